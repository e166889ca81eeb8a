/* A zone with a single contact against closed forms: four unit masses, the first feature flies at the second with
 * speed 1. Impulse I = -v_n / sum(a_i^2 / m_i); positions are the nearest ones that keep the gap. */
#include <check.h>
#include <math.h>
#include <stdbool.h>
#include <stdlib.h>
#include <string.h>

#include "raddle/engine.h"

enum { ROOM = 6 };

/* lift: how far above the gap the first feature starts; fall: how far it means to move down; m. */
static const double gap = 1e-7, fall = 0.01, duration = 0.5;

typedef struct setup {
    const char *name;
    bool edges;          /* strand against strand, else a strand's end against a triangle */
    double weight[4];    /* a_i of the contact, first feature positive */
    double foot[2];      /* where the strand's end is over the triangle (0,0), (1,0), (0,1) */
    double lift;
    double impulse;      /* of speed 1 */
} setup;

static const setup setups[] = {
    {"face, thirds", false, {1.0, -1.0 / 3.0, -1.0 / 3.0, -1.0 / 3.0}, {1.0 / 3.0, 1.0 / 3.0}, 0.0, 3.0 / 4.0},
    {"face, thirds, after flight", false, {1.0, -1.0 / 3.0, -1.0 / 3.0, -1.0 / 3.0}, {1.0 / 3.0, 1.0 / 3.0}, 0.004,
     3.0 / 4.0},
    {"face, half and quarters", false, {1.0, -0.5, -0.25, -0.25}, {0.25, 0.25}, 0.0, 8.0 / 11.0},
    {"face, half and quarters, after flight", false, {1.0, -0.5, -0.25, -0.25}, {0.25, 0.25}, 0.004, 8.0 / 11.0},
    {"vertex", false, {1.0, -1.0, 0.0, 0.0}, {0.0, 0.0}, 0.0, 0.5},
    {"edges, middles", true, {0.5, 0.5, -0.5, -0.5}, {0.0, 0.0}, 0.0, 1.0},
    {"edges, middles, after flight", true, {0.5, 0.5, -0.5, -0.5}, {0.0, 0.0}, 0.004, 1.0},
};

typedef struct stage {
    size_t count;
    double start[ROOM][3], proposed[ROOM][3], delivered[ROOM][3], impulses[ROOM][3];
    uint32_t contact[4]; /* the contact's vertices in the order of setup.weight */
    rdl_report report;
    rdl_engine *engine;
} stage;

static void put(double x[3], double a, double b, double c)
{
    x[0] = a;
    x[1] = b;
    x[2] = c;
}

static void place(const setup *s, stage *st)
{
    double z = gap + s->lift;
    if (s->edges) {
        st->count = 4;
        put(st->start[0], -1.0, 0.0, z);
        put(st->start[1], 1.0, 0.0, z);
        put(st->start[2], 0.0, -1.0, 0.0);
        put(st->start[3], 0.0, 1.0, 0.0);
    } else {
        st->count = 5;
        put(st->start[0], s->foot[0], s->foot[1], z);
        put(st->start[1], 0.0, 0.0, 0.0);
        put(st->start[2], 1.0, 0.0, 0.0);
        put(st->start[3], 0.0, 1.0, 0.0);
        put(st->start[4], s->foot[0], s->foot[1], z + 2.0); /* the strand's other end */
    }
    memcpy(st->proposed, st->start, sizeof st->start);
    st->proposed[0][2] -= fall;
    if (s->edges)
        st->proposed[1][2] -= fall;
    for (uint32_t i = 0; i < 4; i++)
        st->contact[i] = i;
}

static void run(const setup *s, stage *st)
{
    static const uint32_t segments[2][2] = {{0, 1}, {2, 3}}, ends[1][2] = {{0, 4}}, triangles[1][3] = {{1, 2, 3}};
    static const uint32_t part_of_edges[4] = {0, 0, 1, 1}, part_of_face[5] = {0, 1, 1, 1, 0};
    static const double mass[5] = {1.0, 1.0, 1.0, 1.0, 1.0};
    rdl_part parts[2] = {{"first", RDL_STRANDS, 0.4 * gap, 0.0}, {"second", RDL_CLOTH, 0.6 * gap, 0.0}};
    rdl_scene scene = {.size = sizeof scene, .part_count = 2, .parts = parts, .mass = mass};
    memset(st, 0, sizeof *st);
    place(s, st);
    parts[1].kind = s->edges ? RDL_STRANDS : RDL_CLOTH;
    scene.vertex_count = st->count;
    scene.vertex_part = s->edges ? part_of_edges : part_of_face;
    scene.segment_count = s->edges ? 2 : 1;
    scene.segments = s->edges ? segments : ends;
    scene.triangle_count = s->edges ? 0 : 1;
    scene.triangles = triangles;
    rdl_host host = {.size = sizeof host, .threads = 1};
    ck_assert_int_eq(rdl_engine_create(&scene, NULL, &host, &st->engine, NULL), RDL_OK);
    rdl_step step = {.size = sizeof step, .start = {st->start, 0, RDL_FLOAT64},
                     .proposed = {st->proposed, 0, RDL_FLOAT64},
                     .delivered = {st->delivered, 0, RDL_FLOAT64}, .duration = duration};
    st->report.size = sizeof st->report;
    ck_assert_int_eq(rdl_engine_step(st->engine, &step, &st->report, NULL), RDL_OK);
    memcpy(st->impulses, st->report.impulses, st->count * sizeof st->impulses[0]);
}

/* The nearest positions by hand: x = x1 + a I n with the normal of the four points themselves, repeated until it stands
 * still. (For the face the normal turns with the triangle, so that the answer is not a plain formula.) */
static void nearest(const setup *s, const stage *st, double x[4][3])
{
    double n[3] = {0.0, 0.0, 1.0}, w[4];
    memcpy(w, s->weight, sizeof w);
    for (int round = 0; round < 60; round++) {
        double along = 0.0, size = 0.0;
        for (int i = 0; i < 4; i++)
            for (int k = 0; k < 3; k++)
                along += w[i] * n[k] * st->proposed[i][k];
        for (int i = 0; i < 4; i++)
            size += w[i] * w[i];
        for (int i = 0; i < 4; i++)
            for (int k = 0; k < 3; k++)
                x[i][k] = st->proposed[i][k] + w[i] * n[k] * (gap - along) / size;
        if (s->edges || s->weight[1] == -1.0)
            continue;
        double u[3], v[3], p[3], c[3], b[2];
        for (int k = 0; k < 3; k++) {
            u[k] = x[2][k] - x[1][k];
            v[k] = x[3][k] - x[1][k];
            p[k] = x[0][k] - x[1][k];
        }
        put(c, u[1] * v[2] - u[2] * v[1], u[2] * v[0] - u[0] * v[2], u[0] * v[1] - u[1] * v[0]);
        double area = c[0] * c[0] + c[1] * c[1] + c[2] * c[2];
        double uu = u[0] * u[0] + u[1] * u[1] + u[2] * u[2], vv = v[0] * v[0] + v[1] * v[1] + v[2] * v[2];
        double uv = u[0] * v[0] + u[1] * v[1] + u[2] * v[2], pu = p[0] * u[0] + p[1] * u[1] + p[2] * u[2];
        double pv = p[0] * v[0] + p[1] * v[1] + p[2] * v[2];
        b[0] = (vv * pu - uv * pv) / area;
        b[1] = (uu * pv - uv * pu) / area;
        for (int k = 0; k < 3; k++)
            n[k] = c[k] / sqrt(area);
        w[1] = b[0] + b[1] - 1.0;
        w[2] = -b[0];
        w[3] = -b[1];
    }
}

START_TEST(positions)
{
    const setup *s = &setups[_i];
    stage st;
    double x[4][3];
    run(s, &st);
    nearest(s, &st, x);
    ck_assert_int_eq(st.report.verdict, RDL_RESOLVED);
    /* On a vertex the surface rises beside it as it gives way, and the end slides off a little: no formula for that. */
    double near = s->weight[1] == -1.0 ? 0.01 : 1e-9;
    for (int i = 0; i < 4; i++)
        for (int k = 0; k < 3; k++)
            ck_assert_msg(fabs(st.delivered[i][k] - x[i][k]) <= near * fall,
                          "%s: vertex %d axis %d at %.17g, not %.17g", s->name, i, k, st.delivered[i][k], x[i][k]);
    /* Where the geometry does not turn, the plain formula: all end at the share of the fall that I leaves. */
    for (int i = 0; i < 4 && (s->edges || s->weight[1] == s->weight[2]); i++) {
        double end = st.proposed[i][2] + s->weight[i] * s->impulse * (fall - s->lift);
        ck_assert_msg(fabs(st.delivered[i][2] - end) <= 1e-9 * fall, "%s: vertex %d at height %.17g, not %.17g",
                      s->name, i, st.delivered[i][2], end);
    }
    if (!s->edges)
        ck_assert_mem_eq(st.delivered[4], st.proposed[4], sizeof st.delivered[4]);
    rdl_engine_destroy(st.engine);
}
END_TEST

/* Impulses along the normal of the contact, in total those of the closed form. The triangle turns by at most 0.01 until
 * the contact's time, which the weights of the reported contact show. */
START_TEST(impulses)
{
    const setup *s = &setups[_i];
    stage st;
    run(s, &st);
    double speed = fall / duration, closing = 0.0, size = 0.0, total = 0.0;
    ck_assert_uint_ge(st.report.contact_count, 1);
    for (size_t c = 0; c < st.report.contact_count; c++) {
        const rdl_contact *contact = &st.report.contacts[c];
        double sum[3] = {0.0, 0.0, 0.0};
        for (int i = 0; i < 4; i++)
            for (int k = 0; k < 3; k++)
                sum[k] += contact->weights[i] * contact->normal[k];
        ck_assert_double_le(fabs(sum[0]) + fabs(sum[1]) + fabs(sum[2]), 1e-14);
        total += contact->impulse;
    }
    for (int i = 0; i < 4 && st.report.contact_count == 1; i++) {
        const rdl_contact *contact = &st.report.contacts[0];
        uint32_t v = contact->vertices[i];
        for (int k = 0; k < 3; k++)
            closing += contact->weights[i] * contact->normal[k] * (st.proposed[v][k] - st.start[v][k]) / duration;
        size += contact->weights[i] * contact->weights[i];
    }
    if (st.report.contact_count == 1)
        ck_assert_msg(fabs(total + closing / size) <= 1e-9 * speed, "%s: impulse %.17g, own closed form %.17g", s->name,
                      total, -closing / size);
    double turn = s->edges || s->weight[1] == s->weight[2] || s->weight[1] == -1.0 ? 1e-9 : 0.02;
    ck_assert_msg(fabs(total - s->impulse * speed) <= turn * speed, "%s: impulse %.17g, closed form %.17g", s->name,
                  total, s->impulse * speed);
    for (int i = 0; i < 4; i++)
        ck_assert_msg(fabs(st.impulses[i][2] - s->weight[i] * s->impulse * speed) <= turn * speed,
                      "%s: vertex %d gets %.17g, not %.17g", s->name, i, st.impulses[i][2],
                      s->weight[i] * s->impulse * speed);
    rdl_engine_destroy(st.engine);
}
END_TEST

int main(void)
{
    int count = (int)(sizeof setups / sizeof setups[0]);
    Suite *suite = suite_create("closed forms");
    TCase *all = tcase_create("one contact");
    tcase_add_loop_test(all, positions, 0, count);
    tcase_add_loop_test(all, impulses, 0, count);
    suite_add_tcase(suite, all);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_NORMAL);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
