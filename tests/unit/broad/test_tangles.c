/* tests/unit/broad/test_tangles.c: tangles at rest against the exact predicate for every couple. */
#include <check.h>
#include <math.h>
#include <stdio.h>

#include "common.h"
#include "raddle/rest.h"

enum { TRIANGLES = 36, SEGMENTS = 20, VERTICES = 3 * TRIANGLES + 2 * SEGMENTS };

/* How coordinates are drawn: whole numbers of a small range give contacts and coplanar couples, steps of one unit in the last
 * place about them give couples that are apart, or pierce, by next to nothing. */
typedef struct drawing {
    double range, scale, offset;
    bool nudged, flat;
} drawing;

static double coordinate(const drawing *d, uint64_t *seed, int k)
{
    double x = floor(draw(seed) * d->range);
    if (d->flat && k == 2)
        x = 1;
    x = (x + d->offset) * d->scale;
    if (d->nudged && draw(seed) < 0.3)
        x = nextafter(x, draw(seed) < 0.5 ? INFINITY : -INFINITY);
    return x;
}

static int compare_tangles(const void *x, const void *y)
{
    const rdl_tangle *a = x, *b = y;
    const int edges = compare_pairs(a->edge, b->edge);
    return edges != 0 ? edges : a->triangle < b->triangle ? -1 : a->triangle > b->triangle;
}

static size_t check_drawing(const drawing *d, uint64_t seed, unsigned threads)
{
    static double x[VERTICES][3], mass[VERTICES];
    static uint32_t part[VERTICES], triangles[TRIANGLES][3], segments[SEGMENTS][2];
    static rdl_tangle want[4 * TRIANGLES * (TRIANGLES + SEGMENTS)];
    const rdl_part parts[2] = {{"sheets", RDL_CLOTH, 0.1, 0}, {"strands", RDL_STRANDS, 0.1, 0}};
    uint32_t edges[3 * TRIANGLES + SEGMENTS][2], edge_count = 0;
    for (uint32_t v = 0; v < VERTICES; v++) {
        part[v] = v >= 3 * TRIANGLES;
        mass[v] = 1;
        for (int k = 0; k < 3; k++)
            x[v][k] = coordinate(d, &seed, k);
    }
    for (uint32_t t = 0; t < TRIANGLES; t++)
        for (uint32_t i = 0; i < 3; i++) {
            triangles[t][i] = 3 * t + i;
            edges[edge_count][0] = 3 * t + (i == 2 ? 0 : i);
            edges[edge_count++][1] = 3 * t + (i == 2 ? 2 : i + 1);
        }
    for (uint32_t s = 0; s < SEGMENTS; s++)
        for (uint32_t i = 0; i < 2; i++)
            segments[s][i] = edges[edge_count + s][i] = 3 * TRIANGLES + 2 * s + i;
    edge_count += SEGMENTS;
    size_t count = 0;
    for (uint32_t e = 0; e < edge_count; e++)
        for (uint32_t t = 0; t < TRIANGLES; t++) {
            if (edges[e][0] / 3 == t && edges[e][1] / 3 == t && e < 3 * TRIANGLES)
                continue;
            double edge[2][3], corner[3][3];
            for (int i = 0; i < 2; i++)
                memcpy(edge[i], x[edges[e][i]], sizeof edge[i]);
            memcpy(corner, x[3 * t], sizeof corner);
            int relation = rdl_edge_against_triangle((const double(*)[3])edge, (const double(*)[3])corner);
            if (relation != RDL_REST_APART)
                want[count++] = (rdl_tangle){{edges[e][0], edges[e][1]}, t, (uint32_t)relation};
        }
    qsort(want, count, sizeof *want, compare_tangles);
    const rdl_scene scene = {.size = sizeof scene, .part_count = 2, .parts = parts, .vertex_count = VERTICES,
                             .vertex_part = part, .mass = mass, .segment_count = SEGMENTS,
                             .segments = (const uint32_t(*)[2])segments, .triangle_count = TRIANGLES,
                             .triangles = (const uint32_t(*)[3])triangles};
    const rdl_view positions = {x, 0, RDL_FLOAT64};
    const rdl_host host = {.size = sizeof host, .threads = threads};
    rdl_tangles got;
    ck_assert_int_eq(rdl_find_tangles(&scene, &positions, 0, &host, &got, NULL), RDL_OK);
    ck_assert_uint_eq(got.count, count);
    if (count > 0)
        ck_assert_mem_eq(got.items, want, count * sizeof *want);
    rdl_tangles_release(&got, &host);
    return count;
}

START_TEST(test_tangles)
{
    const drawing drawings[] = {
        {6, 1, 0, false, false},         {12, 1, 0, false, false},      {8, 1, 0, true, false},
        {12, 1, 0, false, true},         {12, 0.1, 0, true, true},      {8, 0.1, 1e6, true, false},
        {6, 0x1p-1000, 0, false, false}, {8, 0x1p-1070, 0, true, false},{6, 0x1p1000, 0, true, false},
        {8, 1.0 / 3, 0, false, false},   {8, 0x1p-340, 0, true, false}, {8, 0x1p340, 0, true, false},
        {8, 0x1p1020, -4, true, false},
    };
    size_t found = 0;
    for (size_t i = 0; i < sizeof drawings / sizeof *drawings; i++)
        for (uint64_t seed = 0; seed < 2; seed++)
            found += check_drawing(&drawings[i], 100 * i + seed, 1 + (unsigned)seed);
    ck_assert_uint_gt(found, 2000);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("tangles");
    TCase *all = tcase_create("tangles");
    tcase_set_timeout(all, 60);
    tcase_add_test(all, test_tangles);
    suite_add_tcase(suite, all);
    SRunner *runner = srunner_create(suite);
    srunner_set_fork_status(runner, CK_NOFORK);
    srunner_run_all(runner, CK_NORMAL);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? 0 : 1;
}
