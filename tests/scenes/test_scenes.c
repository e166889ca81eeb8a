/* Multi-step scenes, each judged after every step without the library. Without arguments all of them run, with one line of
 * results for each; `--scene NAME [--verbose] [--float32] [--scale POWER_OF_TWO] [--threads N] [--portable]
 * [--saboteur start|proposed]` plays one. */
#include <check.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "saboteurs.h"

static uint64_t frozen, counted; /* held or rigid vertex-steps of all; the tests run in one process, in order */

START_TEST(plays_well)
{
    play_options options = play_defaults();
    play_result result;
    play(&scenes[_i], &options, &result);
    play_print(scenes[_i].name, &result);
    if ((scenes[_i].flags & PLATES) == 0) {
        frozen += result.held + result.rigid;
        counted += result.vertex_steps;
    }
    play_release(&result);
    ck_assert_msg(result.faults == 0, "%s: %zu faults, first %s", scenes[_i].name, result.faults, result.first_fault);
}
END_TEST

START_TEST(little_is_frozen)
{
    printf("held and rigid: %llu of %llu vertex-steps\n", (unsigned long long)frozen, (unsigned long long)counted);
    ck_assert_msg(frozen * 20 <= counted, "held and rigid vertices: %llu of %llu vertex-steps",
                  (unsigned long long)frozen, (unsigned long long)counted);
}
END_TEST

static void expect_same_track(const char *name, const play_result *a, const play_result *b, double scale, const char *how)
{
    ck_assert_msg(a->steps == b->steps, "%s, %s: %u steps, not %u", name, how, b->steps, a->steps);
    size_t n = a->vertex_count * 3;
    for (unsigned s = 0; s < a->steps; s++) {
        ck_assert_msg(a->verdict_track[s] == b->verdict_track[s], "%s, %s: another verdict in step %u", name, how, s);
        for (size_t i = 0; i < n; i++) {
            double x = a->track[s * n + i] * scale, y = b->track[s * n + i];
            ck_assert_msg(memcmp(&x, &y, sizeof x) == 0, "%s, %s: other bits in step %u at vertex %zu: %.17g, not %.17g",
                          name, how, s, i / 3, y, x);
        }
    }
}

/* The engine on more threads, and without vector instructions, delivers the same bits. */
START_TEST(same_bits)
{
    static const struct { unsigned threads; double vector; const char *how; } ways[3] = {
        {2, 1.0, "2 threads"}, {4, 1.0, "4 threads"}, {1, 0.0, "no vector instructions"}};
    play_options options = play_defaults();
    play_result base, other;
    options.judged = false;
    play(&scenes[_i], &options, &base);
    for (int way = 0; way < 3; way++) {
        options.threads = ways[way].threads;
        options.vector = ways[way].vector;
        play(&scenes[_i], &options, &other);
        expect_same_track(scenes[_i].name, &base, &other, 1.0, ways[way].how);
        play_release(&other);
    }
    play_release(&base);
}
END_TEST

static void scaled(const scene *s, double scale, const char *how)
{
    play_options options = play_defaults();
    play_result base, other;
    options.judged = false;
    play(s, &options, &base);
    options.scale = scale;
    play(s, &options, &other);
    expect_same_track(s->name, &base, &other, scale, how);
    play_release(&base);
    play_release(&other);
}

/* Lengths times a power of two: the same verdicts and the same bits, multiplied. */
START_TEST(scale_free)
{
    if (scenes[_i].flags & ALSO_SMALL)
        scaled(&scenes[_i], 0x1p-27, "scale 2^-27");
    if (scenes[_i].flags & ALSO_LARGE)
        scaled(&scenes[_i], 0x1p10, "scale 2^10");
}
END_TEST

START_TEST(float32_host)
{
    play_options options = play_defaults();
    play_result result;
    char name[40];
    if ((scenes[_i].flags & ALSO_FLOAT32) == 0)
        return;
    options.format = RDL_FLOAT32;
    play(&scenes[_i], &options, &result);
    (void)snprintf(name, sizeof name, "%s/f32", scenes[_i].name);
    play_print(name, &result);
    play_release(&result);
    ck_assert_msg(result.faults == 0, "%s: %zu faults, first %s", name, result.faults, result.first_fault);
}
END_TEST

static int failed_under(resolver *saboteur, const char *how)
{
    int failed = 0;
    for (int i = 0; i < scene_count; i++) {
        play_options options = play_defaults();
        play_result result;
        options.resolve = saboteur;
        options.until_fault = true;
        play(&scenes[i], &options, &result);
        printf("saboteur %-9s %-14s %s\n", how, scenes[i].name, result.faults > 0 ? result.first_fault : "passes");
        failed += result.faults > 0;
        play_release(&result);
    }
    return failed;
}

START_TEST(freezing_does_not_pass)
{
    ck_assert_int_ge(failed_under(saboteur_start, "start"), 6);
}
END_TEST

START_TEST(ignoring_does_not_pass)
{
    ck_assert_int_ge(failed_under(saboteur_proposed, "proposed"), 8);
}
END_TEST

static int play_one(int argc, char **argv)
{
    play_options options = play_defaults();
    int index = -1;
    for (int i = 1; i < argc; i++) {
        const char *value = i + 1 < argc ? argv[i + 1] : "";
        if (strcmp(argv[i], "--verbose") == 0)
            options.verbose = true;
        else if (strcmp(argv[i], "--float32") == 0)
            options.format = RDL_FLOAT32;
        else if (strcmp(argv[i], "--portable") == 0)
            options.vector = 0.0;
        else if (strcmp(argv[i], "--scale") == 0)
            options.scale = ldexp(1.0, atoi(value));
        else if (strcmp(argv[i], "--threads") == 0)
            options.threads = (unsigned)atoi(value);
        else if (strcmp(argv[i], "--saboteur") == 0)
            options.resolve = strcmp(value, "start") == 0 ? saboteur_start : saboteur_proposed;
        else if (strcmp(argv[i], "--scene") == 0)
            index = scene_find(value);
    }
    if (index < 0) {
        for (int i = 0; i < scene_count; i++)
            fprintf(stderr, "%s\n", scenes[i].name);
        return EXIT_FAILURE;
    }
    play_result result;
    play(&scenes[index], &options, &result);
    play_print(scenes[index].name, &result);
    play_release(&result);
    return result.faults == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}

int main(int argc, char **argv)
{
    if (argc > 1)
        return play_one(argc, argv);
    Suite *suite = suite_create("scenes");
    static const char *const names[5] = {"judged", "float32", "bits", "scale", "saboteurs"};
    TCase *cases[5];
    for (int i = 0; i < 5; i++) {
        cases[i] = tcase_create(names[i]); /* CK_RUN_CASE=judged runs one of them */
        suite_add_tcase(suite, cases[i]);
    }
    tcase_add_loop_test(cases[0], plays_well, 0, scene_count);
    tcase_add_test(cases[0], little_is_frozen);
    tcase_add_loop_test(cases[1], float32_host, 0, scene_count);
    tcase_add_loop_test(cases[2], same_bits, 0, scene_count);
    tcase_add_loop_test(cases[3], scale_free, 0, scene_count);
    tcase_add_test(cases[4], freezing_does_not_pass);
    tcase_add_test(cases[4], ignoring_does_not_pass);
    SRunner *runner = srunner_create(suite);
    srunner_set_fork_status(runner, CK_NOFORK); /* sums over scenes */
    srunner_run_all(runner, CK_NORMAL);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
