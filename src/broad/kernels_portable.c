/* broad/kernels_portable.c: the inner loops in plain C, and the choice between them and AVX2. */
#include "broad/lanes_portable.h"

#include "broad/kernels_body.h"

const rdli_kernels *rdli_kernels_choose(bool vector)
{
#ifdef RDLI_HAVE_AVX2
    if (vector && __builtin_cpu_supports("avx2") && __builtin_cpu_supports("bmi") && __builtin_cpu_supports("popcnt"))
        return &rdli_kernels_avx2;
#else
    (void)vector;
#endif
    return &rdli_kernels_portable;
}
