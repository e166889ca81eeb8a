/* oracle/frame.c: see frame.h. */
#include "frame.h"

#include <limits.h>
#include <math.h>

void frame_init(frame *f, const double *const rows[], int count)
{
    int least = INT_MAX;
    f->count = count;
    for (int i = 0; i < count; i++)
        for (int k = 0; k < 3; k++) {
            int e;
            if (rows[i][k] != 0.0) {
                (void)frexp(rows[i][k], &e);
                least = e < least ? e : least;
            }
        }
    f->exponent = least == INT_MAX ? 0 : least - 53;
    for (int i = 0; i < count; i++)
        for (int k = 0; k < 3; k++) {
            int e;
            double mantissa = frexp(rows[i][k], &e);
            mpz_init_set_d(f->x[i][k], ldexp(mantissa, 53));
            if (mantissa != 0.0)
                mpz_mul_2exp(f->x[i][k], f->x[i][k], (unsigned long)(e - 53 - f->exponent));
        }
}

void frame_clear(frame *f)
{
    for (int i = 0; i < f->count; i++)
        for (int k = 0; k < 3; k++)
            mpz_clear(f->x[i][k]);
}

static void shift(mpq_t result, const mpq_t value, int exponent)
{
    if (exponent >= 0)
        mpq_mul_2exp(result, value, (unsigned long)exponent);
    else
        mpq_div_2exp(result, value, (unsigned long)-exponent);
}

void frame_square(const frame *f, mpq_t result, const mpq_t square)
{
    shift(result, square, -2 * f->exponent);
}

void frame_square_back(const frame *f, mpq_t result, const mpq_t square)
{
    shift(result, square, 2 * f->exponent);
}

void poly3_init(poly3 *v)
{
    for (int k = 0; k < 3; k++)
        poly_init(&v->c[k]);
}

void poly3_clear(poly3 *v)
{
    for (int k = 0; k < 3; k++)
        poly_clear(&v->c[k]);
}

void poly3_difference(poly3 *v, mpz_t a_start[3], mpz_t a_end[3], mpz_t b_start[3], mpz_t b_end[3])
{
    mpz_t start, end;
    mpz_init(start);
    mpz_init(end);
    for (int k = 0; k < 3; k++) {
        mpz_sub(start, b_start[k], a_start[k]);
        mpz_sub(end, b_end[k], a_end[k]);
        poly_set_path(&v->c[k], start, end);
    }
    mpz_clear(start);
    mpz_clear(end);
}

void poly3_dot(poly *result, const poly3 *a, const poly3 *b)
{
    poly product, sum;
    poly_init(&product);
    poly_init(&sum);
    for (int k = 0; k < 3; k++) {
        poly_mul(&product, &a->c[k], &b->c[k]);
        poly_add(&sum, &sum, &product);
    }
    poly_set(result, &sum);
    poly_clear(&product);
    poly_clear(&sum);
}

void poly3_cross(poly3 *result, const poly3 *a, const poly3 *b)
{
    poly left, right;
    poly_init(&left);
    poly_init(&right);
    for (int k = 0; k < 3; k++) {
        int i = (k + 1) % 3, j = (k + 2) % 3;
        poly_mul(&left, &a->c[i], &b->c[j]);
        poly_mul(&right, &a->c[j], &b->c[i]);
        poly_sub(&result->c[k], &left, &right);
    }
    poly_clear(&left);
    poly_clear(&right);
}
