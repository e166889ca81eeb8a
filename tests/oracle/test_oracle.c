/* The oracle on the check values of published and hand-made cases, and against dense exact sampling at rest. */
#include "test_oracle.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "families.h"
#include "oracle.h"

enum { PT = RDL_POINT_TRIANGLE, EE = RDL_EDGE_EDGE };

static const rdl_motion head_on_pt = {{{0.25, 0.25, 1}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}},
                                      {{0.25, 0.25, -1}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}}};
static const rdl_motion edge_pt = {{{0.5, 0.5, 1}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}},
                                   {{0.5, 0.5, -1}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}}};
static const rdl_motion lands_pt = {{{0.25, 0.25, 1}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}},
                                    {{0.25, 0.25, 0}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}}};
static const rdl_motion graze_pt = {{{0, 0.25, 0.25}, {0, 0, 0}, {1, 0, 1}, {0, 1, 0}},
                                    {{0.5, 0.25, -0.25}, {0, 0, 0}, {1, 0, -1}, {0, 1, 0}}};
static const rdl_motion head_on_ee = {{{-1, 0, 0}, {1, 0, 0}, {0, -1, 1}, {0, 1, 1}},
                                      {{-1, 0, 0}, {1, 0, 0}, {0, -1, -1}, {0, 1, -1}}};
static const rdl_motion triple_ee = {{{0, 0, 0}, {0, -1, 1}, {-1, 0.5, 0.5}, {1, -1.5, -0.5}},
                                     {{0, 0, 0}, {0, 1, 1}, {1, 1.5, 0.5}, {-1, -0.5, 1.5}}};
static const rdl_motion coplanar_ee = {{{0, 0, 0}, {2, 0, 0}, {1, 1, 0}, {1, 3, 0}},
                                       {{0, 0, 0}, {2, 0, 0}, {1, -1, 0}, {1, 1, 0}}};

static bool find(int kind, const rdl_motion *motion, double gap, oracle_touch *touch)
{
    mpq_t gap2;
    mpq_init(gap2);
    oracle_square_gap(gap2, gap, 0);
    oracle_find(kind, motion, gap2, touch);
    mpq_clear(gap2);
    return touch->touches;
}

/* The pair touches at the gap first at exactly this time. */
static void expect_time(int kind, const rdl_motion *motion, double gap, double time)
{
    oracle_touch touch;
    oracle_touch_init(&touch);
    ck_assert(find(kind, motion, gap, &touch));
    ck_assert_int_eq(oracle_compare_time(&touch, time), 0);
    oracle_touch_clear(&touch);
}

static void expect_miss(int kind, const rdl_motion *motion, double gap)
{
    oracle_touch touch;
    oracle_touch_init(&touch);
    ck_assert(!find(kind, motion, gap, &touch));
    oracle_touch_clear(&touch);
}

START_TEST(published_zero_gap_times)
{
    expect_time(PT, &head_on_pt, 0.0, 0.5);
    expect_time(PT, &edge_pt, 0.0, 0.5);
    expect_time(PT, &lands_pt, 0.0, 1.0);
    expect_time(PT, &graze_pt, 0.0, 0.5);
    expect_time(EE, &head_on_ee, 0.0, 0.5);
    expect_time(EE, &triple_ee, 0.0, 0.5);
    expect_time(EE, &coplanar_ee, 0.0, 0.5);
    rdl_motion lower = graze_pt;
    lower.start[0][2] -= 1.0 / 64.0;
    lower.end[0][2] -= 1.0 / 64.0;
    expect_time(PT, &lower, 0.0, 0.375);
}
END_TEST

START_TEST(published_crossing_counts)
{
    oracle_crossings c;
    oracle_count_crossings(PT, &head_on_pt, &c);
    ck_assert(c.passes == 1 && c.grazes == 0 && c.on_border == 0 && c.signed_sum == -1 && c.first_is_simple);
    oracle_count_crossings(PT, &edge_pt, &c);
    ck_assert(c.passes == 1 && c.on_border == 1);
    oracle_count_crossings(PT, &lands_pt, &c);
    ck_assert(c.passes == 0 && c.unclear == 1 && c.first_is_simple);
    oracle_count_crossings(PT, &graze_pt, &c);
    ck_assert(c.passes == 0 && c.grazes == 1 && c.signed_sum == 0 && !c.first_is_simple);
    oracle_count_crossings(EE, &triple_ee, &c);
    ck_assert(c.passes == 1 && !c.first_is_simple);
    oracle_count_crossings(EE, &coplanar_ee, &c);
    ck_assert(c.planar);
    rdl_motion lower = graze_pt;
    lower.start[0][2] -= 1.0 / 64.0;
    lower.end[0][2] -= 1.0 / 64.0;
    oracle_count_crossings(PT, &lower, &c);
    ck_assert(c.passes == 2 && c.signed_sum == 0 && c.first_is_simple);
}
END_TEST

START_TEST(near_misses_of_published_cases)
{
    rdl_motion m = lands_pt;
    m.end[0][2] = 0x1p-1074;
    expect_miss(PT, &m, 0.0);
    m = graze_pt;
    m.start[0][2] += 0x1p-50;
    m.end[0][2] += 0x1p-50;
    expect_miss(PT, &m, 0.0);
    m = edge_pt;
    m.start[0][0] = m.end[0][0] = nextafter(0.5, 1.0);
    expect_miss(PT, &m, 0.0);
    m = coplanar_ee;
    m.start[0][0] = m.end[0][0] = nextafter(1.0, 2.0);
    expect_miss(EE, &m, 0.0);
}
END_TEST

START_TEST(times_at_a_gap_by_hand)
{
    /* Face: height 1 - 2 t = 1/4 at t = 3/8. Edge and corner: 3-4-5 triangles. */
    expect_time(PT, &head_on_pt, 0.25, 0.375);
    expect_time(EE, &head_on_ee, 0.25, 0.375);
    expect_time(PT, &head_on_pt, 1.0, 0.0);
    rdl_motion side = {{{8, -3, 0}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}}, {{0, -3, 0}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}}};
    expect_time(PT, &side, 5.0, 0.375); /* x = 5: 4 beyond the corner (1, 0, 0), 3 below it */
    expect_time(PT, &side, 3.0, 0.875); /* above the edge from x = 1 on */
    expect_miss(PT, &side, nextafter(3.0, 2.0));
    expect_time(EE, &coplanar_ee, 0.5, 0.25);
    /* Parallel edges that slide past each other at distance 1: within the gap while they overlap. */
    rdl_motion slide = {{{0, 0, 0}, {1, 0, 0}, {5, 1, 0}, {6, 1, 0}}, {{0, 0, 0}, {1, 0, 0}, {-11, 1, 0}, {-10, 1, 0}}};
    expect_time(EE, &slide, 1.0, 0.25);
    expect_miss(EE, &slide, nextafter(1.0, 0.0));
}
END_TEST

static void expect_distance2(const double x[4][3], long above, unsigned long below)
{
    mpq_t distance2;
    mpq_init(distance2);
    oracle_rest_distance2(EE, x, distance2);
    ck_assert_int_eq(mpq_cmp_si(distance2, above, below), 0);
    mpq_clear(distance2);
}

START_TEST(published_segment_distances)
{
    static const double a[5][4][3] = {{{0, 0, 0}, {4, 0, 0}, {1, 1, 1}, {1, 3, -1}},
                                      {{0, 0, 0}, {2, 0, 0}, {3, 1, 0}, {3, 3, 0}},
                                      {{0, 0, 0}, {2, 0, 0}, {0, 1, 0}, {2, 1, 0}},
                                      {{0, 0, 0}, {3, 0, 0}, {1, -1, 2}, {2, 2, 1}},
                                      {{0, 0, 0}, {1, 1, 1}, {2, 0, 0}, {0, 2, 1}}};
    expect_distance2(a[0], 2, 1);
    expect_distance2(a[1], 2, 1);
    expect_distance2(a[2], 1, 1);
    expect_distance2(a[3], 5, 2);
    expect_distance2(a[4], 2, 13);
}
END_TEST

START_TEST(published_nearly_parallel_yarns)
{
    static const double x[4][3] = {{0.012711, -0.000688, -0.001097}, {0.012895, -0.000686, -0.001133},
                                   {0.012676, -0.000689, -0.000999}, {0.012859, -0.000687, -0.001034}};
    mpq_t distance2;
    mpq_init(distance2);
    oracle_rest_distance2(EE, x, distance2);
    ck_assert_double_eq_tol(sqrt(mpq_get_d(distance2)), 0.0896816e-3, 5e-11);
    mpq_clear(distance2);
}
END_TEST

START_TEST(point_triangle_distances_by_hand)
{
    static const double x[4][4][3] = {{{0.25, 0.25, 3}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}},
                                      {{-3, -4, 0}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}},
                                      {{1, 1, 1}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}},
                                      {{0, 5, 0}, {0, 0, 0}, {1, 0, 0}, {2, 0, 0}}};
    static const long above[4] = {9, 25, 3, 25}, below[4] = {1, 1, 2, 1};
    mpq_t distance2;
    mpq_init(distance2);
    for (int i = 0; i < 4; i++) {
        oracle_rest_distance2(PT, x[i], distance2);
        ck_assert_int_eq(mpq_cmp_si(distance2, above[i], (unsigned long)below[i]), 0);
    }
    mpq_clear(distance2);
}
END_TEST

START_TEST(edge_and_triangle_at_rest)
{
    static const double t[3][3] = {{0, 0, 0}, {4, 0, 0}, {0, 4, 0}}, line[3][3] = {{0, 0, 0}, {2, 0, 0}, {4, 0, 0}};
    static const double through[2][3] = {{1, 1, -1}, {1, 1, 1}}, border[2][3] = {{2, 2, -1}, {2, 2, 1}},
                        corner[2][3] = {{4, 0, -1}, {4, 0, 1}}, past[2][3] = {{3, 3, -1}, {3, 3, 1}},
                        lands[2][3] = {{1, 1, 0}, {1, 1, 1}}, flat[2][3] = {{-1, 1, 0}, {5, 1, 0}},
                        beside[2][3] = {{5, 5, 0}, {6, 1, 0}}, above[2][3] = {{1, 1, 0x1p-1074}, {1, 1, 1}};
    ck_assert_int_eq(oracle_edge_against_triangle(through, t), ORACLE_PIERCE);
    ck_assert_int_eq(oracle_edge_against_triangle(border, t), ORACLE_PIERCE);
    ck_assert_int_eq(oracle_edge_against_triangle(corner, t), ORACLE_PIERCE);
    ck_assert_int_eq(oracle_edge_against_triangle(past, t), ORACLE_APART);
    ck_assert_int_eq(oracle_edge_against_triangle(lands, t), ORACLE_CONTACT);
    ck_assert_int_eq(oracle_edge_against_triangle(flat, t), ORACLE_CONTACT);
    ck_assert_int_eq(oracle_edge_against_triangle(beside, t), ORACLE_APART);
    ck_assert_int_eq(oracle_edge_against_triangle(above, t), ORACLE_APART);
    ck_assert_int_eq(oracle_edge_against_triangle(flat, line), ORACLE_APART);
    static const double across[2][3] = {{1, -1, -1}, {1, 1, 1}};
    ck_assert_int_eq(oracle_edge_against_triangle(across, line), ORACLE_CONTACT);
}
END_TEST

START_TEST(floors_and_apart_by_hand)
{
    /* Start 1 above, dips to 1/2 of it by way of a second piece, ends at 1. */
    rdl_motion way[2] = {head_on_pt, head_on_pt};
    way[0].end[0][2] = way[1].start[0][2] = 0.25;
    way[1].end[0][2] = 1.0;
    oracle_apart a = oracle_pair_apart(PT, way, 2, 0.25, 0.5);
    ck_assert(a.apart && a.end_kept && a.path_kept && !a.start_zero);
    a = oracle_pair_apart(PT, way, 2, 0.5, 0.5); /* path floor 1/4 is reached: must stay above it */
    ck_assert(!a.apart && a.end_kept && !a.path_kept);
    a = oracle_pair_apart(PT, way, 2, 0.5, 0.4999);
    ck_assert(a.apart);
    way[1].end[0][2] = nextafter(1.0, 0.0);
    a = oracle_pair_apart(PT, way, 2, 7.0, 0.125); /* the end floor is the start distance 1 */
    ck_assert(!a.apart && !a.end_kept && a.path_kept);
    ck_assert(!oracle_end_keeps_floor(PT, &lands_pt, 0.25));
    rdl_motion back = lands_pt;
    memcpy(back.start, lands_pt.end, sizeof back.start);
    a = oracle_pair_apart(PT, &back, 1, 0.25, 0.5);
    ck_assert(a.start_zero && a.end_kept && !a.path_kept);
}
END_TEST

START_TEST(least_distance_encloses_known_values)
{
    rdl_motion side = {{{8, -3, 0}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}}, {{2, -3, 0}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}}};
    double lo, hi;
    oracle_least_distance(PT, &side, &lo, &hi); /* sqrt(10) at the end */
    ck_assert(lo < sqrt(10.0) && sqrt(10.0) <= hi && hi - lo < 1e-8);
    oracle_least_distance(EE, &head_on_ee, &lo, &hi);
    ck_assert(lo == 0.0 && hi == 0.0);
    rdl_motion pass = head_on_ee;
    for (int i = 2; i < 4; i++) {
        pass.start[i][0] += 1.0 + 0x1p-30;
        pass.end[i][0] += 1.0 + 0x1p-30;
    }
    oracle_least_distance(EE, &pass, &lo, &hi);
    ck_assert(lo < 0x1p-30 && hi >= 0x1p-30 && hi - lo <= 0x1p-60);
}
END_TEST

/* Members of every family: the distance at sampled times, exact, must agree with the verdict and the first time. */
static void sample_family(const motion_family *family, int kind, double share)
{
    random_source source = random_from(0x5a3c1e + (uint64_t)kind);
    oracle_touch touch;
    mpq_t gap2, distance2;
    mpq_init(gap2);
    mpq_init(distance2);
    oracle_touch_init(&touch);
    for (int n = 0; n < 8; n++) {
        rdl_motion m;
        family->make(&source, kind, &m);
        double gap = share * motion_distance(kind, &m, 0.0);
        if (!(gap >= 0.0 && gap < 1e308))
            continue;
        oracle_square_gap(gap2, gap, 0);
        oracle_find(kind, &m, gap2, &touch);
        for (int i = 0; i <= 16; i++) {
            /* Differences of neighbours are exact on the way only for t = 0 and 1: ask at rest there, by time else. */
            double t = i / 16.0;
            bool early = touch.touches && oracle_compare_time(&touch, t) <= 0;
            if (i == 0 || i == 16) {
                oracle_rest_distance2(kind, (const double(*)[3])(i == 0 ? m.start : m.end), distance2);
                bool near = mpq_cmp(distance2, gap2) <= 0;
                ck_assert_msg(!near || early, "%s: touches at t = %g, found none", family->name, t);
            } else if (!early && motion_distance(kind, &m, t) < 1e300) {
                /* double distance: loose on purpose */
                ck_assert_msg(!(motion_distance(kind, &m, t) < 0.99 * gap), "%s: missed at t = %g", family->name, t);
            }
        }
    }
    oracle_touch_clear(&touch);
    mpq_clear(gap2);
    mpq_clear(distance2);
}

START_TEST(agrees_with_sampled_distances)
{
    for (int i = 0; i < motion_family_count; i++)
        for (int kind = PT; kind <= EE; kind++) {
            sample_family(&motion_families[i], kind, 0.0);
            sample_family(&motion_families[i], kind, 0.5);
        }
}
END_TEST

/* Where the pair touches, cutting the motion just before the first time must leave a motion that does not. */
START_TEST(first_times_are_first)
{
    random_source source = random_from(20261201);
    oracle_touch touch;
    oracle_touch_init(&touch);
    int seen = 0;
    for (int n = 0; n < 400; n++) {
        rdl_motion m;
        int kind = n % 2;
        double lo, hi;
        motion_families[motion_family_find("integer grid")].make(&source, kind, &m);
        if (!find(kind, &m, n % 4 < 2 ? 0.0 : 0.25, &touch))
            continue;
        oracle_bracket_time(&touch, 20, &lo, &hi);
        ck_assert(oracle_compare_time(&touch, lo) >= 0 && oracle_compare_time(&touch, hi) <= 0 && hi - lo < 2e-6);
        double cut = ldexp(floor(ldexp(lo, 20)) - 1.0, -20);
        if (cut <= 0.0)
            continue;
        seen++;
        rdl_motion head = m; /* grid coordinates times a 20-bit fraction: exact */
        rdl_motion next = m;
        for (int i = 0; i < 4; i++)
            for (int k = 0; k < 3; k++) {
                head.end[i][k] = m.start[i][k] + cut * (m.end[i][k] - m.start[i][k]);
                next.end[i][k] = m.start[i][k] + (cut + 0x1p-18) * (m.end[i][k] - m.start[i][k]);
            }
        ck_assert(!find(kind, &head, n % 4 < 2 ? 0.0 : 0.25, &touch));
        ck_assert(find(kind, &next, n % 4 < 2 ? 0.0 : 0.25, &touch));
    }
    ck_assert_int_gt(seen, 40);
    oracle_touch_clear(&touch);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("oracle");
    TCase *facts = tcase_create("facts");
    tcase_set_timeout(facts, 240);
    tcase_add_test(facts, published_zero_gap_times);
    tcase_add_test(facts, published_crossing_counts);
    tcase_add_test(facts, near_misses_of_published_cases);
    tcase_add_test(facts, times_at_a_gap_by_hand);
    tcase_add_test(facts, published_segment_distances);
    tcase_add_test(facts, published_nearly_parallel_yarns);
    tcase_add_test(facts, point_triangle_distances_by_hand);
    tcase_add_test(facts, edge_and_triangle_at_rest);
    tcase_add_test(facts, floors_and_apart_by_hand);
    tcase_add_test(facts, least_distance_encloses_known_values);
    tcase_add_test(facts, agrees_with_sampled_distances);
    tcase_add_test(facts, first_times_are_first);
    suite_add_tcase(suite, facts);
    SRunner *runner = srunner_create(suite);
    srunner_add_suite(runner, loops_suite());
    srunner_run_all(runner, CK_NORMAL);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
