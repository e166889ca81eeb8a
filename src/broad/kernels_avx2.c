/* broad/kernels_avx2.c: the inner loops with AVX2, for x86-64 compilers that can be told so per file. */
#include "broad/kernels.h"

#ifdef RDLI_HAVE_AVX2
#pragma GCC push_options
#pragma GCC target("avx2,bmi,popcnt")
#include "broad/lanes_avx2.h"

#include "broad/kernels_body.h"
#pragma GCC pop_options
#endif
