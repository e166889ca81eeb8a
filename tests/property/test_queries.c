/* Queries against the exact oracle, family by family. Arguments: "pt" or "ee", then "zero" (gap 0: exact yes and no, times
 * never late, narrow brackets) or "gap" (gap > 0: no miss, no alarm above gap (1 + 1e-6), times never late). */
#include <check.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "families.h"
#include "judge.h"

/* Over 100,000 of each kind in all, at gap 0 and at a gap; a million each with RADDLE_ROUNDS=10. */
enum { ZERO_COUNT = 3650, GAP_COUNT = 1620, BLOCK = 500 };

static int kind;

static void ask_block(judge *j, size_t count, const rdl_motion *motions, const double *gaps)
{
    static rdl_touch touches[BLOCK];
    memset(touches, 0xa5, sizeof touches);
    ck_assert_int_eq(rdl_find_touches(kind, count, motions, gaps, touches, NULL), RDL_OK);
    for (size_t i = 0; i < count; i++)
        judge_answer(j, &motions[i], gaps == NULL ? 0.0 : gaps[i], &touches[i]);
}

static size_t members(const motion_family *family, size_t usual)
{
    size_t count = usual * judge_rounds() * (size_t)family->percent / 100;
    return count > 0 ? count : 1;
}

START_TEST(exact_at_gap_zero)
{
    const motion_family *family = &motion_families[_i];
    static rdl_motion motions[BLOCK];
    random_source source = random_from(1000 + (uint64_t)_i * 2 + (uint64_t)kind);
    judge j;
    judge_init(&j, kind);
    for (size_t left = members(family, ZERO_COUNT), now; left > 0; left -= now) {
        now = left < BLOCK ? left : BLOCK;
        for (size_t i = 0; i < now; i++)
            family->make(&source, kind, &motions[i]);
        ask_block(&j, now, motions, NULL);
    }
    ck_assert_msg(j.faults == 0, "%s", judge_story(&j, family->name));
    judge_clear(&j);
}
END_TEST

/* Gaps in use, a gap that is tiny beside the coordinates, and gaps just beside the least distance of the motion. */
static double choose_gap(random_source *source, const rdl_motion *motion)
{
    static const double beside[8] = {2e-6, -1e-9, 1e-9, 1.01e-6, 0.99e-6, -1e-13, 1e-13, -1e-6};
    double size = motion_size(motion), gap = 0.0;
    unsigned choice = random_below(source, 10);
    if (choice < 8)
        gap = motion_least_distance(kind, motion) / (1.0 + beside[choice]);
    else if (choice == 8)
        gap = 1e-12 * size;
    if (!(gap > 0.0 && gap <= size))
        gap = pow(10.0, random_between(source, -4.0, -1.0)) * size;
    return gap > 0.0 ? gap : 0x1p-1074;
}

START_TEST(sound_at_a_gap)
{
    const motion_family *family = &motion_families[_i];
    static rdl_motion motions[BLOCK];
    static double gaps[BLOCK];
    random_source source = random_from(9000 + (uint64_t)_i * 2 + (uint64_t)kind);
    judge j;
    judge_init(&j, kind);
    size_t percent = family->percent < 10 ? 40u : 1u; /* very wide numbers: fewer still */
    size_t usual = (size_t)family->gap_times * GAP_COUNT / percent;
    for (size_t left = members(family, usual), now; left > 0; left -= now) {
        now = left < BLOCK ? left : BLOCK;
        for (size_t i = 0; i < now; i++) {
            family->make(&source, kind, &motions[i]);
            gaps[i] = choose_gap(&source, &motions[i]);
        }
        ask_block(&j, now, motions, gaps);
    }
    ck_assert_msg(j.faults == 0, "%s", judge_story(&j, family->name));
    judge_clear(&j);
}
END_TEST

int main(int argc, char **argv)
{
    if (argc != 3 || (strcmp(argv[1], "pt") != 0 && strcmp(argv[1], "ee") != 0)) {
        fprintf(stderr, "usage: %s pt|ee zero|gap\n", argv[0]);
        return EXIT_FAILURE;
    }
    kind = strcmp(argv[1], "pt") == 0 ? RDL_POINT_TRIANGLE : RDL_EDGE_EDGE;
    Suite *suite = suite_create(argv[2]);
    TCase *all = tcase_create("families");
    tcase_set_timeout(all, 600.0 * (double)judge_rounds());
    if (strcmp(argv[2], "zero") == 0)
        tcase_add_loop_test(all, exact_at_gap_zero, 0, motion_family_count);
    else
        tcase_add_loop_test(all, sound_at_a_gap, 0, motion_family_count);
    suite_add_tcase(suite, all);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_NORMAL);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
