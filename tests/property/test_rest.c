/* Exact answers about states at rest against the oracle: an edge and a triangle. */
#include <check.h>
#include <stdlib.h>
#include <string.h>

#include "families.h"
#include "oracle.h"
#include "raddle/rest.h"

enum { MEMBERS = 1500 };

_Static_assert(RDL_REST_APART == (int)ORACLE_APART && RDL_REST_CONTACT == (int)ORACLE_CONTACT &&
                   RDL_REST_PIERCE == (int)ORACLE_PIERCE, "the two scales are compared number by number");

/* From a moving point and triangle: the point's path is the edge; the triangle is taken at the start or half-way. */
static void edge_and_triangle(random_source *source, const rdl_motion *motion, double edge[2][3], double triangle[3][3])
{
    unsigned halfway = random_below(source, 2);
    for (int k = 0; k < 3; k++) {
        edge[0][k] = motion->start[0][k];
        edge[1][k] = motion->end[0][k];
        for (int i = 0; i < 3; i++) {
            double start = motion->start[1 + i][k], end = motion->end[1 + i][k];
            triangle[i][k] = halfway ? 0.5 * start + 0.5 * end : start;
        }
    }
}

static size_t seen[3];

static void compare(double edge[2][3], double triangle[3][3], const char *family)
{
    int want = oracle_edge_against_triangle((const double(*)[3])edge, (const double(*)[3])triangle);
    int got = rdl_edge_against_triangle((const double(*)[3])edge, (const double(*)[3])triangle);
    seen[want]++;
    ck_assert_msg(got == want, "%s: %d instead of %d for {%a,%a,%a} {%a,%a,%a} / {%a,%a,%a} {%a,%a,%a} {%a,%a,%a}", family,
                  got, want, edge[0][0], edge[0][1], edge[0][2], edge[1][0], edge[1][1], edge[1][2], triangle[0][0],
                  triangle[0][1], triangle[0][2], triangle[1][0], triangle[1][1], triangle[1][2], triangle[2][0],
                  triangle[2][1], triangle[2][2]);
}

START_TEST(edge_against_triangle_is_exact)
{
    const motion_family *family = &motion_families[_i];
    random_source source = random_from(400 + (uint64_t)_i);
    int members = family->percent < 10 ? MEMBERS / 10 : MEMBERS;
    for (int n = 0; n < members; n++) {
        rdl_motion motion;
        double edge[2][3], triangle[3][3];
        family->make(&source, RDL_POINT_TRIANGLE, &motion);
        edge_and_triangle(&source, &motion, edge, triangle);
        compare(edge, triangle, family->name);
    }
}
END_TEST

START_TEST(order_of_ends_and_corners_is_nothing)
{
    static const int orders[6][3] = {{0, 1, 2}, {0, 2, 1}, {1, 0, 2}, {1, 2, 0}, {2, 0, 1}, {2, 1, 0}};
    random_source source = random_from(9);
    for (int n = 0; n < 3000; n++) {
        rdl_motion motion;
        double edge[2][3], triangle[3][3], turned_edge[2][3], turned[3][3];
        motion_families[n % motion_family_count].make(&source, RDL_POINT_TRIANGLE, &motion);
        edge_and_triangle(&source, &motion, edge, triangle);
        int first = rdl_edge_against_triangle((const double(*)[3])edge, (const double(*)[3])triangle);
        for (int o = 0; o < 12; o++) {
            for (int i = 0; i < 3; i++)
                memcpy(turned[i], triangle[orders[o % 6][i]], sizeof turned[i]);
            for (int i = 0; i < 2; i++)
                memcpy(turned_edge[i], edge[o < 6 ? i : 1 - i], sizeof turned_edge[i]);
            ck_assert_int_eq(rdl_edge_against_triangle((const double(*)[3])turned_edge, (const double(*)[3])turned), first);
        }
    }
}
END_TEST

START_TEST(all_three_answers_occur)
{
    memset(seen, 0, sizeof seen);
    random_source source = random_from(10);
    for (int n = 0; n < 3000; n++) {
        rdl_motion motion;
        double edge[2][3], triangle[3][3];
        motion_families[motion_family_find("small integer grid")].make(&source, RDL_POINT_TRIANGLE, &motion);
        edge_and_triangle(&source, &motion, edge, triangle);
        compare(edge, triangle, "small integer grid");
    }
    for (int i = 0; i < 3; i++)
        ck_assert_uint_gt(seen[i], 100);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("rest");
    TCase *all = tcase_create("rest");
    tcase_set_timeout(all, 240);
    tcase_add_loop_test(all, edge_against_triangle_is_exact, 0, motion_family_count);
    tcase_add_test(all, order_of_ends_and_corners_is_nothing);
    tcase_add_test(all, all_three_answers_occur);
    suite_add_tcase(suite, all);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_NORMAL);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
