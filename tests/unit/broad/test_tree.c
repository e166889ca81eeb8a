/* tests/unit/broad/test_tree.c: rdl_tree_... against brute force, bad input, failing memory. */
#include <check.h>
#include <float.h>
#include <math.h>
#include <pthread.h>

#include "common.h"
#include "driver/boxtree.h"

typedef struct pair_list {
    pthread_mutex_t lock;
    uint32_t (*pairs)[2];
    size_t count, room;
    unsigned threads, busy[RDL_THREADS_MAX];
    bool overlapped;
} pair_list;

static void collect(void *user, unsigned worker, const uint32_t (*pairs)[2], size_t count)
{
    pair_list *list = user;
    pthread_mutex_lock(&list->lock);
    list->overlapped |= count == 0 || worker >= list->threads || list->busy[worker]++ != 0;
    while (list->count + count > list->room) {
        list->room = list->room * 2 + 1024;
        list->pairs = realloc(list->pairs, list->room * sizeof *list->pairs);
    }
    memcpy(list->pairs + list->count, pairs, count * sizeof *pairs);
    list->count += count;
    list->busy[worker]--;
    pthread_mutex_unlock(&list->lock);
}

static pair_list new_list(void)
{
    pair_list list;
    memset(&list, 0, sizeof list);
    list.threads = 1;
    pthread_mutex_init(&list.lock, NULL);
    return list;
}

static void free_list(pair_list *list)
{
    free(list->pairs);
    pthread_mutex_destroy(&list->lock);
}

/* `count` boxes of sizes up to `size` in the unit cube; every seventh is a point, every eleventh repeats its predecessor. */
static rdl_box *random_boxes(size_t count, double size, uint64_t seed)
{
    rdl_box *boxes = malloc((count + 1) * sizeof *boxes);
    for (size_t i = 0; i < count; i++) {
        for (int k = 0; k < 3; k++) {
            boxes[i].lo[k] = (float)draw(&seed);
            boxes[i].hi[k] = i % 7 == 0 ? boxes[i].lo[k] : boxes[i].lo[k] + (float)(size * draw(&seed));
        }
        if (i % 11 == 10)
            boxes[i] = boxes[i - 1];
    }
    return boxes;
}

static bool share(const uint32_t *corners, size_t i, size_t j)
{
    for (int a = 0; a < 4; a++)
        for (int b = 0; b < 4; b++)
            if (corners[4 * i + (size_t)a] == corners[4 * j + (size_t)b])
                return true;
    return false;
}

static pair_list brute_force(const rdl_box *boxes, size_t count, const uint32_t *corners)
{
    pair_list list = new_list();
    for (uint32_t i = 0; i < count; i++)
        for (uint32_t j = i + 1; j < count; j++)
            if (boxes_overlap(&boxes[i], &boxes[j]) && (corners == NULL || !share(corners, i, j)))
                collect(&list, 0, (const uint32_t[1][2]){{i, j}}, 1);
    return list;
}

static void expect_equal(const pair_list *got, const pair_list *want)
{
    ck_assert(!got->overlapped);
    ck_assert_uint_eq(got->count, want->count);
    ck_assert(got->count == 0 || memcmp(got->pairs, want->pairs, got->count * sizeof *got->pairs) == 0);
}

static void check_against(const pair_list *want, const rdl_tree *tree, unsigned threads, const uint32_t *corners)
{
    pair_list got = new_list();
    got.threads = threads;
    ck_assert_int_eq(rdl_tree_self_pairs(tree, corners, collect, &got), RDL_OK);
    if (threads > 1 && got.count > 0)
        qsort(got.pairs, got.count, sizeof *got.pairs, compare_pairs);
    expect_equal(&got, want);
    free_list(&got);
}

static void check_tree(const rdl_tree *tree, unsigned threads, const rdl_box *boxes, size_t count, const uint32_t *corners)
{
    pair_list want = brute_force(boxes, count, corners);
    check_against(&want, tree, threads, corners);
    free_list(&want);
}

START_TEST(test_brute_force)
{
    const size_t counts[] = {0, 1, 2, 7, 8, 9, 63, 64, 65, 511, 513, 2000};
    for (size_t c = 0; c < sizeof counts / sizeof *counts; c++)
        for (unsigned threads = 1; threads <= 4; threads *= 2)
            for (int size = 0; size < 3; size++) {
                rdl_box *boxes = random_boxes(counts[c], (double[]){0.0, 0.05, 0.4}[size], 10 * c + (uint64_t)size);
                rdl_host host = ledger_host(&(ledger){0}, threads);
                rdl_tree *tree;
                ck_assert_int_eq(rdl_tree_create(boxes, counts[c], &host, &tree, NULL), RDL_OK);
                check_tree(tree, threads, boxes, counts[c], NULL);
                uint32_t *corners = malloc((counts[c] + 1) * 4 * sizeof *corners);
                uint64_t seed = c;
                for (size_t i = 0; i < 4 * counts[c]; i++)
                    corners[i] = i % 4 == 3 ? corners[i - 3] : (uint32_t)(draw(&seed) * (double)counts[c]);
                check_tree(tree, threads, boxes, counts[c], corners);
                free(corners);
                rdl_tree_destroy(tree);
                free(boxes);
            }
}
END_TEST

/* Portable code, and so little room that the pairs come in many stretches: the same pairs in the same order. */
START_TEST(test_same_everywhere)
{
    const size_t count = 3000;
    for (int size = 0; size < 3; size++) {
        rdl_box *boxes = random_boxes(count, (double[]){0.03, 0.1, 0.6}[size], (uint64_t)size);
        pair_list want = brute_force(boxes, count, NULL);
        for (unsigned threads = 1; threads <= 4; threads *= 2)
            for (int vector = 0; vector < 2; vector++) {
                rdl_host host = ledger_host(&(ledger){0}, threads);
                rdl_tree *tree;
                ck_assert_int_eq(rdl_tree_create(boxes, count, &host, &tree, NULL), RDL_OK);
                rdli_boxtree_use_vector(tree, vector != 0);
                for (int l = 0; l < 3; l++) {
                    rdli_boxtree_limit(tree, (size_t[]){SIZE_MAX, 5000, 100}[l]);
                    check_against(&want, tree, threads, NULL);
                }
                ck_assert_int_eq(rdl_tree_update(tree, boxes, NULL), RDL_OK);
                check_against(&want, tree, threads, NULL);
                rdl_tree_destroy(tree);
            }
        free_list(&want);
        free(boxes);
    }
}
END_TEST

/* Thousands of boxes in one place: lists and rows grow far beyond their first room. */
START_TEST(test_crowd)
{
    const size_t count = 8000, crowd = 1300;
    rdl_box *boxes = random_boxes(count, 0.0001, 4);
    for (size_t i = 0; i < crowd; i++)
        boxes[i * 6 + 1] = (rdl_box){{0.5f, 0.5f, 0.5f}, {0.5001f, 0.5001f, 0.5001f}};
    boxes[13] = (rdl_box){{0, 0, 0}, {1.1f, 1.1f, 1.1f}};
    for (unsigned threads = 1; threads <= 2; threads++) {
        rdl_host host = ledger_host(&(ledger){0}, threads);
        rdl_tree *tree;
        ck_assert_int_eq(rdl_tree_create(boxes, count, &host, &tree, NULL), RDL_OK);
        check_tree(tree, threads, boxes, count, NULL);
        rdl_tree_destroy(tree);
    }
    free(boxes);
}
END_TEST

/* Exact counts: n^3 cubes of width w, k < w < k + 1, on a unit lattice (METHODS: closed formula). */
START_TEST(test_lattice_counts)
{
    const struct { unsigned n, k; uint64_t pairs; } cases[] = {{10, 1, 10476}, {20, 2, 411292}, {50, 1, 1558396}};
    for (unsigned c = 0; c < 3; c++) {
        unsigned n = cases[c].n;
        float width = (float)cases[c].k + 0.5f;
        rdl_box *boxes = malloc((size_t)n * n * n * sizeof *boxes);
        for (unsigned i = 0; i < n * n * n; i++) {
            const float at[3] = {(float)(i % n), (float)(i / n % n), (float)(i / n / n)};
            for (int k = 0; k < 3; k++) {
                boxes[i].lo[k] = at[k];
                boxes[i].hi[k] = at[k] + width;
            }
        }
        rdl_tree *tree;
        ck_assert_int_eq(rdl_tree_create(boxes, (size_t)n * n * n, NULL, &tree, NULL), RDL_OK);
        pair_list got = new_list();
        got.threads = RDL_THREADS_MAX;
        ck_assert_int_eq(rdl_tree_self_pairs(tree, NULL, collect, &got), RDL_OK);
        ck_assert_uint_eq(got.count, cases[c].pairs);
        ck_assert(!got.overlapped);
        free_list(&got);
        rdl_tree_destroy(tree);
        free(boxes);
    }
}
END_TEST

/* Closed boxes: sharing one corner point counts; a float beside does not. */
START_TEST(test_closed)
{
    const rdl_box boxes[3] = {{{0, 0, 0}, {1, 1, 1}}, {{1, 1, 1}, {2, 2, 2}}, {{nextafterf(2, 3), 0, 0}, {3, 3, 3}}};
    rdl_tree *tree;
    ck_assert_int_eq(rdl_tree_create(boxes, 3, NULL, &tree, NULL), RDL_OK);
    pair_list got = new_list();
    got.threads = RDL_THREADS_MAX;
    ck_assert_int_eq(rdl_tree_self_pairs(tree, NULL, collect, &got), RDL_OK);
    ck_assert_uint_eq(got.count, 1);
    ck_assert_uint_eq(got.pairs[0][0], 0);
    ck_assert_uint_eq(got.pairs[0][1], 1);
    free_list(&got);
    rdl_tree_destroy(tree);
}
END_TEST

/* Slow drift, then a shuffle of all places, then collapse into one point and out to the ends of the float range. */
START_TEST(test_updates)
{
    const size_t count = 1500;
    for (unsigned threads = 1; threads <= 2; threads++) {
        rdl_box *boxes = random_boxes(count, 0.06, 5);
        ledger l = {0};
        rdl_host host = ledger_host(&l, threads);
        rdl_tree *tree;
        uint64_t seed = 99;
        ck_assert_int_eq(rdl_tree_create(boxes, count, &host, &tree, NULL), RDL_OK);
        for (int step = 0; step < 12; step++) {
            for (size_t i = 0; i < count; i++)
                for (int k = 0; k < 3; k++) {
                    float move = (float)(draw(&seed) - 0.5) * (step < 6 ? 0.02f : 2.0f);
                    boxes[i].lo[k] += move;
                    boxes[i].hi[k] += move;
                    if (step == 9)
                        boxes[i].lo[k] = boxes[i].hi[k] = (float)(i % 40);
                    if (step == 10) {
                        boxes[i].lo[k] = i % 3 == 0 ? -FLT_MAX : FLT_MAX;
                        boxes[i].hi[k] = i % 50 == 1 ? -FLT_MAX : FLT_MAX;
                        if (boxes[i].lo[k] > boxes[i].hi[k])
                            boxes[i].lo[k] = -FLT_MAX;
                    }
                    if (step == 11) {
                        boxes[i].lo[k] = (float)draw(&seed);
                        boxes[i].hi[k] = boxes[i].lo[k] + 0.05f;
                    }
                }
            ck_assert_int_eq(rdl_tree_update(tree, boxes, NULL), RDL_OK);
            check_tree(tree, threads, boxes, count, NULL);
        }
        /* Warm calls allocate nothing. */
        size_t calls = l.calls;
        ck_assert_int_eq(rdl_tree_update(tree, boxes, NULL), RDL_OK);
        check_tree(tree, threads, boxes, count, NULL);
        ck_assert_uint_eq(l.calls, calls);
        ck_assert_uint_eq(rdl_tree_bytes(tree), l.live_bytes);
        rdl_tree_destroy(tree);
        ck_assert_uint_eq(l.live, 0);
        ck_assert_uint_eq(l.live_bytes, 0);
        free(boxes);
    }
}
END_TEST

START_TEST(test_bad_input)
{
    const size_t count = 300;
    rdl_box *boxes = random_boxes(count, 0.2, 3), *bad = malloc(count * sizeof *bad);
    rdl_tree *tree = NULL, *none = NULL;
    rdl_fault fault;
    ck_assert_int_eq(rdl_tree_create(boxes, count, NULL, &tree, NULL), RDL_OK);
    for (int c = 0; c < 8; c++) {
        size_t at = (size_t[]){0, 1, 17, 128, 200, 255, 298, 299}[c];
        memcpy(bad, boxes, count * sizeof *bad);
        rdl_status want = c % 4 == 3 ? RDL_BAD_BOX : RDL_NOT_FINITE;
        float *bound = c % 2 == 0 ? &bad[at].lo[c % 3] : &bad[at].hi[c % 3];
        *bound = (float[]){NAN, INFINITY, -INFINITY, bad[at].lo[c % 3] - 1}[c % 4];
        bad[count - 1].lo[0] = c < 7 ? NAN : bad[count - 1].lo[0]; /* a later offender is not named */
        memset(&fault, 0xAA, sizeof fault);
        ck_assert_int_eq(rdl_tree_create(bad, count, NULL, &none, &fault), want);
        ck_assert(none == NULL);
        ck_assert_uint_eq(fault.index, at);
        ck_assert_str_eq(fault.field, "boxes");
        memset(&fault, 0, sizeof fault);
        ck_assert_int_eq(rdl_tree_update(tree, bad, &fault), want);
        ck_assert_uint_eq(fault.index, at);
        check_tree(tree, 2, boxes, count, NULL);
    }
    ck_assert_int_eq(rdl_tree_create(NULL, 1, NULL, &none, &fault), RDL_BAD_ARGUMENT);
    ck_assert_int_eq(rdl_tree_create(boxes, (size_t)1 << 31, NULL, &none, &fault), RDL_TOO_LARGE);
    ck_assert_int_eq(rdl_tree_create(boxes, count, NULL, NULL, &fault), RDL_BAD_ARGUMENT);
    ck_assert_int_eq(rdl_tree_update(NULL, boxes, &fault), RDL_BAD_ARGUMENT);
    ck_assert_int_eq(rdl_tree_update(tree, NULL, &fault), RDL_BAD_ARGUMENT);
    ck_assert_int_eq(rdl_tree_self_pairs(tree, NULL, NULL, NULL), RDL_BAD_ARGUMENT);
    rdl_host host = ledger_host(&(ledger){0}, 1);
    host.release = NULL;
    ck_assert_int_eq(rdl_tree_create(boxes, count, &host, &none, &fault), RDL_BAD_ARGUMENT);
    ck_assert_str_eq(fault.field, "host");
    rdl_tree_destroy(tree);
    rdl_tree_destroy(NULL);
    free(bad);
    free(boxes);
}
END_TEST

static int cancel_now(void *user)
{
    ledger *l = user;
    return l->fail_at == SIZE_MAX; /* the ledger has no use for that number */
}

/* A cancelled search says so, and the tree serves afterwards. */
START_TEST(test_cancel)
{
    const size_t count = 5000;
    rdl_box *boxes = random_boxes(count, 0.1, 21);
    ledger l = {0};
    rdl_host host = ledger_host(&l, 1);
    host.cancel = cancel_now;
    rdl_tree *tree;
    pair_list got = new_list();
    ck_assert_int_eq(rdl_tree_create(boxes, count, &host, &tree, NULL), RDL_OK);
    l.fail_at = SIZE_MAX;
    ck_assert_int_eq(rdl_tree_self_pairs(tree, NULL, collect, &got), RDL_CANCELLED);
    ck_assert_uint_eq(got.count, 0);
    l.fail_at = 0;
    check_tree(tree, 1, boxes, count, NULL);
    rdl_tree_destroy(tree);
    free_list(&got);
    free(boxes);
}
END_TEST

/* What docs/method/broad.md states: 49 bytes a box, and 16 for its row and 6 per pair once pairs were asked for. */
START_TEST(test_bytes)
{
    const size_t count = 100000, fixed = 2000000;
    rdl_box *boxes = random_boxes(count, 0.03, 2);
    const rdl_host host = {.size = sizeof host, .threads = 1};
    rdl_tree *tree;
    pair_list got = new_list();
    ck_assert_int_eq(rdl_tree_create(boxes, count, &host, &tree, NULL), RDL_OK);
    ck_assert_uint_le(rdl_tree_bytes(tree), 49 * count + fixed);
    ck_assert_int_eq(rdl_tree_self_pairs(tree, NULL, collect, &got), RDL_OK);
    ck_assert_uint_le(rdl_tree_bytes(tree), (49 + 16) * count + 6 * got.count + fixed);
    rdl_tree_destroy(tree);
    free_list(&got);
    free(boxes);
}
END_TEST

/* Every allocation fails once: the same status, nothing lost, and the tree serves afterwards. */
START_TEST(test_failing_memory)
{
    const size_t count = 900;
    rdl_box *boxes = random_boxes(count, 0.3, 8);
    bool finished = false;
    for (size_t n = 1; !finished; n++) {
        ledger l = {.fail_at = n};
        rdl_host host = ledger_host(&l, 2);
        rdl_tree *tree = NULL;
        pair_list got = new_list();
        got.threads = 2;
        rdl_status status = rdl_tree_create(boxes, count, &host, &tree, NULL);
        if (status == RDL_OK) {
            status = rdl_tree_self_pairs(tree, NULL, collect, &got);
            finished = status == RDL_OK;
            if (!finished)
                ck_assert_uint_eq(got.count, 0);
            check_tree(tree, 2, boxes, count, NULL);
            ck_assert_int_eq(rdl_tree_update(tree, boxes, NULL), RDL_OK);
        } else {
            ck_assert(tree == NULL);
        }
        if (!finished)
            ck_assert_int_eq(status, RDL_NO_MEMORY);
        rdl_tree_destroy(tree);
        ck_assert_uint_eq(l.live, 0);
        free_list(&got);
        ck_assert_uint_lt(n, 100);
    }
    free(boxes);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("tree");
    TCase *all = tcase_create("tree");
    tcase_set_timeout(all, 60);
    tcase_add_test(all, test_brute_force);
    tcase_add_test(all, test_same_everywhere);
    tcase_add_test(all, test_crowd);
    tcase_add_test(all, test_lattice_counts);
    tcase_add_test(all, test_closed);
    tcase_add_test(all, test_updates);
    tcase_add_test(all, test_bad_input);
    tcase_add_test(all, test_cancel);
    tcase_add_test(all, test_bytes);
    tcase_add_test(all, test_failing_memory);
    suite_add_tcase(suite, all);
    SRunner *runner = srunner_create(suite);
    srunner_set_fork_status(runner, CK_NOFORK);
    srunner_run_all(runner, CK_NORMAL);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? 0 : 1;
}
