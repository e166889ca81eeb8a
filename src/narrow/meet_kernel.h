/* narrow/meet_kernel.h: gap 0 in lanes: the roots of the coplanarity cubic, and the inside test there, by certified signs.
 * Included after screen_kernel.h.
 *
 * Where the cubic's coefficients change their sign once there is one root, and a simple one. Where they change it twice, the
 * step is cut at the critical point between: the Bernstein coefficients of each part then change their sign once or not at
 * all. A narrow bracket of a root is certified by the signs of f at its ends. Everything else is left to the scalar
 * stages. */

/* Half the width of a bracket. */
#define BRACKET 0x1p-30

/* Value of f at t, from the coefficients f[i] times 1, 3, 3, 1. */
LANE_INLINE vec cubic_at(const vec f[4], vec t)
{
    vec s = 1 - t;
    return (f[0] * s + f[1] * t) * (s * s) + (f[2] * s + f[3] * t) * (t * t);
}

LANE_INLINE vec slope_at(const vec f[4], vec t)
{
    vec s = 1 - t;
    return (f[1] - 3 * f[0]) * (s * s) + 2 * (f[2] - f[1]) * (s * t) + (3 * f[3] - f[2]) * (t * t);
}

/* f changes its sign from a to b, once: Newton steps kept inside by bisection. It begins as a parabola at the end that is a
 * cut. Only a guess. */
LANE_INLINE vec guess_root(const vec f[4], vec a, vec b, vec at_a, vec at_b, bits flat_a, bits flat_b)
{
    bits rising = at_a < 0, moving = a <= b;
    vec share = at_a / (at_a - at_b);
    if (mask_of(flat_a | flat_b))
        share = pick(flat_a, root(share), pick(flat_b, 1 - root(1 - share), share));
    vec t = a + (b - a) * share;
    for (int i = 0; i < 8 && mask_of(moving); i++) {
        vec value = cubic_at(f, t), slope = slope_at(f, t);
        bits before = (value < 0) == rising;
        a = pick(before, t, a);
        b = pick(before, b, t);
        vec next = t - value / slope;
        bits held = (next >= a) & (next <= b);
        next = pick(held, next, 0.5 * (a + b));
        next = pick(moving, next, t); /* a lane's answer must not depend on its neighbours */
        moving &= absolute(next - t) > 0x1p-36;
        t = next;
    }
    return t;
}

enum { WITHIN_NO, WITHIN_YES, WITHIN_COUNT };

/* Whether the features hold the point at which the pair is coplanar at a time at most BRACKET from t: (w x v) . n / n . n
 * and its like are polynomials of degree 4 in t, wrong by rounding and by that much of their slope. */
LANE_INLINE void within(int kind, const block *b, vec t, bits where[WITHIN_COUNT])
{
    frames f = frames_at(b->at, t);
    vec3 n, wv, wu;
    for (int k = 0; k < 3; k++) {
        n.c[k] = cross(&f.u, &f.v, k);
        wv.c[k] = cross(&f.w, &f.v, k);
        wu.c[k] = cross(&f.w, &f.u, k);
    }
    vec w2 = larger(dot(&b->at[0].w, &b->at[0].w), dot(&b->at[1].w, &b->at[1].w));
    vec u2 = larger(dot(&b->at[0].u, &b->at[0].u), dot(&b->at[1].u, &b->at[1].u));
    vec v2 = larger(dot(&b->at[0].v, &b->at[0].v), dot(&b->at[1].v, &b->at[1].v));
    /* slope of a product of four vectors linear in t: at most 4 x 2 times the product of their largest norms, and rounding
     * of the frames (each difference once, interpolation three times) and of the products below 2^-44 of it */
    double loss = 8.01 * BRACKET + 0x1p-44;
    vec nw = root(w2), nu = root(u2), nv = root(v2), uv = nu * nv, square = dot(&n, &n), first = dot(&wv, &n);
    vec second = dot(&wu, &n), square_off = loss * (uv * uv) + RDLI_UNDERFLOW;
    vec first_off = loss * (nw * nv * uv) + RDLI_UNDERFLOW, second_off = loss * (nw * nu * uv) + RDLI_UNDERFLOW;
    bits facing = square > square_off, inside, outside;
    if (kind == RDL_POINT_TRIANGLE) {
        second = -second;
        vec rest = square - (first + second), rest_off = 2 * (square_off + first_off + second_off);
        inside = (first > first_off) & (second > second_off) & (rest > rest_off);
        outside = (-first > first_off) | (-second > second_off) | (-rest > rest_off);
    } else {
        vec over = square - first, across = square - second;
        vec over_off = 2 * (square_off + first_off), across_off = 2 * (square_off + second_off);
        inside = (first > first_off) & (second > second_off) & (over > over_off) & (across > across_off);
        outside = (-first > first_off) | (-second > second_off) | (-over > over_off) | (-across > across_off);
    }
    where[WITHIN_YES] = facing & inside;
    where[WITHIN_NO] = facing & outside;
}

typedef struct crossing {
    bits open, touch;
    vec lo, hi;
} crossing;

/* The part [a, b] of the step in the lanes of `ask`, on which f changes its sign exactly once, with certified signs at its
 * ends: is the pair in contact at the root? Lanes that are not certain become open. */
LANE_INLINE void cross_over(int kind, const block *blk, const vec f[4], vec bound, bits ask, vec a, vec b, bits twice,
                            crossing *c)
{
    bits where[WITHIN_COUNT];
    vec at_a = cubic_at(f, a), at_b = cubic_at(f, b), t;
    t = guess_root(f, a, b, at_a, at_b, twice & (a > 0), twice & (b < 1));
    vec lo = larger(t - BRACKET, a), hi = smaller(t + BRACKET, b);
    vec at_lo = cubic_at(f, lo), at_hi = cubic_at(f, hi);
    bits rising = (at_lo < -bound) & (at_hi > bound) & (at_a < 0), falling = (at_lo > bound) & (at_hi < -bound) & (at_a > 0);
    within(kind, blk, t, where);
    bits sure = (rising | falling) & (where[WITHIN_YES] | where[WITHIN_NO]);
    bits touch = ask & sure & where[WITHIN_YES];
    c->open |= ask & ~sure;
    c->touch |= touch;
    c->lo = pick(touch, lo, c->lo);
    c->hi = pick(touch, hi, c->hi);
}

/* Critical points of f in order; where they are no numbers, comparisons with them fail. */
LANE_INLINE void critical_points(const vec f[4], vec *first, vec *second)
{
    vec d0 = f[1] - 3 * f[0], d1 = f[2] - f[1], d2 = 3 * f[3] - f[2]; /* times 1, 1, 1: slope in Bernstein form */
    vec a = d0 - 2 * d1 + d2, h = d0 - d1, r = root(larger(h * h - a * d0, all(0)));
    vec q = h + pick(h > 0, r, -r), one = d0 / q, two = q / a;
    *first = pick(one < two, one, two);
    *second = pick(one < two, two, one);
}

/* The coefficients of f on [a, b], one of which is 0 or 1, all have the sign of `plus`, certified (de Casteljau's scheme: a
 * certain sum of three levels, below the bound's reserve). */
LANE_INLINE bits keeps_sign(const vec f[4], vec bound, bits plus, vec t, bool left)
{
    vec s = 1 - t, c[4] = {f[0], f[1] * (1.0 / 3), f[2] * (1.0 / 3), f[3]};
    bits keeps = plus | ~plus;
    for (int level = 3; level >= 0; level--) {
        vec value = left ? c[0] : c[level];
        keeps &= pick(plus, value, -value) > bound;
        for (int i = 0; i < level; i++)
            c[i] = s * c[i] + t * c[i + 1];
    }
    return keeps;
}

/* f has one sign at both ends of the step, and so at most two roots. The time of its extreme value on the other side; where
 * that is certified to be across 0 there is exactly one root before it and one after. *none: certainly no root. */
LANE_INLINE bits cut_between(const vec f[4], vec bound, vec *cut, bits *none)
{
    vec first, second;
    critical_points(f, &first, &second);
    bits plus = f[0] > 0, one_in = (first > 0) & (first < 1), two_in = (second > 0) & (second < 1);
    vec one = cubic_at(f, first), two = cubic_at(f, second);
    one = pick(plus, one, -one);
    two = pick(plus, two, -two);
    bits take_two = two_in & (~one_in | (two < one)), in = one_in | two_in;
    *cut = pick(take_two, second, first);
    vec value = pick(take_two, two, one);
    *none = in & (value > bound);
    if (mask_of(*none))
        *none &= keeps_sign(f, bound, plus, *cut, true) & keeps_sign(f, bound, plus, *cut, false);
    return in & (value < -bound);
}

LANE_INLINE void meet_half(int kind, const rdli_quad *quad, int half, rdli_answers *answers)
{
    points p;
    load_points(quad, half, &p);
    block b = block_of(kind, &p, all(0));
    vec f[4], bound, cut = all(0);
    cubic_of(&b, f, &bound);
    bits plus[4], minus[4];
    for (int i = 0; i < 4; i++) {
        plus[i] = f[i] > bound;
        minus[i] = f[i] < -bound;
    }
    bits once = (plus[0] & minus[3] & (plus[1] | minus[2])) | (minus[0] & plus[3] & (minus[1] | plus[2]));
    bits twice = (plus[0] & plus[3]) | (minus[0] & minus[3]);
    bits none = once & 0;
    if (mask_of(twice)) {
        bits cuts = cut_between(f, bound, &cut, &none);
        none &= twice;
        twice &= cuts;
    }
    cut = pick(twice, cut, all(0));
    crossing c = {~(once | twice | none), none & 0, all(0), all(0)};
    if (mask_of(twice))
        cross_over(kind, &b, f, bound, twice, all(0), cut, twice, &c);
    cross_over(kind, &b, f, bound, ~(c.open | c.touch | none), cut, all(1), twice, &c);
    unsigned open = mask_of(c.open), touch = mask_of(c.touch);
    for (int i = 0; i < LANE_WIDTH; i++) {
        answers->answer[half + i] = open >> i & 1 ? RDLI_LANE_OPEN : touch >> i & 1 ? RDLI_LANE_TOUCH : RDLI_LANE_FREE;
    }
    store(c.lo, answers->lo + half);
    store(c.hi, answers->hi + half);
}

static void meet(int kind, const rdli_quad *quad, rdli_answers *answers)
{
    for (int half = 0; half < RDLI_LANES; half += LANE_WIDTH) {
        if (kind == RDL_POINT_TRIANGLE)
            meet_half(RDL_POINT_TRIANGLE, quad, half, answers);
        else
            meet_half(RDL_EDGE_EDGE, quad, half, answers);
    }
}
