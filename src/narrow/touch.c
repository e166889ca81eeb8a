/* narrow/touch.c: one pair's question from the cheap certificates to exact arithmetic. */
#include "narrow/exact_pair.h"
#include "narrow/roots.h"
#include "narrow/series.h"

static bool exact_touch(mp_limb_t *limbs, size_t room, int kind, const rdl_motion *motion, double gap, rdl_touch *touch)
{
    rdli_arena arena = {limbs, 0, room, false};
    if (gap > 0)
        rdli_exact_gap(&arena, kind, motion, gap, touch);
    else
        rdli_exact_zero(&arena, kind, motion, touch);
    return !arena.overflow;
}

/* Its own frame, so that only numbers of very different size need a large stack. */
static __attribute__((noinline)) void wide_touch(int kind, const rdl_motion *motion, double gap, rdl_touch *touch)
{
    mp_limb_t limbs[RDLI_LARGE_ROOM];
    bool enough = exact_touch(limbs, RDLI_LARGE_ROOM, kind, motion, gap, touch);
    assert(enough);
    if (!enough)
        *touch = (rdl_touch){.time_hi = 1, .touches = 1, .stage = RDL_STAGE_EXACT};
}

static __attribute__((noinline)) void certain_touch(int kind, const rdl_motion *motion, double gap, rdl_touch *touch)
{
    mp_limb_t limbs[RDLI_SMALL_ROOM];
    if (!exact_touch(limbs, RDLI_SMALL_ROOM, kind, motion, gap, touch))
        wide_touch(kind, motion, gap, touch);
}

void rdli_find_touch(int kind, const rdl_motion *motion, double gap, rdl_touch *touch)
{
    rdl_motion scaled;
    int shift = rdli_scale_points((const double *)motion, 24, (double *)&scaled);
    double scaled_gap = shift ? ldexp(gap, shift) : gap;
    uint8_t stage;
    if (rdli_filter_quiet(kind, &scaled, scaled_gap, &stage)) {
        *touch = (rdl_touch){.time_lo = 1, .time_hi = 1, .stage = stage};
        return;
    }
    if (gap > 0 && isnormal(scaled_gap) && rdli_series_touch(kind, &scaled, scaled_gap, touch))
        return;
    if (gap == 0 && rdli_roots_touch(kind, &scaled, touch))
        return;
    certain_touch(kind, motion, gap, touch);
}
