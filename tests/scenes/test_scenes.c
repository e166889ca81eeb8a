/* Multi-step scenes, each judged after every step without the library. Without arguments all of them run, with one
 * line of results for each, with `--short` the quick ones; `--scene NAME [--verbose] [--float32] [--scale
 * POWER_OF_TWO] [--threads N] [--portable] [--saboteur start|proposed]` plays one; with `--compare` it plays in all
 * the ways that must give the same bits. */
#include <check.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "saboteurs.h"

/* Scenes of a group of tests: those that have a flag, in a short run only the quick ones. */
typedef struct group {
    int index[40], count;
} group;

static group judged, narrow, scaled, again;

static void choose(group *g, unsigned flags, bool quick_only)
{
    g->count = 0;
    for (int i = 0; i < scene_count; i++)
        if ((flags == 0 || (scenes[i].flags & flags) != 0) && (!quick_only || (scenes[i].flags & QUICK) != 0))
            g->index[g->count++] = i;
}

static play_result plain[40]; /* what the judged plays delivered, per scene, for comparison with other ways */
static uint64_t frozen, counted; /* held or rigid vertex-steps of all; the tests run in one process, in order */

START_TEST(plays_well)
{
    const scene *s = &scenes[judged.index[_i]];
    play_options options = play_defaults();
    play_result result;
    play(s, &options, &result);
    play_print(s->name, &result);
    if ((s->flags & PLATES) == 0) {
        frozen += result.held + result.rigid;
        counted += result.vertex_steps;
    }
    play_release(&plain[judged.index[_i]]);
    plain[judged.index[_i]] = result;
    ck_assert_msg(result.faults == 0, "%s: %zu faults, first %s", s->name, result.faults, result.first_fault);
}
END_TEST

START_TEST(little_is_frozen)
{
    printf("held and rigid: %llu of %llu vertex-steps\n", (unsigned long long)frozen, (unsigned long long)counted);
    ck_assert_msg(frozen * 20 <= counted, "held and rigid vertices: %llu of %llu vertex-steps",
                  (unsigned long long)frozen, (unsigned long long)counted);
}
END_TEST

/* Compares two plays bit by bit, the first one scaled; false with a line on stdout where they differ. */
static bool same_track(const char *name, const play_result *a, const play_result *b, double scale, const char *how)
{
    size_t n = a->vertex_count * 3;
    if (a->steps != b->steps) {
        printf("%s, %s: %u steps, not %u\n", name, how, b->steps, a->steps);
        return false;
    }
    for (unsigned s = 0; s < a->steps; s++) {
        if (a->verdict_track[s] != b->verdict_track[s]) {
            printf("%s, %s: another verdict in step %u\n", name, how, s);
            return false;
        }
        for (size_t i = 0; i < n; i++) {
            double x = a->track[s * n + i] * scale, y = b->track[s * n + i];
            if (memcmp(&x, &y, sizeof x) != 0) {
                printf("%s, %s: other bits in step %u at vertex %zu: %.17g, not %.17g\n", name, how, s, i / 3, y, x);
                return false;
            }
        }
    }
    return true;
}

/* One way of playing a scene that must give the bits of the plain way. */
typedef struct way {
    const char *how;
    unsigned threads, flag; /* flag: only scenes that have it; 0: all */
    double vector, scale;
} way;

static const way ways[] = {
    {"2 threads", 2, 0, 1.0, 1.0},
    {"4 threads", 4, 0, 1.0, 1.0},
    {"no vector instructions", 1, 0, 0.0, 1.0},
    {"scale 2^-27", 1, ALSO_SMALL, 1.0, 0x1p-27}, /* DNA */
    {"scale 2^10", 1, ALSO_LARGE, 1.0, 0x1p10},   /* cables */
};

static bool same_bits_in(const scene *s, size_t from, size_t to)
{
    play_options options = play_defaults();
    play_result *base = &plain[s - scenes], other;
    bool same = true;
    options.judged = false;
    if (base->track == NULL)
        play(s, &options, base);
    for (size_t i = from; i < to; i++) {
        if (ways[i].flag != 0 && (s->flags & ways[i].flag) == 0)
            continue;
        options.threads = ways[i].threads;
        options.vector = ways[i].vector;
        options.scale = ways[i].scale;
        play(s, &options, &other);
        same = same_track(s->name, base, &other, ways[i].scale, ways[i].how) && same;
        play_release(&other);
    }
    return same;
}

/* The engine on more threads, and without vector instructions, delivers the same bits. */
START_TEST(same_bits)
{
    const scene *s = &scenes[again.index[_i]];
    ck_assert_msg(same_bits_in(s, 0, 3), "%s: other bits", s->name);
}
END_TEST

/* Lengths times a power of two: the same verdicts and the same bits, multiplied. */
START_TEST(scale_free)
{
    const scene *s = &scenes[scaled.index[_i]];
    ck_assert_msg(same_bits_in(s, 3, 5), "%s: other bits at another scale", s->name);
}
END_TEST

START_TEST(float32_host)
{
    play_options options = play_defaults();
    play_result result;
    const scene *s = &scenes[narrow.index[_i]];
    char name[40];
    options.format = RDL_FLOAT32;
    play(s, &options, &result);
    (void)snprintf(name, sizeof name, "%s/f32", s->name);
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
    bool compare = false;
    int index = -1;
    for (int i = 1; i < argc; i++) {
        const char *value = i + 1 < argc ? argv[i + 1] : "";
        if (strcmp(argv[i], "--verbose") == 0)
            options.verbose = true;
        else if (strcmp(argv[i], "--float32") == 0)
            options.format = RDL_FLOAT32;
        else if (strcmp(argv[i], "--portable") == 0)
            options.vector = 0.0;
        else if (strcmp(argv[i], "--compare") == 0)
            compare = true;
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
    if (compare)
        return same_bits_in(&scenes[index], 0, sizeof ways / sizeof ways[0]) ? EXIT_SUCCESS : EXIT_FAILURE;
    play_result result;
    play(&scenes[index], &options, &result);
    play_print(scenes[index].name, &result);
    play_release(&result);
    return result.faults == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}

int main(int argc, char **argv)
{
    bool quick_only = argc == 2 && strcmp(argv[1], "--short") == 0;
    if (argc > 1 && !quick_only)
        return play_one(argc, argv);
    choose(&judged, 0, quick_only);
    choose(&narrow, ALSO_FLOAT32, quick_only);
    choose(&again, 0, quick_only);
    choose(&scaled, ALSO_SMALL | ALSO_LARGE, quick_only);
    Suite *suite = suite_create("scenes");
    static const char *const names[5] = {"judged", "float32", "bits", "scale", "saboteurs"};
    TCase *cases[5];
    for (int i = 0; i < 5; i++) {
        cases[i] = tcase_create(names[i]); /* CK_RUN_CASE=judged runs one of them */
        suite_add_tcase(suite, cases[i]);
    }
    tcase_add_loop_test(cases[0], plays_well, 0, judged.count);
    tcase_add_test(cases[0], little_is_frozen);
    tcase_add_loop_test(cases[1], float32_host, 0, narrow.count);
    tcase_add_loop_test(cases[2], same_bits, 0, again.count);
    tcase_add_loop_test(cases[3], scale_free, 0, scaled.count);
    tcase_add_test(cases[4], freezing_does_not_pass);
    tcase_add_test(cases[4], ignoring_does_not_pass);
    SRunner *runner = srunner_create(suite);
    srunner_set_fork_status(runner, CK_NOFORK); /* sums over scenes */
    srunner_run_all(runner, CK_NORMAL);
    int failed = srunner_ntests_failed(runner);
    for (int i = 0; i < scene_count; i++)
        play_release(&plain[i]);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
