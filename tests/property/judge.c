/* property/judge.c: see judge.h. */
#include "judge.h"

#include <stdio.h>
#include <stdlib.h>

void judge_init(judge *j, int kind)
{
    *j = (judge){.kind = kind};
    oracle_touch_init(&j->exact);
    mpq_init(j->gap2);
}

void judge_clear(judge *j)
{
    oracle_touch_clear(&j->exact);
    mpq_clear(j->gap2);
}

static bool well_formed(const rdl_touch *touch)
{
    for (int i = 0; i < 4; i++)
        if (touch->reserved[i] != 0)
            return false;
    if (touch->touches > 1 || touch->stage >= RDL_STAGE_COUNT)
        return false;
    if (touch->touches == 0)
        return touch->time_lo == 1.0 && touch->time_hi == 1.0;
    return 0.0 <= touch->time_lo && touch->time_lo <= touch->time_hi && touch->time_hi <= 1.0;
}

/* Simple at gap 0: a simple root of the coplanarity polynomial, both features met. */
static bool simple_first_root(int kind, const rdl_motion *motion)
{
    oracle_crossings crossings;
    oracle_count_crossings(kind, motion, &crossings);
    return crossings.first_is_simple;
}

/* The bracket of a true touch. The exact first time is in j->exact. */
static const char *time_fault(judge *j, const rdl_motion *motion, double gap, const rdl_touch *touch)
{
    if (oracle_compare_time(&j->exact, 0.0) == 0)
        return touch->time_lo == 0.0 && touch->time_hi == 0.0 ? NULL : "touches at the start, times are not 0, 0";
    if (oracle_compare_time(&j->exact, touch->time_lo) < 0)
        return "time_lo is late";
    if (oracle_compare_time(&j->exact, touch->time_hi) > 0)
        return "time_hi is early";
    if (gap == 0.0 && touch->time_hi - touch->time_lo > 1e-6 && simple_first_root(j->kind, motion))
        return "bracket of a simple root is wider than 1e-6";
    return NULL;
}

static const char *find_fault(judge *j, const rdl_motion *motion, double gap, const rdl_touch *touch)
{
    if (!well_formed(touch))
        return "ill-formed answer";
    oracle_square_gap(j->gap2, gap, 0);
    oracle_find(j->kind, motion, j->gap2, &j->exact);
    if (j->exact.touches) {
        j->touching++;
        return touch->touches ? time_fault(j, motion, gap, touch) : "missed";
    }
    if (!touch->touches)
        return NULL;
    if (gap == 0.0)
        return "invented";
    oracle_square_gap(j->gap2, gap, 1);
    oracle_find(j->kind, motion, j->gap2, &j->exact);
    return j->exact.touches ? NULL : "alarm above gap (1 + 1e-6)";
}

void judge_answer(judge *j, const rdl_motion *motion, double gap, const rdl_touch *touch)
{
    const char *fault = find_fault(j, motion, gap, touch);
    j->asked++;
    if (fault == NULL)
        return;
    if (j->faults++ == 0) {
        j->what = fault;
        j->motion = *motion;
        j->gap = gap;
        j->touch = *touch;
    }
}

const char *judge_story(const judge *j, const char *family)
{
    static char text[2048];
    if (j->faults == 0)
        return family;
    size_t room = sizeof text;
    int used = snprintf(text, room, "%s, %s: %zu of %zu wrong (%zu touch). First: %s. gap %a touches %u lo %a hi %a "
                        "stage %u order %u depth %u; start", j->kind == RDL_POINT_TRIANGLE ? "PT" : "EE", family, j->faults,
                        j->asked, j->touching, j->what, j->gap, j->touch.touches, j->touch.time_lo, j->touch.time_hi,
                        j->touch.stage, j->touch.order, j->touch.depth);
    for (int i = 0; i < 8 && used > 0 && (size_t)used < room; i++) {
        const double *x = i < 4 ? j->motion.start[i] : j->motion.end[i - 4];
        used += snprintf(text + used, room - (size_t)used, "%s {%a, %a, %a}", i == 4 ? "; end" : "", x[0], x[1], x[2]);
    }
    return text;
}

size_t judge_rounds(void)
{
    const char *text = getenv("RADDLE_ROUNDS");
    long rounds = text == NULL ? 1 : strtol(text, NULL, 10);
    return rounds > 1 ? (size_t)rounds : 1;
}
