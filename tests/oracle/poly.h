/* oracle/poly.h: polynomials in the time t with integer coefficients, exact (GMP).
 * Part of the slow second opinion of the tests; shares no code and no method with the library. */
#ifndef ORACLE_POLY_H
#define ORACLE_POLY_H

#include <gmp.h>
#include <stdbool.h>

enum { POLY_DEGREE_MAX = 6, POLY_CHAIN_MAX = POLY_DEGREE_MAX + 2 };

/* c[0] + c[1] t + ...; degree -1 is the zero polynomial; c[degree] is never 0. */
typedef struct poly {
    int degree;
    mpz_t c[POLY_DEGREE_MAX + 1];
} poly;

void poly_init(poly *p);
void poly_clear(poly *p);
void poly_set(poly *result, const poly *p);
void poly_set_constant(poly *result, const mpz_t value);
/* start + (end - start) t */
void poly_set_path(poly *result, const mpz_t start, const mpz_t end);
void poly_add(poly *result, const poly *a, const poly *b);
void poly_sub(poly *result, const poly *a, const poly *b);
void poly_negate(poly *p);
void poly_scale(poly *p, const mpz_t factor);
/* result must be neither a nor b. */
void poly_mul(poly *result, const poly *a, const poly *b);
void poly_derivative(poly *result, const poly *p);
/* Divides by the greatest common divisor of the coefficients; signs stay. */
void poly_make_primitive(poly *p);

/* Sign of p at t = numerator / 2^bits. */
int poly_sign_at(const poly *p, const mpz_t numerator, unsigned long bits);

/* A sequence of signed remainders: chain[0] = p, chain[1] = q, chain[i+1] = -(positive number) * (chain[i-1] mod
 * chain[i]). With q = p' it is Sturm's sequence; the last member is a greatest common divisor of p and q. Coefficients
 * are kept small by the subresultant divisors (Brown & Traub 1971). Needs deg p >= deg q >= 0. */
typedef struct poly_chain {
    int count;
    poly member[POLY_CHAIN_MAX];
} poly_chain;

void poly_chain_init(poly_chain *chain);
void poly_chain_clear(poly_chain *chain);
void poly_chain_build(poly_chain *chain, const poly *p, const poly *q);
/* Number of sign changes along the chain at numerator / 2^bits; *first_sign = sign of chain[0] there. */
int poly_chain_changes(const poly_chain *chain, const mpz_t numerator, unsigned long bits, int *first_sign);

/* Primitive greatest common divisor; degree 0 when coprime. Neither may be zero. */
void poly_gcd(poly *result, const poly *a, const poly *b);
/* result = the primitive polynomial with the roots of p, each once; *chain = its Sturm sequence. deg p >= 1. */
void poly_squarefree(poly *result, poly_chain *chain, const poly *p);

#endif
