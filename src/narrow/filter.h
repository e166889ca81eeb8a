/* narrow/filter.h: the double-precision view of a pair, its closest points, and certificates for a whole interval.
 * Inside narrow only. */
#ifndef RDLI_FILTER_H
#define RDLI_FILTER_H

#include "base/vector.h"
#include "narrow/narrow.h"

/* Difference vectors of a pair at rest (see exact_pair.h), each component rounded once. */
typedef struct rdli_frame {
    double w[3], u[3], v[3];
} rdli_frame;

/* x multiplied by 2^shift, where the largest coordinate needs it to stay far from overflow and underflow; returns the
 * shift (0 for ordinary sizes, and then x is only copied). count is a multiple of 4. */
int rdli_scale_points(const double *x, size_t count, double *scaled);

/* length 2^-shift, rounded towards `towards` where it is too small to be exact. */
double rdli_unscaled(double length, int shift, double towards);

rdli_frame rdli_frame_of(int kind, const double x[4][3]);

/* A vector of the frame between two points of the features, from nearly the closest points: the first feature's point
 * less the second's. weight as in rdli_closest; all of them are feasible to rounding. */
typedef struct rdli_nearest {
    double d[3], weight[4];
} rdli_nearest;
void rdli_nearest_points(int kind, const rdli_frame *frame, rdli_nearest *nearest);

/* Not above the least value of d . e over the differences e of a vertex of the first feature less one of the second. */
double rdli_least_along(int kind, const double x[4][3], const double d[3]);

/* Linear interpolation, every component rounded three times at most. */
void rdli_frame_mix(const rdli_frame *a, const rdli_frame *b, double t, rdli_frame *mixed);
/* Largest component. */
double rdli_frame_size(const rdli_frame *frame);
/* Least d . e over the control points of the frame; its rounding is at most 2^-47 size |d|. */
double rdli_frame_least(int kind, const rdli_frame *frame, const double d[3]);

/* An enclosure narrower than this, relative to the distance, needs no exact arithmetic: two orders finer than any margin
 * that the response works with. */
#define RDLI_TIGHT 0x1p-36

/* A bound of the effect of underflow on any expression here, for ordinary sizes: far above 2^-1074 times the number of
 * operations times the largest factor, far below the rounding of anything of relevant size. */
#define RDLI_UNDERFLOW 0x1p-960

#endif
