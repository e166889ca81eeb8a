/* broad/tree.c: room, refit and the rebuild rule. */
#include "broad/kernels.h"

enum { BLOCK = 512 }; /* packs per task; a multiple of 8, so that no two tasks write into one pack above */

typedef struct refit_job {
    rdli_tree *tree;
    const rdli_kernels *kernels;
    const rdl_box *boxes;
    const uint8_t *stale;
    unsigned level;
    double *spread; /* one sum per block of level 0, added in order afterwards */
} refit_job;

static size_t blocks(uint32_t packs)
{
    return ((size_t)packs + BLOCK - 1) / BLOCK;
}

static void refit_block(void *data, size_t block, unsigned worker)
{
    (void)worker;
    refit_job *job = data;
    const uint32_t count = job->tree->pack_count[job->level];
    const uint32_t first = (uint32_t)(block * BLOCK), last = count - first < BLOCK ? count : first + BLOCK;
    if (job->level == 0)
        job->spread[block] = job->kernels->refit_elements(job->tree, job->boxes, job->stale, first, last);
    else
        job->kernels->refit_inner(job->tree, job->level, first, last);
}

/* Returns the looseness of level 0. */
static double refit(rdli_workers *workers, const rdli_kernels *kernels, rdli_tree *tree, const rdl_box *boxes,
                    const uint8_t *stale)
{
    refit_job job = {tree, kernels, boxes, stale, 0, tree->sum_room.data};
    double spread = 0;
    for (unsigned level = 0; level < tree->levels; level++) {
        job.level = level;
        rdli_parallel_for(workers, blocks(tree->pack_count[level]), refit_block, &job);
    }
    for (size_t b = 0; tree->levels > 0 && b < blocks(tree->pack_count[0]); b++)
        spread += job.spread[b];
    return spread;
}

static bool reserve(rdli_memory *memory, rdli_tree *tree, uint32_t count)
{
    size_t packs = 1; /* the crown */
    unsigned levels = 0;
    for (size_t n = count; n > 0 && (levels == 0 || n > 1); levels++) {
        n = (n + RDLI_WIDE - 1) / RDLI_WIDE;
        tree->pack_count[levels] = (uint32_t)n;
        packs += n;
    }
    tree->pack_count[levels] = 1;
    size_t sums = levels > 0 ? blocks(tree->pack_count[0]) : 0;
    size_t places = levels > 0 ? (size_t)tree->pack_count[0] * RDLI_WIDE : 0;
    if (!rdli_room_reserve(memory, &tree->pack_room, packs, sizeof(rdli_pack), false) ||
        !rdli_room_reserve(memory, &tree->number_room, 2 * packs + RDLI_WIDE, sizeof(uint32_t), false) ||
        !rdli_room_reserve(memory, &tree->order_room, places, sizeof(uint32_t), false) ||
        !rdli_room_reserve(memory, &tree->item_room, count, 4 * sizeof(float), false) ||
        !rdli_room_reserve(memory, &tree->sum_room, sums, sizeof(double), false))
        return false;
    size_t next = 0;
    for (unsigned level = 0; level <= levels; level++) {
        tree->packs[level] = (rdli_pack *)tree->pack_room.data + next;
        tree->lowest[level] = (uint32_t *)tree->number_room.data + next;
        tree->highest[level] = (uint32_t *)tree->number_room.data + packs + next;
        next += tree->pack_count[level];
    }
    tree->order = tree->order_room.data;
    tree->count = count;
    tree->levels = levels;
    return true;
}

static void find_numbers(rdli_tree *tree)
{
    const uint32_t *low = tree->order, *high = tree->order;
    size_t inner = tree->count;
    for (unsigned level = 0; level <= tree->levels; level++) {
        memset(tree->lowest[level], 0xFF, tree->pack_count[level] * sizeof(uint32_t));
        memset(tree->highest[level], 0, tree->pack_count[level] * sizeof(uint32_t));
        for (size_t i = 0; i < inner; i++) {
            uint32_t *lowest = &tree->lowest[level][i / RDLI_WIDE], *highest = &tree->highest[level][i / RDLI_WIDE];
            *lowest = low[i] < *lowest ? low[i] : *lowest;
            *highest = high[i] > *highest ? high[i] : *highest;
        }
        low = tree->lowest[level];
        high = tree->highest[level];
        inner = tree->pack_count[level];
    }
}

void rdli_tree_rebuild(rdli_workers *workers, const rdli_kernels *kernels, rdli_tree *tree, const rdl_box *boxes,
                       const uint8_t *classes)
{
    if (tree->count == 0)
        return;
    rdli_tree_arrange(workers, tree, boxes, classes);
    for (size_t i = tree->count; i % RDLI_WIDE != 0; i++)
        tree->order[i] = tree->order[tree->count - 1];
    find_numbers(tree);
    tree->arranged++;
    tree->built_spread = refit(workers, kernels, tree, boxes, NULL);
}

rdl_status rdli_tree_build(rdli_memory *memory, rdli_workers *workers, const rdli_kernels *kernels, rdli_tree *tree,
                           const rdl_box *boxes, uint32_t count, const uint8_t *classes)
{
    tree->count = 0;
    tree->levels = 0;
    if (!reserve(memory, tree, count))
        return RDL_NO_MEMORY;
    rdli_tree_rebuild(workers, kernels, tree, boxes, classes);
    return RDL_OK;
}

bool rdli_tree_refit(rdli_workers *workers, const rdli_kernels *kernels, rdli_tree *tree, const rdl_box *boxes,
                     const uint8_t *stale)
{
    const double decay = 1.5; /* a third more visits cost about as much as a build spread over some ten steps */
    double spread = refit(workers, kernels, tree, boxes, stale);
    return stale == NULL && !(spread <= decay * tree->built_spread);
}

void rdli_tree_release(rdli_memory *memory, rdli_tree *tree)
{
    rdli_room_release(memory, &tree->pack_room);
    rdli_room_release(memory, &tree->number_room);
    rdli_room_release(memory, &tree->order_room);
    rdli_room_release(memory, &tree->item_room);
    rdli_room_release(memory, &tree->sum_room);
    memset(tree, 0, sizeof *tree);
}
