/* Hand-made check values through the public query. */
#include <check.h>
#include <stdlib.h>

#include "oracle.h"
#include "published.h"

static void expect(const published_case *c, const rdl_touch *touch)
{
    ck_assert_msg(touch->touches == c->touches, "%s: touches %d", c->name, touch->touches);
    ck_assert_msg(touch->time_lo <= c->time && c->time <= touch->time_hi, "%s: %.17g is not in [%.17g, %.17g]", c->name,
                  c->time, touch->time_lo, touch->time_hi);
    if (!c->touches || c->time == 0.0)
        ck_assert_msg(touch->time_lo == c->time && touch->time_hi == c->time, "%s: not [%g, %g]", c->name, c->time, c->time);
}

START_TEST(library_knows_it)
{
    const published_case *c = &published_cases[_i];
    rdl_touch touch;
    ck_assert_int_eq(rdl_find_touches(c->kind, 1, &c->motion, &c->gap, &touch, NULL), RDL_OK);
    expect(c, &touch);
}
END_TEST

START_TEST(oracle_knows_it)
{
    const published_case *c = &published_cases[_i];
    oracle_touch touch;
    mpq_t gap2;
    mpq_init(gap2);
    oracle_touch_init(&touch);
    oracle_square_gap(gap2, c->gap, 0);
    oracle_find(c->kind, &c->motion, gap2, &touch);
    ck_assert_int_eq(touch.touches, c->touches);
    if (c->touches)
        ck_assert_int_eq(oracle_compare_time(&touch, c->time), 0);
    oracle_touch_clear(&touch);
    mpq_clear(gap2);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("published");
    TCase *all = tcase_create("published");
    tcase_add_loop_test(all, library_knows_it, 0, published_count);
    tcase_add_loop_test(all, oracle_knows_it, 0, published_count);
    suite_add_tcase(suite, all);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_NORMAL);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
