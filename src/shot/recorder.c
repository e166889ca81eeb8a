/* shot/recorder.c: see raddle/recorder.h. Steps that may still be wanted wait in a ring whose slots keep their room, so
 * that a warm step allocates nothing. */
#include "raddle/recorder.h"

#include "base/memory.h"
#include "raddle/watch.h"

enum { BEFORE_MAX = 1 << 16 };

/* What a frame points at, copied. */
enum { PIECE_START, PIECE_PROPOSED, PIECE_DELIVERED, PIECE_TIMES, PIECE_PLACES, PIECE_MEMORY, PIECE_MASS, PIECE_MUTED,
       PIECE_COUNT };

typedef struct slot {
    rdl_shot_frame frame;
    rdli_room pieces[PIECE_COUNT];
} slot;

struct rdl_recorder {
    rdli_memory memory;
    rdl_engine *engine;
    rdl_shot_writer *writer;
    rdl_recorder_options options;
    size_t vertex_count, written;
    double *scene_mass; /* N */
    slot *ring;
    size_t ring_first, ring_count;
    double time, clock; /* of the next frame, where it was marked; sum of the durations */
    uint32_t picture;
    bool marked;
    rdl_status status;
    rdl_fault fault;
};

void rdl_recorder_options_default(rdl_recorder_options *options)
{
    *options = (rdl_recorder_options){.size = sizeof *options, .host_bits = RDL_FLOAT64, .deflate = 1};
}

static rdl_status check_options(const rdl_recorder_options *options, rdl_fault *fault)
{
    if (options->size < sizeof *options)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "size", 0);
    if ((options->triggers & ~255u) != 0)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "triggers", options->triggers);
    if (options->steps_before > BEFORE_MAX)
        return rdli_fault_set(fault, RDL_OUT_OF_RANGE, "steps_before", options->steps_before);
    if (!(options->seconds_above >= 0))
        return rdli_fault_set(fault, RDL_OUT_OF_RANGE, "seconds_above", 0);
    if (!(options->correction_above >= 0))
        return rdli_fault_set(fault, RDL_OUT_OF_RANGE, "correction_above", 0);
    return RDL_OK;
}

static void note(rdl_recorder *r, rdl_status status, const rdl_fault *fault)
{
    if (r->status != RDL_OK || status == RDL_OK)
        return;
    r->status = status;
    r->fault = *fault;
}

/* ---- frames ---- */

static rdl_shot_frame frame_of(const rdl_recorder *r, const rdl_watched_step *watched)
{
    const rdl_step *step = watched->step;
    const rdl_report *report = watched->report;
    bool same_mass = step->mass == NULL ||
                     memcmp(step->mass, r->scene_mass, r->vertex_count * sizeof(double)) == 0;
    return (rdl_shot_frame){.time = r->marked ? r->time : r->clock,
                            .picture = r->picture,
                            .verdict = (uint8_t)report->verdict,
                            .start = watched->start,
                            .proposed = watched->proposed,
                            .delivered = watched->delivered,
                            .waypoint_count = report->waypoint_count,
                            .waypoint_times = report->waypoint_times,
                            .waypoint_positions = report->waypoint_positions,
                            .memory = watched->memory,
                            .memory_bytes = watched->memory_bytes,
                            .duration = step->duration,
                            .seconds_max = step->seconds_max,
                            .passes_max = step->passes_max,
                            .mass = same_mass ? NULL : step->mass,
                            .muted_count = step->muted_count,
                            .muted_parts = step->muted_parts};
}

static const void *copy_piece(rdl_recorder *r, rdli_room *room, const void *data, size_t count, size_t item, bool *done)
{
    if (data == NULL || count == 0)
        return NULL;
    if (!*done || !rdli_room_reserve(&r->memory, room, count, item, false)) {
        *done = false;
        return NULL;
    }
    memcpy(room->data, data, count * item);
    return room->data;
}

static bool copy_frame(rdl_recorder *r, slot *s, const rdl_shot_frame *frame)
{
    bool done = true;
    size_t n = r->vertex_count, state = 3 * sizeof(double);
    s->frame = *frame;
    s->frame.start = copy_piece(r, &s->pieces[PIECE_START], frame->start, n, state, &done);
    s->frame.proposed = copy_piece(r, &s->pieces[PIECE_PROPOSED], frame->proposed, n, state, &done);
    s->frame.delivered = copy_piece(r, &s->pieces[PIECE_DELIVERED], frame->delivered, n, state, &done);
    s->frame.waypoint_times = copy_piece(r, &s->pieces[PIECE_TIMES], frame->waypoint_times, frame->waypoint_count,
                                         sizeof(double), &done);
    s->frame.waypoint_positions = copy_piece(r, &s->pieces[PIECE_PLACES], frame->waypoint_positions,
                                             frame->waypoint_count, n * state, &done);
    s->frame.memory = copy_piece(r, &s->pieces[PIECE_MEMORY], frame->memory, frame->memory_bytes, 1, &done);
    s->frame.mass = copy_piece(r, &s->pieces[PIECE_MASS], frame->mass, n, sizeof(double), &done);
    s->frame.muted_parts = copy_piece(r, &s->pieces[PIECE_MUTED], frame->muted_parts, frame->muted_count,
                                      2 * sizeof(uint32_t), &done);
    return done;
}

static void write_frame(rdl_recorder *r, const rdl_shot_frame *frame)
{
    rdl_fault fault = {0, ""};
    rdl_status status = rdl_shot_append(r->writer, frame, &fault);
    note(r, status, &fault);
    r->written += status == RDL_OK;
}

static void write_ring(rdl_recorder *r)
{
    for (size_t k = 0; k < r->ring_count && r->status == RDL_OK; k++)
        write_frame(r, &r->ring[(r->ring_first + k) % r->options.steps_before].frame);
    r->ring_count = 0;
}

static void keep_in_ring(rdl_recorder *r, const rdl_shot_frame *frame)
{
    size_t room = r->options.steps_before;
    if (room == 0)
        return;
    if (r->ring_count == room) {
        r->ring_first = (r->ring_first + 1) % room;
        r->ring_count--;
    }
    const rdl_fault fault = {0, "steps_before"};
    if (copy_frame(r, &r->ring[(r->ring_first + r->ring_count) % room], frame))
        r->ring_count++;
    else
        note(r, RDL_NO_MEMORY, &fault);
}

static bool is_picked(const rdl_recorder_options *options, const rdl_report *report)
{
    static const unsigned verdicts[] = {0, RDL_TRIGGER_RESOLVED, RDL_TRIGGER_PINCHED, RDL_TRIGGER_TANGLED};
    unsigned raised = verdicts[report->verdict];
    raised |= report->held_count > 0 ? RDL_TRIGGER_HELD : 0;
    raised |= report->seconds[RDL_TIME_TOTAL] > options->seconds_above ? RDL_TRIGGER_SECONDS : 0;
    raised |= report->worst_correction > options->correction_above ? RDL_TRIGGER_CORRECTION : 0;
    raised |= report->passes > options->passes_above ? RDL_TRIGGER_PASSES : 0;
    return (raised & options->triggers) != 0;
}

static void on_step(void *user, const rdl_watched_step *watched)
{
    rdl_recorder *r = user;
    const rdl_fault other_format = {0, "delivered"};
    r->clock += watched->step->duration;
    if (r->status == RDL_OK && watched->step->delivered.format != r->options.host_bits)
        note(r, RDL_BAD_ARGUMENT, &other_format);
    if (r->status != RDL_OK)
        return;
    const rdl_shot_frame frame = frame_of(r, watched);
    if (r->options.triggers == 0) {
        write_frame(r, &frame);
    } else if (is_picked(&r->options, watched->report)) {
        write_ring(r);
        if (r->status == RDL_OK)
            write_frame(r, &frame);
    } else {
        keep_in_ring(r, &frame);
    }
}

/* ---- life ---- */

static void release(rdl_recorder *r)
{
    rdli_memory memory = r->memory;
    rdl_engine_unwatch(r->engine, r);
    for (size_t k = 0; r->ring != NULL && k < r->options.steps_before; k++)
        for (size_t p = 0; p < PIECE_COUNT; p++)
            rdli_room_release(&memory, &r->ring[k].pieces[p]);
    rdli_give(&memory, r->ring, r->options.steps_before, sizeof(slot));
    rdli_give(&memory, r->scene_mass, r->vertex_count, sizeof(double));
    rdli_give(&memory, r, 1, sizeof *r);
}

static rdl_recorder *new_recorder(rdl_engine *engine, const rdl_scene *scene, const rdl_recorder_options *options)
{
    rdli_memory memory;
    if (rdli_memory_init(&memory, NULL) != RDL_OK)
        return NULL;
    rdl_recorder *r = rdli_take(&memory, 1, sizeof *r);
    if (r == NULL)
        return NULL;
    memset(r, 0, sizeof *r);
    r->memory = memory;
    r->engine = engine;
    r->options = *options;
    r->options.created_by = NULL;
    r->vertex_count = scene->vertex_count;
    r->scene_mass = rdli_take(&r->memory, scene->vertex_count, sizeof(double));
    size_t room = options->steps_before;
    r->ring = room > 0 ? rdli_take(&r->memory, room, sizeof(slot)) : NULL;
    if (r->ring != NULL)
        memset(r->ring, 0, room * sizeof(slot));
    if (r->scene_mass == NULL || (room > 0 && r->ring == NULL)) {
        release(r);
        return NULL;
    }
    memcpy(r->scene_mass, scene->mass, scene->vertex_count * sizeof(double));
    return r;
}

static rdl_status attach(rdl_recorder *r)
{
    const rdl_watch watch = {.size = sizeof watch, .user = r, .stepped = on_step};
    return rdl_engine_watch(r->engine, &watch);
}

rdl_status rdl_recorder_create(const char *path, rdl_engine *engine, const rdl_scene *scene,
                               const rdl_recorder_options *options, rdl_recorder **recorder, rdl_fault *fault)
{
    rdl_recorder_options defaults;
    rdl_shot_options shot;
    rdl_shot_writer *writer = NULL;
    rdl_settings settings;
    rdl_recorder_options_default(&defaults);
    options = options != NULL ? options : &defaults;
    if (engine == NULL || recorder == NULL)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, engine == NULL ? "engine" : "recorder", 0);
    rdl_status status = check_options(options, fault);
    if (status != RDL_OK)
        return status;
    rdl_engine_settings(engine, &settings);
    rdl_shot_options_default(&shot);
    shot.host_bits = options->host_bits;
    shot.deflate = options->deflate;
    shot.overwrite = options->overwrite;
    shot.created_by = options->created_by;
    shot.settings = &settings;
    status = rdl_shot_create(path, scene, &shot, &writer, fault);
    if (status != RDL_OK)
        return status;
    rdl_recorder *r = new_recorder(engine, scene, options);
    status = r != NULL ? attach(r) : RDL_NO_MEMORY;
    if (status != RDL_OK) {
        rdl_shot_discard(writer);
        if (r != NULL)
            release(r);
        return status;
    }
    r->writer = writer;
    *recorder = r;
    return RDL_OK;
}

void rdl_recorder_mark(rdl_recorder *recorder, double time, uint32_t picture)
{
    if (recorder == NULL)
        return;
    recorder->marked = true;
    recorder->time = time;
    recorder->picture = picture;
}

rdl_status rdl_recorder_dump(rdl_recorder *recorder, rdl_fault *fault)
{
    if (recorder == NULL)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "recorder", 0);
    if (recorder->status == RDL_OK)
        write_ring(recorder);
    return rdl_recorder_state(recorder, NULL, fault);
}

rdl_status rdl_recorder_state(const rdl_recorder *recorder, size_t *recorded, rdl_fault *fault)
{
    if (recorder == NULL)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "recorder", 0);
    if (recorded != NULL)
        *recorded = recorder->written;
    if (recorder->status != RDL_OK && fault != NULL)
        *fault = recorder->fault;
    return recorder->status;
}

rdl_status rdl_recorder_finish(rdl_recorder *recorder, rdl_fault *fault)
{
    rdl_status status = rdl_recorder_state(recorder, NULL, fault);
    if (recorder == NULL)
        return status;
    if (status != RDL_OK)
        rdl_shot_keep(recorder->writer);
    else if (recorder->options.triggers != 0 && recorder->written == 0)
        rdl_shot_discard(recorder->writer);
    else
        status = rdl_shot_finish(recorder->writer, fault);
    release(recorder);
    return status;
}

void rdl_recorder_keep(rdl_recorder *recorder)
{
    if (recorder == NULL)
        return;
    rdl_shot_keep(recorder->writer);
    release(recorder);
}

void rdl_recorder_discard(rdl_recorder *recorder)
{
    if (recorder == NULL)
        return;
    rdl_shot_discard(recorder->writer);
    release(recorder);
}
