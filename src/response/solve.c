/* response/solve.c: see solve.h. */
#include "response/solve.h"

#include "base/vector.h"
#include "response/dense.h"

typedef struct state {
    rdli_problem *problem;
    double *gradient, *direction, *image, *scaled; /* row_count each: g, p, A p, scaled multipliers */
    uint32_t *list, *other;                        /* the rows that matter now, see refresh; room for the next ones */
    size_t listed;
    uint32_t *mark, *row_of, *start;               /* rows at vertex v: row_of[start[v] .. start[v + 1] - 1] */
    uint32_t round;
    double step_bar;                               /* fixed step length of the projection, 1 / |A| */
} state;

enum {
    RELAXATIONS = 32, /* Gauss-Seidel sweeps before the conjugate gradients take over */
    CONJUGATE = 96,   /* conjugate gradient steps after which the problem counts as degenerate, and relaxation goes on */
    CHECK = 8,        /* sweeps between two looks at the residuals of the listed rows */
    REFRESH = 32,     /* conjugate gradient steps between two looks at all rows */
    LOCAL = 64,       /* sweeps over the neighbourhood of what is not done before its surroundings are looked at */
    LOCAL_ROUNDS = 64, /* such looks between two looks at all rows */
    FEW_OPEN = 16     /* fewer than one in so many rows not done: work on all of them would be a waste */
};
/* Over-relaxation of the sweeps: any number between 0 and 2 converges; common practice for contact problems. */
static const double over_relaxation = 1.3;
/* Less of it where the sweeps start from a point ahead, and not too far ahead: of 4, 8, 16 and of 1.0, 1.15, 1.3 the pair with
 * the fewest sweeps over the scenes of stacked sheets. */
static const double over_ahead = 1.15, momentum_most = 8.0;

static double row_value(const rdli_row *row, const double (*x)[3])
{
    double sum = 0.0;
    for (uint32_t k = 0; k < row->used; k++)
        sum += row->weight[k] * rdli_dot(row->normal, x[row->vertex[k]]);
    return sum;
}

/* scratch = M^-1 J' S v over all or the listed rows, with S the row scales. */
static void spread(const state *s, const double *v, bool all)
{
    const rdli_problem *problem = s->problem;
    double (*out)[3] = problem->scratch;
    memset(out, 0, problem->vertex_count * sizeof *out);
    for (size_t i = 0; i < (all ? problem->row_count : s->listed); i++) {
        size_t r = all ? i : s->list[i];
        const rdli_row *row = &problem->rows[r];
        double amount = row->scale * v[r];
        if (amount == 0.0)
            continue;
        for (uint32_t k = 0; k < row->used; k++)
            rdli_add_scaled(out[row->vertex[k]], amount * row->weight[k], row->normal);
    }
    for (size_t i = 0; i < problem->vertex_count; i++)
        for (int k = 0; k < 3; k++)
            out[i][k] *= problem->inverse_mass[i];
}

/* image = S J M^-1 J' S v, on the listed rows */
static void apply(const state *s, const double *v, double *image)
{
    const rdli_problem *problem = s->problem;
    spread(s, v, false);
    for (size_t i = 0; i < s->listed; i++) {
        const rdli_row *row = &problem->rows[s->list[i]];
        image[s->list[i]] = row->scale * row_value(row, (const double (*)[3])problem->scratch);
    }
}

static void scale_rows(const rdli_problem *problem)
{
    for (size_t r = 0; r < problem->row_count; r++) {
        rdli_row *row = &problem->rows[r];
        double diagonal = 0.0, square = rdli_dot(row->normal, row->normal);
        for (uint32_t k = 0; k < row->used; k++)
            diagonal += row->weight[k] * row->weight[k] * problem->inverse_mass[row->vertex[k]] * square;
        row->scale = diagonal > 0.0 ? 1.0 / sqrt(diagonal) : 0.0;
    }
}

/* Largest eigenvalue of the scaled matrix by the power method, from a fixed start of mixed signs. It approaches from below;
 * a projection step of one over it is safe as long as it has found half of the true value. */
static double norm_estimate(state *s)
{
    double size = 0.0;
    for (size_t i = 0; i < s->listed; i++) {
        size_t r = s->list[i];
        s->direction[r] = (r * 2654435761u >> 16 & 1u ? 1.0 : -1.0) * (1.0 + (double)(r % 7) / 8.0);
    }
    for (int step = 0; step < 12; step++) {
        apply(s, s->direction, s->image);
        double square = 0.0, before = 0.0;
        for (size_t i = 0; i < s->listed; i++) {
            size_t r = s->list[i];
            before += s->direction[r] * s->direction[r];
            square += s->image[r] * s->image[r];
        }
        if (!(square > 0.0))
            return 0.0;
        size = sqrt(square / before);
        double scale = 1.0 / sqrt(square);
        for (size_t i = 0; i < s->listed; i++)
            s->direction[s->list[i]] = s->image[s->list[i]] * scale;
    }
    return size;
}

/* One projected successive over-relaxation sweep over the listed rows, forwards or backwards (Cryer 1971). Rows that
 * repeat each other, of which stacked sheets have hundreds at a vertex, do not slow it down as they do gradient steps. */
static void relax(state *s, bool backwards, double over)
{
    rdli_problem *problem = s->problem;
    for (size_t i = 0; i < s->listed; i++) {
        size_t r = s->list[backwards ? s->listed - 1 - i : i];
        const rdli_row *row = &problem->rows[r];
        double residual = row_value(row, (const double (*)[3])problem->solution) - row->bound;
        double moved = s->scaled[r] - over * row->scale * residual;
        double change = (moved > 0.0 ? moved : 0.0) - s->scaled[r];
        if (change == 0.0)
            continue;
        s->scaled[r] += change;
        for (uint32_t k = 0; k < row->used; k++)
            rdli_add_scaled(problem->solution[row->vertex[k]],
                            change * row->scale * row->weight[k] * problem->inverse_mass[row->vertex[k]], row->normal);
    }
}

/* The gradient of the listed rows in scaled variables, from the present solution. */
static void listed_gradient(state *s)
{
    const rdli_problem *problem = s->problem;
    for (size_t i = 0; i < s->listed; i++) {
        const rdli_row *row = &problem->rows[s->list[i]];
        s->gradient[s->list[i]] = row->scale * (row_value(row, (const double (*)[3])problem->solution) - row->bound);
    }
}

/* The solution that belongs to the present multipliers. */
static void solution_of(state *s)
{
    rdli_problem *problem = s->problem;
    spread(s, s->scaled, true);
    for (size_t i = 0; i < problem->vertex_count; i++)
        for (int k = 0; k < 3; k++)
            problem->solution[i][k] = problem->target[i][k] + problem->scratch[i][k];
}

/* A fresh solution and the residuals of all rows; then lists the rows that matter until the next look: those with a
 * multiplier, and those that are violated or, going by the worst violation, could soon be. Returns the worst violation.
 * Of the rows of a draped cloth one in five ends with a multiplier, and sweeps cost in proportion to the list. */
static double refresh(state *s)
{
    rdli_problem *problem = s->problem;
    solution_of(s);
    double worst = 0.0;
    for (size_t r = 0; r < problem->row_count; r++) {
        const rdli_row *row = &problem->rows[r];
        double residual = row_value(row, (const double (*)[3])problem->solution) - row->bound;
        s->gradient[r] = residual;
        worst = row->scale > 0.0 ? fmax(worst, -residual) : worst; /* nobody can help the others */
    }
    s->listed = 0;
    for (size_t r = 0; r < problem->row_count; r++) {
        double scale = problem->rows[r].scale;
        if (scale > 0.0 && (s->scaled[r] > 0.0 || s->gradient[r] <= worst))
            s->list[s->listed++] = (uint32_t)r;
        s->gradient[r] *= scale;
    }
    return worst;
}

static bool row_done(const state *s, size_t r)
{
    const rdli_row *row = &s->problem->rows[r];
    double g = s->gradient[r], tolerance = row->scale * row->tolerance;
    if (g < -tolerance)
        return false;
    return s->problem->feasible_only || s->scaled[r] == 0.0 || g <= tolerance || s->scaled[r] <= s->step_bar * tolerance;
}

static bool all_done(const state *s)
{
    for (size_t i = 0; i < s->listed; i++)
        if (!row_done(s, s->list[i]))
            return false;
    return true;
}

static size_t count_open(const state *s)
{
    size_t open = 0;
    for (size_t i = 0; i < s->listed; i++)
        open += !row_done(s, s->list[i]);
    return open;
}

static void free_gradient(const state *s, double *out)
{
    for (size_t i = 0; i < s->listed; i++)
        out[s->list[i]] = s->scaled[s->list[i]] > 0.0 ? s->gradient[s->list[i]] : 0.0;
}

/* Square of the chopped gradient against the reduced free one: proportional iterates go on with conjugate gradients. */
static bool is_proportional(const state *s)
{
    double chopped = 0.0, reduced = 0.0;
    for (size_t i = 0; i < s->listed; i++) {
        double g = s->gradient[s->list[i]], load = s->scaled[s->list[i]];
        if (load > 0.0)
            reduced += g * fmin(load / s->step_bar, g);
        else if (g < 0.0)
            chopped += g * g;
    }
    return chopped <= reduced;
}

static double dot(const state *s, const double *a, const double *b)
{
    double sum = 0.0;
    for (size_t i = 0; i < s->listed; i++)
        sum += a[s->list[i]] * b[s->list[i]];
    return sum;
}

/* Largest step along -direction that keeps all multipliers >= 0. */
static double step_to_bound(const state *s)
{
    double step = DBL_MAX;
    for (size_t i = 0; i < s->listed; i++)
        if (s->direction[s->list[i]] > 0.0)
            step = fmin(step, s->scaled[s->list[i]] / s->direction[s->list[i]]);
    return step;
}

static void walk(state *s, double step)
{
    for (size_t i = 0; i < s->listed; i++) {
        size_t r = s->list[i];
        double moved = s->scaled[r] - step * s->direction[r];
        s->scaled[r] = moved > 0.0 ? moved : 0.0;
        s->gradient[r] -= step * s->image[r];
    }
}

/* Rows that no multiplier holds any more must not stay a rounding above zero. */
static void expand(state *s, double step)
{
    walk(s, step);
    for (size_t i = 0; i < s->listed; i++) {
        size_t r = s->list[i];
        if (s->scaled[r] > 0.0) {
            double moved = s->scaled[r] - s->step_bar * s->gradient[r];
            s->scaled[r] = moved > 0.0 ? moved : 0.0;
        }
    }
    solution_of(s);
    listed_gradient(s);
    free_gradient(s, s->direction);
}

/* One step; false when the direction has no curvature although the gradient wants to go on: the dual is unbounded. */
static bool advance(state *s)
{
    bool proportional = is_proportional(s);
    for (size_t i = 0; !proportional && i < s->listed; i++) {
        size_t r = s->list[i];
        s->direction[r] = s->scaled[r] == 0.0 && s->gradient[r] < 0.0 ? s->gradient[r] : 0.0;
    }
    apply(s, s->direction, s->image);
    double slope = dot(s, s->gradient, s->direction);
    double curvature = dot(s, s->direction, s->image);
    double size = dot(s, s->direction, s->direction);
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
        for (size_t i = 0; i < s->listed; i++) {
            size_t r = s->list[i];
            beta += s->scaled[r] > 0.0 ? s->gradient[r] * s->image[r] : 0.0;
        }
        beta /= curvature;
        for (size_t i = 0; i < s->listed; i++) {
            size_t r = s->list[i];
            s->direction[r] = (s->scaled[r] > 0.0 ? s->gradient[r] : 0.0) - beta * s->direction[r];
        }
    } else {
        expand(s, to_bound);
    }
    return true;
}

/* One sweep forwards and one backwards from a point ahead of the last iterate, in the direction of the last step (Nesterov
 * 1983), and back to plain sweeps where that direction no longer points down (O'Donoghue & Candes 2015, eq. 12). The point
 * ahead may have negative multipliers; the sweeps visit every listed row and leave none. `direction` and `scratch` hold the
 * iterate before the last one. */
static void relax_ahead(state *s, double *momentum)
{
    rdli_problem *problem = s->problem;
    double next = 0.5 * (1.0 + sqrt(1.0 + 4.0 * *momentum * *momentum)), ahead = (*momentum - 1.0) / next;
    for (size_t i = 0; i < s->listed; i++) {
        size_t r = s->list[i];
        double last = s->scaled[r];
        s->scaled[r] = s->image[r] = last + ahead * (last - s->direction[r]);
        s->direction[r] = last;
    }
    for (size_t i = 0; i < problem->vertex_count; i++)
        for (int k = 0; k < 3; k++) {
            double last = problem->solution[i][k];
            problem->solution[i][k] = last + ahead * (last - problem->scratch[i][k]);
            problem->scratch[i][k] = last;
        }
    relax(s, false, over_ahead);
    relax(s, true, over_ahead);
    double uphill = 0.0;
    for (size_t i = 0; i < s->listed; i++) {
        size_t r = s->list[i];
        uphill += (s->image[r] - s->scaled[r]) * (s->scaled[r] - s->direction[r]);
    }
    *momentum = uphill > 0.0 ? 1.0 : fmin(next, momentum_most);
}

/* Sweeps over the list until it is done, or `most` of them; counts them as shares of sweeps over all rows. Going ahead moves
 * all vertices: not for short lists. */
static void relax_list(state *s, double *work, uint32_t most, bool plain)
{
    rdli_problem *problem = s->problem;
    double momentum = 1.0;
    for (size_t i = 0; i < s->listed; i++)
        s->direction[s->list[i]] = s->scaled[s->list[i]];
    memcpy(problem->scratch, problem->solution, plain ? 0 : problem->vertex_count * sizeof problem->scratch[0]);
    for (uint32_t sweep = 0; sweep < most; sweep += CHECK) {
        for (int k = 0; k < CHECK; k += 2)
            if (plain) {
                relax(s, false, over_relaxation);
                relax(s, true, over_relaxation);
            } else {
                relax_ahead(s, &momentum);
            }
        *work += (double)CHECK * ((double)s->listed / (double)problem->row_count);
        listed_gradient(s);
        if (all_done(s))
            return;
    }
}

/* Sorts the rows by their vertices (counting sort); false where the work space is too small for that: rows much fewer than
 * vertices. */
static bool index_rows(state *s)
{
    const rdli_problem *problem = s->problem;
    size_t n = problem->vertex_count;
    if (n + 1 > 2 * problem->row_count)
        return false;
    memset(s->start, 0, (n + 1) * sizeof *s->start);
    for (size_t r = 0; r < problem->row_count; r++)
        for (uint32_t k = 0; k < problem->rows[r].used; k++)
            s->start[problem->rows[r].vertex[k]]++;
    for (size_t v = 1; v <= n; v++)
        s->start[v] += s->start[v - 1];
    for (size_t r = problem->row_count; r-- > 0;)
        for (uint32_t k = 0; k < problem->rows[r].used; k++)
            s->row_of[--s->start[problem->rows[r].vertex[k]]] = (uint32_t)r;
    return true;
}

/* Replaces the list by the rows at the vertices of its open, or of all its rows. scratch marks the vertices. */
static void list_around(state *s, bool open_only)
{
    rdli_problem *problem = s->problem;
    size_t count = 0;
    double now = (double)++s->round;
    for (size_t i = 0; i < s->listed; i++) {
        const rdli_row *row = &problem->rows[s->list[i]];
        if (open_only && row_done(s, s->list[i]))
            continue;
        for (uint32_t k = 0; k < row->used; k++) {
            uint32_t v = row->vertex[k];
            if (problem->scratch[v][0] == now)
                continue;
            problem->scratch[v][0] = now;
            for (uint32_t e = s->start[v]; e < s->start[v + 1]; e++) {
                uint32_t r = s->row_of[e];
                if (s->mark[r] == s->round || problem->rows[r].scale == 0.0)
                    continue;
                s->mark[r] = s->round;
                s->other[count++] = r;
            }
        }
    }
    uint32_t *swap = s->list;
    s->list = s->other;
    s->other = swap;
    s->listed = count;
}

/* Relaxes what is not done and its neighbourhood, and looks again only at the rows around, until nothing there is open. Most
 * of a zone is done after a few sweeps, and waits for single vertices that are wedged between rows of nearly opposite
 * directions. */
static void relax_around(state *s, double *work, double most)
{
    rdli_problem *problem = s->problem;
    memset(s->mark, 0, problem->row_count * sizeof *s->mark);
    for (size_t v = 0; v < problem->vertex_count; v++)
        problem->scratch[v][0] = 0.0;
    s->round = 0;
    for (int round = 0; round < LOCAL_ROUNDS && *work < most; round++) {
        list_around(s, true);
        if (s->listed == 0)
            return;
        relax_list(s, work, LOCAL, true);
        list_around(s, false);
        listed_gradient(s);
        *work += (double)s->listed / (double)problem->row_count;
    }
}

/* Relaxes, locally where that serves, until a look at all rows finds nothing open. */
static bool relax_locally(state *s, double *work, double most)
{
    bool indexed = index_rows(s);
    for (double looks = 0.0; *work < most && looks < most / CHECK; looks += 1.0) {
        if (indexed && count_open(s) < s->listed / FEW_OPEN)
            relax_around(s, work, most);
        else
            relax_list(s, work, LOCAL, s->listed < s->problem->vertex_count);
        *work += 1.0;
        refresh(s);
        if (all_done(s))
            return true;
    }
    return false;
}

/* Conjugate gradients on the faces. */
static bool descend(state *s, rdli_solved *solved, double *work, uint32_t steps)
{
    double norm = norm_estimate(s);
    s->step_bar = norm > 0.0 ? 1.0 / norm : 1.0;
    free_gradient(s, s->direction);
    for (uint32_t since = 0, step = 0; step < steps; since++, step++) {
        if (since >= REFRESH || all_done(s)) {
            /* The recursive gradient drifts, and knows only the listed rows: trust a fresh one. */
            refresh(s);
            if (all_done(s))
                return true;
            free_gradient(s, s->direction);
            since = 0;
        }
        *work += (double)s->listed / (double)s->problem->row_count;
        if (!advance(s)) {
            solved->infeasible = true;
            break;
        }
    }
    refresh(s);
    return false;
}

/* Row multipliers below this many tolerances may be let go: 1 / |A| is not known until the conjugate gradients need it, and
 * with rows of unit diagonal a multiplier moves no other row by more than itself. */
static const double negligible = 0x1p-4;

/* What is left of the worst violation when relaxing is given up: below, the next pass does better than a dense solve. */
static const double hopeless = 0.125;

rdli_solved rdli_solve(rdli_problem *problem)
{
    size_t n = problem->row_count;
    uint32_t *numbers = (uint32_t *)(problem->work + 4 * n);
    state s = { .problem = problem, .gradient = problem->work, .direction = problem->work + n,
        .image = problem->work + 2 * n, .scaled = problem->work + 3 * n, .list = numbers, .other = numbers + n,
        .mark = numbers + 2 * n, .row_of = numbers + 3 * n, .start = numbers + 7 * n, .step_bar = negligible };
    static_assert(RDLI_SOLVE_WORK * sizeof(double) >= 4 * sizeof(double) + 9 * sizeof(uint32_t), "room for the lists");
    rdli_solved solved = { 0, false, false, 0.0, 0.0 };
    scale_rows(problem);
    memset(s.scaled, 0, n * sizeof(double));
    solved.worst_before = refresh(&s);
    s.listed = 0;
    for (size_t r = 0; r < n; r++) {
        s.scaled[r] = problem->rows[r].scale > 0.0 ? problem->load[r] / problem->rows[r].scale : 0.0;
        if (s.scaled[r] > 0.0)
            s.list[s.listed++] = (uint32_t)r;
    }
    refresh(&s);
    solved.converged = all_done(&s);
    double most = problem->sweeps_max, work = 0.0;
    if (!solved.converged) {
        relax_list(&s, &work, RELAXATIONS, s.listed < problem->vertex_count);
        refresh(&s);
        solved.converged = all_done(&s);
    }
    if (!solved.converged && !problem->feasible_only && count_open(&s) >= s.listed / FEW_OPEN)
        solved.converged = descend(&s, &solved, &work, CONJUGATE);
    if (!solved.converged && !solved.infeasible)
        solved.converged = relax_locally(&s, &work, most);
    bool lost = !solved.converged && refresh(&s) > hopeless * solved.worst_before;
    if (lost && problem->dense_work != NULL && rdli_solve_dense(problem, problem->dense_work)) {
        /* The interior point leaves a trace of load on every row. Without it the answer is a little off its tolerances, on
         * rows that are now known: conjugate gradients mend that at once. */
        s.listed = 0;
        for (size_t r = 0; r < n; r++) {
            s.scaled[r] = problem->load[r] / problem->rows[r].scale;
            if (s.scaled[r] > 0.0)
                s.list[s.listed++] = (uint32_t)r;
        }
        refresh(&s);
        descend(&s, &solved, &work, CONJUGATE);
        solved.converged = true;
        solved.infeasible = false;
    }
    for (size_t r = 0; r < n; r++)
        problem->load[r] = s.scaled[r] * problem->rows[r].scale;
    solved.sweeps = (uint32_t)work;
    solved.worst_after = refresh(&s);
    return solved;
}
