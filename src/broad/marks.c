/* broad/marks.c: see marks.h. Corners and parts follow the order of the tree and change only with it; marks change with
 * the driven and awake flags and are filled in every call. */
#include "broad/marks.h"

enum { BLOCK = 512 }; /* packs per task */

typedef struct mark_job {
    rdli_marked_tree *marked;
    const rdli_elements *elements;
    const rdli_moment *moment;
    unsigned level;
    rdli_marks *marks[RDLI_LEVELS];
    uint32_t *parts[RDLI_LEVELS], *element_parts;
    uint32_t *corners;
} mark_job;

static size_t used_places(const rdli_tree *tree, unsigned level, size_t pack)
{
    size_t inner = level == 0 ? tree->count : tree->pack_count[level - 1];
    return inner - pack * RDLI_WIDE < RDLI_WIDE ? inner - pack * RDLI_WIDE : RDLI_WIDE;
}

static void block_range(const mark_job *job, size_t block, size_t *first, size_t *last)
{
    size_t count = job->marked->tree.pack_count[job->level];
    *first = block * BLOCK;
    *last = count - *first < BLOCK ? count : *first + BLOCK;
}

/* Tasks of the current level. */
static size_t blocks(const mark_job *job)
{
    const rdli_tree *tree = &job->marked->tree;
    return tree->levels == 0 ? 0 : ((size_t)tree->pack_count[job->level] + BLOCK - 1) / BLOCK;
}

static bool has_attachment(const rdli_mesh *mesh, uint32_t vertex)
{
    return mesh->attachment_count != 0 && mesh->attached_first[vertex] != mesh->attached_first[vertex + 1];
}

static bool is_driven(const rdli_mesh *mesh, uint32_t vertex)
{
    return mesh->driven != NULL && mesh->driven[vertex] != 0;
}

static rdli_marks mark_elements(const mark_job *job, size_t pack)
{
    const unsigned corner_count = job->elements->corner_count;
    const uint32_t *corners = job->marked->side.corners + pack * RDLI_WIDE * corner_count;
    unsigned driven = 0xFF, awake = job->moment->awake == NULL ? 0xFF : 0, attached = 0;
    for (unsigned c = 0; c < corner_count; c++)
        for (unsigned i = 0; i < RDLI_WIDE; i++) {
            uint32_t vertex = corners[c * RDLI_WIDE + i];
            driven &= ~((unsigned)!is_driven(job->moment->mesh, vertex) << i);
            awake |= (unsigned)(job->moment->awake != NULL && job->moment->awake[vertex] != 0) << i;
            attached |= (unsigned)has_attachment(job->moment->mesh, vertex) << i;
        }
    return (rdli_marks){(uint8_t)driven, (uint8_t)awake, (uint8_t)attached};
}

/* The unused places of a pack hold copies of its last element, so all eight bits can be looked at; unused places of
 * inner packs count as driven and asleep, which changes nothing. */
static void mark_block(void *data, size_t block, unsigned worker)
{
    (void)worker;
    mark_job *job = data;
    size_t first, last;
    block_range(job, block, &first, &last);
    for (size_t p = first; p < last; p++) {
        if (job->level == 0) {
            job->marks[0][p] = mark_elements(job, p);
            continue;
        }
        unsigned driven = 0xFF, awake = 0, attached = 0;
        for (unsigned i = 0, used = (unsigned)used_places(&job->marked->tree, job->level, p); i < used; i++) {
            const rdli_marks *below = &job->marks[job->level - 1][p * RDLI_WIDE + i];
            driven &= ~((unsigned)(below->driven != 0xFF) << i);
            awake |= (unsigned)(below->awake != 0) << i;
            attached |= (unsigned)(below->attached != 0) << i;
        }
        job->marks[job->level][p] = (rdli_marks){(uint8_t)driven, (uint8_t)awake, (uint8_t)attached};
    }
}

static void corner_block(void *data, size_t block, unsigned worker)
{
    (void)worker;
    mark_job *job = data;
    const unsigned corner_count = job->elements->corner_count;
    const uint32_t *vertices = job->elements->vertices;
    size_t first, last;
    block_range(job, block, &first, &last);
    uint32_t *to = job->corners + first * RDLI_WIDE * corner_count;
    for (size_t p = first; p < last; p++)
        for (unsigned c = 0; c < corner_count; c++)
            for (unsigned i = 0; i < RDLI_WIDE; i++) {
                uint32_t element = job->marked->tree.order[p * RDLI_WIDE + i];
                *to++ = vertices == NULL ? element : vertices[(size_t)element * corner_count + c];
            }
}

static void part_block(void *data, size_t block, unsigned worker)
{
    (void)worker;
    mark_job *job = data;
    const unsigned corner_count = job->elements->corner_count;
    size_t first, last;
    block_range(job, block, &first, &last);
    for (size_t p = first; p < last; p++) {
        for (size_t i = 0; job->level == 0 && i < RDLI_WIDE; i++)
            job->element_parts[p * RDLI_WIDE + i] =
                job->moment->mesh->vertex_part[job->corners[p * RDLI_WIDE * corner_count + i]];
        const uint32_t *below = (job->level == 0 ? job->element_parts : job->parts[job->level - 1]) + p * RDLI_WIDE;
        uint32_t part = below[0];
        for (size_t i = 1, used = used_places(&job->marked->tree, job->level, p); i < used; i++)
            part = part == below[i] ? part : RDLI_MIXED_PARTS;
        job->parts[job->level][p] = part;
    }
}

static void each_level(rdli_workers *workers, mark_job *job, rdl_task *task)
{
    const rdli_tree *tree = &job->marked->tree;
    if (tree->levels == 0)
        return;
    for (job->level = 0; job->level <= tree->levels; job->level++)
        rdli_parallel_for(workers, blocks(job), task, job);
}

static bool reserve(rdli_memory *memory, mark_job *job)
{
    rdli_marked_tree *marked = job->marked;
    const rdli_tree *tree = &marked->tree;
    size_t packs = 0, places = (size_t)tree->pack_count[0] * RDLI_WIDE * job->elements->corner_count;
    for (unsigned level = 0; level <= tree->levels; level++)
        packs += tree->pack_count[level];
    if (!rdli_room_reserve(memory, &marked->mark_room, packs, sizeof(rdli_marks), false) ||
        !rdli_room_reserve(memory, &marked->stale_room, tree->pack_count[0], 1, false) ||
        !rdli_room_reserve(memory, &marked->corner_room, places, sizeof(uint32_t), false))
        return false;
    size_t part_count = job->moment->with_parts ? packs + (size_t)tree->pack_count[0] * RDLI_WIDE : 0, next = 0;
    if (!rdli_room_reserve(memory, &marked->part_room, part_count, sizeof(uint32_t), false))
        return false;
    if (job->moment->with_parts)
        job->element_parts = (uint32_t *)marked->part_room.data + packs;
    for (unsigned level = 0; level <= tree->levels; level++) {
        job->marks[level] = (rdli_marks *)marked->mark_room.data + next;
        if (job->moment->with_parts)
            job->parts[level] = (uint32_t *)marked->part_room.data + next;
        next += tree->pack_count[level];
    }
    job->corners = marked->corner_room.data;
    return true;
}

/* The tree of the vertices: compares every box with what the pack still holds. */
static void moved_block(void *data, size_t block, unsigned worker)
{
    (void)worker;
    mark_job *job = data;
    const rdli_tree *tree = &job->marked->tree;
    uint8_t *stale = job->marked->stale_room.data;
    size_t first, last;
    block_range(job, block, &first, &last);
    for (size_t p = first; p < last; p++) {
        stale[p] = 0;
        for (size_t i = 0, used = used_places(tree, 0, p); i < used; i++) {
            const uint32_t v = tree->order[p * RDLI_WIDE + i];
            const rdl_box *box = &job->elements->boxes[v];
            unsigned differs = 0;
            for (unsigned k = 0; k < 3; k++)
                differs |= (unsigned)(box->lo[k] != tree->packs[0][p].lo[k][i]) |
                           (unsigned)(box->hi[k] != tree->packs[0][p].hi[k][i]);
            job->moment->moved[v] = (uint8_t)differs;
            stale[p] |= (uint8_t)differs;
        }
    }
}

/* The other trees: looks at the vertices. */
static void stale_block(void *data, size_t block, unsigned worker)
{
    (void)worker;
    mark_job *job = data;
    uint8_t *stale = job->marked->stale_room.data;
    const size_t corners = (size_t)job->elements->corner_count * RDLI_WIDE;
    size_t first, last;
    block_range(job, block, &first, &last);
    for (size_t p = first; p < last; p++) {
        stale[p] = 0;
        for (size_t c = p * corners; c < (p + 1) * corners; c++)
            stale[p] |= job->moment->moved[job->marked->side.corners[c]];
    }
}

/* Elements that ignore each other are kept in packs of their own: those that are driven, and, where parts are muted and
 * few enough that the upper levels still sort by place, those of each part. */
static void find_classes(uint8_t *classes, const rdli_elements *elements, const rdli_moment *moment)
{
    enum { PARTS_MAX = 32 };
    const rdli_mesh *mesh = moment->mesh;
    const bool by_part = moment->with_parts && mesh->part_count <= PARTS_MAX;
    for (uint32_t e = 0; e < elements->count; e++) {
        const uint32_t *vertices = elements->vertices == NULL ? &e : elements->vertices + (size_t)e * elements->corner_count;
        unsigned driven = 1;
        for (unsigned c = 0; c < elements->corner_count; c++)
            driven &= is_driven(mesh, vertices[c]);
        classes[e] = (uint8_t)(driven | (by_part ? mesh->vertex_part[vertices[0]] << 1 : 0));
    }
}

/* Brings the tree up to date. */
static rdl_status update_tree(rdli_memory *memory, rdli_workers *workers, const rdli_kernels *kernels, mark_job *job,
                              rdli_moment *moment)
{
    rdli_marked_tree *marked = job->marked;
    rdli_tree *tree = &marked->tree;
    const rdli_elements *elements = job->elements;
    if (!rdli_room_reserve(memory, &marked->class_room, elements->count, 1, false))
        return RDL_NO_MEMORY;
    if (tree->count != elements->count || tree->levels == 0) {
        moment->moved = NULL;
        find_classes(marked->class_room.data, elements, moment);
        return rdli_tree_build(memory, workers, kernels, tree, elements->boxes, elements->count, marked->class_room.data);
    }
    if (moment->moved == NULL || marked->arranged != tree->arranged) {
        moment->moved = NULL;
        if (rdli_tree_refit(workers, kernels, tree, elements->boxes, NULL)) {
            find_classes(marked->class_room.data, elements, moment);
            rdli_tree_rebuild(workers, kernels, tree, elements->boxes, marked->class_room.data);
        }
        return RDL_OK;
    }
    job->level = 0;
    rdli_parallel_for(workers, blocks(job), elements->vertices == NULL ? moved_block : stale_block, job);
    rdli_tree_refit(workers, kernels, tree, elements->boxes, marked->stale_room.data);
    return RDL_OK;
}

rdl_status rdli_marks_prepare(rdli_memory *memory, rdli_workers *workers, const rdli_kernels *kernels,
                              rdli_marked_tree *marked, const rdli_elements *elements, rdli_moment *moment)
{
    rdli_tree *tree = &marked->tree;
    mark_job job = {.marked = marked, .elements = elements, .moment = moment};
    rdl_status status = update_tree(memory, workers, kernels, &job, moment);
    if (status != RDL_OK)
        return status;
    if (tree->levels > 0 && !reserve(memory, &job))
        return RDL_NO_MEMORY;
    marked->side = (rdli_side){.tree = tree, .corners = job.corners, .corner_count = elements->corner_count};
    if (marked->arranged != tree->arranged) {
        job.level = 0;
        rdli_parallel_for(workers, blocks(&job), corner_block, &job);
        marked->arranged = tree->arranged;
    }
    if (moment->with_parts && marked->parts_arranged != tree->arranged) {
        each_level(workers, &job, part_block);
        marked->parts_arranged = tree->arranged;
    }
    marked->side.element_parts = job.element_parts;
    each_level(workers, &job, mark_block);
    for (unsigned level = 0; tree->levels > 0 && level <= tree->levels; level++) {
        marked->side.marks[level] = job.marks[level];
        marked->side.parts[level] = job.parts[level];
    }
    return RDL_OK;
}

void rdli_marks_release(rdli_memory *memory, rdli_marked_tree *marked)
{
    rdli_tree_release(memory, &marked->tree);
    rdli_room_release(memory, &marked->mark_room);
    rdli_room_release(memory, &marked->part_room);
    rdli_room_release(memory, &marked->corner_room);
    rdli_room_release(memory, &marked->stale_room);
    rdli_room_release(memory, &marked->class_room);
}
