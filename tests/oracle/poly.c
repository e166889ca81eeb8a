/* oracle/poly.c: see poly.h.
 * Sources: Sturm's theorem and the subresultant remainder sequence as in Knuth, The Art of Computer Programming 2,
 * 4.6.1, algorithm C (Brown & Traub 1971). Signs are tracked on top, because Sturm's theorem needs each remainder up to a
 * positive factor. */
#include "poly.h"

void poly_init(poly *p)
{
    p->degree = -1;
    for (int i = 0; i <= POLY_DEGREE_MAX; i++)
        mpz_init(p->c[i]);
}

void poly_clear(poly *p)
{
    for (int i = 0; i <= POLY_DEGREE_MAX; i++)
        mpz_clear(p->c[i]);
}

static void trim(poly *p, int degree)
{
    while (degree >= 0 && mpz_sgn(p->c[degree]) == 0)
        degree--;
    p->degree = degree;
}

void poly_set(poly *result, const poly *p)
{
    if (result == p)
        return;
    for (int i = 0; i <= p->degree; i++)
        mpz_set(result->c[i], p->c[i]);
    result->degree = p->degree;
}

void poly_set_constant(poly *result, const mpz_t value)
{
    mpz_set(result->c[0], value);
    trim(result, 0);
}

void poly_set_path(poly *result, const mpz_t start, const mpz_t end)
{
    mpz_sub(result->c[1], end, start);
    mpz_set(result->c[0], start);
    trim(result, 1);
}

static void combine(poly *result, const poly *a, const poly *b, bool minus)
{
    int degree = a->degree > b->degree ? a->degree : b->degree;
    for (int i = 0; i <= degree; i++) {
        if (i > b->degree) {
            mpz_set(result->c[i], a->c[i]);
        } else if (i > a->degree) {
            mpz_set(result->c[i], b->c[i]);
            if (minus)
                mpz_neg(result->c[i], result->c[i]);
        } else if (minus) {
            mpz_sub(result->c[i], a->c[i], b->c[i]);
        } else {
            mpz_add(result->c[i], a->c[i], b->c[i]);
        }
    }
    trim(result, degree);
}

void poly_add(poly *result, const poly *a, const poly *b)
{
    combine(result, a, b, false);
}

void poly_sub(poly *result, const poly *a, const poly *b)
{
    combine(result, a, b, true);
}

void poly_negate(poly *p)
{
    for (int i = 0; i <= p->degree; i++)
        mpz_neg(p->c[i], p->c[i]);
}

void poly_scale(poly *p, const mpz_t factor)
{
    for (int i = 0; i <= p->degree; i++)
        mpz_mul(p->c[i], p->c[i], factor);
    trim(p, p->degree);
}

void poly_mul(poly *result, const poly *a, const poly *b)
{
    if (a->degree < 0 || b->degree < 0) {
        result->degree = -1;
        return;
    }
    int degree = a->degree + b->degree;
    for (int i = 0; i <= degree; i++)
        mpz_set_ui(result->c[i], 0);
    for (int i = 0; i <= a->degree; i++)
        for (int j = 0; j <= b->degree; j++)
            mpz_addmul(result->c[i + j], a->c[i], b->c[j]);
    trim(result, degree);
}

void poly_derivative(poly *result, const poly *p)
{
    for (int i = 1; i <= p->degree; i++)
        mpz_mul_ui(result->c[i - 1], p->c[i], (unsigned long)i);
    trim(result, p->degree - 1);
}

void poly_make_primitive(poly *p)
{
    if (p->degree < 0)
        return;
    mpz_t content;
    mpz_init_set(content, p->c[p->degree]);
    for (int i = 0; i < p->degree && mpz_cmpabs_ui(content, 1) != 0; i++)
        mpz_gcd(content, content, p->c[i]);
    mpz_abs(content, content);
    if (mpz_cmp_ui(content, 1) != 0)
        for (int i = 0; i <= p->degree; i++)
            mpz_divexact(p->c[i], p->c[i], content);
    mpz_clear(content);
}

int poly_sign_at(const poly *p, const mpz_t numerator, unsigned long bits)
{
    if (p->degree < 0)
        return 0;
    if (p->degree == 0 || mpz_sgn(numerator) == 0)
        return mpz_sgn(p->c[0]);
    mpz_t sum, term;
    mpz_init_set(sum, p->c[p->degree]);
    mpz_init(term);
    unsigned long shift = 0;
    for (int i = p->degree - 1; i >= 0; i--) {
        shift += bits;
        mpz_mul(sum, sum, numerator);
        mpz_mul_2exp(term, p->c[i], shift);
        mpz_add(sum, sum, term);
    }
    int sign = mpz_sgn(sum);
    mpz_clear(sum);
    mpz_clear(term);
    return sign;
}

void poly_chain_init(poly_chain *chain)
{
    chain->count = 0;
    for (int i = 0; i < POLY_CHAIN_MAX; i++)
        poly_init(&chain->member[i]);
}

void poly_chain_clear(poly_chain *chain)
{
    for (int i = 0; i < POLY_CHAIN_MAX; i++)
        poly_clear(&chain->member[i]);
}

/* result = -(positive number) * (a mod b), the positive number being |leading(b)|^(deg a - deg b + 1). */
static void signed_remainder(poly *result, const poly *a, const poly *b)
{
    int pending = a->degree - b->degree + 1;
    bool flip = !(mpz_sgn(b->c[b->degree]) < 0 && pending % 2 == 1);
    mpz_t lead, top;
    mpz_init_set(lead, b->c[b->degree]);
    mpz_init(top);
    poly_set(result, a);
    while (result->degree >= b->degree) {
        int shift = result->degree - b->degree, degree = result->degree;
        mpz_set(top, result->c[degree]);
        for (int i = 0; i < degree; i++) {
            mpz_mul(result->c[i], result->c[i], lead);
            if (i >= shift)
                mpz_submul(result->c[i], top, b->c[i - shift]);
        }
        trim(result, degree - 1);
        pending--;
    }
    for (; pending > 0; pending--)
        poly_scale(result, lead);
    if (flip)
        poly_negate(result);
    mpz_clear(lead);
    mpz_clear(top);
}

void poly_chain_build(poly_chain *chain, const poly *p, const poly *q)
{
    mpz_t g, h, divisor;
    mpz_init_set_ui(g, 1);
    mpz_init_set_ui(h, 1);
    mpz_init(divisor);
    poly_set(&chain->member[0], p);
    poly_set(&chain->member[1], q);
    chain->count = 2;
    while (chain->member[chain->count - 1].degree > 0) {
        const poly *a = &chain->member[chain->count - 2], *b = &chain->member[chain->count - 1];
        poly *r = &chain->member[chain->count];
        unsigned long drop = (unsigned long)(a->degree - b->degree);
        signed_remainder(r, a, b);
        if (r->degree < 0)
            break;
        mpz_pow_ui(divisor, h, drop);
        mpz_mul(divisor, divisor, g);
        for (int i = 0; i <= r->degree; i++)
            mpz_divexact(r->c[i], r->c[i], divisor);
        mpz_abs(g, b->c[b->degree]);
        if (drop == 1) {
            mpz_set(h, g);
        } else if (drop > 1) {
            mpz_pow_ui(divisor, h, drop - 1);
            mpz_pow_ui(h, g, drop);
            mpz_divexact(h, h, divisor);
        }
        chain->count++;
    }
    mpz_clear(g);
    mpz_clear(h);
    mpz_clear(divisor);
}

int poly_chain_changes(const poly_chain *chain, const mpz_t numerator, unsigned long bits, int *first_sign)
{
    int changes = 0, last = 0;
    for (int i = 0; i < chain->count; i++) {
        int sign = poly_sign_at(&chain->member[i], numerator, bits);
        if (i == 0)
            *first_sign = sign;
        if (sign != 0 && last != 0 && sign != last)
            changes++;
        if (sign != 0)
            last = sign;
    }
    return changes;
}

void poly_gcd(poly *result, const poly *a, const poly *b)
{
    poly_chain chain;
    poly_chain_init(&chain);
    if (a->degree >= b->degree)
        poly_chain_build(&chain, a, b);
    else
        poly_chain_build(&chain, b, a);
    poly_set(result, &chain.member[chain.count - 1]);
    poly_make_primitive(result);
    poly_chain_clear(&chain);
}

/* quotient = a / b, which must go without remainder. */
static void divide_exactly(poly *quotient, const poly *a, const poly *b)
{
    poly rest;
    poly_init(&rest);
    poly_set(&rest, a);
    int degree = a->degree - b->degree;
    for (int k = degree; k >= 0; k--) {
        mpz_divexact(quotient->c[k], rest.c[k + b->degree], b->c[b->degree]);
        for (int i = 0; i <= b->degree; i++)
            mpz_submul(rest.c[k + i], quotient->c[k], b->c[i]);
    }
    quotient->degree = degree;
    poly_clear(&rest);
}

void poly_squarefree(poly *result, poly_chain *chain, const poly *p)
{
    poly slope, common;
    poly_init(&slope);
    poly_init(&common);
    poly_set(result, p);
    poly_make_primitive(result);
    poly_derivative(&slope, result);
    poly_chain_build(chain, result, &slope);
    if (chain->member[chain->count - 1].degree > 0) {
        poly_set(&common, &chain->member[chain->count - 1]);
        poly_make_primitive(&common);
        divide_exactly(&slope, result, &common);
        poly_set(result, &slope);
        poly_derivative(&slope, result);
        poly_chain_build(chain, result, &slope);
    }
    poly_clear(&slope);
    poly_clear(&common);
}
