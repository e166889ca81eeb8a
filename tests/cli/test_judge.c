/* The judge of `raddle check` against brute force: random small scenes, every pair of elements asked one by one. */
#include <check.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "judge.h"

enum { SEGMENTS = 12, TRIANGLES = 14, VERTICES = 2 * SEGMENTS + TRIANGLES + 2, EDGES_MAX = SEGMENTS + 3 * TRIANGLES };

typedef struct world {
    rdl_part parts[3];
    uint32_t part[VERTICES], segments[SEGMENTS][2], triangles[TRIANGLES][3], muted[1][2], attachments[3][2];
    double mass[VERTICES], from[VERTICES][3], to[VERTICES][3];
    rdl_scene scene;
} world;

/* xorshift of 64 bits [Marsaglia 2003]: the same numbers on every machine. */
static uint64_t next(uint64_t *seed)
{
    *seed ^= *seed << 13;
    *seed ^= *seed >> 7;
    *seed ^= *seed << 17;
    return *seed;
}

/* Multiples of 1/8 in [0, 2): coarse, so that exact contacts and coplanar elements are common. */
static double coordinate(uint64_t *seed)
{
    return (double)(next(seed) % 16) / 8;
}

/* Loose segments; triangles in a strip of which the second half is a driven body. */
static void make_world(world *w, uint64_t seed)
{
    memset(w, 0, sizeof *w);
    const rdl_part parts[3] = {{"a", RDL_STRANDS, 0.01, 0}, {"b", RDL_CLOTH, 0.01, 0}, {"c", RDL_BODY, 0.01, 0}};
    memcpy(w->parts, parts, sizeof parts);
    for (uint32_t s = 0; s < SEGMENTS; s++) {
        w->segments[s][0] = 2 * s;
        w->segments[s][1] = 2 * s + 1;
    }
    for (uint32_t v = 0; v < VERTICES; v++) {
        bool strand = v < 2 * SEGMENTS, cloth = v < 2 * SEGMENTS + TRIANGLES / 2 + 1;
        w->part[v] = strand ? 0 : cloth ? 1 : 2;
        w->mass[v] = strand || cloth ? 1 : (double)INFINITY;
        bool still = next(&seed) % 4 == 0;
        for (size_t c = 0; c < 3; c++) {
            w->from[v][c] = coordinate(&seed);
            w->to[v][c] = still ? w->from[v][c] : coordinate(&seed);
        }
    }
    uint32_t count = 0;
    for (uint32_t v = 2 * SEGMENTS; v + 2 < VERTICES; v++)
        if (w->part[v] == w->part[v + 2]) {
            const uint32_t corners[3] = {v, v + 1, v + 2};
            memcpy(w->triangles[count++], corners, sizeof corners);
        }
    for (size_t k = 0; k < 3; k++) {
        w->attachments[k][0] = (uint32_t)(next(&seed) % (2 * SEGMENTS));
        w->attachments[k][1] = 2 * SEGMENTS + (uint32_t)(next(&seed) % TRIANGLES);
    }
    w->muted[0][0] = (uint32_t)(next(&seed) % 3);
    w->muted[0][1] = (uint32_t)(next(&seed) % 3);
    w->scene = (rdl_scene){.size = sizeof w->scene,
                           .part_count = 3,
                           .parts = w->parts,
                           .vertex_count = VERTICES,
                           .vertex_part = w->part,
                           .mass = w->mass,
                           .segment_count = SEGMENTS,
                           .segments = (const uint32_t(*)[2])w->segments,
                           .triangle_count = count,
                           .triangles = (const uint32_t(*)[3])w->triangles,
                           .muted_count = seed % 3 == 0,
                           .muted_parts = (const uint32_t(*)[2])w->muted,
                           .attachment_count = seed % 2 == 0 ? 3 : 0,
                           .attachments = (const uint32_t(*)[2])w->attachments};
}

/* Whether two elements, given by their vertices, are to be judged at all; driven: neither can move. */
static bool may_meet(const world *w, const uint32_t *a, size_t a_count, const uint32_t *b, size_t b_count, bool *driven)
{
    *driven = true;
    for (size_t i = 0; i < a_count; i++)
        *driven = *driven && isinf(w->mass[a[i]]);
    for (size_t k = 0; k < b_count; k++)
        *driven = *driven && isinf(w->mass[b[k]]);
    for (size_t i = 0; i < a_count; i++)
        for (size_t k = 0; k < b_count; k++) {
            if (a[i] == b[k])
                return false;
            for (size_t n = 0; n < w->scene.attachment_count; n++) {
                const uint32_t *pair = w->attachments[n];
                if ((pair[0] == a[i] && pair[1] == b[k]) || (pair[1] == a[i] && pair[0] == b[k]))
                    return false;
            }
        }
    uint32_t p = w->part[a[0]], q = w->part[b[0]];
    bool muted = w->scene.muted_count > 0 &&
                 ((w->muted[0][0] == p && w->muted[0][1] == q) || (w->muted[0][0] == q && w->muted[0][1] == p));
    return !muted;
}

static void ask(const world *w, int kind, const uint32_t *a, size_t a_count, const uint32_t *b, judge_counts *counts)
{
    rdl_motion motion;
    rdl_touch touch;
    bool driven = false;
    if (!may_meet(w, a, a_count, b, 4 - a_count, &driven))
        return;
    for (size_t i = 0; i < 4; i++) {
        uint32_t v = i < a_count ? a[i] : b[i - a_count];
        memcpy(motion.start[i], w->from[v], sizeof motion.start[i]);
        memcpy(motion.end[i], w->to[v], sizeof motion.end[i]);
    }
    ck_assert_int_eq(rdl_find_touches(kind, 1, &motion, NULL, &touch, NULL), RDL_OK);
    if (touch.touches && touch.time_hi == 0)
        counts->contacts++;
    else if (touch.touches && driven)
        counts->driven_crossings++;
    else if (touch.touches)
        counts->crossings++;
}

static void ask_rest(const world *w, const uint32_t *a, const uint32_t *b, judge_counts *counts)
{
    double ends[2][3], corners[3][3];
    bool driven = false;
    if (!may_meet(w, a, 2, b, 3, &driven))
        return;
    for (size_t i = 0; i < 3; i++) {
        memcpy(corners[i], w->to[b[i]], sizeof corners[i]);
        memcpy(ends[i % 2], w->to[a[i % 2]], sizeof ends[0]);
    }
    if (rdl_edge_against_triangle((const double(*)[3])ends, (const double(*)[3])corners) != RDL_REST_PIERCE)
        return;
    counts->tangles += !driven;
    counts->driven_tangles += driven;
}

static void count_by_force(const world *w, const uint32_t (*edges)[2], size_t edge_count, judge_counts *counts)
{
    for (size_t t = 0; t < w->scene.triangle_count; t++) {
        for (uint32_t v = 0; v < VERTICES; v++)
            ask(w, RDL_POINT_TRIANGLE, &v, 1, w->triangles[t], counts);
        for (size_t e = 0; e < edge_count; e++)
            ask_rest(w, edges[e], w->triangles[t], counts);
    }
    for (size_t e = 0; e < edge_count; e++)
        for (size_t f = e + 1; f < edge_count; f++)
            ask(w, RDL_EDGE_EDGE, edges[e], 2, edges[f], counts);
}

static void expect_counts(const judge_counts *got, const judge_counts *wanted)
{
    ck_assert_uint_eq(got->tangles, wanted->tangles);
    ck_assert_uint_eq(got->crossings, wanted->crossings);
    ck_assert_uint_eq(got->driven_tangles, wanted->driven_tangles);
    ck_assert_uint_eq(got->driven_crossings, wanted->driven_crossings);
    ck_assert_uint_eq(got->contacts, wanted->contacts);
}

START_TEST(judge_counts_what_brute_force_counts)
{
    uint64_t seen = 0;
    for (uint64_t seed = 1; seed <= 40; seed++) {
        static world w;
        judge *j = NULL;
        judge_counts counts, wanted = {0};
        const judge_finding *findings = NULL;
        size_t finding_count = 0, edge_count = 0;
        rdl_fault fault;
        make_world(&w, seed * 0x9e3779b97f4a7c15u);
        ck_assert_int_eq(judge_create(&w.scene, 1 + (unsigned)(seed % 4), true, &j), RDL_OK);
        const uint32_t(*edges)[2] = judge_edges(j, &edge_count);
        ck_assert_uint_le(edge_count, EDGES_MAX);
        count_by_force(&w, edges, edge_count, &wanted);
        for (int again = 0; again < 2; again++) {
            ck_assert_int_eq(judge_piece(j, w.from[0], w.to[0], true, true, SIZE_MAX / 4, &counts, &findings,
                                         &finding_count, &fault),
                             RDL_OK);
            expect_counts(&counts, &wanted);
            ck_assert_uint_eq(finding_count,
                              counts.tangles + counts.crossings + counts.driven_tangles + counts.driven_crossings);
        }
        seen += counts.tangles + counts.crossings;
        judge_destroy(j);
    }
    ck_assert_uint_gt(seen, 1000);
}
END_TEST

/* The first few are the same whether few or all are asked for, at any number of threads. */
START_TEST(listed_findings_are_the_first)
{
    static world w;
    static judge_finding all[20000];
    size_t all_count = 0;
    make_world(&w, 77);
    for (unsigned threads = 1; threads <= 4; threads++) {
        judge *j = NULL;
        judge_counts counts;
        const judge_finding *findings = NULL;
        size_t count = 0, edge_count = 0;
        rdl_fault fault;
        ck_assert_int_eq(judge_create(&w.scene, threads, true, &j), RDL_OK);
        judge_edges(j, &edge_count);
        for (size_t most = 20000; most > 0; most /= 7) {
            ck_assert_int_eq(judge_piece(j, w.from[0], w.to[0], true, true, most, &counts, &findings, &count, &fault),
                             RDL_OK);
            if (all_count == 0) {
                ck_assert_uint_gt(count, 30);
                memcpy(all, findings, count * sizeof *all);
                all_count = count;
            }
            ck_assert_uint_eq(count, most < all_count ? most : all_count);
            ck_assert_mem_eq(findings, all, count * sizeof *all);
        }
        judge_destroy(j);
    }
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("judge");
    TCase *group = tcase_create("judge");
    tcase_set_timeout(group, 60);
    tcase_add_test(group, judge_counts_what_brute_force_counts);
    tcase_add_test(group, listed_findings_are_the_first);
    suite_add_tcase(suite, group);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_ENV);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
