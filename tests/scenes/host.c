/* scenes/host.c: see host.h. Only products of lengths with pure numbers: a scaled world moves in scaled bits. */
#include "host.h"

#include <math.h>
#include <string.h>

static void relax(const world *w, const world_link *link, double (*x)[3])
{
    double wa = 1.0 / w->mass[link->a], wb = 1.0 / w->mass[link->b], d[3], square = 0.0;
    if (wa + wb == 0.0)
        return;
    for (int k = 0; k < 3; k++) {
        d[k] = x[link->b][k] - x[link->a][k];
        square += d[k] * d[k];
    }
    double length = sqrt(square);
    if (length == 0.0 || (link->pull_only && length <= link->rest))
        return;
    double share = link->give * (length - link->rest) / (length * (wa + wb));
    for (int k = 0; k < 3; k++) {
        x[link->a][k] += wa * share * d[k];
        x[link->b][k] -= wb * share * d[k];
    }
}

void host_propose(const world *w, double (*proposed)[3])
{
    for (uint32_t i = 0; i < w->vertex_count; i++)
        for (int k = 0; k < 3 && !world_is_driven(w, i); k++)
            proposed[i][k] = w->x[i][k] + w->duration * w->v[i][k] + w->duration * w->duration * w->gravity[k];
    for (int pass = 0; pass < w->relax_passes; pass++)
        for (size_t i = 0; i < w->link_count; i++)
            relax(w, &w->links[i], proposed);
}

void host_round(const world *w, double (*proposed)[3])
{
    for (size_t i = 0; i < w->vertex_count && w->format == RDL_FLOAT32; i++)
        for (int k = 0; k < 3; k++)
            proposed[i][k] = (double)(float)proposed[i][k];
}

void host_accept(world *w, const double (*proposed)[3], const double (*delivered)[3], const rdl_report *report)
{
    bool by_impulse = w->by_impulse && report != NULL && report->impulses != NULL;
    double keep = 1.0 - w->drag;
    for (uint32_t i = 0; i < w->vertex_count; i++)
        for (int k = 0; k < 3; k++) {
            double v = ((by_impulse ? proposed[i][k] : delivered[i][k]) - w->x[i][k]) / w->duration;
            if (by_impulse && !world_is_driven(w, i))
                v += report->impulses[3 * i + (uint32_t)k] / w->mass[i];
            w->v[i][k] = keep * v;
            w->x[i][k] = delivered[i][k];
        }
}
