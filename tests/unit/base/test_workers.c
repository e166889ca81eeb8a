/* Workers: each index once, one call at a time per worker number, the host's loop, and the thread limits. */
#include <check.h>
#include <stdatomic.h>
#include <stdlib.h>

#include "base/workers.h"

enum { ITEMS = 5000, ROUNDS = 40 };

typedef struct tally {
    _Atomic unsigned visits[ITEMS];
    _Atomic unsigned inside[RDL_THREADS_MAX];
    unsigned workers;
    _Atomic unsigned faults;
} tally;

static void visit(void *data, size_t index, unsigned worker)
{
    tally *t = data;
    if (worker >= t->workers || atomic_fetch_add(&t->inside[worker], 1) != 0)
        atomic_fetch_add(&t->faults, 1);
    atomic_fetch_add(&t->visits[index], 1);
    if (worker < t->workers)
        atomic_fetch_sub(&t->inside[worker], 1);
}

static void loop_rounds(const rdl_host *host)
{
    rdli_memory memory;
    rdli_workers *workers = NULL;
    ck_assert_int_eq(rdli_memory_init(&memory, host), RDL_OK);
    ck_assert_int_eq(rdli_workers_create(&memory, host, &workers), RDL_OK);
    tally *t = calloc(1, sizeof *t);
    ck_assert_ptr_nonnull(t);
    t->workers = rdli_workers_count(workers);
    size_t expected[ITEMS] = {0};
    for (size_t round = 0; round < ROUNDS; round++) {
        size_t count = round == 0 ? 0 : round < 4 ? round : ITEMS - round;
        rdli_parallel_for(workers, count, visit, t);
        for (size_t i = 0; i < count; i++)
            expected[i]++;
    }
    for (size_t i = 0; i < ITEMS; i++)
        ck_assert_uint_eq(atomic_load(&t->visits[i]), expected[i]);
    ck_assert_uint_eq(atomic_load(&t->faults), 0);
    free(t);
    rdli_workers_destroy(&memory, workers);
    ck_assert_uint_eq(memory.bytes_in_use, 0);
}

START_TEST(each_index_is_visited_once)
{
    for (unsigned threads = 1; threads <= 5; threads++) {
        rdl_host host = {.size = sizeof host, .threads = threads};
        loop_rounds(&host);
    }
    loop_rounds(NULL);
}
END_TEST

static void backwards_loop(void *user, size_t count, rdl_task *task, void *data)
{
    ++*(unsigned *)user;
    while (count-- > 0)
        task(data, count, (unsigned)(count % 3));
}

START_TEST(the_host_may_bring_its_own_loop)
{
    unsigned calls = 0;
    rdl_host host = {.size = sizeof host, .threads = 3, .user = &calls, .parallel_for = backwards_loop};
    loop_rounds(&host);
    ck_assert_uint_gt(calls, 0);
}
END_TEST

START_TEST(the_number_of_workers_is_bounded)
{
    rdli_memory memory;
    ck_assert_int_eq(rdli_memory_init(&memory, NULL), RDL_OK);
    const unsigned wanted[] = {1, 2, 7};
    for (size_t i = 0; i < sizeof wanted / sizeof wanted[0]; i++) {
        rdli_workers *workers = NULL;
        rdl_host host = {.size = sizeof host, .threads = wanted[i]};
        ck_assert_int_eq(rdli_workers_create(&memory, &host, &workers), RDL_OK);
        ck_assert_uint_eq(rdli_workers_count(workers), wanted[i]);
        rdli_workers_destroy(&memory, workers);
    }
    rdli_workers_destroy(&memory, NULL);
}
END_TEST

static int stop_when_set(void *user)
{
    return *(const int *)user;
}

START_TEST(cancel_asks_the_host)
{
    int stop = 0;
    rdli_memory memory;
    rdli_workers *workers = NULL;
    rdl_host host = {.size = sizeof host, .threads = 1, .user = &stop, .cancel = stop_when_set};
    ck_assert_int_eq(rdli_memory_init(&memory, NULL), RDL_OK);
    ck_assert_int_eq(rdli_workers_create(&memory, &host, &workers), RDL_OK);
    ck_assert(!rdli_cancelled(workers));
    stop = 1;
    ck_assert(rdli_cancelled(workers));
    rdli_workers_destroy(&memory, workers);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("workers");
    TCase *group = tcase_create("workers");
    tcase_add_test(group, each_index_is_visited_once);
    tcase_add_test(group, the_host_may_bring_its_own_loop);
    tcase_add_test(group, the_number_of_workers_is_bounded);
    tcase_add_test(group, cancel_asks_the_host);
    suite_add_tcase(suite, group);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_ENV);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
