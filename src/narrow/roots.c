/* narrow/roots.c: gap 0 in doubles with certified signs.
 *
 * The roots of f = w . (u x v) are only guessed; what counts is certified. An interval is free when the Bernstein
 * coefficients of f on it have one certified sign, when the parameters of the meeting point stay outside a feature (signs
 * of quadratics in one projection), or when a direction separates the pair. A narrow interval round a guess touches when
 * f has certified opposite signs at its ends and the parameters stay certainly inside. Everything else is left to exact
 * arithmetic. */
#include "narrow/roots.h"

/* Where no coefficient has a certain sign the motion is most likely planar, and exact arithmetic has to look anyway. */
enum { MOST_SPANS = 24, MOST_FLAT_SPANS = 3, DEEPEST = 12, MOST_ROOTS = 3 };

/* One unit of 2^-52 per rounding holds in every rounding mode. */
static const double unit = 0x1p-52;

static void quadratic_of(const double a0[3], const double a1[3], const double b0[3], const double b1[3], int k, rdli_quadratic *q)
{
    int i = (k + 1) % 3, j = (k + 2) % 3;
    double left[4] = {a0[i] * b0[j], a0[i] * b1[j], a1[i] * b0[j], a1[i] * b1[j]};
    double right[4] = {a0[j] * b0[i], a0[j] * b1[i], a1[j] * b0[i], a1[j] * b1[i]};
    double largest = 0;
    for (int m = 0; m < 4; m++) {
        double size = fabs(left[m]) + fabs(right[m]);
        largest = size > largest ? size : largest;
    }
    q->c[0] = left[0] - right[0];
    q->c[1] = 0.5 * ((left[1] - right[1]) + (left[2] - right[2]));
    q->c[2] = left[3] - right[3];
    /* two rounded differences, product, difference, sum; then 8 in a restriction */
    q->bound = 16 * unit * largest + RDLI_UNDERFLOW;
}

static void quadratic_on(const rdli_quadratic *q, double a, double b, double c[3])
{
    double a1 = 1 - a, b1 = 1 - b, left = a1 * q->c[0] + a * q->c[1], right = a1 * q->c[1] + a * q->c[2];
    c[0] = a1 * left + a * right;
    c[1] = b1 * left + b * right;
    c[2] = b1 * (b1 * q->c[0] + b * q->c[1]) + b * (b1 * q->c[1] + b * q->c[2]);
}

/* The certain sign of all coefficients, or 0. */
static int certain_sign(const double *c, int count, double bound)
{
    int sign = c[0] > bound ? 1 : c[0] < -bound ? -1 : 0;
    for (int i = 1; i < count; i++)
        if (!(sign * c[i] > bound))
            return 0;
    return sign;
}

static double mix(double a, double b, double t)
{
    return (1 - t) * a + t * b;
}

/* Coefficients of f on [a, b] by de Casteljau's scheme. */
static void cubic_on(const double f[4], double a, double b, double c[4])
{
    double p0 = mix(f[0], f[1], a), p1 = mix(f[1], f[2], a), p2 = mix(f[2], f[3], a);
    double q0 = mix(f[0], f[1], b), q1 = mix(f[1], f[2], b), q2 = mix(f[2], f[3], b);
    double pp0 = mix(p0, p1, a), pp1 = mix(p1, p2, a), qq0 = mix(q0, q1, b), qq1 = mix(q1, q2, b);
    c[0] = mix(pp0, pp1, a);
    c[1] = mix(pp0, pp1, b);
    c[2] = mix(qq0, qq1, a);
    c[3] = mix(qq0, qq1, b);
}

static double value_of(const double f[4], double t)
{
    double s = 1 - t;
    return s * s * s * f[0] + 3 * t * s * (s * f[1] + t * f[2]) + t * t * t * f[3];
}

static void make_cubic(rdli_cubic *s)
{
    const double *w0 = s->at[0].w, *w1 = s->at[1].w;
    double size = 0;
    for (int i = 0; i < 4; i++)
        s->f[i] = 0;
    for (int k = 0; k < 3; k++) {
        const double *n = s->n[k].c;
        s->f[0] += w0[k] * n[0];
        s->f[1] += (2 * w0[k] * n[1] + w1[k] * n[0]) / 3;
        s->f[2] += (w0[k] * n[2] + 2 * w1[k] * n[1]) / 3;
        s->f[3] += w1[k] * n[2];
        double w = fabs(w0[k]) > fabs(w1[k]) ? fabs(w0[k]) : fabs(w1[k]);
        size += w * (s->n[k].bound / (16 * unit)); /* at least |w| times the terms of n */
    }
    /* 6 roundings in a term of n, 8 more here, 16 in a restriction, whose coefficients are at most 2 size */
    s->bound = 64 * unit * size + RDLI_UNDERFLOW;
    s->most_spans = MOST_FLAT_SPANS;
    for (int i = 0; i < 4; i++)
        if (fabs(s->f[i]) > s->bound)
            s->most_spans = MOST_SPANS;
}

/* From one projection in which the normal keeps its sign: first and second must lie between 0 and the normal (EE), or be positive with their sum below it (PT). */
enum rdli_inside rdli_cubic_inside(const rdli_cubic *s, double a, double b)
{
    double n[3][3], c[3];
    int k = 0;
    for (int i = 0; i < 3; i++) {
        quadratic_on(&s->n[i], a, b, n[i]);
        k = fabs(n[i][1]) > fabs(n[k][1]) ? i : k;
    }
    int facing = certain_sign(n[k], 3, s->n[k].bound);
    if (!facing)
        return RDLI_INSIDE_MAYBE;
    rdli_quadratic first, second;
    const rdli_frame *p = &s->at[0], *q = &s->at[1];
    double lower[2][3], upper[2][3], bounds[2];
    quadratic_of(p->w, q->w, p->v, q->v, k, &first);
    if (s->kind == RDL_POINT_TRIANGLE)
        quadratic_of(p->u, q->u, p->w, q->w, k, &second);
    else
        quadratic_of(p->w, q->w, p->u, q->u, k, &second);
    quadratic_on(&first, a, b, lower[0]);
    quadratic_on(&second, a, b, lower[1]);
    bounds[0] = first.bound;
    bounds[1] = second.bound;
    bool certain = true;
    for (int i = 0; i < 2; i++) {
        int sign = certain_sign(lower[i], 3, bounds[i]) * facing;
        if (sign < 0)
            return RDLI_INSIDE_NO;
        certain = certain && sign > 0;
    }
    bool triangle = s->kind == RDL_POINT_TRIANGLE;
    double bound = 2 * (first.bound + second.bound + s->n[k].bound);
    for (int i = 0; i < (triangle ? 1 : 2); i++) {
        for (int j = 0; j < 3; j++)
            c[j] = triangle ? n[k][j] - (lower[0][j] + lower[1][j]) : n[k][j] - lower[i][j];
        memcpy(upper[i], c, sizeof c);
        int sign = certain_sign(upper[i], 3, bound) * facing;
        if (sign < 0)
            return RDLI_INSIDE_NO;
        certain = certain && sign > 0;
    }
    return certain ? RDLI_INSIDE_YES : RDLI_INSIDE_MAYBE;
}

static bool separated(const rdli_cubic *s, double a, double b)
{
    rdli_frame left, right, middle;
    rdli_nearest nearest;
    rdli_frame_mix(&s->at[0], &s->at[1], a, &left);
    rdli_frame_mix(&s->at[0], &s->at[1], b, &right);
    rdli_frame_mix(&left, &right, 0.5, &middle);
    rdli_nearest_points(s->kind, &middle, &nearest);
    const double *d = nearest.d;
    double least = rdli_frame_least(s->kind, &left, d), other = rdli_frame_least(s->kind, &right, d);
    least = other < least ? other : least;
    return least > s->pad * (fabs(d[0]) + fabs(d[1]) + fabs(d[2])) + RDLI_UNDERFLOW;
}

static bool is_free(rdli_cubic *s, double a, double b)
{
    double c[4];
    s->spans++;
    cubic_on(s->f, a, b, c);
    return certain_sign(c, 4, s->bound) || rdli_cubic_inside(s, a, b) == RDLI_INSIDE_NO || separated(s, a, b);
}

/* Certifies [a, b] free, splitting where needed. */
static bool all_free(rdli_cubic *s, double a, double b, int *depth)
{
    double ends[DEEPEST];
    int top = 0;
    ends[0] = b;
    while (top >= 0) {
        double end = ends[top];
        if (is_free(s, a, end)) {
            a = end;
            top--;
            continue;
        }
        if (s->spans > s->most_spans || top + 1 >= DEEPEST)
            return false;
        ends[++top] = 0.5 * (a + end);
        *depth = top > *depth ? top : *depth;
    }
    return true;
}

/* Root of f between a and b, where its values have opposite signs: Newton steps kept inside by bisection. */
static double refine(const double f[4], double a, double b, double fa)
{
    double d[3] = {f[1] - f[0], f[2] - f[1], f[3] - f[2]}, t = 0.5 * (a + b);
    for (int i = 0; i < 60 && b - a > 0x1p-40; i++) {
        double value = value_of(f, t), s = 1 - t;
        if (value == 0)
            return t;
        if ((value > 0) == (fa > 0))
            a = t;
        else
            b = t;
        double slope = 3 * (s * s * d[0] + 2 * s * t * d[1] + t * t * d[2]), next = t - value / slope;
        bool inside = next > a && next < b;
        if (inside && fabs(next - t) < 0x1p-40)
            return next;
        t = inside ? next : 0.5 * (a + b);
    }
    return t;
}

/* Guesses of the roots in [0, 1], from the left. */
static int guess_roots(const double f[4], double roots[MOST_ROOTS])
{
    double d0 = f[1] - f[0], d1 = f[2] - f[1], d2 = f[3] - f[2], cuts[4] = {0, 1, 1, 1};
    double a = d0 - 2 * d1 + d2, b = d0 - d1, square = b * b - a * d0;
    int count = 1;
    if (square > 0) { /* a t^2 - 2 b t + d0 = 0 */
        double q = b + (b > 0 ? sqrt(square) : -sqrt(square)), r = d0 / q, t = q / a;
        double first = r < t ? r : t, second = r < t ? t : r;
        if (first > 0 && first < 1)
            cuts[count++] = first;
        if (second > 0 && second < 1)
            cuts[count++] = second;
    }
    cuts[count] = 1;
    int found = 0;
    for (int i = 0; i < count; i++) {
        double left = value_of(f, cuts[i]), right = value_of(f, cuts[i + 1]);
        if ((left < 0) != (right < 0))
            roots[found++] = refine(f, cuts[i], cuts[i + 1], left);
    }
    return found;
}

/* The guess's surroundings: 1 touch, 0 free, -1 undecided. */
static int settle(rdli_cubic *s, double root, double free, double *lo, double *hi)
{
    for (int e = -30; e <= -22; e += 4) {
        double width = ldexp(1, e), c[4];
        *lo = root - width > free ? root - width : free;
        *hi = root + width < 1 ? root + width : 1;
        if (*lo >= *hi)
            continue;
        cubic_on(s->f, *lo, *hi, c);
        enum rdli_inside inside = rdli_cubic_inside(s, *lo, *hi);
        if (inside == RDLI_INSIDE_NO)
            return 0;
        bool opposite = (c[0] > s->bound && c[3] < -s->bound) || (c[0] < -s->bound && c[3] > s->bound);
        if (inside == RDLI_INSIDE_YES && opposite)
            return 1;
    }
    return separated(s, *lo, *hi) ? 0 : -1;
}

rdli_cubic rdli_cubic_of(int kind, const rdli_frame *start, const rdli_frame *end)
{
    rdli_cubic s = {.kind = kind, .at = {*start, *end}};
    double a = rdli_frame_size(start), b = rdli_frame_size(end), largest = a > b ? a : b;
    for (int k = 0; k < 3; k++)
        quadratic_of(s.at[0].u, s.at[1].u, s.at[0].v, s.at[1].v, k, &s.n[k]);
    make_cubic(&s);
    s.pad = 0x1p-45 * largest + RDLI_UNDERFLOW;
    s.size = largest;
    return s;
}

bool rdli_roots_touch(const rdli_cubic *cubic, rdl_touch *touch)
{
    rdli_cubic s = *cubic;
    double roots[MOST_ROOTS], free = 0;
    int count = guess_roots(s.f, roots), depth = 0;
    *touch = (rdl_touch){.time_lo = 1, .time_hi = 1, .stage = RDL_STAGE_ROOTS, .order = 3};
    if (separated(&s, 0, 1)) {
        touch->stage = RDL_STAGE_DIRECTION;
        touch->order = 1;
        return true;
    }
    for (int i = 0; i < count; i++) {
        double lo, hi;
        int meets = settle(&s, roots[i], free, &lo, &hi);
        if (meets < 0 || (lo > free && !all_free(&s, free, lo, &depth)))
            return false;
        touch->depth = (uint8_t)depth;
        if (meets) {
            touch->touches = 1;
            touch->time_lo = lo;
            touch->time_hi = hi;
            return true;
        }
        free = hi > free ? hi : free;
    }
    if (free < 1 && !all_free(&s, free, 1, &depth))
        return false;
    touch->depth = (uint8_t)depth;
    return true;
}
