/* broad/sink.h: where traversal tasks put pairs: one array handed out to the workers in chunks. Included by the broad
 * folder only. */
#ifndef RDLI_SINK_H
#define RDLI_SINK_H

#include "base/workers.h"
#include "flow/pairs.h"
#include "raddle/tree.h"

enum {
    RDLI_CHUNK = 2048,  /* pairs; a worker leaves at most one chunk partly empty */
    RDLI_CHUNK_ROW = 8  /* pairs that a kernel may write at once, wanted or not */
};

typedef struct rdli_sink_worker {
    rdli_pair *next, *limit; /* no row may start at or after limit */
    size_t chunk;            /* in hand, if limit is not NULL */
    size_t found;            /* pairs in closed chunks, also those that found no room */
    char padding[64 - 2 * sizeof(rdli_pair *) - 2 * sizeof(size_t)]; /* one cache line a worker */
} rdli_sink_worker;

typedef struct rdli_sink {
    rdli_room raw, used_room, worker_room;
    uint32_t *used;    /* pairs in each chunk */
    size_t chunks;     /* that may be handed out */
    size_t next_chunk; /* taken with atomic additions */
    bool full;
    rdli_sink_worker *workers;
    unsigned worker_count;
    rdl_emit_pairs *emit; /* NULL, or called with every chunk at once instead of keeping it */
    void *emit_user;
} rdli_sink;

/* Empties the sink, with room for at least `pairs` pairs beside one started chunk per worker. */
rdl_status rdli_sink_open(rdli_memory *memory, rdli_sink *sink, unsigned workers, size_t pairs);
/* Closes this worker's chunk and gives it a fresh one; without room it gives the worker's spare chunk again and again and
 * marks the sink as full: then the pairs are only counted. */
void rdli_sink_turn(rdli_sink *sink, unsigned worker);
/* Closes all chunks; the number of pairs found. */
size_t rdli_sink_close(rdli_sink *sink);
void rdli_sink_release(rdli_memory *memory, rdli_sink *sink);

static inline const rdli_pair *rdli_sink_chunk(const rdli_sink *sink, size_t chunk)
{
    return (const rdli_pair *)sink->raw.data + chunk * RDLI_CHUNK;
}

#endif
