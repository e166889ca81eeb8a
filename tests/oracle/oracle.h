/* oracle/oracle.h: the second opinion on the library's answers: exact, slow, by another method.
 *
 * The distance of two features at time t is the least of the distances of those sub-features (vertex-vertex,
 * vertex-edge, vertex-face, line-line) whose foot points lie inside. For each sub-feature "foot point inside and distance
 * <= gap" is a list of polynomial conditions in t with integer coefficients after a common power of two is taken out of
 * the given doubles; the times at which a list holds are found exactly with Sturm's theorem. The union over the
 * sub-features is the closed set of touching times, so that its first time is the least of the infima.
 * Nothing here calls the library. Not thread-safe within one object; no global state. GMP aborts when memory runs out. */
#ifndef ORACLE_ORACLE_H
#define ORACLE_ORACLE_H

#include "raddle/query.h"
#include "roots.h"

/* The first time at which a pair's distance is <= the gap. */
typedef struct oracle_touch {
    bool touches;
    root time;  /* valid when touches */
    poly owner; /* its square-free polynomial; empty for exactly 0 or 1 */
} oracle_touch;

void oracle_touch_init(oracle_touch *touch);
void oracle_touch_clear(oracle_touch *touch);
/* gap2: the square of the gap, m^2, >= 0. */
void oracle_find(int kind, const rdl_motion *motion, const mpq_t gap2, oracle_touch *touch);
/* gap2 = (gap (1 + share))^2, exactly, for the double `gap` and share = millionths / 1e6. */
void oracle_square_gap(mpq_t gap2, double gap, unsigned long millionths);
/* Sign of (first time - t), exact. The pair must touch. */
int oracle_compare_time(const oracle_touch *touch, double t);
/* Certified bracket of the first time, at most 2^-bits wide before rounding outward. */
void oracle_bracket_time(oracle_touch *touch, unsigned long bits, double *lo, double *hi);

/* The meetings at gap 0 in the open interval (0, 1) at times when u x v is not zero, counted by the coplanarity
 * polynomial. */
typedef struct oracle_crossings {
    bool planar;     /* the four vertices stay coplanar: nothing below is filled */
    int passes;      /* roots with both features met at which the polynomial changes sign */
    int grazes;      /* ... at which it does not (double roots) */
    int signed_sum;  /* sum over passes: +1 where the polynomial w . (u x v) grows through 0, -1 where it falls */
    int on_border;   /* of all of them, how many are not strictly inside both features */
    bool first_is_simple; /* the first meeting in [0, 1] is a simple root of the polynomial */
    int unclear;     /* meetings at exactly t = 0 or t = 1 */
} oracle_crossings;

/* w, u, v: PT p - a, b - a, c - a; EE (a, b), (c, d): c - a, b - a, d - c. */
void oracle_count_crossings(int kind, const rdl_motion *motion, oracle_crossings *crossings);

/* Certified enclosure of the least distance over [0, 1], relative width <= 2^-30; [0, 0] when they meet. */
void oracle_least_distance(int kind, const rdl_motion *motion, double *lo, double *hi);

/* Exact squared distance of a pair at rest, m^2. */
void oracle_rest_distance2(int kind, const double x[4][3], mpq_t distance2);

enum { ORACLE_APART = 0, ORACLE_CONTACT = 1, ORACLE_PIERCE = 2 };
/* Does the edge pierce the closed triangle at rest (its ends strictly on both sides of the plane), meet it otherwise, or
 * not at all? */
int oracle_edge_against_triangle(const double edge[2][3], const double triangle[3][3]);

/* Floors of a pair from its start distance d0: end floor = min(gap, d0), path floor = share * end floor; squares, m^2. */
typedef struct oracle_floors {
    mpq_t start2, end2, path2;
} oracle_floors;

void oracle_floors_init(oracle_floors *floors);
void oracle_floors_clear(oracle_floors *floors);
void oracle_floors_set(oracle_floors *floors, int kind, const double start[4][3], double gap, double share);

typedef struct oracle_apart {
    bool apart;        /* all that follows is in order */
    bool start_zero;   /* the start distance is exactly 0: the floors are 0, and the path touches at once */
    bool end_kept;     /* end distance >= end floor */
    bool path_kept;    /* distance along the whole path > path floor */
} oracle_apart;

/* Judges the polyline of `count` pieces (piece k + 1 starts where piece k ends) against the floors of its first start. */
oracle_apart oracle_pair_apart(int kind, const rdl_motion pieces[], size_t count, double gap, double share);
/* Is the end distance >= min(gap, start distance)? */
bool oracle_end_keeps_floor(int kind, const rdl_motion *motion, double gap);

#endif
