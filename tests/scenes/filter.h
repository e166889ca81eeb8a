/* scenes/filter.h: a sound double-precision shortcut for the exact judge: "surely apart" or "cannot tell". */
#ifndef SCENES_FILTER_H
#define SCENES_FILTER_H

#include <stdbool.h>
#include <stddef.h>

#include "raddle/query.h"

/* What doubles can say about a pair along its path of `count` pieces. */
typedef struct filter_answer {
    bool end_sure;  /* end distance >= min(gap, start distance), and the start distance is not zero */
    bool path_sure; /* distance > share * min(gap, start distance) all along, and the start distance is not zero */
} filter_answer;

filter_answer filter_pair(int kind, const rdl_motion pieces[], size_t count, double gap, double share);

/* Distance at rest: value, and the vector from the second feature's point to the first's. */
double filter_distance(int kind, const double x[4][3], double direction[3]);

/* True when the edge surely does not pierce the triangle. */
bool filter_misses(const double edge[2][3], const double triangle[3][3]);

#endif
