/* matrix.h: symmetric sparse matrices of 3x3 blocks and of scalars, and conjugate gradients on their sum. */
#ifndef RADDLE_TOOLS_HOST_MATRIX_H
#define RADDLE_TOOLS_HOST_MATRIX_H

#include <stddef.h>
#include <stdint.h>

/* Where the entries above the diagonal are: row i holds columns column[first[i]] .. column[first[i + 1] - 1], all > i
 * and ascending. The lower half is the mirror image and is not stored. */
typedef struct host_pattern {
    size_t rows;
    size_t *first;
    uint32_t *column;
} host_pattern;

typedef struct host_matrix {
    host_pattern pattern;
    double (*block)[9];    /* row-major, one per pattern entry */
    double (*diagonal)[9]; /* one per row, symmetric */
} host_matrix;

/* Each entry stands for itself times the 3x3 identity. */
typedef struct host_scalars {
    host_pattern pattern;
    double *value, *diagonal;
} host_scalars;

/* A bending element: energy 1/2 stiffness |sum weight[i] x_i|^2 over up to four vertices. */
typedef struct host_bend {
    uint32_t vertex[4], count;
    double weight[4], stiffness;
} host_bend;

/* Resists relative motion of up to four vertices along a direction: adds strength weight_i weight_j n n^T for each couple
 * of them. Not in the patterns, since such contacts come and go. */
typedef struct host_coupling {
    uint32_t vertex[4];
    double weight[4], normal[3], strength;
} host_coupling;

/* A linear system: the sum of its parts, A + scale B + couplings. */
typedef struct host_system {
    const host_matrix *a;
    const host_scalars *b;
    double scale;
    const host_coupling *couplings;
    size_t coupling_count;
} host_system;

/* Which motions of a row are free: all but those along `count` given directions; 3: none. */
typedef struct host_filter {
    uint32_t count; /* 0, 1 or 3 */
    double along[3]; /* unit vector, for count 1 */
} host_filter;

typedef struct host_solver {
    host_filter *filter;
    double (*pivot)[9], (*inverse)[9], (*upper)[9]; /* the preconditioner, see factor() in matrix.c */
    double (*residual)[3], (*direction)[3], (*image)[3], (*scaled)[3];
} host_solver;

/* pairs: vertex couples in any order, repeats welcome; sorted in place. 0 when memory ran out. */
int host_pattern_build(host_pattern *pattern, size_t rows, uint32_t (*pairs)[2], size_t pair_count);
void host_pattern_free(host_pattern *pattern);
/* The entry of an existing pair. */
size_t host_pattern_find(const host_pattern *pattern, uint32_t a, uint32_t b);

/* y = system x */
void host_multiply(const host_system *system, const double (*x)[3], double (*y)[3]);
/* y = B x */
void host_multiply_scalars(const host_scalars *b, const double (*x)[3], double (*y)[3]);
/* Solves system x = rhs in the free motions of solver->filter; x holds the first guess, and keeps its given values
 * elsewhere. Ends when the preconditioned residual has fallen to tolerance times that of rhs. Returns the iterations and
 * leaves rhs - system x, unfiltered, in solver->residual. */
size_t host_solve(host_solver *solver, const host_system *system, const double (*rhs)[3], double tolerance,
                  size_t limit, double (*x)[3]);

#endif
