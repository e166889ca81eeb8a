/* The judge of the query tests must object to every kind of wrong answer, and to no right one. */
#include <check.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "judge.h"
#include "published.h"

static const char *verdict(const published_case *c, double gap, rdl_touch touch)
{
    static const char *what;
    judge j;
    judge_init(&j, c->kind);
    judge_answer(&j, &c->motion, gap, &touch);
    what = j.faults == 0 ? "" : j.what;
    judge_clear(&j);
    return what;
}

static rdl_touch right_answer(const published_case *c)
{
    rdl_touch touch = {.time_lo = c->time, .time_hi = c->time, .touches = (uint8_t)c->touches, .stage = RDL_STAGE_EXACT};
    return touch;
}

START_TEST(right_answers_pass)
{
    ck_assert_str_eq(verdict(&published_cases[_i], published_cases[_i].gap, right_answer(&published_cases[_i])), "");
}
END_TEST

START_TEST(turned_answers_fail)
{
    const published_case *c = &published_cases[_i];
    rdl_touch touch = right_answer(c);
    touch.touches = !touch.touches;
    touch.time_lo = touch.touches ? 0.25 : 1.0;
    touch.time_hi = touch.touches ? 0.25 : 1.0;
    const char *what = verdict(c, c->gap, touch);
    ck_assert_str_eq(what, c->touches ? "missed" : c->gap > 0 ? "alarm above gap (1 + 1e-6)" : "invented");
}
END_TEST

START_TEST(wrong_times_fail)
{
    const published_case *c = &published_cases[_i];
    rdl_touch late = right_answer(c), early = right_answer(c);
    late.time_lo = late.time_hi = nextafter(c->time, 2.0);
    early.time_lo = early.time_hi = nextafter(c->time, -1.0);
    ck_assert_str_ne(verdict(c, c->gap, late), "");
    ck_assert_str_ne(verdict(c, c->gap, early), "");
}
END_TEST

START_TEST(wide_brackets_of_simple_roots_fail)
{
    rdl_touch wide = {.time_lo = 0.4, .time_hi = 0.6, .touches = 1, .stage = RDL_STAGE_EXACT};
    ck_assert_str_ne(verdict(&published_cases[0], 0.0, wide), "");
    for (int i = 0; i < published_count; i++) /* a double root may be wide */
        if (strcmp(published_cases[i].name, "graze, double root") == 0)
            ck_assert_str_eq(verdict(&published_cases[i], 0.0, wide), "");
}
END_TEST

START_TEST(ill_formed_answers_fail)
{
    rdl_touch touch = right_answer(&published_cases[0]);
    touch.reserved[2] = 1;
    ck_assert_str_ne(verdict(&published_cases[0], 0.0, touch), "");
    touch = right_answer(&published_cases[0]);
    touch.stage = RDL_STAGE_COUNT;
    ck_assert_str_ne(verdict(&published_cases[0], 0.0, touch), "");
}
END_TEST

START_TEST(alarms_inside_the_tolerance_pass)
{
    /* Head on at distance 1/2 at the end: gap 1/2 (1 - 0.9e-6) may alarm, gap 1/2 (1 - 1.1e-6) may not. */
    published_case c = published_cases[0];
    c.motion.end[0][2] = 0.5;
    rdl_touch touch = {.time_lo = 0.99, .time_hi = 1.0, .touches = 1, .stage = RDL_STAGE_SERIES};
    ck_assert_str_eq(verdict(&c, 0.5 * (1.0 - 0.9e-6), touch), "");
    ck_assert_str_eq(verdict(&c, 0.5 * (1.0 - 1.1e-6), touch), "alarm above gap (1 + 1e-6)");
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("judge");
    TCase *all = tcase_create("judge");
    tcase_add_loop_test(all, right_answers_pass, 0, published_count);
    tcase_add_loop_test(all, turned_answers_fail, 0, published_count);
    tcase_add_loop_test(all, wrong_times_fail, 0, published_count);
    tcase_add_test(all, wide_brackets_of_simple_roots_fail);
    tcase_add_test(all, ill_formed_answers_fail);
    tcase_add_test(all, alarms_inside_the_tolerance_pass);
    suite_add_tcase(suite, all);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_NORMAL);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
