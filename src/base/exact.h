/* base/exact.h: signed integers of any length on caller-owned limbs, and polynomials over them.
 *
 * Built on those calls of GMP's mpn layer that never allocate (mpn_mul_1, mpn_addmul_1, mpn_add, mpn_sub, shifts), so the
 * multiplication is schoolbook. Values are immutable; results live in an arena, a stack of limbs that the caller owns. An
 * arena that is too small never writes outside its room: it raises `overflow`, after which all results are meaningless
 * and the caller starts again with more room. Included by narrow and api. */
#ifndef RDLI_EXACT_H
#define RDLI_EXACT_H

#include <gmp.h>

#include "base/internal.h"

typedef struct rdli_arena {
    mp_limb_t *limbs;
    size_t used, room;
    bool overflow;
} rdli_arena;

/* size: number of limbs, negative for a negative value, 0 for zero; no leading zero limb. */
typedef struct rdli_int {
    const mp_limb_t *limb;
    int64_t size;
} rdli_int;

static inline int rdli_int_sign(rdli_int a)
{
    return (a.size > 0) - (a.size < 0);
}

static inline rdli_int rdli_int_negate(rdli_int a)
{
    return (rdli_int){a.limb, -a.size};
}

static inline rdli_int rdli_int_magnitude(rdli_int a)
{
    return (rdli_int){a.limb, a.size < 0 ? -a.size : a.size};
}

/* x / 2^unit, which must be an integer. */
rdli_int rdli_int_of_double(rdli_arena *arena, double x, int unit);
rdli_int rdli_int_of_word(rdli_arena *arena, uint64_t value);
rdli_int rdli_int_add(rdli_arena *arena, rdli_int a, rdli_int b);
rdli_int rdli_int_sub(rdli_arena *arena, rdli_int a, rdli_int b);
rdli_int rdli_int_mul(rdli_arena *arena, rdli_int a, rdli_int b);
rdli_int rdli_int_times_word(rdli_arena *arena, rdli_int a, uint64_t word);
/* a 2^bits; bits may be negative: then rounded towards zero. */
rdli_int rdli_int_shift(rdli_arena *arena, rdli_int a, int64_t bits);
int rdli_int_compare(rdli_int a, rdli_int b);
/* Number of bits of the magnitude. */
int64_t rdli_int_bits(rdli_int a);
/* Frees everything above mark but a, which moves down to mark. */
rdli_int rdli_int_keep(rdli_arena *arena, size_t mark, rdli_int a);
/* Bounds of |a| 2^unit as a double: at or below it, and at or above it. */
double rdli_int_below(rdli_int a, int64_t unit);
double rdli_int_above(rdli_int a, int64_t unit);

/* Largest k such that x is an integer multiple of 2^k; INT_MAX for zero. */
int rdli_lowest_bit(double x);

/* A polynomial of formal degree n in scaled Bernstein form: sum c[i] t^i (1-t)^(n-i), which is also the power form
 * sum c[i] x^i in x = t / (1-t). Products are convolutions; t in (0, 1) is x in (0, infinity). */
enum { RDLI_POLY_DEGREE = 6 };
typedef struct rdli_poly {
    int degree;
    rdli_int c[RDLI_POLY_DEGREE + 1];
} rdli_poly;

rdli_poly rdli_poly_mul(rdli_arena *arena, const rdli_poly *a, const rdli_poly *b);
rdli_poly rdli_poly_add(rdli_arena *arena, const rdli_poly *a, const rdli_poly *b);
rdli_poly rdli_poly_sub(rdli_arena *arena, const rdli_poly *a, const rdli_poly *b);
bool rdli_poly_is_zero(const rdli_poly *a);
/* 1 or -1 when all coefficients have that strict sign, else 0. */
int rdli_poly_one_sign(const rdli_poly *a);

#endif
