/* replay_explain.c: `raddle replay SHOT --explain PAIR`: the life of one pair in one frame, for people who do not have the
 * source at hand. */
#include <inttypes.h>
#include <math.h>
#include <string.h>

#include "pair_facts.h"
#include "replay.h"

static const char *const stages[RDL_STAGE_COUNT] = {
    "a direction that separates the two during the whole step",
    "the signs of the cubic that is 0 when the four points lie in a plane",
    "their distance at the start",
    "the roots of that cubic, isolated with certified signs",
    "a series expansion of their distance, with a bound of its error",
    "exact arithmetic"};

typedef struct tale {
    const replayer *r;
    const scenario *s;
    const naming *names;
    pair_name pair;
    uint32_t vertex[4];
    rdl_motion motion;
    double gap, start_distance, end_floor, path_floor;
} tale;

static double half_of(const rdl_scene *scene, const uint32_t *vertex, size_t count)
{
    double half = 0;
    for (size_t i = 0; i < count; i++)
        half = fmax(half, scene->half_thickness != NULL ? scene->half_thickness[vertex[i]]
                                                        : scene->parts[scene->vertex_part[vertex[i]]].half_thickness);
    return half;
}

static double mass_of(const tale *t, uint32_t vertex)
{
    return t->s->mass != NULL ? t->s->mass[vertex] : t->s->scene.mass[vertex];
}

static size_t first_count(const tale *t)
{
    return t->pair.kind == RDL_POINT_TRIANGLE ? 1 : 2;
}

static void tell_elements(tale *t)
{
    char text[NAME_ROOM];
    pair_text(t->names, t->pair.kind, t->pair.first, t->pair.second, text);
    printf("frame %zu of %s: %s\n\nWho they are\n", t->s->frame, cli_clean(t->r->path), text);
    for (int i = 0; i < 4; i++) {
        const double *a = t->motion.start[i], *b = t->motion.end[i];
        printf("  vertex %" PRIu32 ": start (%.9g, %.9g, %.9g), proposed (%.9g, %.9g, %.9g) m, ", t->vertex[i], a[0], a[1],
               a[2], b[0], b[1], b[2]);
        if (isinf(mass_of(t, t->vertex[i])))
            printf("driven by the host\n");
        else
            printf("%.6g kg\n", mass_of(t, t->vertex[i]));
    }
}

static void tell_floors(tale *t)
{
    double weight[4], first = half_of(&t->s->scene, t->vertex, first_count(t));
    double second = half_of(&t->s->scene, t->vertex + first_count(t), 4 - first_count(t));
    t->gap = first + second;
    t->start_distance = pair_distance((int)t->pair.kind, t->motion.start, weight);
    t->end_floor = fmin(t->gap, t->start_distance);
    t->path_floor = t->end_floor * t->r->settings.path_floor_share;
    printf("\nWhat they should keep\n");
    printf("  gap: half-thicknesses %.9g m + %.9g m = %.9g m\n", first, second, t->gap);
    printf("  distance at the start: %.9g m; where proposed: %.9g m\n", t->start_distance,
           pair_distance((int)t->pair.kind, t->motion.end, weight));
    printf("  so they must end at least %.9g m apart (the smaller of gap and start distance), and keep more than\n"
           "  %.9g m on the way (path_floor_share %.9g)\n",
           t->end_floor, t->path_floor, t->r->settings.path_floor_share);
}

static bool is_muted(const uint32_t (*rows)[2], size_t count, uint32_t p, uint32_t q)
{
    for (size_t k = 0; k < count; k++)
        if ((rows[k][0] == p && rows[k][1] == q) || (rows[k][0] == q && rows[k][1] == p))
            return true;
    return false;
}

/* Why the engine leaves the pair alone, or NULL. */
static const char *why_ignored(const tale *t)
{
    const rdl_scene *scene = &t->s->scene;
    uint32_t p = scene->vertex_part[t->vertex[0]], q = scene->vertex_part[t->vertex[3]];
    bool driven = true;
    for (int i = 0; i < 4; i++)
        driven = driven && isinf(mass_of(t, t->vertex[i]));
    if (driven)
        return "all four vertices are driven by the host";
    if (is_muted(scene->muted_parts, scene->muted_count, p, q))
        return "their parts are muted in the scene";
    if (is_muted(t->s->recorded.muted_parts, t->s->recorded.muted_count, p, q))
        return "their parts are muted in this step";
    for (size_t k = 0; k < scene->attachment_count; k++)
        for (size_t i = 0; i < first_count(t); i++)
            for (size_t n = first_count(t); n < 4; n++)
                if (is_muted(&scene->attachments[k], 1, t->vertex[i], t->vertex[n]))
                    return "they are attached to each other";
    return NULL;
}

static void tell_boxes(const tale *t)
{
    double lo[2][3], hi[2][3], widest = 0;
    int axis = -1;
    for (int side = 0; side < 2; side++) {
        size_t from = side == 0 ? 0 : first_count(t), to = side == 0 ? first_count(t) : 4;
        double half = half_of(&t->s->scene, t->vertex + from, to - from);
        for (int k = 0; k < 3; k++) {
            lo[side][k] = HUGE_VAL;
            hi[side][k] = -HUGE_VAL;
            for (size_t i = from; i < to; i++) {
                lo[side][k] = fmin(lo[side][k], fmin(t->motion.start[i][k], t->motion.end[i][k]) - half);
                hi[side][k] = fmax(hi[side][k], fmax(t->motion.start[i][k], t->motion.end[i][k]) + half);
            }
        }
    }
    printf("\nBoxes round the whole straight way, half-thickness included\n");
    for (int side = 0; side < 2; side++)
        printf("  %s: (%.9g, %.9g, %.9g) to (%.9g, %.9g, %.9g)\n", side == 0 ? "first " : "second", lo[side][0], lo[side][1],
               lo[side][2], hi[side][0], hi[side][1], hi[side][2]);
    for (int k = 0; k < 3; k++) {
        double apart = fmax(lo[0][k] - hi[1][k], lo[1][k] - hi[0][k]);
        if (apart > widest) {
            widest = apart;
            axis = k;
        }
    }
    if (axis < 0)
        printf("  they overlap: the pair may meet and is looked at\n");
    else
        printf("  they are %.9g m apart along %c: the pair cannot meet on the straight way\n", widest, "xyz"[axis]);
}

static void tell_answer(const rdl_touch *touch, const char *what, bool graze)
{
    if (touch->touches && touch->time_hi == 0)
        printf("  %s: yes, already at the start", what);
    else if (touch->touches)
        printf("  %s: yes, first between %.9g and %.9g of the step", what, touch->time_lo, touch->time_hi);
    else
        printf("  %s: no", what);
    printf("%s\n    decided by %s", graze && touch->touches ? " (they graze, and do not cross)" : "",
           stages[touch->stage < RDL_STAGE_COUNT ? touch->stage : 0]);
    printf(" (series order %u, %u halvings)\n", touch->order, touch->depth);
}

static void tell_roots(const tale *t)
{
    static const char *const ways[] = {"", "", ", touching the plane only (double)", ", flat (triple)"};
    plane_time times[3];
    int count = pair_plane_times((int)t->pair.kind, &t->motion, times);
    bool point = t->pair.kind == RDL_POINT_TRIANGLE;
    printf("\nOn the straight way from start to proposed\n");
    if (count < 0)
        printf("  the four points stay in one plane all the time: points and edges within the plane decide\n");
    else if (count == 0)
        printf("  the four points never lie in a plane: they cannot touch at distance 0\n");
    bool graze = false;
    for (int i = 0; i < count; i++) {
        const double *w = times[i].weight;
        graze = graze || (times[i].inside && times[i].multiplicity == 2);
        printf("  in one plane at %.15g%s, and ", times[i].time, ways[times[i].multiplicity]);
        if (!times[i].inside)
            printf("beside each other there\n");
        else if (point)
            printf("the point is in the triangle, weights %.9g, %.9g, %.9g\n", w[1], w[2], w[3]);
        else
            printf("the edges meet, at %.9g of the first and %.9g of the second\n", w[1], w[3]);
    }
    rdl_touch touch;
    if (rdl_find_touches((int)t->pair.kind, 1, &t->motion, NULL, &touch, NULL) == RDL_OK)
        tell_answer(&touch, "do they touch", graze);
    if (t->gap > 0 && rdl_find_touches((int)t->pair.kind, 1, &t->motion, &t->gap, &touch, NULL) == RDL_OK)
        tell_answer(&touch, "do they come within the gap", false);
}

static bool is_this(const tale *t, const rdl_event *event)
{
    return event->kind == t->pair.kind && event->first == t->pair.first && event->second == t->pair.second;
}

/* The zone of this pair in a pass follows it as rows, so it is known before its row is met: look it up. */
static void tell_zone(const tale *t, const event_list *events, size_t member)
{
    char text[NAME_ROOM];
    double zone = events->rows[member].value[0];
    for (size_t i = member; i-- > 0;)
        if (events->rows[i].stage == RDL_EVENT_ZONE && (double)events->rows[i].first == zone) {
            event_text(t->names, &events->rows[i], text);
            printf("  detection %" PRIu32 ": in %s\n", events->rows[member].detection, text);
            return;
        }
}

static void tell_passes(const tale *t)
{
    const event_list *events = &t->r->st.events;
    char text[NAME_ROOM];
    uint32_t detections = 0, candidate = 0, zoned = 0;
    enum { SHOWN = 12 };
    printf("\nWhat the engine did with it\n"
           "  A detection looks for pairs that break a floor on the way as it stands. Those that share vertices are solved\n"
           "  together, as a zone; what was moved is looked at again, until nothing breaks a floor.\n");
    for (size_t i = 0; i < events->count; i++) {
        const rdl_event *event = &events->rows[i];
        bool ours = event->stage != RDL_EVENT_BOX && event->stage != RDL_EVENT_ZONE && event->stage != RDL_EVENT_PIECE &&
                    is_this(t, event);
        detections = event->detection + 1 > detections ? event->detection + 1 : detections;
        candidate += ours && event->stage == RDL_EVENT_PAIR;
        if (event->stage == RDL_EVENT_PIECE && (event->kind != RDL_PIECE_ACCEPTED || event->value[0] < 1)) {
            event_text(t->names, event, text);
            printf("  %s\n", text);
        }
        if (!ours || zoned > SHOWN)
            continue;
        if (event->stage == RDL_EVENT_TOUCH) {
            event_text(t->names, event, text);
            printf("  detection %" PRIu32 ": %s\n", event->detection, text);
        } else if (event->stage == RDL_EVENT_MEMBER && ++zoned <= SHOWN) {
            tell_zone(t, events, i);
        }
        if (zoned > SHOWN)
            printf("  (and so on)\n");
    }
    if (candidate > 0)
        printf("  a candidate in %" PRIu32 " of %" PRIu32 " detections (a detection looks at what moved since the last)\n",
               candidate, detections);
    else
        printf("  nothing: boxes or a separating direction told it apart before it became a candidate\n");
}

static void tell_outcome(const tale *t)
{
    const rdl_report *report = &t->r->st.result.report;
    const double *delivered = t->r->st.result.delivered;
    double x[4][3], weight[4];
    printf("\nHow it ended\n");
    for (size_t c = 0; c < report->contact_count; c++) {
        const rdl_contact *contact = &report->contacts[c];
        if (contact->kind == t->pair.kind && contact->first == t->pair.first && contact->second == t->pair.second)
            printf("  contact at %.9g of the step: impulse %.6g kg m/s along (%.6g, %.6g, %.6g)\n", contact->time,
                   contact->impulse, contact->normal[0], contact->normal[1], contact->normal[2]);
    }
    for (int i = 0; i < 4; i++) {
        double square = 0;
        memcpy(x[i], delivered + 3 * (size_t)t->vertex[i], sizeof x[i]);
        for (int k = 0; k < 3; k++)
            square += (x[i][k] - t->motion.end[i][k]) * (x[i][k] - t->motion.end[i][k]);
        if (square > 0)
            printf("  vertex %" PRIu32 ": delivered (%.9g, %.9g, %.9g) m, %.6g m from where it was proposed\n", t->vertex[i],
                   x[i][0], x[i][1], x[i][2], sqrt(square));
    }
    double distance = pair_distance((int)t->pair.kind, (const double(*)[3])x, weight);
    printf("  distance as delivered: %.9g m, %s\n", distance,
           distance >= t->end_floor * (1 - 1e-12) ? "which keeps the floor" : "which is below the floor");
    static const char *const whys[] = {"it intersects at the start", "it is in contact at the start",
                                       "it crossed in an earlier step", "there was no room", "the budget was spent"};
    for (size_t n = 0; n < report->named_count; n++)
        if (report->named[n].kind == t->pair.kind && report->named[n].first == t->pair.first &&
            report->named[n].second == t->pair.second && report->named[n].why < 5)
            printf("  named in the report: %s\n", whys[report->named[n].why]);
    printf("  the delivered path is %s\n",
           report->waypoint_count > 0 ? "not straight: the step was cut, see the way-points" : "straight");
}

int replay_explain(replayer *r)
{
    scenario s;
    rdl_fault fault = {0, ""};
    if (r->first != r->last && r->range != NULL) {
        cli_error("replay", "--explain looks at one frame: --frames K");
        return CLI_BAD_INPUT;
    }
    rdl_status status = replay_frame(r, r->first, &s, &fault);
    if (status != RDL_OK)
        return cli_fail("replay", r->path, (long long)r->first, status, &fault);
    naming names = naming_of(&s, &r->st);
    tale t = {.r = r, .s = &s, .names = &names};
    const char *wrong = pair_read(&names, r->explain, &t.pair);
    if (wrong != NULL) {
        cli_error("replay", "--explain: %s %s", cli_clean(r->explain), wrong);
        scenario_release(&s);
        return CLI_BAD_INPUT;
    }
    pair_vertices(&names, &t.pair, t.vertex);
    for (int i = 0; i < 4; i++) {
        memcpy(t.motion.start[i], s.start + 3 * (size_t)t.vertex[i], sizeof t.motion.start[i]);
        memcpy(t.motion.end[i], s.proposed + 3 * (size_t)t.vertex[i], sizeof t.motion.end[i]);
    }
    tell_elements(&t);
    tell_floors(&t);
    const char *why = why_ignored(&t);
    if (why != NULL) {
        printf("\nThe engine leaves this pair alone: %s\n", why);
    }
    tell_boxes(&t);
    tell_roots(&t);
    if (why == NULL) {
        tell_passes(&t);
        tell_outcome(&t);
    }
    scenario_release(&s);
    return CLI_DONE;
}
