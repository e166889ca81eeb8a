/* scenes/saboteurs.c: see saboteurs.h. Views here are tightly packed doubles. */
#include "saboteurs.h"

#include <math.h>
#include <string.h>

/* Honest about what is held, so that only the rules about freezing can catch it. */
static void deliver(size_t vertex_count, const rdl_step *step, bool freeze, rdl_report *report)
{
    static uint32_t held[WORLD_VERTICES];
    const double *start = step->start.data, *proposed = step->proposed.data;
    double (*delivered)[3] = step->delivered.data;
    size_t size = report->size;
    size_t held_count = 0;
    for (size_t v = 0; v < vertex_count; v++) {
        memcpy(delivered[v], freeze && isfinite(step->mass[v]) ? start + 3 * v : proposed + 3 * v, sizeof delivered[v]);
        if (memcmp(delivered[v], proposed + 3 * v, sizeof delivered[v]) != 0)
            held[held_count++] = (uint32_t)v;
    }
    memset(report, 0, sizeof *report);
    report->size = size;
    report->verdict = held_count > 0 ? RDL_RESOLVED : RDL_CLEAR;
    report->held = held;
    report->held_count = held_count;
}

rdl_status saboteur_start(rdl_engine *engine, size_t vertex_count, const rdl_step *step, rdl_report *report,
                          rdl_fault *fault)
{
    (void)engine;
    (void)fault;
    deliver(vertex_count, step, true, report);
    return RDL_OK;
}

rdl_status saboteur_proposed(rdl_engine *engine, size_t vertex_count, const rdl_step *step, rdl_report *report,
                             rdl_fault *fault)
{
    (void)engine;
    (void)fault;
    deliver(vertex_count, step, false, report);
    return RDL_OK;
}
