/* narrow/exact_pair.h: a pair's motion in integers, exact questions about it. Inside narrow only. */
#ifndef RDLI_EXACT_PAIR_H
#define RDLI_EXACT_PAIR_H

#include "base/exact.h"
#include "narrow/roots.h"

/* Difference vectors in units of 2^unit, [0] at the start and [1] at the end.
 * PT (p; a, b, c): w = p - a, u = b - a, v = c - a. EE (a, b; c, d): w = c - a, u = b - a, v = d - c. */
typedef struct rdli_exact_pair {
    int kind, unit;
    rdli_int w[2][3], u[2][3], v[2][3];
} rdli_exact_pair;

/* The largest unit in which all coordinates (and gap, where it is not 0) are integers. */
int rdli_common_unit(const rdl_motion *motion, double gap);
void rdli_exact_pair_of(rdli_arena *arena, int kind, const rdl_motion *motion, int unit, rdli_exact_pair *pair);

/* A point against a segment: w from the segment's first end to the point, u along the segment. */
typedef struct rdli_point_segment {
    rdli_int w[2][3], u[2][3];
} rdli_point_segment;
enum { RDLI_POINT_SEGMENTS = 4 };
/* The pair's boundary couples: PT the point against the three edges, EE each end against the other edge. Returns how
 * many there are. */
int rdli_point_segments(rdli_arena *arena, const rdli_exact_pair *pair, rdli_point_segment couples[RDLI_POINT_SEGMENTS]);

/* Quadratic component k of a x b, and a . b, for vectors linear in time. */
rdli_poly rdli_cross_component(rdli_arena *arena, const rdli_int a[2][3], const rdli_int b[2][3], int k);
rdli_poly rdli_dot_poly(rdli_arena *arena, const rdli_int a[2][3], const rdli_int b[2][3]);

/* Squared distance at t = 0 or 1 as num / den in units of 2^(2 unit); den > 0. */
typedef struct rdli_ratio {
    rdli_int num, den;
} rdli_ratio;
rdli_ratio rdli_squared_distance(rdli_arena *arena, const rdli_exact_pair *pair, int end);

/* Gap 0. Fills touch; exact. doubles: the pair's polynomials at ordinary size, whose certain answers are used. */
void rdli_exact_zero(rdli_arena *arena, int kind, const rdl_motion *motion, const rdli_cubic *doubles, rdl_touch *touch);
/* Distance 0 at t = 0 (end 0) or t = 1 (end 1). */
bool rdli_exact_meets(rdli_arena *arena, const rdli_exact_pair *pair, int end);
/* Sign of (distance at `end`)^2 - gap^2. */
int rdli_exact_against_gap(rdli_arena *arena, int kind, const rdl_motion *motion, double gap, int end);
/* Gap > 0, in fixed-point arithmetic fine enough for the gap. meeting: a time before which the pair is known to meet at
 * gap 0, or more than 1. */
void rdli_exact_gap(rdli_arena *arena, int kind, const rdl_motion *motion, double gap, double meeting, rdl_touch *touch);

/* Room for numbers of ordinary range, and for any finite doubles; see docs/method/narrow.md. */
enum { RDLI_SMALL_ROOM = 6144, RDLI_LARGE_ROOM = 49152 };

#endif
