/* base/rounding.h: the host's number format. */
#ifndef RDLI_ROUNDING_H
#define RDLI_ROUNDING_H

#include "base/internal.h"
#include "raddle/scene.h"

/* The nearest number of the format, as a double. */
static inline double rdli_round_to(int format, double x)
{
    return format == RDL_FLOAT32 ? (double)(float)x : x;
}

/* Half a unit in the last place, relative: |round(x) - x| <= rdli_half_unit * |x| for normal numbers. */
static inline double rdli_half_unit(int format)
{
    return format == RDL_FLOAT32 ? 0x1p-24 : 0x1p-53;
}

#endif
