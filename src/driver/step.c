/* driver/step.c: one step of the host: pieces, escalation beyond the zones, way-points. The order of levels is
 *   zones (advance.c) -> shorter pieces from the last certified state -> squeezed floors -> hold at the last certified state,
 * and every level is verified by detection on the rounded bits. */
#include "base/rounding.h"
#include "base/vector.h"
#include "driver/engine.h"
#include "driver/stages.h"
#include "driver/watch.h"

/* The shortest piece. Below 1/64 of a step a piece moves driven vertices so little that a zone fails for want of room, not
 * for want of time resolution (common practice: hosts take 1 to 10 steps a picture). */
static const double piece_min = 0x1p-6;
/* Pieces above this length are cut when they go deep (advance.c): eight of them cost less than one deep tangle of planes. */
static const double long_piece = 0x1p-3;
/* Where there is no room floors shrink by this factor at a time, down to piece-wise hold. */
static const double squeeze_factor = 0.25, squeeze_min = 0x1p-10;

typedef struct course {
    double reached, length; /* shares of the step: certified so far, length of the next piece */
    uint64_t failures;
    bool first;
} course;

/* Where the piece is to end. Vertices on their proposed path stay on it. One that was moved off goes on with the velocity that
 * the impulses left it: heading back for its proposed end would feed energy that the contact had taken (the mean of
 * velocities that only lose energy has no more of it than the first). */
static void aim_piece(rdl_engine *engine, const course *c)
{
    const double (*start)[3] = engine->start.data, (*proposed)[3] = engine->proposed.data;
    const double (*from)[3] = engine->piece_start.data, (*velocity)[3] = engine->velocity.data;
    double (*target)[3] = engine->target.data;
    const uint8_t *driven = engine->driven.data, *fixed = engine->fixed.data, *touched = engine->touched.data;
    double end = c->reached + c->length;
    bool last = end >= 1.0;
    for (uint32_t v = 0; v < engine->mesh.vertex_count; v++)
        for (int k = 0; k < 3; k++) {
            double x = proposed[v][k];
            if (fixed[v] && !driven[v])
                x = from[v][k];
            else if (touched[v])
                x = from[v][k] + c->length * velocity[v][k];
            else if (!last)
                x = start[v][k] + end * (proposed[v][k] - start[v][k]);
            target[v][k] = rdli_round_to(engine->format, x);
        }
}

/* Moved, or given an impulse: either way the proposed path is no longer its own. */
static void mark_touched(rdl_engine *engine)
{
    const double (*target)[3] = engine->target.data, (*trial)[3] = engine->trial.data;
    const double (*start)[3] = engine->start.data, (*proposed)[3] = engine->proposed.data;
    const double (*velocity)[3] = engine->velocity.data;
    uint8_t *touched = engine->touched.data;
    for (uint32_t v = 0; v < engine->mesh.vertex_count; v++) {
        double meant[3];
        rdli_subtract(proposed[v], start[v], meant);
        if (memcmp(target[v], trial[v], sizeof target[v]) != 0 || memcmp(meant, velocity[v], sizeof meant) != 0)
            touched[v] = 1;
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

static bool must_give_way(const rdli_zone *zone)
{
    return zone->violated || zone->infeasible;
}

enum { PUT_BACK = 1, SQUEEZED = 2 };

/* Puts the vertices of the unsettled zones back to the start of the piece and looks again. marks: PUT_BACK, or SQUEEZED for
 * those of a pair that would not keep its floor against driven or held vertices even so. Pairs with vertices that still
 * move are no reason: they will have to give way to what is held. */
static rdl_status find_squeezed(rdl_engine *engine, const rdli_piece *piece, bool first, uint8_t *marks)
{
    const rdli_zone *zones = engine->response.zones.data;
    const uint32_t *vertices = engine->response.zone_vertices.data;
    memset(marks, 0, piece->vertex_count);
    for (uint32_t z = 0; z < engine->response.zone_count; z++)
        for (uint32_t i = 0; must_give_way(&zones[z]) && i < zones[z].vertex_count; i++) {
            uint32_t v = vertices[zones[z].vertex_first + i];
            memcpy(piece->trial[v], piece->start[v], sizeof piece->trial[v]);
            marks[v] = PUT_BACK;
        }
    rdli_look look = { .from = piece->start, .to = (const double (*)[3])piece->trial, .awake = marks,
        .fixed = piece->fixed, .squeeze = engine->squeeze.data, .first_piece = first };
    rdl_status status = rdli_detect(engine, &look);
    const rdli_hit *hits = engine->hits.data;
    for (size_t h = 0; status == RDL_OK && h < engine->hit_count; h++) {
        bool stands = !hits[h].contact_at_start;
        for (int k = 0; k < 4; k++)
            stands = stands && (piece->fixed[hits[h].vertex[k]] || marks[hits[h].vertex[k]] != 0);
        for (int k = 0; stands && k < 4; k++)
            if (!piece->fixed[hits[h].vertex[k]])
                marks[hits[h].vertex[k]] = SQUEEZED;
    }
    return status;
}

/* Acts on the zones that the last piece could not settle. Where holding them at the start of the piece keeps every floor,
 * they are held: that gives up time, not thickness. Otherwise driven vertices press on them, and there is less room for
 * their pairs, or none at all. */
static rdl_status give_way(rdl_engine *engine, const rdli_piece *piece, bool first, bool hold_now)
{
    uint8_t *marks = engine->awake.data, *fixed = engine->fixed.data;
    double *squeeze = engine->squeeze.data;
    rdl_status status = find_squeezed(engine, piece, first, marks);
    const rdli_zone *zones = engine->response.zones.data;
    const uint32_t *vertices = engine->response.zone_vertices.data;
    for (uint32_t z = 0; status == RDL_OK && z < engine->response.zone_count; z++) {
        const uint32_t *mine = vertices + zones[z].vertex_first;
        bool squeezed = false;
        if (!must_give_way(&zones[z]))
            continue;
        for (uint32_t i = 0; i < zones[z].vertex_count; i++)
            squeezed = squeezed || marks[mine[i]] == SQUEEZED;
        for (uint32_t i = 0; i < zones[z].vertex_count; i++) {
            squeeze[mine[i]] *= squeezed ? squeeze_factor : 1.0;
            if (!squeezed || hold_now || squeeze[mine[i]] < squeeze_min)
                fixed[mine[i]] = 1;
        }
    }
    return status;
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
    mark_touched(engine);
    rdli_watch_piece(engine, RDL_PIECE_ACCEPTED, end, c->length);
    c->reached = end;
    c->first = false;
    c->length = fmin(2.0 * c->length, 1.0 - end);
    if (end < 1.0)
        memcpy(engine->piece_start.data, engine->trial.data, engine->mesh.vertex_count * 3 * sizeof(double));
    return RDL_OK;
}

static rdl_status retreat(rdl_engine *engine, course *c, const rdli_piece *piece, uint64_t budget)
{
    c->failures++;
    bool spent = engine->attempts >= budget;
    if (!spent && c->length > piece_min) {
        rdli_watch_piece(engine, RDL_PIECE_SHORTENED, c->reached, c->length);
        c->length *= 0.5;
        return RDL_OK;
    }
    bool held = engine->attempts >= 2 * budget + 16;
    rdli_watch_piece(engine, held ? RDL_PIECE_HELD : RDL_PIECE_GIVES_WAY, c->reached, c->length);
    if (!held)
        return give_way(engine, piece, c->first, spent);
    hold_everything(engine);
    return RDL_OK;
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
    memset(engine->touched.data, 0, n);
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
        piece.long_piece = c.length > long_piece && limit > 1;
        bool apart;
        rdl_status status = rdli_advance(engine, &piece, c.first, limit, &apart);
        engine->attempts++;
        if (status == RDL_OK && apart)
            status = accept_piece(engine, &c, &piece);
        else if (status == RDL_OK && limit == 0)
            status = give_way(engine, &piece, c.first, true); /* out of budget: straight to the safe level */
        else if (status == RDL_OK)
            status = retreat(engine, &c, &piece, (uint64_t)engine->settings.substeps_max);
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
