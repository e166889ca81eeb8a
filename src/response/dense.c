/* response/dense.c: see dense.h. */
#include "response/dense.h"

#include "base/vector.h"

enum { STEPS_MAX = 48, ROW = 12 };

typedef struct interior {
    const rdli_problem *problem;
    size_t n, m;                     /* unknowns, rows */
    double *factor;                  /* n x n, lower triangle */
    double *y, *right, *move;        /* n */
    double *entry;                   /* m x ROW: the scaled row */
    double *bound, *slack, *load, *primal, *slack_move, *load_move, *image; /* m */
} interior;

size_t rdli_dense_work(size_t vertex_count, size_t row_count)
{
    size_t n = 3 * vertex_count;
    return n * n + 3 * n + (ROW + 7) * row_count;
}

static void lay_out(interior *in, const rdli_problem *problem, double *work)
{
    in->problem = problem;
    in->n = 3 * problem->vertex_count;
    in->m = problem->row_count;
    in->factor = work;
    in->y = in->factor + in->n * in->n;
    in->right = in->y + in->n;
    in->move = in->right + in->n;
    in->entry = in->move + in->n;
    in->bound = in->entry + ROW * in->m;
    in->slack = in->bound + in->m;
    in->load = in->slack + in->m;
    in->primal = in->load + in->m;
    in->slack_move = in->primal + in->m;
    in->load_move = in->slack_move + in->m;
    in->image = in->load_move + in->m;
}

static double row_dot(const interior *in, size_t r, const double *v)
{
    const double *entry = in->entry + ROW * r;
    const uint32_t *vertex = in->problem->rows[r].vertex;
    double sum = 0.0;
    for (int k = 0; k < 4; k++)
        sum += rdli_dot(entry + 3 * k, v + 3 * vertex[k]);
    return sum;
}

static void row_add(const interior *in, size_t r, double amount, double *v)
{
    const double *entry = in->entry + ROW * r;
    const uint32_t *vertex = in->problem->rows[r].vertex;
    for (int k = 0; k < 4; k++)
        rdli_add_scaled(v + 3 * vertex[k], amount, entry + 3 * k);
}

static void load_rows(interior *in)
{
    double worst = 0.0;
    for (size_t r = 0; r < in->m; r++) {
        const rdli_row *row = &in->problem->rows[r];
        double at_target = 0.0;
        for (int k = 0; k < 4; k++) {
            double root = sqrt(in->problem->inverse_mass[row->vertex[k]]);
            for (int c = 0; c < 3; c++)
                in->entry[ROW * r + 3 * (size_t)k + (size_t)c] = row->scale * row->weight[k] * row->normal[c] * root;
            at_target += row->weight[k] * rdli_dot(row->normal, in->problem->target[row->vertex[k]]);
        }
        in->bound[r] = row->scale * (row->bound - at_target);
        worst = fmax(worst, in->bound[r]);
    }
    memset(in->y, 0, in->n * sizeof(double));
    for (size_t r = 0; r < in->m; r++) {
        in->slack[r] = fmax(-in->bound[r], worst);
        in->load[r] = worst;
    }
}

/* factor = lower Cholesky factor of I + J' D J, D = load / slack. */
static bool factorise(interior *in)
{
    size_t n = in->n;
    double *a = in->factor;
    memset(a, 0, n * n * sizeof(double));
    for (size_t i = 0; i < n; i++)
        a[i * n + i] = 1.0;
    for (size_t r = 0; r < in->m; r++) {
        const uint32_t *vertex = in->problem->rows[r].vertex;
        const double *entry = in->entry + ROW * r;
        double weight = in->load[r] / in->slack[r];
        for (int p = 0; p < ROW; p++) {
            size_t i = 3 * (size_t)vertex[p / 3] + (size_t)(p % 3);
            double scaled = weight * entry[p];
            for (int q = 0; scaled != 0.0 && q < ROW; q++) {
                size_t j = 3 * (size_t)vertex[q / 3] + (size_t)(q % 3);
                if (j <= i)
                    a[i * n + j] += scaled * entry[q];
            }
        }
    }
    for (size_t i = 0; i < n; i++)
        for (size_t j = 0; j <= i; j++) {
            const double *row = a + i * n, *other = a + j * n;
            double part[4] = { 0.0, 0.0, 0.0, 0.0 };
            size_t k = 0;
            for (; k + 4 <= j; k += 4)
                for (int l = 0; l < 4; l++) /* four sums: independent, in a fixed order */
                    part[l] += row[k + (size_t)l] * other[k + (size_t)l];
            for (; k < j; k++)
                part[0] += row[k] * other[k];
            double sum = a[i * n + j] - ((part[0] + part[1]) + (part[2] + part[3]));
            if (i == j && !(sum > 0.0))
                return false;
            a[i * n + j] = i == j ? sqrt(sum) : sum / other[j];
        }
    return true;
}

/* move = (L L')^-1 right */
static void substitute(interior *in)
{
    size_t n = in->n;
    const double *a = in->factor;
    for (size_t i = 0; i < n; i++) {
        double sum = in->right[i];
        for (size_t j = 0; j < i; j++)
            sum -= a[i * n + j] * in->move[j];
        in->move[i] = sum / a[i * n + i];
    }
    for (size_t i = n; i-- > 0;) {
        in->move[i] /= a[i * n + i];
        for (size_t j = 0; j < i; j++)
            in->move[j] -= a[i * n + j] * in->move[i];
    }
}

/* Solves the Newton system for the complementarity target `centre`; image holds second-order terms to be taken off. */
static void newton(interior *in, double centre)
{
    for (size_t i = 0; i < in->n; i++)
        in->right[i] = -in->y[i];
    for (size_t r = 0; r < in->m; r++) {
        double wanted = (centre - in->image[r]) / in->slack[r] - in->load[r] / in->slack[r] * in->primal[r];
        row_add(in, r, wanted, in->right); /* -r_d + J' (centre / s - load - D r_p), with r_d = y - J' load */
    }
    substitute(in);
    for (size_t r = 0; r < in->m; r++) {
        in->slack_move[r] = row_dot(in, r, in->move) + in->primal[r];
        in->load_move[r] = (centre - in->image[r] - in->load[r] * in->slack_move[r]) / in->slack[r] - in->load[r];
    }
}

static double longest_step(const interior *in)
{
    double step = 1.0;
    for (size_t r = 0; r < in->m; r++) {
        if (in->slack_move[r] < 0.0)
            step = fmin(step, -in->slack[r] / in->slack_move[r]);
        if (in->load_move[r] < 0.0)
            step = fmin(step, -in->load[r] / in->load_move[r]);
    }
    return step;
}

static double complementarity(const interior *in, double step)
{
    double sum = 0.0;
    for (size_t r = 0; r < in->m; r++)
        sum += (in->slack[r] + step * in->slack_move[r]) * (in->load[r] + step * in->load_move[r]);
    return sum / (double)in->m;
}

static void take_step(interior *in, double step)
{
    for (size_t i = 0; i < in->n; i++)
        in->y[i] += step * in->move[i];
    for (size_t r = 0; r < in->m; r++) {
        in->slack[r] += step * in->slack_move[r];
        in->load[r] += step * in->load_move[r];
    }
}

/* Residuals of the rows; true when all are within tolerance and what slack and load still share is negligible. */
static bool arrived(interior *in)
{
    bool done = true;
    for (size_t r = 0; r < in->m; r++) {
        double value = row_dot(in, r, in->y) - in->bound[r];
        double tolerance = in->problem->rows[r].scale * in->problem->rows[r].tolerance;
        in->primal[r] = value - in->slack[r];
        done = done && value >= -tolerance && fmin(in->slack[r], in->load[r]) <= tolerance;
    }
    return done;
}

static void write_out(const interior *in)
{
    const rdli_problem *problem = in->problem;
    for (size_t r = 0; r < in->m; r++) {
        bool pushes = in->load[r] > in->slack[r];
        problem->load[r] = pushes ? problem->rows[r].scale * in->load[r] : 0.0;
    }
    for (size_t i = 0; i < problem->vertex_count; i++)
        for (size_t k = 0; k < 3; k++)
            problem->solution[i][k] = problem->target[i][k] + sqrt(problem->inverse_mass[i]) * in->y[3 * i + k];
}

bool rdli_solve_dense(rdli_problem *problem, double *work)
{
    interior in;
    lay_out(&in, problem, work);
    load_rows(&in);
    for (int step = 0; step < STEPS_MAX; step++) {
        if (arrived(&in)) {
            write_out(&in);
            return true;
        }
        if (!factorise(&in))
            return false;
        memset(in.slack_move, 0, in.m * sizeof(double));
        memset(in.load_move, 0, in.m * sizeof(double));
        double now = complementarity(&in, 0.0);
        memset(in.image, 0, in.m * sizeof(double));
        newton(&in, 0.0);
        double reached = complementarity(&in, longest_step(&in)), share = reached / now;
        for (size_t r = 0; r < in.m; r++)
            in.image[r] = in.slack_move[r] * in.load_move[r];
        newton(&in, share * share * share * now);
        take_step(&in, 0.995 * longest_step(&in));
    }
    return false;
}
