/* matrix.c: symmetric block matrices and preconditioned conjugate gradients.
 * Source: Baraff & Witkin 1998, Large steps in cloth simulation, section 5.3 (the filter for driven vertices). */
#include "matrix.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static int compare_pairs(const void *left, const void *right)
{
    const uint32_t *a = left, *b = right;
    if (a[0] != b[0])
        return a[0] < b[0] ? -1 : 1;
    return a[1] < b[1] ? -1 : a[1] > b[1];
}

int host_pattern_build(host_pattern *pattern, size_t rows, uint32_t (*pairs)[2], size_t pair_count)
{
    for (size_t k = 0; k < pair_count; k++)
        if (pairs[k][0] > pairs[k][1]) {
            uint32_t swap = pairs[k][0];
            pairs[k][0] = pairs[k][1];
            pairs[k][1] = swap;
        }
    if (pair_count)
        qsort(pairs, pair_count, sizeof *pairs, compare_pairs);
    pattern->rows = rows;
    pattern->first = calloc(rows + 1, sizeof *pattern->first);
    pattern->column = malloc((pair_count + 1) * sizeof *pattern->column);
    if (!pattern->first || !pattern->column)
        return 0;
    size_t count = 0;
    for (size_t k = 0; k < pair_count; k++) {
        if (k && compare_pairs(pairs[k], pairs[k - 1]) == 0)
            continue;
        pattern->column[count++] = pairs[k][1];
        pattern->first[pairs[k][0] + 1] = count;
    }
    for (size_t i = 1; i <= rows; i++) /* rows without entries begin where the row before them ends */
        if (pattern->first[i] < pattern->first[i - 1])
            pattern->first[i] = pattern->first[i - 1];
    return 1;
}

void host_pattern_free(host_pattern *pattern)
{
    free(pattern->first);
    free(pattern->column);
}

size_t host_pattern_find(const host_pattern *pattern, uint32_t a, uint32_t b)
{
    uint32_t row = a < b ? a : b, column = a < b ? b : a;
    size_t low = pattern->first[row], high = pattern->first[row + 1];
    while (high - low > 1) {
        size_t middle = low + (high - low) / 2;
        if (pattern->column[middle] <= column)
            low = middle;
        else
            high = middle;
    }
    return low;
}

void host_multiply_scalars(const host_scalars *b, const double (*x)[3], double (*y)[3])
{
    for (size_t i = 0; i < b->pattern.rows; i++)
        for (int k = 0; k < 3; k++)
            y[i][k] = b->diagonal[i] * x[i][k];
    for (size_t i = 0; i < b->pattern.rows; i++) {
        double sum[3] = {0, 0, 0};
        for (size_t e = b->pattern.first[i]; e < b->pattern.first[i + 1]; e++) {
            uint32_t j = b->pattern.column[e];
            for (int k = 0; k < 3; k++) {
                sum[k] += b->value[e] * x[j][k];
                y[j][k] += b->value[e] * x[i][k];
            }
        }
        for (int k = 0; k < 3; k++)
            y[i][k] += sum[k];
    }
}

static void add_block(const double m[9], const double x[3], double y[3])
{
    y[0] += m[0] * x[0] + m[1] * x[1] + m[2] * x[2];
    y[1] += m[3] * x[0] + m[4] * x[1] + m[5] * x[2];
    y[2] += m[6] * x[0] + m[7] * x[1] + m[8] * x[2];
}

static void add_transposed(const double m[9], const double x[3], double y[3])
{
    y[0] += m[0] * x[0] + m[3] * x[1] + m[6] * x[2];
    y[1] += m[1] * x[0] + m[4] * x[1] + m[7] * x[2];
    y[2] += m[2] * x[0] + m[5] * x[1] + m[8] * x[2];
}

static void multiply_couplings(const host_system *system, const double (*x)[3], double (*y)[3])
{
    for (size_t c = 0; c < system->coupling_count; c++) {
        const host_coupling *k = &system->couplings[c];
        double along = 0;
        for (int i = 0; i < 4; i++) {
            const double *v = x[k->vertex[i]];
            along += k->weight[i] * (v[0] * k->normal[0] + v[1] * k->normal[1] + v[2] * k->normal[2]);
        }
        for (int i = 0; i < 4; i++)
            for (int n = 0; n < 3; n++)
                y[k->vertex[i]][n] += k->strength * along * k->weight[i] * k->normal[n];
    }
}

void host_multiply(const host_system *system, const double (*x)[3], double (*y)[3])
{
    const host_matrix *a = system->a;
    host_multiply_scalars(system->b, x, y);
    for (size_t i = 0; i < a->pattern.rows; i++)
        for (int k = 0; k < 3; k++)
            y[i][k] *= system->scale;
    for (size_t i = 0; i < a->pattern.rows; i++) {
        double own[3] = {x[i][0], x[i][1], x[i][2]}, sum[3] = {0, 0, 0};
        add_block(a->diagonal[i], own, sum);
        for (size_t e = a->pattern.first[i]; e < a->pattern.first[i + 1]; e++) {
            uint32_t j = a->pattern.column[e];
            add_block(a->block[e], x[j], sum);
            add_transposed(a->block[e], own, y[j]);
        }
        for (int k = 0; k < 3; k++)
            y[i][k] += sum[k];
    }
    multiply_couplings(system, x, y);
}

static void subtract_transposed(const double m[9], const double x[3], double y[3])
{
    y[0] -= m[0] * x[0] + m[3] * x[1] + m[6] * x[2];
    y[1] -= m[1] * x[0] + m[4] * x[1] + m[7] * x[2];
    y[2] -= m[2] * x[0] + m[5] * x[1] + m[8] * x[2];
}

/* target -= m^T inner m */
static void subtract_sandwich(const double m[9], const double inner[9], double target[9])
{
    double right[9];
    for (int r = 0; r < 3; r++)
        for (int c = 0; c < 3; c++)
            right[3 * r + c] = inner[3 * r] * m[c] + inner[3 * r + 1] * m[3 + c] + inner[3 * r + 2] * m[6 + c];
    for (int r = 0; r < 3; r++)
        for (int c = 0; c < 3; c++)
            target[3 * r + c] -= m[r] * right[c] + m[3 + r] * right[3 + c] + m[6 + r] * right[6 + c];
}

/* 0 when the symmetric m is not positive definite (leading minors, with a margin against rounding). */
static int invert_positive(const double m[9], double out[9])
{
    double minor = m[0] * m[4] - m[1] * m[3];
    double a = m[4] * m[8] - m[5] * m[7], b = m[2] * m[7] - m[1] * m[8], c = m[1] * m[5] - m[2] * m[4];
    double determinant = m[0] * a + m[3] * b + m[6] * c;
    if (!(m[0] > 0) || !(minor > 1e-9 * m[0] * m[4]) || !(determinant > 1e-9 * minor * m[8]))
        return 0;
    double rows[9] = {a, b, c, m[5] * m[6] - m[3] * m[8], m[0] * m[8] - m[2] * m[6], m[2] * m[3] - m[0] * m[5],
                      m[3] * m[7] - m[4] * m[6], m[1] * m[6] - m[0] * m[7], m[0] * m[4] - m[1] * m[3]};
    for (int k = 0; k < 9; k++)
        out[k] = rows[k] / determinant;
    return 1;
}

static void keep_free(const host_filter *filter, double v[3])
{
    if (filter->count == 0)
        return;
    double along = v[0] * filter->along[0] + v[1] * filter->along[1] + v[2] * filter->along[2];
    for (int k = 0; k < 3; k++)
        v[k] = filter->count == 3 ? 0 : v[k] - along * filter->along[k];
}

/* m := F m G with the filters of its row and its column. */
static void keep_free_block(const host_filter *row, const host_filter *column, double m[9])
{
    for (int c = 0; c < 3 && row->count; c++) {
        double v[3] = {m[c], m[3 + c], m[6 + c]};
        keep_free(row, v);
        for (int r = 0; r < 3; r++)
            m[3 * r + c] = v[r];
    }
    for (int r = 0; r < 3 && column->count; r++)
        keep_free(column, &m[3 * r]);
}

/* Diagonal blocks of the system into solver->pivot. */
static void collect_diagonal(host_solver *solver, const host_system *system)
{
    for (size_t i = 0; i < system->a->pattern.rows; i++) {
        memcpy(solver->pivot[i], system->a->diagonal[i], sizeof solver->pivot[i]);
        for (int k = 0; k < 9; k += 4)
            solver->pivot[i][k] += system->scale * system->b->diagonal[i];
    }
    for (size_t c = 0; c < system->coupling_count; c++) {
        const host_coupling *k = &system->couplings[c];
        for (int i = 0; i < 4; i++)
            for (int r = 0; r < 3; r++)
                for (int q = 0; q < 3; q++)
                    solver->pivot[k->vertex[i]][3 * r + q] +=
                        k->strength * k->weight[i] * k->weight[i] * k->normal[r] * k->normal[q];
    }
}

/* m := F m F for a diagonal block, with a positive value along filtered directions so that it has an inverse. */
static void filter_diagonal(const host_filter *filter, double m[9])
{
    double along = m[0];
    keep_free_block(filter, filter, m);
    for (int r = 0; r < 3; r++)
        for (int c = 0; c < 3; c++)
            if (filter->count == 1)
                m[3 * r + c] += along * filter->along[r] * filter->along[c];
            else if (filter->count == 3)
                m[3 * r + c] = r == c ? along : 0;
}

/* Factors of the preconditioner P = (E + L) E^-1 (E + L^T) of F A F, L its strict lower half (without bending and
 * couplings) and E block-diagonal with E_j = D_j - sum_i L_ji E_i^-1 L_ji^T: P equals the filtered system on the diagonal,
 * and on a plain chain everywhere (Pommerell 1992 calls it D-ILU). Where a block would cease to be positive definite, D_j
 * itself serves: P stays positive definite with any such E. */
static void factor(host_solver *solver, const host_system *system)
{
    const host_pattern *pattern = &system->a->pattern;
    collect_diagonal(solver, system);
    for (size_t i = 0; i < pattern->rows; i++) {
        filter_diagonal(&solver->filter[i], solver->pivot[i]);
        memcpy(solver->inverse[i], solver->pivot[i], sizeof solver->inverse[i]); /* D_i, until its turn comes */
        for (size_t e = pattern->first[i]; e < pattern->first[i + 1]; e++) {
            memcpy(solver->upper[e], system->a->block[e], sizeof solver->upper[e]);
            keep_free_block(&solver->filter[i], &solver->filter[pattern->column[e]], solver->upper[e]);
        }
    }
    for (size_t i = 0; i < pattern->rows; i++) {
        double own[9];
        memcpy(own, solver->inverse[i], sizeof own);
        if (!invert_positive(solver->pivot[i], solver->inverse[i]))
            invert_positive(own, solver->inverse[i]);
        for (size_t e = pattern->first[i]; e < pattern->first[i + 1]; e++)
            subtract_sandwich(solver->upper[e], solver->inverse[i], solver->pivot[pattern->column[e]]);
    }
}

/* z = F P^-1 F r with the filter F; returns r . z. */
static double precondition(const host_solver *solver, const host_pattern *pattern, const double (*r)[3],
                           double (*z)[3])
{
    double dot = 0;
    for (size_t i = 0; i < pattern->rows; i++) {
        memcpy(z[i], r[i], sizeof z[i]);
        keep_free(&solver->filter[i], z[i]);
    }
    for (size_t i = 0; i < pattern->rows; i++) { /* z := (E + L)^-1 z */
        double own[3] = {0, 0, 0};
        add_block(solver->inverse[i], z[i], own);
        memcpy(z[i], own, sizeof own);
        for (size_t e = pattern->first[i]; e < pattern->first[i + 1]; e++)
            subtract_transposed(solver->upper[e], own, z[pattern->column[e]]);
    }
    for (size_t i = pattern->rows; i-- > 0;) { /* z := (I + E^-1 L^T)^-1 z */
        double sum[3] = {0, 0, 0}, own[3] = {0, 0, 0};
        for (size_t e = pattern->first[i]; e < pattern->first[i + 1]; e++)
            add_block(solver->upper[e], z[pattern->column[e]], sum);
        add_block(solver->inverse[i], sum, own);
        for (int k = 0; k < 3; k++)
            z[i][k] -= own[k];
    }
    for (size_t i = 0; i < pattern->rows; i++) {
        keep_free(&solver->filter[i], z[i]); /* what rounding has left there */
        dot += r[i][0] * z[i][0] + r[i][1] * z[i][1] + r[i][2] * z[i][2];
    }
    return dot;
}

size_t host_solve(host_solver *solver, const host_system *system, const double (*rhs)[3], double tolerance,
                  size_t limit, double (*x)[3])
{
    const host_pattern *pattern = &system->a->pattern;
    size_t rows = pattern->rows, used = 0;
    double (*r)[3] = solver->residual, (*p)[3] = solver->direction, (*q)[3] = solver->image, (*z)[3] = solver->scaled;
    factor(solver, system);
    double aim = precondition(solver, pattern, rhs, z) * tolerance * tolerance;
    host_multiply(system, (const double (*)[3])x, q);
    for (size_t i = 0; i < rows; i++)
        for (int k = 0; k < 3; k++)
            r[i][k] = rhs[i][k] - q[i][k];
    double size = precondition(solver, pattern, (const double (*)[3])r, z);
    memcpy(p, z, rows * sizeof *p);
    while (size > aim && used < limit) {
        host_multiply(system, (const double (*)[3])p, q);
        double curvature = 0;
        for (size_t i = 0; i < rows; i++)
            curvature += p[i][0] * q[i][0] + p[i][1] * q[i][1] + p[i][2] * q[i][2];
        double step = size / curvature;
        for (size_t i = 0; i < rows; i++)
            for (int k = 0; k < 3; k++) {
                x[i][k] += step * p[i][k];
                r[i][k] -= step * q[i][k];
            }
        double next = precondition(solver, pattern, (const double (*)[3])r, z);
        double turn = next / size;
        for (size_t i = 0; i < rows; i++)
            for (int k = 0; k < 3; k++)
                p[i][k] = z[i][k] + turn * p[i][k];
        size = next;
        used++;
    }
    return used;
}
