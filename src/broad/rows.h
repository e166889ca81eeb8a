/* broad/rows.h: the pairs of each element, as rows: the first's number leads to its sorted seconds. Included by the broad
 * folder only. */
#ifndef RDLI_ROWS_H
#define RDLI_ROWS_H

#include "base/workers.h"
#include "flow/pairs.h"

enum { RDLI_PORTION = 16384 }; /* seconds that a worker takes at once from the common array: 64 KiB */

typedef struct rdli_row {
    uint64_t start; /* into seconds */
    uint32_t count;
    uint32_t reserved;
} rdli_row;

typedef struct rdli_rows {
    rdli_room row_room, second_room, sum_room, pair_room;
    rdli_row *rows;     /* one per first; count 0 where nothing was found */
    uint32_t row_count;
    uint32_t *seconds;
    size_t room;        /* of seconds */
    size_t next;        /* taken with atomic additions */
    bool full;
} rdli_rows;

/* What one worker holds of the rows; one cache line each. */
typedef struct rdli_portion {
    uint32_t *next, *limit;
    size_t found; /* pairs, also those that found no room */
    char padding[64 - 2 * sizeof(uint32_t *) - sizeof(size_t)];
} rdli_portion;

/* Empties all rows, with room for at least `pairs` pairs whatever the workers' portions waste. */
rdl_status rdli_rows_open(rdli_memory *memory, rdli_rows *rows, uint32_t row_count, unsigned workers, size_t pairs);
/* Room for `count` seconds, or NULL (and rows->full) when it is used up. */
uint32_t *rdli_rows_take(rdli_rows *rows, rdli_portion *portion, size_t count);
/* All rows as one list sorted by (first, second), valid until the next call. Errors: RDL_NO_MEMORY. */
rdl_status rdli_rows_list(rdli_memory *memory, rdli_workers *workers, rdli_rows *rows, const rdli_pair **pairs);
/* Where a row lies is known long before it is read, so its first lines can be on their way. */
static inline void rdli_rows_fetch(const rdli_rows *rows, uint32_t first, uint32_t end)
{
    enum { AHEAD = 8 };
    if (end - first > AHEAD) {
        const uint32_t *seconds = rows->seconds + rows->rows[first + AHEAD].start;
        __builtin_prefetch(seconds);
        __builtin_prefetch(seconds + 16);
    }
}

/* Pairs of first with `count` seconds. */
static inline void rdli_rows_copy(rdli_pair *restrict to, uint32_t first, const uint32_t *restrict seconds, uint32_t count)
{
    for (uint32_t i = 0; i < count; i++) {
        to[i].first = first;
        to[i].second = seconds[i];
    }
}

/* The list as the public callback takes it. */
static inline const uint32_t (*rdli_plain_pairs(const rdli_pair *pairs))[2]
{
    static_assert(sizeof(rdli_pair) == sizeof(uint32_t[2]), "a pair is two plain ids in a row");
    return (const uint32_t(*)[2])(const void *)pairs;
}

void rdli_rows_release(rdli_memory *memory, rdli_rows *rows);

#endif
