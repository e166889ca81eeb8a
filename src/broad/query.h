/* broad/query.h: which elements of one tree overlap which elements of another, or of the same? Included by the broad
 * folder only.
 *
 * The first tree is cut into groups of 64 elements, the packs of its level 1. For each group the second tree is searched
 * with the group's box for level-0 packs; these are then tried against the group's own packs, and their elements against
 * its elements. All that overlaps one element is thus found in one go, so its row can be sorted at once, in the first
 * cache, and groups are independent tasks of even size.
 *
 * A dual descent that meets each two packs only once does half the tests of a tree with itself, but scatters the pairs of
 * an element over its whole run, and bringing them together cost more than the tests did (measured: two thirds of the
 * time went into sorting). Here packs whose element numbers all lie below a group's are left out, which removes most of
 * the other half. */
#ifndef RDLI_QUERY_H
#define RDLI_QUERY_H

#include "broad/apart.h"
#include "broad/rows.h"
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
    const rdli_marks *marks[RDLI_LEVELS]; /* up to the crown; all NULL: nothing driven, all awake, none attached */
    const uint32_t *parts[RDLI_LEVELS];   /* part of each pack, or RDLI_MIXED_PARTS; all NULL: none muted */
    const uint32_t *element_parts;        /* with parts: of each element, in tree order */
} rdli_side;

/* The last word on a pair of elements that passed all other tests; asked only where both sides have attachments. */
typedef bool rdli_keep(const void *rules, const uint32_t *corners_a, const uint32_t *corners_b);

/* Level-0 packs that overlap something; the end is filled up to eight with places that overlap nothing. */
typedef struct rdli_list {
    float *lo[3], *hi[3];
    uint32_t *packs, *highest; /* number, and highest element number below */
} rdli_list;

/* One worker's room. Each stage filters what the stage before has left, in loops without inner branches. */
typedef struct rdli_scratch {
    rdli_list group, pack;    /* what overlaps the group, and one of its packs */
    uint32_t *near;           /* packs that overlap one element */
    uint64_t *hits;           /* 256 * pack + mask of its children that overlap the element */
    uint32_t *row;            /* those children that pass the rules */
    uint64_t *bits;           /* zero between rows; see kernels_body.h, sort_row */
    rdli_pair *block;         /* pairs that wait to be emitted */
    size_t list_need, block_count;
} rdli_scratch;

enum { RDLI_EMIT_BLOCK = 4096 }; /* pairs: 32 KiB, which stays in the first cache */

typedef struct rdli_query {
    rdli_side a, b;
    bool self;                    /* b is a: each unordered pair once, the lower number first */
    uint32_t range_lo, range_hi;  /* only elements of a with numbers in [lo, hi) */
    const uint64_t *muted;        /* matrix of flow/mesh.h */
    uint32_t part_count;
    rdli_keep *keep;
    const void *rules;
    const rdli_record *records;   /* NULL, or pairs that stay apart for sure are left out (apart_body.h) */
    const uint32_t *vertices_b;   /* with records: the vertices of b's elements, corner_count each, by element number */
    size_t pairs_max;             /* more are not kept: RDL_TOO_LARGE */
    rdl_emit_pairs *emit;         /* NULL: rows are kept; else pairs go out unsorted as they are found */
    void *emit_user;
    rdli_rows rows;
    rdli_room scratch_room, scratch_data_room, portion_room, done_room;
    rdli_scratch *scratch;        /* per worker */
    rdli_portion *portions;       /* per worker */
    uint8_t *done;                /* per group: 0 while the group waits for a longer list */
    size_t list_room;             /* entries of each worker's list; a multiple of 8 */
    size_t bit_words;
} rdli_query;

struct rdli_kernels;

/* Finds all pairs; *count of them are then in query->rows, or were emitted. Room grows until everything fits.
 * Errors: RDL_NO_MEMORY, RDL_CANCELLED, RDL_TOO_LARGE (pairs_max). After an error pairs may have been emitted already. */
rdl_status rdli_query_run(rdli_memory *memory, rdli_workers *workers, const struct rdli_kernels *kernels, rdli_query *query,
                          size_t *count);
void rdli_query_release(rdli_memory *memory, rdli_query *query);
/* Emits a worker's waiting pairs. */
void rdli_query_flush(const rdli_query *query, unsigned worker);

#endif
