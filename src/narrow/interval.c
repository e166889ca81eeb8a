/* narrow/interval.c: gap > 0 in double arithmetic: the hull bound (constant order of the series) on a bisected time axis.
 * It settles what is far from its gap against the rounding of doubles; the rest is left to exact arithmetic. */
#include "narrow/interval.h"

#include "narrow/filter.h"

static const double unit = 0x1p-52;

enum {
    WIDTH_BITS = 21,   /* a bracket of 2^-21 < 1e-6 of the step */
    NODE_BUDGET = 256  /* a simple root needs 2 WIDTH_BITS; more than a few hundred means grazing: another stage's work */
};

typedef struct axis {
    int kind;
    const rdl_motion *motion;
    double gap, padded; /* padded: gap and what rounding of the positions inside the step can take */
    double slack;       /* that rounding, m */
} axis;

/* Positions at t: three roundings of numbers not above the largest coordinate, none at the ends. */
static void place(const axis *a, double t, double x[4][3])
{
    for (int i = 0; i < 4; i++)
        for (int k = 0; k < 3; k++) {
            double from = a->motion->start[i][k], to = a->motion->end[i][k];
            x[i][k] = t == 0 ? from : t == 1 ? to : from + t * (to - from);
        }
}

static double largest_of(const rdl_motion *motion)
{
    const double *x = (const double *)motion;
    double largest = 0;
    for (int i = 0; i < 24; i++)
        largest = fabs(x[i]) > largest ? fabs(x[i]) : largest;
    return largest;
}

static void nearest_at(const axis *a, double t, rdli_nearest *nearest)
{
    double x[4][3];
    place(a, t, x);
    rdli_frame frame = rdli_frame_of(a->kind, (const double (*)[3])x);
    rdli_nearest_points(a->kind, &frame, nearest);
}

static double length_of(const double d[3])
{
    return sqrt(d[0] * d[0] + d[1] * d[1] + d[2] * d[2]);
}

/* The interval is free by the direction of the closest points at its middle; *middle_touches when these points show that
 * the middle is at or below the gap. */
static bool interval_keeps(const axis *a, double from, double to, bool *middle_touches)
{
    rdl_motion part;
    rdli_nearest nearest;
    place(a, from, part.start);
    place(a, to, part.end);
    nearest_at(a, 0.5 * (from + to), &nearest);
    *middle_touches = length_of(nearest.d) * (1 + 8 * unit) + a->slack <= a->gap;
    return !*middle_touches && rdli_direction_keeps(a->kind, &part, nearest.d, a->padded);
}

static enum rdli_settled search(const axis *a, rdl_touch *touch)
{
    double from = 0, width = 1, known = 2; /* known: earliest time certainly at or below the gap */
    int depth = 0, deepest = 0;
    for (int node = 0; node < NODE_BUDGET; node++) {
        bool middle_touches;
        if (interval_keeps(a, from, from + width, &middle_touches)) {
            from += width;
            while (depth > 0 && fmod(from, 2 * width) == 0) {
                width *= 2;
                depth--;
            }
            if (from >= 1) {
                *touch = (rdl_touch){.time_lo = 1, .time_hi = 1, .stage = RDL_STAGE_SERIES, .depth = (uint8_t)deepest};
                return RDLI_SETTLED;
            }
            continue;
        }
        if (middle_touches && from + 0.5 * width < known)
            known = from + 0.5 * width;
        if (known - from <= 0x1p-21) {
            *touch = (rdl_touch){.time_lo = from, .time_hi = known, .touches = 1, .stage = RDL_STAGE_SERIES,
                .depth = (uint8_t)deepest};
            return RDLI_SETTLED;
        }
        if (depth >= WIDTH_BITS + 2)
            return RDLI_UNSETTLED;
        width *= 0.5;
        depth++;
        deepest = depth > deepest ? depth : deepest;
    }
    return RDLI_UNSETTLED;
}

enum rdli_settled rdli_interval_gap(int kind, const rdl_motion *motion, double gap, rdl_touch *touch)
{
    axis a = {kind, motion, gap, 0, 0};
    /* positions: 3 roundings per coordinate, two features, sqrt(3) per vector; the frame and the combination of the closest
     * points: 8 more of up to twice the size */
    a.slack = 48 * unit * largest_of(motion) + RDLI_UNDERFLOW;
    a.padded = gap + a.slack;
    if (!(a.slack < 0x1p-24 * gap))
        return RDLI_UNSETTLED;
    rdli_nearest nearest;
    nearest_at(&a, 0, &nearest);
    double begin = length_of(nearest.d);
    if (begin * (1 + 8 * unit) + a.slack <= gap) {
        *touch = (rdl_touch){.touches = 1, .stage = RDL_STAGE_ENDS};
        return RDLI_SETTLED;
    }
    if (begin * (1 - 8 * unit) <= a.padded + 0x1p-20 * gap)
        return RDLI_UNSETTLED;
    return search(&a, touch);
}
