/* tests/bench/bench_broad_anchors.h: general-purpose libraries that find overlapping boxes, behind one small face. */
#ifndef BENCH_BROAD_ANCHORS_H
#define BENCH_BROAD_ANCHORS_H

#include <stddef.h>

#include "raddle/tree.h"

#ifdef __cplusplus
extern "C" {
#endif

/* Embree 3, one thread or more. mode 0: low quality, 1: medium quality, 2: high quality: all rebuilt by every update; 3: built with
 * medium quality, then refitted. NULL when it cannot start. */
void *embree_open(const rdl_box *boxes, size_t count, unsigned threads, int mode);
void embree_update(void *embree, const rdl_box *boxes);
/* Number of pairs; each unordered pair once. */
size_t embree_pairs(void *embree);
void embree_close(void *embree);

/* CGAL box_self_intersection_d; it has nothing to update. cutoff: see its manual. */
size_t cgal_pairs(const rdl_box *boxes, size_t count, size_t cutoff);

#ifdef __cplusplus
}
#endif
#endif
