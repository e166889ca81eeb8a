/* api/tree.c: rdl_tree_...: argument checks, then the driver's box tree. */
#include "driver/boxtree.h"

static const size_t COUNT_MAX = 0x7FFFFFFF;

rdl_status rdl_tree_create(const rdl_box boxes[], size_t count, const rdl_host *host, rdl_tree **tree, rdl_fault *fault)
{
    if (tree == NULL)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "tree", 0);
    if (boxes == NULL && count != 0)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "boxes", 0);
    if (count > COUNT_MAX)
        return rdli_fault_set(fault, RDL_TOO_LARGE, "count", count);
    return rdli_boxtree_create(host, boxes, (uint32_t)count, tree, fault);
}

rdl_status rdl_tree_update(rdl_tree *tree, const rdl_box boxes[], rdl_fault *fault)
{
    if (tree == NULL)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "tree", 0);
    if (boxes == NULL && rdli_boxtree_count(tree) != 0)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "boxes", 0);
    return rdli_boxtree_update(tree, boxes, fault);
}

rdl_status rdl_tree_self_pairs(const rdl_tree *tree, const uint32_t *corners, rdl_emit_pairs *emit, void *user)
{
    if (tree == NULL || emit == NULL)
        return RDL_BAD_ARGUMENT;
    /* What the caller sees of the tree does not change; its room may grow. */
    return rdli_boxtree_self_pairs((rdl_tree *)tree, corners, emit, user);
}

size_t rdl_tree_bytes(const rdl_tree *tree)
{
    return tree == NULL ? 0 : rdli_boxtree_bytes(tree);
}

void rdl_tree_destroy(rdl_tree *tree)
{
    rdli_boxtree_destroy(tree);
}
