/* unit/narrow/test_known.c: motions with known first touching times, permuted, reversed, scaled, and with a gap. */
#include <check.h>
#include <math.h>
#include <stdbool.h>
#include <stdlib.h>
#include <string.h>

#include "cases.h"

static rdl_touch ask(int kind, const rdl_motion *motion, double gap)
{
    rdl_touch touch;
    memset(&touch, 0xa5, sizeof touch);
    ck_assert_int_eq(rdl_find_touches(kind, 1, motion, &gap, &touch, NULL), RDL_OK);
    for (int i = 0; i < 4; i++)
        ck_assert_uint_eq(touch.reserved[i], 0);
    return touch;
}

static void expect(const known_case *c, const rdl_motion *motion, double time)
{
    rdl_touch touch = ask(c->kind, motion, 0);
    ck_assert_msg(touch.touches == c->touches, "%s: touches %d", c->name, touch.touches);
    ck_assert_msg(touch.time_lo <= time && time <= touch.time_hi && touch.time_hi - touch.time_lo <= 1e-6,
                  "%s: [%.17g, %.17g] instead of %.17g", c->name, touch.time_lo, touch.time_hi, time);
    if (time == 0 || !c->touches)
        ck_assert_msg(touch.time_lo == time && touch.time_hi == time, "%s: times must be exact", c->name);
}

START_TEST(forwards_and_backwards)
{
    const known_case *c = &known_cases[_i];
    rdl_motion back = motion_reversed(&c->motion);
    expect(c, &c->motion, c->time);
    expect(c, &back, c->back);
}
END_TEST

START_TEST(in_every_vertex_order)
{
    const known_case *c = &known_cases[_i];
    int orders = c->kind == RDL_POINT_TRIANGLE ? 6 : 8;
    for (int i = 0; i < orders; i++) {
        rdl_motion other = motion_permuted(&c->motion, c->kind == RDL_POINT_TRIANGLE ? point_orders[i] : edge_orders[i]);
        expect(c, &other, c->time);
    }
}
END_TEST

static bool stays_normal(const rdl_motion *motion, int power)
{
    for (int i = 0; i < 24; i++) {
        double x = ((const double *)motion)[i];
        if (x != 0 && !(isnormal(x) && isnormal(ldexp(x, power))))
            return false;
    }
    return true;
}

START_TEST(at_every_scale)
{
    const known_case *c = &known_cases[_i];
    static const int powers[] = {-1000, -300, -70, -27, -3, 1, 10, 64, 333, 1000};
    rdl_touch here = ask(c->kind, &c->motion, 0), gapped = ask(c->kind, &c->motion, 0.125);
    for (size_t i = 0; i < sizeof powers / sizeof *powers; i++) {
        if (!stays_normal(&c->motion, powers[i]))
            continue;
        rdl_motion other = motion_scaled(&c->motion, powers[i]);
        rdl_touch there = ask(c->kind, &other, 0);
        ck_assert_msg(memcmp(&here, &there, sizeof here) == 0, "%s times 2^%d", c->name, powers[i]);
        there = ask(c->kind, &other, ldexp(0.125, powers[i]));
        ck_assert_msg(memcmp(&gapped, &there, sizeof gapped) == 0, "%s times 2^%d with a gap", c->name, powers[i]);
    }
}
END_TEST

/* The head-on cases close at speed 2: the gap is reached at 1/2 - gap / 2. */
START_TEST(with_a_gap)
{
    static const double gaps[] = {0x1p-1, 0x1p-4, 0x1p-10, 0x1p-20, 0x1p-40, 1e-12, 1e-300};
    for (int i = 0; i < known_case_count; i++) {
        const known_case *c = &known_cases[i];
        if (strncmp(c->name, "head-on", 7) != 0)
            continue;
        for (size_t j = 0; j < sizeof gaps / sizeof *gaps; j++) {
            rdl_touch touch = ask(c->kind, &c->motion, gaps[j]);
            double time = 0.5 - 0.5 * gaps[j];
            ck_assert_uint_eq(touch.touches, 1);
            ck_assert(touch.time_lo <= time && time <= touch.time_hi && touch.time_hi - touch.time_lo <= 1e-6);
        }
    }
}
END_TEST

/* A point that slides over a triangle, and one edge over another, turning, at distance exactly 1/8 throughout. */
static rdl_motion sliding(int kind)
{
    rdl_motion point = {{{0.25, 0.25, 0.125}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}},
                        {{0.375, 0.125, 0.125}, {0, 0, 0}, {0.875, 0.25, 0}, {-0.25, 0.875, 0}}};
    rdl_motion edges = {{{-1, 0, 0}, {1, 0, 0}, {0, -1, 0.125}, {0, 1, 0.125}},
                        {{-0.875, 0.25, 0}, {1, -0.25, 0}, {0.25, -1, 0.125}, {0.125, 1, 0.125}}};
    return kind == RDL_POINT_TRIANGLE ? point : edges;
}

START_TEST(sliding_layers)
{
    rdl_motion motion = sliding(_i);
    rdl_touch above = ask(_i, &motion, 0.125 / (1 + 2e-6)), at = ask(_i, &motion, 0.125);
    rdl_touch below = ask(_i, &motion, 0.125 / (1 - 1e-9)), just = ask(_i, &motion, 0.125 * (1 - 0x1p-53));
    ck_assert_uint_eq(above.touches, 0);
    ck_assert_uint_lt(above.depth, 4);
    ck_assert(at.touches == 1 && at.time_hi == 0);
    ck_assert(below.touches == 1 && below.time_hi == 0);
    ck_assert(just.touches <= 1); /* inside the tolerance: both answers are right */
}
END_TEST

START_TEST(bad_input)
{
    rdl_motion motions[2] = {known_cases[0].motion, known_cases[0].motion};
    double gaps[2] = {0, 1};
    rdl_touch touches[2], before[2];
    rdl_fault fault = {99, "untouched"};
    memset(touches, 0x5a, sizeof touches);
    memcpy(before, touches, sizeof before);
    ck_assert_int_eq(rdl_find_touches(RDL_EDGE_EDGE, 0, NULL, NULL, NULL, &fault), RDL_OK);
    ck_assert_uint_eq(fault.index, 99);
    ck_assert_int_eq(rdl_find_touches(2, 2, motions, gaps, touches, &fault), RDL_BAD_ARGUMENT);
    ck_assert_int_eq(rdl_find_touches(0, 2, NULL, gaps, touches, &fault), RDL_BAD_ARGUMENT);
    ck_assert_int_eq(rdl_find_touches(0, 2, motions, gaps, NULL, NULL), RDL_BAD_ARGUMENT);
    gaps[1] = -0x1p-1074;
    ck_assert_int_eq(rdl_find_touches(0, 2, motions, gaps, touches, &fault), RDL_OUT_OF_RANGE);
    ck_assert(fault.index == 1 && strcmp(fault.field, "gaps") == 0);
    gaps[1] = INFINITY;
    ck_assert_int_eq(rdl_find_touches(0, 2, motions, gaps, touches, &fault), RDL_NOT_FINITE);
    gaps[1] = 0;
    motions[1].end[3][2] = NAN;
    ck_assert_int_eq(rdl_find_touches(0, 2, motions, gaps, touches, &fault), RDL_NOT_FINITE);
    ck_assert(fault.index == 1 && strcmp(fault.field, "end") == 0);
    motions[0].start[0][0] = -INFINITY;
    ck_assert_int_eq(rdl_find_touches(0, 2, motions, gaps, touches, &fault), RDL_NOT_FINITE);
    ck_assert(fault.index == 0 && strcmp(fault.field, "start") == 0);
    ck_assert(memcmp(touches, before, sizeof before) == 0);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("narrow known");
    TCase *all = tcase_create("all");
    tcase_add_loop_test(all, forwards_and_backwards, 0, known_case_count);
    tcase_add_loop_test(all, in_every_vertex_order, 0, known_case_count);
    tcase_add_loop_test(all, at_every_scale, 0, known_case_count);
    tcase_add_test(all, with_a_gap);
    tcase_add_loop_test(all, sliding_layers, 0, 2);
    tcase_add_test(all, bad_input);
    suite_add_tcase(suite, all);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_NORMAL);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
