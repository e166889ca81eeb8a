/* narrow/narrow.h: one pair's motion -> what happens to it. Included by driver and api. */
#ifndef RDLI_NARROW_H
#define RDLI_NARROW_H

#include "base/internal.h"
#include "raddle/query.h"

/* Closest points of a pair at rest. D = sum_i weight[i] x[i] is the vector from the second feature's closest point to
 * the first's (weights: PT (1, -w1, -w2, -w3), EE (1-s, s, -(1-r), -r)). */
typedef struct rdli_closest {
    double distance_lo, distance_hi; /* certified enclosure of the exact distance; [0, 0] means exactly 0 */
    double normal[3];                /* unit (to rounding), D / |D|; a zero vector when the distance is exactly 0 */
    double weight[4];
} rdli_closest;

void rdli_closest_points(int kind, const double x[4][3], rdli_closest *closest);

/* The stateless question of query.h for one pair; inputs are finite, gap >= 0. */
void rdli_find_touch(int kind, const rdl_motion *motion, double gap, rdl_touch *touch);

/* The same for many pairs, four lanes at a time; gaps may be NULL: all 0. Same bits as one by one. */
void rdli_find_touch_list(int kind, size_t count, const rdl_motion motions[], const double gaps[], rdl_touch touches[]);

/* Exact: is the distance at the end >= min(gap, distance at the start)? Decided by exact arithmetic where doubles
 * cannot. */
bool rdli_end_keeps_floor(int kind, const rdl_motion *motion, double gap);

/* The engine's question about one pair over one straight piece of path. */
typedef struct rdli_examined {
    uint8_t quiet;            /* certified: distance > gap during the whole piece; nothing else below is filled */
    uint8_t reaches_path;     /* the path floor may be reached: false alarms only below path_floor (1 + 1e-6) */
    uint8_t below_end;        /* end distance < end floor, exactly (as rdli_end_keeps_floor) */
    uint8_t contact_at_start; /* the start distance is exactly 0 (floors are 0, the touch is at gap 0) */
    double start_lo, start_hi;/* enclosure of the start distance */
    double end_lo;            /* not above the end distance */
    double end_floor;         /* min(gap, start_hi): not below the exact floor */
    double path_floor;        /* share * end_floor */
    rdl_touch touch;          /* of the path floor */
} rdli_examined;

/* floor_distance: NULL, or the enclosure [lo, hi] of the distance from which the floors are to be taken, where the piece
 * is not the first of its step; below_end is then decided against min(gap, hi) with certified doubles. */
void rdli_examine(int kind, const rdl_motion *motion, double gap, double share, const double floor_distance[2],
                  rdli_examined *examined);

/* The same for many pairs, in blocks, four lanes at a time; floor_distances may be NULL. Same bits as one by one. */
void rdli_examine_list(int kind, size_t count, const rdl_motion motions[], const double gaps[], double share,
                       const double (*floor_distances)[2], rdli_examined examined[]);

/* The cheap first look of rdli_examine_list alone: quiet[i] = 1 is certified. */
void rdli_screen_list(int kind, size_t count, const rdl_motion motions[], const double gaps[], uint8_t quiet[]);

/* Exact predicate at rest: see rdl_edge_against_triangle. */
int rdli_edge_against_triangle(const double edge[2][3], const double triangle[3][3]);

/* Exact test whether the pair intersects at rest (distance exactly 0): PT the point lies on the closed triangle, EE the
 * closed edges meet. */
bool rdli_meets_at_rest(int kind, const double x[4][3]);

#endif
