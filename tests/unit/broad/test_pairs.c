/* tests/unit/broad/test_pairs.c: bounds and the engine's pair lists against brute force with all filters. */
#include <check.h>
#include <float.h>
#include <math.h>
#include <stdio.h>

#include "bounds/bounds.h"
#include "broad/broad.h"
#include "common.h"
#include "raddle/query.h"

/* A scene that owns its arrays: strands of four vertices, two cloth sheets, two bodies. */
typedef struct scene {
    rdli_mesh mesh;
    uint32_t (*edges)[2], (*triangles)[3], *vertex_part, *attached_first, *attached;
    double *vertex_half, *edge_half, *triangle_half, (*start)[3], (*end)[3];
    uint64_t *muted;
    uint8_t *driven, *awake;
    rdli_boxes boxes;
} scene;

enum { GRID = 9, STRANDS = 40, STRAND = 4, SHEETS = 4, PARTS = 2 + SHEETS };

static int compare_edges(const void *x, const void *y)
{
    return compare_pairs(x, y);
}

static void add_edge(scene *s, uint32_t v, uint32_t w)
{
    uint32_t *edge = s->edges[s->mesh.edge_count++];
    edge[0] = v < w ? v : w;
    edge[1] = v < w ? w : v;
}

static void add_triangle(scene *s, uint32_t a, uint32_t b, uint32_t c)
{
    uint32_t *triangle = s->triangles[s->mesh.triangle_count++];
    triangle[0] = a;
    triangle[1] = b;
    triangle[2] = c;
    add_edge(s, a, b);
    add_edge(s, b, c);
    add_edge(s, c, a);
}

static void sort_edges(scene *s)
{
    qsort(s->edges, s->mesh.edge_count, sizeof *s->edges, compare_edges);
    uint32_t kept = 0;
    for (uint32_t i = 0; i < s->mesh.edge_count; i++)
        if (kept == 0 || compare_pairs(s->edges[kept - 1], s->edges[i]) != 0)
            memmove(s->edges[kept++], s->edges[i], sizeof *s->edges);
    s->mesh.edge_count = kept;
}

static void place(scene *s, uint64_t seed, double motion)
{
    for (uint32_t v = 0; v < s->mesh.vertex_count; v++)
        for (int k = 0; k < 3; k++) {
            double x;
            if (v < STRANDS * STRAND) {
                x = draw(&seed) * 0.2 + (k == 0 ? 0.2 * (v % STRAND) : 0.3);
            } else {
                uint32_t local = (v - STRANDS * STRAND) % (GRID * GRID), sheet = (v - STRANDS * STRAND) / (GRID * GRID);
                x = k == 0 ? local % GRID / (double)GRID : k == 1 ? local / GRID / (double)GRID : 0.3 + 0.03 * sheet;
                x += 0.02 * draw(&seed);
            }
            s->start[v][k] = x;
            s->end[v][k] = x + motion * (draw(&seed) - 0.5);
        }
}

/* The last two sheets are driven bodies; one vertex of the first sheet is pinned. */
static scene *make_scene(uint64_t seed)
{
    scene *s = calloc(1, sizeof *s);
    const uint32_t vertices = STRANDS * STRAND + SHEETS * GRID * GRID, triangles = SHEETS * 2 * (GRID - 1) * (GRID - 1);
    const uint32_t edges = STRANDS * (STRAND - 1) + 3 * triangles;
    s->edges = malloc(edges * sizeof *s->edges);
    s->triangles = malloc(triangles * sizeof *s->triangles);
    s->vertex_part = calloc(vertices, sizeof(uint32_t));
    s->vertex_half = calloc(vertices, sizeof(double));
    s->edge_half = calloc(edges, sizeof(double));
    s->triangle_half = calloc(triangles, sizeof(double));
    s->start = malloc(vertices * sizeof *s->start);
    s->end = malloc(vertices * sizeof *s->end);
    s->driven = calloc(vertices, 1);
    s->awake = calloc(vertices, 1);
    s->muted = calloc(PARTS * PARTS / 64 + 1, sizeof(uint64_t));
    s->attached_first = calloc(vertices + 1, sizeof(uint32_t));
    s->attached = calloc(2, sizeof(uint32_t));
    s->mesh.vertex_count = vertices;
    s->mesh.part_count = PARTS;
    for (uint32_t v = 0; v < vertices; v++) {
        uint32_t sheet = v < STRANDS * STRAND ? 0 : (v - STRANDS * STRAND) / (GRID * GRID);
        s->vertex_part[v] = v < STRANDS * STRAND ? v % (2 * STRAND) / STRAND : 2 + sheet;
        s->driven[v] = s->vertex_part[v] >= 4 || v == STRANDS * STRAND + 5;
        s->vertex_half[v] = 0.002 * draw(&seed);
    }
    for (uint32_t v = 0; v < STRANDS * STRAND; v++)
        if (v % STRAND != STRAND - 1)
            add_edge(s, v, v + 1);
    for (uint32_t sheet = 0; sheet < SHEETS; sheet++)
        for (uint32_t y = 0; y + 1 < GRID; y++)
            for (uint32_t x = 0; x + 1 < GRID; x++) {
                uint32_t a = STRANDS * STRAND + sheet * GRID * GRID + y * GRID + x;
                add_triangle(s, a, a + 1, a + GRID + 1);
                add_triangle(s, a, a + GRID + 1, a + GRID);
            }
    sort_edges(s);
    for (uint32_t e = 0; e < s->mesh.edge_count; e++)
        s->edge_half[e] = fmax(s->vertex_half[s->edges[e][0]], s->vertex_half[s->edges[e][1]]);
    for (uint32_t t = 0; t < s->mesh.triangle_count; t++)
        for (int i = 0; i < 3; i++)
            s->triangle_half[t] = fmax(s->triangle_half[t], s->vertex_half[s->triangles[t][i]]);
    place(s, seed, 0.05);
    s->boxes.vertices = malloc(vertices * sizeof(rdl_box));
    s->boxes.edges = malloc(edges * sizeof(rdl_box));
    s->boxes.triangles = malloc(triangles * sizeof(rdl_box));
    s->mesh.edges = (const uint32_t(*)[2])s->edges;
    s->mesh.triangles = (const uint32_t(*)[3])s->triangles;
    s->mesh.vertex_part = s->vertex_part;
    s->mesh.vertex_half = s->vertex_half;
    s->mesh.edge_half = s->edge_half;
    s->mesh.triangle_half = s->triangle_half;
    s->mesh.muted = s->muted;
    s->mesh.attached_first = s->attached_first;
    s->mesh.attached = s->attached;
    s->mesh.driven = s->driven;
    return s;
}

static void free_scene(scene *s)
{
    free(s->edges);
    free(s->triangles);
    free(s->vertex_part);
    free(s->vertex_half);
    free(s->edge_half);
    free(s->triangle_half);
    free(s->start);
    free(s->end);
    free(s->driven);
    free(s->awake);
    free(s->muted);
    free(s->attached_first);
    free(s->attached);
    free(s->boxes.vertices);
    free(s->boxes.edges);
    free(s->boxes.triangles);
    free(s);
}

static void mute(scene *s, uint32_t p, uint32_t q)
{
    uint64_t bits[2] = {(uint64_t)p * PARTS + q, (uint64_t)q * PARTS + p};
    for (int i = 0; i < 2; i++)
        s->muted[bits[i] / 64] |= 1ull << bits[i] % 64;
}

/* One attachment: vertices v < w. */
static void attach(scene *s, uint32_t v, uint32_t w)
{
    for (uint32_t i = 0; i <= s->mesh.vertex_count; i++)
        s->attached_first[i] = (uint32_t)(i > v) + (uint32_t)(i > w);
    s->attached[0] = w;
    s->attached[1] = v;
    s->mesh.attachment_count = 1;
}

static bool wanted(const scene *s, const uint8_t *awake, const uint32_t *a, unsigned na, const uint32_t *b, unsigned nb)
{
    bool any_free = false, any_awake = awake == NULL;
    for (unsigned i = 0; i < na + nb; i++) {
        uint32_t v = i < na ? a[i] : b[i - na];
        any_free |= !s->driven[v];
        any_awake |= awake != NULL && awake[v];
    }
    for (unsigned i = 0; i < na; i++)
        for (unsigned j = 0; j < nb; j++) {
            if (a[i] == b[j])
                return false;
            for (uint32_t r = s->attached_first[a[i]]; s->mesh.attachment_count != 0 && r < s->attached_first[a[i] + 1]; r++)
                if (s->attached[r] == b[j])
                    return false;
        }
    uint64_t bit = (uint64_t)s->vertex_part[a[0]] * PARTS + s->vertex_part[b[0]];
    return any_free && any_awake && !(s->muted[bit / 64] >> bit % 64 & 1);
}

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

typedef struct stage {
    ledger ledger;
    rdl_host host;
    rdli_memory memory;
    rdli_workers *workers;
    rdli_broad *broad;
} stage;

static rdl_status open_stage(stage *st, unsigned threads, size_t fail_at)
{
    memset(st, 0, sizeof *st);
    st->ledger.fail_at = fail_at;
    st->host = ledger_host(&st->ledger, threads);
    ck_assert_int_eq(rdli_memory_init(&st->memory, &st->host), RDL_OK);
    rdl_status status = rdli_workers_create(&st->memory, &st->host, &st->workers);
    if (status == RDL_OK)
        status = rdli_broad_create(&st->memory, st->workers, &st->broad);
    return status;
}

static void close_stage(stage *st)
{
    rdli_broad_destroy(st->broad);
    rdli_workers_destroy(&st->memory, st->workers);
    ck_assert_uint_eq(st->ledger.live, 0);
    ck_assert_uint_eq(st->memory.bytes_in_use, 0);
}

static void fill(const scene *s, stage *st)
{
    rdli_motion motion = {(const double(*)[3])s->start, (const double(*)[3])s->end, NULL};
    rdli_boxes boxes = s->boxes;
    rdli_bounds_fill(&s->mesh, &motion, st->workers, &boxes);
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
        for (uint32_t v = 0; v < s->mesh.vertex_count; v++) {
            for (int k = 0; k < 3; k++) {
                s->start[v][k] = (s->start[v][k] + cases[c].offset) * cases[c].scale;
                s->end[v][k] = (s->end[v][k] + cases[c].offset + cases[c].common) * cases[c].scale;
            }
            s->vertex_half[v] *= cases[c].scale;
        }
        for (uint32_t e = 0; e < s->mesh.edge_count; e++)
            s->edge_half[e] *= cases[c].scale;
        for (uint32_t t = 0; t < s->mesh.triangle_count; t++)
            s->triangle_half[t] *= cases[c].scale;
        rdli_motion motion = {(const double(*)[3])s->start, (const double(*)[3])s->end, NULL};
        size_t points = 0, edges = 0;
        for (unsigned round = 0; round < 4; round++) {
            stage st;
            rdli_pairs all, near;
            ck_assert_int_eq(open_stage(&st, 1u << round / 2, 0), RDL_OK);
            rdli_broad_use_vector(st.broad, round % 2 == 1);
            fill(s, &st);
            ck_assert_int_eq(rdli_broad_near_pairs(st.broad, &s->mesh, &motion, &s->boxes, &near), RDL_OK);
            if (round > 0) {
                ck_assert_uint_eq(near.point_triangle_count, points);
                ck_assert_uint_eq(near.edge_edge_count, edges);
            }
            points = near.point_triangle_count;
            edges = near.edge_edge_count;
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
        fill(full, &st);
        rdli_motion motion = {(const double(*)[3])s->start, (const double(*)[3])s->end, step % 5 == 4 ? NULL : s->awake};
        rdli_boxes boxes = s->boxes;
        rdli_bounds_fill(&s->mesh, &motion, st.workers, &boxes);
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

/* Two vertices on one axis whose distance comes down to the sum of their half-thicknesses: at every size and offset their
 * boxes overlap, and the boxes stay tight. */
START_TEST(test_bounds)
{
    stage st;
    ck_assert_int_eq(open_stage(&st, 1, 0), RDL_OK);
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
        rdli_bounds_fill(&mesh, &motion, st.workers, &boxes);
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
    close_stage(&st);
}
END_TEST

/* Beyond the float range the boxes are clamped and still overlap. */
START_TEST(test_bounds_clamped)
{
    stage st;
    ck_assert_int_eq(open_stage(&st, 1, 0), RDL_OK);
    double start[4][3] = {{1e300, 1e39, -1e300}, {1e301, 1e40, -DBL_MAX}, {0, 0, 0}, {FLT_MAX, FLT_MAX, -FLT_MAX}};
    double half[4] = {0, DBL_MAX, 1e-300, 0};
    uint32_t part[4] = {0};
    rdli_mesh mesh = {.vertex_count = 4, .part_count = 1, .vertex_part = part, .vertex_half = half};
    rdli_motion motion = {(const double(*)[3])start, (const double(*)[3])start, NULL};
    rdl_box vertices[4];
    rdli_boxes boxes = {vertices, NULL, NULL};
    rdli_bounds_fill(&mesh, &motion, st.workers, &boxes);
    for (int v = 0; v < 4; v++)
        for (int k = 0; k < 3; k++)
            ck_assert(isfinite(vertices[v].lo[k]) && isfinite(vertices[v].hi[k]) && vertices[v].lo[k] <= vertices[v].hi[k]);
    ck_assert(boxes_overlap(&vertices[0], &vertices[1]));
    ck_assert(boxes_overlap(&vertices[0], &vertices[3]));
    ck_assert(boxes_overlap(&vertices[1], &vertices[2]));
    ck_assert(!boxes_overlap(&vertices[0], &vertices[2]));
    close_stage(&st);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("pairs");
    TCase *all = tcase_create("pairs");
    tcase_set_timeout(all, 60);
    tcase_add_test(all, test_filters);
    tcase_add_test(all, test_near_pairs);
    tcase_add_test(all, test_few_awake);
    tcase_add_test(all, test_steps);
    tcase_add_test(all, test_failing_memory);
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
