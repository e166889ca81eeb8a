/* narrow/exact_zero.c: the touch at gap 0, exactly, for any finite doubles.
 *
 * The pair meets at t only if f(t) = w . (u x v) = 0. Where f is not identically zero its distinct roots in (0, 1) are
 * isolated by Sturm's theorem; at a root the pair meets or not by the signs of quadratics at that algebraic number. Where
 * f is identically zero the motion is planar and the first contact after a free start is that of a point with a segment,
 * whose times are roots of a component of w x u, or, on a common line, of a component of a difference vector. Signs at a
 * root are exact Tarski queries (Basu, Pollack, Roy 2006, ch. 2): the sign of q at the only root of f in (a, b) is
 * the difference of sign variations at a and b of the signed remainder sequence of f and f' q. */
#include "narrow/exact_pair.h"
#include "narrow/roots.h"

enum { CHAIN = 6, FINE = 24, SHARP = 72 };

/* A time: exactly k / 2^m, or the only root of f in (k / 2^m, (k + 1) / 2^m). */
typedef struct instant {
    bool dyadic;
    rdli_int k;
    unsigned m;
    const rdli_poly *f;
    mp_limb_t own[2]; /* where k lives while it is short, so that it can be sharpened in place */
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

/* sum c[i] t^i rest^(n-i) */
static rdli_int value_at_proportion(rdli_arena *arena, const rdli_poly *q, proportion at)
{
    if (at.t.size == 0)
        return q->c[0];
    if (at.rest.size == 0)
        return q->c[q->degree];
    rdli_int sum = q->c[q->degree], power = at.rest;
    for (int i = q->degree - 1; i >= 0; i--) {
        sum = rdli_int_add(arena, rdli_int_mul(arena, sum, at.t), rdli_int_mul(arena, q->c[i], power));
        if (i)
            power = rdli_int_mul(arena, power, at.rest);
    }
    return sum;
}

static int sign_at_proportion(rdli_arena *arena, const rdli_poly *q, proportion at)
{
    size_t mark = arena->used;
    int sign = rdli_int_sign(value_at_proportion(arena, q, at));
    arena->used = mark;
    return sign;
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

/* |a| / (|a| + |b|) */
static double share_of(rdli_int a, rdli_int b)
{
    int64_t bits = rdli_int_bits(a) > rdli_int_bits(b) ? rdli_int_bits(a) : rdli_int_bits(b);
    double x = rdli_int_below(a, -bits), y = rdli_int_below(b, -bits);
    return x / (x + y);
}

/* Finds the cell of (k, k + 2^more) / 2^m that holds the only root of f in it; `left` is f's sign at its left end, not 0,
 * and guess a cell that may be right. Leaves an exact root where a cell's end is one. */
static void find_cell(rdli_arena *arena, instant *at, unsigned more, uint64_t guess, int left)
{
    size_t mark = arena->used;
    rdli_int base = rdli_int_shift(arena, at->k, more);
    uint64_t lo = 0, hi = UINT64_C(1) << more, step = 1;
    at->m += more;
    size_t above = arena->used;
    while (hi - lo > 1 && !at->dyadic) {
        uint64_t cut = guess > lo && guess < hi ? guess : guess <= lo ? lo + step : hi - step;
        cut = cut > lo && cut < hi ? cut : lo + (hi - lo) / 2;
        rdli_int k = rdli_int_add(arena, base, rdli_int_of_word(arena, cut));
        int sign = sign_at_proportion(arena, at->f, proportion_of(arena, k, at->m, false));
        arena->used = above;
        at->dyadic = sign == 0;
        bool right = sign == left;
        lo = right || at->dyadic ? cut : lo;
        hi = right ? hi : cut;
        step = (guess == cut) ? 1 : step * 8;
        if (arena->overflow)
            break;
    }
    rdli_int k = rdli_int_add(arena, base, rdli_int_of_word(arena, lo));
    if (!arena->overflow)
        memcpy(at->own, k.limb, (size_t)k.size * sizeof *k.limb);
    at->k = (rdli_int){at->own, k.size};
    arena->used = mark;
}

/* Makes the interval 2^16 times narrower, by the secant. */
static void sharpen(rdli_arena *arena, instant *at)
{
    size_t mark = arena->used;
    rdli_int a = value_at_proportion(arena, at->f, proportion_of(arena, at->k, at->m, false));
    rdli_int b = value_at_proportion(arena, at->f, proportion_of(arena, at->k, at->m, true));
    double share = share_of(a, b);
    int left = rdli_int_sign(a);
    arena->used = mark;
    find_cell(arena, at, 16, (uint64_t)(share * 0x1p16), left);
}

/* The sign of q at the only root of at->f in the interval, by a Tarski query. */
static int sign_by_query(rdli_arena *arena, const instant *at, const rdli_poly *q, proportion a, proportion b)
{
    rdli_poly slope = derivative(arena, at->f), weighted = rdli_poly_mul(arena, &slope, q);
    drop_leading_zeros(&weighted);
    chain s;
    build_chain(arena, at->f, remainder_of(arena, weighted, at->f, NULL), &s);
    return variations(arena, &s, a) - variations(arena, &s, b);
}

static int sign_at(rdli_arena *arena, instant *at, const rdli_poly *q)
{
    if (rdli_poly_is_zero(q))
        return 0;
    for (;;) {
        size_t mark = arena->used;
        proportion a = proportion_of(arena, at->k, at->m, false);
        int sign;
        if (at->dyadic) {
            sign = sign_at_proportion(arena, q, a);
            arena->used = mark;
            return sign;
        }
        proportion b = proportion_of(arena, at->k, at->m, true);
        sign = sign_over(arena, q, a, b);
        bool sharp = at->m >= SHARP;
        if (sign == 0 && sharp)
            sign = sign_by_query(arena, at, q, a, b);
        arena->used = mark;
        if (sign || sharp)
            return sign;
        sharpen(arena, at);
    }
}

static bool vector_vanishes(rdli_arena *arena, instant *at, const rdli_int v[2][3])
{
    for (int k = 0; k < 3; k++) {
        rdli_poly line = {.degree = 1, .c = {v[0][k], v[1][k]}};
        if (sign_at(arena, at, &line))
            return false;
    }
    return true;
}

static bool on_segment(rdli_arena *arena, instant *at, const rdli_point_segment *couple)
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
static bool inside_in_plane(rdli_arena *arena, instant *at, const rdli_exact_pair *pair, int k, const rdli_poly *n,
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
static bool meets_when_coplanar(rdli_arena *arena, instant *at, const rdli_exact_pair *pair)
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
    const rdli_cubic *doubles;         /* and what doubles know of it */
    const rdli_point_segment *couple;  /* else the point and the segment */
} event;

static bool happens(rdli_arena *arena, const event *what, instant *root, double lo, double hi)
{
    if (!what->pair)
        return on_segment(arena, root, what->couple);
    enum rdli_inside inside = rdli_cubic_inside(what->doubles, lo, hi);
    return inside == RDLI_INSIDE_YES || (inside == RDLI_INSIDE_MAYBE && meets_when_coplanar(arena, root, what->pair));
}

/* The cell of (k, k + 2^more) / 2^m in which doubles see the root. */
static uint64_t guess_cell(const rdli_poly *f, const instant *at, unsigned more, int left)
{
    double c[4], base = at->k.size ? (double)at->k.limb[0] : 0;
    int64_t bits = 0;
    for (int i = 0; i <= f->degree; i++)
        bits = rdli_int_bits(f->c[i]) > bits ? rdli_int_bits(f->c[i]) : bits;
    for (int i = 0; i <= f->degree; i++)
        c[i] = rdli_int_sign(f->c[i]) * rdli_int_below(f->c[i], -bits);
    uint64_t lo = 0, hi = UINT64_C(1) << more;
    while (hi - lo > 1) {
        uint64_t cut = lo + (hi - lo) / 2;
        double t = ldexp(base, -(int)at->m) + ldexp((double)cut, -(int)(at->m + more)), s = 1 - t;
        double value = c[f->degree], power = s;
        for (int i = f->degree - 1; i >= 0; i--, power *= s)
            value = value * t + c[i] * power;
        bool right = (value > 0) == (left > 0);
        lo = right ? cut : lo;
        hi = right ? hi : cut;
    }
    return lo;
}

/* Bisects to the root of rank `rank` (from 1) of the squarefree f until it is alone between dyadic ends that are not
 * roots, or is itself the right end; then narrows that interval to 2^-FINE. */
static void isolate(rdli_arena *arena, const chain *s, int at_zero, int at_one, int rank, instant *root)
{
    size_t mark = arena->used;
    int left = at_zero, right = at_one;
    root->k = (rdli_int){NULL, 0};
    root->m = 0;
    root->dyadic = false;
    while (!arena->overflow) {
        root->k = rdli_int_keep(arena, mark, root->k);
        size_t above = arena->used;
        if (left - right == 1) {
            proportion a = proportion_of(arena, root->k, root->m, false), b = proportion_of(arena, root->k, root->m, true);
            int sign = sign_at_proportion(arena, root->f, a);
            root->dyadic = sign_at_proportion(arena, root->f, b) == 0;
            arena->used = above;
            if (root->dyadic) {
                root->k = rdli_int_keep(arena, mark, rdli_int_add(arena, root->k, rdli_int_of_word(arena, 1)));
                return;
            }
            if (sign && root->m < FINE)
                find_cell(arena, root, FINE - root->m, guess_cell(root->f, root, FINE - root->m, sign), sign);
            if (sign)
                return;
        }
        rdli_int twice = rdli_int_shift(arena, root->k, 1);
        proportion middle = proportion_of(arena, twice, ++root->m, true);
        int here = variations(arena, s, middle);
        bool go_left = at_zero - here >= rank;
        left = go_left ? left : here;
        right = go_left ? here : right;
        root->k = go_left ? twice : middle.t;
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
            isolate(arena, &s, at_zero, at_one, rank, &root);
            bracket_of(&root, lo, hi);
            found = happens(arena, what, &root, *lo, *hi);
            if (found) {
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

/* The couples of rdli_point_segments as frames of doubles. */
static void couple_of(const rdli_cubic *s, int which, double w[2][3], double u[2][3])
{
    bool triangle = s->kind == RDL_POINT_TRIANGLE;
    for (int end = 0; end < 2; end++)
        for (int k = 0; k < 3; k++) {
            double pw = s->at[end].w[k], pu = s->at[end].u[k], pv = s->at[end].v[k];
            const double from[2][4] = {{pw, -pw, pw + pv, pu - pw}, {pw, pw, pw - pu, 0}};
            const double along[2][4] = {{pu, pv, pu, pv}, {pu, pv, pv - pu, 0}};
            w[end][k] = from[triangle][which];
            u[end][k] = along[triangle][which];
        }
}

static bool first_couple_event(rdli_arena *arena, const rdli_point_segment *couple, double *lo, double *hi, uint8_t *depth)
{
    for (int which = 0; which < 2; which++) {
        size_t mark = arena->used;
        event what = {NULL, NULL, couple};
        rdli_poly f;
        bool found = segment_event(arena, couple, which, &f) && first_event(arena, &f, &what, lo, hi, depth);
        arena->used = mark;
        if (found || f.degree == 2) /* not on one line: there is no second polynomial */
            return found;
    }
    return false;
}

static bool first_planar_event(rdli_arena *arena, const rdli_exact_pair *pair, const rdli_cubic *doubles, rdl_touch *touch)
{
    rdli_point_segment couples[RDLI_POINT_SEGMENTS];
    int count = rdli_point_segments(arena, pair, couples);
    bool found = false;
    touch->time_lo = touch->time_hi = 1;
    for (int i = 0; i < count; i++) {
        double lo, hi, w[2][3], u[2][3];
        couple_of(doubles, i, w, u);
        enum rdli_inside meets = rdli_planar_event(doubles, (const double (*)[3])w, (const double (*)[3])u, &lo, &hi);
        if (meets == RDLI_INSIDE_NO ||
            (meets == RDLI_INSIDE_MAYBE && !first_couple_event(arena, &couples[i], &lo, &hi, &touch->depth)))
            continue;
        found = true;
        touch->time_lo = lo < touch->time_lo ? lo : touch->time_lo;
        touch->time_hi = hi < touch->time_hi ? hi : touch->time_hi;
    }
    return found;
}

/* f(end) = 0 is known exactly. */
static bool meets_at_end(rdli_arena *arena, const rdli_exact_pair *pair, const rdli_cubic *doubles, int end)
{
    size_t mark = arena->used;
    enum rdli_inside inside = rdli_cubic_inside(doubles, end, end);
    instant at = {.dyadic = true, .k = end ? rdli_int_of_word(arena, 1) : (rdli_int){NULL, 0}};
    bool meets = inside == RDLI_INSIDE_YES || (inside == RDLI_INSIDE_MAYBE && meets_when_coplanar(arena, &at, pair));
    arena->used = mark;
    return meets;
}

void rdli_exact_zero(rdli_arena *arena, int kind, const rdl_motion *motion, const rdli_cubic *doubles, rdl_touch *touch)
{
    rdli_exact_pair pair;
    rdli_exact_pair_of(arena, kind, motion, rdli_common_unit(motion, 0), &pair);
    *touch = (rdl_touch){.stage = RDL_STAGE_EXACT, .order = 3};
    rdli_poly f = coplanarity(arena, &pair);
    if (f.c[0].size == 0 && meets_at_end(arena, &pair, doubles, 0)) {
        touch->touches = 1;
        touch->stage = RDL_STAGE_ENDS;
        return;
    }
    event what = {&pair, doubles, NULL};
    touch->touches = rdli_poly_is_zero(&f)
        ? first_planar_event(arena, &pair, doubles, touch)
        : first_event(arena, &f, &what, &touch->time_lo, &touch->time_hi, &touch->depth);
    if (!touch->touches) {
        touch->time_lo = touch->time_hi = 1;
        touch->touches = f.c[3].size == 0 && meets_at_end(arena, &pair, doubles, 1);
    }
}
