/* tests/unit/broad/scene.c: see scene.h. */
#include "scene.h"

#include <check.h>
#include <math.h>

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

void place(scene *s, uint64_t seed, double motion)
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

scene *make_scene(uint64_t seed)
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

void free_scene(scene *s)
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

bool wanted(const scene *s, const uint8_t *awake, const uint32_t *a, unsigned na, const uint32_t *b, unsigned nb)
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

void mute(scene *s, uint32_t p, uint32_t q)
{
    uint64_t bits[2] = {(uint64_t)p * PARTS + q, (uint64_t)q * PARTS + p};
    for (int i = 0; i < 2; i++)
        s->muted[bits[i] / 64] |= 1ull << bits[i] % 64;
}

void attach(scene *s, uint32_t v, uint32_t w)
{
    for (uint32_t i = 0; i <= s->mesh.vertex_count; i++)
        s->attached_first[i] = (uint32_t)(i > v) + (uint32_t)(i > w);
    s->attached[0] = w;
    s->attached[1] = v;
    s->mesh.attachment_count = 1;
}

rdl_status open_stage(stage *st, unsigned threads, size_t fail_at)
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

void close_stage(stage *st)
{
    rdli_broad_destroy(st->broad);
    rdli_workers_destroy(&st->memory, st->workers);
    ck_assert_uint_eq(st->ledger.live, 0);
    ck_assert_uint_eq(st->memory.bytes_in_use, 0);
}

void fill(scene *s, stage *st)
{
    rdli_motion motion = {(const double(*)[3])s->start, (const double(*)[3])s->end, NULL};
    rdli_bounds_fill(&s->mesh, &motion, st->workers, &s->boxes);
}
