/* Past fault: at a gap > 0 the exact stage ran out of its room on ordinary coordinates and fell back to "touches
 * somewhere in [0, 1]", a false alarm at any distance. Both pairs below were answered so; they stay well outside. */
#include <check.h>
#include <stdlib.h>

#include "oracle.h"

typedef struct far_pair {
    int kind;
    double gap;
    rdl_motion motion;
} far_pair;

static const far_pair pairs[2] = {
    {RDL_POINT_TRIANGLE, 0.19814,
     {{{4, 4, 4}, {-1, 1, 0}, {1, -1, 2}, {0, 3, 1}}, {{-3, 0, 1}, {1, 0, 1}, {2, 1, 0}, {1, 1, 3}}}},
    {RDL_EDGE_EDGE, 1.5,
     {{{3, 2, -3}, {2, -1, 2}, {0, 4, 4}, {-2, 4, -1}}, {{4, 0, -4}, {0, 0, 4}, {-3, -3, 2}, {1, -1, -1}}}},
};

START_TEST(no_alarm_far_from_the_gap)
{
    const far_pair *p = &pairs[_i];
    rdl_touch touch;
    double lo, hi;
    oracle_least_distance(p->kind, &p->motion, &lo, &hi);
    ck_assert(lo > 1.001 * p->gap);
    ck_assert_int_eq(rdl_find_touches(p->kind, 1, &p->motion, &p->gap, &touch, NULL), RDL_OK);
    ck_assert_int_eq(touch.touches, 0);
    ck_assert(touch.time_lo == 1.0 && touch.time_hi == 1.0);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("gap room");
    TCase *all = tcase_create("gap room");
    tcase_add_loop_test(all, no_alarm_far_from_the_gap, 0, 2);
    suite_add_tcase(suite, all);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_NORMAL);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
