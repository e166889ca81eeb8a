/* The engine's questions about one pair (inner interface of the narrow phase) against the exact oracle: distance at rest,
 * end floor, path floor. */
#include <check.h>
#include <math.h>
#include <stdlib.h>

#include "families.h"
#include "narrow/narrow.h"
#include "oracle.h"

enum { MEMBERS = 120 };

typedef struct bench {
    int kind;
    const char *family;
    mpq_t distance2, bound, gap2;
    oracle_touch touch;
} bench;

static void bench_init(bench *b, int kind)
{
    b->kind = kind;
    mpq_init(b->distance2);
    mpq_init(b->bound);
    mpq_init(b->gap2);
    oracle_touch_init(&b->touch);
}

static void bench_clear(bench *b)
{
    mpq_clear(b->distance2);
    mpq_clear(b->bound);
    mpq_clear(b->gap2);
    oracle_touch_clear(&b->touch);
}

/* lo <= exact distance <= hi, where hi may be infinite. */
static bool encloses(bench *b, double lo, double hi)
{
    if (!(lo >= 0.0 && lo <= hi))
        return false;
    mpq_set_d(b->bound, lo);
    mpq_mul(b->bound, b->bound, b->bound);
    if (mpq_cmp(b->bound, b->distance2) > 0)
        return false;
    if (isinf(hi))
        return true;
    mpq_set_d(b->bound, hi);
    mpq_mul(b->bound, b->bound, b->bound);
    return mpq_cmp(b->bound, b->distance2) >= 0;
}

static void check_closest(bench *b, const double x[4][3])
{
    rdli_closest c;
    rdli_closest_points(b->kind, x, &c);
    oracle_rest_distance2(b->kind, x, b->distance2);
    bool zero = mpq_sgn(b->distance2) == 0;
    ck_assert_msg(encloses(b, c.distance_lo, c.distance_hi), "%s: [%a, %a] misses the distance", b->family, c.distance_lo,
                  c.distance_hi);
    ck_assert_msg(zero == (c.distance_hi == 0.0), "%s: exactly 0 or not", b->family);
    ck_assert_msg(zero == rdli_meets_at_rest(b->kind, x), "%s: meets at rest or not", b->family);
    double length = sqrt(c.normal[0] * c.normal[0] + c.normal[1] * c.normal[1] + c.normal[2] * c.normal[2]);
    ck_assert_msg(zero ? length == 0.0 : fabs(length - 1.0) < 1e-12,
                  "%s: normal of length %.17g at distance [%a, %a] of {%a,%a,%a} {%a,%a,%a} {%a,%a,%a} {%a,%a,%a}, kind %d",
                  b->family, length, c.distance_lo, c.distance_hi, x[0][0], x[0][1], x[0][2], x[1][0], x[1][1], x[1][2],
                  x[2][0], x[2][1], x[2][2], x[3][0], x[3][1], x[3][2], b->kind);
    double sum = c.weight[0] + c.weight[1] + c.weight[2] + c.weight[3], size = 0.0;
    for (int i = 0; i < 4; i++)
        size = fmax(size, fabs(c.weight[i]));
    ck_assert_msg(fabs(sum) < 1e-12 && size <= 1.0 + 1e-12, "%s: weights", b->family);
}

static void check_end_floor(bench *b, const rdl_motion *motion, double gap)
{
    bool want = oracle_end_keeps_floor(b->kind, motion, gap);
    ck_assert_msg(rdli_end_keeps_floor(b->kind, motion, gap) == want, "%s: end floor, gap %a, exact answer %d", b->family,
                  gap, want);
}

static bool touches_at(bench *b, const rdl_motion *motion)
{
    oracle_find(b->kind, motion, b->gap2, &b->touch);
    return b->touch.touches;
}

static void check_examined(bench *b, const rdl_motion *motion, double gap, double share)
{
    rdli_examined e;
    rdli_examine(b->kind, motion, gap, share, NULL, &e);
    if (e.quiet) {
        oracle_square_gap(b->gap2, gap, 0);
        ck_assert_msg(!touches_at(b, motion), "%s: called quiet, gap %a", b->family, gap);
        return;
    }
    oracle_floors floors;
    oracle_floors_init(&floors);
    oracle_floors_set(&floors, b->kind, (const double(*)[3])motion->start, gap, share);
    mpq_set(b->distance2, floors.start2);
    ck_assert_msg(encloses(b, e.start_lo, e.start_hi), "%s: start distance", b->family);
    ck_assert_msg(e.contact_at_start == (mpq_sgn(floors.start2) == 0), "%s: contact at start", b->family);
    ck_assert_msg(e.below_end == !oracle_end_keeps_floor(b->kind, motion, gap), "%s: below the end floor", b->family);
    mpq_set(b->distance2, floors.end2);
    ck_assert_msg(encloses(b, 0.0, e.end_floor), "%s: end floor too low", b->family);
    mpq_set(b->gap2, floors.path2);
    bool reached = touches_at(b, motion);
    ck_assert_msg(e.reaches_path || !reached, "%s: reaching the path floor missed, gap %a", b->family, gap);
    if (e.reaches_path && !reached) {
        oracle_square_gap(b->gap2, e.path_floor, 1);
        ck_assert_msg(touches_at(b, motion), "%s: false alarm at the path floor %a", b->family, e.path_floor);
    }
    if (reached)
        ck_assert_msg(oracle_compare_time(&b->touch, e.touch.time_lo) >= 0,
                      "%s: time_lo %a is late, path floor %a, gap %a, share %g, kind %d", b->family, e.touch.time_lo,
                      e.path_floor, gap, share, b->kind);
    oracle_floors_clear(&floors);
}

static double some_gap(random_source *source, const rdl_motion *motion, int kind)
{
    double ends[2] = {motion_distance(kind, motion, 0.0), motion_distance(kind, motion, 1.0)};
    double gap = ends[random_below(source, 2)] * (random_below(source, 3) ? 1.0 : random_between(source, 0.3, 3.0));
    return gap > 0.0 && gap < 1e300 ? gap : 1e-9 * motion_size(motion) + 0x1p-1074;
}

typedef void check_pair(bench *b, random_source *source, const rdl_motion *motion);

static void closest(bench *b, random_source *source, const rdl_motion *motion)
{
    (void)source;
    check_closest(b, (const double(*)[3])motion->start);
    check_closest(b, (const double(*)[3])motion->end);
}

static void end_floor(bench *b, random_source *source, const rdl_motion *motion)
{
    check_end_floor(b, motion, some_gap(source, motion, b->kind));
    check_end_floor(b, motion, 0x1.fffffffffffffp1023); /* end against start distance */
}

static void examined(bench *b, random_source *source, const rdl_motion *motion)
{
    check_examined(b, motion, some_gap(source, motion, b->kind), random_below(source, 2) ? 0.5 : 0.9);
}

static void over_members(int family, int scarce, check_pair *check)
{
    const motion_family *members = &motion_families[family];
    int count = members->percent < 10 ? scarce : MEMBERS;
    for (int kind = RDL_POINT_TRIANGLE; kind <= RDL_EDGE_EDGE; kind++) {
        bench b = {.family = members->name};
        random_source source = random_from(600 + (uint64_t)family);
        bench_init(&b, kind);
        for (int n = 0; n < count; n++) {
            rdl_motion motion;
            members->make(&source, kind, &motion);
            check(&b, &source, &motion);
        }
        bench_clear(&b);
    }
}

START_TEST(closest_points_at_rest)
{
    over_members(_i, 20, closest);
}
END_TEST

START_TEST(end_floors)
{
    over_members(_i, 20, end_floor);
}
END_TEST

START_TEST(examined_pairs)
{
    over_members(_i, 2, examined);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("floors");
    TCase *all = tcase_create("floors");
    tcase_set_timeout(all, 240);
    tcase_add_loop_test(all, closest_points_at_rest, 0, motion_family_count);
    tcase_add_loop_test(all, end_floors, 0, motion_family_count);
    tcase_add_loop_test(all, examined_pairs, 0, motion_family_count);
    suite_add_tcase(suite, all);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_NORMAL);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
