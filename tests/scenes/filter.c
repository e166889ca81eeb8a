/* scenes/filter.c: see filter.h. Every distance here is bounded below by a direction: the differences of the two
 * features' corners span a convex set that holds every difference of their points, during a straight motion too
 * (convex hull property), so the least of direction . difference over the corners bounds the distance. The direction
 * may come from anywhere; only the bound has to be sound, and its rounding is covered by `slack`. */
#include "filter.h"

#include <math.h>
#include <string.h>

enum { DEPTH = 9 };

static double dot(const double a[3], const double b[3])
{
    return a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
}

static void minus(const double a[3], const double b[3], double out[3])
{
    for (int k = 0; k < 3; k++)
        out[k] = a[k] - b[k];
}

static void cross(const double a[3], const double b[3], double out[3])
{
    out[0] = a[1] * b[2] - a[2] * b[1];
    out[1] = a[2] * b[0] - a[0] * b[2];
    out[2] = a[0] * b[1] - a[1] * b[0];
}

static void keep_shorter(const double d[3], double best[3])
{
    if (dot(d, d) < dot(best, best))
        memcpy(best, d, 3 * sizeof *d);
}

/* Keeps the shorter of best and p - (a + s (b - a)), s clamped. */
static void try_segment(const double p[3], const double a[3], const double b[3], double sign, double best[3])
{
    double u[3], w[3];
    minus(b, a, u);
    minus(p, a, w);
    double uu = dot(u, u), s = uu > 0.0 ? dot(w, u) / uu : 0.0;
    s = s < 0.0 ? 0.0 : s > 1.0 ? 1.0 : s;
    for (int k = 0; k < 3; k++)
        w[k] = sign * (p[k] - (a[k] * (1.0 - s) + b[k] * s));
    keep_shorter(w, best);
}

static void closest_point_triangle(const double x[4][3], double best[3])
{
    double u[3], v[3], w[3], n[3], t[3];
    for (int i = 1; i < 4; i++)
        try_segment(x[0], x[i], x[i % 3 + 1], 1.0, best);
    minus(x[2], x[1], u);
    minus(x[3], x[1], v);
    minus(x[0], x[1], w);
    cross(u, v, n);
    double nn = dot(n, n);
    if (nn == 0.0)
        return;
    cross(w, v, t);
    double b = dot(t, n) / nn;
    cross(u, w, t);
    double c = dot(t, n) / nn;
    if (b < 0.0 || c < 0.0 || b + c > 1.0)
        return;
    for (int k = 0; k < 3; k++)
        t[k] = w[k] - b * u[k] - c * v[k]; /* of two real points: never below the distance */
    keep_shorter(t, best);
}

static void closest_edge_edge(const double x[4][3], double best[3])
{
    double u[3], v[3], w[3], n[3], t[3];
    for (int i = 0; i < 2; i++) {
        try_segment(x[i], x[2], x[3], 1.0, best);
        try_segment(x[2 + i], x[0], x[1], -1.0, best);
    }
    minus(x[1], x[0], u);
    minus(x[3], x[2], v);
    minus(x[0], x[2], w);
    cross(u, v, n);
    double nn = dot(n, n);
    if (nn == 0.0)
        return;
    cross(v, w, t);
    double s = dot(t, n) / nn;
    cross(u, w, t);
    double r = dot(t, n) / nn;
    if (s < 0.0 || s > 1.0 || r < 0.0 || r > 1.0)
        return;
    for (int k = 0; k < 3; k++)
        t[k] = w[k] + s * u[k] - r * v[k];
    keep_shorter(t, best);
}

double filter_distance(int kind, const double x[4][3], double direction[3])
{
    minus(x[0], x[kind == RDL_POINT_TRIANGLE ? 1 : 2], direction);
    if (kind == RDL_POINT_TRIANGLE)
        closest_point_triangle(x, direction);
    else
        closest_edge_edge(x, direction);
    return sqrt(dot(direction, direction));
}

/* Least of direction . (corner of the first - corner of the second), over the direction's length. */
static double least_along(int kind, const double x[4][3], const double direction[3])
{
    double length = sqrt(dot(direction, direction)), least = INFINITY;
    int firsts = kind == RDL_POINT_TRIANGLE ? 1 : 2;
    if (length == 0.0)
        return -INFINITY;
    for (int i = 0; i < firsts; i++)
        for (int j = firsts; j < 4; j++) {
            double d[3];
            minus(x[i], x[j], d);
            least = fmin(least, dot(direction, d));
        }
    return least / length;
}

static void at_time(const rdl_motion *motion, double t, double x[4][3])
{
    for (int i = 0; i < 4; i++)
        for (int k = 0; k < 3; k++)
            x[i][k] = (1.0 - t) * motion->start[i][k] + t * motion->end[i][k];
}

static bool stays_beyond(int kind, const rdl_motion *motion, double from, double to, double floor, int depth)
{
    double x[4][3], y[4][3], z[4][3], direction[3], middle = 0.5 * (from + to);
    at_time(motion, middle, x);
    if (filter_distance(kind, (const double(*)[3])x, direction) <= floor)
        return false;
    at_time(motion, from, y);
    at_time(motion, to, z);
    if (least_along(kind, (const double(*)[3])y, direction) > floor
        && least_along(kind, (const double(*)[3])z, direction) > floor)
        return true;
    return depth > 0 && stays_beyond(kind, motion, from, middle, floor, depth - 1)
           && stays_beyond(kind, motion, middle, to, floor, depth - 1);
}

/* Rounding of everything above, for coordinates up to the largest: a corner at a time takes 3 roundings, a difference
 * one, a product of three terms five, a root and a quotient one each, relative to 2 sqrt(3) times the largest
 * coordinate. */
static double slack_of(const rdl_motion pieces[], size_t count)
{
    double largest = 0.0;
    for (size_t p = 0; p < count; p++)
        for (int i = 0; i < 4; i++)
            for (int k = 0; k < 3; k++)
                largest = fmax(largest, fmax(fabs(pieces[p].start[i][k]), fabs(pieces[p].end[i][k])));
    return 0x1p-46 * largest;
}

static bool is_still(const rdl_motion pieces[], size_t count)
{
    for (size_t p = 0; p < count; p++)
        if (memcmp(pieces[p].start, pieces[p].end, sizeof pieces[p].start) != 0)
            return false;
    return true;
}

filter_answer filter_pair(int kind, const rdl_motion pieces[], size_t count, double gap, double share)
{
    filter_answer answer = {false, false};
    double direction[3], slack = slack_of(pieces, count);
    double start = filter_distance(kind, pieces[0].start, direction);
    if (least_along(kind, pieces[0].start, direction) <= slack)
        return answer; /* perhaps zero */
    if (is_still(pieces, count))
        return (filter_answer){true, true};
    double floor = fmin(gap, start + slack);
    (void)filter_distance(kind, pieces[count - 1].end, direction);
    answer.end_sure = least_along(kind, pieces[count - 1].end, direction) - slack >= floor;
    answer.path_sure = true;
    for (size_t p = 0; p < count && answer.path_sure; p++)
        answer.path_sure = stays_beyond(kind, &pieces[p], 0.0, 1.0, share * floor * (1.0 + 0x1p-40) + slack, DEPTH);
    return answer;
}

/* Sign of det(b - a, c - a, d - a), 0 when doubles cannot tell (bound after Shewchuk 1997, enlarged). */
static int side(const double a[3], const double b[3], const double c[3], const double d[3])
{
    double u[3], v[3], w[3], n[3], m[3];
    minus(b, a, u);
    minus(c, a, v);
    minus(d, a, w);
    cross(u, v, n);
    for (int k = 0; k < 3; k++) {
        int i = (k + 1) % 3, j = (k + 2) % 3;
        m[k] = fabs(u[i] * v[j]) + fabs(u[j] * v[i]);
    }
    double value = dot(n, w), size = m[0] * fabs(w[0]) + m[1] * fabs(w[1]) + m[2] * fabs(w[2]);
    if (!(fabs(value) > 0x1p-49 * size + 0x1p-1000))
        return 0;
    return value > 0.0 ? 1 : -1;
}

/* A direction along which the edge and the triangle do not overlap: from one feature of each to its nearest. */
static bool lies_apart(const double edge[2][3], const double triangle[3][3])
{
    double x[4][3], direction[3], best[3] = {INFINITY, 0.0, 0.0}, largest = 0.0, least = INFINITY;
    for (int i = 0; i < 5; i++) {
        memcpy(x[0], edge[i < 3 ? 0 : i - 3], sizeof x[0]);
        memcpy(x[1], i < 3 ? edge[1] : triangle[0], sizeof x[1]);
        memcpy(x[2], triangle[i < 3 ? i : 1], sizeof x[2]);
        memcpy(x[3], triangle[i < 3 ? (i + 1) % 3 : 2], sizeof x[3]);
        filter_distance(i < 3 ? RDL_EDGE_EDGE : RDL_POINT_TRIANGLE, (const double(*)[3])x, direction);
        keep_shorter(direction, best);
    }
    for (int i = 0; i < 2; i++)
        for (int k = 0; k < 3; k++) {
            double d[3];
            minus(edge[i], triangle[k], d);
            least = fmin(least, dot(best, d));
            for (int c = 0; c < 3; c++)
                largest = fmax(largest, fmax(fabs(edge[i][c]), fabs(triangle[k][c])));
        }
    return least > 0x1p-46 * largest * sqrt(dot(best, best));
}

bool filter_misses(const double edge[2][3], const double triangle[3][3])
{
    int above = side(triangle[0], triangle[1], triangle[2], edge[0]);
    int below = side(triangle[0], triangle[1], triangle[2], edge[1]);
    if (above != 0 && above == below)
        return true;
    int turns[3];
    for (int i = 0; i < 3; i++)
        turns[i] = side(edge[0], edge[1], triangle[i], triangle[(i + 1) % 3]);
    for (int i = 0; i < 3; i++)
        if (turns[i] * turns[(i + 1) % 3] < 0)
            return true;
    return lies_apart(edge, triangle);
}
