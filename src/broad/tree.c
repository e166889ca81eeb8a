/* broad/tree.c: room, refit and the rebuild rule. */
#include "broad/tree.h"

enum { BLOCK = 512 }; /* packs per task */

typedef struct refit_job {
    rdli_tree *tree;
    const rdl_box *boxes;
    unsigned level;
    double *spread; /* one sum per block of level 0, added in order afterwards */
} refit_job;

static const rdl_box EMPTY = {{INFINITY, INFINITY, INFINITY}, {-INFINITY, -INFINITY, -INFINITY}};

static void pack_set(rdli_pack *pack, unsigned place, const rdl_box *box)
{
    for (unsigned k = 0; k < 3; k++) {
        pack->lo[k][place] = box->lo[k];
        pack->hi[k][place] = box->hi[k];
    }
}

static rdl_box pack_bound(const rdli_pack *pack)
{
    rdl_box box = EMPTY;
    for (unsigned k = 0; k < 3; k++)
        for (unsigned i = 0; i < RDLI_WIDE; i++) {
            box.lo[k] = pack->lo[k][i] < box.lo[k] ? pack->lo[k][i] : box.lo[k];
            box.hi[k] = pack->hi[k][i] > box.hi[k] ? pack->hi[k][i] : box.hi[k];
        }
    return box;
}

static double extent(const rdl_box *box)
{
    double sum = 0;
    for (unsigned k = 0; k < 3; k++)
        sum += (double)box->hi[k] - (double)box->lo[k];
    return sum;
}

static void refit_elements(refit_job *job, size_t block)
{
    rdli_tree *tree = job->tree;
    size_t end = (block + 1) * BLOCK < tree->pack_count[0] ? (block + 1) * BLOCK : tree->pack_count[0];
    double spread = 0;
    for (size_t p = block * BLOCK; p < end; p++) {
        rdli_pack *pack = &tree->packs[0][p];
        double inner = 0;
        unsigned used = 0;
        for (unsigned i = 0; i < RDLI_WIDE; i++) {
            size_t slot = p * RDLI_WIDE + i;
            const rdl_box *box = slot < tree->count ? &job->boxes[tree->order[slot]] : &EMPTY;
            pack_set(pack, i, box);
            if (slot < tree->count) {
                inner += extent(box);
                used++;
            }
        }
        rdl_box bound = pack_bound(pack);
        spread += extent(&bound) - inner / used;
    }
    job->spread[block] = spread;
}

static void refit_block(void *data, size_t block, unsigned worker)
{
    (void)worker;
    refit_job *job = data;
    rdli_tree *tree = job->tree;
    if (job->level == 0) {
        refit_elements(job, block);
        return;
    }
    const rdli_pack *below = tree->packs[job->level - 1];
    size_t count = tree->pack_count[job->level], inner = tree->pack_count[job->level - 1];
    size_t end = (block + 1) * BLOCK < count ? (block + 1) * BLOCK : count;
    for (size_t p = block * BLOCK; p < end; p++)
        for (unsigned i = 0; i < RDLI_WIDE; i++) {
            size_t child = p * RDLI_WIDE + i;
            rdl_box box = child < inner ? pack_bound(&below[child]) : EMPTY;
            pack_set(&tree->packs[job->level][p], i, &box);
        }
}

/* Returns the looseness of level 0. */
static double refit(rdli_workers *workers, rdli_tree *tree, const rdl_box *boxes)
{
    refit_job job = {tree, boxes, 0, tree->sum_room.data};
    double spread = 0;
    for (unsigned level = 0; level < tree->levels; level++) {
        job.level = level;
        rdli_parallel_for(workers, ((size_t)tree->pack_count[level] + BLOCK - 1) / BLOCK, refit_block, &job);
    }
    for (size_t b = 0; tree->levels > 0 && b < ((size_t)tree->pack_count[0] + BLOCK - 1) / BLOCK; b++)
        spread += job.spread[b];
    return spread;
}

static bool reserve(rdli_memory *memory, rdli_tree *tree, uint32_t count)
{
    size_t packs = 0;
    unsigned levels = 0;
    for (size_t n = count; n > 0 && (levels == 0 || n > 1); levels++) {
        n = (n + RDLI_WIDE - 1) / RDLI_WIDE;
        tree->pack_count[levels] = (uint32_t)n;
        packs += n;
    }
    size_t sums = levels > 0 ? ((size_t)tree->pack_count[0] + BLOCK - 1) / BLOCK : 0;
    if (!rdli_room_reserve(memory, &tree->pack_room, packs, sizeof(rdli_pack), false) ||
        !rdli_room_reserve(memory, &tree->order_room, count, sizeof(uint32_t), false) ||
        !rdli_room_reserve(memory, &tree->item_room, count, 4 * sizeof(float), false) ||
        !rdli_room_reserve(memory, &tree->sum_room, sums, sizeof(double), false))
        return false;
    rdli_pack *next = tree->pack_room.data;
    for (unsigned level = 0; level < levels; level++) {
        tree->packs[level] = next;
        next += tree->pack_count[level];
    }
    tree->order = tree->order_room.data;
    tree->count = count;
    tree->levels = levels;
    return true;
}

rdl_status rdli_tree_build(rdli_memory *memory, rdli_workers *workers, rdli_tree *tree, const rdl_box *boxes, uint32_t count)
{
    tree->count = 0;
    tree->levels = 0;
    if (!reserve(memory, tree, count))
        return RDL_NO_MEMORY;
    rdli_tree_arrange(workers, tree, boxes);
    tree->built_spread = refit(workers, tree, boxes);
    return RDL_OK;
}

void rdli_tree_update(rdli_workers *workers, rdli_tree *tree, const rdl_box *boxes)
{
    const double decay = 1.5; /* a third more node visits cost about as much as a build spread over some ten steps */
    if (refit(workers, tree, boxes) <= decay * tree->built_spread)
        return;
    rdli_tree_arrange(workers, tree, boxes);
    tree->built_spread = refit(workers, tree, boxes);
}

void rdli_tree_release(rdli_memory *memory, rdli_tree *tree)
{
    rdli_room_release(memory, &tree->pack_room);
    rdli_room_release(memory, &tree->order_room);
    rdli_room_release(memory, &tree->item_room);
    rdli_room_release(memory, &tree->sum_room);
    memset(tree, 0, sizeof *tree);
}
