/* setup.c: host_finish: which vertices interact, and everything that never changes afterwards. */
#include "host.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static int build_matrix(host *h)
{
    size_t count = 0;
    uint32_t (*pairs)[2] = malloc((3 * h->membrane_count + h->spring_count + 1) * sizeof *pairs);
    if (!pairs)
        return 0;
    for (size_t m = 0; m < h->membrane_count; m++)
        for (int k = 0; k < 3; k++) {
            pairs[count][0] = h->membranes[m].vertex[k];
            pairs[count++][1] = h->membranes[m].vertex[(k + 1) % 3];
        }
    for (size_t s = 0; s < h->spring_count; s++)
        memcpy(pairs[count++], h->springs[s].vertex, sizeof *pairs);
    host_pattern *pattern = &h->matrix.pattern;
    int done = host_pattern_build(pattern, h->soft_count, pairs, count);
    free(pairs);
    if (!done)
        return 0;
    for (size_t m = 0; m < h->membrane_count; m++)
        for (int k = 0; k < 3; k++)
            h->membranes[m].slot[k] = host_pattern_find(pattern, h->membranes[m].vertex[k],
                                                        h->membranes[m].vertex[(k + 1) % 3]);
    for (size_t s = 0; s < h->spring_count; s++)
        h->springs[s].slot = host_pattern_find(pattern, h->springs[s].vertex[0], h->springs[s].vertex[1]);
    h->matrix.block = malloc((pattern->first[h->soft_count] + 1) * sizeof *h->matrix.block);
    h->matrix.diagonal = malloc((h->soft_count + 1) * sizeof *h->matrix.diagonal);
    return h->matrix.block && h->matrix.diagonal;
}

static int build_bending(host *h)
{
    size_t count = 0;
    uint32_t (*pairs)[2] = malloc((6 * h->bend_count + 1) * sizeof *pairs);
    if (!pairs)
        return 0;
    for (size_t b = 0; b < h->bend_count; b++)
        for (uint32_t i = 0; i < h->bends[b].count; i++)
            for (uint32_t j = 0; j < i; j++) {
                pairs[count][0] = h->bends[b].vertex[i];
                pairs[count++][1] = h->bends[b].vertex[j];
            }
    host_scalars *bending = &h->bending;
    int done = host_pattern_build(&bending->pattern, h->soft_count, pairs, count);
    free(pairs);
    if (!done)
        return 0;
    bending->value = calloc(bending->pattern.first[h->soft_count] + 1, sizeof *bending->value);
    bending->diagonal = calloc(h->soft_count + 1, sizeof *bending->diagonal);
    if (!bending->value || !bending->diagonal)
        return 0;
    for (size_t b = 0; b < h->bend_count; b++) {
        const host_bend *bend = &h->bends[b];
        for (uint32_t i = 0; i < bend->count; i++) {
            bending->diagonal[bend->vertex[i]] += bend->stiffness * bend->weight[i] * bend->weight[i];
            for (uint32_t j = 0; j < i; j++)
                bending->value[host_pattern_find(&bending->pattern, bend->vertex[i], bend->vertex[j])] +=
                    bend->stiffness * bend->weight[i] * bend->weight[j];
        }
    }
    return 1;
}

static int build_solver(host *h)
{
    size_t rows = h->soft_count + 1, entries = h->matrix.pattern.first[h->soft_count] + 1;
    host_solver *s = &h->solver;
    h->force = malloc(rows * sizeof *h->force);
    s->filter = malloc(rows * sizeof *s->filter);
    s->upper = malloc(entries * sizeof *s->upper);
    s->pivot = malloc(rows * sizeof *s->pivot);
    s->inverse = malloc(rows * sizeof *s->inverse);
    s->residual = malloc(rows * sizeof *s->residual);
    s->direction = malloc(rows * sizeof *s->direction);
    s->image = malloc(rows * sizeof *s->image);
    s->scaled = malloc(rows * sizeof *s->scaled);
    return h->force && s->filter && s->upper && s->pivot && s->inverse && s->residual && s->direction && s->image &&
           s->scaled;
}

int host_finish(host *h)
{
    for (size_t i = 0; i < h->vertex_count; i++) {
        if (!(h->own_mass[i] > 0))
            return 0; /* a vertex that no element uses */
        h->mass[i] = h->own_mass[i];
        memcpy(h->proposed[i], h->position[i], sizeof h->proposed[i]);
    }
    return build_matrix(h) && build_bending(h) && build_solver(h);
}

void host_drive(host *h, uint32_t vertex)
{
    h->driven[vertex] = 1;
    h->mass[vertex] = INFINITY;
    memcpy(h->target[vertex], h->position[vertex], sizeof h->target[vertex]);
}

void host_release(host *h, uint32_t vertex)
{
    h->driven[vertex] = (uint8_t)(isinf(h->own_mass[vertex]) != 0);
    h->mass[vertex] = h->own_mass[vertex];
}
