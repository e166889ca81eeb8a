/* tests/unit/bounds/test_bounds.c: boxes enclose, overlap when they must, and are tight. */
#include <check.h>
#include <float.h>
#include <math.h>

#include "../broad/common.h"
#include "bounds/bounds.h"

static rdli_workers *open_workers(rdli_memory *memory)
{
    const rdl_host host = {.size = sizeof host, .threads = 1};
    rdli_workers *workers = NULL;
    ck_assert_int_eq(rdli_memory_init(memory, NULL), RDL_OK);
    ck_assert_int_eq(rdli_workers_create(memory, &host, &workers), RDL_OK);
    return workers;
}

/* Two vertices on one axis whose distance comes down to the sum of their half-thicknesses: at every size and offset their
 * boxes overlap, and the boxes stay tight. */
START_TEST(test_bounds)
{
    rdli_memory memory;
    rdli_workers *workers = open_workers(&memory);
    uint64_t seed = 4;
    bool fine = true;
    for (int trial = 0; trial < 200000; trial++) {
        double scale = ldexp(1, (int)(draw(&seed) * 260) - 170), half[2] = {draw(&seed) * scale, draw(&seed) * scale};
        double start[2][3] = {{0}}, end[2][3] = {{0}};
        for (int k = 0; k < 3; k++) {
            start[0][k] = end[0][k] = (draw(&seed) - 0.5) * scale * (trial % 3 == 0 ? 1e6 : 1);
            double sum = half[0] + half[1], x = start[0][k] + sum;
            while (x - start[0][k] > sum)
                x = nextafter(x, -INFINITY);
            start[1][k] = end[1][k] = x;
            if (k == trial % 3)
                start[1][k] += scale;
        }
        uint32_t part[2] = {0, 0};
        rdli_mesh mesh = {.vertex_count = 2, .part_count = 1, .vertex_part = part, .vertex_half = half};
        rdli_motion motion = {(const double(*)[3])start, (const double(*)[3])end, NULL};
        rdl_box vertices[2];
        rdli_boxes boxes = {vertices, NULL, NULL};
        rdli_bounds_fill(&mesh, &motion, workers, &boxes);
        fine = fine && boxes_overlap(&vertices[0], &vertices[1]);
        for (int v = 0; v < 2; v++)
            for (int k = 0; k < 3; k++) {
                double lo = fmin(start[v][k], end[v][k]) - half[v], hi = fmax(start[v][k], end[v][k]) + half[v];
                fine = fine && vertices[v].lo[k] <= lo && vertices[v].hi[k] >= hi;
                fine = fine && fabs(vertices[v].lo[k] - lo) <= fabs(lo) * 0x1p-22 + 0x1p-148;
                fine = fine && fabs(vertices[v].hi[k] - hi) <= fabs(hi) * 0x1p-22 + 0x1p-148;
            }
    }
    ck_assert(fine);
    rdli_workers_destroy(&memory, workers);
}
END_TEST

/* Beyond the float range the boxes are clamped and still overlap. */
START_TEST(test_bounds_clamped)
{
    rdli_memory memory;
    rdli_workers *workers = open_workers(&memory);
    double start[4][3] = {{1e300, 1e39, -1e300}, {1e301, 1e40, -DBL_MAX}, {0, 0, 0}, {FLT_MAX, FLT_MAX, -FLT_MAX}};
    double half[4] = {0, DBL_MAX, 1e-300, 0};
    uint32_t part[4] = {0};
    rdli_mesh mesh = {.vertex_count = 4, .part_count = 1, .vertex_part = part, .vertex_half = half};
    rdli_motion motion = {(const double(*)[3])start, (const double(*)[3])start, NULL};
    rdl_box vertices[4];
    rdli_boxes boxes = {vertices, NULL, NULL};
    rdli_bounds_fill(&mesh, &motion, workers, &boxes);
    for (int v = 0; v < 4; v++)
        for (int k = 0; k < 3; k++)
            ck_assert(isfinite(vertices[v].lo[k]) && isfinite(vertices[v].hi[k]) && vertices[v].lo[k] <= vertices[v].hi[k]);
    ck_assert(boxes_overlap(&vertices[0], &vertices[1]));
    ck_assert(boxes_overlap(&vertices[0], &vertices[3]));
    ck_assert(boxes_overlap(&vertices[1], &vertices[2]));
    ck_assert(!boxes_overlap(&vertices[0], &vertices[2]));
    rdli_workers_destroy(&memory, workers);
}
END_TEST
int main(void)
{
    Suite *suite = suite_create("bounds");
    TCase *all = tcase_create("bounds");
    tcase_set_timeout(all, 60);
    tcase_add_test(all, test_bounds);
    tcase_add_test(all, test_bounds_clamped);
    suite_add_tcase(suite, all);
    SRunner *runner = srunner_create(suite);
    srunner_set_fork_status(runner, CK_NOFORK);
    srunner_run_all(runner, CK_NORMAL);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? 0 : 1;
}
