/* response/solve.c: see solve.h. */
#include "response/solve.h"

#include "base/vector.h"
#include "response/dense.h"

typedef struct state {
    rdli_problem *problem;
    double *gradient, *direction, *image, *scaled; /* row_count each: g, p, A p, scaled multipliers */
    double step_bar;                               /* fixed step length of the projection, 1 / |A| */
} state;

enum {
    RELAXATIONS = 32, /* Gauss-Seidel sweeps before the conjugate gradients take over */
    CONJUGATE = 96,   /* conjugate gradient steps after which the problem counts as degenerate, and relaxation goes on */
    CHECK = 8         /* sweeps between two looks at the residuals */
};
/* Over-relaxation of the sweeps: any number between 0 and 2 converges; common practice for contact problems. */
static const double over_relaxation = 1.3;

static double row_value(const rdli_row *row, const double (*x)[3])
{
    double sum = 0.0;
    for (int k = 0; k < 4; k++)
        sum += row->weight[k] * rdli_dot(row->normal, x[row->vertex[k]]);
    return sum;
}

/* scratch = M^-1 J' S v, with S the row scales. */
static void spread(const rdli_problem *problem, const double *v)
{
    double (*out)[3] = problem->scratch;
    memset(out, 0, problem->vertex_count * sizeof *out);
    for (size_t r = 0; r < problem->row_count; r++) {
        const rdli_row *row = &problem->rows[r];
        double amount = row->scale * v[r];
        if (amount == 0.0)
            continue;
        for (int k = 0; k < 4; k++)
            rdli_add_scaled(out[row->vertex[k]], amount * row->weight[k], row->normal);
    }
    for (size_t i = 0; i < problem->vertex_count; i++)
        for (int k = 0; k < 3; k++)
            out[i][k] *= problem->inverse_mass[i];
}

/* image = S J M^-1 J' S v */
static void apply(const rdli_problem *problem, const double *v, double *image)
{
    spread(problem, v);
    for (size_t r = 0; r < problem->row_count; r++)
        image[r] = problem->rows[r].scale * row_value(&problem->rows[r], (const double (*)[3])problem->scratch);
}

static void scale_rows(const rdli_problem *problem)
{
    for (size_t r = 0; r < problem->row_count; r++) {
        rdli_row *row = &problem->rows[r];
        double diagonal = 0.0, square = rdli_dot(row->normal, row->normal);
        for (int k = 0; k < 4; k++)
            if (row->weight[k] != 0.0)
                diagonal += row->weight[k] * row->weight[k] * problem->inverse_mass[row->vertex[k]] * square;
        row->scale = diagonal > 0.0 ? 1.0 / sqrt(diagonal) : 0.0;
    }
}

/* Largest eigenvalue of the scaled matrix by the power method, from a fixed start of mixed signs. It approaches from below;
 * a projection step of one over it is safe as long as it has found half of the true value. */
static double norm_estimate(state *s)
{
    size_t n = s->problem->row_count;
    double size = 0.0;
    for (size_t r = 0; r < n; r++)
        s->direction[r] = (r * 2654435761u >> 16 & 1u ? 1.0 : -1.0) * (1.0 + (double)(r % 7) / 8.0);
    for (int step = 0; step < 12; step++) {
        apply(s->problem, s->direction, s->image);
        double square = 0.0, before = 0.0;
        for (size_t r = 0; r < n; r++) {
            before += s->direction[r] * s->direction[r];
            square += s->image[r] * s->image[r];
        }
        if (!(square > 0.0))
            return 0.0;
        size = sqrt(square / before);
        double scale = 1.0 / sqrt(square);
        for (size_t r = 0; r < n; r++)
            s->direction[r] = s->image[r] * scale;
    }
    return size;
}

/* One projected successive over-relaxation sweep over the rows, forwards or backwards (Cryer 1971). Rows that repeat each
 * other, of which stacked sheets have hundreds at a vertex, do not slow it down as they do gradient steps. */
static void relax(state *s, bool backwards)
{
    rdli_problem *problem = s->problem;
    size_t n = problem->row_count;
    for (size_t i = 0; i < n; i++) {
        size_t r = backwards ? n - 1 - i : i;
        const rdli_row *row = &problem->rows[r];
        if (row->scale == 0.0)
            continue;
        double residual = row_value(row, (const double (*)[3])problem->solution) - row->bound;
        double moved = s->scaled[r] - over_relaxation * row->scale * residual;
        double change = (moved > 0.0 ? moved : 0.0) - s->scaled[r];
        if (change == 0.0)
            continue;
        s->scaled[r] += change;
        for (int k = 0; k < 4; k++)
            rdli_add_scaled(problem->solution[row->vertex[k]],
                            change * row->scale * row->weight[k] * problem->inverse_mass[row->vertex[k]], row->normal);
    }
}

/* Solution and unscaled row residuals from the present multipliers; the gradient in scaled variables. */
static double refresh(state *s)
{
    rdli_problem *problem = s->problem;
    spread(problem, s->scaled);
    for (size_t i = 0; i < problem->vertex_count; i++)
        for (int k = 0; k < 3; k++)
            problem->solution[i][k] = problem->target[i][k] + problem->scratch[i][k];
    double worst = 0.0;
    for (size_t r = 0; r < problem->row_count; r++) {
        const rdli_row *row = &problem->rows[r];
        double residual = row_value(row, (const double (*)[3])problem->solution) - row->bound;
        s->gradient[r] = row->scale * residual;
        worst = row->scale > 0.0 ? fmax(worst, -residual) : worst; /* nobody can help the others */
    }
    return worst;
}

static bool row_done(const state *s, size_t r)
{
    const rdli_row *row = &s->problem->rows[r];
    double g = s->gradient[r], tolerance = row->scale * row->tolerance;
    if (g < -tolerance)
        return false;
    return s->scaled[r] == 0.0 || g <= tolerance || s->scaled[r] <= s->step_bar * tolerance;
}

static bool all_done(const state *s)
{
    for (size_t r = 0; r < s->problem->row_count; r++)
        if (s->problem->rows[r].scale > 0.0 && !row_done(s, r))
            return false;
    return true;
}

static void free_gradient(const state *s, double *out)
{
    for (size_t r = 0; r < s->problem->row_count; r++)
        out[r] = s->scaled[r] > 0.0 ? s->gradient[r] : 0.0;
}

/* Square of the chopped gradient against the reduced free one: proportional iterates go on with conjugate gradients. */
static bool is_proportional(const state *s)
{
    double chopped = 0.0, reduced = 0.0;
    for (size_t r = 0; r < s->problem->row_count; r++) {
        double g = s->gradient[r];
        if (s->scaled[r] > 0.0)
            reduced += g * fmin(s->scaled[r] / s->step_bar, g);
        else if (g < 0.0)
            chopped += g * g;
    }
    return chopped <= reduced;
}

static double dot(size_t n, const double *a, const double *b)
{
    double sum = 0.0;
    for (size_t i = 0; i < n; i++)
        sum += a[i] * b[i];
    return sum;
}

/* Largest step along -direction that keeps all multipliers >= 0. */
static double step_to_bound(const state *s)
{
    double step = DBL_MAX;
    for (size_t r = 0; r < s->problem->row_count; r++)
        if (s->direction[r] > 0.0)
            step = fmin(step, s->scaled[r] / s->direction[r]);
    return step;
}

static void walk(state *s, double step)
{
    for (size_t r = 0; r < s->problem->row_count; r++) {
        double moved = s->scaled[r] - step * s->direction[r];
        s->scaled[r] = moved > 0.0 ? moved : 0.0;
        s->gradient[r] -= step * s->image[r];
    }
}

/* Rows that no multiplier holds any more must not stay a rounding above zero. */
static void expand(state *s, double step)
{
    size_t n = s->problem->row_count;
    walk(s, step);
    for (size_t r = 0; r < n; r++) {
        if (s->scaled[r] > 0.0) {
            double moved = s->scaled[r] - s->step_bar * s->gradient[r];
            s->scaled[r] = moved > 0.0 ? moved : 0.0;
        }
    }
    refresh(s);
    free_gradient(s, s->direction);
}

/* One step; false when the direction has no curvature although the gradient wants to go on: the dual is unbounded. */
static bool advance(state *s)
{
    size_t n = s->problem->row_count;
    bool proportional = is_proportional(s);
    if (!proportional)
        for (size_t r = 0; r < n; r++)
            s->direction[r] = s->scaled[r] == 0.0 && s->gradient[r] < 0.0 ? s->gradient[r] : 0.0;
    apply(s->problem, s->direction, s->image);
    double slope = dot(n, s->gradient, s->direction);
    double curvature = dot(n, s->direction, s->image);
    double size = dot(n, s->direction, s->direction);
    /* 2^-40 of the largest possible curvature: what rounding leaves of a null direction. */
    bool flat = !(curvature > size / s->step_bar * 0x1p-40);
    double to_bound = step_to_bound(s);
    if (flat && (to_bound == DBL_MAX || slope <= 0.0))
        return false;
    double step = flat ? 0.0 : slope / curvature;
    if (!proportional) {
        walk(s, step);
        free_gradient(s, s->direction);
    } else if (!flat && step <= to_bound) {
        walk(s, step);
        double beta = 0.0;
        for (size_t r = 0; r < n; r++)
            beta += s->scaled[r] > 0.0 ? s->gradient[r] * s->image[r] : 0.0;
        beta /= curvature;
        for (size_t r = 0; r < n; r++)
            s->direction[r] = (s->scaled[r] > 0.0 ? s->gradient[r] : 0.0) - beta * s->direction[r];
    } else {
        expand(s, to_bound);
    }
    return true;
}

static bool relax_until(state *s, rdli_solved *solved, uint32_t sweeps_max)
{
    while (solved->sweeps < sweeps_max) {
        for (int k = 0; k < CHECK; k++)
            relax(s, k % 2 != 0);
        solved->sweeps += CHECK;
        refresh(s);
        if (all_done(s))
            return true;
    }
    return false;
}

/* Conjugate gradients on the faces. */
static bool descend(state *s, rdli_solved *solved, uint32_t sweeps_max)
{
    free_gradient(s, s->direction);
    while (solved->sweeps < sweeps_max) {
        if (all_done(s)) {
            /* The recursive gradient drifts: trust only a fresh one. */
            refresh(s);
            if (all_done(s))
                return true;
            free_gradient(s, s->direction);
        }
        solved->sweeps++;
        if (!advance(s)) {
            solved->infeasible = true;
            return false;
        }
    }
    return false;
}

rdli_solved rdli_solve(rdli_problem *problem)
{
    size_t n = problem->row_count;
    state s = { problem, problem->work, problem->work + n, problem->work + 2 * n, problem->work + 3 * n, 0.0 };
    rdli_solved solved = { 0, false, false, 0.0, 0.0 };
    scale_rows(problem);
    double norm = norm_estimate(&s);
    s.step_bar = norm > 0.0 ? 1.0 / norm : 1.0;
    memset(s.scaled, 0, n * sizeof(double));
    solved.worst_before = refresh(&s);
    for (size_t r = 0; r < n; r++)
        s.scaled[r] = problem->rows[r].scale > 0.0 ? problem->load[r] / problem->rows[r].scale : 0.0;
    refresh(&s);
    uint32_t most = problem->sweeps_max, relaxed = most < RELAXATIONS ? most : RELAXATIONS;
    solved.converged = all_done(&s) || relax_until(&s, &solved, relaxed);
    uint32_t conjugate = most < RELAXATIONS + CONJUGATE ? most : RELAXATIONS + CONJUGATE;
    if (!solved.converged)
        solved.converged = descend(&s, &solved, conjugate);
    if (!solved.converged && !solved.infeasible)
        solved.converged = relax_until(&s, &solved, most);
    if (!solved.converged && problem->dense_work != NULL && rdli_solve_dense(problem, problem->dense_work)) {
        /* The interior point leaves a trace of load on every row. Without it the answer is a little off its tolerances, on
         * rows that are now known: conjugate gradients mend that at once. */
        for (size_t r = 0; r < n; r++)
            s.scaled[r] = problem->load[r] / problem->rows[r].scale;
        refresh(&s);
        descend(&s, &solved, solved.sweeps + CONJUGATE);
        solved.converged = true;
        solved.infeasible = false;
    }
    for (size_t r = 0; r < n; r++)
        problem->load[r] = s.scaled[r] * problem->rows[r].scale;
    solved.worst_after = refresh(&s);
    return solved;
}
