/* tests/unit/broad/test_parts.c: lists that exceed the budget come in parts; edges against triangles. */
#include <check.h>

#include "driver/engine.h"
#include "raddle/engine.h"
#include "scene.h"

typedef struct whole_list {
    rdli_pair *pairs;
    size_t count;
} whole_list;

static void append(whole_list *list, const rdli_pair *pairs, size_t count)
{
    if (count == 0)
        return;
    list->pairs = realloc(list->pairs, (list->count + count) * sizeof *pairs);
    memcpy(list->pairs + list->count, pairs, count * sizeof *pairs);
    list->count += count;
}

/* All parts; returns how many. lists: point-triangle, edge-edge. */
static size_t gather(const scene *s, stage *st, bool near, whole_list lists[2])
{
    const rdli_motion motion = {(const double(*)[3])s->start, (const double(*)[3])s->end, NULL};
    rdli_pairs pairs;
    size_t parts = 1;
    rdl_status status = near ? rdli_broad_near_pairs(st->broad, &s->mesh, &motion, &s->boxes, &pairs)
                             : rdli_broad_pairs(st->broad, &s->mesh, &s->boxes, NULL, &pairs);
    memset(lists, 0, 2 * sizeof *lists);
    for (;; parts++) {
        ck_assert_int_eq(status, RDL_OK);
        /* Edge pairs begin when the other kind is through. */
        ck_assert(pairs.point_triangle_count == 0 || lists[1].count == 0);
        append(&lists[0], pairs.point_triangle, pairs.point_triangle_count);
        append(&lists[1], pairs.edge_edge, pairs.edge_edge_count);
        if (!pairs.more)
            return parts;
        status = rdli_broad_more(st->broad, &s->mesh, &pairs);
    }
}

static void check_same(const whole_list a[2], const whole_list b[2])
{
    for (int i = 0; i < 2; i++) {
        ck_assert_uint_eq(a[i].count, b[i].count);
        ck_assert_mem_eq(a[i].pairs, b[i].pairs, a[i].count * sizeof *a[i].pairs);
    }
}

static void free_lists(whole_list lists[2])
{
    free(lists[0].pairs);
    free(lists[1].pairs);
}

/* Whatever the budget, the threads and the instructions: the same list; and a budget that is raised again is used. */
START_TEST(test_budgets)
{
    scene *s = make_scene(5);
    for (unsigned round = 0; round < 6; round++) {
        stage st;
        whole_list whole[2], parts[2];
        ck_assert_int_eq(open_stage(&st, 1u << round / 2, 0), RDL_OK);
        rdli_broad_use_vector(st.broad, round % 2 == 1);
        fill(s, &st);
        for (int near = 0; near < 2; near++) {
            rdli_broad_limit(st.broad, RDLI_PAIRS_MAX);
            ck_assert_uint_eq(gather(s, &st, near, whole), 1);
            ck_assert_uint_gt(whole[0].count, 100);
            ck_assert_uint_gt(whole[1].count, 100);
            const size_t budgets[] = {round == 0 ? 1 : 150, 40, whole[1].count / 3, whole[1].count - 1, whole[1].count + whole[0].count};
            for (size_t b = 0; b < 5; b++) {
                rdli_broad_limit(st.broad, budgets[b]);
                size_t count = gather(s, &st, near, parts);
                ck_assert(b == 4 ? count == 1 : b < 3 ? count > 2 : count > 1);
                check_same(whole, parts);
                free_lists(parts);
                gather(s, &st, near, parts); /* again, with what was learned */
                check_same(whole, parts);
                free_lists(parts);
            }
            free_lists(whole);
        }
        close_stage(&st);
    }
    free_scene(s);
}
END_TEST

/* Edges against triangles, with all rules, in one list and in parts, against brute force. */
START_TEST(test_couples)
{
    for (unsigned round = 0; round < 8; round++) {
        scene *s = make_scene(20 + round);
        stage st;
        ck_assert_int_eq(open_stage(&st, 1 + round % 2, 0), RDL_OK);
        fill(s, &st);
        if (round % 4 >= 2) {
            attach(s, s->edges[0][0], s->triangles[0][0]);
            mute(s, 0, 2);
            mute(s, 3, 3);
        }
        uint8_t *driven = s->driven;
        if (round >= 4) {
            s->mesh.driven = NULL;
            s->driven = calloc(s->mesh.vertex_count, 1);
        }
        if (round % 2 == 1)
            rdli_broad_limit(st.broad, 50);
        whole_list got = {0};
        bool more = true, same = true;
        ck_assert_int_eq(rdli_broad_couples_begin(st.broad, &s->mesh, &s->boxes), RDL_OK);
        while (more) {
            const rdli_pair *couples = NULL;
            size_t count;
            ck_assert_int_eq(rdli_broad_couples(st.broad, &s->mesh, &couples, &count, &more), RDL_OK);
            append(&got, couples, count);
        }
        size_t at = 0;
        for (uint32_t e = 0; e < s->mesh.edge_count; e++)
            for (uint32_t t = 0; t < s->mesh.triangle_count; t++)
                if (boxes_overlap(&s->boxes.edges[e], &s->boxes.triangles[t]) && wanted(s, NULL, s->edges[e], 2, s->triangles[t], 3)) {
                    same = same && at < got.count && got.pairs[at].first == e && got.pairs[at].second == t;
                    at++;
                }
        ck_assert_uint_gt(at, 200);
        ck_assert_uint_eq(at, got.count);
        ck_assert(same);
        free(got.pairs);
        if (s->driven != driven)
            free(driven);
        close_stage(&st);
        free_scene(s);
    }
}
END_TEST

enum { SIDE = 12, LAYERS = 4, NODES = SIDE * SIDE * LAYERS, CELLS = 2 * (SIDE - 1) * (SIDE - 1) * LAYERS };

/* Sheets that are pushed into one another. */
static void step_layers(size_t pairs_max, double delivered[NODES][3], rdl_verdict *verdict)
{
    static double start[NODES][3], proposed[NODES][3], mass[NODES];
    static uint32_t part[NODES], triangles[CELLS][3];
    const rdl_part parts[1] = {{.name = "sheets", .kind = RDL_CLOTH, .half_thickness = 0.002, .friction = 0.2}};
    uint64_t seed = 3;
    size_t count = 0;
    for (uint32_t v = 0; v < NODES; v++) {
        const uint32_t layer = v / (SIDE * SIDE), at = v % (SIDE * SIDE);
        const double x[3] = {0.01 * (at % SIDE) + 0.001 * layer, 0.01 * (at / SIDE), 0.006 * layer};
        for (int k = 0; k < 3; k++) {
            start[v][k] = x[k] + 0.0005 * draw(&seed);
            proposed[v][k] = start[v][k] + 0.002 * (draw(&seed) - 0.5) - (k == 2 ? 0.003 * layer : 0);
        }
        mass[v] = 1e-4;
        if (at % SIDE + 1 < SIDE && at / SIDE + 1 < SIDE) {
            const uint32_t rows[2][3] = {{v, v + 1, v + SIDE + 1}, {v, v + SIDE + 1, v + SIDE}};
            memcpy(triangles[count], rows, sizeof rows);
            count += 2;
        }
    }
    const rdl_scene sheets = {.size = sizeof sheets, .part_count = 1, .parts = parts, .vertex_count = NODES,
                             .vertex_part = part, .mass = mass, .triangle_count = CELLS,
                             .triangles = (const uint32_t(*)[3])triangles};
    const rdl_step step = {.size = sizeof step, .start = {start, 0, RDL_FLOAT64}, .proposed = {proposed, 0, RDL_FLOAT64},
                           .delivered = {delivered, 0, RDL_FLOAT64}, .duration = 0.04};
    const rdl_host host = {.size = sizeof host, .threads = 2};
    rdl_report report = {.size = sizeof report};
    rdl_engine *engine;
    ck_assert_int_eq(rdl_engine_create(&sheets, NULL, &host, &engine, NULL), RDL_OK);
    rdli_broad_limit(engine->broad, pairs_max);
    ck_assert_int_eq(rdl_engine_step(engine, &step, &report, NULL), RDL_OK);
    *verdict = report.verdict;
    rdl_engine_destroy(engine);
}

/* A step whose pairs come in parts delivers the same bits. */
START_TEST(test_step_in_parts)
{
    static double whole[NODES][3], parts[NODES][3];
    rdl_verdict verdict, same_verdict;
    step_layers(RDLI_PAIRS_MAX, whole, &verdict);
    ck_assert_int_eq(verdict, RDL_RESOLVED);
    const size_t budgets[] = {20, 300};
    for (int b = 0; b < 2; b++) {
        memset(parts, 0, sizeof parts);
        step_layers(budgets[b], parts, &same_verdict);
        ck_assert_int_eq(same_verdict, verdict);
        ck_assert_mem_eq(whole, parts, sizeof whole);
    }
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("parts");
    TCase *all = tcase_create("parts");
    tcase_set_timeout(all, 60);
    tcase_add_test(all, test_budgets);
    tcase_add_test(all, test_couples);
    tcase_add_test(all, test_step_in_parts);
    suite_add_tcase(suite, all);
    SRunner *runner = srunner_create(suite);
    srunner_set_fork_status(runner, CK_NOFORK);
    srunner_run_all(runner, CK_NORMAL);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? 0 : 1;
}
