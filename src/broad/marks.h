/* broad/marks.h: one tree of the engine with what the rules need to know of its packs. Included by the broad folder only. */
#ifndef RDLI_MARKS_H
#define RDLI_MARKS_H

#include "broad/kernels.h"
#include "flow/mesh.h"

typedef struct rdli_marked_tree {
    rdli_tree tree;
    rdli_room mark_room, part_room, corner_room;
    uint32_t arranged; /* tree.arranged for which corners and parts were filled */
    rdli_side side;
} rdli_marked_tree;

/* The elements: `corner_count` vertices each, row after row. NULL: the vertices themselves. */
typedef struct rdli_elements {
    const uint32_t *vertices;
    unsigned corner_count;
    uint32_t count;
    const rdl_box *boxes;
} rdli_elements;

/* Builds or updates the tree and fills marked->side. awake: NULL or one flag per vertex. with_parts: some parts are
 * muted. Errors: RDL_NO_MEMORY. */
rdl_status rdli_marks_prepare(rdli_memory *memory, rdli_workers *workers, const rdli_kernels *kernels,
                              rdli_marked_tree *marked, const rdli_mesh *mesh, const rdli_elements *elements,
                              const uint8_t *awake, bool with_parts);
void rdli_marks_release(rdli_memory *memory, rdli_marked_tree *marked);

#endif
