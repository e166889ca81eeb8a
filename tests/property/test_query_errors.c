/* Bad input to rdl_find_touches: the status, the offender, and outputs left alone. */
#include <check.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "families.h"
#include "raddle/query.h"

enum { COUNT = 7 };

static rdl_motion motions[COUNT];
static double gaps[COUNT];
static rdl_touch touches[COUNT], before[COUNT];
static rdl_fault fault, fresh;

static void good_input(void)
{
    random_source source = random_from(5);
    for (int i = 0; i < COUNT; i++) {
        motion_families[0].make(&source, RDL_EDGE_EDGE, &motions[i]);
        gaps[i] = 0.01 * i;
    }
    memset(touches, 0x5a, sizeof touches);
    memcpy(before, touches, sizeof touches);
    memset(&fresh, 0x5a, sizeof fresh);
    fault = fresh;
}

/* Both kinds, with and without a place for the fault. */
static void expect(rdl_status status, const char *field, uint64_t index)
{
    for (int kind = RDL_POINT_TRIANGLE; kind <= RDL_EDGE_EDGE; kind++) {
        fault = fresh;
        ck_assert_int_eq(rdl_find_touches(kind, COUNT, motions, gaps, touches, &fault), status);
        ck_assert_str_eq(fault.field, field);
        ck_assert_uint_eq(fault.index, index);
        ck_assert_int_eq(rdl_find_touches(kind, COUNT, motions, gaps, touches, NULL), status);
        ck_assert_int_eq(memcmp(touches, before, sizeof touches), 0);
    }
}

START_TEST(good_input_is_answered_and_leaves_the_fault_alone)
{
    ck_assert_int_eq(rdl_find_touches(RDL_POINT_TRIANGLE, COUNT, motions, gaps, touches, &fault), RDL_OK);
    ck_assert_int_eq(memcmp(&fault, &fresh, sizeof fault), 0);
    for (int i = 0; i < COUNT; i++)
        ck_assert_int_le(touches[i].touches, 1);
}
END_TEST

START_TEST(no_pairs_are_fine)
{
    ck_assert_int_eq(rdl_find_touches(RDL_EDGE_EDGE, 0, NULL, NULL, NULL, &fault), RDL_OK);
    ck_assert_int_eq(memcmp(&fault, &fresh, sizeof fault), 0);
}
END_TEST

START_TEST(negative_zero_is_a_gap_of_zero)
{
    rdl_touch minus[COUNT], none[COUNT];
    for (int i = 0; i < COUNT; i++)
        gaps[i] = -0.0;
    ck_assert_int_eq(rdl_find_touches(RDL_EDGE_EDGE, COUNT, motions, gaps, minus, &fault), RDL_OK);
    ck_assert_int_eq(rdl_find_touches(RDL_EDGE_EDGE, COUNT, motions, NULL, none, &fault), RDL_OK);
    ck_assert_int_eq(memcmp(minus, none, sizeof minus), 0);
}
END_TEST

START_TEST(unknown_kind)
{
    static const int kinds[4] = {-1, 2, 255, INT32_MIN};
    for (int i = 0; i < 4; i++)
        ck_assert_int_eq(rdl_find_touches(kinds[i], COUNT, motions, gaps, touches, &fault), RDL_BAD_ARGUMENT);
    ck_assert_str_eq(fault.field, "kind");
    ck_assert_int_eq(memcmp(touches, before, sizeof touches), 0);
}
END_TEST

START_TEST(missing_arrays)
{
    ck_assert_int_eq(rdl_find_touches(RDL_EDGE_EDGE, COUNT, NULL, gaps, touches, &fault), RDL_BAD_ARGUMENT);
    ck_assert_str_eq(fault.field, "motions");
    ck_assert_int_eq(memcmp(touches, before, sizeof touches), 0);
    ck_assert_int_eq(rdl_find_touches(RDL_EDGE_EDGE, COUNT, motions, gaps, NULL, &fault), RDL_BAD_ARGUMENT);
    ck_assert_str_eq(fault.field, "touches");
}
END_TEST

/* Every one of the 24 numbers of a pair is looked at, for NaN and both infinities. */
START_TEST(start_not_finite)
{
    static const double bad[3] = {NAN, INFINITY, -INFINITY};
    for (int i = 0; i < 12; i++) {
        double *place = &motions[3].start[i / 3][i % 3], kept = *place;
        *place = bad[i % 3];
        expect(RDL_NOT_FINITE, "start", 3);
        *place = kept;
    }
}
END_TEST

START_TEST(end_not_finite)
{
    static const double bad[3] = {NAN, INFINITY, -INFINITY};
    for (int i = 0; i < 12; i++) {
        double *place = &motions[COUNT - 1].end[i / 3][i % 3], kept = *place;
        *place = bad[i % 3];
        expect(RDL_NOT_FINITE, "end", COUNT - 1);
        *place = kept;
    }
}
END_TEST

START_TEST(gap_not_finite)
{
    static const double bad[2] = {NAN, INFINITY};
    for (int i = 0; i < 2; i++) {
        gaps[4] = bad[i];
        expect(RDL_NOT_FINITE, "gaps", 4);
    }
}
END_TEST

START_TEST(gap_negative)
{
    gaps[0] = -0x1p-1074;
    expect(RDL_OUT_OF_RANGE, "gaps", 0);
    gaps[0] = 0.0;
    gaps[COUNT - 1] = -1.0;
    expect(RDL_OUT_OF_RANGE, "gaps", COUNT - 1);
}
END_TEST

START_TEST(the_first_offender_is_named)
{
    motions[5].start[0][0] = NAN;
    motions[2].end[3][2] = INFINITY;
    gaps[6] = -1.0;
    expect(RDL_NOT_FINITE, "end", 2);
    gaps[1] = -1.0;
    expect(RDL_OUT_OF_RANGE, "gaps", 1);
}
END_TEST

START_TEST(largest_finite_numbers_are_no_error)
{
    for (int i = 0; i < 12; i++) {
        motions[0].start[i / 3][i % 3] = i % 2 ? 0x1.fffffffffffffp1023 : -0x1.fffffffffffffp1023;
        motions[0].end[i / 3][i % 3] = i % 3 ? 0x1.fffffffffffffp1023 : -0x1.fffffffffffffp1023;
    }
    gaps[0] = 0.0;
    ck_assert_int_eq(rdl_find_touches(RDL_EDGE_EDGE, 1, motions, gaps, touches, &fault), RDL_OK);
    ck_assert_int_eq(rdl_find_touches(RDL_POINT_TRIANGLE, 1, motions, gaps, touches, &fault), RDL_OK);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("query errors");
    TCase *all = tcase_create("query errors");
    tcase_add_checked_fixture(all, good_input, NULL);
    tcase_add_test(all, good_input_is_answered_and_leaves_the_fault_alone);
    tcase_add_test(all, no_pairs_are_fine);
    tcase_add_test(all, negative_zero_is_a_gap_of_zero);
    tcase_add_test(all, unknown_kind);
    tcase_add_test(all, missing_arrays);
    tcase_add_test(all, start_not_finite);
    tcase_add_test(all, end_not_finite);
    tcase_add_test(all, gap_not_finite);
    tcase_add_test(all, gap_negative);
    tcase_add_test(all, the_first_offender_is_named);
    tcase_add_test(all, largest_finite_numbers_are_no_error);
    suite_add_tcase(suite, all);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_NORMAL);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
