/* narrow/series.h: adaptive series expansion of a pair's distance in double arithmetic. Inside narrow only. */
#ifndef RDLI_SERIES_H
#define RDLI_SERIES_H

#include "narrow/filter.h"

/* A pair's frames at both ends of a time interval. */
typedef struct rdli_span {
    rdli_frame at[2];
} rdli_span;

/* The squared lengths that a certificate compares with; each entry holds for the next lower order of feature. */
typedef struct rdli_margin {
    double free[3];
} rdli_margin;
rdli_margin rdli_margin_of(double length);

/* Certified: the distance of the span's exact frames is > length over the whole interval, where margin is
 * rdli_margin_of(length). *order: the highest degree that was needed. */
bool rdli_span_keeps(int kind, const rdli_span *span, const rdli_margin *margin, int *order);

/* Gap > 0, for frames of ordinary size (rdli_scale_points). False where doubles cannot decide: touch is then untouched. */
bool rdli_series_touch(int kind, const rdli_frame *start, const rdli_frame *end, double gap,
                       rdl_touch *touch);

#endif
