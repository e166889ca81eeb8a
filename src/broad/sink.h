/* broad/sink.h: where traversal tasks put pairs: one array handed out to the workers in chunks, and the sort.
 * Included by the broad folder only. */
#ifndef RDLI_SINK_H
#define RDLI_SINK_H

#include "base/workers.h"
#include "flow/pairs.h"

enum { RDLI_CHUNK = 2048 }; /* pairs; a worker leaves at most one chunk partly empty */

typedef struct rdli_sink_worker {
    rdli_pair *next, *end; /* of the chunk in hand */
    size_t found;          /* pairs, also those that found no room */
    char padding[64 - 3 * sizeof(void *)]; /* one cache line a worker */
} rdli_sink_worker;

typedef struct rdli_sink {
    rdli_room raw, sorted, scratch, count_room, worker_room;
    size_t chunks;         /* room of raw */
    size_t next_chunk;     /* taken with atomic additions */
    bool full;
    rdli_sink_worker *workers;
    unsigned worker_count;
} rdli_sink;

/* Empties the sink, with room for at least `pairs` pairs beside one started chunk per worker. */
rdl_status rdli_sink_open(rdli_memory *memory, rdli_sink *sink, unsigned workers, size_t pairs);
/* A fresh chunk for this worker; without room it gives the worker's spare chunk again and marks the sink as full. */
void rdli_sink_turn(rdli_sink *sink, unsigned worker);
static inline void rdli_sink_put(rdli_sink *sink, unsigned worker, uint32_t first, uint32_t second)
{
    rdli_sink_worker *w = &sink->workers[worker];
    if (w->next == w->end)
        rdli_sink_turn(sink, worker);
    *w->next++ = (rdli_pair){first, second};
}
/* Closes the chunks; the number of pairs found. */
size_t rdli_sink_close(rdli_sink *sink);
/* Sorts what a sink that is closed and not full holds, by (first, second); first < firsts, second < seconds. */
rdl_status rdli_sink_sort(rdli_memory *memory, rdli_sink *sink, size_t count, uint32_t firsts, uint32_t seconds,
                          const rdli_pair **pairs);
void rdli_sink_release(rdli_memory *memory, rdli_sink *sink);

#endif
