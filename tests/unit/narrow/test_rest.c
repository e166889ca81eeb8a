/* unit/narrow/test_rest.c: closest points, exact predicates at rest, floors. */
#include <check.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "cases.h"
#include "narrow/narrow.h"
#include "raddle/rest.h"

typedef struct closest_case {
    int kind;
    double x[4][3], square, weight[4];
    bool parallel; /* the closest points are not unique */
} closest_case;

static const closest_case closest_cases[] = {
    {1, {{0, 0, 0}, {4, 0, 0}, {1, 1, 1}, {1, 3, -1}}, 2, {0.75, 0.25, -1, 0}, false},
    {1, {{0, 0, 0}, {2, 0, 0}, {3, 1, 0}, {3, 3, 0}}, 2, {0, 1, -1, 0}, false},
    {1, {{0, 0, 0}, {2, 0, 0}, {0, 1, 0}, {2, 1, 0}}, 1, {0, 0, 0, 0}, true},
    {1, {{0, 0, 0}, {3, 0, 0}, {1, -1, 2}, {2, 2, 1}}, 2.5, {0.5, 0.5, -0.5, -0.5}, false},
    {1, {{0, 0, 0}, {1, 1, 1}, {2, 0, 0}, {0, 2, 1}}, 2. / 13, {2. / 13, 11. / 13, -6. / 13, -7. / 13}, false},
    {0, {{0.25, 0.25, 0.5}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}}, 0.25, {1, -0.5, -0.25, -0.25}, false},
    {0, {{1, 1, 0}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}}, 0.5, {1, 0, -0.5, -0.5}, false},
    {0, {{3, -1, 2}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}}, 9, {1, 0, -1, 0}, false},
    {0, {{1, 2, 0}, {0, 0, 0}, {1, 0, 0}, {3, 0, 0}}, 4, {1, 0, -1, 0}, true},
    {0, {{1e-200, 0, 1}, {0, 0, 0}, {0, 0, 0}, {0, 0, 0}}, 1, {1, -1, 0, 0}, false},
};

START_TEST(closest_points)
{
    const closest_case *c = &closest_cases[_i];
    rdli_closest closest;
    rdli_closest_points(c->kind, c->x, &closest);
    double lo = closest.distance_lo * closest.distance_lo, hi = closest.distance_hi * closest.distance_hi, square = 0;
    ck_assert(lo <= c->square * (1 + 1e-15) && c->square * (1 - 1e-15) <= hi && hi - lo <= 1e-9 * hi);
    for (int k = 0; k < 3; k++) {
        double d = 0;
        for (int i = 0; i < 4; i++)
            d += closest.weight[i] * c->x[i][k];
        square += d * d;
        ck_assert(fabs(d - closest.normal[k] * closest.distance_hi) < 1e-9);
    }
    ck_assert(fabs(square - c->square) < 1e-12);
    for (int i = 0; i < 4 && !c->parallel; i++)
        ck_assert_msg(fabs(closest.weight[i] - c->weight[i]) < 1e-12, "weight %d is %.17g", i, closest.weight[i]);
}
END_TEST

/* Nearly parallel segments of yarn on which a common formula jumps. */
START_TEST(nearly_parallel_yarns)
{
    const double x[4][3] = {{0.012711, -0.000688, -0.001097}, {0.012895, -0.000686, -0.001133},
                            {0.012676, -0.000689, -0.000999}, {0.012859, -0.000687, -0.001034}};
    rdli_closest closest;
    rdli_closest_points(RDL_EDGE_EDGE, x, &closest);
    ck_assert(fabs(closest.distance_lo - 0.0896816e-3) < 1e-10 && fabs(closest.distance_hi - 0.0896816e-3) < 1e-10);
    ck_assert(closest.weight[1] == 0 && fabs(-closest.weight[3] - 0.28334) < 1e-5);
}
END_TEST

START_TEST(distance_zero_is_exact)
{
    double x[4][3] = {{0.25, 0.25, 0}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}};
    rdli_closest closest;
    rdli_closest_points(RDL_POINT_TRIANGLE, x, &closest);
    ck_assert(closest.distance_lo == 0 && closest.distance_hi == 0 && closest.normal[0] == 0 && closest.normal[2] == 0);
    ck_assert(rdli_meets_at_rest(RDL_POINT_TRIANGLE, x));
    x[0][2] = 0x1p-1074;
    rdli_closest_points(RDL_POINT_TRIANGLE, x, &closest);
    ck_assert(closest.distance_lo >= 0 && closest.distance_hi >= 0x1p-1074);
    ck_assert(!rdli_meets_at_rest(RDL_POINT_TRIANGLE, x));
    x[0][2] = 1e-300;
    rdli_closest_points(RDL_POINT_TRIANGLE, x, &closest);
    ck_assert(closest.distance_lo > 0.999e-300 && closest.distance_hi < 1.001e-300);
}
END_TEST

static int relation(double x, double y, double below, double above)
{
    const double triangle[3][3] = {{0, 0, 0}, {1, 0, 0}, {0, 1, 0}}, edge[2][3] = {{x, y, below}, {x, y, above}};
    const double other[2][3] = {{x, y, above}, {x, y, below}};
    int answer = rdl_edge_against_triangle(edge, triangle);
    ck_assert_int_eq(rdl_edge_against_triangle(other, triangle), answer);
    return answer;
}

START_TEST(edges_and_triangles)
{
    ck_assert_int_eq(relation(0.25, 0.25, -1, 1), RDL_REST_PIERCE);
    ck_assert_int_eq(relation(0.5, 0.5, -1, 1), RDL_REST_PIERCE);  /* through a border */
    ck_assert_int_eq(relation(0, 0, -1, 1), RDL_REST_PIERCE);      /* through a corner */
    ck_assert_int_eq(relation(0.5, 0x1.0000000000001p-1, -1, 1), RDL_REST_APART);
    ck_assert_int_eq(relation(0.25, 0.25, 0, 1), RDL_REST_CONTACT);
    ck_assert_int_eq(relation(0.25, 0.25, 0x1p-1074, 1), RDL_REST_APART);
    ck_assert_int_eq(relation(0.25, 0.25, -0x1p-1074, 1e300), RDL_REST_PIERCE);
    ck_assert_int_eq(relation(2, 2, -1, 1), RDL_REST_APART);
    const double triangle[3][3] = {{0, 0, 0}, {1, 0, 0}, {0, 1, 0}}, line[3][3] = {{0, 0, 0}, {1, 0, 0}, {2, 0, 0}};
    const double flat[2][3] = {{-1, 0.25, 0}, {2, 0.25, 0}}, beside[2][3] = {{-1, 2, 0}, {2, 2, 0}};
    ck_assert_int_eq(rdl_edge_against_triangle(flat, triangle), RDL_REST_CONTACT);
    ck_assert_int_eq(rdl_edge_against_triangle(beside, triangle), RDL_REST_APART);
    const double through[2][3] = {{0.5, 0, -1}, {0.5, 0, 1}};
    ck_assert_int_eq(rdl_edge_against_triangle(through, line), RDL_REST_CONTACT); /* no area: never pierced */
}
END_TEST

START_TEST(end_floors)
{
    rdl_motion m = {{{0.25, 0.25, 0.3}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}}, {{0.25, 0.25, 0.3}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}}};
    ck_assert(rdli_end_keeps_floor(RDL_POINT_TRIANGLE, &m, 1));
    m.end[0][0] = 0.5; /* slides at the same height */
    ck_assert(rdli_end_keeps_floor(RDL_POINT_TRIANGLE, &m, 1));
    m.end[0][2] = nextafter(0.3, 0);
    ck_assert(!rdli_end_keeps_floor(RDL_POINT_TRIANGLE, &m, 1));
    ck_assert(!rdli_end_keeps_floor(RDL_POINT_TRIANGLE, &m, 0.3));
    ck_assert(rdli_end_keeps_floor(RDL_POINT_TRIANGLE, &m, nextafter(0.3, 0)));
    ck_assert(rdli_end_keeps_floor(RDL_POINT_TRIANGLE, &m, 0));
    for (int i = 0; i < 4; i++) /* the same rigid shift of all four, exactly */
        for (int k = 0; k < 3; k++)
            m.end[i][k] = m.start[i][k] * 0.5;
    ck_assert(!rdli_end_keeps_floor(RDL_POINT_TRIANGLE, &m, 1));
    ck_assert(rdli_end_keeps_floor(RDL_POINT_TRIANGLE, &m, 0.125));
}
END_TEST

START_TEST(examination)
{
    rdl_motion m = known_cases[0].motion;
    rdli_examined e;
    rdli_examine(RDL_POINT_TRIANGLE, &m, 0.1, 0.5, NULL, &e);
    ck_assert(!e.quiet && e.reaches_path && !e.below_end && !e.contact_at_start);
    ck_assert(e.start_lo <= 1 && 1 <= e.start_hi && e.end_floor == 0.1 && e.path_floor >= 0.05 && e.path_floor <= 0.05 * (1 + 0x1p-51));
    ck_assert(e.touch.time_lo <= 0.475 && 0.475 <= e.touch.time_hi);
    m.end[0][2] = 0.5;
    rdli_examine(RDL_POINT_TRIANGLE, &m, 0.1, 0.5, NULL, &e);
    ck_assert(e.quiet);
    m.end[0][2] = 0.0625;
    rdli_examine(RDL_POINT_TRIANGLE, &m, 0.1, 0.5, NULL, &e);
    ck_assert(!e.quiet && !e.reaches_path && e.below_end);
    double floor_distance[2] = {0.03125, 0.0625};
    rdli_examine(RDL_POINT_TRIANGLE, &m, 0.1, 0.5, floor_distance, &e);
    ck_assert(!e.below_end && e.end_floor == 0.0625 && e.path_floor >= 0.03125 && e.path_floor <= 0.03125 * (1 + 0x1p-51));
    m.start[0][2] = 0;
    rdli_examine(RDL_POINT_TRIANGLE, &m, 0.1, 0.5, NULL, &e);
    ck_assert(e.contact_at_start && e.end_floor == 0 && e.path_floor == 0 && e.reaches_path && !e.below_end);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("narrow rest");
    TCase *all = tcase_create("all");
    tcase_add_loop_test(all, closest_points, 0, (int)(sizeof closest_cases / sizeof *closest_cases));
    tcase_add_test(all, nearly_parallel_yarns);
    tcase_add_test(all, distance_zero_is_exact);
    tcase_add_test(all, edges_and_triangles);
    tcase_add_test(all, end_floors);
    tcase_add_test(all, examination);
    suite_add_tcase(suite, all);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_NORMAL);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
