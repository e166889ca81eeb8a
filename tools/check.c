/* check.c: `raddle check`: tangles and crossings of a shot, by a judge that knows nothing of the resolver. */
#include <inttypes.h>
#include <stdlib.h>
#include <string.h>

#include "cli.h"
#include "judge.h"
#include "verbs.h"

static const cli_option options[] = {
    {"bodies", NULL, "bodies that cut themselves or each other count as findings too"},
    {"threads", "N", "threads to use (default: all processors); the result does not depend on it"},
    {"most", "N", "print at most N findings (default 20); counts are always full"},
    {"json", NULL, "print one JSON object"},
};

static const cli_spec spec = {
    .verb = "check",
    .operands = "SHOT",
    .summary = "Looks for tangles at rest in every delivered state and for crossings along every path: from start by\n"
               "way of the way-points to delivered, and from delivered to the next start where the host moved it.\n"
               "Exact for the recorded numbers, and independent of the resolver.",
    .notes = "Without delivered positions the proposed ones are judged; a shot of poses alone is judged from pose to\n"
             "pose. Motion between recorded states is taken as straight.",
    .options = options,
    .option_count = sizeof options / sizeof options[0],
    .operands_min = 1,
    .operands_max = 1};

/* What a piece of path is. */
typedef enum stretch { STRETCH_REST, STRETCH_STEP, STRETCH_HOST, STRETCH_POSES, STRETCHES } stretch;

static const char *const stretch_names[STRETCHES] = {"at rest", "step", "moved by the host", "between poses"};
static const char *const stretch_keys[STRETCHES] = {"rest", "step", "host", "poses"};

typedef struct checker {
    const char *path;
    rdl_shot *shot;
    const rdl_scene *scene;
    const rdl_shot_info *about;
    judge *judge;
    unsigned from, to;   /* which positions a step starts and ends with; from 0: poses */
    double *start, *end; /* of the frame at hand */
    double *last;        /* end of the frame before */
    size_t frame, most, printed, named, frames_done, bad_frames;
    long long first_bad;
    bool bodies, json, frame_is_bad;
    uint64_t tangles, crossings[STRETCHES], driven_tangles, driven_crossings, contacts, pairs;
    json_t *list;
} checker;

static const char *part_of(const checker *c, uint32_t vertex)
{
    return c->scene->parts[c->scene->vertex_part[vertex]].name;
}

static void list_finding(checker *c, const judge_finding *found, stretch where, const uint32_t (*edges)[2], double lo,
                         double hi)
{
    bool point = found->kind == JUDGE_CROSSING_PT, tangle = found->kind == JUDGE_TANGLE;
    uint32_t a = point ? found->first : edges[found->first][0];
    uint32_t b = tangle || point ? c->scene->triangles[found->second][0] : edges[found->second][0];
    json_t *row = json_pack("{s:I, s:s, s:s, s:I, s:I, s:s, s:s, s:b}", "frame", (json_int_t)c->frame, "kind",
                            tangle  ? "tangle"
                            : point ? "pt"
                                    : "ee",
                            "where", stretch_keys[tangle ? STRETCH_REST : where], "first", (json_int_t)found->first,
                            "second", (json_int_t)found->second, "first_part", part_of(c, a), "second_part",
                            part_of(c, b), "driven", (int)found->driven);
    if (!point)
        json_object_set_new(
            row, "first_vertices",
            json_pack("[I, I]", (json_int_t)edges[found->first][0], (json_int_t)edges[found->first][1]));
    if (!tangle)
        json_object_set_new(row, "time", json_pack("[f, f]", lo, hi));
    json_array_append_new(c->list, row);
}

static void print_finding(checker *c, const judge_finding *found, stretch where, const uint32_t (*edges)[2], double lo,
                          double hi)
{
    const char *bodies = found->driven ? " (bodies)" : "";
    cli_progress_end();
    if (found->kind == JUDGE_TANGLE)
        printf("frame %zu, at rest: edge %" PRIu32 "-%" PRIu32 " of \"%s\" pierces triangle %" PRIu32 " of \"%s\"%s\n",
               c->frame, edges[found->first][0], edges[found->first][1], cli_clean(part_of(c, edges[found->first][0])),
               found->second, cli_clean(part_of(c, c->scene->triangles[found->second][0])), bodies);
    else if (found->kind == JUDGE_CROSSING_PT)
        printf("frame %zu, %s: vertex %" PRIu32 " of \"%s\" meets triangle %" PRIu32 " of \"%s\" at %.6f to %.6f%s\n",
               c->frame, stretch_names[where], found->first, cli_clean(part_of(c, found->first)), found->second,
               cli_clean(part_of(c, c->scene->triangles[found->second][0])), lo, hi, bodies);
    else
        printf("frame %zu, %s: edge %" PRIu32 "-%" PRIu32 " of \"%s\" meets edge %" PRIu32 "-%" PRIu32
               " of \"%s\" at %.6f to %.6f%s\n",
               c->frame, stretch_names[where], edges[found->first][0], edges[found->first][1],
               cli_clean(part_of(c, edges[found->first][0])), edges[found->second][0], edges[found->second][1],
               cli_clean(part_of(c, edges[found->second][0])), lo, hi, bodies);
}

/* One straight piece, which covers the share [lo, hi] of its stretch. */
static rdl_status look(checker *c, stretch where, const double *from, const double *to, double lo, double hi, bool end,
                       rdl_fault *fault)
{
    judge_counts counts;
    const judge_finding *found = NULL;
    size_t count = 0, edge_count = 0;
    size_t most = c->most - c->printed;
    rdl_status status =
        judge_piece(c->judge, from, to, where != STRETCH_REST, end, most, &counts, &found, &count, fault);
    if (status != RDL_OK)
        return status;
    const uint32_t(*edges)[2] = judge_edges(c->judge, &edge_count);
    for (size_t i = 0; i < count; i++, c->printed++) {
        double a = lo + found[i].time_lo * (hi - lo), b = lo + found[i].time_hi * (hi - lo);
        if (c->json)
            list_finding(c, &found[i], where, edges, a, b);
        else
            print_finding(c, &found[i], where, edges, a, b);
    }
    c->tangles += counts.tangles;
    c->crossings[where] += counts.crossings;
    c->driven_tangles += counts.driven_tangles;
    c->driven_crossings += counts.driven_crossings;
    c->contacts += counts.contacts;
    c->pairs += counts.pairs;
    uint64_t bad = counts.tangles + counts.crossings, driven = counts.driven_tangles + counts.driven_crossings;
    c->named += (size_t)(bad + (c->bodies ? driven : 0));
    c->frame_is_bad = c->frame_is_bad || bad + (c->bodies ? driven : 0) > 0;
    return RDL_OK;
}

static size_t state_bytes(const checker *c)
{
    return 3 * c->scene->vertex_count * sizeof(double);
}

/* From start through the way-points to the end; at rest only the end is judged, since that is what the host is given.
 */
static rdl_status look_at_step(checker *c, rdl_fault *fault)
{
    rdl_shot_frame frame = {0};
    rdl_status status = RDL_OK;
    if (c->to == RDL_SHOT_DELIVERED)
        status = rdl_shot_read_frame(c->shot, c->frame, &frame, fault);
    const double *from = c->start;
    double lo = 0;
    for (size_t w = 0; status == RDL_OK && w < frame.waypoint_count; w++) {
        const double *to = frame.waypoint_positions + w * 3 * c->scene->vertex_count;
        status = look(c, STRETCH_STEP, from, to, lo, frame.waypoint_times[w], false, fault);
        lo = frame.waypoint_times[w];
        from = to;
    }
    return status == RDL_OK ? look(c, STRETCH_STEP, from, c->end, lo, 1, true, fault) : status;
}

static rdl_status look_at_frame(checker *c, rdl_fault *fault)
{
    rdl_status status = RDL_OK;
    if (c->from != 0)
        status = rdl_shot_read_positions(c->shot, c->frame, c->from, c->start, fault);
    if (status == RDL_OK)
        status = rdl_shot_read_positions(c->shot, c->frame, c->to, c->end, fault);
    if (status != RDL_OK)
        return status;
    const double *first = c->from != 0 ? c->start : c->end;
    if (c->frame == 0)
        status = look(c, STRETCH_REST, first, first, 0, 1, true, fault);
    else if (c->from == 0)
        status = look(c, STRETCH_POSES, c->last, c->end, 0, 1, true, fault);
    else if (memcmp(c->last, c->start, state_bytes(c)) != 0)
        status = look(c, STRETCH_HOST, c->last, c->start, 0, 1, true, fault);
    if (status == RDL_OK && c->from != 0)
        status = look_at_step(c, fault);
    double *swap = c->last;
    c->last = c->end;
    c->end = swap;
    return status;
}

static int check_all(checker *c, unsigned threads)
{
    rdl_fault fault = {0, ""};
    size_t count = c->about->frame_count;
    c->start = malloc(state_bytes(c));
    c->end = malloc(state_bytes(c));
    c->last = malloc(state_bytes(c));
    rdl_status status = c->start != NULL && c->end != NULL && c->last != NULL
                            ? judge_create(c->scene, threads, c->bodies, &c->judge)
                            : RDL_NO_MEMORY;
    if (status != RDL_OK)
        return cli_fail("check", c->path, -1, status, NULL);
    for (c->frame = 0; c->frame < count; c->frame++) {
        if (cli_interrupted())
            return CLI_INTERRUPTED;
        c->frame_is_bad = false;
        status = look_at_frame(c, &fault);
        if (status != RDL_OK)
            return cli_fail("check", c->path, (long long)c->frame, status, &fault);
        if (c->frame_is_bad && c->bad_frames++ == 0)
            c->first_bad = (long long)c->frame;
        c->frames_done++;
        cli_progress("check", c->frame + 1, count);
    }
    cli_progress_end();
    uint64_t bad = c->tangles;
    for (size_t k = 0; k < STRETCHES; k++)
        bad += c->crossings[k];
    if (c->bodies)
        bad += c->driven_tangles + c->driven_crossings;
    return bad > 0 ? CLI_FINDINGS : CLI_DONE;
}

static const char *judged(const checker *c)
{
    return c->from == 0 ? "poses" : c->to == RDL_SHOT_DELIVERED ? "delivered" : "proposed";
}

static json_t *make_json(checker *c)
{
    return json_pack("{s:o, s:I, s:s, s:b, s:I, s:I, s:I, s:I, s:I, s:I, s:I, s:I, s:I, s:I, s:I, s:O}", "file",
                     cli_json_text(c->path), "frames", (json_int_t)c->frames_done, "judged", judged(c), "complete",
                     c->about->complete, "tangles", (json_int_t)c->tangles, "crossings",
                     (json_int_t)(c->crossings[STRETCH_STEP] + c->crossings[STRETCH_POSES]), "host_crossings",
                     (json_int_t)c->crossings[STRETCH_HOST], "body_tangles", (json_int_t)c->driven_tangles,
                     "body_crossings", (json_int_t)c->driven_crossings, "contacts", (json_int_t)c->contacts, "pairs",
                     (json_int_t)c->pairs, "frames_with_findings", (json_int_t)c->bad_frames, "first_frame",
                     (json_int_t)c->first_bad, "listed", (json_int_t)c->printed, "found", (json_int_t)c->named,
                     "findings", c->list);
}

static void print_text(const checker *c)
{
    if (c->named > c->printed)
        printf("... and %zu more (--most prints them)\n", c->named - c->printed);
    printf("%s: %zu frames, %s judged%s\n", cli_clean(c->path), c->frames_done, judged(c),
           c->about->complete ? "" : " (an unfinished recording)");
    printf("%" PRIu64 " tangles at rest, %" PRIu64 " crossings in steps, %" PRIu64
           " crossings where the host moved it\n",
           c->tangles, c->crossings[STRETCH_STEP] + c->crossings[STRETCH_POSES], c->crossings[STRETCH_HOST]);
    bool hidden = !c->bodies && c->driven_tangles + c->driven_crossings > 0;
    printf("bodies: %" PRIu64 " tangles, %" PRIu64 " crossings among driven vertices%s\n", c->driven_tangles,
           c->driven_crossings, hidden ? " (--bodies lists them and counts them as findings)" : "");
    if (c->contacts > 0)
        printf("%" PRIu64 " pairs at distance 0 where a piece of path starts (not counted as findings)\n", c->contacts);
    if (c->bad_frames > 0)
        printf("%zu frames with findings, the first is %lld\n", c->bad_frames, c->first_bad);
}

static int run(checker *c, unsigned threads)
{
    int code = CLI_DONE;
    if (!cli_open_shot("check", c->path, &c->shot, &code))
        return code;
    c->scene = rdl_shot_scene(c->shot);
    c->about = rdl_shot_describe(c->shot);
    unsigned held = c->about->contents;
    bool steps = (held & RDL_SHOT_START) != 0 && (held & (RDL_SHOT_DELIVERED | RDL_SHOT_PROPOSED)) != 0;
    c->from = steps ? RDL_SHOT_START : 0;
    c->to = (held & RDL_SHOT_DELIVERED) != 0  ? RDL_SHOT_DELIVERED
            : (held & RDL_SHOT_PROPOSED) != 0 ? RDL_SHOT_PROPOSED
                                              : RDL_SHOT_START;
    code = check_all(c, threads);
    bool done = code == CLI_DONE || code == CLI_FINDINGS;
    if (done && c->json)
        return cli_print_json("check", make_json(c), code);
    if (done)
        print_text(c);
    return code;
}

int verb_check(int argc, char **argv)
{
    cli_line line;
    int code = CLI_DONE;
    double threads = 0, most = 20;
    checker c = {.first_bad = -1};
    if (!cli_read(&spec, argc, argv, &line, &code))
        return code;
    const char *threads_text = cli_value(&spec, &line, "threads"), *most_text = cli_value(&spec, &line, "most");
    if ((threads_text != NULL && !cli_number(&spec, "threads", threads_text, 1, RDL_THREADS_MAX, true, &threads)) ||
        (most_text != NULL && !cli_number(&spec, "most", most_text, 0, 1e9, true, &most)))
        return CLI_BAD_INPUT;
    c.path = line.operands[0];
    c.most = (size_t)most;
    c.bodies = cli_value(&spec, &line, "bodies") != NULL;
    c.json = cli_value(&spec, &line, "json") != NULL;
    c.list = json_array();
    code = run(&c, (unsigned)threads);
    judge_destroy(c.judge);
    rdl_shot_close(c.shot);
    json_decref(c.list);
    free(c.start);
    free(c.end);
    free(c.last);
    return code;
}
