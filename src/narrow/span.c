/* narrow/span.c: certificates for an interval by Bernstein coefficients of polynomials in t, in doubles.
 *
 * The pair stays further apart than a length when every way to come as near is excluded: an end at an end (degree 2), an
 * end at the inside of an edge (along: degree 2, length: degree 4), inside at inside (degree 4 and 6). The frames are
 * taken as exact here; all bounds are multiples of the products of the vectors' norms (docs/method/narrow.md,
 * "Rounding of the expansions"). */
#include "narrow/series.h"

/* One unit of 2^-52 per rounding holds in every rounding mode. */
static const double unit = 0x1p-52;

/* Each level is (1 + 2^-21) times the one before: the whole slack is below (1 + 1e-6)^2 - 1. */
static const double step = 0x1p-21;

typedef struct line {
    double at[2][3];
    double square; /* the larger squared norm of the two ends */
} line;

static double dot(const double a[3], const double b[3])
{
    return a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
}

static double larger(double a, double b)
{
    return a > b ? a : b;
}

static void set_square(line *l)
{
    l->square = larger(dot(l->at[0], l->at[0]), dot(l->at[1], l->at[1])) * (1 + 8 * unit);
}

static line combination(const line *a, double s, const line *b)
{
    line c;
    for (int end = 0; end < 2; end++)
        for (int k = 0; k < 3; k++)
            c.at[end][k] = a->at[end][k] + s * b->at[end][k];
    set_square(&c);
    return c;
}

rdli_margin rdli_margin_of(double length)
{
    rdli_margin margin;
    margin.free[0] = length * length * (1 + 8 * unit);
    for (int i = 0; i < 2; i++)
        margin.free[i + 1] = margin.free[i] * (1 + step);
    return margin;
}

/* The bound of the covering rules: four times the difference of two levels, from below. */
static double cover(double level)
{
    return 4 * step * level * (1 - 0x1p-20);
}

static void dot_of(const line *a, const line *b, double q[3])
{
    q[0] = dot(a->at[0], b->at[0]);
    q[1] = 0.5 * (dot(a->at[0], b->at[1]) + dot(a->at[1], b->at[0]));
    q[2] = dot(a->at[1], b->at[1]);
}

static void cross_of(const line *a, const line *b, double q[3][3])
{
    for (int k = 0; k < 3; k++) {
        int i = (k + 1) % 3, j = (k + 2) % 3;
        const double *a0 = a->at[0], *a1 = a->at[1], *b0 = b->at[0], *b1 = b->at[1];
        q[k][0] = a0[i] * b0[j] - a0[j] * b0[i];
        q[k][1] = 0.5 * ((a0[i] * b1[j] - a0[j] * b1[i]) + (a1[i] * b0[j] - a1[j] * b0[i]));
        q[k][2] = a1[i] * b1[j] - a1[j] * b1[i];
    }
}

/* sum over k of p[k] q[k], quadratics in Bernstein form: degree 4. */
static void product_of(const double p[3][3], const double q[3][3], double r[5])
{
    for (int i = 0; i < 5; i++)
        r[i] = 0;
    for (int k = 0; k < 3; k++) {
        r[0] += p[k][0] * q[k][0];
        r[1] += 0.5 * (p[k][0] * q[k][1] + p[k][1] * q[k][0]);
        r[2] += (p[k][0] * q[k][2] + p[k][2] * q[k][0] + 4 * (p[k][1] * q[k][1])) / 6;
        r[3] += 0.5 * (p[k][1] * q[k][2] + p[k][2] * q[k][1]);
        r[4] += p[k][2] * q[k][2];
    }
}

/* The same polynomial in degree 4. */
static void raise(const double q[3], double r[5])
{
    r[0] = q[0];
    r[1] = 0.5 * (q[0] + q[1]);
    r[2] = (q[0] + 4 * q[1] + q[2]) / 6;
    r[3] = 0.5 * (q[1] + q[2]);
    r[4] = q[2];
}

static bool all_at_most(const double *q, int count, double bound)
{
    for (int i = 0; i < count; i++)
        if (!(q[i] <= bound))
            return false;
    return true;
}

static bool all_at_least(const double *q, int count, double bound)
{
    for (int i = 0; i < count; i++)
        if (!(q[i] >= bound))
            return false;
    return true;
}

static bool end_keeps(const line *w, double level)
{
    double q[3];
    dot_of(w, w, q);
    return all_at_least(q, 3, level * (1 + unit) + 16 * unit * w->square + RDLI_UNDERFLOW);
}

/* Inside of the segment from the point: beyond an end all the time, or far from the line, or too short to matter. */
static bool inner_segment_keeps(const line *w, const line *u, const line *far, const double *level, int *order)
{
    double along[3], square[3], beyond[3], both = sqrt(w->square * u->square);
    dot_of(w, u, along);
    if (all_at_most(along, 3, -(16 * unit * both + RDLI_UNDERFLOW)))
        return true;
    dot_of(u, u, square);
    for (int i = 0; i < 3; i++)
        beyond[i] = square[i] - along[i];
    if (all_at_most(beyond, 3, -(16 * unit * (both + u->square) + RDLI_UNDERFLOW)))
        return true;
    double cross[3][3], length[5], raised[5];
    *order = *order < 4 ? 4 : *order;
    cross_of(w, u, cross);
    product_of((const double (*)[3])cross, (const double (*)[3])cross, length);
    raise(square, raised);
    for (int i = 0; i < 5; i++)
        length[i] -= level[0] * raised[i];
    if (all_at_least(length, 5, 64 * unit * (w->square + level[0]) * u->square + RDLI_UNDERFLOW))
        return true;
    return all_at_most(square, 3, cover(level[0]) - 16 * unit * u->square - RDLI_UNDERFLOW) && end_keeps(w, level[1]) &&
           end_keeps(far, level[1]);
}

/* Lines of a pair: w, u, v; and the differences between the vertices: PT w - u, w - v; EE w + v, w - u, w + v - u. */
typedef struct lines {
    line w, u, v, difference[3], across;
    int differences;
    double n[3][3], square[5]; /* u x v and its square */
} lines;

static void set_vectors(const rdli_span *span, lines *l)
{
    for (int end = 0; end < 2; end++) {
        rdli_copy(span->at[end].w, l->w.at[end]);
        rdli_copy(span->at[end].u, l->u.at[end]);
        rdli_copy(span->at[end].v, l->v.at[end]);
    }
    set_square(&l->w);
    set_square(&l->u);
    set_square(&l->v);
    cross_of(&l->u, &l->v, l->n);
    product_of((const double (*)[3])l->n, (const double (*)[3])l->n, l->square);
}

static void set_differences(int kind, lines *l)
{
    l->difference[0] = combination(&l->w, -1, &l->u);
    if (kind == RDL_POINT_TRIANGLE) {
        l->difference[1] = combination(&l->w, -1, &l->v);
        l->across = combination(&l->v, -1, &l->u);
        l->differences = 2;
    } else {
        l->difference[1] = combination(&l->w, 1, &l->v);
        l->difference[2] = combination(&l->difference[1], -1, &l->u);
        l->differences = 3;
    }
}

static line reversed(const line *a)
{
    line b = *a;
    for (int end = 0; end < 2; end++)
        for (int k = 0; k < 3; k++)
            b.at[end][k] = -a->at[end][k];
    return b;
}

static bool boundary_keeps(int kind, const lines *l, const double *level, int *order)
{
    if (!end_keeps(&l->w, level[0]))
        return false;
    for (int i = 0; i < l->differences; i++)
        if (!end_keeps(&l->difference[i], level[0]))
            return false;
    if (kind == RDL_POINT_TRIANGLE)
        return inner_segment_keeps(&l->w, &l->u, &l->difference[0], level, order) &&
               inner_segment_keeps(&l->w, &l->v, &l->difference[1], level, order) &&
               inner_segment_keeps(&l->difference[0], &l->across, &l->difference[1], level, order);
    line back = reversed(&l->w), side = reversed(&l->difference[0]);
    return inner_segment_keeps(&l->w, &l->u, &l->difference[0], level, order) &&
           inner_segment_keeps(&l->difference[1], &l->u, &l->difference[2], level, order) &&
           inner_segment_keeps(&back, &l->v, &l->difference[1], level, order) &&
           inner_segment_keeps(&side, &l->v, &l->difference[2], level, order);
}

/* The squared height, degree 6, less level times the squared normal: where it stays positive the normal does not vanish
 * and two parallel planes that hold the features stay further apart than the level. */
static bool height_keeps(const lines *l, double level)
{
    const double (*n)[3] = l->n, *square = l->square;
    double h[4] = {0, 0, 0, 0}, r[7], e[7];
    for (int k = 0; k < 3; k++) {
        double w0 = l->w.at[0][k], w1 = l->w.at[1][k];
        h[0] += w0 * n[k][0];
        h[1] += (2 * w0 * n[k][1] + w1 * n[k][0]) / 3;
        h[2] += (w0 * n[k][2] + 2 * w1 * n[k][1]) / 3;
        h[3] += w1 * n[k][2];
    }
    r[0] = h[0] * h[0];
    r[1] = h[0] * h[1];
    r[2] = (2 * (h[0] * h[2]) + 3 * (h[1] * h[1])) / 5;
    r[3] = (h[0] * h[3] + 9 * (h[1] * h[2])) / 10;
    r[4] = (2 * (h[1] * h[3]) + 3 * (h[2] * h[2])) / 5;
    r[5] = h[2] * h[3];
    r[6] = h[3] * h[3];
    e[0] = square[0];
    e[1] = (square[0] + 2 * square[1]) / 3;
    e[2] = (square[0] + 8 * square[1] + 6 * square[2]) / 15;
    e[3] = (square[1] + 3 * square[2] + square[3]) / 5;
    e[4] = (square[4] + 8 * square[3] + 6 * square[2]) / 15;
    e[5] = (square[4] + 2 * square[3]) / 3;
    e[6] = square[4];
    for (int i = 0; i < 7; i++)
        r[i] -= level * e[i];
    return all_at_least(r, 7, 128 * unit * (l->w.square + level) * l->u.square * l->v.square + RDLI_UNDERFLOW);
}

/* No common normal through the inside of both features; or the normal all but vanishes and the boundary covers. */
static bool inside_keeps(int kind, const lines *l, const double *level, int *order)
{
    const double (*n)[3] = l->n, *square = l->square;
    double c[3][3], first[5], second[5], rest[5];
    double nu = sqrt(l->u.square), nv = sqrt(l->v.square), nw = sqrt(l->w.square), uv = nu * nv;
    double bound_first = 64 * unit * nw * nv * uv + RDLI_UNDERFLOW, bound_second = 64 * unit * nw * nu * uv + RDLI_UNDERFLOW;
    double bound_square = 64 * unit * uv * uv + RDLI_UNDERFLOW;
    cross_of(&l->w, &l->v, c);
    product_of((const double (*)[3])c, n, first);
    if (all_at_most(first, 5, -bound_first))
        return true;
    cross_of(&l->w, &l->u, c);
    product_of((const double (*)[3])c, n, second);
    double sign = kind == RDL_POINT_TRIANGLE ? -1 : 1;
    for (int i = 0; i < 5; i++)
        second[i] *= sign;
    if (all_at_most(second, 5, -bound_second))
        return true;
    for (int i = 0; i < 5; i++)
        rest[i] = square[i] - first[i] - (sign < 0 ? second[i] : 0);
    if (all_at_most(rest, 5, -2 * (bound_square + bound_first + bound_second)))
        return true;
    for (int i = 0; i < 5; i++)
        rest[i] = square[i] - second[i];
    if (sign > 0 && all_at_most(rest, 5, -2 * (bound_square + bound_second)))
        return true;
    double u[3], v[3], raised[5];
    dot_of(&l->u, &l->u, u);
    dot_of(&l->v, &l->v, v);
    for (int side = 0; side < 2; side++) {
        raise(side ? v : u, raised);
        for (int i = 0; i < 5; i++)
            rest[i] = square[i] - cover(level[0]) * raised[i];
        double longest = side ? l->v.square : l->u.square;
        if (all_at_most(rest, 5, -(2 * bound_square + 64 * unit * level[0] * longest + RDLI_UNDERFLOW)))
            return boundary_keeps(kind, l, level + 1, order);
    }
    return false;
}

bool rdli_span_keeps(int kind, const rdli_span *span, const rdli_margin *margin, int *order)
{
    lines l;
    set_vectors(span, &l);
    *order = 6;
    if (height_keeps(&l, margin->free[0]))
        return true;
    set_differences(kind, &l);
    return boundary_keeps(kind, &l, margin->free, order) && inside_keeps(kind, &l, margin->free, order);
}
