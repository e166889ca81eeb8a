/* oracle/frame.h: doubles -> integers on a common grid, and vectors of polynomials. Used inside the oracle only. */
#ifndef ORACLE_FRAME_H
#define ORACLE_FRAME_H

#include <gmp.h>

#include "poly.h"

/* Integer coordinates x * 2^-exponent with one exponent for all of them. */
typedef struct frame {
    int exponent;
    int count;
    mpz_t x[8][3];
} frame;

/* rows: up to 8 points of three finite doubles each. */
void frame_init(frame *f, const double *const rows[], int count);
void frame_clear(frame *f);
/* square / 2^(2 exponent): a squared length in m^2 -> grid units. back: the other way. */
void frame_square(const frame *f, mpq_t result, const mpq_t square);
void frame_square_back(const frame *f, mpq_t result, const mpq_t square);

typedef struct poly3 {
    poly c[3];
} poly3;

void poly3_init(poly3 *v);
void poly3_clear(poly3 *v);
/* path of b minus path of a; starts and ends are rows of a frame. */
void poly3_difference(poly3 *v, mpz_t a_start[3], mpz_t a_end[3], mpz_t b_start[3], mpz_t b_end[3]);
void poly3_dot(poly *result, const poly3 *a, const poly3 *b);
void poly3_cross(poly3 *result, const poly3 *a, const poly3 *b);

#endif
