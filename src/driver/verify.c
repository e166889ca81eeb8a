/* driver/verify.c: the delivered path once more, from nothing, at the true floors. */
#include "driver/stages.h"

static rdl_status judge_hit(rdl_engine *engine, const rdli_hit *hit, const double (*from)[3], const double (*to)[3])
{
    if (hit->contact_at_start)
        return rdli_name_pair(engine, hit->kind, hit->first, hit->second, RDL_WHY_CONTACT_AT_START);
    bool driven = false;
    for (int k = 0; k < 4; k++)
        driven = driven || engine->mesh.driven[hit->vertex[k]];
    const double *squeeze = engine->squeeze.data;
    for (int k = 0; k < 4; k++)
        driven = driven || squeeze[hit->vertex[k]] < 1.0;
    rdl_status status = rdli_name_pair(engine, hit->kind, hit->first, hit->second,
                                       driven ? RDL_WHY_NO_ROOM : RDL_WHY_BUDGET);
    if (status != RDL_OK || !hit->reaches_path)
        return status;
    rdl_motion motion;
    rdl_touch touch;
    for (int k = 0; k < 4; k++) {
        memcpy(motion.start[k], from[hit->vertex[k]], sizeof motion.start[k]);
        memcpy(motion.end[k], to[hit->vertex[k]], sizeof motion.end[k]);
    }
    rdli_find_touch((int)hit->kind, &motion, 0.0, &touch);
    return touch.touches ? rdli_remember_crossing(engine, hit, from) : RDL_OK;
}

static rdl_status verify_piece(rdl_engine *engine, const double (*from)[3], const double (*to)[3], bool first)
{
    rdli_look look = { .from = from, .to = to, .fixed = engine->mesh.driven, .first_piece = first };
    rdl_status status = rdli_detect(engine, &look);
    const rdli_hit *hits = engine->hits.data;
    for (size_t h = 0; status == RDL_OK && h < engine->hit_count; h++)
        status = judge_hit(engine, &hits[h], from, to);
    return status;
}

rdl_status rdli_verify(rdl_engine *engine)
{
    size_t n = engine->mesh.vertex_count;
    const double (*at)[3] = engine->start.data;
    bool untouched = memcmp(engine->trial.data, engine->proposed.data, n * 3 * sizeof(double)) == 0;
    /* The pass loop's only detection was already this one. */
    if (untouched && engine->passes == 1 && engine->violation_count == 0)
        return RDL_OK;
    double seconds[RDL_TIME_COUNT];
    memcpy(seconds, engine->seconds, sizeof seconds);
    rdli_counts counts = engine->counts;
    double begun = rdli_now();
    rdl_status status = RDL_OK;
    for (size_t w = 0; status == RDL_OK && w <= engine->waypoint_count; w++) {
        const double (*to)[3] = w < engine->waypoint_count
            ? (const double (*)[3])((double (*)[3])engine->waypoint_positions.data + w * n)
            : (const double (*)[3])engine->trial.data;
        status = verify_piece(engine, at, to, w == 0);
        at = to;
    }
    memcpy(engine->seconds, seconds, sizeof seconds);
    engine->counts = counts;
    engine->seconds[RDL_TIME_VERIFY] += rdli_now() - begun;
    return status;
}
