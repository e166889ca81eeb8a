/* The answer to a query must not depend on how the question is put: order of vertices, order of features, direction of
 * time, units. */
#include <check.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "families.h"
#include "oracle.h"

enum { MEMBERS = 400, GAP_MEMBERS = 40 };

static const int pt_orders[5][4] = {{0, 1, 3, 2}, {0, 2, 1, 3}, {0, 2, 3, 1}, {0, 3, 1, 2}, {0, 3, 2, 1}};
static const int ee_orders[7][4] = {{1, 0, 2, 3}, {0, 1, 3, 2}, {1, 0, 3, 2}, {2, 3, 0, 1}, {3, 2, 0, 1}, {2, 3, 1, 0},
                                    {3, 2, 1, 0}};

static rdl_touch ask(int kind, const rdl_motion *motion, double gap)
{
    rdl_touch touch;
    ck_assert_int_eq(rdl_find_touches(kind, 1, motion, &gap, &touch, NULL), RDL_OK);
    return touch;
}

/* Between gap and gap (1 + 1e-6) the library may say either. */
static bool free_to_differ(int kind, const rdl_motion *motion, double gap)
{
    if (gap == 0.0)
        return false;
    oracle_touch touch;
    mpq_t gap2;
    mpq_init(gap2);
    oracle_touch_init(&touch);
    oracle_square_gap(gap2, gap, 0);
    oracle_find(kind, motion, gap2, &touch);
    bool below = touch.touches;
    oracle_square_gap(gap2, gap, 1);
    oracle_find(kind, motion, gap2, &touch);
    bool band = !below && touch.touches;
    oracle_touch_clear(&touch);
    mpq_clear(gap2);
    return band;
}

static rdl_motion reorder(const rdl_motion *motion, const int order[4])
{
    rdl_motion other;
    for (int i = 0; i < 4; i++) {
        memcpy(other.start[i], motion->start[order[i]], sizeof other.start[i]);
        memcpy(other.end[i], motion->end[order[i]], sizeof other.end[i]);
    }
    return other;
}

static rdl_motion scaled(const rdl_motion *motion, int exponent)
{
    rdl_motion other;
    for (int i = 0; i < 4; i++)
        for (int k = 0; k < 3; k++) {
            other.start[i][k] = ldexp(motion->start[i][k], exponent);
            other.end[i][k] = ldexp(motion->end[i][k], exponent);
        }
    return other;
}

static bool normal_after(double x, int exponent)
{
    return x == 0.0 || (isnormal(x) && isnormal(ldexp(x, exponent)));
}

static bool stays_normal(const rdl_motion *motion, double gap, int exponent)
{
    bool normal = normal_after(gap, exponent);
    for (int i = 0; i < 4; i++)
        for (int k = 0; k < 3; k++)
            normal = normal && normal_after(motion->start[i][k], exponent) && normal_after(motion->end[i][k], exponent);
    return normal;
}

typedef void check_member(int kind, const rdl_motion *motion, double gap, const char *family);

static void same_yes_or_no(int kind, const rdl_motion *motion, const rdl_motion *other, double gap, const char *family)
{
    bool a = ask(kind, motion, gap).touches, b = ask(kind, other, gap).touches;
    ck_assert_msg(a == b || free_to_differ(kind, motion, gap), "%s, %s, gap %a: %d and %d", family,
                  kind == RDL_POINT_TRIANGLE ? "PT" : "EE", gap, a, b);
}

static void check_orders(int kind, const rdl_motion *motion, double gap, const char *family)
{
    int count = kind == RDL_POINT_TRIANGLE ? 5 : 7;
    for (int i = 0; i < count; i++) {
        rdl_motion other = reorder(motion, kind == RDL_POINT_TRIANGLE ? pt_orders[i] : ee_orders[i]);
        same_yes_or_no(kind, motion, &other, gap, family);
    }
}

static void check_time(int kind, const rdl_motion *motion, double gap, const char *family)
{
    rdl_motion other;
    memcpy(other.start, motion->end, sizeof other.start);
    memcpy(other.end, motion->start, sizeof other.end);
    same_yes_or_no(kind, motion, &other, gap, family);
}

static void check_units(int kind, const rdl_motion *motion, double gap, const char *family)
{
    static const int exponents[6] = {1, -1, 37, -37, 400, -400};
    rdl_touch touch = ask(kind, motion, gap);
    for (int i = 0; i < 6; i++) {
        if (!stays_normal(motion, gap, exponents[i]))
            continue;
        rdl_motion other = scaled(motion, exponents[i]);
        rdl_touch twin = ask(kind, &other, ldexp(gap, exponents[i]));
        ck_assert_msg(memcmp(&touch, &twin, sizeof touch) == 0,
                      "%s, %s, gap %a, times 2^%d: %d [%a, %a] stage %d became %d [%a, %a] stage %d", family,
                      kind == RDL_POINT_TRIANGLE ? "PT" : "EE", gap, exponents[i], touch.touches, touch.time_lo,
                      touch.time_hi, touch.stage, twin.touches, twin.time_lo, twin.time_hi, twin.stage);
    }
}

static void check_repeat(int kind, const rdl_motion *motion, double gap, const char *family)
{
    rdl_motion five[5];
    double gaps[5];
    rdl_touch touches[5], one = ask(kind, motion, gap);
    for (int i = 0; i < 5; i++) {
        five[i] = i % 2 == 0 ? *motion : scaled(motion, -1);
        gaps[i] = i % 2 == 0 ? gap : 0.5 * gap;
    }
    ck_assert_int_eq(rdl_find_touches(kind, 5, five, gaps, touches, NULL), RDL_OK);
    for (int i = 0; i < 5; i += 2)
        ck_assert_msg(memcmp(&touches[i], &one, sizeof one) == 0, "%s: place %d of 5 answers otherwise", family, i);
}

static void over_families(int kind, bool at_gap, check_member *check)
{
    for (int f = 0; f < motion_family_count; f++) {
        const motion_family *family = &motion_families[f];
        random_source source = random_from(77 + (uint64_t)f);
        int count = family->percent < 10 ? 4 : at_gap ? GAP_MEMBERS : MEMBERS;
        for (int n = 0; n < count; n++) {
            rdl_motion motion;
            family->make(&source, kind, &motion);
            double gap = at_gap ? motion_least_distance(kind, &motion) * random_between(&source, 0.5, 1.5) : 0.0;
            if (gap < 1e308)
                check(kind, &motion, gap, family->name);
        }
    }
}

#define SYMMETRY_TEST(name, check)             \
    START_TEST(name##_at_gap_zero)             \
    {                                          \
        over_families(_i, false, check);       \
    }                                          \
    END_TEST                                   \
    START_TEST(name##_at_a_gap)                \
    {                                          \
        over_families(_i, true, check);        \
    }                                          \
    END_TEST

SYMMETRY_TEST(order_of_vertices_and_features, check_orders)
SYMMETRY_TEST(direction_of_time, check_time)
SYMMETRY_TEST(units_in_powers_of_two, check_units)
SYMMETRY_TEST(place_in_the_batch, check_repeat)

int main(void)
{
    Suite *suite = suite_create("symmetry");
    TCase *all = tcase_create("symmetry");
    tcase_set_timeout(all, 600);
    tcase_add_loop_test(all, order_of_vertices_and_features_at_gap_zero, 0, 2);
    tcase_add_loop_test(all, order_of_vertices_and_features_at_a_gap, 0, 2);
    tcase_add_loop_test(all, direction_of_time_at_gap_zero, 0, 2);
    tcase_add_loop_test(all, direction_of_time_at_a_gap, 0, 2);
    tcase_add_loop_test(all, units_in_powers_of_two_at_gap_zero, 0, 2);
    tcase_add_loop_test(all, units_in_powers_of_two_at_a_gap, 0, 2);
    tcase_add_loop_test(all, place_in_the_batch_at_gap_zero, 0, 2);
    tcase_add_loop_test(all, place_in_the_batch_at_a_gap, 0, 2);
    suite_add_tcase(suite, all);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_NORMAL);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
