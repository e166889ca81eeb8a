/* tests/bench/bench_broad_lists.h: the engine's pair lists of a scene, and the rival way to make them. */
#ifndef BENCH_BROAD_LISTS_H
#define BENCH_BROAD_LISTS_H

#include <stdbool.h>

#include "bench_broad_scenes.h"

typedef struct bench_lists {
    size_t vertex_count, edge_count, triangle_count;
    double boxes;                     /* s: making all boxes */
    size_t box_pairs, near_pairs;     /* point-triangle and edge-edge: boxes overlap; and not certainly apart */
    double box_seconds, near_seconds; /* s: update of the trees, search, lists */
    double near_wall[2];              /* s, wall time: with one thread and with two; the same lists */
    double touches;                   /* near pairs that touch; estimated from a sample */
    size_t assigned_pairs;            /* representative assignment: must equal box_pairs */
    double assigned_seconds;          /* s: update, search, elementary box tests; lists neither written nor sorted */
    double bytes;                     /* that the broad phase holds for the near pairs */
    /* Every sheet ignores itself: the bounds of what culling flat regions could save; seconds 1e9 where there is no sheet. */
    size_t culled_pairs;
    double culled_seconds, culled_near_seconds;
} bench_lists;

/* One thread; the best of several runs. push: m, added to the proposed place of every vertex. False: no memory. */
bool bench_lists_measure(const bench_scene *scene, double push, bench_lists *lists);

#endif
