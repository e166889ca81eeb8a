/* narrow/series.c: adaptive series expansion of a pair's distance for a gap > 0, in doubles.
 *
 * Intervals are taken from the left. On each the constant order is tried first: the hull of the control points against
 * the direction of the closest points in the middle. Where that fails, the expansion in Bernstein form is tried (span.c)
 * when the motion within the interval is small enough for it to pay, and else the interval is split. A time found at or
 * below the gap is polished to the crossing, and what is left to certify ends just before it. */
#include "narrow/series.h"

enum { MOST_SPANS = 160, DEEPEST = 40 };

static const double unit = 0x1p-52;
static const double half_width = 0x1p-22; /* of a bracket: 2^-21 < 1e-6 in all */

typedef struct scene {
    int kind;
    rdli_frame start, change, end;
    double gap;
    double pad; /* no distance between frames is wrong by more than this */
    rdli_margin margin;
    int order, spans;
} scene;

static void combine(const rdli_frame *a, double s, const rdli_frame *b, rdli_frame *c)
{
    for (int k = 0; k < 3; k++) {
        c->w[k] = a->w[k] + s * b->w[k];
        c->u[k] = a->u[k] + s * b->u[k];
        c->v[k] = a->v[k] + s * b->v[k];
    }
}

static rdli_frame frame_at(const scene *s, double t)
{
    rdli_frame f;
    if (t == 1)
        return s->end;
    combine(&s->start, t, &s->change, &f);
    return f;
}

static scene scene_of(int kind, const rdli_frame *start, const rdli_frame *end, double gap)
{
    scene s = {.kind = kind, .start = *start, .end = *end, .gap = gap, .order = 1};
    combine(&s.end, -1, &s.start, &s.change);
    double a = rdli_frame_size(start), b = rdli_frame_size(end);
    s.pad = 6 * 0x1p-48 * (a > b ? a : b) + RDLI_UNDERFLOW;
    s.margin = rdli_margin_of((gap + s.pad) * (1 + unit));
    return s;
}

/* Distance at t from feasible points. */
static double distance_at(const scene *s, double t, rdli_nearest *nearest)
{
    rdli_frame f = frame_at(s, t);
    rdli_nearest_points(s->kind, &f, nearest);
    return rdli_length(nearest->d);
}

/* Certified: the distance at t is at most the gap. */
static bool is_touch(const scene *s, double distance)
{
    return (distance + s->pad) * (1 + 8 * unit) <= s->gap;
}

/* The length that the hull of the span certifies along d (unit to rounding), rounding not yet taken off. */
static double hull_length(const scene *s, const rdli_span *span, const double d[3], double length)
{
    double a = rdli_frame_least(s->kind, &span->at[0], d), b = rdli_frame_least(s->kind, &span->at[1], d);
    return (a < b ? a : b) / length;
}

/* Narrows [lo, *hi], free at lo and touching at *hi, towards the crossing (regula falsi, Illinois variant). Values are
 * distances less the gap. */
static void polish(const scene *s, double lo, double lo_value, double *hi, double *hi_value)
{
    const double close = half_width / 4, margin = half_width / 8;
    rdli_nearest nearest;
    double below = *hi_value;
    int side = 0;
    for (int i = 0; i < 40 && *hi - lo > close; i++) {
        double t = lo + (*hi - lo) * (lo_value / (lo_value - below));
        t = t < lo + margin ? lo + margin : t > *hi - margin ? *hi - margin : t;
        double value = distance_at(s, t, &nearest) - s->gap;
        if (value <= 0) {
            *hi = t;
            *hi_value = below = value;
            lo_value *= side < 0 ? 0.5 : 1;
            side = -1;
        } else {
            lo = t;
            lo_value = value;
            below *= side > 0 ? 0.5 : 1;
            side = 1;
        }
    }
}

/* What one span shows. */
enum outcome { KEPT, TOUCHED, OPEN };

/* aimed: the span ends just before a crossing, where no hull can separate. */
static enum outcome look(scene *s, double a, double b, bool aimed, double *middle_distance)
{
    rdli_span span = {{frame_at(s, a), frame_at(s, b)}};
    rdli_nearest nearest;
    s->spans++;
    if (aimed && rdli_span_keeps(s->kind, &span, &s->margin, &s->order))
        return KEPT;
    double length = distance_at(s, 0.5 * (a + b), &nearest);
    *middle_distance = length;
    if (is_touch(s, length))
        return TOUCHED;
    double hull = hull_length(s, &span, nearest.d, length);
    if (hull * (1 - 16 * unit) - s->pad > (s->gap + s->pad) * (1 + 4 * unit))
        return KEPT;
    /* A hull that loses more than half of the distance announces terms of higher order that are no smaller. */
    if (aimed || (hull < 0.5 * length && length > 2 * s->gap))
        return OPEN;
    return rdli_span_keeps(s->kind, &span, &s->margin, &s->order) ? KEPT : OPEN;
}

/* A touch in (free, t]: bracket of the crossing nearest to t. Returns the end of what is left to certify, and in *hi a
 * certified touch. */
static double aim(const scene *s, double free, double before, double t, double distance, double *hi)
{
    rdli_nearest nearest;
    double crossing = t, value = distance - s->gap;
    if (before > 0)
        polish(s, free, before, &crossing, &value);
    *hi = is_touch(s, value + s->gap) ? crossing : t;
    for (double width = half_width / 4; *hi == t && crossing + width < t && width <= half_width; width *= 2)
        if (is_touch(s, distance_at(s, crossing + width, &nearest)))
            *hi = crossing + width;
    double target = *hi - 2 * half_width;
    return target > free ? target : free;
}

bool rdli_series_touch(int kind, const rdli_frame *start, const rdli_frame *end, double gap, rdl_touch *touch)
{
    scene s = scene_of(kind, start, end, gap);
    rdli_nearest nearest;
    double middle, ends[DEEPEST], free = 0, hi = 2, distance = INFINITY;
    enum outcome outcome = look(&s, 0, 1, false, &middle);
    if (outcome != KEPT) {
        distance = distance_at(&s, 0, &nearest);
        if (is_touch(&s, distance)) {
            *touch = (rdl_touch){.touches = 1, .stage = RDL_STAGE_ENDS, .order = 1};
            return true;
        }
        if (distance <= s.gap + 4 * s.pad) /* near enough to the gap for exact arithmetic to tell */
            return false;
    }
    int top = 0, depth = 0;
    ends[0] = 1;
    for (;; outcome = look(&s, free, ends[top], hi <= 1 && top == 0, &middle)) {
        double right = ends[top];
        if (outcome == KEPT) {
            free = right;
            if (--top < 0)
                break;
            continue;
        }
        if (s.spans > MOST_SPANS || top + 1 >= DEEPEST)
            return false;
        double half = 0.5 * (free + right);
        if (outcome == TOUCHED) {
            double before = (free > 0 ? distance_at(&s, free, &nearest) : distance) - gap;
            ends[0] = aim(&s, free, before, half, middle, &hi);
            top = 0;
            if (ends[0] <= free)
                break;
            continue;
        }
        ends[++top] = half;
        depth = top > depth ? top : depth;
    }
    bool touches = hi <= 1;
    if (touches && hi - free > 1e-6)
        return false;
    bool hull = !touches && s.spans == 1 && s.order == 1;
    *touch = (rdl_touch){.time_lo = touches ? free : 1, .time_hi = touches ? hi : 1, .touches = touches,
        .stage = hull ? RDL_STAGE_DIRECTION : RDL_STAGE_SERIES, .order = (uint8_t)s.order, .depth = (uint8_t)depth};
    return true;
}
