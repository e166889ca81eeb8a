/* narrow/rest.c: exact predicates about states at rest. */
#include "narrow/exact_pair.h"
#include "raddle/rest.h"

/* p - q in units of 2^unit */
static void vector_between(rdli_arena *arena, const double p[3], const double q[3], int unit, rdli_int d[2][3])
{
    for (int k = 0; k < 3; k++) {
        size_t mark = arena->used;
        rdli_int a = rdli_int_of_double(arena, p[k], unit), b = rdli_int_of_double(arena, q[k], unit);
        d[0][k] = d[1][k] = rdli_int_keep(arena, mark, rdli_int_sub(arena, a, b));
    }
}

/* Sign of a . (b x c) for resting vectors. */
static int orientation(rdli_arena *arena, rdli_int a[2][3], rdli_int b[2][3], rdli_int c[2][3])
{
    size_t mark = arena->used;
    rdli_int sum = {NULL, 0};
    for (int k = 0; k < 3; k++) {
        rdli_poly n = rdli_cross_component(arena, (const rdli_int (*)[3])b, (const rdli_int (*)[3])c, k);
        sum = rdli_int_add(arena, sum, rdli_int_mul(arena, a[0][k], n.c[0]));
    }
    arena->used = mark;
    return rdli_int_sign(sum);
}

static rdl_motion resting(const double a[3], const double b[3], const double c[3], const double d[3])
{
    rdl_motion rest;
    const double *x[4] = {a, b, c, d};
    for (int i = 0; i < 4; i++) {
        memcpy(rest.start[i], x[i], sizeof rest.start[i]);
        memcpy(rest.end[i], x[i], sizeof rest.end[i]);
    }
    return rest;
}

/* Strict piercing: the ends on both sides of the plane, and the edge's line not outside any border. */
static int relation_by_signs(rdli_arena *arena, const double edge[2][3], const double triangle[3][3], int unit, bool *apart)
{
    rdli_int u[2][3], v[2][3], p[2][3], q[2][3], line[2][3], corner[3][2][3];
    vector_between(arena, triangle[1], triangle[0], unit, u);
    vector_between(arena, triangle[2], triangle[0], unit, v);
    vector_between(arena, edge[0], triangle[0], unit, p);
    vector_between(arena, edge[1], triangle[0], unit, q);
    int first = orientation(arena, p, u, v), second = orientation(arena, q, u, v);
    *apart = first * second > 0;
    if (first * second >= 0)
        return RDL_REST_APART;
    vector_between(arena, edge[1], edge[0], unit, line);
    for (int i = 0; i < 3; i++)
        vector_between(arena, triangle[i], edge[0], unit, corner[i]);
    int side = 0;
    for (int i = 0; i < 3; i++) {
        int here = orientation(arena, line, corner[i], corner[(i + 1) % 3]);
        if (here * side < 0)
            *apart = true;
        side = here ? here : side;
    }
    return *apart ? RDL_REST_APART : RDL_REST_PIERCE;
}

static bool meets(mp_limb_t *limbs, size_t room, int kind, const rdl_motion *rest, bool *answer)
{
    rdli_arena arena = {limbs, 0, room, false};
    rdli_exact_pair pair;
    rdli_exact_pair_of(&arena, kind, rest, rdli_common_unit(rest, 0), &pair);
    *answer = rdli_exact_meets(&arena, &pair, 0);
    return !arena.overflow;
}

static __attribute__((noinline)) bool wide_meets(int kind, const rdl_motion *rest)
{
    mp_limb_t limbs[RDLI_LARGE_ROOM];
    bool answer = true;
    return !meets(limbs, RDLI_LARGE_ROOM, kind, rest, &answer) || answer;
}

static __attribute__((noinline)) bool certain_meets(int kind, const rdl_motion *rest)
{
    mp_limb_t limbs[RDLI_SMALL_ROOM];
    bool answer = true;
    return meets(limbs, RDLI_SMALL_ROOM, kind, rest, &answer) ? answer : wide_meets(kind, rest);
}

bool rdli_meets_at_rest(int kind, const double x[4][3])
{
    rdl_motion rest = resting(x[0], x[1], x[2], x[3]);
    return certain_meets(kind, &rest);
}

static int by_signs(mp_limb_t *limbs, size_t room, const double edge[2][3], const double triangle[3][3], bool *apart,
                    bool *enough)
{
    rdli_arena arena = {limbs, 0, room, false};
    int unit = INT_MAX;
    for (int k = 0; k < 15; k++) {
        int lowest = rdli_lowest_bit(k < 6 ? (&edge[0][0])[k] : (&triangle[0][0])[k - 6]);
        unit = lowest < unit ? lowest : unit;
    }
    int relation = relation_by_signs(&arena, edge, triangle, unit == INT_MAX ? 0 : unit, apart);
    *enough = !arena.overflow;
    return relation;
}

static __attribute__((noinline)) int wide_by_signs(const double edge[2][3], const double triangle[3][3], bool *apart)
{
    mp_limb_t limbs[RDLI_LARGE_ROOM];
    bool enough;
    return by_signs(limbs, RDLI_LARGE_ROOM, edge, triangle, apart, &enough);
}

int rdli_edge_against_triangle(const double edge[2][3], const double triangle[3][3])
{
    mp_limb_t limbs[RDLI_SMALL_ROOM];
    bool apart, enough;
    int relation = by_signs(limbs, RDLI_SMALL_ROOM, edge, triangle, &apart, &enough);
    if (!enough)
        relation = wide_by_signs(edge, triangle, &apart);
    if (apart || relation == RDL_REST_PIERCE)
        return relation;
    for (int i = 0; i < 2; i++) {
        rdl_motion rest = resting(edge[i], triangle[0], triangle[1], triangle[2]);
        if (certain_meets(RDL_POINT_TRIANGLE, &rest))
            return RDL_REST_CONTACT;
    }
    for (int i = 0; i < 3; i++) {
        rdl_motion rest = resting(edge[0], edge[1], triangle[i], triangle[(i + 1) % 3]);
        if (certain_meets(RDL_EDGE_EDGE, &rest))
            return RDL_REST_CONTACT;
    }
    return RDL_REST_APART;
}
