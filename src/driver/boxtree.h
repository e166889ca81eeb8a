/* driver/boxtree.h: the object behind rdl_tree: memory, workers and one tree of the broad phase. Included by api/tree.c. */
#ifndef RDLI_BOXTREE_H
#define RDLI_BOXTREE_H

#include "base/memory.h"
#include "raddle/tree.h"

/* The box checks of raddle/tree.h are made here, where there are workers for them; all other arguments are valid. */
rdl_status rdli_boxtree_create(const rdl_host *host, const rdl_box *boxes, uint32_t count, rdl_tree **tree,
                               rdl_fault *fault);
uint32_t rdli_boxtree_count(const rdl_tree *tree);
rdl_status rdli_boxtree_update(rdl_tree *tree, const rdl_box *boxes, rdl_fault *fault);
rdl_status rdli_boxtree_self_pairs(rdl_tree *tree, const uint32_t *corners, rdl_emit_pairs *emit, void *user);
/* For tests: portable code only, and how many pairs may be kept at once. The pairs stay the same. */
void rdli_boxtree_use_vector(rdl_tree *tree, bool vector);
void rdli_boxtree_limit(rdl_tree *tree, size_t pairs_max);
size_t rdli_boxtree_bytes(const rdl_tree *tree);
void rdli_boxtree_destroy(rdl_tree *tree);

#endif
