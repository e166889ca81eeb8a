/* narrow/exact_pair.c: exact difference vectors, their products, and the exact squared distance at rest. */
#include "narrow/exact_pair.h"

int rdli_common_unit(const rdl_motion *motion, double gap)
{
    int unit = rdli_lowest_bit(gap);
    for (int i = 0; i < 4; i++)
        for (int k = 0; k < 3; k++) {
            int a = rdli_lowest_bit(motion->start[i][k]), b = rdli_lowest_bit(motion->end[i][k]);
            unit = a < unit ? a : unit;
            unit = b < unit ? b : unit;
        }
    return unit == INT_MAX ? 0 : unit;
}

static void difference(rdli_arena *arena, const rdl_motion *motion, int unit, int i, int j, rdli_int d[2][3])
{
    for (int k = 0; k < 3; k++) {
        for (int end = 0; end < 2; end++) {
            size_t mark = arena->used;
            double x = end ? motion->end[i][k] : motion->start[i][k], y = end ? motion->end[j][k] : motion->start[j][k];
            rdli_int a = rdli_int_of_double(arena, x, unit), b = rdli_int_of_double(arena, y, unit);
            d[end][k] = rdli_int_keep(arena, mark, rdli_int_sub(arena, a, b));
        }
    }
}

void rdli_exact_pair_of(rdli_arena *arena, int kind, const rdl_motion *motion, int unit, rdli_exact_pair *pair)
{
    bool edges = kind == RDL_EDGE_EDGE;
    pair->kind = kind;
    pair->unit = unit;
    difference(arena, motion, unit, edges ? 2 : 0, edges ? 0 : 1, pair->w);
    difference(arena, motion, unit, edges ? 1 : 2, edges ? 0 : 1, pair->u);
    difference(arena, motion, unit, 3, edges ? 2 : 1, pair->v);
}

static void combine(rdli_arena *arena, const rdli_int a[2][3], const rdli_int b[2][3], bool minus, rdli_int sum[2][3])
{
    for (int end = 0; end < 2; end++)
        for (int k = 0; k < 3; k++)
            sum[end][k] = minus ? rdli_int_sub(arena, a[end][k], b[end][k]) : rdli_int_add(arena, a[end][k], b[end][k]);
}

static void copy(const rdli_int a[2][3], rdli_int b[2][3])
{
    memcpy(b, a, 6 * sizeof(rdli_int));
}

int rdli_point_segments(rdli_arena *arena, const rdli_exact_pair *pair, rdli_point_segment couples[RDLI_POINT_SEGMENTS])
{
    copy(pair->w, couples[0].w);
    copy(pair->u, couples[0].u);
    copy(pair->v, couples[1].u);
    if (pair->kind == RDL_POINT_TRIANGLE) {
        copy(pair->w, couples[1].w);
        combine(arena, pair->w, pair->u, true, couples[2].w);
        combine(arena, pair->v, pair->u, true, couples[2].u);
        return 3;
    }
    for (int end = 0; end < 2; end++)
        for (int k = 0; k < 3; k++)
            couples[1].w[end][k] = rdli_int_negate(pair->w[end][k]);
    combine(arena, pair->w, pair->v, false, couples[2].w);
    copy(pair->u, couples[2].u);
    combine(arena, pair->u, pair->w, true, couples[3].w);
    copy(pair->v, couples[3].u);
    return 4;
}

/* Sum of sign_i a_i b_i for linear a_i, b_i: coefficients of 1, and of the middle and last Bernstein place. */
static rdli_int sum_of_products(rdli_arena *arena, const rdli_int a[], const rdli_int b[], int count)
{
    size_t mark = arena->used;
    rdli_int sum = {NULL, 0};
    for (int i = 0; i < count; i++)
        sum = rdli_int_add(arena, sum, rdli_int_mul(arena, a[i], b[i]));
    return rdli_int_keep(arena, mark, sum);
}

rdli_poly rdli_cross_component(rdli_arena *arena, const rdli_int a[2][3], const rdli_int b[2][3], int k)
{
    int i = (k + 1) % 3, j = (k + 2) % 3;
    rdli_poly q = {.degree = 2};
    for (int end = 0; end < 2; end++) {
        rdli_int left[2] = {a[end][i], rdli_int_negate(a[end][j])}, right[2] = {b[end][j], b[end][i]};
        q.c[2 * end] = sum_of_products(arena, left, right, 2);
    }
    rdli_int left[4] = {a[0][i], a[1][i], rdli_int_negate(a[0][j]), rdli_int_negate(a[1][j])};
    rdli_int right[4] = {b[1][j], b[0][j], b[1][i], b[0][i]};
    q.c[1] = sum_of_products(arena, left, right, 4);
    return q;
}

rdli_poly rdli_dot_poly(rdli_arena *arena, const rdli_int a[2][3], const rdli_int b[2][3])
{
    rdli_poly q = {.degree = 2};
    q.c[0] = sum_of_products(arena, a[0], b[0], 3);
    rdli_int left[6] = {a[0][0], a[0][1], a[0][2], a[1][0], a[1][1], a[1][2]};
    rdli_int right[6] = {b[1][0], b[1][1], b[1][2], b[0][0], b[0][1], b[0][2]};
    q.c[1] = sum_of_products(arena, left, right, 6);
    q.c[2] = sum_of_products(arena, a[1], b[1], 3);
    return q;
}

static rdli_int dot3(rdli_arena *arena, const rdli_int a[3], const rdli_int b[3])
{
    return sum_of_products(arena, a, b, 3);
}

static void cross3(rdli_arena *arena, const rdli_int a[3], const rdli_int b[3], rdli_int c[3])
{
    for (int k = 0; k < 3; k++) {
        int i = (k + 1) % 3, j = (k + 2) % 3;
        rdli_int left[2] = {a[i], rdli_int_negate(a[j])}, right[2] = {b[j], b[i]};
        c[k] = sum_of_products(arena, left, right, 2);
    }
}

static int compare_ratios(rdli_arena *arena, rdli_ratio a, rdli_ratio b)
{
    size_t mark = arena->used;
    int order = rdli_int_compare(rdli_int_mul(arena, a.num, b.den), rdli_int_mul(arena, b.num, a.den));
    arena->used = mark;
    return order;
}

/* The closest point is inside the segment: |w x u|^2 / |u|^2; else the nearer end. */
static rdli_ratio point_segment_ratio(rdli_arena *arena, const rdli_int w[3], const rdli_int u[3])
{
    rdli_int one = rdli_int_of_word(arena, 1);
    rdli_int along = dot3(arena, w, u), square = dot3(arena, u, u);
    if (rdli_int_sign(along) <= 0)
        return (rdli_ratio){dot3(arena, w, w), one};
    if (rdli_int_compare(along, square) >= 0) {
        rdli_int rest[3];
        for (int k = 0; k < 3; k++)
            rest[k] = rdli_int_sub(arena, w[k], u[k]);
        return (rdli_ratio){dot3(arena, rest, rest), one};
    }
    rdli_int cross[3];
    cross3(arena, w, u, cross);
    return (rdli_ratio){dot3(arena, cross, cross), square};
}

/* Whether the common normal n = u x v meets the inside of both features; n != 0. */
static bool normal_inside(rdli_arena *arena, const rdli_exact_pair *pair, int end, const rdli_int n[3], rdli_int square)
{
    rdli_int cross[3];
    cross3(arena, pair->w[end], pair->v[end], cross);
    rdli_int first = dot3(arena, cross, n);
    cross3(arena, pair->w[end], pair->u[end], cross);
    rdli_int second = dot3(arena, cross, n);
    if (pair->kind == RDL_POINT_TRIANGLE) {
        second = rdli_int_negate(second);
        rdli_int rest = rdli_int_sub(arena, rdli_int_sub(arena, square, first), second);
        return rdli_int_sign(first) >= 0 && rdli_int_sign(second) >= 0 && rdli_int_sign(rest) >= 0;
    }
    return rdli_int_sign(first) >= 0 && rdli_int_sign(second) >= 0 && rdli_int_compare(first, square) <= 0 &&
           rdli_int_compare(second, square) <= 0;
}

rdli_ratio rdli_squared_distance(rdli_arena *arena, const rdli_exact_pair *pair, int end)
{
    rdli_int n[3];
    cross3(arena, pair->u[end], pair->v[end], n);
    rdli_int square = dot3(arena, n, n);
    if (rdli_int_sign(square) && normal_inside(arena, pair, end, n, square)) {
        rdli_int height = dot3(arena, pair->w[end], n);
        return (rdli_ratio){rdli_int_mul(arena, height, height), square};
    }
    rdli_point_segment couples[RDLI_POINT_SEGMENTS];
    int count = rdli_point_segments(arena, pair, couples);
    rdli_ratio best = point_segment_ratio(arena, couples[0].w[end], couples[0].u[end]);
    for (int i = 1; i < count; i++) {
        rdli_ratio next = point_segment_ratio(arena, couples[i].w[end], couples[i].u[end]);
        if (compare_ratios(arena, next, best) < 0)
            best = next;
    }
    return best;
}

int rdli_exact_against_gap(rdli_arena *arena, int kind, const rdl_motion *motion, double gap, int end)
{
    rdl_motion rest = *motion;
    memcpy(end ? rest.start : rest.end, end ? motion->end : motion->start, sizeof rest.end);
    int unit = rdli_common_unit(&rest, gap);
    rdli_exact_pair pair;
    rdli_exact_pair_of(arena, kind, &rest, unit, &pair);
    rdli_int length = rdli_int_of_double(arena, gap, unit);
    rdli_ratio squared_gap = {rdli_int_mul(arena, length, length), rdli_int_of_word(arena, 1)};
    return compare_ratios(arena, rdli_squared_distance(arena, &pair, end), squared_gap);
}
