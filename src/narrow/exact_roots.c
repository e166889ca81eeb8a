/* narrow/exact_roots.c: real roots in (0, 1) of polynomials with integer coefficients, and signs there.
 *
 * In x = t / (1 - t) the scaled Bernstein coefficients are power-basis coefficients and (0, 1) is (0, infinity). Distinct
 * roots are isolated by Sturm's theorem. The sign of q at the only root of f in (a, b) is read from q on (a, b), after
 * that has been narrowed; whether it is 0, from the greatest common divisor; and where neither helps, it is an exact Tarski
 * query (Basu, Pollack, Roy 2006, ch. 2): the difference of the sign variations at a and b of the signed remainder
 * sequence of f and f' q. */
#include "narrow/exact_roots.h"

/* Intervals of roots are 2^-FINE wide, well below the promised 1e-6. A sign that is not clear on one of 2^-SHARP is most
 * likely 0, and worth the question whether it is; SHARPEST + 16 is what fits into an instant's own limbs. */
enum { FINE = 24, SHARP = 56, SHARPEST = 104 };

/* t : 1 - t, both >= 0 */
typedef struct proportion {
    rdli_int t, rest;
} proportion;

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
    size_t bottom = arena->used;
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
    size_t mark = bottom; /* the last pass allocated the coefficients in this order, above those of the passes before */
    for (int i = 0; i <= a.degree && !quotient; i++, mark = arena->used)
        a.c[i] = rdli_int_keep(arena, mark, a.c[i]);
    return a;
}

/* Signed remainder sequence of f and g (g may be zero). */
static void build_chain(rdli_arena *arena, const rdli_poly *f, rdli_poly g, rdli_chain *s)
{
    drop_leading_zeros(&g);
    s->p[0] = *f;
    s->count = 1;
    while (!rdli_poly_is_zero(&g) && s->count < RDLI_CHAIN) {
        s->p[s->count++] = g;
        if (g.degree == 0 || arena->overflow)
            break;
        rdli_poly r = remainder_of(arena, s->p[s->count - 2], &s->p[s->count - 1], NULL);
        for (int i = 0; i <= r.degree; i++)
            r.c[i] = rdli_int_negate(r.c[i]);
        g = r;
    }
}

static int variations(rdli_arena *arena, const rdli_chain *s, proportion at)
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
    rdli_chain s;
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
static void find_cell(rdli_arena *arena, rdli_instant *at, unsigned more, uint64_t guess, int left)
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
static void sharpen(rdli_arena *arena, rdli_instant *at)
{
    size_t mark = arena->used;
    rdli_int a = value_at_proportion(arena, at->f, proportion_of(arena, at->k, at->m, false));
    rdli_int b = value_at_proportion(arena, at->f, proportion_of(arena, at->k, at->m, true));
    double share = share_of(a, b);
    int left = rdli_int_sign(a);
    arena->used = mark;
    find_cell(arena, at, 16, (uint64_t)(share * 0x1p16), left);
}

/* The sign of q at the only root of the polynomial in the interval, by a Tarski query. */
static int sign_by_query(rdli_arena *arena, const rdli_instant *at, const rdli_poly *q, proportion a, proportion b)
{
    rdli_poly slope = derivative(arena, at->whole), weighted = rdli_poly_mul(arena, &slope, q);
    drop_leading_zeros(&weighted);
    rdli_chain s;
    build_chain(arena, at->whole, remainder_of(arena, weighted, at->whole, NULL), &s);
    return variations(arena, &s, a) - variations(arena, &s, b);
}

/* Whether q vanishes at the root, by Euclid's algorithm: 1 yes, 0 no, -1 where the common factor has more than one root. */
static int shares_root(rdli_arena *arena, const rdli_instant *at, const rdli_poly *q, proportion a, proportion b)
{
    rdli_poly first = *at->whole, second = *q;
    drop_leading_zeros(&second);
    while (!rdli_poly_is_zero(&second) && !arena->overflow) {
        rdli_poly rest = remainder_of(arena, first, &second, NULL);
        first = second;
        second = rest;
    }
    if (first.degree != 1)
        return first.degree == 0 ? 0 : -1;
    return sign_at_proportion(arena, &first, a) * sign_at_proportion(arena, &first, b) < 0;
}

int rdli_instant_sign(rdli_arena *arena, rdli_instant *at, const rdli_poly *q)
{
    if (rdli_poly_is_zero(q))
        return 0;
    for (bool not_zero = false;;) {
        size_t mark = arena->used;
        proportion a = proportion_of(arena, at->k, at->m, false);
        int sign;
        if (at->dyadic) {
            sign = sign_at_proportion(arena, q, a);
            arena->used = mark;
            return sign;
        }
        proportion b = proportion_of(arena, at->k, at->m, true);
        bool done = false;
        sign = sign_over(arena, q, a, b);
        if (sign == 0 && at->m >= SHARP && !not_zero) {
            int shares = shares_root(arena, at, q, a, b);
            not_zero = shares == 0;
            done = shares == 1;
        }
        if (sign == 0 && !done && at->m >= SHARP && (!not_zero || at->m >= SHARPEST)) {
            sign = sign_by_query(arena, at, q, a, b);
            done = true;
        }
        arena->used = mark;
        if (sign || done || arena->overflow)
            return sign;
        sharpen(arena, at);
    }
}

/* The cell of (k, k + 2^more) / 2^m in which doubles see the root. */
static uint64_t guess_cell(const rdli_poly *f, const rdli_instant *at, unsigned more, int left)
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
void rdli_roots_isolate(rdli_arena *arena, const rdli_roots *roots, int rank, rdli_instant *root)
{
    size_t mark = arena->used;
    int left = roots->at_zero, right = roots->at_one;
    root->f = &roots->f;
    root->whole = &roots->whole;
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
        int here = variations(arena, &roots->sturm, middle);
        bool go_left = roots->at_zero - here >= rank;
        left = go_left ? left : here;
        right = go_left ? here : right;
        root->k = go_left ? twice : middle.t;
    }
}

void rdli_instant_bracket(const rdli_instant *root, double *lo, double *hi)
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

void rdli_roots_open(rdli_arena *arena, const rdli_poly *f, rdli_roots *roots)
{
    roots->count = 0;
    roots->whole = deflated(f);
    if (roots->whole.degree == 0 || rdli_poly_one_sign(&roots->whole))
        return;
    roots->f = squarefree(arena, &roots->whole);
    build_chain(arena, &roots->f, derivative(arena, &roots->f), &roots->sturm);
    proportion zero = proportion_of(arena, (rdli_int){NULL, 0}, 0, false);
    proportion one = proportion_of(arena, (rdli_int){NULL, 0}, 0, true);
    roots->at_zero = variations(arena, &roots->sturm, zero);
    roots->at_one = variations(arena, &roots->sturm, one);
    roots->count = roots->at_zero - roots->at_one;
}
