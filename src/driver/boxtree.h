/* driver/boxtree.h: the object behind rdl_tree: memory, workers and one tree of the broad phase. Included by api/tree.c. */
#ifndef RDLI_BOXTREE_H
#define RDLI_BOXTREE_H

#include "base/memory.h"
#include "flow/pairs.h"
#include "raddle/tree.h"

/* boxes are valid. Errors: RDL_BAD_ARGUMENT (host), RDL_NO_MEMORY. */
rdl_status rdli_boxtree_create(const rdl_host *host, const rdl_box *boxes, uint32_t count, rdl_tree **tree);
uint32_t rdli_boxtree_count(const rdl_tree *tree);
void rdli_boxtree_update(rdl_tree *tree, const rdl_box *boxes);
/* Sorted pairs, owned by the tree until its next call. */
rdl_status rdli_boxtree_self_pairs(rdl_tree *tree, const uint32_t *corners, const rdli_pair **pairs, size_t *count);
size_t rdli_boxtree_bytes(const rdl_tree *tree);
void rdli_boxtree_destroy(rdl_tree *tree);

#endif
