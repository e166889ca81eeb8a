/* narrow/stages.h: how a pair goes from stage to stage. Inside narrow only. */
#ifndef RDLI_STAGES_H
#define RDLI_STAGES_H

#include "narrow/filter.h"
#include "narrow/lanes.h"

/* A motion brought to ordinary size: its coordinates times 2^shift. */
typedef struct rdli_sized {
    rdl_motion motion;
    int shift;
} rdli_sized;

void rdli_sized_of(const rdl_motion *motion, rdli_sized *sized);
/* The scalar stages, for what the lanes leave open. */
void rdli_find_open_touch(int kind, const rdl_motion *motion, const rdli_sized *sized, double gap, rdl_touch *touch);

/* Certified bounds of a distance at rest; [0, 0] means exactly 0. */
typedef struct rdli_enclosure {
    double lo, hi;
} rdli_enclosure;

void rdli_exact_enclosure(int kind, const double x[4][3], rdli_enclosure *enclosure);
/* Distance at the end >= length; distance at the end >= min(gap, distance at the start). ends: what is known of both. */
bool rdli_end_reaches(int kind, const rdl_motion *motion, const rdli_enclosure *end, double length);
bool rdli_end_keeps(int kind, const rdl_motion *motion, double gap, const rdli_enclosure ends[2]);

#endif
