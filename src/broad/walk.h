/* broad/walk.h: the dual traversal of two trees, or of one with itself. Included by the broad folder only. */
#ifndef RDLI_WALK_H
#define RDLI_WALK_H

#include "broad/sink.h"
#include "broad/tree.h"

/* What the walk must know of one side beside the boxes. marks[l][k] describes the children of pack k of level l. */
typedef struct rdli_marks {
    uint8_t driven; /* bit i: every vertex below child i is driven */
    uint8_t awake;  /* bit i: some vertex below child i is awake */
} rdli_marks;

typedef struct rdli_side {
    const rdli_tree *tree;
    const rdli_marks *marks[RDLI_LEVELS]; /* NULL in [0]: nothing is driven, everything is awake */
} rdli_side;

/* Keeps or drops a pair of elements whose boxes overlap. */
typedef bool rdli_keep(const void *rules, uint32_t a, uint32_t b);

typedef struct rdli_visit {
    unsigned level_a, level_b;
    uint32_t a, b; /* packs; in a walk of a tree with itself a == b at one level stands for the pack with itself */
} rdli_visit;

typedef struct rdli_walk {
    rdli_side a, b;
    bool self;        /* b is a: each unordered pair once, the lower number first */
    rdli_keep *keep;
    const void *rules;
    rdli_sink *sink;
    rdli_room visit_room;
    size_t visit_count;
} rdli_walk;

/* Finds all pairs; *count of them are then in walk->sink (closed). The sink grows until they have room.
 * Errors: RDL_NO_MEMORY, RDL_CANCELLED. */
rdl_status rdli_walk_run(rdli_memory *memory, rdli_workers *workers, rdli_walk *walk, size_t *count);

#endif
