/* broad/rows.c: see rows.h. */
#include "broad/rows.h"

enum { BLOCK = 4096 }; /* rows per task */

typedef struct list_job {
    const rdli_rows *rows;
    size_t *sums; /* per block: number of pairs, then where the block's pairs begin */
    rdli_pair *pairs;
} list_job;

rdl_status rdli_rows_open(rdli_memory *memory, rdli_rows *rows, uint32_t row_count, unsigned workers, size_t pairs)
{
    /* A portion is left for the next one when a row does not fit any more; a row that is longer than an eighth of a portion
     * takes its own room. So at most an eighth is wasted, and one portion per worker. */
    size_t room = pairs + pairs / 7 + (size_t)workers * RDLI_PORTION;
    if (!rdli_room_reserve(memory, &rows->row_room, row_count, sizeof(rdli_row), false) ||
        !rdli_room_reserve(memory, &rows->second_room, room, sizeof(uint32_t), false))
        return RDL_NO_MEMORY;
    rows->rows = rows->row_room.data;
    rows->row_count = row_count;
    if (row_count > 0)
        memset(rows->rows, 0, row_count * sizeof(rdli_row));
    rows->seconds = rows->second_room.data;
    rows->room = rows->second_room.bytes / sizeof(uint32_t);
    rows->next = 0;
    rows->full = false;
    return RDL_OK;
}

static uint32_t *take_common(rdli_rows *rows, size_t count)
{
    size_t start = __atomic_fetch_add(&rows->next, count, __ATOMIC_RELAXED);
    if (start + count <= rows->room)
        return rows->seconds + start;
    __atomic_store_n(&rows->full, true, __ATOMIC_RELAXED);
    return NULL;
}

uint32_t *rdli_rows_take(rdli_rows *rows, rdli_portion *portion, size_t count)
{
    portion->found += count;
    if (__atomic_load_n(&rows->full, __ATOMIC_RELAXED))
        return NULL;
    if (count > RDLI_PORTION / 8)
        return take_common(rows, count);
    if ((size_t)(portion->limit - portion->next) < count) {
        portion->next = take_common(rows, RDLI_PORTION);
        portion->limit = portion->next == NULL ? NULL : portion->next + RDLI_PORTION;
        if (portion->next == NULL)
            return NULL;
    }
    portion->next += count;
    return portion->next - count;
}

static void block_range(const list_job *job, size_t block, uint32_t *first, uint32_t *last)
{
    *first = (uint32_t)(block * BLOCK);
    *last = job->rows->row_count - *first < BLOCK ? job->rows->row_count : *first + BLOCK;
}

static void count_block(void *data, size_t block, unsigned worker)
{
    (void)worker;
    list_job *job = data;
    uint32_t first, last;
    size_t sum = 0;
    block_range(job, block, &first, &last);
    for (uint32_t r = first; r < last; r++)
        sum += job->rows->rows[r].count;
    job->sums[block] = sum;
}

static void write_block(void *data, size_t block, unsigned worker)
{
    (void)worker;
    const list_job *job = data;
    const rdli_rows *rows = job->rows;
    uint32_t first, last;
    block_range(job, block, &first, &last);
    rdli_pair *to = job->pairs + job->sums[block];
    for (uint32_t r = first; r < last; r++) {
        const rdli_row row = rows->rows[r];
        rdli_rows_fetch(rows, r, last);
        rdli_rows_copy(to, r, rows->seconds + row.start, row.count);
        to += row.count;
    }
}

rdl_status rdli_rows_list(rdli_memory *memory, rdli_workers *workers, rdli_rows *rows, const rdli_pair **pairs)
{
    size_t blocks = ((size_t)rows->row_count + BLOCK - 1) / BLOCK, sum = 0;
    if (!rdli_room_reserve(memory, &rows->sum_room, blocks, sizeof(size_t), false))
        return RDL_NO_MEMORY;
    list_job job = {rows, rows->sum_room.data, NULL};
    rdli_parallel_for(workers, blocks, count_block, &job);
    for (size_t b = 0; b < blocks; b++) {
        size_t here = job.sums[b];
        job.sums[b] = sum;
        sum += here;
    }
    if (!rdli_room_reserve(memory, &rows->pair_room, sum, sizeof(rdli_pair), false))
        return RDL_NO_MEMORY;
    job.pairs = rows->pair_room.data;
    rdli_parallel_for(workers, blocks, write_block, &job);
    *pairs = job.pairs;
    return RDL_OK;
}

void rdli_rows_release(rdli_memory *memory, rdli_rows *rows)
{
    rdli_room_release(memory, &rows->row_room);
    rdli_room_release(memory, &rows->second_room);
    rdli_room_release(memory, &rows->sum_room);
    rdli_room_release(memory, &rows->pair_room);
}
