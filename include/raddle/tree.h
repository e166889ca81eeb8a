/* raddle/tree.h: the broad phase on its own: which boxes overlap? Boxes are closed.
 * Usable from C17 and C++17. */
#ifndef RADDLE_TREE_H
#define RADDLE_TREE_H

#include <stddef.h>
#include <stdint.h>

#include "host.h"
#include "status.h"

#ifdef __cplusplus
extern "C" {
#endif

typedef struct rdl_box {
    float lo[3], hi[3];
} rdl_box;

typedef struct rdl_tree rdl_tree;

/* Called with blocks of pairs, pairs[k][0] < pairs[k][1]. May run on several threads at once, never twice at once
 * with one worker number; worker < threads. pairs is valid during the call. */
typedef void rdl_emit_pairs(void *user, unsigned worker, const uint32_t (*pairs)[2], size_t count);

/* Builds a tree over `count` boxes (count 0 is fine). The boxes are copied. host (or NULL) must outlive the tree.
 * Errors: RDL_NOT_FINITE, RDL_BAD_BOX (index = box, field "boxes"), RDL_TOO_LARGE, RDL_NO_MEMORY. */
RDL_API rdl_status rdl_tree_create(const rdl_box boxes[], size_t count, const rdl_host *host, rdl_tree **tree,
                                   rdl_fault *fault);
/* The same number of boxes, moved: refits or rebuilds, its own choice. On error the tree is as it was. */
RDL_API rdl_status rdl_tree_update(rdl_tree *tree, const rdl_box boxes[], rdl_fault *fault);
/* Emits each unordered pair of overlapping boxes once. corners: NULL, or count x 4 vertex ids (unused corners repeat
 * corner 0): pairs that share a corner are left out. The set is deterministic; with one thread the order too (sorted).
 * The tree is not changed, but one tree serves one call at a time. */
RDL_API rdl_status rdl_tree_self_pairs(const rdl_tree *tree, const uint32_t *corners, rdl_emit_pairs *emit, void *user);
/* Bytes that the tree holds. */
RDL_API size_t rdl_tree_bytes(const rdl_tree *tree);
RDL_API void rdl_tree_destroy(rdl_tree *tree);

#ifdef __cplusplus
}
#endif
#endif
