/* support/families.c: the table of families, and plain distances; see families.h. */
#include "families.h"

#include <math.h>
#include <string.h>

#include "motions.h"

const motion_family motion_families[] = {
    {"random", make_random, 100, 1},
    {"integer grid", make_grid, 100, 2},
    {"small integer grid", make_small_grid, 150, 1},
    {"near-parallel", make_near_parallel, 100, 1},
    {"near-coplanar", make_near_coplanar, 100, 1},
    {"planar in a tilted plane", make_tilted_plane, 200, 1},
    {"planar in an axis plane", make_flat_plane, 100, 3},
    {"grazing", make_graze, 100, 1},
    {"triple root", make_triple_root, 100, 1},
    {"through a border", make_border, 100, 1},
    {"through a corner", make_corner, 100, 1},
    {"contact at the start", make_at_start, 100, 1},
    {"contact at the end", make_at_end, 100, 1},
    {"scale 1e-300", make_tiny, 50, 1},
    {"subnormal", make_subnormal, 100, 3},
    {"far from the origin", make_offset, 100, 3},
    {"1e-300 beside 1e300", make_mixed, 1, 1},
    {"turning 60 to 180 degrees", make_rotation, 100, 1},
    {"slivers of 1e8", make_sliver, 100, 1},
    {"zero-length edges", make_zero_edge, 100, 1},
    {"fast and thin", make_fast_thin, 100, 1},
    {"tight cloth", make_cloth, 200, 3},
    {"tight strands", make_strands, 200, 2},
    {"layers that slide and turn", make_layers, 200, 8},
    {"at rest", make_still, 50, 16},
};

const int motion_family_count = (int)(sizeof motion_families / sizeof motion_families[0]);

int motion_family_find(const char *name)
{
    for (int i = 0; i < motion_family_count; i++)
        if (strcmp(motion_families[i].name, name) == 0)
            return i;
    return -1;
}

static double dot(const double a[3], const double b[3])
{
    return a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
}

static void cross(double r[3], const double a[3], const double b[3])
{
    r[0] = a[1] * b[2] - a[2] * b[1];
    r[1] = a[2] * b[0] - a[0] * b[2];
    r[2] = a[0] * b[1] - a[1] * b[0];
}

static void minus(double r[3], const double a[3], const double b[3])
{
    for (int k = 0; k < 3; k++)
        r[k] = a[k] - b[k];
}

static double point_segment(const double p[3], const double a[3], const double b[3])
{
    double w[3], e[3];
    minus(w, p, a);
    minus(e, b, a);
    double length2 = dot(e, e), s = length2 > 0.0 ? dot(w, e) / length2 : 0.0;
    s = fmax(0.0, fmin(1.0, s));
    for (int k = 0; k < 3; k++)
        w[k] -= s * e[k];
    return sqrt(dot(w, w));
}

static double inner(int kind, double x[4][3])
{
    double w[3], u[3], v[3], n[3], turn[3];
    int face = kind == RDL_POINT_TRIANGLE;
    minus(w, face ? x[0] : x[2], face ? x[1] : x[0]);
    minus(u, face ? x[2] : x[1], face ? x[1] : x[0]);
    minus(v, x[3], face ? x[1] : x[2]);
    cross(n, u, v);
    double n2 = dot(n, n);
    cross(turn, w, v);
    double first = dot(turn, n);
    cross(turn, face ? u : w, face ? w : u);
    double second = dot(turn, n);
    if (!(n2 > 0.0) || first < 0.0 || second < 0.0 || first > n2 || second > n2 || (face && first + second > n2))
        return INFINITY;
    return fabs(dot(w, n)) / sqrt(n2);
}

/* Distance of positions that are moved to unit size first, so that no square over- or underflows for want of scaling. */
static double scaled_distance(int kind, const rdl_motion *motion, double t, int exponent)
{
    double x[4][3];
    for (int i = 0; i < 4; i++)
        for (int k = 0; k < 3; k++)
            x[i][k] = (1.0 - t) * ldexp(motion->start[i][k], -exponent) + t * ldexp(motion->end[i][k], -exponent);
    double best = inner(kind, x);
    if (kind == RDL_POINT_TRIANGLE) {
        for (int i = 1; i <= 3; i++)
            best = fmin(best, point_segment(x[0], x[i], x[i % 3 + 1]));
    } else {
        for (int i = 0; i < 2; i++) {
            best = fmin(best, point_segment(x[i], x[2], x[3]));
            best = fmin(best, point_segment(x[2 + i], x[0], x[1]));
        }
    }
    return best;
}

double motion_size(const rdl_motion *motion)
{
    double size = 0.0;
    for (int i = 0; i < 4; i++)
        for (int k = 0; k < 3; k++)
            size = fmax(size, fmax(fabs(motion->start[i][k]), fabs(motion->end[i][k])));
    return size;
}

static int size_exponent(const rdl_motion *motion)
{
    int exponent;
    (void)frexp(motion_size(motion), &exponent);
    return exponent;
}

double motion_distance(int kind, const rdl_motion *motion, double t)
{
    int exponent = size_exponent(motion);
    return ldexp(scaled_distance(kind, motion, t, exponent), exponent);
}

double motion_least_distance(int kind, const rdl_motion *motion)
{
    enum { SAMPLES = 24 };
    int exponent = size_exponent(motion);
    double best = INFINITY, at = 0.0;
    for (int i = 0; i <= SAMPLES; i++) {
        double t = (double)i / SAMPLES, d = scaled_distance(kind, motion, t, exponent);
        if (d < best) {
            best = d;
            at = t;
        }
    }
    double lo = fmax(0.0, at - 1.0 / SAMPLES), hi = fmin(1.0, at + 1.0 / SAMPLES);
    for (int i = 0; i < 50; i++) {
        double a = lo + (hi - lo) / 3.0, b = hi - (hi - lo) / 3.0;
        double da = scaled_distance(kind, motion, a, exponent), db = scaled_distance(kind, motion, b, exponent);
        best = fmin(best, fmin(da, db));
        if (da < db)
            hi = b;
        else
            lo = a;
    }
    return ldexp(best, exponent);
}
