/* rdl_tree through its public header: pair sets against brute force, exact lattice counts, motion, threads, errors. */
#include <check.h>
#include <math.h>
#include <stdbool.h>
#include <stdlib.h>
#include <string.h>

#include "raddle/tree.h"
#include "random.h"

typedef uint32_t pair[2];

/* Pairs as emitted, one list per worker. */
typedef struct basket {
    size_t count, room;
    pair *items;
} basket;

enum { WORKERS = 8 };

static void gather(void *user, unsigned worker, const uint32_t (*pairs)[2], size_t count)
{
    basket *b = (basket *)user + worker;
    if (count == 0)
        return;
    if (b->count + count > b->room) {
        b->room = 2 * (b->count + count);
        b->items = realloc(b->items, b->room * sizeof *b->items);
        if (b->items == NULL)
            exit(EXIT_FAILURE);
    }
    memcpy(b->items + b->count, pairs, count * sizeof *pairs);
    b->count += count;
}

static int compare_pairs(const void *a, const void *b)
{
    const uint32_t *p = a, *q = b;
    if (p[0] != q[0])
        return p[0] < q[0] ? -1 : 1;
    return p[1] < q[1] ? -1 : p[1] > q[1];
}

/* All pairs of the tree in one sorted list, with the number of threads given; sorted reports whether they came so. */
static basket tree_pairs(const rdl_tree *tree, const uint32_t *corners, bool *came_sorted)
{
    basket parts[WORKERS], all = {0, 0, NULL};
    memset(parts, 0, sizeof parts);
    ck_assert_int_eq(rdl_tree_self_pairs(tree, corners, gather, parts), RDL_OK);
    for (int w = 0; w < WORKERS; w++) {
        gather(&all, 0, (const uint32_t(*)[2])parts[w].items, parts[w].count);
        free(parts[w].items);
    }
    *came_sorted = true;
    for (size_t i = 1; i < all.count; i++)
        if (compare_pairs(all.items[i - 1], all.items[i]) >= 0)
            *came_sorted = false;
    if (all.count > 0)
        qsort(all.items, all.count, sizeof *all.items, compare_pairs);
    return all;
}

static bool overlap(const rdl_box *a, const rdl_box *b)
{
    for (int k = 0; k < 3; k++)
        if (a->lo[k] > b->hi[k] || b->lo[k] > a->hi[k])
            return false;
    return true;
}

static bool share_corner(const uint32_t *corners, uint32_t a, uint32_t b)
{
    for (int i = 0; i < 4; i++)
        for (int j = 0; j < 4; j++)
            if (corners[4 * a + (uint32_t)i] == corners[4 * b + (uint32_t)j])
                return true;
    return false;
}

static basket brute_pairs(const rdl_box *boxes, uint32_t count, const uint32_t *corners)
{
    basket all = {0, 0, NULL};
    for (uint32_t i = 0; i < count; i++)
        for (uint32_t j = i + 1; j < count; j++)
            if (overlap(&boxes[i], &boxes[j]) && !(corners != NULL && share_corner(corners, i, j))) {
                pair p = {i, j};
                gather(&all, 0, (const uint32_t(*)[2]) & p, 1);
            }
    return all;
}

static void expect_pairs(const rdl_tree *tree, const rdl_box *boxes, uint32_t count, const uint32_t *corners)
{
    bool sorted;
    basket got = tree_pairs(tree, corners, &sorted), want = brute_pairs(boxes, count, corners);
    ck_assert_uint_eq(got.count, want.count);
    ck_assert(want.count == 0 || memcmp(got.items, want.items, want.count * sizeof(pair)) == 0);
    free(got.items);
    free(want.items);
}

static rdl_tree *build(const rdl_box *boxes, size_t count, const rdl_host *host)
{
    rdl_tree *tree = NULL;
    rdl_fault fault;
    ck_assert_int_eq(rdl_tree_create(boxes, count, host, &tree, &fault), RDL_OK);
    ck_assert_ptr_nonnull(tree);
    return tree;
}

static const rdl_host one_thread = {.size = sizeof(rdl_host), .threads = 1};

/* ---- scenes ---- */

typedef struct box_scene {
    uint32_t count;
    rdl_box boxes[4096];
    uint32_t corners[4 * 4096];
} box_scene;

static box_scene scene;

static void add_box(const float at[3], const float half[3], const uint32_t corners[4])
{
    rdl_box *b = &scene.boxes[scene.count];
    for (int k = 0; k < 3; k++) {
        b->lo[k] = at[k] - half[k];
        b->hi[k] = at[k] + half[k];
    }
    memcpy(&scene.corners[4 * scene.count++], corners, 4 * sizeof *corners);
}

static float real(random_source *source, double lo, double hi)
{
    return (float)random_between(source, lo, hi);
}

/* Boxes of very different size in a cube; corners at random, so that many share one. */
static void scatter(uint64_t seed, uint32_t count)
{
    random_source source = random_from(seed);
    scene.count = 0;
    for (uint32_t i = 0; i < count; i++) {
        float at[3], half[3], size = (float)pow(10.0, random_between(&source, -4, -0.7));
        uint32_t corners[4];
        for (int k = 0; k < 3; k++) {
            at[k] = real(&source, -1, 1);
            half[k] = random_below(&source, 8) == 0 ? 0.0f : size * real(&source, 0.1, 1);
        }
        for (int c = 0; c < 4; c++)
            corners[c] = c < 3 ? random_below(&source, 3 * count) : corners[0];
        add_box(at, half, corners);
    }
}

/* Triangles of a folded sheet: boxes of n x n cells, two each. */
static void sheet(uint64_t seed, uint32_t n)
{
    random_source source = random_from(seed);
    scene.count = 0;
    for (uint32_t i = 0; i < n; i++)
        for (uint32_t j = 0; j < 2 * n; j++) {
            uint32_t cell = i * (n + 1) + j / 2;
            float u = (float)i, v = (float)(j / 2), fold = (float)(n / 3);
            float at[3] = {u < fold ? u : 2 * fold - u, v, 0.3f * sinf(0.7f * v) + (u < fold ? 0.0f : 0.4f)};
            float half[3] = {0.5f + real(&source, 0, 0.1), 0.5f, real(&source, 0, 0.3)};
            uint32_t corners[4] = {cell + j % 2, cell + n + 1, j % 2 ? cell + n + 2 : cell + 1, cell + j % 2};
            add_box(at, half, corners);
        }
}

/* Long thin boxes along one axis, as of strands. */
static void strands(uint64_t seed, uint32_t count)
{
    random_source source = random_from(seed);
    scene.count = 0;
    for (uint32_t i = 0; i < count; i++) {
        float at[3] = {real(&source, 0, 1), real(&source, 0, 1), real(&source, 0, 20)}, half[3] = {0.01f, 0.01f, 0.5f};
        uint32_t corners[4] = {i, i + 1, i, i};
        add_box(at, half, corners);
    }
}

/* Everything in the same place: every pair overlaps. */
static void heap(uint32_t count)
{
    scene.count = 0;
    for (uint32_t i = 0; i < count; i++) {
        float at[3] = {1, 2, 3}, half[3] = {0.5f, 0, 0.5f};
        uint32_t corners[4] = {i, i, i, i};
        add_box(at, half, corners);
    }
}

/* Points that coincide and boxes that only touch: boxes are closed. */
static void integer_points(uint64_t seed, uint32_t count)
{
    random_source source = random_from(seed);
    scene.count = 0;
    for (uint32_t i = 0; i < count; i++) {
        float at[3], half[3];
        uint32_t corners[4] = {i, i, i, i};
        for (int k = 0; k < 3; k++) {
            at[k] = (float)random_grid(&source, 4);
            half[k] = 0.5f * (float)random_below(&source, 3);
        }
        add_box(at, half, corners);
    }
}

static void make_scene(int which, uint64_t seed)
{
    switch (which) {
    case 0:
        scatter(seed, 2000);
        break;
    case 1:
        sheet(seed, 30);
        break;
    case 2:
        strands(seed, 2500);
        break;
    case 3:
        heap(300);
        break;
    case 4:
        integer_points(seed, 800);
        break;
    default:
        scatter(seed, (uint32_t)which - 5); /* 0, 1, 2, 3, 4, ... boxes */
    }
}

enum { SCENES = 5 + 20 };

START_TEST(pairs_equal_brute_force)
{
    make_scene(_i, 42);
    rdl_tree *tree = build(scene.boxes, scene.count, NULL);
    expect_pairs(tree, scene.boxes, scene.count, NULL);
    expect_pairs(tree, scene.boxes, scene.count, scene.corners);
    rdl_tree_destroy(tree);
}
END_TEST

START_TEST(pairs_after_motion)
{
    make_scene(_i, 43);
    random_source source = random_from(7);
    rdl_tree *tree = build(scene.boxes, scene.count, NULL);
    for (int step = 0; step < 6; step++) {
        double far = step < 4 ? 0.02 : 3.0; /* a little, so that a refit serves; then far */
        for (uint32_t i = 0; i < scene.count; i++)
            for (int k = 0; k < 3; k++) {
                float move = real(&source, -far, far), grow = real(&source, 0, 0.01);
                scene.boxes[i].lo[k] += move;
                scene.boxes[i].hi[k] += move + grow;
            }
        ck_assert_int_eq(rdl_tree_update(tree, scene.boxes, NULL), RDL_OK);
        expect_pairs(tree, scene.boxes, scene.count, scene.corners);
    }
    rdl_tree_destroy(tree);
}
END_TEST

START_TEST(one_thread_emits_in_order)
{
    make_scene(_i, 44);
    rdl_tree *tree = build(scene.boxes, scene.count, &one_thread);
    bool sorted;
    basket got = tree_pairs(tree, scene.corners, &sorted);
    ck_assert(sorted);
    free(got.items);
    rdl_tree_destroy(tree);
}
END_TEST

START_TEST(threads_change_nothing)
{
    make_scene(_i, 45);
    basket first = {0, 0, NULL};
    for (unsigned threads = 1; threads <= 4; threads *= 2) {
        rdl_host host = {.size = sizeof host, .threads = threads};
        rdl_tree *tree = build(scene.boxes, scene.count, &host);
        bool sorted;
        basket got = tree_pairs(tree, scene.corners, &sorted);
        if (threads == 1) {
            first = got;
        } else {
            ck_assert_uint_eq(got.count, first.count);
            ck_assert(got.count == 0 || memcmp(got.items, first.items, got.count * sizeof(pair)) == 0);
            free(got.items);
        }
        rdl_tree_destroy(tree);
    }
    free(first.items);
}
END_TEST

/* ---- lattices: n^3 cubes of width w, k < w < k + 1: ((n + 2 sum_{d=1..k} (n - d))^3 - n^3) / 2 pairs ---- */

static void count_only(void *user, unsigned worker, const uint32_t (*pairs)[2], size_t count)
{
    (void)pairs;
    ((size_t *)user)[worker] += count;
}

static void expect_lattice(uint32_t n, float width, size_t expected)
{
    rdl_box *boxes = malloc(n * n * n * sizeof *boxes);
    ck_assert_ptr_nonnull(boxes);
    size_t counts[RDL_THREADS_MAX] = {0}, sum = 0;
    for (uint32_t i = 0; i < n * n * n; i++) {
        uint32_t at[3] = {i % n, i / n % n, i / n / n};
        for (int k = 0; k < 3; k++) {
            boxes[i].lo[k] = (float)at[k];
            boxes[i].hi[k] = (float)at[k] + width;
        }
    }
    rdl_tree *tree = build(boxes, n * n * n, NULL);
    ck_assert_int_eq(rdl_tree_self_pairs(tree, NULL, count_only, counts), RDL_OK);
    for (unsigned w = 0; w < RDL_THREADS_MAX; w++)
        sum += counts[w];
    ck_assert_uint_eq(sum, expected);
    ck_assert_uint_gt(rdl_tree_bytes(tree), 0);
    rdl_tree_destroy(tree);
    free(boxes);
}

START_TEST(lattice_counts)
{
    expect_lattice(10, 1.5f, 10476);
    expect_lattice(50, 1.5f, 1558396);
    expect_lattice(20, 2.5f, 411292);
    expect_lattice(10, 0.5f, 0);
    expect_lattice(10, 1.0f, 10476); /* closed boxes: touching counts */
}
END_TEST

/* ---- errors ---- */

static void spoil(rdl_box *box, int how)
{
    static const float bad[3] = {NAN, INFINITY, -INFINITY};
    if (how < 18) {
        float *place = how % 6 < 3 ? &box->lo[how % 3] : &box->hi[how % 3];
        *place = bad[how / 6];
    } else {
        box->lo[how - 18] = nextafterf(box->hi[how - 18], INFINITY);
    }
}

START_TEST(bad_boxes_are_named)
{
    for (int how = 0; how < 21; how++) {
        scatter(46, 100);
        rdl_tree *tree = NULL;
        rdl_fault fault;
        spoil(&scene.boxes[70], how);
        spoil(&scene.boxes[63], how);
        ck_assert_int_eq(rdl_tree_create(scene.boxes, scene.count, NULL, &tree, &fault),
                         how < 18 ? RDL_NOT_FINITE : RDL_BAD_BOX);
        ck_assert_ptr_null(tree);
        ck_assert_str_eq(fault.field, "boxes");
        ck_assert_uint_eq(fault.index, 63);
    }
}
END_TEST

START_TEST(refused_update_leaves_the_tree)
{
    for (int how = 0; how < 21; how++) {
        scatter(47, 400);
        static rdl_box moved[400];
        rdl_fault fault;
        memcpy(moved, scene.boxes, sizeof moved);
        rdl_tree *tree = build(scene.boxes, scene.count, NULL);
        for (int i = 0; i < 400; i++)
            moved[i].hi[0] += 0.5f;
        spoil(&moved[399], how);
        ck_assert_int_eq(rdl_tree_update(tree, moved, &fault), how < 18 ? RDL_NOT_FINITE : RDL_BAD_BOX);
        ck_assert_str_eq(fault.field, "boxes");
        ck_assert_uint_eq(fault.index, 399);
        expect_pairs(tree, scene.boxes, scene.count, scene.corners);
        rdl_tree_destroy(tree);
    }
}
END_TEST

START_TEST(no_boxes_at_all)
{
    rdl_tree *tree = build(NULL, 0, NULL);
    size_t counts[RDL_THREADS_MAX] = {0};
    ck_assert_int_eq(rdl_tree_update(tree, NULL, NULL), RDL_OK);
    ck_assert_int_eq(rdl_tree_self_pairs(tree, NULL, count_only, counts), RDL_OK);
    for (unsigned w = 0; w < RDL_THREADS_MAX; w++)
        ck_assert_uint_eq(counts[w], 0);
    rdl_tree_destroy(tree);
    rdl_tree_destroy(NULL);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("tree");
    TCase *all = tcase_create("tree");
    tcase_set_timeout(all, 240);
    tcase_add_loop_test(all, pairs_equal_brute_force, 0, SCENES);
    tcase_add_loop_test(all, pairs_after_motion, 0, SCENES);
    tcase_add_loop_test(all, one_thread_emits_in_order, 0, 6);
    tcase_add_loop_test(all, threads_change_nothing, 0, 6);
    tcase_add_test(all, lattice_counts);
    tcase_add_test(all, bad_boxes_are_named);
    tcase_add_test(all, refused_update_leaves_the_tree);
    tcase_add_test(all, no_boxes_at_all);
    suite_add_tcase(suite, all);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_NORMAL);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
