/* broad/broad.c: the engine's broad phase: three trees, the rules, the sorted lists. */
#include "broad/broad.h"

#include "broad/marks.h"

enum { VERTICES, EDGES, TRIANGLES, KINDS };
enum { POINT_TRIANGLE, EDGE_EDGE, EDGE_TRIANGLE, QUERIES };

/* Where the search for one kind of pairs stands. */
typedef struct stretch {
    uint32_t next, end; /* firsts that are to come */
    uint32_t length;    /* firsts whose pairs are likely to fit the budget */
} stretch;

struct rdli_broad {
    rdli_memory *memory;
    rdli_workers *workers;
    const rdli_kernels *kernels;
    rdli_marked_tree trees[KINDS];
    rdli_query queries[QUERIES];
    stretch stretches[QUERIES];
    size_t pairs_max;
    rdli_apart apart;
    rdli_room moved_room;
    bool settled; /* all trees are those of the last call's boxes */
};

static bool attached(const rdli_mesh *mesh, uint32_t v, uint32_t w)
{
    uint32_t lo = mesh->attached_first[v], hi = mesh->attached_first[v + 1];
    while (lo < hi) {
        uint32_t middle = lo + (hi - lo) / 2;
        if (mesh->attached[middle] == w)
            return true;
        if (mesh->attached[middle] < w)
            lo = middle + 1;
        else
            hi = middle;
    }
    return false;
}

static bool none_attached(const rdli_mesh *mesh, const uint32_t *a, unsigned count_a, const uint32_t *b, unsigned count_b)
{
    for (unsigned i = 0; i < count_a; i++)
        for (unsigned j = 0; j < count_b; j++)
            if (attached(mesh, a[i], b[j]))
                return false;
    return true;
}

static bool keep_edge_edge(const void *mesh, const uint32_t *a, const uint32_t *b)
{
    return none_attached(mesh, a, 2, b, 2);
}

static bool keep_point_triangle(const void *mesh, const uint32_t *a, const uint32_t *b)
{
    return none_attached(mesh, a, 1, b, 3);
}

static bool keep_edge_triangle(const void *mesh, const uint32_t *a, const uint32_t *b)
{
    return none_attached(mesh, a, 2, b, 3);
}

static bool any_muted(const rdli_mesh *mesh)
{
    uint64_t bits = (uint64_t)mesh->part_count * mesh->part_count;
    for (uint64_t w = 0; w < (bits + 63) / 64; w++)
        if (mesh->muted[w] != 0)
            return true;
    return false;
}

/* Pairs of firsts in [lo, hi). */
static rdl_status collect(rdli_broad *broad, unsigned which, const rdli_mesh *mesh, uint32_t lo, uint32_t hi,
                          size_t pairs_max, const rdli_pair **list, size_t *count)
{
    static const struct {
        unsigned a, b;
        rdli_keep *keep;
    } kinds[QUERIES] = {
        {VERTICES, TRIANGLES, keep_point_triangle}, {EDGES, EDGES, keep_edge_edge}, {EDGES, TRIANGLES, keep_edge_triangle}};
    rdli_query *query = &broad->queries[which];
    query->a = broad->trees[kinds[which].a].side;
    query->b = broad->trees[kinds[which].b].side;
    query->self = which == EDGE_EDGE;
    query->range_lo = lo;
    query->range_hi = hi;
    query->pairs_max = pairs_max;
    query->muted = mesh->muted;
    query->part_count = mesh->part_count;
    query->keep = kinds[which].keep;
    query->rules = mesh;
    query->records = which == EDGE_TRIANGLE ? NULL : broad->apart.records;
    query->vertices_b = which == EDGE_EDGE ? (const uint32_t *)mesh->edges : (const uint32_t *)mesh->triangles;
    rdl_status status = rdli_query_run(broad->memory, broad->workers, broad->kernels, query, count);
    return status == RDL_OK ? rdli_rows_list(broad->memory, broad->workers, &query->rows, list) : status;
}

/* The next stretch of firsts whose pairs are within the budget. What fitted is a good guess for the next call. */
static rdl_status next_stretch(rdli_broad *broad, unsigned which, const rdli_mesh *mesh, const rdli_pair **list, size_t *count)
{
    stretch *s = &broad->stretches[which];
    while (s->next < s->end) {
        const uint32_t left = s->end - s->next, span = left < s->length ? left : s->length;
        size_t found;
        rdl_status status = collect(broad, which, mesh, s->next, s->next + span, span > 1 ? broad->pairs_max : SIZE_MAX, list,
                                    &found);
        if (status == RDL_TOO_LARGE) { /* at least halved, so this ends */
            const double fitting = (double)span * ((double)broad->pairs_max / (double)found);
            s->length = fitting < 0.5 * span ? (uint32_t)fitting : span / 2;
            s->length += s->length == 0;
            continue;
        }
        if (status == RDL_OK) {
            s->next += span;
            *count = found;
            if (found < broad->pairs_max / 4)
                s->length = span < UINT32_MAX / 2 ? 2 * span : UINT32_MAX;
        }
        return status;
    }
    return RDL_OK;
}

rdl_status rdli_broad_more(rdli_broad *broad, const rdli_mesh *mesh, rdli_pairs *pairs)
{
    stretch *s = broad->stretches;
    rdli_pairs found = {0};
    rdl_status status = next_stretch(broad, POINT_TRIANGLE, mesh, &found.point_triangle, &found.point_triangle_count);
    if (status == RDL_OK && s[POINT_TRIANGLE].next == s[POINT_TRIANGLE].end)
        status = next_stretch(broad, EDGE_EDGE, mesh, &found.edge_edge, &found.edge_edge_count);
    if (status != RDL_OK)
        return status;
    found.more = s[POINT_TRIANGLE].next < s[POINT_TRIANGLE].end || s[EDGE_EDGE].next < s[EDGE_EDGE].end;
    *pairs = found;
    return RDL_OK;
}

rdl_status rdli_broad_create(rdli_memory *memory, rdli_workers *workers, rdli_broad **broad)
{
    rdli_broad *made = rdli_take(memory, 1, sizeof *made);
    if (made == NULL)
        return RDL_NO_MEMORY;
    memset(made, 0, sizeof *made);
    made->memory = memory;
    made->workers = workers;
    made->kernels = rdli_kernels_choose(true);
    rdli_broad_limit(made, RDLI_PAIRS_MAX);
    *broad = made;
    return RDL_OK;
}

void rdli_broad_destroy(rdli_broad *broad)
{
    if (broad == NULL)
        return;
    for (unsigned kind = 0; kind < KINDS; kind++)
        rdli_marks_release(broad->memory, &broad->trees[kind]);
    for (unsigned which = 0; which < QUERIES; which++)
        rdli_query_release(broad->memory, &broad->queries[which]);
    rdli_room_release(broad->memory, &broad->apart.record_room);
    rdli_room_release(broad->memory, &broad->moved_room);
    rdli_give(broad->memory, broad, 1, sizeof *broad);
}

void rdli_broad_use_vector(rdli_broad *broad, bool vector)
{
    broad->kernels = rdli_kernels_choose(vector);
}

void rdli_broad_limit(rdli_broad *broad, size_t pairs_max)
{
    broad->pairs_max = pairs_max;
    for (unsigned which = 0; which < QUERIES; which++)
        broad->stretches[which].length = UINT32_MAX;
}

/* motion NULL: no certificate. */
static rdl_status find_pairs(rdli_broad *broad, const rdli_mesh *mesh, const rdli_motion *motion, const rdli_boxes *boxes,
                             const uint8_t *awake, rdli_pairs *pairs)
{
    const rdli_elements elements[KINDS] = {
        {NULL, 1, mesh->vertex_count, boxes->vertices},
        {(const uint32_t *)mesh->edges, 2, mesh->edge_count, boxes->edges},
        {(const uint32_t *)mesh->triangles, 3, mesh->triangle_count, boxes->triangles},
    };
    rdli_moment moment = {mesh, awake, any_muted(mesh), NULL};
    rdl_status status = RDL_OK;
    if (!rdli_room_reserve(broad->memory, &broad->moved_room, mesh->vertex_count, 1, false))
        return RDL_NO_MEMORY;
    if (awake != NULL && broad->settled)
        moment.moved = broad->moved_room.data;
    broad->settled = false;
    for (unsigned kind = 0; kind < KINDS && status == RDL_OK; kind++)
        status = rdli_marks_prepare(broad->memory, broad->workers, broad->kernels, &broad->trees[kind], &elements[kind],
                                    &moment);
    broad->settled = status == RDL_OK;
    broad->apart.records = NULL;
    if (status == RDL_OK && motion != NULL)
        status = rdli_apart_fill(broad->memory, broad->workers, &broad->apart, mesh, motion, &broad->trees[VERTICES].tree,
                                 boxes->shift);
    if (status != RDL_OK)
        return status;
    broad->stretches[POINT_TRIANGLE].next = broad->stretches[EDGE_EDGE].next = 0;
    broad->stretches[POINT_TRIANGLE].end = mesh->vertex_count;
    broad->stretches[EDGE_EDGE].end = mesh->edge_count;
    return rdli_broad_more(broad, mesh, pairs);
}

rdl_status rdli_broad_near_pairs(rdli_broad *broad, const rdli_mesh *mesh, const rdli_motion *motion,
                                 const rdli_boxes *boxes, rdli_pairs *pairs)
{
    return find_pairs(broad, mesh, motion, boxes, motion->awake, pairs);
}

rdl_status rdli_broad_pairs(rdli_broad *broad, const rdli_mesh *mesh, const rdli_boxes *boxes, const uint8_t *awake,
                            rdli_pairs *pairs)
{
    return find_pairs(broad, mesh, NULL, boxes, awake, pairs);
}

rdl_status rdli_broad_couples_begin(rdli_broad *broad, const rdli_mesh *mesh, const rdli_boxes *boxes)
{
    const rdli_elements elements[KINDS] = {
        [EDGES] = {(const uint32_t *)mesh->edges, 2, mesh->edge_count, boxes->edges},
        [TRIANGLES] = {(const uint32_t *)mesh->triangles, 3, mesh->triangle_count, boxes->triangles},
    };
    rdl_status status = RDL_OK;
    broad->settled = false;
    for (unsigned kind = EDGES; kind < KINDS && status == RDL_OK; kind++) {
        rdli_moment moment = {mesh, NULL, any_muted(mesh), NULL};
        status = rdli_marks_prepare(broad->memory, broad->workers, broad->kernels, &broad->trees[kind], &elements[kind],
                                    &moment);
    }
    broad->stretches[EDGE_TRIANGLE].next = 0;
    broad->stretches[EDGE_TRIANGLE].end = mesh->edge_count;
    return status;
}

rdl_status rdli_broad_couples(rdli_broad *broad, const rdli_mesh *mesh, const rdli_pair **couples, size_t *count, bool *more)
{
    const stretch *s = &broad->stretches[EDGE_TRIANGLE];
    *count = 0;
    rdl_status status = next_stretch(broad, EDGE_TRIANGLE, mesh, couples, count);
    *more = s->next < s->end;
    return status;
}

void rdli_broad_couples_end(rdli_broad *broad)
{
    rdli_query *query = &broad->queries[EDGE_TRIANGLE];
    rdli_query_release(broad->memory, query);
    memset(query, 0, sizeof *query);
}
