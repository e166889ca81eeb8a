/* narrow/lanes.h: many pairs at once, four lanes wide: what the vector stages take and give. Inside narrow only. */
#ifndef RDLI_LANES_H
#define RDLI_LANES_H

#include "narrow/narrow.h"

enum { RDLI_LANES = 4 };

/* Four pairs of ordinary size (rdli_scale_points); unused lanes repeat a used one. */
typedef struct rdli_quad {
    const rdl_motion *motion[RDLI_LANES];
    alignas(32) double gap[RDLI_LANES];
} rdli_quad;

/* The screen: RESIZE asks for the pair again, brought to ordinary size. */
enum { RDLI_SCREEN_OPEN = 0, RDLI_SCREEN_DIRECTION = 1, RDLI_SCREEN_CUBIC = 2, RDLI_SCREEN_RESIZE = 3 };

/* A lane's answer at gap 0. OPEN: the scalar stages must decide. */
enum { RDLI_LANE_OPEN = 0, RDLI_LANE_FREE = 1, RDLI_LANE_TOUCH = 2 };
typedef struct rdli_answers {
    uint8_t answer[RDLI_LANES];
    alignas(32) double lo[RDLI_LANES], hi[RDLI_LANES]; /* valid for TOUCH */
} rdli_answers;

/* How far the lanes have come at a gap > 0; see approach_kernel.h. done: certified, touching where HI <= 1, with the
 * bracket [LO, HI]. */
enum { RDLI_STATE = 16, RDLI_STATE_LO = 2, RDLI_STATE_HI = 3 };
typedef struct rdli_progress {
    double *state[RDLI_LANES];  /* RDLI_STATE numbers of each lane, where the caller keeps them */
    uint8_t start[RDLI_LANES];  /* at or below the gap at t = 0: nothing else counts */
    uint8_t unsure[RDLI_LANES]; /* perhaps so: exact arithmetic must tell */
    uint8_t done[RDLI_LANES];
} rdli_progress;

/* What the lanes know about the engine's question; lengths in units of the lane's pair. */
typedef struct rdli_outlook {
    rdli_progress progress;       /* towards the path floor */
    uint8_t quiet[RDLI_LANES];    /* certified: distance > gap during the whole motion; nothing else is filled */
    uint8_t known[RDLI_LANES];    /* the path floor is known, and of ordinary size */
    uint8_t tight[2][RDLI_LANES]; /* the enclosure at this end is that of rdli_closest_points */
    alignas(32) double path[RDLI_LANES], lo[2][RDLI_LANES], hi[2][RDLI_LANES]; /* distance at the start and at the end */
} rdli_outlook;

/* One instruction set's functions; all sets give the same bits. */
typedef struct rdli_path {
    void (*screen)(int kind, const rdli_quad *quad, uint8_t verdict[RDLI_LANES]);
    /* gap 0: roots of the cubic */
    void (*meet)(int kind, const rdli_quad *quad, rdli_answers *answers);
    /* gap > 0: what the closest points at both ends show; what those at progress->time add */
    void (*approach)(int kind, const rdli_quad *quad, rdli_progress *progress);
    void (*look_again)(int kind, const rdli_quad *quad, rdli_progress *progress);
    /* from: the distances that the floors are taken from; a negative one stands for the distance at the start */
    void (*outlook)(int kind, const rdli_quad *quad, double share, const double from[RDLI_LANES], rdli_outlook *outlook);
} rdli_path;

extern const rdli_path rdli_path_portable;
/* NULL where this machine or this build cannot run it. */
const rdli_path *rdli_path_avx2(void);
/* The path to use. */
const rdli_path *rdli_path_choose(void);

#endif
