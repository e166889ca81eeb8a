/* narrow/screen.c: the portable screen, its lanes, and the choice of the path. */
#define SCREEN_NAME rdli_screen_portable
#define SCREEN_WIDTH 2
#include "narrow/screen_kernel.h"

bool rdli_screen_has_avx2(void)
{
#if defined(__x86_64__)
    return __builtin_cpu_supports("avx2") != 0;
#else
    return false;
#endif
}

rdli_screen *rdli_screen_choose(void)
{
    return rdli_screen_has_avx2() ? rdli_screen_avx2 : rdli_screen_portable;
}

void rdli_lanes_load(rdli_lanes *lanes, int lane, const rdl_motion *scaled, double scaled_gap)
{
    const double *x = (const double *)scaled;
    for (int i = 0; i < 24; i++)
        lanes->x[i][lane] = x[i];
    lanes->gap[lane] = scaled_gap;
}

void rdli_lanes_repeat(rdli_lanes *lanes, int count)
{
    for (int lane = count; lane < RDLI_LANES; lane++) {
        for (int i = 0; i < 24; i++)
            lanes->x[i][lane] = lanes->x[i][0];
        lanes->gap[lane] = lanes->gap[0];
    }
}
