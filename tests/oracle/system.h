/* oracle/system.h: where in [0, 1] does a list of polynomial conditions hold? Decided exactly, cell by cell, on the
 * arrangement of all roots. */
#ifndef ORACLE_SYSTEM_H
#define ORACLE_SYSTEM_H

#include "roots.h"

enum { SYSTEM_MAX = 6, SYSTEM_ROOTS_MAX = SYSTEM_MAX * POLY_DEGREE_MAX + 2 };

typedef enum relation { IS_ZERO, NOT_NEGATIVE, POSITIVE } relation;

/* All conditions must hold together. */
typedef struct condition_system {
    int count;
    poly p[SYSTEM_MAX];
    relation wanted[SYSTEM_MAX];
} condition_system;

void system_init(condition_system *s);
void system_clear(condition_system *s);
/* Empties the list. */
void system_restart(condition_system *s);
/* Makes room for one more condition and returns its polynomial, to be filled in. */
poly *system_add(condition_system *s, relation wanted);

/* The distinct roots of all polynomials in [0, 1], with 0 and 1 themselves, ascending and with disjoint brackets. */
typedef struct arrangement {
    int count;
    root at[SYSTEM_ROOTS_MAX];
    int owner[SYSTEM_ROOTS_MAX];         /* square-free polynomial whose root it is; -1 for plain 0 and 1 */
    unsigned vanishing[SYSTEM_ROOTS_MAX];/* bit k: polynomial k is zero there */
    poly squarefree[SYSTEM_MAX];
} arrangement;

void arrangement_init(arrangement *a);
void arrangement_clear(arrangement *a);
void arrangement_build(arrangement *a, const condition_system *s);
/* Cells are numbered 0 .. 2 count - 2: even 2 i = the number at[i], odd = the open interval after it. */
int arrangement_sign(const arrangement *a, const condition_system *s, int k, int cell);

/* Infimum of the times in [0, 1] at which all conditions hold; false when there are none. *owner = its square-free
 * polynomial (empty when the time is exactly 0 or 1). */
bool system_first(const condition_system *s, root *first, poly *owner);

#endif
