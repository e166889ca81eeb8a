/* unit/narrow/test_paths.c: the same answers on every path: AVX2 and portable lanes, one by one and in lists, doubles and
 * exact arithmetic; and under every symmetry of the question. */
#include <check.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "cases.h"
#include "families.h"
#include "narrow/exact_pair.h"
#include "narrow/stages.h"

enum { COUNT = 60 };

static void make(int family, int kind, rdl_motion motions[COUNT], double gaps[COUNT])
{
    random_source source = random_from(4000 + (uint64_t)(2 * family + kind));
    for (int i = 0; i < COUNT; i++) {
        motion_families[family].make(&source, kind, &motions[i]);
        gaps[i] = i % 2 ? 0.05 * motion_size(&motions[i]) : 0;
    }
}

static bool same_double(double a, double b)
{
    return memcmp(&a, &b, sizeof a) == 0;
}

static void same_progress(const rdli_progress *one, const rdli_progress *other, int i)
{
    ck_assert(one->start[i] == other->start[i] && one->unsure[i] == other->unsure[i]);
    ck_assert(one->start[i] || one->unsure[i] || one->done[i] == other->done[i]);
    bool over = one->done[i] || one->start[i] || one->unsure[i]; /* the rest then only follows from the neighbours' needs */
    for (int k = over ? RDLI_STATE_LO : 0; k < (over ? RDLI_STATE_HI + 1 : RDLI_STATE); k++)
        ck_assert(same_double(one->state[i][k], other->state[i][k]));
}

static void same_outlook(const rdli_outlook *one, const rdli_outlook *other, int i)
{
    ck_assert(one->quiet[i] == other->quiet[i]);
    if (one->quiet[i])
        return;
    for (int end = 0; end < 2; end++) {
        ck_assert(one->tight[end][i] == other->tight[end][i]);
        ck_assert(same_double(one->lo[end][i], other->lo[end][i]) && same_double(one->hi[end][i], other->hi[end][i]));
    }
    ck_assert(one->known[i] == other->known[i]);
    ck_assert(same_double(one->path[i], other->path[i]));
    if (one->known[i])
        same_progress(&one->progress, &other->progress, i);
}

static void same_at_a_gap(int kind, const rdli_quad *quad, const rdli_path *one, const rdli_path *other)
{
    static rdli_progress progress[2];
    static rdli_outlook outlooks[2];
    static double rows[4][RDLI_LANES][RDLI_STATE];
    for (int i = 0; i < RDLI_LANES; i++)
        for (int j = 0; j < 2; j++) {
            progress[j].state[i] = rows[j][i];
            outlooks[j].progress.state[i] = rows[2 + j][i];
        }
    alignas(32) static const double from[RDLI_LANES] = {-1, -1, 0.01, -1};
    one->approach(kind, quad, &progress[0]);
    other->approach(kind, quad, &progress[1]);
    bool over[RDLI_LANES] = {false};
    for (int look = 0; look < 5; look++) {
        for (int i = 0; i < RDLI_LANES; i++) {
            if (!over[i])
                same_progress(&progress[0], &progress[1], i);
            over[i] = over[i] || progress[0].done[i] || (look == 0 && (progress[0].start[i] || progress[0].unsure[i]));
        }
        one->look_again(kind, quad, &progress[0]);
        other->look_again(kind, quad, &progress[1]);
    }
    one->outlook(kind, quad, 0.5, from, &outlooks[0]);
    other->outlook(kind, quad, 0.5, from, &outlooks[1]);
    for (int i = 0; i < RDLI_LANES; i++)
        same_outlook(&outlooks[0], &outlooks[1], i);
}

static void compare_paths(int kind, const rdli_quad *quad, const rdli_path *other)
{
    const rdli_path *one = &rdli_path_portable;
    uint8_t verdict[2][RDLI_LANES] = {{9, 9, 9, 9}, {8, 8, 8, 8}};
    static rdli_answers answers[2];
    one->screen(kind, quad, verdict[0]);
    other->screen(kind, quad, verdict[1]);
    ck_assert(memcmp(verdict[0], verdict[1], sizeof verdict[0]) == 0);
    one->meet(kind, quad, &answers[0]);
    other->meet(kind, quad, &answers[1]);
    for (int i = 0; i < RDLI_LANES; i++) {
        ck_assert(answers[0].answer[i] == answers[1].answer[i]);
        ck_assert(same_double(answers[0].lo[i], answers[1].lo[i]) && same_double(answers[0].hi[i], answers[1].hi[i]));
    }
    same_at_a_gap(kind, quad, one, other);
}

START_TEST(lanes_give_the_same_bits)
{
    rdl_motion motions[COUNT];
    double gaps[COUNT];
    const rdli_path *wide = rdli_path_avx2();
    for (int kind = 0; kind < 2; kind++) {
        make(_i, kind, motions, gaps);
        for (int first = 0; first + RDLI_LANES <= COUNT; first += RDLI_LANES) {
            rdli_quad quad;
            rdli_sized sized[RDLI_LANES];
            for (int i = 0; i < RDLI_LANES; i++) {
                rdli_sized_of(&motions[first + i], &sized[i]);
                quad.motion[i] = &sized[i].motion;
                quad.gap[i] = ldexp(gaps[first + i], sized[i].shift);
            }
            compare_paths(kind, &quad, wide ? wide : rdli_path_choose());
        }
    }
}
END_TEST

static void same_examined(const rdli_examined *one, const rdli_examined *other)
{
    ck_assert_int_eq(one->quiet, other->quiet);
    if (one->quiet)
        return;
    ck_assert(one->reaches_path == other->reaches_path && one->below_end == other->below_end);
    ck_assert(one->contact_at_start == other->contact_at_start);
    ck_assert(memcmp(&one->start_lo, &other->start_lo, 5 * sizeof(double)) == 0);
    ck_assert(memcmp(&one->touch, &other->touch, sizeof one->touch) == 0);
}

START_TEST(examined_lists_and_singles)
{
    rdl_motion motions[COUNT];
    double gaps[COUNT], floors[COUNT][2];
    static rdli_examined listed[COUNT], floored[COUNT];
    for (int kind = 0; kind < 2; kind++) {
        size_t count = motion_families[_i].percent < 10 ? 4 : COUNT - 3;
        make(_i, kind, motions, gaps);
        for (size_t i = 0; i < count; i++)
            floors[i][0] = floors[i][1] = 0.5 * gaps[i];
        rdli_examine_list(kind, count, motions, gaps, 0.5, NULL, listed);
        rdli_examine_list(kind, count, motions, gaps, 0.5, (const double (*)[2])floors, floored);
        for (size_t i = 0; i < count; i++) {
            rdli_examined single;
            rdli_examine(kind, &motions[i], gaps[i], 0.5, NULL, &single);
            same_examined(&listed[i], &single);
            rdli_examine(kind, &motions[i], gaps[i], 0.5, floors[i], &single);
            same_examined(&floored[i], &single);
            rdli_closest closest;
            rdli_closest_points(kind, (const double (*)[3])motions[i].start, &closest);
            if (!listed[i].quiet && motion_families[_i].percent >= 50)
                ck_assert(closest.distance_hi == listed[i].start_hi);
        }
    }
}
END_TEST

START_TEST(lists_and_singles)
{
    rdl_motion motions[COUNT];
    double gaps[COUNT];
    rdl_touch listed[COUNT], single;
    uint8_t quiet[COUNT];
    for (int kind = 0; kind < 2; kind++) {
        make(_i, kind, motions, gaps);
        for (size_t count = COUNT; count > COUNT - 5; count--) { /* every length of the last block */
            rdli_find_touch_list(kind, count, motions, gaps, listed);
            rdli_screen_list(kind, count, motions, gaps, quiet);
            for (size_t i = 0; i < count; i++) {
                rdli_find_touch(kind, &motions[i], gaps[i], &single);
                ck_assert(memcmp(&single, &listed[i], sizeof single) == 0);
                ck_assert(!(quiet[i] && single.touches));
            }
        }
    }
}
END_TEST

/* The exact stage alone against the answer of the whole chain; its doubles know nothing here. */
START_TEST(exact_alone)
{
    rdl_motion motions[COUNT];
    double gaps[COUNT];
    static mp_limb_t limbs[RDLI_LARGE_ROOM];
    for (int kind = 0; kind < 2; kind++) {
        make(_i, kind, motions, gaps);
        for (int i = 0; i < COUNT; i += motion_families[_i].percent < 10 ? 20 : 4) {
            rdl_touch chain, exact;
            rdli_arena arena = {limbs, 0, RDLI_LARGE_ROOM, false};
            rdli_frame nothing = {{0}, {0}, {0}};
            rdli_cubic doubles = rdli_cubic_of(kind, &nothing, &nothing);
            rdli_find_touch(kind, &motions[i], 0, &chain);
            rdli_exact_zero(&arena, kind, &motions[i], &doubles, &exact);
            ck_assert(!arena.overflow && exact.touches == chain.touches);
            ck_assert(exact.time_lo <= chain.time_hi && chain.time_lo <= exact.time_hi);
        }
    }
}
END_TEST

START_TEST(symmetries)
{
    rdl_motion motions[COUNT];
    double gaps[COUNT];
    for (int kind = 0; kind < 2; kind++) {
        make(_i, kind, motions, gaps);
        for (int i = 0; i < COUNT; i += motion_families[_i].percent < 10 ? 20 : 6) {
            rdl_touch here, there;
            rdli_find_touch(kind, &motions[i], 0, &here);
            for (int j = 1; j < (kind ? 8 : 6); j++) {
                rdl_motion other = motion_permuted(&motions[i], kind ? edge_orders[j] : point_orders[j]);
                rdli_find_touch(kind, &other, 0, &there);
                ck_assert(here.touches == there.touches);
                ck_assert(here.time_lo <= there.time_hi && there.time_lo <= here.time_hi);
            }
            rdl_motion back = motion_reversed(&motions[i]);
            rdli_find_touch(kind, &back, 0, &there);
            ck_assert(here.touches == there.touches);
            if (here.touches) /* the first time backwards is the last one forwards */
                ck_assert(1 - there.time_lo >= here.time_lo);
        }
    }
}
END_TEST

START_TEST(numbers)
{
    mp_limb_t limbs[512];
    rdli_arena arena = {limbs, 0, 512, false};
    rdli_int a = rdli_int_of_double(&arena, 0x1.8p200, -300), b = rdli_int_of_double(&arena, -0x1p-290, -300);
    rdli_int sum = rdli_int_add(&arena, a, b), product = rdli_int_mul(&arena, a, b);
    ck_assert_int_eq(rdli_int_bits(a), 501);
    ck_assert_int_eq(rdli_int_bits(sum), 501);
    ck_assert(rdli_int_compare(rdli_int_sub(&arena, sum, b), a) == 0 && rdli_int_compare(sum, a) < 0);
    ck_assert(rdli_int_sign(product) < 0 && rdli_int_below(product, -600) == 0x1.8p-90);
    ck_assert(rdli_int_below(sum, -300) < 0x1.8p200 && rdli_int_above(sum, -300) == 0x1.8p200);
    ck_assert(rdli_int_compare(rdli_int_shift(&arena, rdli_int_shift(&arena, a, 77), -77), a) == 0);
    ck_assert(!arena.overflow);
    for (int i = 0; i < 60; i++)
        a = rdli_int_mul(&arena, a, a);
    ck_assert(arena.overflow && arena.used <= arena.room);
    ck_assert_int_eq(rdli_lowest_bit(0x1.8p-1073), -1074);
    ck_assert_int_eq(rdli_lowest_bit(12), 2);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("narrow paths");
    TCase *all = tcase_create("all");
    tcase_set_timeout(all, 120);
    tcase_add_loop_test(all, lanes_give_the_same_bits, 0, motion_family_count);
    tcase_add_loop_test(all, examined_lists_and_singles, 0, motion_family_count);
    tcase_add_loop_test(all, lists_and_singles, 0, motion_family_count);
    tcase_add_loop_test(all, exact_alone, 0, motion_family_count);
    tcase_add_loop_test(all, symmetries, 0, motion_family_count);
    tcase_add_test(all, numbers);
    suite_add_tcase(suite, all);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_NORMAL);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
