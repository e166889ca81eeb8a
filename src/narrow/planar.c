/* narrow/planar.c: point against segment in a motion that is known to be planar, in doubles with certified signs.
 *
 * All vectors lie in one plane at every time, so that w x u is parallel to the normal n = u x v of the pair. In a
 * projection in which n keeps its sign, the point is on the segment's line exactly at the roots of one quadratic. */
#include "narrow/roots.h"

static const double unit = 0x1p-52;
static const double half_width = 0x1p-26;

static double dot_mixed(const double a[2][3], const double b[2][3])
{
    return 0.5 * (rdli_dot(a[0], b[1]) + rdli_dot(a[1], b[0]));
}

static void restrict_to(const double q[3], double a, double b, double c[3])
{
    double a1 = 1 - a, b1 = 1 - b, left = a1 * q[0] + a * q[1], right = a1 * q[1] + a * q[2];
    c[0] = a1 * left + a * right;
    c[1] = b1 * left + b * right;
    c[2] = b1 * (b1 * q[0] + b * q[1]) + b * (b1 * q[1] + b * q[2]);
}

/* Certain common sign of the coefficients on [a, b], or 0. */
static int sign_on(const double q[3], double a, double b, double bound)
{
    double c[3];
    restrict_to(q, a, b, c);
    int sign = c[0] > bound ? 1 : c[0] < -bound ? -1 : 0;
    return sign * c[1] > bound && sign * c[2] > bound ? sign : 0;
}

/* Certainly no root in [a, b]; where the coefficients do not show it, those on both sides of the extreme value may. */
static bool keeps_sign(const double q[3], double a, double b, double bound)
{
    if (sign_on(q, a, b, bound))
        return true;
    double cut = (q[0] - q[1]) / (q[0] - 2 * q[1] + q[2]);
    return cut > a && cut < b && sign_on(q, a, cut, bound) && sign_on(q, cut, b, bound);
}

/* Roots of the quadratic in (0, 1), guessed, from the left. */
static int guess(const double q[3], double roots[2])
{
    double a = q[0] - 2 * q[1] + q[2], b = q[0] - q[1], square = b * b - a * q[0];
    if (!(square >= 0))
        return 0;
    double root = b + (b > 0 ? sqrt(square) : -sqrt(square)), x = q[0] / root, y = root / a;
    int count = 0;
    double first = x < y ? x : y, second = x < y ? y : x;
    if (first > 0 && first < 1)
        roots[count++] = first;
    if (second > 0 && second < 1)
        roots[count++] = second;
    if (count == 0 && x > 0 && x < 1) /* y is not a number where the quadratic is a line */
        roots[count++] = x;
    return count;
}

/* The couples of rdli_point_segments (exact_pair.h). */
static void couple_of(const rdli_cubic *s, int which, double w[2][3], double u[2][3])
{
    bool triangle = s->kind == RDL_POINT_TRIANGLE;
    for (int end = 0; end < 2; end++)
        for (int k = 0; k < 3; k++) {
            double pw = s->at[end].w[k], pu = s->at[end].u[k], pv = s->at[end].v[k];
            const double from[2][4] = {{pw, -pw, pw + pv, pu - pw}, {pw, pw, pw - pu, 0}};
            const double along[2][4] = {{pu, pv, pu, pv}, {pu, pv, pv - pu, 0}};
            w[end][k] = from[triangle][which];
            u[end][k] = along[triangle][which];
        }
}

enum rdli_inside rdli_planar_event(const rdli_cubic *s, int couple, double *lo, double *hi)
{
    double w[2][3], u[2][3];
    couple_of(s, couple, w, u);
    /* w and u are sums of at most three rounded vectors of this size: at most 3 size each:
     * twice 24 for their own errors, 162 for products, sums and restriction, more for three products */
    double bound = 512 * unit * s->size * s->size + RDLI_UNDERFLOW, roots[2], free = 0;
    int k = 0;
    for (int i = 1; i < 3; i++)
        k = fabs(s->n[i].c[1]) > fabs(s->n[k].c[1]) ? i : k;
    int i = (k + 1) % 3, j = (k + 2) % 3;
    double q[3] = {w[0][i] * u[0][j] - w[0][j] * u[0][i],
        0.5 * ((w[0][i] * u[1][j] - w[0][j] * u[1][i]) + (w[1][i] * u[0][j] - w[1][j] * u[0][i])),
        w[1][i] * u[1][j] - w[1][j] * u[1][i]};
    if (sign_on(q, 0, 1, bound))
        return RDLI_INSIDE_NO;
    double along[3] = {rdli_dot(w[0], u[0]), dot_mixed((const double (*)[3])w, (const double (*)[3])u), rdli_dot(w[1], u[1])};
    double beyond[3] = {rdli_dot(u[0], u[0]) - along[0], dot_mixed((const double (*)[3])u, (const double (*)[3])u) - along[1], rdli_dot(u[1], u[1]) - along[2]};
    if (sign_on(along, 0, 1, bound) < 0 || sign_on(beyond, 0, 1, 2 * bound) < 0)
        return RDLI_INSIDE_NO;
    int count = guess(q, roots);
    for (int m = 0; m < count; m++) {
        double c[3];
        *lo = roots[m] - half_width > free ? roots[m] - half_width : free;
        *hi = roots[m] + half_width < 1 ? roots[m] + half_width : 1;
        if (*lo > free && !keeps_sign(q, free, *lo, bound))
            break;
        int before = sign_on(along, *lo, *hi, bound), after = sign_on(beyond, *lo, *hi, 2 * bound);
        free = *hi;
        if (before < 0 || after < 0)
            continue;
        restrict_to(q, *lo, *hi, c);
        bool opposite = (c[0] > bound && c[2] < -bound) || (c[0] < -bound && c[2] > bound);
        bool faces = sign_on(s->n[k].c, *lo, *hi, s->n[k].bound) != 0;
        return before > 0 && after > 0 && opposite && faces ? RDLI_INSIDE_YES : RDLI_INSIDE_MAYBE;
    }
    *hi = -1;
    return free < 1 && !keeps_sign(q, free, 1, bound) ? RDLI_INSIDE_MAYBE : RDLI_INSIDE_NO;
}
