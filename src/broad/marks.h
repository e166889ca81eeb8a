/* broad/marks.h: one tree of the engine with what the rules need to know of its packs. Included by the broad folder only. */
#ifndef RDLI_MARKS_H
#define RDLI_MARKS_H

#include "broad/kernels.h"
#include "flow/mesh.h"

typedef struct rdli_marked_tree {
    rdli_tree tree;
    rdli_room mark_room, part_room, corner_room, stale_room, class_room;
    uint32_t arranged, parts_arranged; /* tree.arranged for which corners, and parts, were filled */
    rdli_side side;
} rdli_marked_tree;

/* The elements: `corner_count` vertices each, row after row. NULL: the vertices themselves. */
typedef struct rdli_elements {
    const uint32_t *vertices;
    unsigned corner_count;
    uint32_t count;
    const rdl_box *boxes;
} rdli_elements;

/* What one call of the broad phase knows. */
typedef struct rdli_moment {
    const rdli_mesh *mesh;
    const uint8_t *awake; /* NULL or one flag per vertex */
    bool with_parts;      /* some parts are muted */
    uint8_t *moved;       /* NULL, or room for one flag per vertex: its box is not that of the last call. Filled with the
                             tree of the vertices, which comes first; the boxes of elements change only with those */
} rdli_moment;

/* Builds or updates the tree and fills marked->side. Errors: RDL_NO_MEMORY. */
rdl_status rdli_marks_prepare(rdli_memory *memory, rdli_workers *workers, const rdli_kernels *kernels,
                              rdli_marked_tree *marked, const rdli_elements *elements, rdli_moment *moment);
void rdli_marks_release(rdli_memory *memory, rdli_marked_tree *marked);

#endif
