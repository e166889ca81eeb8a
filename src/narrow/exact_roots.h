/* narrow/exact_roots.h: times that are roots of polynomials with integer coefficients. Inside narrow only. */
#ifndef RDLI_EXACT_ROOTS_H
#define RDLI_EXACT_ROOTS_H

#include "base/exact.h"

enum { RDLI_CHAIN = 6 };

/* A signed remainder sequence. */
typedef struct rdli_chain {
    int count;
    rdli_poly p[RDLI_CHAIN];
} rdli_chain;

/* The distinct roots of a polynomial in (0, 1); degree at most 3. */
typedef struct rdli_roots {
    int count;
    rdli_poly whole; /* without its roots at 0 and 1 */
    rdli_poly f;     /* and squarefree: valid with what follows where count > 0 */
    rdli_chain sturm;
    int at_zero, at_one;
} rdli_roots;

/* A time: exactly k / 2^m, or the only root of f in (k / 2^m, (k + 1) / 2^m). */
typedef struct rdli_instant {
    bool dyadic;
    rdli_int k;
    unsigned m;
    const rdli_poly *f;     /* squarefree: it changes its sign at the root */
    const rdli_poly *whole; /* with its multiple roots, and much shorter where there are any: for queries */
    mp_limb_t own[2];       /* where k lives while it is short, so that it can be sharpened in place */
} rdli_instant;

void rdli_roots_open(rdli_arena *arena, const rdli_poly *f, rdli_roots *roots);
/* The root of rank `rank`, from 1, ascending. It refers to roots, and must not be copied. */
void rdli_roots_isolate(rdli_arena *arena, const rdli_roots *roots, int rank, rdli_instant *root);
/* Exact sign of q (degree at most 2) at the instant, which may become sharper. */
int rdli_instant_sign(rdli_arena *arena, rdli_instant *at, const rdli_poly *q);
/* Bounds in doubles. */
void rdli_instant_bracket(const rdli_instant *at, double *lo, double *hi);

#endif
