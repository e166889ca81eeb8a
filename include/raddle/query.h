/* raddle/query.h: do two moving features come within a gap, and when? No engine needed.
 * Usable from C17 and C++17. */
#ifndef RADDLE_QUERY_H
#define RADDLE_QUERY_H

#include <stddef.h>
#include <stdint.h>

#include "status.h"

#ifdef __cplusplus
extern "C" {
#endif

/* PT: vertex 0 is the point, 1-2-3 the triangle. EE: edges 0-1 and 2-3. */
enum { RDL_POINT_TRIANGLE = 0, RDL_EDGE_EDGE = 1 };

/* Straight motion of the four vertices, t = 0 at start, t = 1 at end; metres. */
typedef struct rdl_motion {
    double start[4][3], end[4][3];
} rdl_motion;

/* Which part of the narrow phase settled a pair. */
enum {
    RDL_STAGE_DIRECTION = 0, /* a separating direction for the whole step */
    RDL_STAGE_CUBIC = 1,     /* signs of the coplanarity cubic's Bernstein coefficients */
    RDL_STAGE_ENDS = 2,      /* at or below the gap at t = 0 */
    RDL_STAGE_ROOTS = 3,     /* root isolation with certified signs in double arithmetic */
    RDL_STAGE_SERIES = 4,    /* adaptive series expansion */
    RDL_STAGE_EXACT = 5,     /* exact arithmetic */
    RDL_STAGE_COUNT = 6
};

/* touches: 1 when the distance is <= gap somewhere in [0, 1], else 0.
 * [time_lo, time_hi] encloses the first such time; [0, time_lo) is certified free; not touching: 1, 1;
 * at or below the gap at t = 0: 0, 0. stage, order, depth: what decided, highest series order, deepest split. */
typedef struct rdl_touch {
    double time_lo, time_hi;
    uint8_t touches, stage, order, depth, reserved[4];
} rdl_touch;

/* Answers `count` questions. gaps: count values >= 0, finite, metres, or NULL = all 0.
 * Gap 0 is exact for the given doubles. Gap > 0: never a miss; a false alarm only where the true least distance is
 * below gap (1 + 1e-6). For simple roots time_hi - time_lo <= 1e-6.
 * Errors: RDL_BAD_ARGUMENT, RDL_NOT_FINITE (field "start", "end" or "gaps", index = pair), RDL_OUT_OF_RANGE (negative gap);
 * touches is then untouched. No allocation; safe from any thread. fault may be NULL. */
RDL_API rdl_status rdl_find_touches(int kind, size_t count, const rdl_motion motions[], const double gaps[],
                                    rdl_touch touches[], rdl_fault *fault);

#ifdef __cplusplus
}
#endif
#endif
