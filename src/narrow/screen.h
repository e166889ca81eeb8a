/* narrow/screen.h: the first look at many pairs at once, four lanes wide. Inside narrow only. */
#ifndef RDLI_SCREEN_H
#define RDLI_SCREEN_H

#include "narrow/narrow.h"

enum { RDLI_LANES = 4 };
enum { RDLI_SCREEN_OPEN = 0, RDLI_SCREEN_DIRECTION = 1, RDLI_SCREEN_CUBIC = 2 };

/* Structure of arrays: x[3 i + k][lane] is component k of vertex i at the start, x[12 + 3 i + k][lane] at the end. All
 * of ordinary size (rdli_scale_points). */
typedef struct rdli_lanes {
    alignas(32) double x[24][RDLI_LANES];
    alignas(32) double gap[RDLI_LANES];
} rdli_lanes;

/* Certified per lane: the distance stays above the gap during the whole motion, by a separating direction, or, for gap
 * 0, by the signs of the cubic. The two functions give the same bits. */
void rdli_screen_portable(int kind, const rdli_lanes *lanes, uint8_t verdict[RDLI_LANES]);
void rdli_screen_avx2(int kind, const rdli_lanes *lanes, uint8_t verdict[RDLI_LANES]);
/* Whether this machine and this build can run the AVX2 path. */
bool rdli_screen_has_avx2(void);

/* The path to use, for callers that keep it over many calls. */
typedef void rdli_screen(int kind, const rdli_lanes *lanes, uint8_t verdict[RDLI_LANES]);
rdli_screen *rdli_screen_choose(void);

/* Brings a pair to ordinary size into a lane, and fills the lanes behind the last one with copies of it. Returns the
 * shift of rdli_scale_points. */
void rdli_lanes_load(rdli_lanes *lanes, int lane, const rdl_motion *scaled, double scaled_gap);
void rdli_lanes_repeat(rdli_lanes *lanes, int count);

#endif
