/* bench/narrow/textbook.c: see textbook.h. */
#include "textbook.h"

#include <gsl/gsl_poly.h>
#include <math.h>

#define INSIDE_TOLERANCE 1e-6

typedef double vector[3];

static double dot(const vector a, const vector b)
{
    return a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
}

static void cross(const vector a, const vector b, vector c)
{
    c[0] = a[1] * b[2] - a[2] * b[1];
    c[1] = a[2] * b[0] - a[0] * b[2];
    c[2] = a[0] * b[1] - a[1] * b[0];
}

static double triple(const vector a, const vector b, const vector c)
{
    vector n;
    cross(b, c, n);
    return dot(a, n);
}

static void place(const rdl_motion *motion, double t, double x[4][3])
{
    for (int i = 0; i < 4; i++)
        for (int k = 0; k < 3; k++)
            x[i][k] = motion->start[i][k] + t * (motion->end[i][k] - motion->start[i][k]);
}

static void frame(int kind, double x[4][3], vector w, vector u, vector v)
{
    int edges = kind == RDL_EDGE_EDGE;
    for (int k = 0; k < 3; k++) {
        w[k] = x[edges ? 2 : 0][k] - x[edges ? 0 : 1][k];
        u[k] = x[edges ? 1 : 2][k] - x[edges ? 0 : 1][k];
        v[k] = x[3][k] - x[edges ? 2 : 1][k];
    }
}

/* Parameters of the closest points of plane or lines; false when u and v are parallel. */
static bool parameters(int kind, const vector w, const vector u, const vector v, double *s, double *r)
{
    double uu = dot(u, u), vv = dot(v, v), uv = dot(u, v), wu = dot(w, u), wv = dot(w, v), det = uu * vv - uv * uv;
    if (det <= 0)
        return false;
    *s = (wu * vv - uv * wv) / det;
    *r = (kind == RDL_EDGE_EDGE ? uv * wu - uu * wv : uu * wv - uv * wu) / det;
    return true;
}

static bool inside(int kind, const vector w, const vector u, const vector v)
{
    double s, r;
    if (!parameters(kind, w, u, v, &s, &r))
        return false;
    double lo = -INSIDE_TOLERANCE, hi = 1 + INSIDE_TOLERANCE;
    return s >= lo && r >= lo && (kind == RDL_EDGE_EDGE ? s <= hi && r <= hi : s + r <= hi);
}

/* Roots of the coplanarity cubic in [0, 1], ascending. */
static int coplanar_times(int kind, const rdl_motion *motion, double times[3])
{
    vector w0, u0, v0, w1, u1, v1;
    double x[4][3], roots[3], c[4];
    place(motion, 0, x);
    frame(kind, x, w0, u0, v0);
    place(motion, 1, x);
    frame(kind, x, w1, u1, v1);
    for (int k = 0; k < 3; k++) {
        w1[k] -= w0[k];
        u1[k] -= u0[k];
        v1[k] -= v0[k];
    }
    c[0] = triple(w0, u0, v0);
    c[1] = triple(w1, u0, v0) + triple(w0, u1, v0) + triple(w0, u0, v1);
    c[2] = triple(w0, u1, v1) + triple(w1, u0, v1) + triple(w1, u1, v0);
    c[3] = triple(w1, u1, v1);
    int count = 0, found = 0;
    if (c[3] != 0)
        count = gsl_poly_solve_cubic(c[2] / c[3], c[1] / c[3], c[0] / c[3], &roots[0], &roots[1], &roots[2]);
    else
        count = gsl_poly_solve_quadratic(c[2], c[1], c[0], &roots[0], &roots[1]);
    for (int i = 0; i < count; i++)
        if (roots[i] >= 0 && roots[i] <= 1)
            times[found++] = roots[i];
    return found;
}

bool textbook_meets(int kind, const rdl_motion *motion, double *time)
{
    double times[3], x[4][3];
    int count = coplanar_times(kind, motion, times);
    for (int i = 0; i < count; i++) {
        vector w, u, v;
        place(motion, times[i], x);
        frame(kind, x, w, u, v);
        if (inside(kind, w, u, v)) {
            *time = times[i];
            return true;
        }
    }
    return false;
}

static double clamp(double x)
{
    return x > 0 ? (x < 1 ? x : 1) : 0;
}

static double to_segment(const vector w, const vector u)
{
    double uu = dot(u, u), t = uu > 0 ? clamp(dot(w, u) / uu) : 0;
    vector e = {w[0] - t * u[0], w[1] - t * u[1], w[2] - t * u[2]};
    return dot(e, e);
}

static double squared_distance(int kind, const rdl_motion *motion, double t)
{
    vector w, u, v, e;
    double x[4][3], s, r, sign = kind == RDL_EDGE_EDGE ? 1 : -1;
    place(motion, t, x);
    frame(kind, x, w, u, v);
    if (parameters(kind, w, u, v, &s, &r) && s >= 0 && r >= 0 && (sign > 0 ? s <= 1 && r <= 1 : s + r <= 1)) {
        for (int k = 0; k < 3; k++)
            e[k] = w[k] - s * u[k] + sign * r * v[k];
        return dot(e, e);
    }
    vector far, along, back;
    double best = to_segment(w, u), next;
    for (int k = 0; k < 3; k++) {
        far[k] = sign > 0 ? w[k] + v[k] : w[k] - u[k];
        along[k] = sign > 0 ? u[k] : v[k] - u[k];
        back[k] = sign > 0 ? -w[k] : w[k];
    }
    next = to_segment(far, along);
    best = next < best ? next : best;
    next = to_segment(back, v);
    best = next < best ? next : best;
    if (sign > 0) {
        for (int k = 0; k < 3; k++)
            back[k] = u[k] - w[k];
        next = to_segment(back, v);
        best = next < best ? next : best;
    }
    return best;
}

bool textbook_touches(int kind, const rdl_motion *motion, double gap, double *time)
{
    double times[5] = {0};
    int count = 1 + coplanar_times(kind, motion, times + 1);
    times[count++] = 1;
    for (int i = 0; i < count; i++)
        if (squared_distance(kind, motion, times[i]) <= gap * gap) {
            *time = times[i];
            return true;
        }
    return false;
}
