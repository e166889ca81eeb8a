/* tests/unit/broad/test_pairs.c: the engine's pair lists against brute force with all filters. */
#include <check.h>

#include "scene.h"

/* Compares with every pair, in order; returns how many there are. */
static size_t check_pairs(const scene *s, const uint8_t *awake, const rdli_pairs *pairs)
{
    size_t pt = 0, ee = 0;
    bool same = true;
    for (uint32_t v = 0; v < s->mesh.vertex_count; v++)
        for (uint32_t t = 0; t < s->mesh.triangle_count; t++)
            if (boxes_overlap(&s->boxes.vertices[v], &s->boxes.triangles[t]) && wanted(s, awake, &v, 1, s->triangles[t], 3)) {
                same = same && pt < pairs->point_triangle_count && pairs->point_triangle[pt].first == v &&
                       pairs->point_triangle[pt].second == t;
                pt++;
            }
    for (uint32_t e = 0; e < s->mesh.edge_count; e++)
        for (uint32_t f = e + 1; f < s->mesh.edge_count; f++)
            if (boxes_overlap(&s->boxes.edges[e], &s->boxes.edges[f]) && wanted(s, awake, s->edges[e], 2, s->edges[f], 2)) {
                same = same && ee < pairs->edge_edge_count && pairs->edge_edge[ee].first == e &&
                       pairs->edge_edge[ee].second == f;
                ee++;
            }
    ck_assert(same);
    ck_assert_uint_eq(pt, pairs->point_triangle_count);
    ck_assert_uint_eq(ee, pairs->edge_edge_count);
    return pt + ee;
}

/* All filters on and off, all-asleep, few awake, all awake; the counts must fall as filters are switched on. */
START_TEST(test_filters)
{
    for (unsigned round = 0; round < 6; round++) {
        const unsigned threads = 1u << round / 2;
        scene *s = make_scene(threads);
        stage st;
        rdli_pairs pairs;
        ck_assert_int_eq(open_stage(&st, threads, 0), RDL_OK);
        rdli_broad_use_vector(st.broad, round % 2 == 1);
        fill(s, &st);
        ck_assert_int_eq(rdli_broad_pairs(st.broad, &s->mesh, &s->boxes, NULL, &pairs), RDL_OK);
        size_t all = check_pairs(s, NULL, &pairs);
        uint32_t v = 0, w = 0;
        for (size_t i = 0; i < pairs.edge_edge_count && v == w; i++) {
            const uint32_t *a = s->edges[pairs.edge_edge[i].first], *b = s->edges[pairs.edge_edge[i].second];
            v = a[0] < b[1] ? a[0] : b[1];
            w = a[0] < b[1] ? b[1] : a[0];
        }
        attach(s, v, w);
        ck_assert_int_eq(rdli_broad_pairs(st.broad, &s->mesh, &s->boxes, NULL, &pairs), RDL_OK);
        size_t without_attached = check_pairs(s, NULL, &pairs);
        ck_assert_uint_lt(without_attached, all);
        mute(s, 0, 0);
        mute(s, 1, 2);
        mute(s, 2, 4);
        ck_assert_int_eq(rdli_broad_pairs(st.broad, &s->mesh, &s->boxes, NULL, &pairs), RDL_OK);
        size_t without_muted = check_pairs(s, NULL, &pairs);
        ck_assert_uint_lt(without_muted, without_attached);
        ck_assert_int_eq(rdli_broad_pairs(st.broad, &s->mesh, &s->boxes, s->awake, &pairs), RDL_OK);
        ck_assert_uint_eq(check_pairs(s, s->awake, &pairs), 0);
        s->awake[3] = s->awake[STRANDS * STRAND + 40] = s->awake[s->mesh.vertex_count - 1] = 1;
        ck_assert_int_eq(rdli_broad_pairs(st.broad, &s->mesh, &s->boxes, s->awake, &pairs), RDL_OK);
        size_t few = check_pairs(s, s->awake, &pairs);
        ck_assert_uint_gt(few, 0);
        ck_assert_uint_lt(few, without_muted / 10);
        memset(s->awake, 1, s->mesh.vertex_count);
        ck_assert_int_eq(rdli_broad_pairs(st.broad, &s->mesh, &s->boxes, s->awake, &pairs), RDL_OK);
        ck_assert_uint_eq(check_pairs(s, s->awake, &pairs), without_muted);
        memset(s->driven, 1, s->mesh.vertex_count);
        ck_assert_int_eq(rdli_broad_pairs(st.broad, &s->mesh, &s->boxes, NULL, &pairs), RDL_OK);
        ck_assert_uint_eq(check_pairs(s, NULL, &pairs), 0);
        close_stage(&st);
        free_scene(s);
    }
}
END_TEST

/* Many steps with motion from small to wild, then a warm call that must not allocate. */
START_TEST(test_steps)
{
    scene *s = make_scene(7);
    stage st;
    rdli_pairs pairs;
    ck_assert_int_eq(open_stage(&st, 2, 0), RDL_OK);
    for (uint64_t step = 0; step < 8; step++) {
        place(s, step, (double[]){0, 0.01, 0.05, 0.5, 0.02, 0, 2.0, 0.05}[step]);
        fill(s, &st);
        ck_assert_int_eq(rdli_broad_pairs(st.broad, &s->mesh, &s->boxes, NULL, &pairs), RDL_OK);
        ck_assert_uint_gt(check_pairs(s, NULL, &pairs), 0);
    }
    size_t calls = st.ledger.calls;
    ck_assert_int_eq(rdli_broad_pairs(st.broad, &s->mesh, &s->boxes, NULL, &pairs), RDL_OK);
    ck_assert_uint_eq(st.ledger.calls, calls);
    close_stage(&st);
    free_scene(s);
}
END_TEST

/* A few vertices move in every call and are awake; now and then one that is said to sleep moves as well. Boxes and pairs are
 * those of a full fill and of brute force. */
START_TEST(test_few_awake)
{
    scene *s = make_scene(13), *full = make_scene(13);
    stage st;
    rdli_pairs pairs;
    uint64_t seed = 77;
    ck_assert_int_eq(open_stage(&st, 2, 0), RDL_OK);
    for (uint32_t v = 0; v < s->mesh.vertex_count; v++)
        s->end[v][0] += 0.3; /* motion that all share */
    fill(s, &st);
    for (int step = 0; step < 12; step++) {
        memset(s->awake, 0, s->mesh.vertex_count);
        for (int i = 0; i < 6; i++) {
            uint32_t v = (uint32_t)(draw(&seed) * s->mesh.vertex_count);
            s->awake[v] = i < 5 || step % 3 != 0;
            for (int k = 0; k < 3; k++)
                s->end[v][k] += 0.1 * (draw(&seed) - 0.5);
        }
        memcpy(full->start, s->start, s->mesh.vertex_count * sizeof *s->start);
        memcpy(full->end, s->end, s->mesh.vertex_count * sizeof *s->end);
        rdli_motion motion = {(const double(*)[3])s->start, (const double(*)[3])s->end, step % 5 == 4 ? NULL : s->awake};
        rdli_bounds_fill(&s->mesh, &motion, st.workers, &s->boxes);
        const rdli_motion every = {motion.start, motion.end, full->awake};
        memcpy(full->boxes.shift, s->boxes.shift, sizeof s->boxes.shift);
        memset(full->awake, 1, s->mesh.vertex_count);
        rdli_bounds_fill(&full->mesh, &every, st.workers, &full->boxes);
        ck_assert(s->boxes.shift[0] > 0.25 && s->boxes.shift[1] == 0);
        ck_assert_mem_eq(s->boxes.vertices, full->boxes.vertices, s->mesh.vertex_count * sizeof(rdl_box));
        ck_assert_mem_eq(s->boxes.edges, full->boxes.edges, s->mesh.edge_count * sizeof(rdl_box));
        ck_assert_mem_eq(s->boxes.triangles, full->boxes.triangles, s->mesh.triangle_count * sizeof(rdl_box));
        ck_assert_int_eq(rdli_broad_pairs(st.broad, &s->mesh, &s->boxes, motion.awake, &pairs), RDL_OK);
        check_pairs(s, motion.awake, &pairs);
    }
    close_stage(&st);
    free_scene(s);
    free_scene(full);
}
END_TEST

START_TEST(test_failing_memory)
{
    scene *s = make_scene(11);
    bool finished = false;
    for (size_t n = 1; !finished; n++) {
        stage st;
        rdli_pairs pairs = {0};
        rdl_status status = open_stage(&st, 2, n);
        if (status == RDL_OK) {
            fill(s, &st);
            status = rdli_broad_pairs(st.broad, &s->mesh, &s->boxes, NULL, &pairs);
            finished = status == RDL_OK;
            ck_assert(finished || pairs.point_triangle == NULL);
            /* A call that failed half-way must not make the next one trust its trees. */
            memset(s->awake, 1, s->mesh.vertex_count);
            ck_assert_int_eq(rdli_broad_pairs(st.broad, &s->mesh, &s->boxes, s->awake, &pairs), RDL_OK);
            check_pairs(s, s->awake, &pairs);
        }
        ck_assert_int_eq(status, finished ? RDL_OK : RDL_NO_MEMORY);
        close_stage(&st);
        ck_assert_uint_lt(n, 100);
    }
    free_scene(s);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("pairs");
    TCase *all = tcase_create("pairs");
    tcase_set_timeout(all, 60);
    tcase_add_test(all, test_filters);
    tcase_add_test(all, test_steps);
    tcase_add_test(all, test_few_awake);
    tcase_add_test(all, test_failing_memory);
    suite_add_tcase(suite, all);
    SRunner *runner = srunner_create(suite);
    srunner_set_fork_status(runner, CK_NOFORK);
    srunner_run_all(runner, CK_NORMAL);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? 0 : 1;
}
