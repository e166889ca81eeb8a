/* broad/walk.h: the dual traversal of two trees, or of one with itself. Included by the broad folder only. */
#ifndef RDLI_WALK_H
#define RDLI_WALK_H

#include "broad/sink.h"
#include "broad/tree.h"

#define RDLI_MIXED_PARTS UINT32_MAX /* no part, or several */

/* What the rules need to know of pack k of a level; bit i speaks of its child i. */
typedef struct rdli_marks {
    uint8_t driven;   /* every vertex below is driven */
    uint8_t awake;    /* some vertex below is awake */
    uint8_t attached; /* some vertex below has an attachment */
} rdli_marks;

/* One of the two trees, with the vertices of its elements in tree order: corner c of the element in place i of pack k is
 * corners[(k * corner_count + c) * 8 + i]. */
typedef struct rdli_side {
    const rdli_tree *tree;
    const uint32_t *corners;
    unsigned corner_count;                /* 0: pairs may share vertices */
    const rdli_marks *marks[RDLI_LEVELS]; /* all NULL: nothing driven, all awake, none attached */
    const uint32_t *parts[RDLI_LEVELS];   /* part of each pack, or RDLI_MIXED_PARTS; all NULL: none muted */
} rdli_side;

/* The last word on a pair of elements that passed all other tests; asked only about pairs whose packs are of mixed
 * parts or have attachments. */
typedef bool rdli_keep(const void *rules, const uint32_t *corners_a, const uint32_t *corners_b);

typedef struct rdli_visit {
    uint32_t a, b;            /* packs; in a walk of a tree with itself, a == b on one level means the pack with itself */
    uint8_t level_a, level_b;
    uint8_t check_parts;      /* 1: parts may still be muted */
    uint8_t reserved;
} rdli_visit;

typedef struct rdli_walk {
    rdli_side a, b;
    bool self;            /* b is a: each unordered pair once, the lower number first */
    bool ranged;          /* only pairs whose first lies in [range_lo, range_hi) */
    uint32_t range_lo, range_hi;
    const uint64_t *muted; /* matrix of flow/mesh.h, for the parts of whole packs */
    uint32_t part_count;
    rdli_keep *keep;
    const void *rules;
    rdli_sink *sink;
    rdli_room visit_room;
    size_t visit_count;
} rdli_walk;

struct rdli_kernels;

/* Finds all pairs; *count of them are then in walk->sink (closed). The sink grows until they have room.
 * Errors: RDL_NO_MEMORY, RDL_CANCELLED. */
rdl_status rdli_walk_run(rdli_memory *memory, rdli_workers *workers, const struct rdli_kernels *kernels, rdli_walk *walk,
                         size_t *count);

#endif
