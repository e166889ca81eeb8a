/* broad/broad.c: the engine's broad phase: three trees, the rules, the sorted lists. */
#include "broad/broad.h"

#include "broad/marks.h"

enum { VERTICES, EDGES, TRIANGLES, KINDS };

struct rdli_broad {
    rdli_memory *memory;
    rdli_workers *workers;
    const rdli_kernels *kernels;
    rdli_marked_tree trees[KINDS];
    rdli_query queries[2]; /* point-triangle, edge-edge */
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

static bool any_muted(const rdli_mesh *mesh)
{
    uint64_t bits = (uint64_t)mesh->part_count * mesh->part_count;
    for (uint64_t w = 0; w < (bits + 63) / 64; w++)
        if (mesh->muted[w] != 0)
            return true;
    return false;
}

/* Point-triangle (which = 0) or edge-edge pairs (1). */
static rdl_status collect(rdli_broad *broad, unsigned which, const rdli_mesh *mesh, const rdli_pair **list, size_t *count)
{
    rdli_query *query = &broad->queries[which];
    query->a = broad->trees[which == 0 ? VERTICES : EDGES].side;
    query->b = broad->trees[which == 0 ? TRIANGLES : EDGES].side;
    query->self = which == 1;
    query->range_lo = 0;
    query->range_hi = INT32_MAX;
    query->pairs_max = SIZE_MAX;
    query->muted = mesh->muted;
    query->part_count = mesh->part_count;
    query->keep = which == 0 ? keep_point_triangle : keep_edge_edge;
    query->rules = mesh;
    query->records = broad->apart.records;
    query->vertices_b = which == 0 ? (const uint32_t *)mesh->triangles : (const uint32_t *)mesh->edges;
    rdl_status status = rdli_query_run(broad->memory, broad->workers, broad->kernels, query, count);
    return status == RDL_OK ? rdli_rows_list(broad->memory, broad->workers, &query->rows, list) : status;
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
    *broad = made;
    return RDL_OK;
}

void rdli_broad_destroy(rdli_broad *broad)
{
    if (broad == NULL)
        return;
    for (unsigned kind = 0; kind < KINDS; kind++)
        rdli_marks_release(broad->memory, &broad->trees[kind]);
    for (unsigned which = 0; which < 2; which++)
        rdli_query_release(broad->memory, &broad->queries[which]);
    rdli_room_release(broad->memory, &broad->apart.record_room);
    rdli_room_release(broad->memory, &broad->moved_room);
    rdli_give(broad->memory, broad, 1, sizeof *broad);
}

void rdli_broad_use_vector(rdli_broad *broad, bool vector)
{
    broad->kernels = rdli_kernels_choose(vector);
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
    rdli_pairs found = {0};
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
        status = rdli_apart_fill(broad->memory, broad->workers, &broad->apart, mesh, motion, &broad->trees[VERTICES].tree);
    if (status == RDL_OK)
        status = collect(broad, 0, mesh, &found.point_triangle, &found.point_triangle_count);
    if (status == RDL_OK)
        status = collect(broad, 1, mesh, &found.edge_edge, &found.edge_edge_count);
    if (status == RDL_OK)
        *pairs = found;
    return status;
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
