/* replay_compare.c: `raddle replay A --against B`: where two shots, or two engine settings, part first. */
#include "replay.h"

#include <string.h>

static void set_input(difference *diff, const char *element, const char *here, const char *there)
{
    diff->found = true;
    diff->stage = "input";
    snprintf(diff->element, NAME_ROOM, "%s", element);
    snprintf(diff->here, NAME_ROOM, "%s", here);
    snprintf(diff->there, NAME_ROOM, "%s", there);
}

static void set_counts(difference *diff, const char *element, size_t here, size_t there)
{
    char a[32], b[32];
    snprintf(a, sizeof a, "%zu", here);
    snprintf(b, sizeof b, "%zu", there);
    set_input(diff, element, a, b);
}

/* Whether both shots tell of the same mesh: only then can their elements be compared by number. */
static bool scenes_differ(const rdl_scene *a, const rdl_scene *b, difference *diff)
{
    if (a->vertex_count != b->vertex_count)
        set_counts(diff, "number of vertices", a->vertex_count, b->vertex_count);
    else if (a->segment_count != b->segment_count)
        set_counts(diff, "number of segments", a->segment_count, b->segment_count);
    else if (a->triangle_count != b->triangle_count)
        set_counts(diff, "number of triangles", a->triangle_count, b->triangle_count);
    else if ((a->segment_count > 0 && memcmp(a->segments, b->segments, a->segment_count * sizeof a->segments[0]) != 0) ||
             (a->triangle_count > 0 &&
              memcmp(a->triangles, b->triangles, a->triangle_count * sizeof a->triangles[0]) != 0))
        set_input(diff, "the mesh", "one set of elements", "another");
    else if (memcmp(a->mass, b->mass, a->vertex_count * sizeof(double)) != 0)
        set_input(diff, "the masses", "one set", "another");
    return diff->found;
}

static bool inputs_differ(const naming *names, const scenario *a, const scenario *b, difference *diff)
{
    if (states_differ(names, "input", a->start, b->start, diff)) {
        strncat(diff->element, ", start", NAME_ROOM - strlen(diff->element) - 1);
    } else if (states_differ(names, "input", a->proposed, b->proposed, diff)) {
        strncat(diff->element, ", proposed", NAME_ROOM - strlen(diff->element) - 1);
    } else if (a->has_memory && b->has_memory && (a->recorded.memory_bytes != b->recorded.memory_bytes ||
                                                  (a->recorded.memory_bytes > 0 && memcmp(a->recorded.memory, b->recorded.memory, a->recorded.memory_bytes) != 0))) {
        set_input(diff, "the engine's memory before the step", "one", "another");
    } else if (a->host_bits != b->host_bits) {
        set_counts(diff, "bits of a number of the host", (size_t)a->host_bits, (size_t)b->host_bits);
    }
    return diff->found;
}

/* Events and delivered bits of one side: as recorded where they are, else from a step made now. */
typedef struct side {
    scenario s;
    const rdl_event *events;
    size_t count;
    const double *delivered;
} side;

static rdl_status load_side(replayer *r, bool mine, size_t frame, side *out, rdl_fault *fault)
{
    rdl_shot *shot = mine ? r->shot : r->other;
    stepper *st = mine ? &r->st : &r->other_st;
    rdl_status status = scenario_read(&out->s, shot, frame, fault);
    if (status != RDL_OK)
        return status;
    const rdl_settings *settings = mine ? &r->settings : &r->other_about->settings;
    bool as_recorded = !mine || !r->overridden;
    if (st->engine == NULL)
        status = stepper_create(st, &out->s, settings, r->threads, true, fault);
    out->events = NULL;
    if (status == RDL_OK && as_recorded)
        status = rdl_shot_trace_read(shot, frame, &out->events, &out->count, fault);
    out->delivered = out->s.delivered;
    if (status == RDL_OK && (out->events == NULL || !as_recorded || !out->s.has_delivered)) {
        bool keep = frame > r->first &&
                    memcmp(out->s.start, st->result.delivered, 3 * out->s.scene.vertex_count * sizeof(double)) == 0;
        status = stepper_run(st, &out->s, keep, fault);
        if (out->events == NULL) {
            out->events = st->events.rows;
            out->count = st->events.count;
        }
        if (!as_recorded || !out->s.has_delivered)
            out->delivered = st->result.delivered;
        r->seconds += st->result.report.seconds[RDL_TIME_TOTAL];
    }
    if (status != RDL_OK)
        scenario_release(&out->s);
    return status;
}

static rdl_status compare_frame(replayer *r, size_t frame, rdl_fault *fault)
{
    side here, there;
    rdl_status status = load_side(r, true, frame, &here, fault);
    if (status != RDL_OK)
        return status;
    status = load_side(r, false, frame, &there, fault);
    if (status != RDL_OK) {
        scenario_release(&here.s);
        return status;
    }
    difference diff = {.frame = frame};
    naming names = naming_of(&here.s, &r->st);
    bool differs = inputs_differ(&names, &here.s, &there.s, &diff) ||
                   events_differ(&names, here.events, here.count, there.events, there.count, &diff) ||
                   states_differ(&names, "delivered", here.delivered, there.delivered, &diff);
    r->frames++;
    r->differing += differs;
    r->equal += !differs;
    if (differs && !r->diff.found)
        r->diff = diff;
    scenario_release(&here.s);
    scenario_release(&there.s);
    return RDL_OK;
}

int replay_compare(replayer *r)
{
    int code = CLI_DONE;
    difference diff = {0};
    if (!cli_open_shot("replay", r->against, &r->other, &code))
        return code;
    r->other_about = rdl_shot_describe(r->other);
    unsigned steps = RDL_SHOT_START | RDL_SHOT_PROPOSED;
    if ((r->other_about->contents & steps) != steps) {
        cli_error("replay", "%s: frames/start or frames/proposed is missing: nothing to replay", cli_clean(r->against));
        return CLI_BAD_INPUT;
    }
    if (scenes_differ(rdl_shot_scene(r->shot), rdl_shot_scene(r->other), &diff)) {
        r->diff = diff;
        r->differing = 1;
        return CLI_FINDINGS;
    }
    for (size_t k = r->first; k <= r->last && k < r->other_about->frame_count; k++) {
        rdl_fault fault = {0, ""};
        rdl_status status = cli_interrupted() ? RDL_CANCELLED : compare_frame(r, k, &fault);
        if (status == RDL_CANCELLED)
            return CLI_INTERRUPTED;
        if (status != RDL_OK)
            return cli_fail("replay", r->path, (long long)k, status, &fault);
        cli_progress("replay", k - r->first + 1, r->last - r->first + 1);
    }
    cli_progress_end();
    if (r->range == NULL && r->other_about->frame_count != r->about->frame_count && !r->diff.found) {
        r->differing++;
        r->diff.frame = r->frames;
        set_counts(&r->diff, "number of frames", r->about->frame_count, r->other_about->frame_count);
    }
    return r->differing > 0 ? CLI_FINDINGS : CLI_DONE;
}
