/* Trees: every n-th allocation refused. The status is always the same, nothing leaks, outputs and the tree stay as they
 * were, and the tree is usable afterwards. */
#include <check.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include "raddle/tree.h"
#include "scarce.h"

enum { BOXES = 700, PAIRS_MAX = 200000, TRIES_MAX = 1000 };

typedef struct pair_list {
    size_t count;
    uint32_t (*pairs)[2];
} pair_list;

static void collect(void *user, unsigned worker, const uint32_t (*pairs)[2], size_t count)
{
    pair_list *list = user;
    (void)worker;
    ck_assert_uint_le(list->count + count, PAIRS_MAX);
    memcpy(list->pairs + list->count, pairs, count * sizeof pairs[0]);
    list->count += count;
}

/* Boxes on a crooked lattice, moved by `shift` steps. */
static void place(rdl_box boxes[], unsigned shift)
{
    for (unsigned i = 0; i < BOXES; i++)
        for (unsigned k = 0; k < 3; k++) {
            float at = (float)((i * (7 + 6 * k) + shift * (i % (5 + k))) % 101) / 8.0f;
            boxes[i].lo[k] = at;
            boxes[i].hi[k] = at + 1.5f;
        }
}

static pair_list self_pairs(const rdl_tree *tree)
{
    pair_list list = {0, malloc(PAIRS_MAX * sizeof(uint32_t[2]))};
    ck_assert_ptr_nonnull(list.pairs);
    ck_assert_int_eq(rdl_tree_self_pairs(tree, NULL, collect, &list), RDL_OK);
    return list;
}

static void expect_pairs(const rdl_tree *tree, const pair_list *expected)
{
    pair_list found = self_pairs(tree);
    ck_assert_uint_eq(found.count, expected->count);
    ck_assert_mem_eq(found.pairs, expected->pairs, expected->count * sizeof expected->pairs[0]);
    free(found.pairs);
}

START_TEST(create_survives_every_refusal)
{
    static rdl_box boxes[BOXES];
    place(boxes, 0);
    size_t refusals = 0;
    for (size_t n = 1;; n++) {
        ck_assert_uint_lt(n, TRIES_MAX);
        scarce memory = {0};
        rdl_host host = scarce_host(&memory, 1);
        rdl_tree *tree = (rdl_tree *)&memory; /* must stay as it is on an error */
        scarce_arm(&memory, n);
        rdl_status status = rdl_tree_create(boxes, BOXES, &host, &tree, NULL);
        if (memory.refused == 0) {
            ck_assert_int_eq(status, RDL_OK);
            rdl_tree_destroy(tree);
            ck_assert_uint_eq(memory.blocks, 0);
            break;
        }
        refusals++;
        ck_assert_int_eq(status, RDL_NO_MEMORY);
        ck_assert_ptr_eq(tree, &memory);
        ck_assert_uint_eq(memory.blocks, 0);
        ck_assert_uint_eq(memory.bytes, 0);
        ck_assert_uint_eq(memory.mismatches, 0);
    }
    ck_assert_uint_gt(refusals, 0);
}
END_TEST

/* A call that allocates nothing once the tree is warm passes with no refusal at all. */
static void try_update(scarce *memory, rdl_tree *tree, const rdl_box before[], const rdl_box after[],
                       const pair_list *at_before, const pair_list *at_after)
{
    for (size_t n = 1;; n++) {
        ck_assert_uint_lt(n, TRIES_MAX);
        scarce_arm(memory, n);
        rdl_status status = rdl_tree_update(tree, after, NULL);
        size_t refused = memory->refused;
        scarce_arm(memory, 0);
        if (refused == 0) {
            ck_assert_int_eq(status, RDL_OK);
            expect_pairs(tree, at_after);
            ck_assert_int_eq(rdl_tree_update(tree, before, NULL), RDL_OK);
            expect_pairs(tree, at_before);
            return;
        }
        ck_assert_int_eq(status, RDL_NO_MEMORY);
        expect_pairs(tree, at_before);
    }
}

START_TEST(update_and_pairs_survive_every_refusal)
{
    static rdl_box before[BOXES], after[BOXES];
    place(before, 0);
    place(after, 13);
    scarce memory = {0};
    rdl_host host = scarce_host(&memory, 1);
    rdl_tree *tree = NULL, *other = NULL;
    ck_assert_int_eq(rdl_tree_create(before, BOXES, &host, &tree, NULL), RDL_OK);
    ck_assert_int_eq(rdl_tree_create(after, BOXES, &host, &other, NULL), RDL_OK);
    pair_list at_before = self_pairs(tree), at_after = self_pairs(other);
    ck_assert_uint_gt(at_before.count, BOXES);
    ck_assert(at_before.count != at_after.count ||
              memcmp(at_before.pairs, at_after.pairs, at_after.count * sizeof at_after.pairs[0]) != 0);
    rdl_tree_destroy(other);
    try_update(&memory, tree, before, after, &at_before, &at_after);
    rdl_tree_destroy(tree);
    ck_assert_uint_eq(memory.blocks, 0);
    ck_assert_uint_eq(memory.bytes, 0);
    ck_assert_uint_eq(memory.mismatches, 0);
    free(at_before.pairs);
    free(at_after.pairs);
}
END_TEST

/* Counts per worker, so that several threads may emit at once. */
static void count_pairs(void *user, unsigned worker, const uint32_t (*pairs)[2], size_t count)
{
    (void)pairs;
    ((size_t *)user)[worker] += count;
}

static size_t count_all(const rdl_tree *tree, rdl_status *status)
{
    size_t counts[RDL_THREADS_MAX] = {0}, total = 0;
    *status = rdl_tree_self_pairs(tree, NULL, count_pairs, counts);
    for (unsigned worker = 0; worker < RDL_THREADS_MAX; worker++)
        total += counts[worker];
    return total;
}

/* A fresh tree each time, since pairs may keep their room from call to call. */
static void try_pairs(unsigned threads, size_t expected)
{
    static rdl_box boxes[BOXES];
    place(boxes, 0);
    for (size_t n = 1;; n++) {
        ck_assert_uint_lt(n, TRIES_MAX);
        scarce memory = {0};
        rdl_host host = scarce_host(&memory, threads);
        rdl_tree *tree = NULL;
        rdl_status status;
        ck_assert_int_eq(rdl_tree_create(boxes, BOXES, &host, &tree, NULL), RDL_OK);
        scarce_arm(&memory, n);
        size_t found = count_all(tree, &status);
        size_t refused = memory.refused;
        ck_assert_int_eq(status, refused == 0 ? RDL_OK : RDL_NO_MEMORY);
        ck_assert_uint_eq(found, refused == 0 ? expected : 0);
        scarce_arm(&memory, 0);
        ck_assert_uint_eq(count_all(tree, &status), expected);
        ck_assert_int_eq(status, RDL_OK);
        rdl_tree_destroy(tree);
        ck_assert_uint_eq(memory.blocks, 0);
        ck_assert_uint_eq(memory.mismatches, 0);
        if (refused == 0)
            return;
    }
}

START_TEST(self_pairs_survive_every_refusal)
{
    static rdl_box boxes[BOXES];
    rdl_tree *tree = NULL;
    rdl_status status;
    place(boxes, 0);
    ck_assert_int_eq(rdl_tree_create(boxes, BOXES, NULL, &tree, NULL), RDL_OK);
    size_t expected = count_all(tree, &status);
    rdl_tree_destroy(tree);
    ck_assert_uint_gt(expected, BOXES);
    for (unsigned threads = 1; threads <= 3; threads++)
        try_pairs(threads, expected);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("alloc tree");
    TCase *group = tcase_create("tree");
    tcase_add_test(group, create_survives_every_refusal);
    tcase_add_test(group, update_and_pairs_survive_every_refusal);
    tcase_add_test(group, self_pairs_survive_every_refusal);
    suite_add_tcase(suite, group);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_ENV);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
