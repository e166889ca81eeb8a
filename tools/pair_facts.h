/* pair_facts.h: plain geometry of one pair, for people to read: distances, and the times at which its four points lie in a
 * plane. In ordinary long doubles: the exact answers come from rdl_find_touches, these say why. */
#ifndef RADDLE_TOOLS_PAIR_FACTS_H
#define RADDLE_TOOLS_PAIR_FACTS_H

#include <stdbool.h>

#include <raddle/query.h>

/* Distance of the two closed features at rest, and the weights of the closest points: difference = sum weight x. */
double pair_distance(int kind, const double x[4][3], double weight[4]);

typedef struct plane_time {
    double time;
    int multiplicity;  /* 1 crosses the plane, 2 touches it, 3 */
    bool inside;       /* the features meet there, up to rounding */
    double weight[4];  /* PT: 1 and the triangle's weights; EE: 1 - s, s, 1 - r, r */
} plane_time;

/* Roots in [0, 1] of the volume that the four points span (Provot 1997), which is a cubic in t. Returns their number, or -1
 * when the points stay in one plane all the time. */
int pair_plane_times(int kind, const rdl_motion *motion, plane_time times[3]);

#endif
