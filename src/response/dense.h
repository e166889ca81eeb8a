/* response/dense.h: the zone problem by an interior-point method with dense factors. Private to response. */
#ifndef RDLI_DENSE_H
#define RDLI_DENSE_H

#include "response/solve.h"

/* Zones up to this many vertices; above it the cubic cost of the factors is not worth it. */
enum { RDLI_DENSE_VERTICES = 192 };

/* Doubles of work space for a problem. */
size_t rdli_dense_work(size_t vertex_count, size_t row_count);

/* Solves the same problem as rdli_solve, for zones whose rows depend on each other so much that first-order methods crawl:
 * sheets or strands thicker than their mesh spacing, where every pair is at its floor. Predictor-corrector interior-point
 * method for convex quadratic programs (Mehrotra 1992; Nocedal & Wright 2006, algorithm 16.4) in y = M^1/2 (x - target),
 * with rows scaled to unit length, so that the normal matrix I + J' D J is well conditioned wherever nothing presses.
 * The rows' scale must be filled. Writes loads and solution; false when it did not reach the tolerances (no common point,
 * or no convergence), and then loads and solution are untouched. Serial, no allocation. */
bool rdli_solve_dense(rdli_problem *problem, double *work);

#endif
