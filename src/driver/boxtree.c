/* driver/boxtree.c: see boxtree.h. */
#include "driver/boxtree.h"

#include "base/workers.h"
#include "broad/selfpairs.h"

struct rdl_tree {
    rdli_memory memory;
    rdli_workers *workers;
    rdli_selfpairs *pairs;
    uint32_t count;
};

rdl_status rdli_boxtree_create(const rdl_host *host, const rdl_box *boxes, uint32_t count, rdl_tree **tree)
{
    rdli_memory memory;
    rdl_status status = rdli_memory_init(&memory, host);
    if (status != RDL_OK)
        return status;
    rdl_tree *made = rdli_take(&memory, 1, sizeof *made);
    if (made == NULL)
        return RDL_NO_MEMORY;
    memset(made, 0, sizeof *made);
    made->memory = memory;
    made->count = count;
    status = rdli_workers_create(&made->memory, host, &made->workers);
    if (status == RDL_OK)
        status = rdli_selfpairs_create(&made->memory, made->workers, boxes, count, &made->pairs);
    if (status != RDL_OK) {
        rdli_boxtree_destroy(made);
        return status;
    }
    *tree = made;
    return RDL_OK;
}

uint32_t rdli_boxtree_count(const rdl_tree *tree)
{
    return tree->count;
}

void rdli_boxtree_update(rdl_tree *tree, const rdl_box *boxes)
{
    rdli_selfpairs_update(tree->pairs, boxes);
}

rdl_status rdli_boxtree_self_pairs(rdl_tree *tree, const uint32_t *corners, rdl_emit_pairs *emit, void *user)
{
    return rdli_selfpairs_emit(tree->pairs, corners, emit, user);
}

void rdli_boxtree_use_vector(rdl_tree *tree, bool vector)
{
    rdli_selfpairs_use_vector(tree->pairs, vector);
}

void rdli_boxtree_limit(rdl_tree *tree, size_t pairs_max)
{
    rdli_selfpairs_limit(tree->pairs, pairs_max);
}

size_t rdli_boxtree_bytes(const rdl_tree *tree)
{
    return tree->memory.bytes_in_use;
}

void rdli_boxtree_destroy(rdl_tree *tree)
{
    if (tree == NULL)
        return;
    rdli_selfpairs_destroy(tree->pairs);
    rdli_workers_destroy(&tree->memory, tree->workers);
    rdli_memory memory = tree->memory;
    rdli_give(&memory, tree, 1, sizeof *tree);
}
