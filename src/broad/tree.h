/* broad/tree.h: a box tree of eight-wide packs without pointers. Included by the broad folder only.
 *
 * `order` lists the elements so that neighbours in space are neighbours in the list (build.c). Pack k of level 0 holds
 * the boxes of the elements order[8k .. 8k+7]; box i of pack k of level l > 0 encloses pack 8k+i of level l-1. Level
 * `levels` is one pack, the crown, whose box 0 encloses everything, so that every pack of the levels below has its box
 * in the pack above. Unused places hold an empty box (lo = +infinity, hi = -infinity), which overlaps nothing.
 *
 * Why no pointers: a refit then streams, a pack's box is found from its number, and the packs stay full. The price is
 * that all leaves lie at one depth; with eight children a node that costs less than half-filled packs do. */
#ifndef RDLI_TREE_H
#define RDLI_TREE_H

#include "base/workers.h"
#include "raddle/tree.h"

enum {
    RDLI_WIDE = 8,   /* one AVX register of floats */
    RDLI_LEVELS = 12 /* 8^11 > 2^31 elements, and the crown */
};

typedef struct rdli_pack {
    float lo[3][RDLI_WIDE], hi[3][RDLI_WIDE];
} rdli_pack;

struct rdli_kernels;

typedef struct rdli_tree {
    uint32_t count;
    unsigned levels;                 /* below the crown; 0 when count is 0 */
    uint32_t pack_count[RDLI_LEVELS];
    rdli_pack *packs[RDLI_LEVELS];   /* into pack_room */
    uint32_t *order;                 /* count entries, then copies of the last up to a full pack */
    uint32_t *lowest[RDLI_LEVELS];   /* lowest and highest element number below each pack; into number_room */
    uint32_t *highest[RDLI_LEVELS];
    uint32_t arranged;               /* grows with every new order */
    rdli_room pack_room, number_room, order_room, item_room, sum_room;
    double built_spread;             /* looseness right after the last build; see rdli_tree_refit */
} rdli_tree;

/* Makes room for `count` elements and builds. classes: NULL, or per element a class; classes share no packs, but for one a
 * level. The tree must be zero-initialised or built before. RDL_NO_MEMORY leaves an empty tree. */
rdl_status rdli_tree_build(rdli_memory *memory, rdli_workers *workers, const struct rdli_kernels *kernels, rdli_tree *tree,
                           const rdl_box *boxes, uint32_t count, const uint8_t *classes);
/* Fits the packs to moved boxes. stale: NULL, or one flag per level-0 pack, 0 where no box has changed since the last time.
 * True when the packs have become loose and the tree should be built anew. Looseness is the sum over the level-0 packs of
 * extent (dx + dy + dz) minus the mean extent of the pack's elements: what the packs add to the boxes themselves,
 * so that faster motion alone is not taken for decay. The rule: more than 1.5 times its value after the last
 * build, with stale NULL. Neither choice changes which pairs are found. Allocates nothing. */
bool rdli_tree_refit(rdli_workers *workers, const struct rdli_kernels *kernels, rdli_tree *tree, const rdl_box *boxes,
                     const uint8_t *stale);
/* Builds anew with the same count. Allocates nothing. */
void rdli_tree_rebuild(rdli_workers *workers, const struct rdli_kernels *kernels, rdli_tree *tree, const rdl_box *boxes,
                       const uint8_t *classes);
void rdli_tree_release(rdli_memory *memory, rdli_tree *tree);

/* build.c: fills tree->order (item_room is scratch). */
void rdli_tree_arrange(rdli_workers *workers, rdli_tree *tree, const rdl_box *boxes, const uint8_t *classes);

#endif
