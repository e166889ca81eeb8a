/* narrow/exact_gap.c: the touch at a gap > 0 in fixed-point arithmetic.
 *
 * Used where double bounds cannot resolve the gap. The unit is 2^-100 of the gap's leading bit; difference vectors at the
 * ends of a dyadic time interval are truncated to it, which moves no distance by more than 3 sqrt(3) < PAD units, and
 * everything after that is exact. On an interval every way to come within the gap is excluded by the Bernstein
 * coefficients of polynomials in t: ends against ends (degree 2), ends against edges (2 and 4), inside against inside (4
 * and 6). Where an edge or a normal all but vanishes the polynomials vanish with it; then the distance to the boundary of
 * the feature, asked for a little more than the gap, covers its inside (docs/method/narrow.md, "Covering"). */
#include "narrow/exact_pair.h"

enum { FINE_GAP = 100, PAD = 6, SLACK_BITS = 21, ALARM_BITS = 19, WIDTH_BITS = 21, HI_BUDGET = 64, MOST_SPLITS = 8 };

typedef struct levels {
    rdli_int free[3];   /* squared: the gap with PAD; each next one (1 + 2^-21) times the one before */
    rdli_int touch;     /* squared: the gap less PAD */
    rdli_int alarm;     /* squared: still below gap (1 + 1e-6) */
} levels;

typedef struct moving {
    const rdli_exact_pair *pair;
    int64_t unit; /* exponent of the fixed-point unit */
} moving;

/* Node of the search: [k, k + 1] / 2^m. */
typedef struct node {
    rdli_int k;
    int64_t m;
} node;

/* All coefficients >= 0. */
static bool never_negative(const rdli_poly *q)
{
    for (int i = 0; i <= q->degree; i++)
        if (q->c[i].size < 0)
            return false;
    return true;
}

static bool never_positive(const rdli_poly *q)
{
    for (int i = 0; i <= q->degree; i++)
        if (q->c[i].size > 0)
            return false;
    return true;
}

static void vector_at(rdli_arena *arena, const rdli_int v[2][3], rdli_int t, rdli_int rest, int64_t shift, rdli_int at[3])
{
    for (int k = 0; k < 3; k++) {
        size_t mark = arena->used;
        rdli_int sum = rdli_int_add(arena, rdli_int_mul(arena, v[0][k], rest), rdli_int_mul(arena, v[1][k], t));
        at[k] = rdli_int_keep(arena, mark, rdli_int_shift(arena, sum, shift));
    }
}

/* The pair's vectors at t = k / 2^m in fixed-point units, as end `end` of local. */
static void place_at(rdli_arena *arena, const moving *motion, rdli_int k, int64_t m, int end, rdli_exact_pair *local)
{
    rdli_int rest = rdli_int_sub(arena, rdli_int_shift(arena, rdli_int_of_word(arena, 1), m), k);
    int64_t shift = motion->pair->unit - m - motion->unit;
    vector_at(arena, motion->pair->w, k, rest, shift, local->w[end]);
    vector_at(arena, motion->pair->u, k, rest, shift, local->u[end]);
    vector_at(arena, motion->pair->v, k, rest, shift, local->v[end]);
}

/* a(t) - level b(t) >= 0, or level b(t) - a(t) >= 0, over the interval; same degree. */
static bool at_least(rdli_arena *arena, const rdli_poly *a, rdli_int level, const rdli_poly *b)
{
    for (int i = 0; i <= a->degree; i++) {
        size_t mark = arena->used;
        int order = rdli_int_compare(a->c[i], rdli_int_mul(arena, level, b->c[i]));
        arena->used = mark;
        if (order < 0)
            return false;
    }
    return true;
}

static bool at_most(rdli_arena *arena, const rdli_poly *a, rdli_int level, const rdli_poly *b)
{
    for (int i = 0; i <= a->degree; i++) {
        size_t mark = arena->used;
        int order = rdli_int_compare(a->c[i], rdli_int_mul(arena, level, b->c[i]));
        arena->used = mark;
        if (order > 0)
            return false;
    }
    return true;
}

/* Bernstein coefficients of the constant 1 of degree 2. */
static rdli_poly unity(rdli_arena *arena)
{
    rdli_int one = rdli_int_of_word(arena, 1);
    return (rdli_poly){.degree = 2, .c = {one, rdli_int_of_word(arena, 2), one}};
}

static rdli_poly square_of_cross(rdli_arena *arena, const rdli_int a[2][3], const rdli_int b[2][3])
{
    rdli_poly sum;
    for (int k = 0; k < 3; k++) {
        rdli_poly c = rdli_cross_component(arena, a, b, k), square = rdli_poly_mul(arena, &c, &c);
        sum = k ? rdli_poly_add(arena, &sum, &square) : square;
    }
    return sum;
}

/* The difference of two levels, times 4: the bound of the covering rules. */
static rdli_int four_steps(rdli_arena *arena, const levels *level, int i)
{
    return rdli_int_shift(arena, rdli_int_sub(arena, level->free[i + 1], level->free[i]), 2);
}

/* Both ends of the segment stay at least the level away from the point. */
static bool ends_keep(rdli_arena *arena, const rdli_point_segment *couple, rdli_int level)
{
    rdli_poly one = unity(arena), near = rdli_dot_poly(arena, couple->w, couple->w);
    if (!at_least(arena, &near, level, &one))
        return false;
    rdli_int rest[2][3];
    for (int end = 0; end < 2; end++)
        for (int k = 0; k < 3; k++)
            rest[end][k] = rdli_int_sub(arena, couple->w[end][k], couple->u[end][k]);
    rdli_poly far = rdli_dot_poly(arena, (const rdli_int (*)[3])rest, (const rdli_int (*)[3])rest);
    return at_least(arena, &far, level, &one);
}

/* The whole segment stays at least level `i` away from the point. */
static bool segment_keeps(rdli_arena *arena, const rdli_point_segment *couple, const levels *level, int i)
{
    if (!ends_keep(arena, couple, level->free[i]))
        return false;
    rdli_poly along = rdli_dot_poly(arena, couple->w, couple->u), square = rdli_dot_poly(arena, couple->u, couple->u);
    rdli_poly beyond = rdli_poly_sub(arena, &square, &along);
    if (never_positive(&along) || never_positive(&beyond))
        return true;
    rdli_poly one = unity(arena), length = rdli_poly_mul(arena, &square, &one);
    rdli_poly cross = square_of_cross(arena, couple->w, couple->u);
    if (at_least(arena, &cross, level->free[i], &length))
        return true;
    rdli_int bound = four_steps(arena, level, i);
    return at_most(arena, &square, bound, &one) && ends_keep(arena, couple, level->free[i + 1]);
}

static bool boundary_keeps(rdli_arena *arena, const rdli_exact_pair *local, const levels *level, int i)
{
    size_t mark = arena->used;
    rdli_point_segment couples[RDLI_POINT_SEGMENTS];
    int count = rdli_point_segments(arena, local, couples);
    bool keeps = true;
    for (int j = 0; j < count && keeps; j++) {
        size_t inner = arena->used;
        keeps = segment_keeps(arena, &couples[j], level, i);
        arena->used = inner;
    }
    arena->used = mark;
    return keeps;
}

/* Sum of a_k(t) n_k(t) for the cross product a x b. */
static rdli_poly along_normal(rdli_arena *arena, const rdli_int a[2][3], const rdli_int b[2][3], const rdli_poly n[3])
{
    rdli_poly sum;
    for (int k = 0; k < 3; k++) {
        rdli_poly c = rdli_cross_component(arena, a, b, k), product = rdli_poly_mul(arena, &c, &n[k]);
        sum = k ? rdli_poly_add(arena, &sum, &product) : product;
    }
    return sum;
}

/* Whether over the whole interval no common normal meets the inside of both features, or it is long enough. */
static bool inside_keeps(rdli_arena *arena, const rdli_exact_pair *local, const rdli_poly n[3], const rdli_poly *square,
                         rdli_int level)
{
    rdli_poly first = along_normal(arena, local->w, local->v, n), second = along_normal(arena, local->w, local->u, n);
    rdli_poly rest = rdli_poly_sub(arena, square, &first);
    if (never_positive(&first))
        return true;
    if (local->kind == RDL_POINT_TRIANGLE) {
        rest = rdli_poly_add(arena, &rest, &second);
        if (never_negative(&second) || never_positive(&rest))
            return true;
    } else {
        rdli_poly other = rdli_poly_sub(arena, square, &second);
        if (never_positive(&second) || never_positive(&rest) || never_positive(&other))
            return true;
    }
    rdli_poly height;
    for (int k = 0; k < 3; k++) {
        rdli_poly w = {.degree = 1, .c = {local->w[0][k], local->w[1][k]}}, product = rdli_poly_mul(arena, &w, &n[k]);
        height = k ? rdli_poly_add(arena, &height, &product) : product;
    }
    rdli_poly one = unity(arena), length = rdli_poly_mul(arena, square, &one);
    height = rdli_poly_mul(arena, &height, &height);
    return at_least(arena, &height, level, &length);
}

/* Certifies that the distance stays above the gap over the interval. */
static bool interval_keeps(rdli_arena *arena, const rdli_exact_pair *local, const levels *level)
{
    if (!boundary_keeps(arena, local, level, 0))
        return false;
    rdli_poly n[3];
    for (int k = 0; k < 3; k++)
        n[k] = rdli_cross_component(arena, local->u, local->v, k);
    rdli_poly square = along_normal(arena, local->u, local->v, n);
    if (inside_keeps(arena, local, n, &square, level->free[0]))
        return true;
    rdli_int bound = four_steps(arena, level, 0);
    rdli_poly one = unity(arena), u = rdli_dot_poly(arena, local->u, local->u), v = rdli_dot_poly(arena, local->v, local->v);
    u = rdli_poly_mul(arena, &u, &one);
    v = rdli_poly_mul(arena, &v, &one);
    return (at_most(arena, &square, bound, &u) || at_most(arena, &square, bound, &v)) &&
           boundary_keeps(arena, local, level, 1);
}

static levels levels_of(rdli_arena *arena, double gap, int64_t unit)
{
    levels level;
    rdli_int length = rdli_int_of_double(arena, gap, (int)unit), pad = rdli_int_of_word(arena, PAD);
    rdli_int more = rdli_int_add(arena, length, pad), less = rdli_int_sub(arena, length, pad);
    level.free[0] = rdli_int_mul(arena, more, more);
    for (int i = 0; i < 2; i++)
        level.free[i + 1] = rdli_int_add(arena, level.free[i], rdli_int_shift(arena, level.free[i], -SLACK_BITS));
    level.touch = rdli_int_mul(arena, less, less);
    level.alarm = rdli_int_add(arena, level.free[0], rdli_int_shift(arena, level.free[0], -ALARM_BITS));
    return level;
}

enum nearness { NEAR_NOT, NEAR_ALARM, NEAR_TOUCH };

/* What the middle of the node shows. */
static enum nearness middle_of(rdli_arena *arena, const moving *motion, const node *at, const levels *level)
{
    size_t mark = arena->used;
    rdli_exact_pair local = {.kind = motion->pair->kind}; /* its other end is zero, and not looked at */
    rdli_int k = rdli_int_add(arena, rdli_int_shift(arena, at->k, 1), rdli_int_of_word(arena, 1));
    place_at(arena, motion, k, at->m + 1, 0, &local);
    rdli_ratio square = rdli_squared_distance(arena, &local, 0);
    enum nearness near = NEAR_NOT;
    if (rdli_int_compare(square.num, rdli_int_mul(arena, level->touch, square.den)) <= 0)
        near = NEAR_TOUCH;
    else if (rdli_int_compare(square.num, rdli_int_mul(arena, level->alarm, square.den)) <= 0)
        near = NEAR_ALARM;
    arena->used = mark;
    return near;
}

/* Whether [from, to] / 2^WIDTH_BITS is certified free. */
static bool cells_keep(rdli_arena *arena, const moving *motion, uint64_t from, uint64_t to, const levels *level)
{
    size_t mark = arena->used;
    rdli_exact_pair local = {.kind = motion->pair->kind};
    place_at(arena, motion, rdli_int_of_word(arena, from), WIDTH_BITS, 0, &local);
    place_at(arena, motion, rdli_int_of_word(arena, to), WIDTH_BITS, 1, &local);
    bool keeps = interval_keeps(arena, &local, level);
    arena->used = mark;
    return keeps;
}

/* A meeting at gap 0 before `meeting` is also a touch at the gap: what is left is to certify the time up to just before
 * it. False where an earlier touch is not excluded. */
static bool free_before(rdli_arena *arena, const moving *motion, const levels *level, double meeting, rdl_touch *touch)
{
    uint64_t ends[WIDTH_BITS + 1], free = 0, cell = (uint64_t)(meeting * (double)(1 << WIDTH_BITS));
    int top = 0, depth = 0;
    ends[0] = cell > 0 ? cell - 1 : 0;
    while (top >= 0 && free < ends[0]) {
        if (cells_keep(arena, motion, free, ends[top], level)) {
            free = ends[top--];
            continue;
        }
        uint64_t half = free + (ends[top] - free) / 2;
        if (half == free || top == MOST_SPLITS)
            return false;
        ends[++top] = half;
        depth = top > depth ? top : depth;
    }
    touch->time_lo = ldexp((double)free, -WIDTH_BITS);
    touch->time_hi = meeting;
    touch->touches = 1;
    touch->depth = (uint8_t)depth;
    return true;
}

static bool node_keeps(rdli_arena *arena, const moving *motion, const node *at, const levels *level)
{
    size_t mark = arena->used;
    rdli_exact_pair local = {.kind = motion->pair->kind};
    place_at(arena, motion, at->k, at->m, 0, &local);
    place_at(arena, motion, rdli_int_add(arena, at->k, rdli_int_of_word(arena, 1)), at->m, 1, &local);
    bool keeps = interval_keeps(arena, &local, level);
    arena->used = mark;
    return keeps;
}

/* k / 2^m rounded down, (k + 1) / 2^m rounded up. */
static double left_end(const node *at)
{
    return rdli_int_below(at->k, -at->m);
}

static double right_end(rdli_arena *arena, const node *at, bool middle)
{
    size_t mark = arena->used;
    rdli_int k = middle ? rdli_int_shift(arena, at->k, 1) : at->k;
    k = rdli_int_add(arena, k, rdli_int_of_word(arena, 1));
    double end = rdli_int_above(k, -(at->m + middle));
    arena->used = mark;
    return end;
}

/* To the next node on the right; false at the end of the step. The node's integer lives at mark. */
static bool advance(rdli_arena *arena, size_t mark, node *at)
{
    rdli_int next = rdli_int_add(arena, at->k, rdli_int_of_word(arena, 1));
    while (next.size && !(next.limb[0] & 1) && at->m > 0) {
        next = rdli_int_shift(arena, next, -1);
        at->m--;
    }
    at->k = rdli_int_keep(arena, mark, next);
    return at->m > 0; /* 1 = 1 / 2^0 is the end */
}

static void descend(rdli_arena *arena, size_t mark, node *at)
{
    at->k = rdli_int_keep(arena, mark, rdli_int_shift(arena, at->k, 1));
    at->m++;
}

/* Depth-first from the left. A node that is neither free nor can be split with profit is where the touch begins. */
static void search(rdli_arena *arena, const moving *motion, const levels *level, int64_t deepest, rdl_touch *touch)
{
    size_t mark = arena->used;
    node at = {{NULL, 0}, 0};
    bool hi_known = false, begun = false, inside = true;
    int budget = HI_BUDGET;
    int64_t depth = 0;
    touch->time_hi = 1;
    while (inside && !arena->overflow) {
        depth = at.m > depth ? at.m : depth;
        if (begun && --budget < 0) {
            touch->time_hi = 1;
            break;
        }
        if (node_keeps(arena, motion, &at, level)) {
            inside = advance(arena, mark, &at);
            continue;
        }
        enum nearness near = middle_of(arena, motion, &at, level);
        if (near == NEAR_TOUCH) {
            touch->time_hi = right_end(arena, &at, true);
            hi_known = true;
            if (begun)
                break;
        }
        bool beside = hi_known && right_end(arena, &at, false) == touch->time_hi;
        bool narrow = at.m >= WIDTH_BITS && (near != NEAR_NOT || beside || at.m >= deepest);
        if (!narrow) {
            descend(arena, mark, &at);
            continue;
        }
        if (!begun)
            touch->time_lo = left_end(&at);
        begun = true;
        if (hi_known)
            break;
        touch->time_hi = right_end(arena, &at, false);
        inside = advance(arena, mark, &at);
    }
    touch->touches = begun;
    touch->depth = (uint8_t)(depth < 255 ? depth : 255);
}

void rdli_exact_gap(rdli_arena *arena, int kind, const rdl_motion *motion, double gap, double meeting, rdl_touch *touch)
{
    *touch = (rdl_touch){.stage = RDL_STAGE_EXACT, .order = 6};
    if (rdli_exact_against_gap(arena, kind, motion, gap, 0) <= 0) {
        touch->touches = 1;
        touch->stage = RDL_STAGE_ENDS;
        return;
    }
    arena->used = 0;
    rdli_exact_pair pair;
    int exponent;
    frexp(gap, &exponent);
    rdli_exact_pair_of(arena, kind, motion, rdli_common_unit(motion, 0), &pair);
    moving scene = {&pair, (int64_t)exponent - 1 - FINE_GAP};
    levels level = levels_of(arena, gap, scene.unit);
    if (meeting <= 1 && free_before(arena, &scene, &level, meeting, touch))
        return;
    int64_t widest = 0;
    for (int end = 0; end < 2; end++)
        for (int k = 0; k < 3; k++) {
            const rdli_int parts[3] = {pair.w[end][k], pair.u[end][k], pair.v[end][k]};
            for (int i = 0; i < 3; i++)
                widest = rdli_int_bits(parts[i]) > widest ? rdli_int_bits(parts[i]) : widest;
        }
    int64_t deepest = widest + pair.unit - exponent + 64;
    search(arena, &scene, &level, deepest > WIDTH_BITS ? deepest : WIDTH_BITS, touch);
    if (!touch->touches)
        touch->time_lo = touch->time_hi = 1;
}
