/* broad/walk.c: dual traversal. A visit is a pair of packs; the tests of their children lead to visits one level
 * down (kernels_body.h). Of a pack with itself only the children i <= j are looked at, so that no pair is met twice. */
#include "broad/kernels.h"

enum { TASKS = 1024 }; /* visits that are handed out; many more than workers, so that the load evens out */

typedef struct walk_job {
    rdli_walk *walk;
    const rdli_kernels *kernels;
    rdli_workers *workers;
    bool cancelled;
} walk_job;

/* Opens visits in order, level by level, until there are enough tasks. */
static rdl_status make_tasks(rdli_memory *memory, const rdli_kernels *kernels, rdli_walk *walk, size_t wanted)
{
    const rdli_tree *a = walk->a.tree, *b = walk->b.tree;
    const size_t room = TASKS + RDLI_WIDE * RDLI_WIDE;
    if (!rdli_room_reserve(memory, &walk->visit_room, 2 * room, sizeof(rdli_visit), false))
        return RDL_NO_MEMORY;
    rdli_visit *list = walk->visit_room.data, *copy = list + room;
    list[0] = (rdli_visit){0, 0, (uint8_t)(a->levels - 1), (uint8_t)(b->levels - 1), walk->a.parts[0] != NULL, 0};
    size_t count = 1;
    for (bool grown = true; grown && count < wanted;) {
        size_t before = count, i = 0;
        memcpy(copy, list, count * sizeof *list);
        count = 0;
        grown = false;
        for (; i < before && count + (before - i) < wanted; i++) {
            if (copy[i].level_a == 0 && copy[i].level_b == 0) {
                list[count++] = copy[i];
            } else {
                grown = true;
                count += kernels->expand(walk, copy[i], list + count);
            }
        }
        memcpy(list + count, copy + i, (before - i) * sizeof *list);
        count += before - i;
    }
    walk->visit_count = count;
    return RDL_OK;
}

static void walk_task(void *data, size_t index, unsigned worker)
{
    walk_job *job = data;
    if (__atomic_load_n(&job->cancelled, __ATOMIC_RELAXED))
        return;
    if (worker == 0 && rdli_cancelled(job->workers))
        __atomic_store_n(&job->cancelled, true, __ATOMIC_RELAXED);
    job->kernels->walk(job->walk, ((const rdli_visit *)job->walk->visit_room.data)[index], worker);
}

rdl_status rdli_walk_run(rdli_memory *memory, rdli_workers *workers, const rdli_kernels *kernels, rdli_walk *walk,
                         size_t *count)
{
    *count = 0;
    rdl_status status = rdli_sink_open(memory, walk->sink, rdli_workers_count(workers), 0);
    if (status != RDL_OK || walk->a.tree->levels == 0 || walk->b.tree->levels == 0)
        return status;
    status = make_tasks(memory, kernels, walk, TASKS);
    if (status != RDL_OK)
        return status;
    for (;;) {
        walk_job job = {walk, kernels, workers, false};
        rdli_parallel_for(workers, walk->visit_count, walk_task, &job);
        *count = rdli_sink_close(walk->sink);
        if (job.cancelled)
            return RDL_CANCELLED;
        if (!walk->sink->full)
            return RDL_OK;
        /* An eighth more, so that slowly growing contact does not walk twice in every step. */
        status = rdli_sink_open(memory, walk->sink, rdli_workers_count(workers), *count + *count / 8);
        if (status != RDL_OK)
            return status;
    }
}
