/* scenario.c: see scenario.h. */
#include "scenario.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "cli.h"

/* The length of a step that the shot does not say: to it from the one before; of the first, to the next. */
static rdl_status guess_duration(rdl_shot *shot, size_t frame, double *duration, rdl_fault *fault)
{
    rdl_shot_frame before = {0}, after = {0};
    size_t count = rdl_shot_describe(shot)->frame_count, first = frame > 0 ? frame - 1 : 0;
    *duration = 1.0 / 24;
    if (first + 1 >= count)
        return RDL_OK;
    rdl_status status = rdl_shot_read_frame(shot, first, &before, fault);
    double from = before.time;
    if (status == RDL_OK)
        status = rdl_shot_read_frame(shot, first + 1, &after, fault);
    if (status == RDL_OK && after.time - from > 0 && isfinite(after.time - from))
        *duration = after.time - from;
    return status;
}

static bool copy(void **to, const void *from, size_t bytes)
{
    if (from == NULL || bytes == 0)
        return true;
    *to = malloc(bytes);
    if (*to != NULL)
        memcpy(*to, from, bytes);
    return *to != NULL;
}

static rdl_status read_rules(scenario *s, rdl_shot *shot, rdl_fault *fault)
{
    double duration = 0;
    rdl_status status = guess_duration(shot, s->frame, &duration, fault);
    if (status == RDL_OK)
        status = rdl_shot_read_frame(shot, s->frame, &s->recorded, fault);
    if (status != RDL_OK)
        return status;
    rdl_shot_frame *frame = &s->recorded;
    if (!(frame->duration > 0))
        frame->duration = duration;
    if (!copy(&s->memory, frame->memory, frame->memory_bytes) ||
        !copy((void **)&s->mass, frame->mass, s->scene.vertex_count * sizeof(double)) ||
        !copy((void **)&s->muted, frame->muted_parts, frame->muted_count * sizeof *s->muted))
        return RDL_NO_MEMORY;
    frame->memory = s->memory;
    frame->mass = s->mass;
    frame->muted_parts = (const uint32_t(*)[2])s->muted;
    frame->waypoint_count = 0;
    frame->waypoint_times = frame->waypoint_positions = NULL;
    return RDL_OK;
}

static rdl_status read_states(scenario *s, rdl_shot *shot, bool poses, rdl_fault *fault)
{
    unsigned first = poses ? RDL_SHOT_DELIVERED : RDL_SHOT_START;
    unsigned second = poses ? RDL_SHOT_DELIVERED : RDL_SHOT_PROPOSED;
    rdl_status status = rdl_shot_read_positions(shot, poses ? s->frame - 1 : s->frame, first, s->start, fault);
    if (status == RDL_OK)
        status = rdl_shot_read_positions(shot, s->frame, second, s->proposed, fault);
    if (status == RDL_OK && s->has_delivered)
        status = rdl_shot_read_positions(shot, s->frame, RDL_SHOT_DELIVERED, s->delivered, fault);
    return status;
}

rdl_status scenario_read(scenario *s, rdl_shot *shot, size_t frame, rdl_fault *fault)
{
    const rdl_shot_info *about = rdl_shot_describe(shot);
    unsigned steps = RDL_SHOT_START | RDL_SHOT_PROPOSED;
    bool poses = (about->contents & steps) != steps;
    memset(s, 0, sizeof *s);
    s->scene = *rdl_shot_scene(shot);
    s->settings = about->settings;
    s->host_bits = about->host_bits;
    s->frame = frame;
    s->has_delivered = !poses && (about->contents & RDL_SHOT_DELIVERED) != 0;
    s->has_verdict = !poses && (about->contents & RDL_SHOT_VERDICT) != 0;
    s->has_memory = !poses && (about->contents & RDL_SHOT_MEMORY) != 0;
    size_t bytes = 3 * s->scene.vertex_count * sizeof(double);
    s->start = malloc(bytes);
    s->proposed = malloc(bytes);
    s->delivered = malloc(bytes);
    rdl_status status = s->start != NULL && s->proposed != NULL && s->delivered != NULL ? RDL_OK : RDL_NO_MEMORY;
    if (status == RDL_OK)
        status = read_rules(s, shot, fault);
    if (status == RDL_OK)
        status = read_states(s, shot, poses, fault);
    if (status != RDL_OK)
        scenario_release(s);
    return status;
}

void scenario_release(scenario *s)
{
    free(s->start);
    free(s->proposed);
    free(s->delivered);
    free(s->memory);
    free(s->mass);
    free(s->muted);
    memset(s, 0, sizeof *s);
}

static void take_events(void *user, const rdl_event *events, size_t count)
{
    event_list *list = user;
    if (list->count + count > list->room && !list->full) {
        size_t room = 2 * list->room + count + 1024;
        rdl_event *grown = realloc(list->rows, room * sizeof *grown);
        list->full = grown == NULL;
        if (grown != NULL) {
            list->rows = grown;
            list->room = room;
        }
    }
    if (list->full)
        return;
    memcpy(list->rows + list->count, events, count * sizeof *events);
    list->count += count;
}

rdl_status stepper_create(stepper *made, const scenario *first, const rdl_settings *settings, unsigned threads,
                          bool wants_events, rdl_fault *fault)
{
    const rdl_host host = {.size = sizeof host, .threads = threads, .cancel = cli_cancel};
    size_t n = first->scene.vertex_count;
    memset(made, 0, sizeof *made);
    made->wants_events = wants_events;
    made->vertex_count = n;
    made->narrow = malloc(3 * n * sizeof(float));
    made->result.delivered = malloc(3 * n * sizeof(double));
    rdl_status status = made->narrow != NULL && made->result.delivered != NULL ? RDL_OK : RDL_NO_MEMORY;
    if (status == RDL_OK)
        status = rdl_engine_create(&first->scene, settings, &host, &made->engine, fault);
    if (status != RDL_OK)
        stepper_release(made);
    return status;
}

rdl_status stepper_run(stepper *st, const scenario *s, bool keep, rdl_fault *fault)
{
    const rdl_shot_frame *frame = &s->recorded;
    bool narrow = s->host_bits == RDL_FLOAT32;
    rdl_step step = {.size = sizeof step,
                     .start = {s->start, 0, RDL_FLOAT64},
                     .proposed = {s->proposed, 0, RDL_FLOAT64},
                     .duration = frame->duration,
                     .mass = frame->mass,
                     .muted_count = frame->muted_count,
                     .muted_parts = frame->muted_parts,
                     .seconds_max = frame->seconds_max,
                     .passes_max = frame->passes_max};
    step.delivered = narrow ? (rdl_output_view){st->narrow, 0, RDL_FLOAT32}
                            : (rdl_output_view){st->result.delivered, 0, RDL_FLOAT64};
    rdl_status status = RDL_OK;
    if (s->has_memory && frame->memory_bytes > 0)
        status = rdl_engine_memory_write(st->engine, frame->memory, frame->memory_bytes);
    else if (s->has_memory || !keep)
        status = rdl_engine_reset(st->engine);
    if (status == RDL_BAD_MEMORY && fault != NULL)
        *fault = (rdl_fault){s->frame, "frames/memory"};
    st->events.count = 0;
    st->events.full = false;
    const rdl_watch watch = {.size = sizeof watch, .user = &st->events, .events = take_events};
    if (status == RDL_OK && st->wants_events)
        status = rdl_engine_watch(st->engine, &watch);
    st->result.report = (rdl_report){.size = sizeof st->result.report};
    if (status == RDL_OK)
        status = rdl_engine_step(st->engine, &step, &st->result.report, fault);
    rdl_engine_unwatch(st->engine, &st->events);
    for (size_t i = 0; narrow && status == RDL_OK && i < 3 * st->vertex_count; i++)
        st->result.delivered[i] = (double)st->narrow[i];
    return status == RDL_OK && st->events.full ? RDL_NO_MEMORY : status;
}

void stepper_release(stepper *st)
{
    rdl_engine_destroy(st->engine);
    free(st->narrow);
    free(st->result.delivered);
    free(st->events.rows);
    memset(st, 0, sizeof *st);
}
