/* support/motions.c: see motions.h. Members that must be degenerate exactly are built from few-bit numbers, so that the
 * doubles hold them without rounding. */
#include "motions.h"

#include <float.h>
#include <math.h>
#include <stdbool.h>
#include <string.h>

static double *coordinate(rdl_motion *motion, int i)
{
    return i < 12 ? &motion->start[i / 3][i % 3] : &motion->end[(i - 12) / 3][i % 3];
}

static void scale_all(rdl_motion *motion, double factor)
{
    for (int i = 0; i < 24; i++)
        *coordinate(motion, i) *= factor;
}

static void shift_all(rdl_motion *motion, const double offset[3])
{
    for (int i = 0; i < 24; i++)
        *coordinate(motion, i) += offset[i % 3];
}

/* Changes some coordinates by a few units in the last place, or not at all. */
static void nudge(random_source *source, rdl_motion *motion, unsigned chance)
{
    for (int i = 0; i < 24; i++)
        if (random_below(source, 100) < chance) {
            double *x = coordinate(motion, i);
            *x = nextafter(*x, random_below(source, 2) ? INFINITY : -INFINITY);
        }
}

/* The same integer map on all points keeps every degeneracy; entries are small and the map is invertible. */
static void integer_map(random_source *source, rdl_motion *motion)
{
    double m[3][3], det;
    do {
        for (int i = 0; i < 3; i++)
            for (int j = 0; j < 3; j++)
                m[i][j] = random_grid(source, 3);
        det = m[0][0] * (m[1][1] * m[2][2] - m[1][2] * m[2][1]) - m[0][1] * (m[1][0] * m[2][2] - m[1][2] * m[2][0]) +
              m[0][2] * (m[1][0] * m[2][1] - m[1][1] * m[2][0]);
    } while (det == 0.0);
    double offset[3] = {random_grid(source, 8), random_grid(source, 8), random_grid(source, 8)};
    for (int i = 0; i < 24; i += 3) {
        double *x = coordinate(motion, i), y[3] = {x[0], x[1], x[2]};
        for (int k = 0; k < 3; k++)
            x[k] = m[k][0] * y[0] + m[k][1] * y[1] + m[k][2] * y[2] + offset[k];
    }
}

void make_random(random_source *source, int kind, rdl_motion *motion)
{
    (void)kind;
    for (int i = 0; i < 24; i++)
        *coordinate(motion, i) = random_between(source, -1.0, 1.0);
}

static void grid(random_source *source, rdl_motion *motion, int reach)
{
    for (int i = 0; i < 24; i++)
        *coordinate(motion, i) = random_grid(source, reach);
}

void make_grid(random_source *source, int kind, rdl_motion *motion)
{
    (void)kind;
    grid(source, motion, 4);
}

void make_small_grid(random_source *source, int kind, rdl_motion *motion)
{
    (void)kind;
    grid(source, motion, 1);
}

void make_near_parallel(random_source *source, int kind, rdl_motion *motion)
{
    make_random(source, kind, motion);
    double bend = pow(2.0, random_between(source, -56.0, -12.0));
    bool meet = random_below(source, 2) == 0;
    double (*ends[2])[3] = {motion->start, motion->end};
    for (int k = 0; k < 3; k++) {
        double miss = random_between(source, -0.1, 0.1);
        for (int e = 0; e < 2; e++) {
            double (*x)[3] = ends[e];
            double side = (e ? -miss : miss) + bend * random_between(source, -1.0, 1.0);
            double stretch = random_below(source, 4) == 0 ? 1.0 : 0.75;
            if (kind == RDL_POINT_TRIANGLE) {
                double along = x[2][k] - x[1][k];
                x[3][k] = x[1][k] + stretch * along + bend * random_between(source, -1.0, 1.0);
                if (meet)
                    x[0][k] = x[1][k] + 0.375 * along + side;
            } else {
                double along = x[1][k] - x[0][k];
                if (meet)
                    x[2][k] = x[0][k] + 0.375 * along + side;
                x[3][k] = x[2][k] + stretch * along + bend * random_between(source, -1.0, 1.0);
            }
        }
    }
}

void make_near_coplanar(random_source *source, int kind, rdl_motion *motion)
{
    make_random(source, kind, motion);
    double m[3][3], depth = random_below(source, 3) == 0 ? 0.0 : pow(2.0, random_between(source, -60.0, -20.0));
    random_rotation(source, m);
    for (int i = 0; i < 24; i += 3) {
        double *x = coordinate(motion, i), y[3] = {x[0], x[1], x[2] * depth};
        for (int k = 0; k < 3; k++)
            x[k] = m[k][0] * y[0] + m[k][1] * y[1] + m[k][2] * y[2];
    }
}

/* Two lattice directions of 18 bits, in-plane coordinates of 14 bits, offset 0, 1 or 1000: exact in 53 bits. */
void make_tilted_plane(random_source *source, int kind, rdl_motion *motion)
{
    (void)kind;
    static const double offsets[3] = {0.0, 1.0, 1000.0};
    double axis[2][3], offset[3];
    double where = offsets[random_below(source, 3)];
    int coarse = random_below(source, 3) == 0 ? 8 : 1 << 13;
    for (int k = 0; k < 3; k++) {
        axis[0][k] = random_grid(source, 1 << 17);
        axis[1][k] = random_grid(source, 1 << 17);
        offset[k] = where;
    }
    for (int i = 0; i < 24; i += 3) {
        double a = random_grid(source, coarse), b = random_grid(source, coarse);
        for (int k = 0; k < 3; k++)
            coordinate(motion, i)[k] = (a * axis[0][k] + b * axis[1][k]) * 0x1p-31;
    }
    shift_all(motion, offset);
}

void make_flat_plane(random_source *source, int kind, rdl_motion *motion)
{
    unsigned axis = random_below(source, 3);
    double level = random_grid(source, 2);
    if (random_below(source, 2) == 0)
        make_random(source, kind, motion);
    else
        grid(source, motion, 3);
    for (int i = 0; i < 24; i += 3)
        coordinate(motion, i)[axis] = level;
}

/* The double root of METHODS 1.5, its two-root and no-root neighbours, under integer maps. */
void make_graze(random_source *source, int kind, rdl_motion *motion)
{
    static const double point[8][3] = {{0, 8, 8}, {0, 0, 0}, {32, 0, 32}, {0, 32, 0},
                                       {16, 8, -8}, {0, 0, 0}, {32, 0, -32}, {0, 32, 0}};
    /* In the plane across the fixed edge the other edge's ends are (-1 + s/2, -s) and (1 + s/2, s), s = 2 t - 1: its
     * line passes the fixed edge at distance proportional to s^2. */
    static const double edges[8][3] = {{-32, 0, 0}, {32, 0, 0}, {0, -24, 16}, {0, 8, -16},
                                       {-32, 0, 0}, {32, 0, 0}, {0, -8, -16}, {0, 24, 16}};
    memcpy(motion, kind == RDL_POINT_TRIANGLE ? point : edges, sizeof *motion);
    int bits = (int)random_below(source, 48);
    double change = ldexp(random_grid(source, 1), -bits);
    motion->start[0][2] += change;
    motion->end[0][2] += change;
    integer_map(source, motion);
    if (random_below(source, 4) == 0)
        nudge(source, motion, 20);
}

/* The triple root of METHODS 1.5 (edges; for points the edge's end is the point and the triangle holds the other edge). */
void make_triple_root(random_source *source, int kind, rdl_motion *motion)
{
    static const double edges[8][3] = {{0, 0, 0}, {0, -2, 2}, {-2, 1, 1}, {2, -3, -1},
                                       {0, 0, 0}, {0, 2, 2}, {2, 3, 1}, {-2, -1, 3}};
    memcpy(motion, edges, sizeof *motion);
    if (kind == RDL_POINT_TRIANGLE && random_below(source, 2) == 0)
        for (int k = 0; k < 3; k++) {
            /* p = the middle of the first edge at t = 1/2 lies on the other edge, here a side of the triangle. */
            motion->start[0][k] = edges[0][k] + edges[1][k];
            motion->end[0][k] = edges[4][k] + edges[5][k];
        }
    scale_all(motion, 4.0);
    if (random_below(source, 2) == 0) {
        double change = ldexp(random_grid(source, 1), -(int)random_below(source, 40));
        motion->start[2][2] += change;
        motion->end[2][2] += change;
    }
    integer_map(source, motion);
}

/* Vertex `moved` is sent through `target` (given at t = 1/2) from a random start: all in multiples of 8, so exact. */
static void send_through(random_source *source, rdl_motion *motion, int moved, const double target[3])
{
    for (int k = 0; k < 3; k++) {
        motion->start[moved][k] = 8.0 * random_grid(source, 6);
        motion->end[moved][k] = 2.0 * target[k] - motion->start[moved][k];
    }
}

static double middle(const rdl_motion *motion, int i, int k)
{
    return 0.5 * (motion->start[i][k] + motion->end[i][k]);
}

void make_border(random_source *source, int kind, rdl_motion *motion)
{
    grid(source, motion, 6);
    scale_all(motion, 8.0);
    double share = 0.125 * random_below(source, 9), target[3];
    int a = kind == RDL_POINT_TRIANGLE ? 1 + (int)random_below(source, 3) : 2;
    int b = kind == RDL_POINT_TRIANGLE ? a % 3 + 1 : 3;
    for (int k = 0; k < 3; k++)
        target[k] = middle(motion, a, k) * (1.0 - share) + middle(motion, b, k) * share;
    send_through(source, motion, 0, target);
    if (random_below(source, 2) == 0)
        nudge(source, motion, 10);
}

void make_corner(random_source *source, int kind, rdl_motion *motion)
{
    grid(source, motion, 6);
    scale_all(motion, 8.0);
    double target[3];
    int a = kind == RDL_POINT_TRIANGLE ? 1 + (int)random_below(source, 3) : 2 + (int)random_below(source, 2);
    for (int k = 0; k < 3; k++)
        target[k] = middle(motion, a, k);
    send_through(source, motion, 0, target);
    if (random_below(source, 2) == 0)
        nudge(source, motion, 10);
}

/* Vertex 0 lies on the other feature, exactly; sometimes one unit in the last place beside it. */
static void place_on(random_source *source, int kind, double x[4][3])
{
    double s = 0.125 * random_below(source, 9), r = 0.125 * random_below(source, 9);
    if (kind == RDL_POINT_TRIANGLE) {
        double first = s + r > 1.0 ? 1.0 - s : s, second = s + r > 1.0 ? 1.0 - r : r;
        for (int k = 0; k < 3; k++)
            x[0][k] = x[1][k] * (1.0 - first - second) + x[2][k] * first + x[3][k] * second;
    } else {
        /* The point at share s of the second edge is the point at share 1/2 of the first, or its end. */
        double half = random_below(source, 3) == 0 ? 1.0 : 2.0;
        for (int k = 0; k < 3; k++) {
            double on = x[2][k] * (1.0 - s) + x[3][k] * s;
            x[0][k] = half == 1.0 ? on : 2.0 * on - x[1][k];
        }
    }
    if (random_below(source, 2) == 0) {
        unsigned i = random_below(source, 4), k = random_below(source, 3);
        x[i][k] = nextafter(x[i][k], random_below(source, 2) ? INFINITY : -INFINITY);
    }
}

void make_at_start(random_source *source, int kind, rdl_motion *motion)
{
    grid(source, motion, 6);
    scale_all(motion, 8.0);
    place_on(source, kind, motion->start);
}

void make_at_end(random_source *source, int kind, rdl_motion *motion)
{
    grid(source, motion, 6);
    scale_all(motion, 8.0);
    place_on(source, kind, motion->end);
}

void make_tiny(random_source *source, int kind, rdl_motion *motion)
{
    if (random_below(source, 2) == 0)
        make_random(source, kind, motion);
    else
        make_border(source, kind, motion);
    scale_all(motion, 1e-300);
}

void make_subnormal(random_source *source, int kind, rdl_motion *motion)
{
    unsigned which = random_below(source, 3);
    if (which == 0)
        make_random(source, kind, motion);
    else if (which == 1)
        make_small_grid(source, kind, motion);
    else
        make_border(source, kind, motion);
    scale_all(motion, which == 0 ? 0x1p-1050 : DBL_TRUE_MIN);
}

void make_offset(random_source *source, int kind, rdl_motion *motion)
{
    make_random(source, kind, motion);
    double size = pow(2.0, random_between(source, 10.0, 46.0)), offset[3];
    random_direction(source, offset);
    for (int k = 0; k < 3; k++)
        offset[k] *= size;
    shift_all(motion, offset);
}

void make_mixed(random_source *source, int kind, rdl_motion *motion)
{
    (void)kind;
    unsigned style = random_below(source, 3);
    for (int i = 0; i < 24; i++) {
        double size = 1.0;
        if (style == 0)
            size = random_below(source, 2) ? 1e300 : 1e-300;
        else if (style == 1)
            size = pow(10.0, random_between(source, -300.0, 300.0));
        else
            size = random_below(source, 6) ? 1.0 : (random_below(source, 2) ? 1e300 : 1e-300);
        *coordinate(motion, i) = size * random_grid(source, 2);
    }
}

void make_still(random_source *source, int kind, rdl_motion *motion)
{
    if (random_below(source, 2) == 0)
        make_small_grid(source, kind, motion);
    else
        make_at_start(source, kind, motion);
    memcpy(motion->end, motion->start, sizeof motion->end);
}
