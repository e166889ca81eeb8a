/* scenes/saboteurs.c: see saboteurs.h. Views here are tightly packed doubles. */
#include "saboteurs.h"

#include <math.h>
#include <string.h>

static void deliver(size_t vertex_count, const rdl_step *step, bool freeze, rdl_report *report)
{
    const double *start = step->start.data, *proposed = step->proposed.data;
    double (*delivered)[3] = step->delivered.data;
    size_t size = report->size;
    bool moved = false;
    for (size_t v = 0; v < vertex_count; v++) {
        memcpy(delivered[v], freeze && isfinite(step->mass[v]) ? start + 3 * v : proposed + 3 * v, sizeof delivered[v]);
        moved = moved || memcmp(delivered[v], proposed + 3 * v, sizeof delivered[v]) != 0;
    }
    memset(report, 0, sizeof *report);
    report->size = size;
    report->verdict = moved ? RDL_RESOLVED : RDL_CLEAR;
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
