/* narrow/lanes.c: the portable lanes, and the choice of the path. */
#define LANE_WIDTH 2
#include "narrow/lane_kernel.h"
#include "narrow/nearest_kernel.h"
#include "narrow/screen_kernel.h"
#include "narrow/meet_kernel.h"
#include "narrow/approach_kernel.h"

const rdli_path rdli_path_portable = {screen, meet, approach, look_again, outlook};

const rdli_path *rdli_path_choose(void)
{
    const rdli_path *wide = rdli_path_avx2();
    return wide ? wide : &rdli_path_portable;
}
