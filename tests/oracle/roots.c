/* oracle/roots.c: see roots.h. Isolation: Sturm 1829; equality of two algebraic numbers: a common root of their
 * polynomials, hence of the greatest common divisor, inside both brackets. */
#include "roots.h"

#include <float.h>
#include <math.h>

void root_init(root *r)
{
    mpz_init(r->numerator);
    r->bits = 0;
    r->exact = false;
    r->sign_below = 0;
    r->run = 0;
}

void root_clear(root *r)
{
    mpz_clear(r->numerator);
}

void root_set(root *r, const root *from)
{
    mpz_set(r->numerator, from->numerator);
    r->bits = from->bits;
    r->exact = from->exact;
    r->sign_below = from->sign_below;
    r->run = from->run;
}

void root_set_exact(root *r, unsigned long value)
{
    mpz_set_ui(r->numerator, value);
    r->bits = 0;
    r->exact = true;
    r->run = 0;
}

/* After several halvings to the same side the root lies close to that end of its bracket: tries to keep only the
 * outermost 2^-jump of it. Without this, roots like 1e-600 would cost thousands of halvings. */
static bool leap(root *r, const poly *p)
{
    int run = r->run < 0 ? -r->run : r->run;
    if (run < 8 || run > 1 << 20)
        return false;
    unsigned long jump = (unsigned long)run;
    mpz_t lower, upper;
    mpz_init(lower);
    mpz_init(upper);
    mpz_set(lower, r->numerator);
    if (r->run > 0)
        mpz_add_ui(lower, lower, 1);
    mpz_mul_2exp(lower, lower, jump);
    if (r->run > 0)
        mpz_sub_ui(lower, lower, 1);
    mpz_add_ui(upper, lower, 1);
    int inner = poly_sign_at(p, r->run < 0 ? upper : lower, r->bits + jump);
    bool inside = inner == (r->run < 0 ? -r->sign_below : r->sign_below);
    if (inside) {
        mpz_set(r->numerator, lower);
        r->bits += jump;
        r->run *= 2;
    } else {
        r->run = 0;
    }
    mpz_clear(lower);
    mpz_clear(upper);
    return inside;
}

void root_refine(root *r, const poly *p)
{
    if (r->exact || leap(r, p))
        return;
    mpz_mul_2exp(r->numerator, r->numerator, 1);
    mpz_add_ui(r->numerator, r->numerator, 1);
    r->bits++;
    int sign = poly_sign_at(p, r->numerator, r->bits);
    if (sign == 0) {
        r->exact = true;
    } else if (sign == r->sign_below) {
        r->run = r->run > 0 ? r->run + 1 : 1;
    } else {
        mpz_sub_ui(r->numerator, r->numerator, 1);
        r->run = r->run < 0 ? r->run - 1 : -1;
    }
}

typedef struct search {
    const poly_chain *chain;
    root *roots;
    int count;
} search;

/* One end of a bracket during isolation. */
typedef struct station {
    int changes, sign;
} station;

static station look(const poly_chain *chain, const mpz_t numerator, unsigned long bits)
{
    station s;
    s.changes = poly_chain_changes(chain, numerator, bits, &s.sign);
    return s;
}

/* Shrinks [n, n + 1] / 2^bits while all roots of (n, n + 1] stay inside, by ever longer jumps toward the lower end. */
static void sink(const poly_chain *chain, mpz_t n, unsigned long *bits, station low, station *high)
{
    mpz_t lower, upper;
    mpz_init(lower);
    mpz_init(upper);
    for (unsigned long jump = 8;; jump *= 2) {
        mpz_mul_2exp(lower, n, jump);
        mpz_add_ui(upper, lower, 1);
        station s = look(chain, upper, *bits + jump);
        if (low.changes - s.changes != low.changes - high->changes || s.sign == 0)
            break;
        mpz_set(n, lower);
        *bits += jump;
        *high = s;
    }
    mpz_clear(lower);
    mpz_clear(upper);
}

/* Roots in (n, n + 1] / 2^bits. */
static void isolate(search *job, const mpz_t n, unsigned long bits, station low, station high)
{
    int count = low.changes - high.changes;
    if (count == 0)
        return;
    root *r = &job->roots[job->count];
    if (count == 1 && high.sign == 0) {
        mpz_add_ui(r->numerator, n, 1);
        r->bits = bits;
        r->exact = true;
        job->count++;
    } else if (count == 1 && low.sign != 0) {
        mpz_set(r->numerator, n);
        r->bits = bits;
        r->exact = false;
        r->sign_below = low.sign;
        r->run = 0;
        job->count++;
    } else {
        mpz_t left, right;
        mpz_init_set(left, n);
        mpz_init(right);
        if (bits >= 8)
            sink(job->chain, left, &bits, low, &high);
        mpz_mul_2exp(left, left, 1);
        mpz_add_ui(right, left, 1);
        station middle = look(job->chain, right, bits + 1);
        isolate(job, left, bits + 1, low, middle);
        isolate(job, right, bits + 1, middle, high);
        mpz_clear(left);
        mpz_clear(right);
    }
}

int roots_isolate(const poly_chain *chain, root *roots)
{
    search job = {chain, roots, 0};
    mpz_t zero, one;
    mpz_init_set_ui(zero, 0);
    mpz_init_set_ui(one, 1);
    station low = look(chain, zero, 0), high = look(chain, one, 0);
    if (low.sign == 0)
        root_set_exact(&roots[job.count++], 0);
    isolate(&job, zero, 0, low, high);
    mpz_clear(zero);
    mpz_clear(one);
    return job.count;
}

/* Compares a / 2^a_bits with b / 2^b_bits. */
static int compare_dyadic(const mpz_t a, unsigned long a_bits, const mpz_t b, unsigned long b_bits)
{
    if (a_bits == b_bits)
        return mpz_cmp(a, b);
    mpz_t wide;
    mpz_init(wide);
    int order;
    if (a_bits < b_bits) {
        mpz_mul_2exp(wide, a, b_bits - a_bits);
        order = mpz_cmp(wide, b);
    } else {
        mpz_mul_2exp(wide, b, a_bits - b_bits);
        order = mpz_cmp(a, wide);
    }
    mpz_clear(wide);
    return order;
}

/* -1 or 1 when the closed brackets are disjoint, else 0. */
static int brackets_order(const root *a, const root *b)
{
    mpz_t upper;
    mpz_init(upper);
    int order = 0;
    mpz_add_ui(upper, a->numerator, a->exact ? 0 : 1);
    if (compare_dyadic(upper, a->bits, b->numerator, b->bits) < 0) {
        order = -1;
    } else {
        mpz_add_ui(upper, b->numerator, b->exact ? 0 : 1);
        if (compare_dyadic(upper, b->bits, a->numerator, a->bits) < 0)
            order = 1;
    }
    mpz_clear(upper);
    return order;
}

/* point is exact and lies in the closed bracket of r. */
static int compare_with_exact(const root *point, root *r, const poly *p)
{
    if (poly_sign_at(p, point->numerator, point->bits) == 0) {
        root_set(r, point);
        return 0;
    }
    for (;;) {
        int order = brackets_order(point, r);
        if (order != 0)
            return order;
        root_refine(r, p);
    }
}

/* Dyadic brackets either lie one in the other or share at most an end. */
static bool nested(const root *a, const root *b)
{
    const root *fine = a->bits >= b->bits ? a : b, *coarse = fine == a ? b : a;
    mpz_t shifted;
    mpz_init(shifted);
    mpz_fdiv_q_2exp(shifted, fine->numerator, fine->bits - coarse->bits);
    bool inside = mpz_cmp(shifted, coarse->numerator) == 0;
    mpz_clear(shifted);
    return inside;
}

/* One bracket lies in the other; true when the common divisor has a root in the finer one. */
static bool share_root(const root *a, const poly *pa, const root *b, const poly *pb)
{
    poly common;
    mpz_t upper;
    poly_init(&common);
    mpz_init(upper);
    const root *fine = a->bits >= b->bits ? a : b;
    poly_gcd(&common, pa, pb);
    bool shared = false;
    if (common.degree > 0) {
        mpz_add_ui(upper, fine->numerator, 1);
        shared = poly_sign_at(&common, fine->numerator, fine->bits) *
                     poly_sign_at(&common, upper, fine->bits) < 0;
    }
    poly_clear(&common);
    mpz_clear(upper);
    return shared;
}

/* Same root: both get the finer bracket, each with the sign of its own polynomial. */
static void unify(root *a, const poly *pa, root *b, const poly *pb)
{
    root *fine = a->bits >= b->bits ? a : b, *coarse = fine == a ? b : a;
    const poly *p = fine == a ? pb : pa;
    root_set(coarse, fine);
    coarse->sign_below = poly_sign_at(p, coarse->numerator, coarse->bits);
}

int roots_compare(root *a, const poly *pa, root *b, const poly *pb)
{
    bool asked = false;
    for (int tries = 0;; tries++) {
        int order = brackets_order(a, b);
        if (order != 0)
            return order;
        if (a->exact && b->exact)
            return 0;
        if (a->exact)
            return compare_with_exact(a, b, pb);
        if (b->exact)
            return -compare_with_exact(b, a, pa);
        if (tries >= 16 && !asked && nested(a, b)) {
            asked = true;
            if (share_root(a, pa, b, pb)) {
                unify(a, pa, b, pb);
                return 0;
            }
        }
        root *coarse = a->bits < b->bits ? a : b;
        root_refine(coarse, coarse == a ? pa : pb);
    }
}

int root_compare_double(const root *r, const poly *p, double t)
{
    int exponent;
    double mantissa = frexp(t, &exponent);
    mpz_t numerator, edge;
    mpz_init(numerator);
    mpz_init(edge);
    mpz_set_d(numerator, ldexp(mantissa, 53));
    exponent -= 53;
    unsigned long bits = exponent < 0 ? (unsigned long)-exponent : 0;
    if (exponent > 0)
        mpz_mul_2exp(numerator, numerator, (unsigned long)exponent);
    int order = compare_dyadic(r->numerator, r->bits, numerator, bits);
    if (!r->exact) {
        mpz_add_ui(edge, r->numerator, 1);
        if (order >= 0) {
            order = 1;
        } else if (compare_dyadic(edge, r->bits, numerator, bits) <= 0) {
            order = -1;
        } else {
            int sign = poly_sign_at(p, numerator, bits);
            order = sign == 0 ? 0 : sign == r->sign_below ? 1 : -1;
        }
    }
    mpz_clear(numerator);
    mpz_clear(edge);
    return order < 0 ? -1 : order > 0;
}

void roots_between(const root *a, const root *b, mpz_t numerator, unsigned long *bits)
{
    mpz_t other;
    mpz_init(other);
    mpz_add_ui(numerator, a->numerator, a->exact ? 0 : 1);
    *bits = a->bits > b->bits ? a->bits : b->bits;
    mpz_mul_2exp(numerator, numerator, *bits - a->bits);
    mpz_mul_2exp(other, b->numerator, *bits - b->bits);
    mpz_add(numerator, numerator, other);
    *bits += 1;
    mpz_clear(other);
}

static double to_double(const mpz_t numerator, unsigned long bits, bool up)
{
    long exponent;
    double mantissa = mpz_get_d_2exp(&exponent, numerator); /* truncates */
    double value = ldexp(mantissa, (int)(exponent - (long)bits));
    if (up)
        return nextafter(value, INFINITY);
    return value < DBL_MIN && value > 0 ? nextafter(value, 0) : value;
}

void root_bracket(root *r, const poly *p, unsigned long bits, double *lo, double *hi)
{
    while (!r->exact && r->bits < bits)
        root_refine(r, p);
    mpz_t upper;
    mpz_init(upper);
    mpz_add_ui(upper, r->numerator, r->exact ? 0 : 1);
    *lo = to_double(r->numerator, r->bits, false);
    *hi = to_double(upper, r->bits, true);
    mpz_clear(upper);
}
