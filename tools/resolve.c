/* resolve.c: `raddle resolve`: start and proposed positions in, delivered ones out. */
#include <inttypes.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "cli.h"
#include "verbs.h"

static const cli_option options[] = {
    {"o", "FILE", "the shot to write"},
    {"force", NULL, "replace FILE if it exists"},
    {"threads", "N", "threads to use (default: all processors); the result does not depend on it"},
    {"step", "SECONDS", "length of a step (default: from the recorded times)"},
    {"most", "N", "print at most N named pairs (default 20)"},
    {"json", NULL, "print one JSON object"},
};

static const cli_spec spec = {
    .verb = "resolve",
    .operands = "SHOT",
    .summary = "Resolves every frame of a shot that has start and proposed positions, each from its own start, and\n"
               "writes a complete shot: delivered positions, verdicts, way-points, the engine's memory, digests.",
    .notes = "While it runs, the frames so far are in FILE.part, which every verb reads. An interrupt keeps them.",
    .options = options,
    .option_count = sizeof options / sizeof options[0],
    .operands_min = 1,
    .operands_max = 1,
    .settings = true};

typedef struct resolver {
    const char *path, *out;
    rdl_shot *shot;
    const rdl_scene *scene;
    const rdl_shot_info *about;
    rdl_engine *engine;
    rdl_shot_writer *writer;
    double *start, *proposed, *delivered; /* N x 3 */
    float *narrow;                        /* delivered as the engine writes it for a float host */
    void *memory;
    size_t memory_room;
    double step_seconds, last_time;
    size_t most, named;
    bool json, force;
    size_t frames, verdicts[4];
    uint64_t held, touches, zones, passes, pairs, substeps;
    uint64_t stages[RDL_STAGE_COUNT], orders[16], depths[16], levels[RDL_LEVEL_COUNT];
    double seconds[RDL_TIME_COUNT], worst, sum_mean;
    unsigned threads;
    json_t *named_list;
} resolver;

static const char *const whys[] = {"intersects at the start", "in contact at the start", "crossed in an earlier step",
                                   "no room", "budget spent"};

static const char *part_name(const rdl_scene *scene, uint32_t vertex)
{
    return cli_clean(scene->parts[scene->vertex_part[vertex]].name);
}

/* "vertex 3 of "sheet"", "edge 0-1 of "thread"" or "triangle 7 of "figure"". */
static void describe(const resolver *r, char text[256], bool is_triangle, bool is_vertex, uint32_t id)
{
    size_t edge_count = 0;
    const uint32_t(*edges)[2] = rdl_engine_edges(r->engine, &edge_count);
    if (is_vertex)
        snprintf(text, 256, "vertex %" PRIu32 " of \"%s\"", id, part_name(r->scene, id));
    else if (is_triangle)
        snprintf(text, 256, "triangle %" PRIu32 " of \"%s\"", id, part_name(r->scene, r->scene->triangles[id][0]));
    else
        snprintf(text, 256, "edge %" PRIu32 "-%" PRIu32 " of \"%s\"", edges[id][0], edges[id][1],
                 part_name(r->scene, edges[id][0]));
}

static void name_pair(resolver *r, size_t frame, const rdl_named_pair *pair)
{
    static const char *const kinds[] = {"pt", "ee", "et"};
    const char *why = pair->why < sizeof whys / sizeof whys[0] ? whys[pair->why] : "?";
    char first[256], second[256];
    describe(r, first, false, pair->kind == RDL_POINT_TRIANGLE, pair->first);
    describe(r, second, pair->kind != RDL_EDGE_EDGE, false, pair->second);
    if (r->json) {
        json_array_append_new(r->named_list,
                              json_pack("{s:I, s:s, s:I, s:I, s:o, s:o, s:s}", "frame", (json_int_t)frame, "kind",
                                        kinds[pair->kind], "first", (json_int_t)pair->first, "second",
                                        (json_int_t)pair->second, "first_element", cli_json_text(first),
                                        "second_element", cli_json_text(second), "why", why));
        return;
    }
    cli_progress_end();
    printf("frame %zu: %s and %s: %s\n", frame, first, second, why);
}

static void add_report(resolver *r, size_t frame, const rdl_report *report)
{
    r->frames++;
    r->verdicts[report->verdict]++;
    r->held += report->held_count;
    r->touches += report->touches;
    r->zones += report->zone_count;
    r->passes += report->passes;
    r->pairs += report->pairs;
    r->substeps += report->substeps;
    r->threads = report->threads;
    for (size_t i = 0; i < RDL_STAGE_COUNT; i++)
        r->stages[i] += report->decided[i];
    for (size_t i = 0; i < RDL_LEVEL_COUNT; i++)
        r->levels[i] += report->level_zones[i];
    for (size_t i = 0; i < 16; i++) {
        r->orders[i] += report->orders[i];
        r->depths[i] += report->depths[i];
    }
    for (size_t i = 0; i < RDL_TIME_COUNT; i++)
        r->seconds[i] += report->seconds[i];
    r->worst = report->worst_correction > r->worst ? report->worst_correction : r->worst;
    r->sum_mean += report->mean_correction;
    for (size_t i = 0; i < report->named_count; i++, r->named++)
        if (r->named < r->most)
            name_pair(r, frame, &report->named[i]);
}

/* The length of step k: to it from the one before; of the first, to the next. */
static rdl_status find_duration(resolver *r, size_t k, double time, double *duration, rdl_fault *fault)
{
    double length = k > 0 ? time - r->last_time : 0;
    if (k == 0 && r->about->frame_count > 1 && r->step_seconds == 0) {
        rdl_shot_frame next;
        rdl_status status = rdl_shot_read_frame(r->shot, 1, &next, fault);
        if (status != RDL_OK)
            return status;
        length = next.time - time;
    }
    *duration = length > 0 && isfinite(length) ? length : 1.0 / 24;
    return RDL_OK;
}

static rdl_status read_memory(resolver *r, size_t *bytes)
{
    *bytes = 0;
    rdl_status status = rdl_engine_memory_read(r->engine, NULL, bytes);
    if (status == RDL_OK && *bytes > r->memory_room) {
        void *grown = realloc(r->memory, *bytes);
        if (grown == NULL)
            return RDL_NO_MEMORY;
        r->memory = grown;
        r->memory_room = *bytes;
    }
    return status == RDL_OK && *bytes > 0 ? rdl_engine_memory_read(r->engine, r->memory, bytes) : status;
}

static rdl_status do_step(resolver *r, const rdl_shot_frame *rules, rdl_report *report, rdl_fault *fault)
{
    bool narrow = r->about->host_bits == RDL_FLOAT32;
    rdl_step step = {.size = sizeof step, .duration = rules->duration, .mass = rules->mass,
                     .muted_count = rules->muted_count, .muted_parts = rules->muted_parts,
                     .seconds_max = rules->seconds_max, .passes_max = rules->passes_max};
    step.start = (rdl_view){r->start, 0, RDL_FLOAT64};
    step.proposed = (rdl_view){r->proposed, 0, RDL_FLOAT64};
    step.delivered =
        narrow ? (rdl_output_view){r->narrow, 0, RDL_FLOAT32} : (rdl_output_view){r->delivered, 0, RDL_FLOAT64};
    *report = (rdl_report){.size = sizeof *report};
    rdl_status status = rdl_engine_step(r->engine, &step, report, fault);
    for (size_t i = 0; narrow && status == RDL_OK && i < 3 * r->scene->vertex_count; i++)
        r->delivered[i] = (double)r->narrow[i];
    return status;
}

/* One frame, from its own start. The engine's memory lives on only where the host went on from what it was given. */
static rdl_status do_frame(resolver *r, size_t k, const char **file, rdl_fault *fault)
{
    rdl_report report;
    rdl_shot_frame frame;
    *file = r->path;
    rdl_status status = rdl_shot_read_positions(r->shot, k, RDL_SHOT_START, r->start, fault);
    if (status == RDL_OK)
        status = rdl_shot_read_positions(r->shot, k, RDL_SHOT_PROPOSED, r->proposed, fault);
    if (status == RDL_OK)
        status = rdl_shot_read_frame(r->shot, k, &frame, fault);
    if (status != RDL_OK)
        return status;
    double duration = r->step_seconds > 0 ? r->step_seconds : frame.duration;
    if (!(duration > 0))
        status = find_duration(r, k, frame.time, &duration, fault);
    r->last_time = frame.time;
    if (status == RDL_OK) /* again, since looking for the duration may have read another frame */
        status = rdl_shot_read_frame(r->shot, k, &frame, fault);
    if (status != RDL_OK)
        return status;
    rdl_shot_frame out = {.time = frame.time,
                          .picture = frame.picture,
                          .start = r->start,
                          .proposed = r->proposed,
                          .delivered = r->delivered,
                          .duration = duration,
                          .seconds_max = frame.seconds_max,
                          .passes_max = frame.passes_max,
                          .mass = frame.mass,
                          .muted_count = frame.muted_count,
                          .muted_parts = frame.muted_parts};
    if (status == RDL_OK &&
        (k == 0 || memcmp(r->start, r->delivered, 3 * r->scene->vertex_count * sizeof(double)) != 0))
        status = rdl_engine_reset(r->engine);
    if (status == RDL_OK)
        status = read_memory(r, &out.memory_bytes);
    if (status == RDL_OK)
        status = do_step(r, &out, &report, fault);
    if (status != RDL_OK)
        return status;
    add_report(r, k, &report);
    out.memory = r->memory;
    out.verdict = (uint8_t)report.verdict;
    out.waypoint_count = report.waypoint_count;
    out.waypoint_times = report.waypoint_times;
    out.waypoint_positions = report.waypoint_positions;
    *file = r->out;
    return rdl_shot_append(r->writer, &out, fault);
}

static rdl_status open_engine(resolver *r, const cli_line *line, unsigned threads, const char **file, int *code,
                              rdl_fault *fault)
{
    rdl_settings settings = r->about->settings;
    rdl_host host = {.size = sizeof host, .threads = threads, .cancel = cli_cancel};
    rdl_shot_options shot;
    *file = r->path;
    if (!cli_settings(&spec, line, &settings)) {
        *code = CLI_BAD_INPUT;
        return RDL_BAD_SETTING;
    }
    size_t numbers = 3 * r->scene->vertex_count;
    r->start = malloc(numbers * sizeof(double));
    r->proposed = malloc(numbers * sizeof(double));
    r->delivered = malloc(numbers * sizeof(double));
    r->narrow = malloc(numbers * sizeof(float));
    if (r->start == NULL || r->proposed == NULL || r->delivered == NULL || r->narrow == NULL)
        return RDL_NO_MEMORY;
    rdl_status status = rdl_engine_create(r->scene, &settings, &host, &r->engine, fault);
    if (status != RDL_OK)
        return status;
    rdl_shot_options_default(&shot);
    shot.contents = RDL_SHOT_STEP & ~(unsigned)((r->about->contents & RDL_SHOT_PICTURE) != 0 ? 0 : RDL_SHOT_PICTURE);
    shot.host_bits = r->about->host_bits;
    shot.overwrite = r->force;
    shot.created_by = "raddle resolve " RDL_VERSION_TEXT;
    shot.settings = &settings;
    *file = r->out;
    return rdl_shot_create(r->out, r->scene, &shot, &r->writer, fault);
}

static json_t *counts_json(const uint64_t *counts, size_t count)
{
    json_t *list = json_array();
    for (size_t i = 0; i < count; i++)
        json_array_append_new(list, json_integer((json_int_t)counts[i]));
    return list;
}

static json_t *make_json(resolver *r)
{
    json_t *seconds = json_pack("{s:f, s:f, s:f, s:f, s:f, s:f}", "boxes", r->seconds[RDL_TIME_BOXES], "pairs",
                                r->seconds[RDL_TIME_PAIRS], "touches", r->seconds[RDL_TIME_TOUCHES], "response",
                                r->seconds[RDL_TIME_RESPONSE], "verify", r->seconds[RDL_TIME_VERIFY], "total",
                                r->seconds[RDL_TIME_TOTAL]);
    double mean = r->frames > 0 ? r->sum_mean / (double)r->frames : 0;
    return json_pack("{s:o, s:o, s:I, s:I, s:I, s:I, s:I, s:I, s:I, s:I, s:I, s:I, s:I, s:o, s:f, s:f, s:i, s:o, s:o, "
                     "s:o, s:o, s:I, s:O}",
                     "file", cli_json_text(r->path), "output", cli_json_text(r->out), "frames", (json_int_t)r->frames,
                     "clear", (json_int_t)r->verdicts[RDL_CLEAR], "resolved", (json_int_t)r->verdicts[RDL_RESOLVED],
                     "pinched", (json_int_t)r->verdicts[RDL_PINCHED], "tangled", (json_int_t)r->verdicts[RDL_TANGLED],
                     "held", (json_int_t)r->held, "pairs", (json_int_t)r->pairs, "touches", (json_int_t)r->touches,
                     "zones", (json_int_t)r->zones, "passes", (json_int_t)r->passes, "substeps",
                     (json_int_t)r->substeps, "seconds", seconds, "worst_correction_m", r->worst, "mean_correction_m",
                     mean, "threads", (int)r->threads, "stages", counts_json(r->stages, RDL_STAGE_COUNT), "orders",
                     counts_json(r->orders, 16), "depths", counts_json(r->depths, 16), "levels",
                     counts_json(r->levels, RDL_LEVEL_COUNT), "named_count", (json_int_t)r->named, "named",
                     r->named_list);
}

static void print_text(const resolver *r)
{
    if (r->named > r->most)
        printf("... and %zu more named pairs (--most prints them)\n", r->named - r->most);
    printf("%zu frames: %zu clear, %zu resolved, %zu pinched, %zu tangled; %" PRIu64 " vertices held\n", r->frames,
           r->verdicts[RDL_CLEAR], r->verdicts[RDL_RESOLVED], r->verdicts[RDL_PINCHED], r->verdicts[RDL_TANGLED],
           r->held);
    printf("%" PRIu64 " pairs, %" PRIu64 " touches, %" PRIu64 " zones, %" PRIu64 " passes, worst correction %.4g m\n",
           r->pairs, r->touches, r->zones, r->passes, r->worst);
    printf("seconds: boxes %.3f, pairs %.3f, touches %.3f, response %.3f, verify %.3f, total %.3f (%u threads)\n",
           r->seconds[RDL_TIME_BOXES], r->seconds[RDL_TIME_PAIRS], r->seconds[RDL_TIME_TOUCHES],
           r->seconds[RDL_TIME_RESPONSE], r->seconds[RDL_TIME_VERIFY], r->seconds[RDL_TIME_TOTAL], r->threads);
}

static int resolve_all(resolver *r, const cli_line *line, unsigned threads)
{
    rdl_fault fault = {0, ""};
    const char *file = r->path;
    int code = -1;
    long long frame = -1;
    rdl_status status = open_engine(r, line, threads, &file, &code, &fault);
    if (code >= 0)
        return code;
    size_t count = r->about->frame_count, k = 0;
    for (; status == RDL_OK && k < count && !cli_interrupted(); k++) {
        frame = (long long)k;
        status = do_frame(r, k, &file, &fault);
        cli_progress("resolve", k + 1, count);
    }
    if (status == RDL_CANCELLED || (status == RDL_OK && k < count)) {
        cli_error("resolve", "interrupted: the first %zu frames are in %s.part", r->frames, cli_clean(r->out));
        rdl_shot_keep(r->writer);
        r->writer = NULL;
        return CLI_INTERRUPTED;
    }
    if (status == RDL_OK) {
        frame = -1;
        file = r->out;
        status = rdl_shot_finish(r->writer, &fault);
        r->writer = NULL;
    }
    if (status != RDL_OK)
        return cli_fail("resolve", file, frame, status, &fault);
    cli_progress_end();
    return r->verdicts[RDL_PINCHED] + r->verdicts[RDL_TANGLED] > 0 ? CLI_FINDINGS : CLI_DONE;
}

static int check_input(const resolver *r)
{
    unsigned needed = RDL_SHOT_START | RDL_SHOT_PROPOSED;
    if ((r->about->contents & needed) != needed) {
        cli_error("resolve", "%s: frames/%s is missing: nothing to resolve", cli_clean(r->path),
                  (r->about->contents & RDL_SHOT_START) != 0 ? "proposed" : "start");
        return CLI_BAD_INPUT;
    }
    if (r->about->unknown_setting != NULL) {
        cli_error("resolve", "%s: settings/%s: this version does not have that setting", cli_clean(r->path),
                  cli_clean(r->about->unknown_setting));
        return CLI_BAD_INPUT;
    }
    return CLI_DONE;
}

static int run(resolver *r, const cli_line *line, unsigned threads)
{
    int code = CLI_DONE;
    if (!cli_open_shot("resolve", r->path, &r->shot, &code))
        return code;
    r->scene = rdl_shot_scene(r->shot);
    r->about = rdl_shot_describe(r->shot);
    code = check_input(r);
    if (code == CLI_DONE)
        code = resolve_all(r, line, threads);
    if (r->json && (code == CLI_DONE || code == CLI_FINDINGS))
        code = cli_print_json("resolve", make_json(r), code);
    else if (code == CLI_DONE || code == CLI_FINDINGS)
        print_text(r);
    return code;
}

int verb_resolve(int argc, char **argv)
{
    cli_line line;
    int code = CLI_DONE;
    double threads = 0, most = 20;
    resolver r = {0};
    if (!cli_read(&spec, argc, argv, &line, &code))
        return code;
    r.path = line.operands[0];
    r.out = cli_value(&spec, &line, "o");
    r.json = cli_value(&spec, &line, "json") != NULL;
    r.force = cli_value(&spec, &line, "force") != NULL;
    const char *threads_text = cli_value(&spec, &line, "threads"), *most_text = cli_value(&spec, &line, "most");
    const char *step_text = cli_value(&spec, &line, "step");
    if (r.out == NULL) {
        cli_error("resolve", "-o FILE is missing: where to write the shot");
        return CLI_BAD_INPUT;
    }
    if ((threads_text != NULL && !cli_number(&spec, "threads", threads_text, 1, RDL_THREADS_MAX, true, &threads)) ||
        (most_text != NULL && !cli_number(&spec, "most", most_text, 0, 1e9, true, &most)) ||
        (step_text != NULL && !cli_number(&spec, "step", step_text, 1e-9, 1e9, false, &r.step_seconds)))
        return CLI_BAD_INPUT;
    r.most = (size_t)most;
    r.named_list = json_array();
    code = run(&r, &line, (unsigned)threads);
    rdl_shot_discard(r.writer);
    rdl_engine_destroy(r.engine);
    rdl_shot_close(r.shot);
    json_decref(r.named_list);
    free(r.start);
    free(r.proposed);
    free(r.delivered);
    free(r.narrow);
    free(r.memory);
    return code;
}
