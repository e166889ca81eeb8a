/* Engines: every n-th allocation refused. The status is always RDL_NO_MEMORY, nothing leaks, outputs stay untouched, and
 * the engine then gives the same bits as one that never lacked memory. A warm step asks for nothing. */
#include <check.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include "little.h"
#include "raddle/engine.h"
#include "raddle/rest.h"
#include "scarce.h"

enum {
    TRIES_MAX = 5000,
    WARM = 16, /* steps after which the sheet lies still, and every array has had its greatest length */
    STEPS = 24
};

static little scene;
static double reference[LITTLE_VERTICES][3];

static void expect_nothing_lent(const scarce *memory)
{
    ck_assert_uint_eq(memory->blocks, 0);
    ck_assert_uint_eq(memory->bytes, 0);
    ck_assert_uint_eq(memory->mismatches, 0);
}

static rdl_engine *engine_with(scarce *memory, unsigned threads)
{
    rdl_engine *engine = NULL;
    rdl_host host = scarce_host(memory, threads);
    rdl_fault fault = {0, ""};
    rdl_status status = rdl_engine_create(&scene.scene, NULL, &host, &engine, &fault);
    ck_assert_msg(status == RDL_OK, "%s: %s %u", rdl_status_text(status), fault.field, (unsigned)fault.index);
    return engine;
}

/* The step with plenty of memory: what every later one must repeat. It has to do something, or it tests nothing. */
static void set_up(void)
{
    scarce memory = {0};
    rdl_report report = {.size = sizeof report};
    little_make(&scene);
    rdl_engine *engine = engine_with(&memory, 1);
    ck_assert_int_eq(rdl_engine_step(engine, &scene.step, &report, NULL), RDL_OK);
    ck_assert_int_eq(report.verdict, RDL_RESOLVED);
    ck_assert_uint_gt(report.zone_count, 0);
    ck_assert_uint_gt(report.contact_count, 5);
    memcpy(reference, scene.delivered, sizeof reference);
    rdl_engine_destroy(engine);
    expect_nothing_lent(&memory);
}

START_TEST(create_survives_every_refusal)
{
    size_t refusals = 0;
    for (size_t n = 1;; n++) {
        ck_assert_uint_lt(n, TRIES_MAX);
        scarce memory = {0};
        rdl_host host = scarce_host(&memory, 2);
        rdl_engine *engine = (rdl_engine *)&memory; /* must stay as it is on an error */
        scarce_arm(&memory, n);
        rdl_status status = rdl_engine_create(&scene.scene, NULL, &host, &engine, NULL);
        if (memory.refused == 0) {
            ck_assert_int_eq(status, RDL_OK);
            rdl_engine_destroy(engine);
            expect_nothing_lent(&memory);
            break;
        }
        refusals++;
        ck_assert_int_eq(status, RDL_NO_MEMORY);
        ck_assert_ptr_eq(engine, &memory);
        expect_nothing_lent(&memory);
    }
    ck_assert_uint_gt(refusals, 3);
}
END_TEST

/* One fresh engine whose n-th allocation of its first step is refused. Returns false when the step needed fewer. */
static int step_is_refused(size_t n, unsigned threads)
{
    scarce memory = {0};
    rdl_report report, blank;
    rdl_engine *engine = engine_with(&memory, threads);
    memset(&report, 0x5a, sizeof report);
    report.size = sizeof report;
    blank = report;
    memset(scene.delivered, 0x5a, sizeof scene.delivered);
    double before[LITTLE_VERTICES][3];
    memcpy(before, scene.delivered, sizeof before);
    scarce_arm(&memory, n);
    rdl_status status = rdl_engine_step(engine, &scene.step, &report, NULL);
    int refused = memory.refused != 0;
    scarce_arm(&memory, 0);
    ck_assert_int_eq(status, refused ? RDL_NO_MEMORY : RDL_OK);
    if (refused) {
        ck_assert_mem_eq(&report, &blank, sizeof report);
        ck_assert_mem_eq(scene.delivered, before, sizeof before);
        ck_assert_int_eq(rdl_engine_step(engine, &scene.step, &report, NULL), RDL_OK);
    }
    ck_assert_int_eq(report.verdict, RDL_RESOLVED);
    ck_assert_mem_eq(scene.delivered, reference, sizeof reference);
    rdl_engine_destroy(engine);
    expect_nothing_lent(&memory);
    return refused;
}

START_TEST(step_survives_every_refusal)
{
    for (unsigned threads = 1; threads <= 2; threads++) {
        size_t n = 1;
        while (step_is_refused(n, threads)) {
            ck_assert_uint_lt(n, TRIES_MAX);
            n++;
        }
        ck_assert_uint_gt(n, 3);
    }
}
END_TEST

START_TEST(safe_fraction_survives_every_refusal)
{
    double expected = -1;
    scarce plenty = {0};
    rdl_engine *engine = engine_with(&plenty, 1);
    ck_assert_int_eq(rdl_engine_safe_fraction(engine, &scene.step, &expected, NULL), RDL_OK);
    ck_assert(expected > 0 && expected < 1);
    rdl_engine_destroy(engine);
    for (size_t n = 1;; n++) {
        ck_assert_uint_lt(n, TRIES_MAX);
        scarce memory = {0};
        double fraction = -7;
        engine = engine_with(&memory, 1);
        scarce_arm(&memory, n);
        rdl_status status = rdl_engine_safe_fraction(engine, &scene.step, &fraction, NULL);
        size_t refused = memory.refused;
        scarce_arm(&memory, 0);
        ck_assert_int_eq(status, refused ? RDL_NO_MEMORY : RDL_OK);
        ck_assert_double_eq(fraction, refused ? -7 : expected);
        ck_assert_int_eq(rdl_engine_safe_fraction(engine, &scene.step, &fraction, NULL), RDL_OK);
        ck_assert_double_eq(fraction, expected);
        rdl_engine_destroy(engine);
        expect_nothing_lent(&memory);
        if (refused == 0)
            break;
    }
}
END_TEST

START_TEST(tangles_survive_every_refusal)
{
    /* The strand put half-way through the sheet: there is something to find. */
    for (uint32_t i = LITTLE_SHEET; i < LITTLE_SHEET + LITTLE_STRAND; i++)
        scene.start[i][2] = i % 2 ? 0.04 : 0.004;
    size_t expected = 0;
    for (size_t n = 0;; n++) {
        ck_assert_uint_lt(n, TRIES_MAX);
        scarce memory = {0};
        rdl_host host = scarce_host(&memory, 1);
        rdl_tangles found = {99, NULL};
        scarce_arm(&memory, n); /* 0 = none, the first time */
        rdl_status status = rdl_find_tangles(&scene.scene, &scene.step.start, 0, &host, &found, NULL);
        if (memory.refused == 0) {
            ck_assert_int_eq(status, RDL_OK);
            if (n == 0)
                expected = found.count;
            ck_assert_uint_gt(found.count, 0);
            ck_assert_uint_eq(found.count, expected);
            rdl_tangles_release(&found, &host);
        } else {
            ck_assert_int_eq(status, RDL_NO_MEMORY);
            ck_assert_uint_eq(found.count, 99);
            ck_assert_ptr_null(found.items);
        }
        expect_nothing_lent(&memory);
        if (n > 0 && memory.refused == 0)
            break;
    }
}
END_TEST

/* The sheet is pressed against the plate again and again, each step from where the last one ended. */
START_TEST(a_warm_step_asks_for_nothing)
{
    for (unsigned threads = 1; threads <= 2; threads++) {
        scarce memory = {0};
        rdl_report report = {.size = sizeof report};
        little_make(&scene);
        rdl_engine *engine = engine_with(&memory, threads);
        for (int step = 0; step < STEPS; step++) {
            scarce_arm(&memory, 0);
            ck_assert_int_eq(rdl_engine_step(engine, &scene.step, &report, NULL), RDL_OK);
            ck_assert_int_eq(report.verdict, RDL_RESOLVED);
            ck_assert_uint_gt(report.contact_count, 5);
            if (step >= WARM)
                ck_assert_uint_eq(memory.calls, 0);
            memcpy(scene.start, scene.delivered, sizeof scene.start);
        }
        ck_assert_uint_eq(rdl_engine_bytes(engine), memory.bytes);
        rdl_engine_destroy(engine);
        expect_nothing_lent(&memory);
    }
}
END_TEST

START_TEST(a_reset_engine_repeats_the_bits)
{
    scarce memory = {0};
    rdl_engine *engine = engine_with(&memory, 1);
    for (int round = 0; round < 3; round++) {
        ck_assert_int_eq(rdl_engine_reset(engine), RDL_OK);
        ck_assert_int_eq(rdl_engine_step(engine, &scene.step, NULL, NULL), RDL_OK);
        ck_assert_mem_eq(scene.delivered, reference, sizeof reference);
    }
    rdl_engine_destroy(engine);
    expect_nothing_lent(&memory);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("alloc engine");
    TCase *group = tcase_create("engine");
    tcase_add_checked_fixture(group, set_up, NULL);
    tcase_add_test(group, create_survives_every_refusal);
    tcase_add_test(group, step_survives_every_refusal);
    tcase_add_test(group, safe_fraction_survives_every_refusal);
    tcase_add_test(group, tangles_survive_every_refusal);
    tcase_set_timeout(group, 60); /* some 250 engines, each with a step */
    suite_add_tcase(suite, group);
    TCase *warm = tcase_create("warm");
    tcase_add_checked_fixture(warm, set_up, NULL);
    tcase_add_test(warm, a_warm_step_asks_for_nothing);
    tcase_add_test(warm, a_reset_engine_repeats_the_bits);
    suite_add_tcase(suite, warm);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_ENV);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
