/* driver/step.c: one step of the host: pieces, escalation beyond the zones, way-points. The order of levels is
 *   zones (advance.c) -> shorter pieces from the last certified state -> squeezed floors -> hold at the last certified state,
 * and every level is verified by detection on the rounded bits. */
#include "base/rounding.h"
#include "driver/engine.h"
#include "driver/stages.h"

/* The shortest piece. Below 1/64 of a step a piece moves driven vertices so little that a zone fails for want of room, not
 * for want of time resolution (common practice: hosts take 1 to 10 steps a picture). */
static const double piece_min = 0x1p-6;
/* Where there is no room floors shrink by this factor at a time, down to piece-wise hold. */
static const double squeeze_factor = 0.25, squeeze_min = 0x1p-10;

typedef struct course {
    double reached, length; /* shares of the step: certified so far, length of the next piece */
    uint64_t failures;
    bool first;
} course;

static void aim_piece(rdl_engine *engine, const course *c)
{
    const double (*start)[3] = engine->start.data, (*proposed)[3] = engine->proposed.data;
    const double (*from)[3] = engine->piece_start.data;
    double (*target)[3] = engine->target.data;
    const uint8_t *driven = engine->driven.data, *fixed = engine->fixed.data;
    double left = 1.0 - c->reached, end = c->reached + c->length;
    bool last = c->length >= left;
    for (uint32_t v = 0; v < engine->mesh.vertex_count; v++)
        for (int k = 0; k < 3; k++) {
            double x = proposed[v][k];
            if (fixed[v] && !driven[v])
                x = from[v][k];
            else if (!last && driven[v])
                x = start[v][k] + end * (proposed[v][k] - start[v][k]);
            else if (!last)
                x = from[v][k] + c->length / left * (proposed[v][k] - from[v][k]);
            target[v][k] = rdli_round_to(engine->format, x);
        }
}

static rdl_status keep_waypoint(rdl_engine *engine, double time)
{
    size_t n = engine->mesh.vertex_count, w = engine->waypoint_count;
    if (!rdli_room_reserve(&engine->memory, &engine->waypoint_times, w + 1, sizeof(double), true)
        || !rdli_room_reserve(&engine->memory, &engine->waypoint_positions, (w + 1) * n, 3 * sizeof(double), true))
        return RDL_NO_MEMORY;
    ((double *)engine->waypoint_times.data)[w] = time;
    memcpy((double (*)[3])engine->waypoint_positions.data + w * n, engine->trial.data, n * 3 * sizeof(double));
    engine->waypoint_count++;
    return RDL_OK;
}

/* Acts on the zones that the last piece could not settle: less room for their pairs, or none at all. */
static void give_way(rdl_engine *engine, bool hold_now)
{
    const rdli_zone *zones = engine->response.zones.data;
    const uint32_t *vertices = engine->response.zone_vertices.data;
    double *squeeze = engine->squeeze.data;
    uint8_t *fixed = engine->fixed.data;
    for (uint32_t z = 0; z < engine->response.zone_count; z++) {
        if (!zones[z].violated && !zones[z].infeasible)
            continue;
        for (uint32_t i = 0; i < zones[z].vertex_count; i++) {
            uint32_t v = vertices[zones[z].vertex_first + i];
            squeeze[v] *= squeeze_factor;
            /* Zones without driven vertices have room: holding them gives up time, not thickness. */
            if (hold_now || !zones[z].driven || squeeze[v] < squeeze_min)
                fixed[v] = 1;
        }
    }
}

static void hold_everything(rdl_engine *engine)
{
    memset(engine->fixed.data, 1, engine->mesh.vertex_count);
}

static rdl_status accept_piece(rdl_engine *engine, course *c, const rdli_piece *piece)
{
    rdl_status status = rdli_outcome_piece(engine, piece, c->length);
    double end = c->reached + c->length;
    if (status == RDL_OK && end < 1.0)
        status = keep_waypoint(engine, end);
    if (status != RDL_OK)
        return status;
    c->reached = end;
    c->first = false;
    c->length = fmin(2.0 * c->length, 1.0 - end);
    if (end < 1.0)
        memcpy(engine->piece_start.data, engine->trial.data, engine->mesh.vertex_count * 3 * sizeof(double));
    return RDL_OK;
}

static void retreat(rdl_engine *engine, course *c, uint64_t budget)
{
    c->failures++;
    bool spent = engine->attempts >= budget;
    if (!spent && c->length > piece_min) {
        c->length *= 0.5;
        return;
    }
    if (engine->attempts >= 2 * budget + 16)
        hold_everything(engine);
    else
        give_way(engine, spent);
}

static uint64_t passes_left(const rdl_engine *engine, const rdl_step *step, double begun)
{
    uint64_t limit = (uint64_t)engine->settings.passes_max;
    if (step->passes_max > 0) {
        uint64_t left = step->passes_max > engine->passes ? step->passes_max - engine->passes : 0;
        limit = left < limit ? left : limit;
    }
    if (step->seconds_max > 0.0 && rdli_now() - begun > step->seconds_max)
        limit = 0;
    return limit;
}

static void load_step(rdl_engine *engine)
{
    size_t n = engine->mesh.vertex_count;
    double *squeeze = engine->squeeze.data;
    memcpy(engine->fixed.data, engine->driven.data, n);
    memcpy(engine->piece_start.data, engine->start.data, n * 3 * sizeof(double));
    for (size_t v = 0; v < n; v++)
        squeeze[v] = 1.0;
    rdli_outcome_begin(engine);
}

static rdl_status run_pieces(rdl_engine *engine, const rdl_step *step)
{
    size_t n = engine->mesh.vertex_count;
    course c = { 0.0, 1.0, 0, true };
    double begun = rdli_now();
    rdli_piece piece = { .vertex_count = engine->mesh.vertex_count, .fixed = engine->fixed.data, .mass = engine->mass.data,
        .start = engine->piece_start.data, .target = engine->target.data, .trial = engine->trial.data,
        .format = engine->format, .aim_margin = engine->settings.aim_margin,
        .sweeps_max = (uint32_t)engine->settings.solver_sweeps };
    while (c.reached < 1.0) {
        aim_piece(engine, &c);
        memcpy(engine->trial.data, engine->target.data, n * 3 * sizeof(double));
        uint64_t limit = passes_left(engine, step, begun);
        piece.shortest = c.length <= piece_min || engine->attempts >= (uint64_t)engine->settings.substeps_max;
        bool apart;
        rdl_status status = rdli_advance(engine, &piece, c.first, limit, &apart);
        engine->attempts++;
        if (status == RDL_OK && apart)
            status = accept_piece(engine, &c, &piece);
        else if (status == RDL_OK && limit == 0)
            give_way(engine, true); /* out of budget: straight to the safe level */
        else if (status == RDL_OK)
            retreat(engine, &c, (uint64_t)engine->settings.substeps_max);
        if (status != RDL_OK)
            return status;
    }
    return RDL_OK;
}

rdl_status rdli_step_run(rdl_engine *engine, const rdl_step *step, rdl_verdict *verdict)
{
    load_step(engine);
    rdl_status status = rdli_history_begin(engine);
    if (status == RDL_OK)
        status = run_pieces(engine, step);
    if (status == RDL_OK)
        status = rdli_verify(engine);
    if (status == RDL_OK)
        status = rdli_history_end(engine);
    if (status == RDL_OK)
        status = rdli_outcome_end(engine, step->duration, verdict);
    return status;
}
