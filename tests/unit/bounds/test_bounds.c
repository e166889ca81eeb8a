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
        rdli_boxes boxes = {.vertices = vertices};
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
    rdli_boxes boxes = {.vertices = vertices};
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

/* Many vertices that share their motion but for a little, two of which come down to the sum of their half-thicknesses on
 * the way: their boxes overlap, whatever the sizes, and nothing of the common motion is in any box. Where there is none, or a
 * quarter of the vertices moves alone, that changes nothing. */
START_TEST(test_common_motion)
{
    enum { COUNT = 1500 };
    static double start[COUNT][3], end[COUNT][3], half[COUNT];
    static uint32_t part[COUNT];
    static rdl_box vertices[COUNT];
    rdli_memory memory;
    rdli_workers *workers = open_workers(&memory);
    uint64_t seed = 21;
    for (int trial = 0; trial < 300; trial++) {
        const double scale = ldexp(1, (int)(draw(&seed) * 180) - 90), common = scale * ldexp(1, (int)(draw(&seed) * 12)) * (draw(&seed) - 0.5);
        const double offset = trial % 3 == 0 ? 1e7 * scale : 0;
        const bool alone = trial % 2 == 0;
        for (int v = 0; v < COUNT; v++) {
            half[v] = 0.01 * draw(&seed) * scale;
            for (int k = 0; k < 3; k++) {
                start[v][k] = scale * draw(&seed) + offset;
                end[v][k] = start[v][k] + 1e-3 * scale * (draw(&seed) - 0.5) + (alone && v % 4 == 0 ? 0 : (k + 1) * common);
            }
        }
        /* Vertex 2 ends beside vertex 1 on axis 0, apart by the sum or a little less, and nowhere further away on the others. */
        for (int k = 0; k < 3; k++)
            end[2][k] = end[1][k];
        end[2][0] = end[1][0] + (half[1] + half[2]);
        while (end[2][0] - end[1][0] > half[1] + half[2])
            end[2][0] = nextafter(end[2][0], -INFINITY);
        rdli_mesh mesh = {.vertex_count = COUNT, .part_count = 1, .vertex_part = part, .vertex_half = half};
        rdli_motion motion = {(const double(*)[3])start, (const double(*)[3])end, NULL};
        rdli_boxes boxes = {.vertices = vertices};
        rdli_bounds_fill(&mesh, &motion, workers, &boxes);
        ck_assert(boxes_overlap(&vertices[1], &vertices[2]));
        if (fabs(common) < 0.1 * scale)
            continue;
        for (int k = 0; k < 3; k++)
            ck_assert(fabs(boxes.shift[k] - (k + 1) * common) < 2e-3 * scale + fabs(offset) * 1e-15);
        for (int v = 3; v < COUNT; v++)
            for (int k = 0; k < 3; k++) {
                const double size = (double)vertices[v].hi[k] - (double)vertices[v].lo[k];
                const double want = alone && v % 4 == 0 ? (k + 1) * fabs(common) : 0;
                ck_assert(fabs(size - want - 2 * half[v]) < 3e-3 * scale + offset * 0x1p-20 + want * 0x1p-20);
            }
    }
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
    tcase_add_test(all, test_common_motion);
    suite_add_tcase(suite, all);
    SRunner *runner = srunner_create(suite);
    srunner_set_fork_status(runner, CK_NOFORK);
    srunner_run_all(runner, CK_NORMAL);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? 0 : 1;
}
