/* base/vector.h: three-component vectors of doubles. Fixed evaluation order: delivered bits depend on it. */
#ifndef RDLI_VECTOR_H
#define RDLI_VECTOR_H

#include "base/internal.h"

static inline double rdli_dot(const double a[3], const double b[3])
{
    return (a[0] * b[0] + a[1] * b[1]) + a[2] * b[2];
}

static inline void rdli_subtract(const double a[3], const double b[3], double out[3])
{
    for (int k = 0; k < 3; k++)
        out[k] = a[k] - b[k];
}

static inline void rdli_add_scaled(double out[3], double s, const double a[3])
{
    for (int k = 0; k < 3; k++)
        out[k] += s * a[k];
}

static inline void rdli_cross(const double a[3], const double b[3], double out[3])
{
    out[0] = a[1] * b[2] - a[2] * b[1];
    out[1] = a[2] * b[0] - a[0] * b[2];
    out[2] = a[0] * b[1] - a[1] * b[0];
}

static inline double rdli_length(const double a[3])
{
    return sqrt(rdli_dot(a, a));
}

static inline void rdli_copy(const double a[3], double out[3])
{
    memcpy(out, a, 3 * sizeof(double));
}

#endif
