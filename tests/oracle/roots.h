/* oracle/roots.h: real algebraic numbers in [0, 1]: isolation by Sturm's theorem, exact comparison. */
#ifndef ORACLE_ROOTS_H
#define ORACLE_ROOTS_H

#include "poly.h"

/* exact: the number is numerator / 2^bits. Otherwise it is the only root of its polynomial (kept by the owner,
 * square-free) strictly between numerator / 2^bits and (numerator + 1) / 2^bits, and neither end is a root. */
typedef struct root {
    mpz_t numerator;
    unsigned long bits;
    bool exact;
    int sign_below; /* of the polynomial at the lower end; unused when exact */
    int run;        /* how often in a row refinement kept the same side; < 0 lower, > 0 upper */
} root;

void root_init(root *r);
void root_clear(root *r);
void root_set(root *r, const root *from);
void root_set_exact(root *r, unsigned long value);
/* Shrinks the bracket at least by half; may find the root to be exact. */
void root_refine(root *r, const poly *p);
/* All roots of the square-free polynomial with this Sturm sequence in [0, 1], ascending; at most POLY_DEGREE_MAX. */
int roots_isolate(const poly_chain *chain, root *roots);
/* -1, 0, 1. Refines both until their closed brackets are disjoint, or equal when the numbers are. */
int roots_compare(root *a, const poly *pa, root *b, const poly *pb);
/* Sign of (r - t) for a finite double t. */
int root_compare_double(const root *r, const poly *p, double t);
/* numerator / 2^bits strictly between a and b, whose brackets are disjoint, a below b. */
void roots_between(const root *a, const root *b, mpz_t numerator, unsigned long *bits);
/* Refines to width 2^-bits and returns the bracket, rounded outward. */
void root_bracket(root *r, const poly *p, unsigned long bits, double *lo, double *hi);

#endif
