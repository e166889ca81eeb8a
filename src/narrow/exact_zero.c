/* narrow/exact_zero.c: the touch at gap 0, exactly, for any finite doubles.
 *
 * The pair meets at t only if f(t) = w . (u x v) = 0. Where f is not identically zero its distinct roots in (0, 1) are
 * isolated by Sturm's theorem; at a root the pair meets or not by the signs of quadratics at that algebraic number. Where
 * f is identically zero the motion is planar and the first contact after a free start is that of a point with a segment,
 * whose times are roots of a component of w x u, or, on a common line, of a component of a difference vector. Signs at a
 * root are exact Tarski queries (Basu, Pollack, Roy 2006, ch. 2): the sign of q at the only root of f in (a, b) is
 * the difference of sign variations at a and b of the signed remainder sequence of f and f' q. */
#include "narrow/exact_pair.h"

enum { CHAIN = 6, FINE = 24 };

/* A time: exactly k / 2^m, or the only root of f in (k / 2^m, (k + 1) / 2^m). */
typedef struct instant {
    bool dyadic;
    rdli_int k;
    unsigned m;
    const rdli_poly *f;
} instant;

/* t : 1 - t, both >= 0 */
typedef struct proportion {
    rdli_int t, rest;
} proportion;

typedef struct chain {
    int count;
    rdli_poly p[CHAIN];
} chain;

static proportion proportion_of(rdli_arena *arena, rdli_int k, unsigned m, bool next)
{
    rdli_int one = rdli_int_of_word(arena, 1);
    rdli_int t = next ? rdli_int_add(arena, k, one) : k;
    return (proportion){t, rdli_int_sub(arena, rdli_int_shift(arena, one, m), t)};
}

/* Sign of sum c[i] t^i rest^(n-i). */
static int sign_at_proportion(rdli_arena *arena, const rdli_poly *q, proportion at)
{
    if (at.t.size == 0)
        return rdli_int_sign(q->c[0]);
    if (at.rest.size == 0)
        return rdli_int_sign(q->c[q->degree]);
    size_t mark = arena->used;
    rdli_int sum = q->c[q->degree], power = at.rest;
    for (int i = q->degree - 1; i >= 0; i--) {
        sum = rdli_int_add(arena, rdli_int_mul(arena, sum, at.t), rdli_int_mul(arena, q->c[i], power));
        if (i)
            power = rdli_int_mul(arena, power, at.rest);
    }
    arena->used = mark;
    return rdli_int_sign(sum);
}

/* The polynomial in x = t / (1 - t) without its roots at 0 and infinity. */
static rdli_poly deflated(const rdli_poly *f)
{
    int low = 0, high = f->degree;
    while (low < high && f->c[low].size == 0)
        low++;
    while (high > low && f->c[high].size == 0)
        high--;
    rdli_poly g = {.degree = high - low};
    for (int i = low; i <= high; i++)
        g.c[i - low] = f->c[i];
    return g;
}

static void drop_leading_zeros(rdli_poly *f)
{
    while (f->degree > 0 && f->c[f->degree].size == 0)
        f->degree--;
}

static rdli_poly derivative(rdli_arena *arena, const rdli_poly *f)
{
    rdli_poly d = {.degree = f->degree ? f->degree - 1 : 0};
    for (int i = 1; i <= f->degree; i++)
        d.c[i - 1] = rdli_int_times_word(arena, f->c[i], (uint64_t)i);
    return d;
}

/* A positive multiple of the remainder of a by b in x; both without leading zeros, b not zero. The quotient of an exact
 * division, up to a factor, goes to *quotient where one is asked for. */
static rdli_poly remainder_of(rdli_arena *arena, rdli_poly a, const rdli_poly *b, rdli_poly *quotient)
{
    rdli_int lead = b->c[b->degree];
    bool negative = lead.size < 0;
    rdli_int factor = rdli_int_magnitude(lead);
    if (b->degree == 0)
        return (rdli_poly){.degree = 0};
    if (quotient)
        *quotient = (rdli_poly){.degree = a.degree - b->degree};
    while (a.degree >= b->degree && !rdli_poly_is_zero(&a)) {
        int shift = a.degree - b->degree;
        rdli_int top = negative ? rdli_int_negate(a.c[a.degree]) : a.c[a.degree];
        if (quotient) {
            for (int i = shift + 1; i <= quotient->degree; i++)
                quotient->c[i] = rdli_int_mul(arena, quotient->c[i], factor);
            quotient->c[shift] = top;
        }
        for (int i = 0; i < a.degree; i++) {
            size_t mark = arena->used;
            rdli_int scaled = rdli_int_mul(arena, a.c[i], factor);
            if (i >= shift)
                scaled = rdli_int_sub(arena, scaled, rdli_int_mul(arena, top, b->c[i - shift]));
            a.c[i] = rdli_int_keep(arena, mark, scaled);
        }
        a.c[a.degree] = (rdli_int){NULL, 0};
        drop_leading_zeros(&a);
        if (arena->overflow)
            break;
    }
    return a;
}

/* Signed remainder sequence of f and g (g may be zero). */
static void build_chain(rdli_arena *arena, const rdli_poly *f, rdli_poly g, chain *s)
{
    drop_leading_zeros(&g);
    s->p[0] = *f;
    s->count = 1;
    while (!rdli_poly_is_zero(&g) && s->count < CHAIN) {
        s->p[s->count++] = g;
        if (g.degree == 0 || arena->overflow)
            break;
        rdli_poly r = remainder_of(arena, s->p[s->count - 2], &s->p[s->count - 1], NULL);
        for (int i = 0; i <= r.degree; i++)
            r.c[i] = rdli_int_negate(r.c[i]);
        g = r;
    }
}

static int variations(rdli_arena *arena, const chain *s, proportion at)
{
    int count = 0, last = 0;
    for (int i = 0; i < s->count; i++) {
        int sign = sign_at_proportion(arena, &s->p[i], at);
        count += sign * last < 0;
        last = sign ? sign : last;
    }
    return count;
}

/* Divides out multiple roots. A multiple root of a polynomial of degree at most 3 is rational: the last member of the
 * Sturm sequence is a power of its linear factor. */
static rdli_poly squarefree(rdli_arena *arena, const rdli_poly *f)
{
    chain s;
    build_chain(arena, f, derivative(arena, f), &s);
    const rdli_poly *last = &s.p[s.count - 1];
    if (f->degree < 2 || last->degree == 0)
        return *f;
    if (last->degree == f->degree - 1) { /* c (x - r)^n: the root of n c[n] x + c[n-1] */
        rdli_poly linear = {.degree = 1, .c = {f->c[f->degree - 1],
            rdli_int_times_word(arena, f->c[f->degree], (uint64_t)f->degree)}};
        return linear;
    }
    rdli_poly quotient;
    remainder_of(arena, *f, last, &quotient);
    return quotient;
}

/* The sign of a polynomial of degree <= 2 over the open interval, where all its Bernstein coefficients there agree. */
static int sign_over(rdli_arena *arena, const rdli_poly *q, proportion a, proportion b)
{
    int left = sign_at_proportion(arena, q, a), right = sign_at_proportion(arena, q, b);
    if (left * right < 0 || q->degree < 2)
        return left * right < 0 ? 0 : left + right > 0 ? 1 : left + right < 0 ? -1 : 0;
    size_t mark = arena->used;
    rdli_int first = rdli_int_mul(arena, q->c[0], rdli_int_mul(arena, a.rest, b.rest));
    rdli_int last = rdli_int_mul(arena, q->c[2], rdli_int_mul(arena, a.t, b.t));
    rdli_int mixed = rdli_int_add(arena, rdli_int_mul(arena, a.rest, b.t), rdli_int_mul(arena, b.rest, a.t));
    rdli_int polar = rdli_int_add(arena, rdli_int_times_word(arena, rdli_int_add(arena, first, last), 2),
                                  rdli_int_mul(arena, q->c[1], mixed));
    int middle = rdli_int_sign(polar);
    arena->used = mark;
    int low = left < right ? left : right, high = left < right ? right : left;
    low = middle < low ? middle : low;
    high = middle > high ? middle : high;
    return low >= 0 ? high : high <= 0 ? low : 0;
}

static int sign_at(rdli_arena *arena, const instant *at, const rdli_poly *q)
{
    size_t mark = arena->used;
    proportion a = proportion_of(arena, at->k, at->m, false);
    if (at->dyadic) {
        int sign = sign_at_proportion(arena, q, a);
        arena->used = mark;
        return sign;
    }
    proportion b = proportion_of(arena, at->k, at->m, true);
    int sign = sign_over(arena, q, a, b);
    if (sign == 0 && !rdli_poly_is_zero(q)) {
        rdli_poly slope = derivative(arena, at->f), weighted = rdli_poly_mul(arena, &slope, q);
        drop_leading_zeros(&weighted);
        chain s;
        build_chain(arena, at->f, remainder_of(arena, weighted, at->f, NULL), &s);
        sign = variations(arena, &s, a) - variations(arena, &s, b);
    }
    arena->used = mark;
    return sign;
}

static bool vector_vanishes(rdli_arena *arena, const instant *at, const rdli_int v[2][3])
{
    for (int k = 0; k < 3; k++) {
        rdli_poly line = {.degree = 1, .c = {v[0][k], v[1][k]}};
        if (sign_at(arena, at, &line))
            return false;
    }
    return true;
}

static bool on_segment(rdli_arena *arena, const instant *at, const rdli_point_segment *couple)
{
    size_t mark = arena->used;
    for (int k = 0; k < 3; k++) {
        rdli_poly cross = rdli_cross_component(arena, couple->w, couple->u, k);
        int sign = sign_at(arena, at, &cross);
        arena->used = mark;
        if (sign)
            return false;
    }
    if (vector_vanishes(arena, at, couple->u))
        return vector_vanishes(arena, at, couple->w);
    rdli_poly along = rdli_dot_poly(arena, couple->w, couple->u), square = rdli_dot_poly(arena, couple->u, couple->u);
    rdli_poly rest = rdli_poly_sub(arena, &square, &along);
    bool on = sign_at(arena, at, &along) >= 0 && sign_at(arena, at, &rest) >= 0;
    arena->used = mark;
    return on;
}

/* n_k does not vanish; all vectors lie in one plane. */
static bool inside_in_plane(rdli_arena *arena, const instant *at, const rdli_exact_pair *pair, int k, const rdli_poly *n,
                            int facing)
{
    rdli_poly first = rdli_cross_component(arena, pair->w, pair->v, k);
    rdli_poly second = rdli_cross_component(arena, pair->w, pair->u, k);
    if (sign_at(arena, at, &first) * facing < 0)
        return false;
    rdli_poly rest = rdli_poly_sub(arena, n, &first);
    if (pair->kind == RDL_POINT_TRIANGLE) {
        if (sign_at(arena, at, &second) * facing > 0)
            return false;
        rest = rdli_poly_add(arena, &rest, &second);
        return sign_at(arena, at, &rest) * facing >= 0;
    }
    if (sign_at(arena, at, &second) * facing < 0 || sign_at(arena, at, &rest) * facing < 0)
        return false;
    rest = rdli_poly_sub(arena, n, &second);
    return sign_at(arena, at, &rest) * facing >= 0;
}

/* Whether the pair, coplanar at the instant, meets then. */
static bool meets_when_coplanar(rdli_arena *arena, const instant *at, const rdli_exact_pair *pair)
{
    size_t mark = arena->used;
    for (int k = 0; k < 3; k++) {
        rdli_poly n = rdli_cross_component(arena, pair->u, pair->v, k);
        int facing = sign_at(arena, at, &n);
        if (facing) {
            bool inside = inside_in_plane(arena, at, pair, k, &n, facing);
            arena->used = mark;
            return inside;
        }
    }
    rdli_point_segment couples[RDLI_POINT_SEGMENTS];
    int count = rdli_point_segments(arena, pair, couples);
    bool meets = false;
    for (int i = 0; i < count && !meets; i++)
        meets = on_segment(arena, at, &couples[i]);
    arena->used = mark;
    return meets;
}

static rdli_poly coplanarity(rdli_arena *arena, const rdli_exact_pair *pair)
{
    rdli_poly f = {.degree = 3};
    for (int k = 0; k < 3; k++) {
        rdli_poly n = rdli_cross_component(arena, pair->u, pair->v, k);
        rdli_poly w = {.degree = 1, .c = {pair->w[0][k], pair->w[1][k]}};
        rdli_poly product = rdli_poly_mul(arena, &w, &n);
        f = k ? rdli_poly_add(arena, &f, &product) : product;
    }
    return f;
}

bool rdli_exact_meets(rdli_arena *arena, const rdli_exact_pair *pair, int end)
{
    size_t mark = arena->used;
    rdli_poly f = coplanarity(arena, pair);
    instant at = {.dyadic = true, .k = end ? rdli_int_of_word(arena, 1) : (rdli_int){NULL, 0}, .m = 0, .f = &f};
    bool meets = f.c[end ? 3 : 0].size == 0 && meets_when_coplanar(arena, &at, pair);
    arena->used = mark;
    return meets;
}

/* What the roots of an event polynomial are asked. */
typedef struct event {
    const rdli_exact_pair *pair;       /* the pair, where f is its coplanarity */
    const rdli_point_segment *couple;  /* else the point and the segment */
} event;

/* Bisects to the root of rank `rank` (from 1) of the squarefree f until it is alone between dyadic ends that are not
 * roots, or is itself the right end. */
static void isolate(rdli_arena *arena, const chain *s, int at_zero, int at_one, int rank, size_t mark, instant *root)
{
    int left = at_zero, right = at_one;
    root->k = (rdli_int){NULL, 0};
    root->m = 0;
    root->dyadic = false;
    for (;;) {
        arena->used = mark;
        root->k = rdli_int_keep(arena, mark, root->k);
        size_t above = arena->used;
        if (root->m >= FINE && left - right == 1) {
            proportion a = proportion_of(arena, root->k, root->m, false), b = proportion_of(arena, root->k, root->m, true);
            bool at_left = sign_at_proportion(arena, &s->p[0], a) == 0;
            root->dyadic = sign_at_proportion(arena, &s->p[0], b) == 0;
            if (root->dyadic || !at_left) {
                arena->used = above;
                if (root->dyadic)
                    root->k = rdli_int_keep(arena, mark, b.t);
                return;
            }
        }
        rdli_int twice = rdli_int_shift(arena, root->k, 1);
        proportion middle = proportion_of(arena, twice, ++root->m, true);
        int here = variations(arena, s, middle);
        bool go_left = at_zero - here >= rank;
        left = go_left ? left : here;
        right = go_left ? here : right;
        root->k = go_left ? twice : middle.t;
        if (arena->overflow)
            return;
    }
}

static void bracket_of(const instant *root, double *lo, double *hi)
{
    rdli_int k = root->k;
    *lo = rdli_int_below(k, -(int64_t)root->m);
    *hi = root->dyadic ? rdli_int_above(k, -(int64_t)root->m) : 1;
    if (root->dyadic)
        return;
    mp_limb_t room[2];
    rdli_arena small = {room, 0, 2, false};
    int64_t shift = rdli_int_bits(k) > 60 ? rdli_int_bits(k) - 60 : 0; /* 60 leading bits are finer than a double */
    rdli_int top = rdli_int_shift(&small, k, -shift);
    uint64_t next = (top.size ? top.limb[0] : 0) + 1;
    rdli_int up = {&next, 1};
    *hi = rdli_int_above(up, shift - (int64_t)root->m);
}

/* First root of f in (0, 1) at which the event happens. */
static bool first_event(rdli_arena *arena, const rdli_poly *f, const event *what, double *lo, double *hi, uint8_t *depth)
{
    size_t mark = arena->used;
    rdli_poly g = deflated(f);
    bool found = false;
    if (g.degree > 0 && rdli_poly_one_sign(&g) == 0) {
        g = squarefree(arena, &g);
        chain s;
        build_chain(arena, &g, derivative(arena, &g), &s);
        proportion zero = proportion_of(arena, (rdli_int){NULL, 0}, 0, false);
        proportion one = proportion_of(arena, (rdli_int){NULL, 0}, 0, true);
        int at_zero = variations(arena, &s, zero), at_one = variations(arena, &s, one);
        for (int rank = 1; rank <= at_zero - at_one && !found && !arena->overflow; rank++) {
            instant root = {.f = &g};
            isolate(arena, &s, at_zero, at_one, rank, arena->used, &root);
            found = what->pair ? meets_when_coplanar(arena, &root, what->pair) : on_segment(arena, &root, what->couple);
            if (found) {
                bracket_of(&root, lo, hi);
                *depth = (uint8_t)(root.m < 255 ? root.m : 255);
            }
        }
    }
    arena->used = mark;
    return found;
}

/* Polynomial whose roots hold all times at which the point may come onto the segment; which = 0, 1: the second is
 * needed only for a motion along one line. Returns false when there is none. */
static bool segment_event(rdli_arena *arena, const rdli_point_segment *couple, int which, rdli_poly *f)
{
    for (int k = 0; k < 3 && which == 0; k++) {
        *f = rdli_cross_component(arena, couple->w, couple->u, k);
        if (!rdli_poly_is_zero(f))
            return true;
    }
    for (int k = 0; k < 3; k++) {
        *f = (rdli_poly){.degree = 1, .c = {couple->w[0][k], couple->w[1][k]}};
        for (int end = 0; end < 2 && which; end++)
            f->c[end] = rdli_int_sub(arena, f->c[end], couple->u[end][k]);
        if (!rdli_poly_is_zero(f))
            return true;
    }
    return false;
}

static bool first_planar_event(rdli_arena *arena, const rdli_exact_pair *pair, rdl_touch *touch)
{
    rdli_point_segment couples[RDLI_POINT_SEGMENTS];
    int count = rdli_point_segments(arena, pair, couples);
    bool found = false;
    touch->time_lo = touch->time_hi = 1;
    for (int i = 0; i < count; i++)
        for (int which = 0; which < 2; which++) {
            size_t mark = arena->used;
            event what = {NULL, &couples[i]};
            rdli_poly f;
            double lo, hi;
            if (segment_event(arena, &couples[i], which, &f) && first_event(arena, &f, &what, &lo, &hi, &touch->depth)) {
                found = true;
                touch->time_lo = lo < touch->time_lo ? lo : touch->time_lo;
                touch->time_hi = hi < touch->time_hi ? hi : touch->time_hi;
            }
            arena->used = mark;
            if (f.degree == 2) /* not on one line */
                break;
        }
    return found;
}

void rdli_exact_zero(rdli_arena *arena, int kind, const rdl_motion *motion, rdl_touch *touch)
{
    rdli_exact_pair pair;
    rdli_exact_pair_of(arena, kind, motion, rdli_common_unit(motion, 0), &pair);
    *touch = (rdl_touch){.stage = RDL_STAGE_EXACT, .order = 3};
    if (rdli_exact_meets(arena, &pair, 0)) {
        touch->touches = 1;
        touch->stage = RDL_STAGE_ENDS;
        return;
    }
    rdli_poly f = coplanarity(arena, &pair);
    event what = {&pair, NULL};
    touch->touches = rdli_poly_is_zero(&f)
        ? first_planar_event(arena, &pair, touch)
        : first_event(arena, &f, &what, &touch->time_lo, &touch->time_hi, &touch->depth);
    if (!touch->touches) {
        touch->time_lo = touch->time_hi = 1;
        touch->touches = rdli_exact_meets(arena, &pair, 1);
    }
}
