/* bench/narrow/textbook.h: the opponent. Coplanarity cubic in the power basis, closed-form roots in doubles, inside test
 * with a tolerance (Provot 1997; Bridson, Fedkiw, Anderson 2002), roots by gsl_poly_solve_cubic. */
#ifndef BENCH_TEXTBOOK_H
#define BENCH_TEXTBOOK_H

#include <stdbool.h>

#include "raddle/query.h"

/* Touch at gap 0; *time is the first root at which the features meet. */
bool textbook_meets(int kind, const rdl_motion *motion, double *time);
/* Touch at a gap > 0: the cubic, and the distance at the start, at the roots and at the end. */
bool textbook_touches(int kind, const rdl_motion *motion, double gap, double *time);

#endif
