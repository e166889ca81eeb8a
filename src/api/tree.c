/* api/tree.c: rdl_tree_...: argument checks, then the driver's box tree. */
#include "driver/boxtree.h"

static const size_t COUNT_MAX = 0x7FFFFFFF;

/* Names the first box that is not finite or has lo > hi. */
static rdl_status check_boxes(const rdl_box *boxes, size_t count, rdl_fault *fault)
{
    for (size_t i = 0; i < count; i++) {
        const rdl_box *box = &boxes[i];
        bool finite = true, ordered = true;
        for (unsigned k = 0; k < 3; k++) {
            finite &= isfinite(box->lo[k]) && isfinite(box->hi[k]);
            ordered &= box->lo[k] <= box->hi[k];
        }
        if (!finite)
            return rdli_fault_set(fault, RDL_NOT_FINITE, "boxes", i);
        if (!ordered)
            return rdli_fault_set(fault, RDL_BAD_BOX, "boxes", i);
    }
    return RDL_OK;
}

rdl_status rdl_tree_create(const rdl_box boxes[], size_t count, const rdl_host *host, rdl_tree **tree, rdl_fault *fault)
{
    if (tree == NULL)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "tree", 0);
    if (boxes == NULL && count != 0)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "boxes", 0);
    if (count > COUNT_MAX)
        return rdli_fault_set(fault, RDL_TOO_LARGE, "count", count);
    rdl_status status = check_boxes(boxes, count, fault);
    if (status != RDL_OK)
        return status;
    status = rdli_boxtree_create(host, boxes, (uint32_t)count, tree);
    return status == RDL_OK ? RDL_OK : rdli_fault_set(fault, status, status == RDL_BAD_ARGUMENT ? "host" : "tree", 0);
}

rdl_status rdl_tree_update(rdl_tree *tree, const rdl_box boxes[], rdl_fault *fault)
{
    if (tree == NULL)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "tree", 0);
    size_t count = rdli_boxtree_count(tree);
    if (boxes == NULL && count != 0)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "boxes", 0);
    rdl_status status = check_boxes(boxes, count, fault);
    if (status == RDL_OK)
        rdli_boxtree_update(tree, boxes);
    return status;
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
