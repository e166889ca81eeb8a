/* response/solve.h: nearest point of an intersection of half spaces in the mass metric. Private to response. */
#ifndef RDLI_SOLVE_H
#define RDLI_SOLVE_H

#include "base/internal.h"

/* One half space: normal . sum_k weight[k] x[vertex[k]] >= bound. Unmovable vertices have no share here: their part is
 * already subtracted from bound. */
typedef struct rdli_row {
    uint32_t vertex[4];   /* local vertex numbers, the used ones first; unused entries have weight 0 and vertex 0 */
    double weight[4], normal[3];
    double bound;         /* m, less what unmovable vertices contribute */
    double share;         /* how much of the contact can move, (0, 1] */
    double tolerance;     /* m, allowed violation */
    uint32_t origin;      /* row number before idle rows were left out; the solve does not look at it */
    uint32_t used;        /* entries of vertex and weight */
    double scale;         /* 1 / sqrt(A_rr), filled by the solve; 0 = nothing in this row can move */
} rdli_row;

enum { RDLI_SOLVE_WORK = 9 }; /* doubles of work space per row */

typedef struct rdli_problem {
    size_t vertex_count, row_count;
    const double *inverse_mass;     /* per local vertex, 1/kg, > 0 */
    const double (*target)[3];      /* m */
    rdli_row *rows;
    double *load;                   /* row_count multipliers, in/out, >= 0 */
    double (*solution)[3];          /* out */
    double (*scratch)[3];           /* vertex_count */
    double *work;                   /* RDLI_SOLVE_WORK * row_count */
    double *dense_work;             /* room for rdli_solve_dense, or NULL */
    uint32_t sweeps_max;
    bool feasible_only;             /* stop as soon as every row is met, although some may be pushed too far */
} rdli_problem;

/* Adds a movable vertex to a row. */
static inline void rdli_row_add(rdli_row *row, uint32_t vertex, double weight)
{
    row->vertex[row->used] = vertex;
    row->weight[row->used++] = weight;
}

typedef struct rdli_solved {
    uint32_t sweeps;
    bool converged, infeasible;
    double worst_before, worst_after; /* largest violation of a row, m */
} rdli_solved;

/* minimise 1/2 sum m |x - target|^2 subject to the rows, through the dual
 *   minimise 1/2 l' A l - l' r,  l >= 0,  A = J M^-1 J',  r = bound - J target,  x = target + M^-1 J' l,
 * by modified proportioning with reduced gradient projections (Dostal & Schoeberl 2005, algorithm 1), which is monotone,
 * keeps l feasible, needs no matrix and copes with dependent rows. Departures from the paper: rows are scaled to unit
 * diagonal; projected over-relaxation comes first, and last where rows are degenerate; the stopping test is per row in metres; directions of zero curvature end the solve as infeasible, since then
 * the dual is unbounded and the half spaces have no common point.
 * Serial; the order of all sums is that of rows and vertices. No allocation. */
rdli_solved rdli_solve(rdli_problem *problem);

#endif
