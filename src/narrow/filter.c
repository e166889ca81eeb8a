/* narrow/filter.c: double-precision certificates. All bounds count one unit of 2^-52 per operation, twice the rounding to
 * nearest, so they hold in every rounding mode. */
#include "narrow/filter.h"

static const double unit = 0x1p-52;

int rdli_scale_points(const double *x, size_t count, double *scaled)
{
    double four[4] = {0, 0, 0, 0}; /* four chains instead of one long one; count is a multiple of 4 */
    for (size_t i = 0; i < count; i += 4)
        for (size_t j = 0; j < 4; j++)
            four[j] = fabs(x[i + j]) > four[j] ? fabs(x[i + j]) : four[j];
    double left = four[0] > four[1] ? four[0] : four[1], right = four[2] > four[3] ? four[2] : four[3];
    double largest = left > right ? left : right;
    if (largest == 0 || (largest > 0x1p-20 && largest < 0x1p20)) {
        memcpy(scaled, x, count * sizeof *x);
        return 0;
    }
    int exponent;
    frexp(largest, &exponent);
    int half = -exponent / 2; /* in two steps, because one factor may be out of range */
    double first = ldexp(1, half), second = ldexp(1, -exponent - half);
    for (size_t i = 0; i < count; i++)
        scaled[i] = x[i] * first * second;
    return -exponent;
}

double rdli_unscaled(double length, int shift, double towards)
{
    if (shift == 0)
        return length;
    double metres = ldexp(length, -shift);
    return ldexp(metres, shift) == length ? metres : nextafter(metres, towards);
}

static double dot_absolute(const double a[3], const double b[3])
{
    return fabs(a[0] * b[0]) + fabs(a[1] * b[1]) + fabs(a[2] * b[2]);
}

rdli_frame rdli_frame_of(int kind, const double x[4][3])
{
    rdli_frame f;
    bool edges = kind == RDL_EDGE_EDGE;
    rdli_subtract(x[edges ? 2 : 0], x[edges ? 0 : 1], f.w);
    rdli_subtract(x[edges ? 1 : 2], x[edges ? 0 : 1], f.u);
    rdli_subtract(x[3], x[edges ? 2 : 1], f.v);
    return f;
}

/* d . (a - b) less a bound of its rounding. Four roundings per term (difference, product, two sums), one for the
 * bound's own. */
static double along(const double d[3], const double a[3], const double b[3])
{
    double e[3];
    rdli_subtract(a, b, e);
    return rdli_dot(d, e) - (8 * unit * dot_absolute(d, e) + RDLI_UNDERFLOW);
}

double rdli_least_along(int kind, const double x[4][3], const double d[3])
{
    double least = INFINITY;
    int firsts = kind == RDL_EDGE_EDGE ? 2 : 1;
    for (int i = 0; i < firsts; i++)
        for (int j = firsts; j < 4; j++) {
            double value = along(d, x[i], x[j]);
            least = value < least ? value : least;
        }
    return least;
}

void rdli_frame_mix(const rdli_frame *a, const rdli_frame *b, double t, rdli_frame *mixed)
{
    double s = 1 - t;
    for (int k = 0; k < 3; k++) {
        mixed->w[k] = s * a->w[k] + t * b->w[k];
        mixed->u[k] = s * a->u[k] + t * b->u[k];
        mixed->v[k] = s * a->v[k] + t * b->v[k];
    }
}

double rdli_frame_size(const rdli_frame *frame)
{
    double largest = 0;
    for (int k = 0; k < 3; k++) {
        const double parts[3] = {fabs(frame->w[k]), fabs(frame->u[k]), fabs(frame->v[k])};
        for (int i = 0; i < 3; i++)
            largest = parts[i] > largest ? parts[i] : largest;
    }
    return largest;
}

double rdli_frame_least(int kind, const rdli_frame *frame, const double d[3])
{
    double w = rdli_dot(frame->w, d), u = rdli_dot(frame->u, d), v = rdli_dot(frame->v, d);
    if (kind == RDL_POINT_TRIANGLE) {
        double most = u > v ? u : v;
        return w - (most > 0 ? most : 0);
    }
    return (u < 0 ? u : 0) - w - (v > 0 ? v : 0);
}
