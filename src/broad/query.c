/* broad/query.c: tasks and room of a query; the work itself is in kernels_body.h. */
#include "broad/kernels.h"

enum { FIRST_LIST = 2048 }; /* list entries to start with: far more than cloth and strands need; 224 KiB a worker */

typedef struct query_job {
    rdli_query *query;
    const rdli_kernels *kernels;
    rdli_workers *workers;
    bool cancelled;
} query_job;

/* Words of a bit set over b's elements and of its two summaries. */
static size_t bit_room(const rdli_query *query)
{
    return query->bit_words + query->bit_words / 64 + 1 + query->bit_words / 4096 + 1;
}

/* Cuts one worker's share out of the common block at base; its size. Every piece is a multiple of 32 bytes long. */
static size_t lay_out(const rdli_query *query, rdli_scratch *scratch, char *base)
{
    const size_t list = query->list_room + RDLI_WIDE; /* an append writes eight places */
    size_t at = 0;
    for (rdli_list *part = &scratch->group; part != NULL; part = part == &scratch->group ? &scratch->pack : NULL) {
        for (unsigned k = 0; k < 3; k++) {
            part->lo[k] = (float *)(void *)(base + at);
            part->hi[k] = part->lo[k] + list;
            at += 2 * list * sizeof(float);
        }
        part->packs = (uint32_t *)(void *)(base + at);
        part->highest = part->packs + list;
        at += 2 * list * sizeof(uint32_t);
    }
    scratch->near = (uint32_t *)(void *)(base + at);
    at += list * sizeof(uint32_t);
    scratch->hits = (uint64_t *)(void *)(base + at);
    at += list * sizeof(uint64_t);
    scratch->row = (uint32_t *)(void *)(base + at);
    at += (list + 4) * RDLI_WIDE * sizeof(uint32_t); /* lanes_rank reads on */
    scratch->bits = (uint64_t *)(void *)(base + at);
    at += (bit_room(query) * sizeof(uint64_t) + 63) / 64 * 64;
    scratch->block = (rdli_pair *)(void *)(base + at);
    at += query->emit == NULL ? 0 : RDLI_EMIT_BLOCK * sizeof(rdli_pair);
    return at;
}

static rdl_status open_scratch(rdli_memory *memory, rdli_query *query, unsigned workers)
{
    rdli_scratch sizes;
    const size_t groups = query->a.tree->pack_count[1];
    query->bit_words = (size_t)query->b.tree->count / 64 + 1;
    if (query->list_room == 0)
        query->list_room = FIRST_LIST;
    size_t share = lay_out(query, &sizes, NULL);
    if (!rdli_room_reserve(memory, &query->scratch_room, workers, sizeof(rdli_scratch), false) ||
        !rdli_room_reserve(memory, &query->portion_room, workers, sizeof(rdli_portion), false) ||
        !rdli_room_reserve(memory, &query->done_room, groups, 1, false) ||
        !rdli_room_reserve(memory, &query->scratch_data_room, workers, share, false))
        return RDL_NO_MEMORY;
    query->scratch = query->scratch_room.data;
    query->portions = query->portion_room.data;
    query->done = query->done_room.data;
    memset(query->scratch, 0, workers * sizeof(rdli_scratch));
    for (unsigned w = 0; w < workers; w++) {
        lay_out(query, &query->scratch[w], (char *)query->scratch_data_room.data + w * share);
        memset(query->scratch[w].bits, 0, bit_room(query) * sizeof(uint64_t));
    }
    return RDL_OK;
}

/* Forgets what was found. */
static rdl_status open_rows(rdli_memory *memory, rdli_query *query, unsigned workers, size_t pairs)
{
    const uint32_t rows = query->emit == NULL ? query->a.tree->count : 0;
    rdl_status status = rdli_rows_open(memory, &query->rows, rows, workers, pairs);
    if (status != RDL_OK)
        return status;
    memset(query->portions, 0, workers * sizeof(rdli_portion));
    memset(query->done, 0, query->a.tree->pack_count[1]);
    return RDL_OK;
}

static void query_task(void *data, size_t group, unsigned worker)
{
    query_job *job = data;
    if (__atomic_load_n(&job->cancelled, __ATOMIC_RELAXED))
        return;
    if (worker == 0 && rdli_cancelled(job->workers))
        __atomic_store_n(&job->cancelled, true, __ATOMIC_RELAXED);
    job->kernels->match_group(job->query, (uint32_t)group, worker);
}

void rdli_query_flush(const rdli_query *query, unsigned worker)
{
    rdli_scratch *scratch = &query->scratch[worker];
    if (scratch->block_count > 0)
        query->emit(query->emit_user, worker, rdli_plain_pairs(scratch->block), scratch->block_count);
    scratch->block_count = 0;
}

/* Runs all groups that are not done. *found: pairs so far; *need: entries of the longest list. */
static bool run_groups(rdli_workers *workers, const rdli_kernels *kernels, rdli_query *query, size_t *found, size_t *need)
{
    query_job job = {query, kernels, workers, false};
    rdli_parallel_for(workers, query->a.tree->pack_count[1], query_task, &job);
    *found = *need = 0;
    for (unsigned w = 0; w < rdli_workers_count(workers); w++) {
        *found += query->portions[w].found;
        *need = *need > query->scratch[w].list_need ? *need : query->scratch[w].list_need;
        rdli_query_flush(query, w);
    }
    return !job.cancelled;
}

rdl_status rdli_query_run(rdli_memory *memory, rdli_workers *workers, const rdli_kernels *kernels, rdli_query *query,
                          size_t *count)
{
    const unsigned threads = rdli_workers_count(workers);
    *count = 0;
    if (query->a.tree->levels == 0 || query->b.tree->levels == 0)
        return rdli_rows_open(memory, &query->rows, query->a.tree->count, threads, 0);
    rdl_status status = open_scratch(memory, query, threads);
    if (status == RDL_OK)
        status = open_rows(memory, query, threads, 0);
    while (status == RDL_OK) {
        size_t found, need;
        if (!run_groups(workers, kernels, query, &found, &need))
            return RDL_CANCELLED;
        *count = found;
        /* More room than asked for, so that slowly growing contact does not search twice in every step. */
        if (need > query->list_room - RDLI_WIDE) {
            query->list_room = (need + need / 4 + 3 * RDLI_WIDE) / RDLI_WIDE * RDLI_WIDE;
            status = open_scratch(memory, query, threads);
        } else if (found > query->pairs_max) {
            status = RDL_TOO_LARGE;
        } else if (query->rows.full) {
            status = open_rows(memory, query, threads, found + found / 8);
        } else {
            break;
        }
    }
    return status;
}

void rdli_query_release(rdli_memory *memory, rdli_query *query)
{
    rdli_rows_release(memory, &query->rows);
    rdli_room_release(memory, &query->scratch_room);
    rdli_room_release(memory, &query->scratch_data_room);
    rdli_room_release(memory, &query->portion_room);
    rdli_room_release(memory, &query->done_room);
}
