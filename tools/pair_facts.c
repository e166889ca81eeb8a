/* pair_facts.c: see pair_facts.h. */
#include "pair_facts.h"

#include <math.h>
#include <string.h>

typedef long double real;

static real dot(const real a[3], const real b[3])
{
    return a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
}

static void minus(const double a[3], const double b[3], real out[3])
{
    for (int k = 0; k < 3; k++)
        out[k] = (real)a[k] - (real)b[k];
}

static void cross(const real a[3], const real b[3], real out[3])
{
    out[0] = a[1] * b[2] - a[2] * b[1];
    out[1] = a[2] * b[0] - a[0] * b[2];
    out[2] = a[0] * b[1] - a[1] * b[0];
}

static real clamp(real x)
{
    return x < 0 ? 0 : x > 1 ? 1 : x;
}

/* ---- distances ---- */

static double length_of(const double x[4][3], const double weight[4])
{
    real sum[3] = {0, 0, 0};
    for (int i = 0; i < 4; i++)
        for (int k = 0; k < 3; k++)
            sum[k] += (real)weight[i] * (real)x[i][k];
    return (double)sqrtl(dot(sum, sum));
}

/* Keeps the smaller of what is known and the given weights. */
static void offer(const double x[4][3], const double candidate[4], double weight[4], double *least)
{
    double length = length_of(x, candidate);
    if (length < *least) {
        *least = length;
        memcpy(weight, candidate, 4 * sizeof weight[0]);
    }
}

/* Where the point lies along the segment a-b, 0 to 1. */
static real along(const double p[3], const double a[3], const double b[3])
{
    real d[3], w[3];
    minus(b, a, d);
    minus(p, a, w);
    real square = dot(d, d);
    return square > 0 ? clamp(dot(w, d) / square) : 0;
}

/* Weights of the point's foot on the triangle's plane; false: no plane. */
static bool foot(const double p[3], const double a[3], const double b[3], const double c[3], real w[3])
{
    real u[3], v[3], n[3], d[3], t[3];
    minus(b, a, u);
    minus(c, a, v);
    minus(p, a, d);
    cross(u, v, n);
    real square = dot(n, n);
    if (!(square > 0))
        return false;
    cross(d, v, t);
    w[1] = dot(t, n) / square;
    cross(u, d, t);
    w[2] = dot(t, n) / square;
    w[0] = 1 - w[1] - w[2];
    return true;
}

static double point_triangle(const double x[4][3], double weight[4])
{
    double least = HUGE_VAL;
    real w[3];
    if (foot(x[0], x[1], x[2], x[3], w) && w[0] >= 0 && w[1] >= 0 && w[2] >= 0) {
        const double candidate[4] = {1, (double)-w[0], (double)-w[1], (double)-w[2]};
        offer(x, candidate, weight, &least);
    }
    for (int e = 0; e < 3; e++) {
        int a = 1 + e, b = 1 + (e + 1) % 3;
        double s = (double)along(x[0], x[a], x[b]), candidate[4] = {1, 0, 0, 0};
        candidate[a] = s - 1;
        candidate[b] = -s;
        offer(x, candidate, weight, &least);
    }
    return least;
}

/* Parameters of the closest points of the two lines; false: parallel. */
static bool lines_meet(const double x[4][3], real *s, real *r)
{
    real u[3], v[3], w[3];
    minus(x[1], x[0], u);
    minus(x[3], x[2], v);
    minus(x[2], x[0], w);
    real a = dot(u, u), b = dot(u, v), c = dot(v, v), d = dot(u, w), e = dot(v, w), det = a * c - b * b;
    if (!(det > 1e-18L * a * c))
        return false;
    *s = (d * c - b * e) / det;
    *r = (b * d - a * e) / det;
    return true;
}

static double edge_edge(const double x[4][3], double weight[4])
{
    double least = HUGE_VAL;
    real s, r;
    if (lines_meet(x, &s, &r) && s >= 0 && s <= 1 && r >= 0 && r <= 1) {
        const double candidate[4] = {(double)(1 - s), (double)s, (double)(r - 1), (double)-r};
        offer(x, candidate, weight, &least);
    }
    for (int i = 0; i < 4; i++) {
        int a = i < 2 ? 2 : 0;
        double t = (double)along(x[i], x[a], x[a + 1]), sign = i < 2 ? 1 : -1, candidate[4] = {0, 0, 0, 0};
        candidate[i] = sign;
        candidate[a] = -sign * (1 - t);
        candidate[a + 1] = -sign * t;
        offer(x, candidate, weight, &least);
    }
    return least;
}

double pair_distance(int kind, const double x[4][3], double weight[4])
{
    return kind == RDL_POINT_TRIANGLE ? point_triangle(x, weight) : edge_edge(x, weight);
}

/* ---- times in a plane ---- */

static void differences(int kind, const double x[4][3], real w[3], real u[3], real v[3])
{
    if (kind == RDL_POINT_TRIANGLE) {
        minus(x[0], x[1], w);
        minus(x[2], x[1], u);
        minus(x[3], x[1], v);
    } else {
        minus(x[2], x[0], w);
        minus(x[1], x[0], u);
        minus(x[3], x[2], v);
    }
}

static real volume(const real w[3], const real u[3], const real v[3], real *size)
{
    real n[3];
    cross(u, v, n);
    *size += sqrtl(dot(w, w) * dot(u, u) * dot(v, v));
    return dot(w, n);
}

typedef struct cubic {
    real c[4], size; /* powers of t; rounding of a value is below size */
} cubic;

static cubic cubic_of(int kind, const rdl_motion *motion)
{
    real w[2][3], u[2][3], v[2][3], b[4] = {0, 0, 0, 0}, size = 0;
    differences(kind, motion->start, w[0], u[0], v[0]);
    differences(kind, motion->end, w[1], u[1], v[1]);
    for (int i = 0; i < 8; i++)
        b[(i & 1) + (i >> 1 & 1) + (i >> 2)] += volume(w[i & 1], u[i >> 1 & 1], v[i >> 2], &size);
    /* b holds sums over the choices of ends: binomials times Bernstein coefficients. */
    cubic f = {{b[0], b[1] - 3 * b[0], b[2] - 2 * b[1] + 3 * b[0], b[3] - b[2] + b[1] - b[0]}, size * 1e-17L};
    return f;
}

static real value(const cubic *f, real t)
{
    return ((f->c[3] * t + f->c[2]) * t + f->c[1]) * t + f->c[0];
}

static real slope(const cubic *f, real t)
{
    return (3 * f->c[3] * t + 2 * f->c[2]) * t + f->c[1];
}

/* Turning points in (0, 1), ascending. */
static int turning_points(const cubic *f, real t[2])
{
    real a = 3 * f->c[3], b = 2 * f->c[2], c = f->c[1], tiny = f->size;
    int count = 0;
    real at[2];
    if (fabsl(a) <= tiny) {
        if (fabsl(b) <= tiny)
            return 0;
        at[count++] = -c / b;
    } else {
        real disc = b * b - 4 * a * c;
        if (fabsl(disc) <= 1e-15L * (b * b + fabsl(4 * a * c)))
            disc = 0;
        if (disc < 0)
            return 0;
        real q = -0.5L * (b + (b < 0 ? -sqrtl(disc) : sqrtl(disc)));
        at[count++] = q / a;
        if (disc > 0)
            at[count++] = q != 0 ? c / q : 0;
    }
    int kept = 0;
    for (int i = 0; i < count; i++)
        if (at[i] > 0 && at[i] < 1)
            t[kept++] = at[i];
    if (kept == 2 && t[0] > t[1]) {
        real swap = t[0];
        t[0] = t[1];
        t[1] = swap;
    }
    return kept;
}

static real bisect(const cubic *f, real lo, real hi)
{
    bool rises = value(f, hi) > 0;
    for (int i = 0; i < 80; i++) {
        real middle = 0.5L * (lo + hi);
        if ((value(f, middle) > 0) == rises)
            hi = middle;
        else
            lo = middle;
    }
    return hi;
}

static void add(plane_time times[3], int *count, real t, int multiplicity)
{
    if (*count > 0 && t - (real)times[*count - 1].time < 1e-12L)
        return;
    if (*count < 3)
        times[(*count)++] = (plane_time){.time = (double)t, .multiplicity = multiplicity};
}

static void judge(int kind, const rdl_motion *motion, plane_time *at)
{
    double x[4][3];
    real w[3], s, r;
    const real slack = 1e-9L;
    for (int i = 0; i < 4; i++)
        for (int k = 0; k < 3; k++)
            x[i][k] = motion->start[i][k] + at->time * (motion->end[i][k] - motion->start[i][k]);
    if (kind == RDL_POINT_TRIANGLE) {
        at->inside = foot(x[0], x[1], x[2], x[3], w);
        at->weight[0] = 1;
        for (int k = 0; at->inside && k < 3; k++)
            at->weight[k + 1] = (double)w[k];
        at->inside = at->inside && w[0] >= -slack && w[1] >= -slack && w[2] >= -slack;
        return;
    }
    at->inside = lines_meet((const double(*)[3])x, &s, &r);
    if (at->inside) {
        const double weight[4] = {(double)(1 - s), (double)s, (double)(1 - r), (double)r};
        memcpy(at->weight, weight, sizeof weight);
        at->inside = s >= -slack && s <= 1 + slack && r >= -slack && r <= 1 + slack;
    }
}

int pair_plane_times(int kind, const rdl_motion *motion, plane_time times[3])
{
    const cubic f = cubic_of(kind, motion);
    real fence[4] = {0, 0, 0, 0}, turns[2];
    int count = 0, turn_count = turning_points(&f, turns), fences = 0;
    bool flat = true;
    for (int k = 0; k < 4; k++)
        flat = flat && fabsl(f.c[k]) <= 8 * f.size;
    if (flat)
        return -1;
    fence[fences++] = 0;
    for (int i = 0; i < turn_count; i++)
        fence[fences++] = turns[i];
    fence[fences++] = 1;
    for (int i = 0; i < fences; i++) {
        real here = value(&f, fence[i]);
        if (fabsl(here) <= 8 * f.size) {
            bool turns_here = i > 0 && i + 1 < fences;
            real before = value(&f, fence[i] > 1e-3L ? fence[i] - 1e-3L : 0), after = value(&f, fence[i] + 1e-3L);
            bool crosses = (before > 0) != (after > 0);
            add(times, &count, fence[i], !turns_here ? 1 : crosses ? 3 : 2);
        } else if (i + 1 < fences && fabsl(value(&f, fence[i + 1])) > 8 * f.size &&
                   (here > 0) != (value(&f, fence[i + 1]) > 0)) {
            add(times, &count, bisect(&f, fence[i], fence[i + 1]), 1);
        }
    }
    for (int i = 0; i < count; i++) {
        if (times[i].multiplicity == 1 && fabsl(slope(&f, (real)times[i].time)) <= 1e-6L * f.size)
            times[i].multiplicity = 2;
        judge(kind, motion, &times[i]);
    }
    return count;
}
