/* broad/selfpairs.c: see selfpairs.h. */
#include "broad/selfpairs.h"

#include "broad/kernels.h"

enum {
    CORNERS = 4,
    BLOCK = 512 /* packs per task */
};

/* Pairs that are kept at once while they are sorted: 512 MiB. A step of a million elements has some twenty million. */
static const size_t PAIRS_MAX = (size_t)1 << 27;

struct rdli_selfpairs {
    rdli_memory *memory;
    rdli_workers *workers;
    const rdli_kernels *kernels;
    rdli_tree tree;
    rdli_query query;
    rdli_room corner_room;
    size_t pairs_max;
    uint32_t stretch; /* elements whose pairs fitted at once last time; 0: not known */
};

rdl_status rdli_selfpairs_create(rdli_memory *memory, rdli_workers *workers, const rdl_box *boxes, uint32_t count,
                                 rdli_selfpairs **pairs)
{
    rdli_selfpairs *made = rdli_take(memory, 1, sizeof *made);
    if (made == NULL)
        return RDL_NO_MEMORY;
    memset(made, 0, sizeof *made);
    made->memory = memory;
    made->workers = workers;
    made->kernels = rdli_kernels_choose(true);
    made->pairs_max = PAIRS_MAX;
    rdl_status status = rdli_tree_build(memory, workers, made->kernels, &made->tree, boxes, count, NULL);
    if (status != RDL_OK) {
        rdli_selfpairs_destroy(made);
        return status;
    }
    *pairs = made;
    return RDL_OK;
}

void rdli_selfpairs_use_vector(rdli_selfpairs *pairs, bool vector)
{
    pairs->kernels = rdli_kernels_choose(vector);
}

void rdli_selfpairs_update(rdli_selfpairs *pairs, const rdl_box *boxes)
{
    if (rdli_tree_refit(pairs->workers, pairs->kernels, &pairs->tree, boxes, NULL))
        rdli_tree_rebuild(pairs->workers, pairs->kernels, &pairs->tree, boxes, NULL);
}

/* Corners in use: a last column that repeats the first everywhere need not be compared. */
static unsigned corners_in_use(const uint32_t *corners, uint32_t count)
{
    for (unsigned c = CORNERS - 1; c > 0; c--)
        for (uint32_t e = 0; e < count; e++)
            if (corners[(size_t)e * CORNERS + c] != corners[(size_t)e * CORNERS])
                return c + 1;
    return 1;
}

typedef struct corner_job {
    const rdli_tree *tree;
    const uint32_t *corners;
    unsigned used;
    uint32_t *to;
} corner_job;

static void corner_block(void *data, size_t block, unsigned worker)
{
    (void)worker;
    const corner_job *job = data;
    const size_t packs = job->tree->pack_count[0], end = (block + 1) * BLOCK < packs ? (block + 1) * BLOCK : packs;
    uint32_t *to = job->to + block * BLOCK * RDLI_WIDE * job->used;
    for (size_t p = block * BLOCK; p < end; p++)
        for (unsigned c = 0; c < job->used; c++)
            for (unsigned i = 0; i < RDLI_WIDE; i++)
                *to++ = job->corners[(size_t)job->tree->order[p * RDLI_WIDE + i] * CORNERS + c];
}

static rdl_status set_corners(rdli_selfpairs *pairs, const uint32_t *corners)
{
    rdli_side *side = &pairs->query.a;
    const rdli_tree *tree = &pairs->tree;
    side->tree = tree;
    side->corner_count = corners == NULL ? 0 : corners_in_use(corners, tree->count);
    side->corners = NULL;
    if (corners != NULL && tree->count > 0) {
        size_t packs = tree->pack_count[0], places = packs * RDLI_WIDE * side->corner_count;
        if (!rdli_room_reserve(pairs->memory, &pairs->corner_room, places, sizeof(uint32_t), false))
            return RDL_NO_MEMORY;
        corner_job job = {tree, corners, side->corner_count, pairs->corner_room.data};
        rdli_parallel_for(pairs->workers, (packs + BLOCK - 1) / BLOCK, corner_block, &job);
        side->corners = job.to;
    }
    pairs->query.b = *side;
    return RDL_OK;
}

/* Finds the pairs whose first lies in [lo, hi). */
static rdl_status run(rdli_selfpairs *pairs, uint32_t lo, uint32_t hi, size_t pairs_max, size_t *count)
{
    pairs->query.self = true;
    pairs->query.range_lo = lo;
    pairs->query.range_hi = hi;
    pairs->query.pairs_max = pairs_max;
    return rdli_query_run(pairs->memory, pairs->workers, pairs->kernels, &pairs->query, count);
}

rdl_status rdli_selfpairs_find(rdli_selfpairs *pairs, const uint32_t *corners, const rdli_pair **list, size_t *count)
{
    rdl_status status = set_corners(pairs, corners);
    pairs->query.emit = NULL;
    if (status == RDL_OK)
        status = run(pairs, 0, pairs->tree.count, SIZE_MAX, count);
    if (status == RDL_OK)
        status = rdli_rows_list(pairs->memory, pairs->workers, &pairs->query.rows, list);
    return status;
}

static void emit_rows(const rdli_selfpairs *pairs, uint32_t lo, uint32_t hi, rdl_emit_pairs *emit, void *user)
{
    const rdli_rows *rows = &pairs->query.rows;
    rdli_pair block[RDLI_EMIT_BLOCK];
    size_t count = 0;
    for (uint32_t first = lo; first < hi; first++) {
        const rdli_row row = rows->rows[first];
        rdli_rows_fetch(rows, first, hi);
        for (uint32_t done = 0; done < row.count;) {
            uint32_t left = row.count - done, room = (uint32_t)(RDLI_EMIT_BLOCK - count), some = left < room ? left : room;
            rdli_rows_copy(block + count, first, rows->seconds + row.start + done, some);
            done += some;
            count += some;
            if (count == RDLI_EMIT_BLOCK) {
                emit(user, 0, rdli_plain_pairs(block), count);
                count = 0;
            }
        }
    }
    if (count > 0)
        emit(user, 0, rdli_plain_pairs(block), count);
}

rdl_status rdli_selfpairs_emit(rdli_selfpairs *pairs, const uint32_t *corners, rdl_emit_pairs *emit, void *user)
{
    const uint32_t count = pairs->tree.count;
    const bool sorted = rdli_workers_count(pairs->workers) == 1;
    size_t found;
    rdl_status status = set_corners(pairs, corners);
    pairs->query.emit = sorted ? NULL : emit;
    pairs->query.emit_user = user;
    if (status == RDL_OK && !sorted)
        return run(pairs, 0, count, SIZE_MAX, &found);
    /* Stretches of firsts whose pairs fit, one after the other; what fitted is remembered. */
    uint32_t stretch = pairs->stretch > 0 ? pairs->stretch : count;
    for (uint32_t lo = 0; status == RDL_OK && lo < count;) {
        uint32_t hi = count - lo < stretch ? count : lo + stretch;
        status = run(pairs, lo, hi, hi - lo > 1 ? pairs->pairs_max : SIZE_MAX, &found);
        if (status == RDL_TOO_LARGE) {
            status = RDL_OK;
            stretch = (hi - lo) / 2;
        } else if (status == RDL_OK) {
            emit_rows(pairs, lo, hi, emit, user);
            lo = hi;
        }
    }
    pairs->stretch = stretch;
    return status;
}

void rdli_selfpairs_limit(rdli_selfpairs *pairs, size_t pairs_max)
{
    pairs->pairs_max = pairs_max;
    pairs->stretch = 0;
}

void rdli_selfpairs_destroy(rdli_selfpairs *pairs)
{
    if (pairs == NULL)
        return;
    rdli_tree_release(pairs->memory, &pairs->tree);
    rdli_query_release(pairs->memory, &pairs->query);
    rdli_room_release(pairs->memory, &pairs->corner_room);
    rdli_give(pairs->memory, pairs, 1, sizeof *pairs);
}
