/* Topological witnesses on loops and meshes whose numbers are known. */
#include "loops.h"

#include <math.h>
#include <stdlib.h>

#include "oracle.h"
#include "random.h"
#include "test_oracle.h"

enum { LOOP = 24 };

/* A round loop in the plane of axes i and j. */
static void ring(double p[LOOP][3], int i, int j, const double centre[3], double radius)
{
    for (int n = 0; n < LOOP; n++) {
        double angle = 6.283185307179586 * (n + 0.25) / LOOP;
        for (int k = 0; k < 3; k++)
            p[n][k] = centre[k];
        p[n][i] += radius * cos(angle);
        p[n][j] += radius * sin(angle);
    }
}

static const double here[3] = {0, 0, 0}, beside[3] = {1, 0.01, 0.02}, far[3] = {5, 1, 2};

START_TEST(linked_rings_have_number_one)
{
    double a[LOOP][3], b[LOOP][3], off;
    long number = 99;
    ring(a, 0, 1, here, 1.0);
    ring(b, 0, 2, beside, 1.0);
    ck_assert(oracle_linking_number((const double(*)[3])a, LOOP, (const double(*)[3])b, LOOP, &number, &off));
    ck_assert_int_eq(labs(number), 1);
    long reversed = number;
    ring(b, 2, 0, beside, 1.0);
    ck_assert(oracle_linking_number((const double(*)[3])a, LOOP, (const double(*)[3])b, LOOP, &reversed, &off));
    ck_assert_int_eq(reversed, -number);
    ring(b, 0, 2, far, 1.0);
    ck_assert(oracle_linking_number((const double(*)[3])a, LOOP, (const double(*)[3])b, LOOP, &number, &off));
    ck_assert_int_eq(number, 0);
}
END_TEST

START_TEST(open_loops_fail_loudly)
{
    /* Two rings with one point in common: the sum is no integer. */
    double a[LOOP][3], b[LOOP][3], off;
    long number = 99;
    ring(a, 0, 1, here, 1.0);
    ring(b, 0, 2, beside, 1.0);
    for (int k = 0; k < 3; k++)
        b[3][k] = 0.5 * (a[5][k] + a[6][k]);
    ck_assert(!oracle_linking_number((const double(*)[3])a, LOOP, (const double(*)[3])b, LOOP, &number, &off));
    ck_assert_int_eq(number, 99);
    ck_assert(off > 1e-3);
}
END_TEST

START_TEST(crossings_predict_the_change_of_linking)
{
    random_source source = random_from(314159);
    int changed = 0;
    for (int n = 0; n < 30; n++) {
        double a0[LOOP][3], a1[LOOP][3], b0[LOOP][3], b1[LOOP][3], off;
        long before, after, change;
        for (int i = 0; i < 12; i++)
            for (int k = 0; k < 3; k++) {
                a0[i][k] = random_between(&source, -1, 1);
                b0[i][k] = random_between(&source, -1, 1);
                a1[i][k] = a0[i][k] + random_between(&source, -0.8, 0.8);
                b1[i][k] = b0[i][k] + random_between(&source, -0.8, 0.8);
            }
        const double(*p0)[3] = (const double(*)[3])a0, (*p1)[3] = (const double(*)[3])a1;
        const double(*q0)[3] = (const double(*)[3])b0, (*q1)[3] = (const double(*)[3])b1;
        ck_assert(oracle_linking_number(p0, 12, q0, 12, &before, &off));
        ck_assert(oracle_linking_number(p1, 12, q1, 12, &after, &off));
        ck_assert(oracle_linking_change(p0, p1, 12, q0, q1, 12, &change));
        ck_assert_int_eq(change, after - before);
        changed += change != 0;
    }
    ck_assert_int_gt(changed, 10);
}
END_TEST

static const double tetra[4][3] = {{0, 0, 0}, {1, 0, 0}, {0, 1, 0}, {0, 0, 1}};
static const unsigned faces[4][3] = {{0, 2, 1}, {0, 1, 3}, {0, 3, 2}, {1, 2, 3}};

START_TEST(winding_number_of_a_tetrahedron)
{
    static const double inside[3] = {0.1, 0.2, 0.3}, outside[3] = {0.5, 0.5, 0.5}, on[3] = {0.25, 0.25, 0};
    long number = 99;
    double off;
    ck_assert(!oracle_winding_number(tetra, faces, 4, on, &number, &off));
    ck_assert_int_eq(number, 99);
    ck_assert(oracle_winding_number(tetra, faces, 4, inside, &number, &off));
    ck_assert_int_eq(number, 1);
    ck_assert(oracle_winding_number(tetra, faces, 4, outside, &number, &off));
    ck_assert_int_eq(number, 0);
}
END_TEST

/* Signed exact crossings of the point's path with the faces; a path inwards makes w . (u x v) fall. */
static long entries(const double from[3], const double to[3])
{
    long sum = 0;
    for (int i = 0; i < 4; i++) {
        rdl_motion m;
        oracle_crossings c;
        for (int k = 0; k < 3; k++) {
            m.start[0][k] = from[k];
            m.end[0][k] = to[k];
            for (int v = 0; v < 3; v++)
                m.start[1 + v][k] = m.end[1 + v][k] = tetra[faces[i][v]][k];
        }
        oracle_count_crossings(RDL_POINT_TRIANGLE, &m, &c);
        ck_assert(!c.planar && c.on_border == 0 && c.unclear == 0);
        sum -= c.signed_sum;
    }
    return sum;
}

START_TEST(winding_jumps_where_a_point_crosses_a_face)
{
    random_source source = random_from(271828);
    int jumps = 0;
    for (int n = 0; n < 200; n++) {
        double from[3], to[3], off;
        long before, after;
        for (int k = 0; k < 3; k++) {
            from[k] = random_between(&source, -0.3, 0.8);
            to[k] = random_between(&source, -0.3, 0.8);
        }
        ck_assert(oracle_winding_number(tetra, faces, 4, from, &before, &off));
        ck_assert(oracle_winding_number(tetra, faces, 4, to, &after, &off));
        ck_assert_int_eq(after - before, entries(from, to));
        jumps += after != before;
    }
    ck_assert_int_gt(jumps, 15);
}
END_TEST

Suite *loops_suite(void)
{
    Suite *suite = suite_create("loops");
    TCase *all = tcase_create("loops");
    tcase_set_timeout(all, 120);
    tcase_add_test(all, linked_rings_have_number_one);
    tcase_add_test(all, open_loops_fail_loudly);
    tcase_add_test(all, crossings_predict_the_change_of_linking);
    tcase_add_test(all, winding_number_of_a_tetrahedron);
    tcase_add_test(all, winding_jumps_where_a_point_crosses_a_face);
    suite_add_tcase(suite, all);
    return suite;
}
