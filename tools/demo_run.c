/* demo_run.c: the demo's loop: direct, propose, resolve, record, accept, learn. */
#include "demo.h"

#include <stdlib.h>
#include <string.h>

#include "cli.h"
#include "host/couple.h"

#define APPROACH 0.03 /* m/s, see host_learn */

typedef struct player {
    demo_scene *scene;
    const demo_options *options;
    demo_result *result;
    rdl_part parts[8];
    rdl_scene described;
    rdl_engine *engine;
    rdl_shot_writer *writer;
    demo_stills *stills;
    double (*delivered)[3];
    void *memory;
    size_t memory_bytes, memory_room;
    rdl_fault fault;
    const char *doing;
} player;

static rdl_status open_all(player *p)
{
    rdl_host hooks = {.size = sizeof hooks, .threads = p->options->threads};
    rdl_settings settings;
    rdl_shot_options shot;
    host_describe(p->scene->h, p->parts, &p->described);
    rdl_settings_default(&settings);
    rdl_shot_options_default(&shot);
    shot.contents = RDL_SHOT_START | RDL_SHOT_PROPOSED | RDL_SHOT_DELIVERED | RDL_SHOT_PICTURE;
    shot.overwrite = p->options->force;
    shot.created_by = "raddle demo " RDL_VERSION_TEXT;
    p->delivered = malloc(p->scene->h->vertex_count * sizeof *p->delivered);
    if (!p->delivered)
        return RDL_NO_MEMORY;
    if (p->options->respond) {
        shot.contents = RDL_SHOT_STEP;
        shot.settings = &settings;
        p->doing = "the engine";
        rdl_status status = rdl_engine_create(&p->described, &settings, &hooks, &p->engine, &p->fault);
        if (status != RDL_OK)
            return status;
    }
    if (p->options->stills) {
        p->stills = demo_stills_begin(p->scene, &p->described, p->options);
        if (!p->stills)
            return RDL_NO_MEMORY;
    }
    p->doing = p->options->shot;
    return rdl_shot_create(p->options->shot, &p->described, &shot, &p->writer, &p->fault);
}

/* The engine's memory as it was before the step goes into the recording. */
static rdl_status keep_memory(player *p)
{
    size_t bytes = 0;
    rdl_status status = rdl_engine_memory_read(p->engine, NULL, &bytes);
    if (status != RDL_OK)
        return status;
    if (bytes > p->memory_room) {
        void *room = realloc(p->memory, bytes);
        if (!room)
            return RDL_NO_MEMORY;
        p->memory = room;
        p->memory_room = bytes;
    }
    p->memory_bytes = bytes;
    return bytes ? rdl_engine_memory_read(p->engine, p->memory, &p->memory_bytes) : RDL_OK;
}

static void count(demo_result *result, const rdl_report *report, size_t vertex_count)
{
    result->verdicts[report->verdict]++;
    result->touches += report->touches;
    result->zones += report->zone_count;
    result->passes += report->passes;
    result->held += report->held_count;
    for (size_t i = 0; i < vertex_count; i++)
        result->moved += report->moved[i];
    if (report->worst_correction > result->worst_correction)
        result->worst_correction = report->worst_correction;
    result->sum_correction += report->mean_correction;
    result->threads = report->threads;
    for (int k = 0; k < RDL_TIME_COUNT; k++)
        result->seconds[k] += report->seconds[k];
}

/* One step of the integrator, with raddle behind it. */
static rdl_status play_step(player *p, double time, uint32_t picture)
{
    host *h = p->scene->h;
    double h_step = p->scene->step, begin = cli_clock();
    rdl_report report = {.size = sizeof report};
    rdl_status status = RDL_OK;
    demo_scene_direct(p->scene, time);
    host_propose(h, h_step);
    p->result->host_seconds += cli_clock() - begin;
    p->result->solver_iterations += h->solver_used;
    if (p->options->respond) {
        p->doing = "a step";
        status = keep_memory(p);
        if (status == RDL_OK)
            status = host_resolve(h, p->engine, h_step, p->delivered, &report, &p->fault);
        if (status != RDL_OK)
            return status;
        count(p->result, &report, h->vertex_count);
    } else {
        memcpy(p->delivered, h->proposed, h->vertex_count * sizeof *p->delivered);
    }
    begin = cli_clock();
    rdl_shot_frame frame = {.time = time, .picture = picture, .verdict = (uint8_t)report.verdict,
                            .start = h->position[0], .proposed = h->proposed[0], .delivered = p->delivered[0],
                            .waypoint_count = report.waypoint_count, .waypoint_times = report.waypoint_times,
                            .waypoint_positions = report.waypoint_positions,
                            .memory = p->memory, .memory_bytes = p->memory_bytes, .duration = h_step};
    p->doing = p->options->shot;
    status = rdl_shot_append(p->writer, &frame, &p->fault);
    p->result->shot_seconds += cli_clock() - begin;
    if (p->stills)
        demo_stills_watch(p->stills, (const double (*)[3])p->delivered);
    begin = cli_clock();
    host_accept(h, h_step, (const double (*)[3])p->delivered, report.impulses, report.moved);
    if (p->options->respond && status == RDL_OK && !host_learn(h, &report, APPROACH))
        status = RDL_NO_MEMORY;
    p->result->host_seconds += cli_clock() - begin;
    p->result->steps++;
    return status;
}

static rdl_status play_pictures(player *p)
{
    size_t each = p->scene->steps_per_picture;
    for (size_t picture = 0; picture < p->options->pictures && !p->result->interrupted; picture++) {
        double begin = cli_clock();
        if (p->stills && !demo_stills_before(p->stills, picture))
            return RDL_NO_MEMORY;
        p->result->stills_seconds += cli_clock() - begin;
        for (size_t s = 0; s < each && !p->result->interrupted; s++) {
            rdl_status status = play_step(p, p->scene->step * (double)(picture * each + s + 1), (uint32_t)picture);
            if (status != RDL_OK)
                return status;
            p->result->interrupted = cli_interrupted();
            cli_progress("demo", picture * each + s + 1, p->options->pictures * each);
        }
        if (p->result->interrupted)
            break;
        p->result->pictures++;
        begin = cli_clock();
        p->doing = "the stills";
        rdl_status status = p->stills ? demo_stills_after(p->stills, picture, p->result) : RDL_OK;
        if (status != RDL_OK)
            return status;
        p->result->stills_seconds += cli_clock() - begin;
    }
    return RDL_OK;
}

int demo_play(demo_scene *scene, const demo_options *options, demo_result *result)
{
    player p = {.scene = scene, .options = options, .result = result, .doing = "the scene"};
    double begin = cli_clock();
    memset(result, 0, sizeof *result);
    rdl_status status = open_all(&p);
    if (status == RDL_OK)
        status = play_pictures(&p);
    if (p.writer && status == RDL_OK) {
        double closing = cli_clock();
        p.doing = options->shot;
        status = rdl_shot_finish(p.writer, &p.fault);
        result->shot_seconds += cli_clock() - closing;
    } else {
        rdl_shot_discard(p.writer);
    }
    cli_progress_end();
    demo_stills_end(p.stills);
    rdl_engine_destroy(p.engine);
    free(p.delivered);
    free(p.memory);
    result->total_seconds = cli_clock() - begin;
    return status == RDL_OK ? CLI_DONE : cli_fail("demo", p.doing, -1, status, &p.fault);
}
