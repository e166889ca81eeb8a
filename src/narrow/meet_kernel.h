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

/* A part of the step on which f changes its sign once; a flat end is a critical point of f. */
typedef struct part {
    vec a, b, at_a, at_b, t;
    bits flat_a, flat_b, moving;
} part;

/* Guesses of the roots: Newton steps kept inside by bisection. They begin as a parabola at an end that is flat. All parts go
 * together, because each step waits for its division. */
LANE_INLINE void guess_roots(const vec f[4], int count, part *p)
{
    for (int j = 0; j < count; j++) {
        vec share = p[j].at_a / (p[j].at_a - p[j].at_b);
        if (mask_of(p[j].flat_a | p[j].flat_b))
            share = pick(p[j].flat_a, root(share), pick(p[j].flat_b, 1 - root(1 - share), share));
        p[j].t = p[j].a + (p[j].b - p[j].a) * share;
        p[j].moving = p[j].a <= p[j].b;
    }
    for (int i = 0; i < 8; i++) {
        bits moving = p[0].moving & 0;
        for (int j = 0; j < count; j++) {
            vec t = p[j].t, value = cubic_at(f, t), slope = slope_at(f, t), next = t - value / slope;
            bits before = (value < 0) == (p[j].at_a < 0);
            p[j].a = pick(before, t, p[j].a);
            p[j].b = pick(before, p[j].b, t);
            bits held = (next >= p[j].a) & (next <= p[j].b);
            next = pick(held, next, 0.5 * (p[j].a + p[j].b));
            next = pick(p[j].moving, next, t); /* a lane's answer must not depend on its neighbours */
            p[j].moving &= absolute(next - t) > 0x1p-36;
            p[j].t = next;
            moving |= p[j].moving;
        }
        if (!mask_of(moving))
            break;
    }
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

/* In the lanes of `ask`, with t a guess of the only root in [a, b], at whose ends f has certified signs: is the pair in
 * contact at the root? Lanes that are not certain become open. */
LANE_INLINE void cross_over(int kind, const block *blk, const vec f[4], vec bound, bits ask, vec a, vec b, vec t, crossing *c)
{
    bits where[WITHIN_COUNT];
    vec lo = larger(t - BRACKET, a), hi = smaller(t + BRACKET, b), at_lo = cubic_at(f, lo), at_hi = cubic_at(f, hi);
    bits crosses = ((at_lo < -bound) & (at_hi > bound)) | ((at_lo > bound) & (at_hi < -bound));
    within(kind, blk, t, where);
    bits sure = crosses & (where[WITHIN_YES] | where[WITHIN_NO]), touch = ask & sure & where[WITHIN_YES];
    c->open |= ask & ~sure;
    c->touch |= touch;
    c->lo = pick(touch, lo, c->lo);
    c->hi = pick(touch, hi, c->hi);
}

/* The roots in the lanes of `ask`: one before and one after the cut in those of `twice`, else one. */
LANE_INLINE void cross_all(int kind, const block *b, const vec f[4], vec bound, bits ask, bits twice, vec cut, crossing *c)
{
    vec at_cut = cubic_at(f, cut);
    bits never = ask & ~ask;
    part p[2] = {{cut, all(1), at_cut, f[3], cut, twice, never, never}, {all(0), cut, f[0], at_cut, cut, never, twice, never}};
    bool both = mask_of(twice) != 0;
    if (both) {
        guess_roots(f, 2, p);
        cross_over(kind, b, f, bound, twice, all(0), cut, p[1].t, c);
        ask &= ~(c->open | c->touch);
    } else {
        guess_roots(f, 1, p);
    }
    if (mask_of(ask))
        cross_over(kind, b, f, bound, ask, cut, all(1), p[0].t, c);
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
    cross_all(kind, &b, f, bound, once | twice, twice, cut, &c);
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
