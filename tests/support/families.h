/* support/families.h: families of pair motions that are known to be hard, with seeded random members. */
#ifndef SUPPORT_FAMILIES_H
#define SUPPORT_FAMILIES_H

#include "raddle/query.h"
#include "random.h"

typedef struct motion_family {
    const char *name;
    void (*make)(random_source *source, int kind, rdl_motion *motion);
    int percent;   /* how many members a test takes, of its usual count: less where exact arithmetic is slow */
    int gap_times; /* at a gap > 0, that many times as many: more where the exact oracle is quick */
} motion_family;

extern const motion_family motion_families[];
extern const int motion_family_count;

/* Index of a family by name, -1 when there is none. */
int motion_family_find(const char *name);

/* Plain double distance of a pair at time t, and an estimate of its least value over [0, 1]: for choosing interesting
 * gaps, never for judging. */
double motion_size(const rdl_motion *motion); /* largest coordinate */
double motion_distance(int kind, const rdl_motion *motion, double t);
double motion_least_distance(int kind, const rdl_motion *motion);

#endif
