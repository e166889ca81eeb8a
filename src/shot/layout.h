/* shot/layout.h: the datasets of /frames, as docs/shot-file.md specifies them. Included by src/shot only.
 * Writer and reader walk the same table, so that a dataset is described once. */
#ifndef RDLI_SHOT_LAYOUT_H
#define RDLI_SHOT_LAYOUT_H

#include <hdf5.h>

#include "raddle/shot.h"

enum { RDLI_SHOT_VERSION = 1, RDLI_MEMORY_VERSION = 1 };

typedef enum rdli_set {
    RDLI_SET_TIME,
    RDLI_SET_PICTURE,
    RDLI_SET_START,
    RDLI_SET_PROPOSED,
    RDLI_SET_DELIVERED,
    RDLI_SET_DIGEST,
    RDLI_SET_VERDICT,
    RDLI_SET_WAYPOINT_FIRST,
    RDLI_SET_WAYPOINT_TIME,
    RDLI_SET_WAYPOINT_POSITION,
    RDLI_SET_MEMORY,
    RDLI_SET_MEMORY_BYTES,
    RDLI_SET_DURATION,
    RDLI_SET_SECONDS_MAX,
    RDLI_SET_PASSES_MAX,
    RDLI_SET_MASS_FIRST,
    RDLI_SET_MASS,
    RDLI_SET_MUTED_FIRST,
    RDLI_SET_MUTED_PARTS,
    RDLI_SET_COUNT
} rdli_set;

/* How many rows a dataset has: one per frame, one per frame and one more, one per item that the fences count, one per
 * byte. */
typedef enum rdli_rows { RDLI_ROWS_FRAMES, RDLI_ROWS_FENCES, RDLI_ROWS_ITEMS, RDLI_ROWS_BYTES } rdli_rows;

typedef enum rdli_item {
    RDLI_ITEM_F64,
    RDLI_ITEM_U8,
    RDLI_ITEM_U32,
    RDLI_ITEM_U64,
    RDLI_ITEM_SPAN,
    RDLI_ITEM_BYTE
} rdli_item;

/* Where a frame's memory lies among the memory bytes. */
typedef struct rdli_span {
    uint64_t first, bytes;
} rdli_span;

typedef struct rdli_set_plan {
    const char *name;  /* inside /frames */
    const char *field; /* as named in a fault */
    unsigned content;  /* the RDL_SHOT_... bit that asks for it; 0: always there */
    rdli_rows rows;
    rdli_item item;
    int rank; /* 1: (rows), 2: (rows, width), 3: (rows, N, 3) */
    int width; /* of rank 2; 0: N */
} rdli_set_plan;

extern const rdli_set_plan rdli_set_plans[RDLI_SET_COUNT];

/* The second extent of a dataset of rank 2 or 3. */
uint64_t rdli_set_width(const rdli_set_plan *set, size_t vertex_count);

/* HDF5's type in memory and in a file for an item; the caller closes both. A negative id: HDF5 had no memory. */
hid_t rdli_item_memory_type(rdli_item item);
hid_t rdli_item_file_type(rdli_item item);

#endif
