/* broad/sort.c: two passes. The first spreads the pairs over buckets of neighbouring firsts; the second sorts every
 * bucket, which then fits the cache, by counting the firsts and by sorting each first's few seconds (kernels: sort_row).
 * No comparison sort: the pairs of one first are few, and where they are many they are sorted through a bit set. */
#include "broad/sort.h"

enum {
    BUCKETS_MAX = 1024,    /* write streams that the caches and the address translation still follow */
    BUCKET_PAIRS = 2048,   /* aim: 16 KiB of pairs in the first cache */
    BUCKET_FIRSTS = 4096,  /* aim: 16 KiB of counters */
    GROUPS_MAX = 64,       /* of chunks, each with counters of its own */
    SMALL = 16             /* pairs in a bucket for which counting all its firsts does not pay */
};

typedef struct sort_job {
    const rdli_sink *sink;
    const rdli_kernels *kernels;
    rdli_pair *parted, *sorted;
    size_t *counts;          /* counts[bucket * groups + group], then where the group's share of the bucket begins */
    size_t count, buckets, groups;
    unsigned shift;          /* bucket = first >> shift */
    uint32_t *counters;      /* per worker */
    uint64_t *bits;          /* per worker */
    size_t counter_stride, bits_stride, bit_words;
} sort_job;

static void chunk_range(const sort_job *job, size_t group, size_t *begin, size_t *end)
{
    *begin = job->sink->next_chunk * group / job->groups;
    *end = job->sink->next_chunk * (group + 1) / job->groups;
}

static void count_group(void *data, size_t group, unsigned worker)
{
    (void)worker;
    sort_job *job = data;
    size_t own[BUCKETS_MAX] = {0}, begin, end;
    chunk_range(job, group, &begin, &end);
    for (size_t c = begin; c < end; c++) {
        const rdli_pair *pairs = rdli_sink_chunk(job->sink, c);
        for (size_t i = 0, n = job->sink->used[c]; i < n; i++)
            own[pairs[i].first >> job->shift]++;
    }
    for (size_t b = 0; b < job->buckets; b++)
        job->counts[b * job->groups + group] = own[b];
}

static void part_group(void *data, size_t group, unsigned worker)
{
    (void)worker;
    sort_job *job = data;
    size_t begin, end;
    rdli_pair *next[BUCKETS_MAX];
    for (size_t b = 0; b < job->buckets; b++)
        next[b] = job->parted + job->counts[b * job->groups + group];
    chunk_range(job, group, &begin, &end);
    for (size_t c = begin; c < end; c++) {
        const rdli_pair *pairs = rdli_sink_chunk(job->sink, c);
        for (size_t i = 0, n = job->sink->used[c]; i < n; i++)
            *next[pairs[i].first >> job->shift]++ = pairs[i];
    }
}

static bool pair_before(rdli_pair a, rdli_pair b)
{
    return a.first < b.first || (a.first == b.first && a.second < b.second);
}

static void sort_small(const rdli_pair *from, rdli_pair *to, size_t count)
{
    for (size_t i = 0; i < count; i++) {
        size_t k = i;
        for (; k > 0 && pair_before(from[i], to[k - 1]); k--)
            to[k] = to[k - 1];
        to[k] = from[i];
    }
}

static void sort_bucket(void *data, size_t bucket, unsigned worker)
{
    sort_job *job = data;
    size_t begin = job->counts[bucket * job->groups];
    size_t end = bucket + 1 < job->buckets ? job->counts[(bucket + 1) * job->groups] : job->count;
    const rdli_pair *from = job->parted;
    if (end - begin <= SMALL) {
        sort_small(from + begin, job->sorted + begin, end - begin);
        return;
    }
    uint32_t *counter = job->counters + worker * job->counter_stride;
    size_t firsts = (size_t)1 << job->shift;
    uint32_t base = (uint32_t)(bucket << job->shift);
    memset(counter, 0, firsts * sizeof *counter);
    for (size_t i = begin; i < end; i++)
        counter[from[i].first - base]++;
    uint32_t sum = 0;
    for (size_t f = 0; f < firsts; f++) {
        uint32_t here = counter[f];
        counter[f] = sum;
        sum += here;
    }
    rdli_pair *to = job->sorted + begin;
    for (size_t i = begin; i < end; i++)
        to[counter[from[i].first - base]++] = from[i];
    uint64_t *bits = job->bits + worker * job->bits_stride;
    for (size_t f = 0, row = 0; f < firsts; row = counter[f++])
        if (counter[f] - row > 1)
            job->kernels->sort_row(to + row, counter[f] - row, bits, job->bit_words);
}

static void sums_from_counts(size_t *counts, size_t n)
{
    size_t sum = 0;
    for (size_t i = 0; i < n; i++) {
        size_t here = counts[i];
        counts[i] = sum;
        sum += here;
    }
}

static void plan(sort_job *job, uint32_t firsts)
{
    size_t wanted = job->count / BUCKET_PAIRS;
    wanted = wanted > firsts / BUCKET_FIRSTS ? wanted : firsts / BUCKET_FIRSTS;
    wanted = wanted < BUCKETS_MAX ? wanted : BUCKETS_MAX;
    job->shift = 0;
    while ((size_t)((firsts - 1) >> job->shift) >= (wanted > 0 ? wanted : 1))
        job->shift++;
    job->buckets = (size_t)((firsts - 1) >> job->shift) + 1;
}

rdl_status rdli_sort_pairs(rdli_memory *memory, rdli_workers *workers, const rdli_kernels *kernels, rdli_sort *sort,
                           rdli_sink *sink, size_t count, uint32_t firsts, uint32_t seconds, const rdli_pair **pairs)
{
    *pairs = NULL;
    if (count == 0)
        return RDL_OK;
    sort_job job = {.sink = sink, .kernels = kernels, .count = count};
    unsigned threads = rdli_workers_count(workers);
    plan(&job, firsts);
    job.groups = threads == 1 ? 1 : threads < GROUPS_MAX / 4 ? 4 * threads : GROUPS_MAX;
    job.counter_stride = (size_t)1 << job.shift;
    job.bit_words = (size_t)seconds / 64 + 1;
    job.bits_stride = job.bit_words + job.bit_words / 64 + 1 + job.bit_words / 4096 + 1; /* see kernels.h, sort_row */
    size_t scratch = threads * (job.bits_stride * sizeof(uint64_t) + job.counter_stride * sizeof(uint32_t));
    if (!rdli_room_reserve(memory, &sort->parted, count, sizeof(rdli_pair), false) ||
        !rdli_room_reserve(memory, &sort->count_room, BUCKETS_MAX * job.groups, sizeof(size_t), false) ||
        !rdli_room_reserve(memory, &sort->scratch_room, scratch, 1, false))
        return RDL_NO_MEMORY;
    job.parted = sort->parted.data;
    job.sorted = sink->raw.data;
    job.counts = sort->count_room.data;
    job.bits = sort->scratch_room.data;
    job.counters = (uint32_t *)(job.bits + threads * job.bits_stride);
    memset(job.bits, 0, threads * job.bits_stride * sizeof(uint64_t));
    rdli_parallel_for(workers, job.groups, count_group, &job);
    sums_from_counts(job.counts, job.buckets * job.groups);
    rdli_parallel_for(workers, job.groups, part_group, &job);
    rdli_parallel_for(workers, job.buckets, sort_bucket, &job);
    *pairs = job.sorted;
    return RDL_OK;
}

void rdli_sort_release(rdli_memory *memory, rdli_sort *sort)
{
    rdli_room_release(memory, &sort->parted);
    rdli_room_release(memory, &sort->count_room);
    rdli_room_release(memory, &sort->scratch_room);
}
