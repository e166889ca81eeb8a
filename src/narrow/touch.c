/* narrow/touch.c: one pair's question from the cheap certificates to exact arithmetic. */
#include "narrow/exact_pair.h"
#include "narrow/roots.h"
#include "narrow/series.h"
#include "narrow/stages.h"

typedef struct question {
    int kind;
    const rdl_motion *motion;
    double gap;
    double meeting;        /* gap > 0: the time by which the pair meets at gap 0; more than 1 when it does not */
    rdli_frame start, end; /* of ordinary size */
} question;

static bool exact_touch(mp_limb_t *limbs, size_t room, const question *q, rdl_touch *touch)
{
    rdli_arena arena = {limbs, 0, room, false};
    if (q->gap > 0) {
        rdli_exact_gap(&arena, q->kind, q->motion, q->gap, q->meeting, touch);
    } else {
        rdli_cubic doubles = rdli_cubic_of(q->kind, &q->start, &q->end);
        rdli_exact_zero(&arena, q->kind, q->motion, &doubles, touch);
    }
    return !arena.overflow;
}

/* Its own frame, so that only numbers of very different size need a large stack. */
static __attribute__((noinline)) void wide_touch(const question *q, rdl_touch *touch)
{
    mp_limb_t limbs[RDLI_LARGE_ROOM];
    bool enough = exact_touch(limbs, RDLI_LARGE_ROOM, q, touch);
    assert(enough);
    if (!enough)
        *touch = (rdl_touch){.time_hi = 1, .touches = 1, .stage = RDL_STAGE_EXACT};
}

static __attribute__((noinline)) void certain_touch(const question *q, rdl_touch *touch)
{
    mp_limb_t limbs[RDLI_SMALL_ROOM];
    if (!exact_touch(limbs, RDLI_SMALL_ROOM, q, touch))
        wide_touch(q, touch);
}

void rdli_sized_of(const rdl_motion *motion, rdli_sized *sized)
{
    sized->shift = rdli_scale_points((const double *)motion, 24, (double *)&sized->motion);
}

static double sized_gap(const rdli_sized *sized, double gap)
{
    return sized->shift ? ldexp(gap, sized->shift) : gap;
}

/* Gap 0 in doubles, and in words. What may be planar, or in contact at an end, is asked in words first: roots are of no use
 * there. */
static bool zero_touch(const question *q, int shift, rdl_touch *touch)
{
    rdli_cubic s = rdli_cubic_of(q->kind, &q->start, &q->end);
    bool words_first = fabs(s.f[0]) <= s.bound || fabs(s.f[3]) <= s.bound;
    if (words_first && rdli_words_touch(&s, q->motion, shift, touch))
        return true;
    return rdli_roots_touch(&s, touch);
}

void rdli_find_open_touch(int kind, const rdl_motion *motion, const rdli_sized *sized, double gap, rdl_touch *touch)
{
    double own_gap = sized_gap(sized, gap);
    question q = {kind, motion, gap, 2, rdli_frame_of(kind, sized->motion.start), rdli_frame_of(kind, sized->motion.end)};
    if (gap > 0 && isnormal(own_gap) && rdli_series_touch(kind, &q.start, &q.end, own_gap, touch))
        return;
    if (gap == 0 && zero_touch(&q, sized->shift, touch))
        return;
    if (gap > 0) {
        rdl_touch at_zero;
        rdli_find_open_touch(kind, motion, sized, 0, &at_zero);
        q.meeting = at_zero.touches ? at_zero.time_hi : 2;
    }
    certain_touch(&q, touch);
}
