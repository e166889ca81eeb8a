/* unit/narrow/cases.h: motions with known exact answers (the table of check values in docs/method/narrow.md). */
#ifndef UNIT_NARROW_CASES_H
#define UNIT_NARROW_CASES_H

#include "raddle/query.h"

typedef struct known_case {
    const char *name;
    int kind, touches;
    double time; /* of the first touch; 1 when there is none */
    double back; /* of the first touch of the reversed motion */
    rdl_motion motion;
} known_case;

extern const known_case known_cases[];
extern const int known_case_count;

/* The motion run backwards; all coordinates times 2^k. */
rdl_motion motion_reversed(const rdl_motion *motion);
rdl_motion motion_scaled(const rdl_motion *motion, int k);
/* Vertex i of the result is vertex order[i]. */
rdl_motion motion_permuted(const rdl_motion *motion, const int order[4]);

/* Orders that keep the question: 6 for a point and a triangle, 8 for two edges. */
extern const int point_orders[6][4], edge_orders[8][4];

#endif
