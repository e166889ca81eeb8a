/* narrow/filter.c: double-precision certificates. All bounds count one unit of 2^-52 per operation, twice the rounding to
 * nearest, so they hold in every rounding mode. */
#include "narrow/filter.h"

static const double unit = 0x1p-52;

int rdli_scale_points(const double *x, size_t count, double *scaled)
{
    double largest = 0;
    for (size_t i = 0; i < count; i++)
        largest = fabs(x[i]) > largest ? fabs(x[i]) : largest;
    if (largest == 0 || (largest > 0x1p-20 && largest < 0x1p20)) {
        memcpy(scaled, x, count * sizeof *x);
        return 0;
    }
    int exponent;
    frexp(largest, &exponent);
    int half = -exponent / 2; /* in two steps, because one factor may be out of range */
    double first = ldexp(1, half), second = ldexp(1, -exponent - half);
    for (size_t i = 0; i < count; i++)
        scaled[i] = x[i] * first * second;
    return -exponent;
}

static void subtract(const double a[3], const double b[3], double c[3])
{
    for (int k = 0; k < 3; k++)
        c[k] = a[k] - b[k];
}

static double dot(const double a[3], const double b[3])
{
    return a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
}

static double dot_absolute(const double a[3], const double b[3])
{
    return fabs(a[0] * b[0]) + fabs(a[1] * b[1]) + fabs(a[2] * b[2]);
}

static void cross(const double a[3], const double b[3], double c[3])
{
    c[0] = a[1] * b[2] - a[2] * b[1];
    c[1] = a[2] * b[0] - a[0] * b[2];
    c[2] = a[0] * b[1] - a[1] * b[0];
}

static double clamp(double x)
{
    return x > 0 ? (x < 1 ? x : 1) : 0; /* also takes NaN to 0 */
}

rdli_frame rdli_frame_of(int kind, const double x[4][3])
{
    rdli_frame f;
    bool edges = kind == RDL_EDGE_EDGE;
    subtract(x[edges ? 2 : 0], x[edges ? 0 : 1], f.w);
    subtract(x[edges ? 1 : 2], x[edges ? 0 : 1], f.u);
    subtract(x[3], x[edges ? 2 : 1], f.v);
    return f;
}

/* Keeps the combination of least length. PT: e = w - s u - r v; EE: e = -(w - s u + r v). */
static void offer(int kind, const rdli_frame *f, double s, double r, double *least, rdli_nearest *nearest)
{
    double e[3], sign = kind == RDL_EDGE_EDGE ? -1 : 1;
    for (int k = 0; k < 3; k++)
        e[k] = sign * ((f->w[k] - s * f->u[k]) - sign * (r * f->v[k]));
    double square = dot(e, e);
    if (!(square < *least))
        return;
    *least = square;
    memcpy(nearest->d, e, sizeof e);
    double weight[4] = {1, -(1 - s - r), -s, -r};
    if (kind == RDL_EDGE_EDGE) {
        weight[0] = 1 - s;
        weight[1] = s;
        weight[2] = -(1 - r);
        weight[3] = -r;
    }
    memcpy(nearest->weight, weight, sizeof weight);
}

static double foot(const double w[3], const double u[3])
{
    return clamp(dot(w, u) / dot(u, u));
}

static void nearest_triangle(const rdli_frame *f, double s, double r, double *least, rdli_nearest *nearest)
{
    if (s >= 0 && r >= 0 && s + r <= 1)
        offer(RDL_POINT_TRIANGLE, f, s, r, least, nearest);
    offer(RDL_POINT_TRIANGLE, f, foot(f->w, f->u), 0, least, nearest);
    offer(RDL_POINT_TRIANGLE, f, 0, foot(f->w, f->v), least, nearest);
    double w[3], u[3];
    subtract(f->w, f->u, w);
    subtract(f->v, f->u, u);
    double t = foot(w, u);
    offer(RDL_POINT_TRIANGLE, f, 1 - t, t, least, nearest);
}

static void nearest_edges(const rdli_frame *f, double s, double r, double *least, rdli_nearest *nearest)
{
    double end[3], back[3];
    for (int k = 0; k < 3; k++)
        back[k] = -f->w[k];
    offer(RDL_EDGE_EDGE, f, foot(f->w, f->u), 0, least, nearest);
    offer(RDL_EDGE_EDGE, f, 0, foot(back, f->v), least, nearest);
    for (int k = 0; k < 3; k++)
        end[k] = f->w[k] + f->v[k];
    offer(RDL_EDGE_EDGE, f, foot(end, f->u), 1, least, nearest);
    subtract(f->u, f->w, end);
    offer(RDL_EDGE_EDGE, f, 1, foot(end, f->v), least, nearest);
    if (s > 0 && s < 1 && r > 0 && r < 1)
        offer(RDL_EDGE_EDGE, f, s, r, least, nearest);
}

void rdli_nearest_points(int kind, const rdli_frame *f, rdli_nearest *nearest)
{
    double n[3], first[3], second[3], least = INFINITY;
    cross(f->u, f->v, n);
    cross(f->w, f->v, first);
    cross(f->w, f->u, second);
    double square = dot(n, n), s = dot(first, n) / square, r = dot(second, n) / square;
    *nearest = (rdli_nearest){.weight = {1, -1, 0, 0}};
    if (kind == RDL_POINT_TRIANGLE)
        nearest_triangle(f, s, -r, &least, nearest);
    else
        nearest_edges(f, s, r, &least, nearest);
}

/* d . (a - b) less a bound of its rounding. Four roundings per term (difference, product, two sums), one for the
 * bound's own. */
static double along(const double d[3], const double a[3], const double b[3])
{
    double e[3];
    subtract(a, b, e);
    return dot(d, e) - (8 * unit * dot_absolute(d, e) + RDLI_UNDERFLOW);
}

double rdli_least_along(int kind, const double x[4][3], const double d[3])
{
    double least = INFINITY;
    int firsts = kind == RDL_EDGE_EDGE ? 2 : 1;
    for (int i = 0; i < firsts; i++)
        for (int j = firsts; j < 4; j++) {
            double value = along(d, x[i], x[j]);
            least = value < least ? value : least;
        }
    return least;
}

bool rdli_direction_keeps(int kind, const rdl_motion *motion, const double d[3], double gap)
{
    double bound = gap * sqrt(dot(d, d)) * (1 + 8 * unit) + RDLI_UNDERFLOW;
    return rdli_least_along(kind, motion->start, d) > bound && rdli_least_along(kind, motion->end, d) > bound;
}

/* Triple product and the sum of the absolute values of its six terms. */
static void triple(const double w[3], const double u[3], const double v[3], double *value, double *absolute)
{
    double a0 = u[1] * v[2], b0 = u[2] * v[1], a1 = u[2] * v[0], b1 = u[0] * v[2], a2 = u[0] * v[1], b2 = u[1] * v[0];
    *value += w[0] * (a0 - b0) + w[1] * (a1 - b1) + w[2] * (a2 - b2);
    *absolute += fabs(w[0]) * (fabs(a0) + fabs(b0)) + fabs(w[1]) * (fabs(a1) + fabs(b1)) + fabs(w[2]) * (fabs(a2) + fabs(b2));
}

bool rdli_cubic_keeps(int kind, const rdl_motion *motion)
{
    rdli_frame f[2] = {rdli_frame_of(kind, motion->start), rdli_frame_of(kind, motion->end)};
    int sign = 0;
    for (int i = 0; i < 4; i++) {
        double value = 0, absolute = 0;
        for (int pick = 0; pick < 8; pick++) {
            int a = pick & 1, b = pick >> 1 & 1, c = pick >> 2;
            if (a + b + c == i)
                triple(f[a].w, f[b].u, f[c].v, &value, &absolute);
        }
        /* roundings per term: 3 differences, 2 products, 1 in the cross product, 2 in the dot, 3 in the sum over picks;
         * the bound's own roundings are covered by the rest of 16 */
        double bound = 16 * unit * absolute + RDLI_UNDERFLOW;
        int here = value > bound ? 1 : value < -bound ? -1 : 0;
        if (here == 0 || here * sign < 0)
            return false;
        sign = here;
    }
    return true;
}

bool rdli_filter_quiet(int kind, const rdl_motion *motion, double gap, uint8_t *stage)
{
    rdli_frame start = rdli_frame_of(kind, motion->start), end = rdli_frame_of(kind, motion->end), middle;
    for (int k = 0; k < 3; k++) {
        middle.w[k] = 0.5 * (start.w[k] + end.w[k]);
        middle.u[k] = 0.5 * (start.u[k] + end.u[k]);
        middle.v[k] = 0.5 * (start.v[k] + end.v[k]);
    }
    const rdli_frame *frames[3] = {&middle, &start, &end};
    *stage = RDL_STAGE_DIRECTION;
    for (int i = 0; i < 3; i++) {
        rdli_nearest nearest;
        rdli_nearest_points(kind, frames[i], &nearest);
        if (rdli_direction_keeps(kind, motion, nearest.d, gap))
            return true;
    }
    *stage = RDL_STAGE_CUBIC;
    return gap == 0 && rdli_cubic_keeps(kind, motion);
}
