/* tests/bench/bench_broad_lists.c: see bench_broad_lists.h. */
#include "bench_broad_lists.h"

#include <stdlib.h>
#include <string.h>
#include <time.h>

#include "bounds/bounds.h"
#include "broad/broad.h"
#include "raddle/query.h"

enum { RUNS = 4, SAMPLE = 16 };

typedef struct mesh_copy {
    rdli_mesh mesh;
    rdli_motion motion;
    rdli_boxes boxes;
    uint32_t (*edges)[2], (*triangles)[3], *part;
    double *half, (*start)[3], (*end)[3];
    uint8_t *driven;
    uint32_t *edge_owner, *vertex_owner, *element_triangle; /* for representative assignment */
} mesh_copy;

static double seconds(void)
{
    struct timespec t;
    clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &t);
    return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

static void keep_least(double *best, double value)
{
    if (value < *best)
        *best = value;
}

static int compare_rows(const void *x, const void *y)
{
    const uint32_t *a = x, *b = y;
    if (a[0] != b[0])
        return a[0] < b[0] ? -1 : 1;
    return a[1] < b[1] ? -1 : a[1] > b[1];
}

static unsigned side_count(const uint32_t *element)
{
    return element[1] == element[2] ? 1 : 3;
}

static void side_of(const uint32_t *element, unsigned i, uint32_t row[2])
{
    uint32_t v = element[i], w = element[(i + 1) % 3];
    row[0] = v < w ? v : w;
    row[1] = v < w ? w : v;
}

static void copy_topology(const bench_scene *scene, mesh_copy *m)
{
    size_t edges = 0, unique = 0, triangles = 0;
    for (size_t e = 0; e < scene->element_count; e++) {
        m->element_triangle[e] = (uint32_t)triangles;
        if (side_count(scene->elements[e]) == 3)
            memcpy(m->triangles[triangles++], scene->elements[e], sizeof *m->triangles);
        for (unsigned i = 0; i < side_count(scene->elements[e]); i++)
            side_of(scene->elements[e], i, m->edges[edges++]);
        for (unsigned i = 0; i < 3; i++)
            m->vertex_owner[scene->elements[e][i]] = (uint32_t)e;
    }
    qsort(m->edges, edges, sizeof *m->edges, compare_rows);
    for (size_t e = 0; e < edges; e++)
        if (unique == 0 || compare_rows(m->edges[unique - 1], m->edges[e]) != 0)
            memmove(m->edges[unique++], m->edges[e], sizeof *m->edges);
    for (size_t e = 0; e < scene->element_count; e++)
        for (unsigned i = 0; i < side_count(scene->elements[e]); i++) {
            uint32_t row[2];
            side_of(scene->elements[e], i, row);
            const uint32_t(*found)[2] = bsearch(row, m->edges, unique, sizeof *m->edges, compare_rows);
            m->edge_owner[found - (const uint32_t(*)[2])m->edges] = (uint32_t)e;
        }
    m->mesh.vertex_count = (uint32_t)scene->vertex_count;
    m->mesh.edge_count = (uint32_t)unique;
    m->mesh.triangle_count = (uint32_t)triangles;
}

static void free_mesh(mesh_copy *m)
{
    void *const all[] = {m->edges, m->triangles, m->part, m->half, m->start, m->end, m->driven, m->edge_owner,
                         m->vertex_owner, m->element_triangle, m->boxes.vertices, m->boxes.edges, m->boxes.triangles};
    for (size_t i = 0; i < sizeof all / sizeof *all; i++)
        free(all[i]);
}

static bool copy_mesh(const bench_scene *scene, double push, mesh_copy *m)
{
    static const uint64_t none_muted = 0;
    const size_t n = scene->vertex_count, e = scene->element_count;
    memset(m, 0, sizeof *m);
    m->edges = malloc(3 * e * sizeof *m->edges);
    m->triangles = malloc(e * sizeof *m->triangles);
    m->part = calloc(n, sizeof(uint32_t));
    m->half = malloc((n + 3 * e) * sizeof(double));
    m->start = malloc(n * sizeof *m->start);
    m->end = malloc(n * sizeof *m->end);
    m->driven = calloc(n, 1);
    m->edge_owner = malloc(3 * e * sizeof(uint32_t));
    m->vertex_owner = malloc(n * sizeof(uint32_t));
    m->element_triangle = malloc(e * sizeof(uint32_t));
    m->boxes = (rdli_boxes){malloc(n * sizeof(rdl_box)), malloc(3 * e * sizeof(rdl_box)), malloc(e * sizeof(rdl_box)), {0}};
    if (m->edges == NULL || m->triangles == NULL || m->part == NULL || m->half == NULL || m->start == NULL ||
        m->end == NULL || m->driven == NULL || m->edge_owner == NULL || m->vertex_owner == NULL ||
        m->element_triangle == NULL || m->boxes.vertices == NULL || m->boxes.edges == NULL || m->boxes.triangles == NULL)
        return false;
    copy_topology(scene, m);
    for (size_t i = 0; i < n + 3 * e; i++)
        m->half[i] = scene->half;
    for (size_t v = 0; v < n; v++)
        for (int k = 0; k < 3; k++) {
            m->start[v][k] = (double)scene->start[v][k];
            m->end[v][k] = (double)scene->end[v][k] + (k == 1 ? push : 0);
        }
    m->motion = (rdli_motion){(const double(*)[3])m->start, (const double(*)[3])m->end, NULL};
    m->mesh.part_count = 1;
    m->mesh.edges = (const uint32_t(*)[2])m->edges;
    m->mesh.triangles = (const uint32_t(*)[3])m->triangles;
    m->mesh.vertex_part = m->part;
    m->mesh.vertex_half = m->mesh.edge_half = m->mesh.triangle_half = m->half;
    m->mesh.muted = &none_muted;
    m->mesh.driven = m->driven;
    return true;
}

static double count_touches(const bench_scene *scene, const mesh_copy *m, int kind, const rdli_pair *pairs, size_t count)
{
    double found = 0;
    for (size_t i = 0; i < count; i += SAMPLE) {
        uint32_t vertices[4] = {pairs[i].first};
        if (kind == RDL_EDGE_EDGE) {
            memcpy(vertices, m->edges[pairs[i].first], sizeof *m->edges);
            memcpy(vertices + 2, m->edges[pairs[i].second], sizeof *m->edges);
        } else {
            memcpy(vertices + 1, m->triangles[pairs[i].second], sizeof *m->triangles);
        }
        rdl_motion motion;
        for (int k = 0; k < 4; k++) {
            memcpy(motion.start[k], m->start[vertices[k]], sizeof motion.start[k]);
            memcpy(motion.end[k], m->end[vertices[k]], sizeof motion.end[k]);
        }
        double gap = 2 * scene->half;
        rdl_touch touch;
        if (rdl_find_touches(kind, 1, &motion, &gap, &touch, NULL) == RDL_OK)
            found += touch.touches * SAMPLE;
    }
    return found;
}

static bool overlap(const rdl_box *a, const rdl_box *b)
{
    return a->lo[0] <= b->hi[0] && b->lo[0] <= a->hi[0] && a->lo[1] <= b->hi[1] && b->lo[1] <= a->hi[1] &&
           a->lo[2] <= b->hi[2] && b->lo[2] <= a->hi[2];
}

/* Representative assignment (Curtis, Tamstorf, Manocha 2008): every vertex and edge belongs to one element; each pair of
 * elements whose boxes overlap tries what belongs to the two. */
typedef struct assignment {
    const bench_scene *scene;
    const mesh_copy *m;
    uint32_t (*own_edges)[3], (*own_vertices)[3]; /* per element; UINT32_MAX where there are fewer */
    size_t pairs;
} assignment;

static void try_vertices(assignment *a, uint32_t owner, uint32_t other)
{
    if (side_count(a->scene->elements[other]) != 3)
        return;
    uint32_t triangle = a->m->element_triangle[other];
    for (int i = 0; i < 3 && a->own_vertices[owner][i] != UINT32_MAX; i++) {
        uint32_t v = a->own_vertices[owner][i];
        const uint32_t *t = a->m->triangles[triangle];
        a->pairs += v != t[0] && v != t[1] && v != t[2] &&
                    overlap(&a->m->boxes.vertices[v], &a->m->boxes.triangles[triangle]);
    }
}

static void try_elements(void *user, unsigned worker, const uint32_t (*pairs)[2], size_t count)
{
    (void)worker;
    assignment *a = user;
    for (size_t p = 0; p < count; p++) {
        const uint32_t *mine = a->own_edges[pairs[p][0]], *other = a->own_edges[pairs[p][1]];
        for (int i = 0; i < 3 && mine[i] != UINT32_MAX; i++)
            for (int j = 0; j < 3 && other[j] != UINT32_MAX; j++) {
                const uint32_t *e = a->m->edges[mine[i]], *f = a->m->edges[other[j]];
                a->pairs += e[0] != f[0] && e[0] != f[1] && e[1] != f[0] && e[1] != f[1] &&
                            overlap(&a->m->boxes.edges[mine[i]], &a->m->boxes.edges[other[j]]);
            }
        try_vertices(a, pairs[p][0], pairs[p][1]);
        try_vertices(a, pairs[p][1], pairs[p][0]);
    }
}

static void list_owned(uint32_t (*owned)[3], size_t elements, const uint32_t *owner, size_t count)
{
    memset(owned, 0xFF, elements * sizeof *owned);
    for (size_t i = 0; i < count; i++) {
        int k = 0;
        while (owned[owner[i]][k] != UINT32_MAX)
            k++;
        owned[owner[i]][k] = (uint32_t)i;
    }
}

static bool measure_assignment(const bench_scene *scene, const mesh_copy *m, bench_lists *lists)
{
    const rdl_host host = {.size = sizeof host, .threads = 1};
    rdl_tree *tree = NULL;
    assignment a = {.scene = scene, .m = m};
    const size_t count = scene->element_count;
    rdl_box *boxes = malloc(count * sizeof *boxes);
    a.own_edges = malloc(count * sizeof *a.own_edges);
    a.own_vertices = malloc(count * sizeof *a.own_vertices);
    bool fine = boxes != NULL && a.own_edges != NULL && a.own_vertices != NULL;
    if (fine) {
        list_owned(a.own_edges, count, m->edge_owner, m->mesh.edge_count);
        list_owned(a.own_vertices, count, m->vertex_owner, m->mesh.vertex_count);
        for (size_t e = 0; e < count; e++) {
            boxes[e] = m->boxes.triangles[m->element_triangle[e]];
            if (side_count(scene->elements[e]) == 1)
                boxes[e] = m->boxes.edges[a.own_edges[e][0]];
        }
        fine = rdl_tree_create(boxes, count, &host, &tree, NULL) == RDL_OK;
    }
    for (int run = 0; fine && run < RUNS; run++) {
        a.pairs = 0;
        double before = seconds();
        fine = rdl_tree_update(tree, boxes, NULL) == RDL_OK && rdl_tree_self_pairs(tree, NULL, try_elements, &a) == RDL_OK;
        keep_least(&lists->assigned_seconds, seconds() - before);
    }
    lists->assigned_pairs = a.pairs;
    rdl_tree_destroy(tree);
    free(boxes);
    free(a.own_edges);
    free(a.own_vertices);
    return fine;
}

/* The least time of several runs; near: with the certificate. */
static bool time_broad(rdli_broad *broad, const mesh_copy *m, bool near, double *best, rdli_pairs *pairs)
{
    bool fine = true;
    for (int run = 0; fine && run < RUNS; run++) {
        double before = seconds();
        fine = (near ? rdli_broad_near_pairs(broad, &m->mesh, &m->motion, &m->boxes, pairs)
                     : rdli_broad_pairs(broad, &m->mesh, &m->boxes, NULL, pairs)) == RDL_OK;
        keep_least(best, seconds() - before);
    }
    return fine && !pairs->more;
}

static size_t count_pairs(const rdli_pairs *pairs)
{
    return pairs->point_triangle_count + pairs->edge_edge_count;
}

typedef struct bench_stage {
    rdli_memory memory;
    rdli_workers *workers;
    rdli_broad *broad;
} bench_stage;

static bool open_stage(bench_stage *stage, unsigned threads)
{
    static const rdl_host hosts[2] = {{.size = sizeof(rdl_host), .threads = 1}, {.size = sizeof(rdl_host), .threads = 2}};
    memset(stage, 0, sizeof *stage);
    bool fine = rdli_memory_init(&stage->memory, NULL) == RDL_OK &&
                rdli_workers_create(&stage->memory, &hosts[threads - 1], &stage->workers) == RDL_OK &&
                rdli_broad_create(&stage->memory, stage->workers, &stage->broad) == RDL_OK;
    if (fine)
        rdli_broad_limit(stage->broad, SIZE_MAX); /* all pairs at once, to count them */
    return fine;
}

static void close_stage(bench_stage *stage)
{
    rdli_broad_destroy(stage->broad);
    if (stage->workers != NULL)
        rdli_workers_destroy(&stage->memory, stage->workers);
}

static bool same_list(const rdli_pair *a, size_t count_a, const rdli_pair *b, size_t count_b)
{
    return count_a == count_b && (count_a == 0 || memcmp(a, b, count_a * sizeof *a) == 0);
}

/* Wall time of near lists, trees with one thread and with two in turn. */
static bool measure_threads(const mesh_copy *m, bench_lists *lists)
{
    enum { TURNS = 8 };
    bench_stage stages[2];
    rdli_pairs pairs[2];
    bool fine = open_stage(&stages[0], 1);
    fine = open_stage(&stages[1], 2) && fine;
    for (int turn = 0; fine && turn <= TURNS; turn++)
        for (int i = 0; i < 2; i++) {
            struct timespec before, after;
            clock_gettime(CLOCK_MONOTONIC, &before);
            fine = fine && rdli_broad_near_pairs(stages[i].broad, &m->mesh, &m->motion, &m->boxes, &pairs[i]) == RDL_OK;
            clock_gettime(CLOCK_MONOTONIC, &after);
            if (turn > 0)
                keep_least(&lists->near_wall[i], (double)(after.tv_sec - before.tv_sec) +
                                                     1e-9 * (double)(after.tv_nsec - before.tv_nsec));
        }
    fine = fine && same_list(pairs[0].point_triangle, pairs[0].point_triangle_count, pairs[1].point_triangle,
                             pairs[1].point_triangle_count) &&
           same_list(pairs[0].edge_edge, pairs[0].edge_edge_count, pairs[1].edge_edge, pairs[1].edge_edge_count);
    close_stage(&stages[0]);
    close_stage(&stages[1]);
    return fine;
}

static bool measure_broad(const bench_scene *scene, mesh_copy *m, bench_lists *lists)
{
    bench_stage stage;
    rdli_pairs pairs = {0};
    bool fine = open_stage(&stage, 1);
    for (int run = 0; fine && run < RUNS; run++) {
        double before = seconds();
        rdli_bounds_fill(&m->mesh, &m->motion, stage.workers, &m->boxes);
        keep_least(&lists->boxes, seconds() - before);
    }
    fine = fine && time_broad(stage.broad, m, true, &lists->near_seconds, &pairs);
    lists->near_pairs = count_pairs(&pairs);
    lists->bytes = (double)stage.memory.bytes_in_use;
    lists->touches = count_touches(scene, m, RDL_POINT_TRIANGLE, pairs.point_triangle, pairs.point_triangle_count) +
                     count_touches(scene, m, RDL_EDGE_EDGE, pairs.edge_edge, pairs.edge_edge_count);
    fine = fine && time_broad(stage.broad, m, false, &lists->box_seconds, &pairs);
    lists->box_pairs = count_pairs(&pairs);
    close_stage(&stage);
    return fine && measure_threads(m, lists);
}

/* What culling within sheets could save at most: every sheet a part that ignores itself. */
static bool measure_culled(const bench_scene *scene, mesh_copy *m, bench_lists *lists)
{
    enum { PARTS = 32 };
    uint64_t muted[PARTS * PARTS / 64] = {0};
    bench_stage stage;
    rdli_pairs pairs = {0};
    const size_t sheets = scene->layout.sheets, side = scene->layout.side;
    if (sheets == 0 || sheets >= PARTS)
        return true;
    for (size_t v = 0; v < scene->vertex_count; v++)
        m->part[v] = (uint32_t)(v < scene->layout.sheet_vertices ? v / (side * side) : sheets);
    for (size_t p = 0; p < sheets; p++)
        muted[p * PARTS / 64 + p / 64] |= 1ull << (p * PARTS + p) % 64;
    m->mesh.part_count = PARTS;
    m->mesh.muted = muted;
    bool fine = open_stage(&stage, 1);
    fine = fine && time_broad(stage.broad, m, true, &lists->culled_near_seconds, &pairs);
    fine = fine && time_broad(stage.broad, m, false, &lists->culled_seconds, &pairs);
    lists->culled_pairs = count_pairs(&pairs);
    close_stage(&stage);
    return fine;
}

bool bench_lists_measure(const bench_scene *scene, double push, bench_lists *lists)
{
    mesh_copy m;
    memset(lists, 0, sizeof *lists);
    lists->boxes = lists->box_seconds = lists->near_seconds = lists->assigned_seconds = 1e9;
    lists->culled_seconds = lists->culled_near_seconds = lists->near_wall[0] = lists->near_wall[1] = 1e9;
    bool fine = copy_mesh(scene, push, &m);
    fine = fine && measure_broad(scene, &m, lists) && measure_assignment(scene, &m, lists) && measure_culled(scene, &m, lists);
    lists->vertex_count = m.mesh.vertex_count;
    lists->edge_count = m.mesh.edge_count;
    lists->triangle_count = m.mesh.triangle_count;
    free_mesh(&m);
    return fine;
}
