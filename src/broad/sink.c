/* broad/sink.c: see sink.h. */
#include "broad/sink.h"

rdl_status rdli_sink_open(rdli_memory *memory, rdli_sink *sink, unsigned workers, size_t pairs)
{
    size_t chunks = pairs / RDLI_CHUNK + 1 + workers;
    /* Behind the chunks that are handed out lies one spare chunk per worker, for counting once the room is used up. */
    if (!rdli_room_reserve(memory, &sink->raw, chunks + workers, RDLI_CHUNK * sizeof(rdli_pair), false) ||
        !rdli_room_reserve(memory, &sink->worker_room, workers, sizeof(rdli_sink_worker), false))
        return RDL_NO_MEMORY;
    sink->chunks = sink->raw.bytes / (RDLI_CHUNK * sizeof(rdli_pair)) - workers;
    sink->next_chunk = 0;
    sink->full = false;
    sink->workers = sink->worker_room.data;
    sink->worker_count = workers;
    memset(sink->workers, 0, workers * sizeof(rdli_sink_worker));
    return RDL_OK;
}

void rdli_sink_turn(rdli_sink *sink, unsigned worker)
{
    rdli_sink_worker *w = &sink->workers[worker];
    if (w->end != NULL)
        w->found += RDLI_CHUNK;
    size_t chunk = __atomic_fetch_add(&sink->next_chunk, 1, __ATOMIC_RELAXED);
    if (chunk >= sink->chunks) {
        chunk = sink->chunks + worker;
        __atomic_store_n(&sink->full, true, __ATOMIC_RELAXED);
    }
    w->next = (rdli_pair *)sink->raw.data + chunk * RDLI_CHUNK;
    w->end = w->next + RDLI_CHUNK;
}

size_t rdli_sink_close(rdli_sink *sink)
{
    size_t total = 0;
    const rdli_pair nothing = {UINT32_MAX, UINT32_MAX};
    for (unsigned k = 0; k < sink->worker_count; k++) {
        rdli_sink_worker *w = &sink->workers[k];
        if (w->end != NULL)
            w->found += RDLI_CHUNK - (size_t)(w->end - w->next);
        total += w->found;
        while (w->next != w->end)
            *w->next++ = nothing;
    }
    return total;
}

static void offsets_from_counts(size_t *counts, size_t buckets)
{
    size_t sum = 0;
    for (size_t i = 0; i < buckets; i++) {
        size_t here = counts[i];
        counts[i] = sum;
        sum += here;
    }
}

/* Two stable counting sorts, by second, then by first: linear whatever the distribution. */
rdl_status rdli_sink_sort(rdli_memory *memory, rdli_sink *sink, size_t count, uint32_t firsts, uint32_t seconds,
                          const rdli_pair **pairs)
{
    *pairs = NULL;
    if (count == 0)
        return RDL_OK;
    if (!rdli_room_reserve(memory, &sink->sorted, count, sizeof(rdli_pair), false) ||
        !rdli_room_reserve(memory, &sink->scratch, count, sizeof(rdli_pair), false) ||
        !rdli_room_reserve(memory, &sink->count_room, (size_t)firsts + seconds, sizeof(size_t), false))
        return RDL_NO_MEMORY;
    const rdli_pair *raw = sink->raw.data;
    rdli_pair *scratch = sink->scratch.data, *sorted = sink->sorted.data;
    size_t *by_first = sink->count_room.data, *by_second = by_first + firsts;
    size_t places = sink->next_chunk * RDLI_CHUNK;
    memset(by_first, 0, ((size_t)firsts + seconds) * sizeof(size_t));
    for (size_t i = 0; i < places; i++)
        if (raw[i].first != UINT32_MAX) {
            by_first[raw[i].first]++;
            by_second[raw[i].second]++;
        }
    offsets_from_counts(by_first, firsts);
    offsets_from_counts(by_second, seconds);
    for (size_t i = 0; i < places; i++)
        if (raw[i].first != UINT32_MAX)
            scratch[by_second[raw[i].second]++] = raw[i];
    for (size_t i = 0; i < count; i++)
        sorted[by_first[scratch[i].first]++] = scratch[i];
    *pairs = sorted;
    return RDL_OK;
}

void rdli_sink_release(rdli_memory *memory, rdli_sink *sink)
{
    rdli_room_release(memory, &sink->raw);
    rdli_room_release(memory, &sink->sorted);
    rdli_room_release(memory, &sink->scratch);
    rdli_room_release(memory, &sink->count_room);
    rdli_room_release(memory, &sink->worker_room);
}
