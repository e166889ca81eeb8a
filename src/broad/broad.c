/* broad/broad.c: the engine's broad phase: three trees, their marks, the filters, the sorted lists. */
#include "broad/broad.h"

#include "broad/walk.h"

enum { VERTICES, EDGES, TRIANGLES, KINDS };

enum { BLOCK = 512 }; /* packs per task */

typedef struct marked_tree {
    rdli_tree tree;
    rdli_room mark_room;
    rdli_marks *marks[RDLI_LEVELS];
} marked_tree;

struct rdli_broad {
    rdli_memory *memory;
    rdli_workers *workers;
    marked_tree trees[KINDS];
    rdli_walk walks[2];
    rdli_sink sinks[2]; /* point-triangle, edge-edge */
};

typedef struct rules {
    const rdli_mesh *mesh;
    const uint8_t *awake;
} rules;

typedef struct mark_job {
    marked_tree *tree;
    const rules *rules;
    unsigned kind, level;
} mark_job;

/* The vertices of an element. */
static unsigned vertices_of(const rdli_mesh *mesh, unsigned kind, uint32_t element, const uint32_t **own)
{
    if (kind == EDGES) {
        *own = mesh->edges[element];
        return 2;
    }
    *own = mesh->triangles[element];
    return 3;
}

static void mark_element(const mark_job *job, uint32_t element, bool *driven, bool *awake)
{
    const rules *r = job->rules;
    const uint32_t *vertices = &element;
    unsigned count = job->kind == VERTICES ? 1 : vertices_of(r->mesh, job->kind, element, &vertices);
    *driven = true;
    *awake = r->awake == NULL;
    for (unsigned i = 0; i < count; i++) {
        *driven &= r->mesh->driven[vertices[i]] != 0;
        *awake |= r->awake != NULL && r->awake[vertices[i]] != 0;
    }
}

static void mark_block(void *data, size_t block, unsigned worker)
{
    (void)worker;
    const mark_job *job = data;
    const rdli_tree *tree = &job->tree->tree;
    size_t count = tree->pack_count[job->level], end = (block + 1) * BLOCK < count ? (block + 1) * BLOCK : count;
    size_t inner = job->level == 0 ? tree->count : tree->pack_count[job->level - 1];
    for (size_t p = block * BLOCK; p < end; p++) {
        unsigned driven_bits = 0, awake_bits = 0;
        for (unsigned i = 0; i < RDLI_WIDE && p * RDLI_WIDE + i < inner; i++) {
            size_t child = p * RDLI_WIDE + i;
            bool driven, awake;
            if (job->level == 0) {
                mark_element(job, tree->order[child], &driven, &awake);
            } else {
                const rdli_marks *below = &job->tree->marks[job->level - 1][child];
                size_t under = job->level == 1 ? tree->count : tree->pack_count[job->level - 2];
                size_t used = under - child * RDLI_WIDE < RDLI_WIDE ? under - child * RDLI_WIDE : RDLI_WIDE;
                driven = below->driven == 0xFFu >> (RDLI_WIDE - used);
                awake = below->awake != 0;
            }
            driven_bits |= (unsigned)driven << i;
            awake_bits |= (unsigned)awake << i;
        }
        job->tree->marks[job->level][p] = (rdli_marks){(uint8_t)driven_bits, (uint8_t)awake_bits};
    }
}

static rdl_status prepare_tree(rdli_broad *broad, unsigned kind, const rdl_box *boxes, uint32_t count, const rules *r)
{
    marked_tree *marked = &broad->trees[kind];
    rdli_tree *tree = &marked->tree;
    if (tree->count != count || tree->levels == 0) {
        rdl_status status = rdli_tree_build(broad->memory, broad->workers, tree, boxes, count);
        if (status != RDL_OK)
            return status;
    } else {
        rdli_tree_update(broad->workers, tree, boxes);
    }
    size_t packs = 0;
    for (unsigned level = 0; level < tree->levels; level++)
        packs += tree->pack_count[level];
    if (!rdli_room_reserve(broad->memory, &marked->mark_room, packs, sizeof(rdli_marks), false))
        return RDL_NO_MEMORY;
    rdli_marks *next = marked->mark_room.data;
    mark_job job = {marked, r, kind, 0};
    for (unsigned level = 0; level < tree->levels; level++) {
        marked->marks[level] = next;
        next += tree->pack_count[level];
        job.level = level;
        rdli_parallel_for(broad->workers, ((size_t)tree->pack_count[level] + BLOCK - 1) / BLOCK, mark_block, &job);
    }
    return RDL_OK;
}

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

/* The rules that depend on the vertices alone; a and b lie in the parts of a[0] and b[0]. */
static bool may_meet(const rules *r, const uint32_t *a, unsigned count_a, const uint32_t *b, unsigned count_b)
{
    const rdli_mesh *mesh = r->mesh;
    bool driven = true, awake = r->awake == NULL;
    for (unsigned i = 0; i < count_a; i++) {
        driven &= mesh->driven[a[i]] != 0;
        awake |= r->awake != NULL && r->awake[a[i]] != 0;
    }
    for (unsigned j = 0; j < count_b; j++) {
        driven &= mesh->driven[b[j]] != 0;
        awake |= r->awake != NULL && r->awake[b[j]] != 0;
    }
    if (driven || !awake)
        return false;
    uint64_t bit = (uint64_t)mesh->vertex_part[a[0]] * mesh->part_count + mesh->vertex_part[b[0]];
    if (mesh->muted[bit / 64] >> (bit % 64) & 1)
        return false;
    for (unsigned i = 0; i < count_a; i++)
        for (unsigned j = 0; j < count_b; j++)
            if (a[i] == b[j] || (mesh->attachment_count != 0 && attached(mesh, a[i], b[j])))
                return false;
    return true;
}

static bool keep_edge_edge(const void *data, uint32_t a, uint32_t b)
{
    const rules *r = data;
    return may_meet(r, r->mesh->edges[a], 2, r->mesh->edges[b], 2);
}

static bool keep_point_triangle(const void *data, uint32_t vertex, uint32_t triangle)
{
    const rules *r = data;
    return may_meet(r, &vertex, 1, r->mesh->triangles[triangle], 3);
}

static void set_side(rdli_side *side, const marked_tree *marked)
{
    side->tree = &marked->tree;
    for (unsigned level = 0; level < marked->tree.levels; level++)
        side->marks[level] = marked->marks[level];
}

/* Walks trees a and b; the sorted list goes to *list. */
static rdl_status collect(rdli_broad *broad, unsigned which, unsigned a, unsigned b, rdli_keep *keep, const rules *r,
                          const rdli_pair **list, size_t *count)
{
    rdli_walk *walk = &broad->walks[which];
    set_side(&walk->a, &broad->trees[a]);
    set_side(&walk->b, &broad->trees[b]);
    walk->self = a == b;
    walk->keep = keep;
    walk->rules = r;
    walk->sink = &broad->sinks[which];
    rdl_status status = rdli_walk_run(broad->memory, broad->workers, walk, count);
    if (status != RDL_OK)
        return status;
    return rdli_sink_sort(broad->memory, walk->sink, *count, broad->trees[a].tree.count, broad->trees[b].tree.count, list);
}

rdl_status rdli_broad_create(rdli_memory *memory, rdli_workers *workers, rdli_broad **broad)
{
    rdli_broad *made = rdli_take(memory, 1, sizeof *made);
    if (made == NULL)
        return RDL_NO_MEMORY;
    memset(made, 0, sizeof *made);
    made->memory = memory;
    made->workers = workers;
    *broad = made;
    return RDL_OK;
}

void rdli_broad_destroy(rdli_broad *broad)
{
    if (broad == NULL)
        return;
    for (unsigned kind = 0; kind < KINDS; kind++) {
        rdli_tree_release(broad->memory, &broad->trees[kind].tree);
        rdli_room_release(broad->memory, &broad->trees[kind].mark_room);
    }
    for (unsigned which = 0; which < 2; which++) {
        rdli_sink_release(broad->memory, &broad->sinks[which]);
        rdli_room_release(broad->memory, &broad->walks[which].visit_room);
    }
    rdli_give(broad->memory, broad, 1, sizeof *broad);
}

rdl_status rdli_broad_pairs(rdli_broad *broad, const rdli_mesh *mesh, const rdli_boxes *boxes, const uint8_t *awake,
                            rdli_pairs *pairs)
{
    const rules r = {mesh, awake};
    rdli_pairs found = {0};
    rdl_status status = prepare_tree(broad, VERTICES, boxes->vertices, mesh->vertex_count, &r);
    if (status == RDL_OK)
        status = prepare_tree(broad, EDGES, boxes->edges, mesh->edge_count, &r);
    if (status == RDL_OK)
        status = prepare_tree(broad, TRIANGLES, boxes->triangles, mesh->triangle_count, &r);
    if (status == RDL_OK)
        status = collect(broad, 0, VERTICES, TRIANGLES, keep_point_triangle, &r, &found.point_triangle,
                         &found.point_triangle_count);
    if (status == RDL_OK)
        status = collect(broad, 1, EDGES, EDGES, keep_edge_edge, &r, &found.edge_edge, &found.edge_edge_count);
    if (status == RDL_OK)
        *pairs = found;
    return status;
}
