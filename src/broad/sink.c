/* broad/sink.c: see sink.h. */
#include "broad/sink.h"

rdl_status rdli_sink_open(rdli_memory *memory, rdli_sink *sink, unsigned workers, size_t pairs)
{
    /* A chunk may stay short by one row less one pair. */
    size_t chunks = sink->emit != NULL ? 0 : pairs / (RDLI_CHUNK - RDLI_CHUNK_ROW + 1) + 1 + workers;
    /* Behind the chunks that are handed out lies one spare chunk per worker. */
    if (!rdli_room_reserve(memory, &sink->raw, chunks + workers, RDLI_CHUNK * sizeof(rdli_pair), false))
        return RDL_NO_MEMORY;
    size_t room = sink->raw.bytes / (RDLI_CHUNK * sizeof(rdli_pair));
    if (!rdli_room_reserve(memory, &sink->used_room, room, sizeof(uint32_t), false) ||
        !rdli_room_reserve(memory, &sink->worker_room, workers, sizeof(rdli_sink_worker), false))
        return RDL_NO_MEMORY;
    sink->used = sink->used_room.data;
    sink->chunks = sink->emit != NULL ? 0 : room - workers;
    sink->next_chunk = 0;
    sink->full = false;
    sink->workers = sink->worker_room.data;
    sink->worker_count = workers;
    memset(sink->workers, 0, workers * sizeof(rdli_sink_worker));
    return RDL_OK;
}

static void close_chunk(rdli_sink *sink, unsigned worker)
{
    rdli_sink_worker *w = &sink->workers[worker];
    const rdli_pair *begin = rdli_sink_chunk(sink, w->chunk);
    size_t count = (size_t)(w->next - begin);
    sink->used[w->chunk] = (uint32_t)count;
    w->found += count;
    if (sink->emit != NULL && count > 0) /* a pair is two plain ids in a row: see api/tree.c */
        sink->emit(sink->emit_user, worker, (const uint32_t(*)[2])(const void *)begin, count);
}

void rdli_sink_turn(rdli_sink *sink, unsigned worker)
{
    rdli_sink_worker *w = &sink->workers[worker];
    if (w->limit != NULL)
        close_chunk(sink, worker);
    size_t chunk = sink->chunks;
    if (sink->emit == NULL && !__atomic_load_n(&sink->full, __ATOMIC_RELAXED))
        chunk = __atomic_fetch_add(&sink->next_chunk, 1, __ATOMIC_RELAXED);
    if (chunk >= sink->chunks) {
        chunk = sink->chunks + worker;
        __atomic_store_n(&sink->full, true, __ATOMIC_RELAXED);
    }
    w->chunk = chunk;
    w->next = (rdli_pair *)sink->raw.data + chunk * RDLI_CHUNK;
    w->limit = w->next + RDLI_CHUNK - RDLI_CHUNK_ROW + 1;
}

size_t rdli_sink_close(rdli_sink *sink)
{
    size_t total = 0;
    for (unsigned k = 0; k < sink->worker_count; k++) {
        if (sink->workers[k].limit != NULL)
            close_chunk(sink, k);
        sink->workers[k].limit = NULL;
        total += sink->workers[k].found;
    }
    sink->full = sink->full && sink->emit == NULL;
    if (sink->next_chunk > sink->chunks)
        sink->next_chunk = sink->chunks;
    return total;
}

void rdli_sink_release(rdli_memory *memory, rdli_sink *sink)
{
    rdli_room_release(memory, &sink->raw);
    rdli_room_release(memory, &sink->used_room);
    rdli_room_release(memory, &sink->worker_room);
}
