/* broad/tree.h: a box tree of eight-wide packs without pointers. Included by the broad folder and driver/boxtree.c only.
 *
 * `order` lists the elements so that neighbours in space are neighbours in the list (build.c). Pack k of level 0 holds
 * the boxes of the elements order[8k .. 8k+7]; box i of pack k of level l > 0 encloses pack 8k+i of level l-1. The last
 * level has one pack. Unused places hold an empty box (lo = +infinity, hi = -infinity), which overlaps nothing. */
#ifndef RDLI_TREE_H
#define RDLI_TREE_H

#include "base/workers.h"
#include "raddle/tree.h"

enum {
    RDLI_WIDE = 8,    /* one AVX register of floats */
    RDLI_LEVELS = 11  /* 8^11 > 2^31 elements */
};

typedef struct rdli_pack {
    float lo[3][RDLI_WIDE], hi[3][RDLI_WIDE];
} rdli_pack;

typedef struct rdli_tree {
    uint32_t count;
    unsigned levels;
    uint32_t pack_count[RDLI_LEVELS];
    rdli_pack *packs[RDLI_LEVELS]; /* into pack_room */
    uint32_t *order;
    rdli_room pack_room, order_room, item_room, sum_room;
    double built_spread; /* looseness right after the last build; see rdli_tree_update */
} rdli_tree;

/* Makes room for `count` elements and builds. The tree must be zero-initialised or built before.
 * RDL_NO_MEMORY leaves an empty tree. */
rdl_status rdli_tree_build(rdli_memory *memory, rdli_workers *workers, rdli_tree *tree, const rdl_box *boxes, uint32_t count);
/* Refits the packs to moved boxes, and builds anew when the packs have become loose: when the sum over all level-0 packs
 * of the extent that exceeds the mean extent of their elements is more than half above its value after the last
 * build. The choice never changes which pairs are found. Allocates nothing. */
void rdli_tree_update(rdli_workers *workers, rdli_tree *tree, const rdl_box *boxes);
void rdli_tree_release(rdli_memory *memory, rdli_tree *tree);

/* build.c: sorts tree->order by recursive median splits (item_room is scratch). */
void rdli_tree_arrange(rdli_workers *workers, rdli_tree *tree, const rdl_box *boxes);

#endif
