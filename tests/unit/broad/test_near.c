/* tests/unit/broad/test_near.c: the certificate that drops pairs, against the exact narrow phase. */
#include <check.h>

#include "raddle/query.h"
#include "scene.h"

static bool touches(const scene *s, int kind, const uint32_t vertices[4], double gap)
{
    rdl_motion motion;
    rdl_touch touch;
    for (int i = 0; i < 4; i++) {
        memcpy(motion.start[i], s->start[vertices[i]], sizeof motion.start[i]);
        memcpy(motion.end[i], s->end[vertices[i]], sizeof motion.end[i]);
    }
    ck_assert_int_eq(rdl_find_touches(kind, 1, &motion, &gap, &touch, NULL), RDL_OK);
    return touch.touches;
}

/* Counts the pairs of `all` that touch; each must be in `near`, which must be a part of `all`. Both are sorted. Of very
 * long lists only some of the pairs that were left out are examined. */
static size_t check_near(const scene *s, int kind, const rdli_pair *all, size_t all_count, const rdli_pair *near,
                         size_t near_count)
{
    size_t at = 0, touching = 0;
    for (size_t i = 0; i < all_count; i++) {
        uint32_t vertices[4];
        double gap;
        if (kind == RDL_EDGE_EDGE) {
            memcpy(vertices, s->edges[all[i].first], 8);
            memcpy(vertices + 2, s->edges[all[i].second], 8);
            gap = s->edge_half[all[i].first] + s->edge_half[all[i].second];
        } else {
            vertices[0] = all[i].first;
            memcpy(vertices + 1, s->triangles[all[i].second], 12);
            gap = s->vertex_half[all[i].first] + s->triangle_half[all[i].second];
        }
        bool found = at < near_count && near[at].first == all[i].first && near[at].second == all[i].second;
        at += found;
        if (!found && all_count > 20000 && i % 16 != 0)
            continue;
        if (touches(s, kind, vertices, gap)) {
            touching++;
            ck_assert(found);
        }
    }
    ck_assert_uint_eq(at, near_count);
    return touching;
}

static void transform(scene *s, double scale, double offset, double common)
{
    for (uint32_t v = 0; v < s->mesh.vertex_count; v++) {
        for (int k = 0; k < 3; k++) {
            s->start[v][k] = (s->start[v][k] + offset) * scale;
            s->end[v][k] = (s->end[v][k] + offset + common) * scale;
        }
        s->vertex_half[v] *= scale;
    }
    for (uint32_t e = 0; e < s->mesh.edge_count; e++)
        s->edge_half[e] *= scale;
    for (uint32_t t = 0; t < s->mesh.triangle_count; t++)
        s->triangle_half[t] *= scale;
}

/* The certificate: nothing that touches is lost, at any size, offset and speed; most that does not touch is left out; and
 * portable code, vector code and any number of threads agree. */
START_TEST(test_near_pairs)
{
    const struct { double scale, offset, motion, common; } cases[] = {
        {1, 0, 0.05, 0},         {1, 0, 0.002, 3},        {1, 0, 0, 0},     {0x1p-30, 0, 0.05, 0},  {0x1p-100, 0, 0.05, 0},
        {0x1p60, 0, 0.05, 0},    {1, 1000, 0.01, 0},      {1, 1e6, 0.02, 1},{0x1p-140, 0, 0.01, 0}, {0x1p200, 0, 0.05, 0},
        {1, 0x1p45, 0.05, 0},
    };
    for (size_t c = 0; c < sizeof cases / sizeof *cases; c++) {
        scene *s = make_scene(c);
        place(s, c, cases[c].motion);
        transform(s, cases[c].scale, cases[c].offset, cases[c].common);
        rdli_motion motion = {(const double(*)[3])s->start, (const double(*)[3])s->end, NULL};
        size_t points = 0, edges = 0;
        rdli_pair *kept[2] = {NULL, NULL}; /* what the first round found */
        for (unsigned round = 0; round < 6; round++) {
            stage st;
            rdli_pairs all, near;
            ck_assert_int_eq(open_stage(&st, 1u << round / 2, 0), RDL_OK);
            rdli_broad_use_vector(st.broad, round % 2 == 1);
            fill(s, &st);
            ck_assert_int_eq(rdli_broad_near_pairs(st.broad, &s->mesh, &motion, &s->boxes, &near), RDL_OK);
            if (round > 0) {
                ck_assert_uint_eq(near.point_triangle_count, points);
                ck_assert_uint_eq(near.edge_edge_count, edges);
                ck_assert_mem_eq(near.point_triangle, kept[0], points * sizeof(rdli_pair));
                ck_assert_mem_eq(near.edge_edge, kept[1], edges * sizeof(rdli_pair));
            } else {
                points = near.point_triangle_count;
                edges = near.edge_edge_count;
                kept[0] = malloc((points + 1) * sizeof(rdli_pair));
                kept[1] = malloc((edges + 1) * sizeof(rdli_pair));
                memcpy(kept[0], near.point_triangle, points * sizeof(rdli_pair));
                memcpy(kept[1], near.edge_edge, edges * sizeof(rdli_pair));
            }
            stage other;
            ck_assert_int_eq(open_stage(&other, 1, 0), RDL_OK);
            ck_assert_int_eq(rdli_broad_pairs(other.broad, &s->mesh, &s->boxes, NULL, &all), RDL_OK);
            size_t touching = 0;
            if (round == 0) {
                touching = check_near(s, RDL_POINT_TRIANGLE, all.point_triangle, all.point_triangle_count,
                                      near.point_triangle, near.point_triangle_count);
                touching += check_near(s, RDL_EDGE_EDGE, all.edge_edge, all.edge_edge_count, near.edge_edge,
                                       near.edge_edge_count);
                ck_assert_uint_gt(all.edge_edge_count + all.point_triangle_count, touching);
                if (cases[c].offset < 1e5 && cases[c].scale < 0x1p100 && cases[c].scale > 0x1p-100)
                    ck_assert_uint_le(points + edges, 3 * touching);
            }
            close_stage(&other);
            close_stage(&st);
        }
        free(kept[0]);
        free(kept[1]);
        free_scene(s);
    }
}
END_TEST

/* A scene that is pushed as a whole, far or little, has no more pairs than one that is not, by boxes or near. */
START_TEST(test_pushed_as_a_whole)
{
    scene *s = make_scene(3);
    size_t by_boxes[4], near[4];
    for (int i = 0; i < 4; i++) {
        const double push = (double[]){0, 0.01, 1, 50}[i];
        place(s, 3, 0.004);
        for (uint32_t v = 0; v < s->mesh.vertex_count; v++)
            for (int k = 0; k < 3; k++)
                s->end[v][k] += (k + 1) * push;
        const rdli_motion motion = {(const double(*)[3])s->start, (const double(*)[3])s->end, NULL};
        stage st;
        rdli_pairs pairs;
        ck_assert_int_eq(open_stage(&st, 1, 0), RDL_OK);
        fill(s, &st);
        ck_assert_int_eq(rdli_broad_pairs(st.broad, &s->mesh, &s->boxes, NULL, &pairs), RDL_OK);
        by_boxes[i] = pairs.point_triangle_count + pairs.edge_edge_count;
        ck_assert_int_eq(rdli_broad_near_pairs(st.broad, &s->mesh, &motion, &s->boxes, &pairs), RDL_OK);
        near[i] = pairs.point_triangle_count + pairs.edge_edge_count;
        close_stage(&st);
        ck_assert_uint_gt(near[0], 0);
        /* The median is not exactly the push, and where boxes end is a matter of rounding: a few pairs in a thousand. */
        ck_assert_uint_le(by_boxes[i], by_boxes[0] + by_boxes[0] / 200);
        ck_assert_uint_le(near[i], near[0] + near[0] / 200);
    }
    free_scene(s);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("near pairs");
    TCase *all = tcase_create("near pairs");
    tcase_set_timeout(all, 60);
    tcase_add_test(all, test_near_pairs);
    tcase_add_test(all, test_pushed_as_a_whole);
    suite_add_tcase(suite, all);
    SRunner *runner = srunner_create(suite);
    srunner_set_fork_status(runner, CK_NOFORK);
    srunner_run_all(runner, CK_NORMAL);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? 0 : 1;
}
