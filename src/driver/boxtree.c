/* driver/boxtree.c: see boxtree.h. */
#include "driver/boxtree.h"

#include "base/workers.h"
#include "broad/selfpairs.h"

struct rdl_tree {
    rdli_memory memory;
    rdli_workers *workers;
    rdli_selfpairs *pairs;
    uint32_t count;
};

enum { BLOCK = 4096 }; /* boxes per task of the check */

typedef struct check_job {
    const rdl_box *boxes;
    size_t count;
    size_t first_bad; /* block; lowered with atomic exchanges */
} check_job;

static size_t block_end(const check_job *job, size_t block)
{
    return (block + 1) * BLOCK < job->count ? (block + 1) * BLOCK : job->count;
}

/* No branches, so that it runs at the speed of memory; a comparison with NaN fails. */
static void check_block(void *data, size_t block, unsigned worker)
{
    (void)worker;
    check_job *job = data;
    unsigned fine = 1;
    for (size_t i = block * BLOCK, end = block_end(job, block); i < end; i++)
        for (unsigned k = 0; k < 3; k++) {
            float lo = job->boxes[i].lo[k], hi = job->boxes[i].hi[k];
            fine &= (unsigned)(lo >= -FLT_MAX) & (unsigned)(lo <= hi) & (unsigned)(hi <= FLT_MAX);
        }
    size_t known = __atomic_load_n(&job->first_bad, __ATOMIC_RELAXED);
    while (!fine && block < known &&
           !__atomic_compare_exchange_n(&job->first_bad, &known, block, true, __ATOMIC_RELAXED, __ATOMIC_RELAXED)) {
    }
}

/* Names the first box that is not finite or has lo > hi. */
static rdl_status check_boxes(rdli_workers *workers, const rdl_box *boxes, size_t count, rdl_fault *fault)
{
    check_job job = {boxes, count, SIZE_MAX};
    rdli_parallel_for(workers, (count + BLOCK - 1) / BLOCK, check_block, &job);
    if (job.first_bad == SIZE_MAX)
        return RDL_OK;
    for (size_t i = job.first_bad * BLOCK, end = block_end(&job, job.first_bad); i < end; i++) {
        bool finite = true, ordered = true;
        for (unsigned k = 0; k < 3; k++) {
            finite &= isfinite(boxes[i].lo[k]) && isfinite(boxes[i].hi[k]);
            ordered &= boxes[i].lo[k] <= boxes[i].hi[k];
        }
        if (!finite)
            return rdli_fault_set(fault, RDL_NOT_FINITE, "boxes", i);
        if (!ordered)
            return rdli_fault_set(fault, RDL_BAD_BOX, "boxes", i);
    }
    assert(false); /* the two checks look for the same */
    return RDL_OK;
}

rdl_status rdli_boxtree_create(const rdl_host *host, const rdl_box *boxes, uint32_t count, rdl_tree **tree,
                               rdl_fault *fault)
{
    rdli_memory memory;
    rdl_status status = rdli_memory_init(&memory, host);
    if (status != RDL_OK)
        return rdli_fault_set(fault, status, "host", 0);
    rdl_tree *made = rdli_take(&memory, 1, sizeof *made);
    if (made == NULL)
        return rdli_fault_set(fault, RDL_NO_MEMORY, "tree", 0);
    memset(made, 0, sizeof *made);
    made->memory = memory;
    made->count = count;
    status = rdli_workers_create(&made->memory, host, &made->workers);
    if (status != RDL_OK)
        rdli_fault_set(fault, status, "tree", 0);
    else
        status = check_boxes(made->workers, boxes, count, fault);
    if (status == RDL_OK) {
        status = rdli_selfpairs_create(&made->memory, made->workers, boxes, count, &made->pairs);
        if (status != RDL_OK)
            rdli_fault_set(fault, status, "tree", 0);
    }
    if (status != RDL_OK) {
        rdli_boxtree_destroy(made);
        return status;
    }
    *tree = made;
    return RDL_OK;
}

uint32_t rdli_boxtree_count(const rdl_tree *tree)
{
    return tree->count;
}

rdl_status rdli_boxtree_update(rdl_tree *tree, const rdl_box *boxes, rdl_fault *fault)
{
    rdl_status status = check_boxes(tree->workers, boxes, tree->count, fault);
    if (status == RDL_OK)
        rdli_selfpairs_update(tree->pairs, boxes);
    return status;
}

rdl_status rdli_boxtree_self_pairs(rdl_tree *tree, const uint32_t *corners, rdl_emit_pairs *emit, void *user)
{
    return rdli_selfpairs_emit(tree->pairs, corners, emit, user);
}

void rdli_boxtree_use_vector(rdl_tree *tree, bool vector)
{
    rdli_selfpairs_use_vector(tree->pairs, vector);
}

void rdli_boxtree_limit(rdl_tree *tree, size_t pairs_max)
{
    rdli_selfpairs_limit(tree->pairs, pairs_max);
}

size_t rdli_boxtree_bytes(const rdl_tree *tree)
{
    return tree->memory.bytes_in_use;
}

void rdli_boxtree_destroy(rdl_tree *tree)
{
    if (tree == NULL)
        return;
    rdli_selfpairs_destroy(tree->pairs);
    rdli_workers_destroy(&tree->memory, tree->workers);
    rdli_memory memory = tree->memory;
    rdli_give(&memory, tree, 1, sizeof *tree);
}
