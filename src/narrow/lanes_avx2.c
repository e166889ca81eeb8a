/* narrow/lanes_avx2.c: all four lanes in one vector, for x86-64 with AVX2. */
#include "narrow/lanes.h"

#if defined(__x86_64__)
#pragma GCC target("avx2")
#define LANE_WIDTH 4
#include "narrow/lane_kernel.h"
#include "narrow/nearest_kernel.h"
#include "narrow/screen_kernel.h"
#include "narrow/meet_kernel.h"
#include "narrow/approach_kernel.h"

static const rdli_path path = {screen, meet, approach, look_again, outlook};

const rdli_path *rdli_path_avx2(void)
{
    return __builtin_cpu_supports("avx2") ? &path : NULL;
}
#else
const rdli_path *rdli_path_avx2(void)
{
    return NULL;
}
#endif
