/* broad/selfpairs.c: see selfpairs.h. */
#include "broad/selfpairs.h"

#include "broad/walk.h"

struct rdli_selfpairs {
    rdli_memory *memory;
    rdli_workers *workers;
    rdli_tree tree;
    rdli_walk walk;
    rdli_sink sink;
};

static bool keep_all(const void *rules, uint32_t a, uint32_t b)
{
    (void)rules;
    (void)a;
    (void)b;
    return true;
}

static bool keep_disjoint(const void *rules, uint32_t a, uint32_t b)
{
    const uint32_t *corners_a = (const uint32_t *)rules + (size_t)a * 4, *corners_b = (const uint32_t *)rules + (size_t)b * 4;
    bool shared = false;
    for (unsigned i = 0; i < 4; i++)
        for (unsigned j = 0; j < 4; j++)
            shared |= corners_a[i] == corners_b[j];
    return !shared;
}

rdl_status rdli_selfpairs_create(rdli_memory *memory, rdli_workers *workers, const rdl_box *boxes, uint32_t count,
                                 rdli_selfpairs **pairs)
{
    rdli_selfpairs *made = rdli_take(memory, 1, sizeof *made);
    if (made == NULL)
        return RDL_NO_MEMORY;
    memset(made, 0, sizeof *made);
    made->memory = memory;
    made->workers = workers;
    rdl_status status = rdli_tree_build(memory, workers, &made->tree, boxes, count);
    if (status != RDL_OK) {
        rdli_selfpairs_destroy(made);
        return status;
    }
    *pairs = made;
    return RDL_OK;
}

void rdli_selfpairs_update(rdli_selfpairs *pairs, const rdl_box *boxes)
{
    rdli_tree_update(pairs->workers, &pairs->tree, boxes);
}

rdl_status rdli_selfpairs_find(rdli_selfpairs *pairs, const uint32_t *corners, const rdli_pair **list, size_t *count)
{
    rdli_walk *walk = &pairs->walk;
    walk->a.tree = walk->b.tree = &pairs->tree;
    walk->self = true;
    walk->keep = corners == NULL ? keep_all : keep_disjoint;
    walk->rules = corners;
    walk->sink = &pairs->sink;
    rdl_status status = rdli_walk_run(pairs->memory, pairs->workers, walk, count);
    if (status != RDL_OK)
        return status;
    return rdli_sink_sort(pairs->memory, walk->sink, *count, pairs->tree.count, pairs->tree.count, list);
}

void rdli_selfpairs_destroy(rdli_selfpairs *pairs)
{
    if (pairs == NULL)
        return;
    rdli_tree_release(pairs->memory, &pairs->tree);
    rdli_sink_release(pairs->memory, &pairs->sink);
    rdli_room_release(pairs->memory, &pairs->walk.visit_room);
    rdli_give(pairs->memory, pairs, 1, sizeof *pairs);
}
