/* broad/walk.c: dual traversal. A visit is a pair of packs; the 8 x 8 tests of their children lead to visits one level
 * down. Of a pack with itself only the children i <= j are looked at, so that no pair is met twice. */
#include "broad/walk.h"

enum { TASKS = 1024 }; /* visits that are handed out; many more than workers, so that the load evens out */

typedef struct walk_job {
    rdli_walk *walk;
    rdli_workers *workers;
    bool cancelled;
} walk_job;

/* Bit j: box i of pack a overlaps box j of pack b. Boxes are closed. */
static unsigned overlaps(const rdli_pack *a, unsigned i, const rdli_pack *b)
{
    unsigned mask = 0;
    for (unsigned j = 0; j < RDLI_WIDE; j++) {
        bool hit = true;
        for (unsigned k = 0; k < 3; k++)
            hit &= (a->lo[k][i] <= b->hi[k][j]) & (b->lo[k][j] <= a->hi[k][i]);
        mask |= (unsigned)hit << j;
    }
    return mask;
}

/* Children of b that may meet child i of a: not all driven on both sides, and somebody awake. */
static unsigned welcome(const rdli_marks *a, unsigned i, const rdli_marks *b)
{
    if (a == NULL || b == NULL)
        return 0xFF;
    unsigned mask = 0xFF;
    if (a->driven >> i & 1)
        mask &= ~(unsigned)b->driven;
    if (!(a->awake >> i & 1))
        mask &= b->awake;
    return mask;
}

static const rdli_marks *marks_of(const rdli_side *side, unsigned level, uint32_t pack)
{
    return side->marks[0] == NULL ? NULL : &side->marks[level][pack];
}

static void put_pairs(rdli_walk *walk, uint32_t element_a, const uint32_t *elements_b, unsigned mask, unsigned worker)
{
    while (mask != 0) {
        uint32_t element_b = elements_b[__builtin_ctz(mask)];
        mask &= mask - 1;
        if (walk->self) {
            uint32_t low = element_a < element_b ? element_a : element_b;
            uint32_t high = element_a < element_b ? element_b : element_a;
            if (walk->keep(walk->rules, low, high))
                rdli_sink_put(walk->sink, worker, low, high);
        } else if (walk->keep(walk->rules, element_a, element_b)) {
            rdli_sink_put(walk->sink, worker, element_a, element_b);
        }
    }
}

typedef void visit_child(void *context, rdli_visit visit, unsigned worker);

/* Calls each() for every visit below a visit of two inner packs of one level. */
static void expand_level(const rdli_walk *walk, rdli_visit v, visit_child *each, void *context, unsigned worker)
{
    const rdli_pack *a = &walk->a.tree->packs[v.level_a][v.a], *b = &walk->b.tree->packs[v.level_b][v.b];
    const rdli_marks *marks_a = marks_of(&walk->a, v.level_a, v.a), *marks_b = marks_of(&walk->b, v.level_b, v.b);
    bool same = walk->self && v.a == v.b;
    for (unsigned i = 0; i < RDLI_WIDE; i++) {
        unsigned mask = overlaps(a, i, b) & welcome(marks_a, i, marks_b);
        if (same)
            mask &= 0xFFu << i;
        for (; mask != 0; mask &= mask - 1) {
            rdli_visit child = {v.level_a - 1, v.level_b - 1, v.a * RDLI_WIDE + i,
                                v.b * RDLI_WIDE + (unsigned)__builtin_ctz(mask)};
            each(context, child, worker);
        }
    }
}

/* The same for packs of different levels: only the higher one is opened, and its children are tested one by one
 * against the lower pack's children. */
static void expand_uneven(const rdli_walk *walk, rdli_visit v, visit_child *each, void *context, unsigned worker)
{
    bool open_a = v.level_a > v.level_b;
    const rdli_side *high = open_a ? &walk->a : &walk->b, *low = open_a ? &walk->b : &walk->a;
    unsigned level = open_a ? v.level_a : v.level_b, other_level = open_a ? v.level_b : v.level_a;
    uint32_t pack = open_a ? v.a : v.b, other = open_a ? v.b : v.a;
    const rdli_marks *marks = marks_of(high, level, pack), *other_marks = marks_of(low, other_level, other);
    for (unsigned i = 0; i < RDLI_WIDE; i++) {
        if ((overlaps(&high->tree->packs[level][pack], i, &low->tree->packs[other_level][other]) &
             welcome(marks, i, other_marks)) == 0)
            continue;
        rdli_visit child = v;
        if (open_a) {
            child.level_a--;
            child.a = v.a * RDLI_WIDE + i;
        } else {
            child.level_b--;
            child.b = v.b * RDLI_WIDE + i;
        }
        each(context, child, worker);
    }
}

static void visit_leaves(rdli_walk *walk, rdli_visit v, unsigned worker)
{
    const rdli_pack *a = &walk->a.tree->packs[0][v.a], *b = &walk->b.tree->packs[0][v.b];
    const rdli_marks *marks_a = marks_of(&walk->a, 0, v.a), *marks_b = marks_of(&walk->b, 0, v.b);
    const uint32_t *elements_a = walk->a.tree->order + (size_t)v.a * RDLI_WIDE;
    const uint32_t *elements_b = walk->b.tree->order + (size_t)v.b * RDLI_WIDE;
    bool same = walk->self && v.a == v.b;
    for (unsigned i = 0; i < RDLI_WIDE; i++) {
        unsigned mask = overlaps(a, i, b) & welcome(marks_a, i, marks_b);
        if (same)
            mask &= 0xFEu << i;
        if (mask != 0)
            put_pairs(walk, elements_a[i], elements_b, mask, worker);
    }
}

/* Depth: at most the levels of both trees together. */
static void walk_visit(void *context, rdli_visit v, unsigned worker)
{
    rdli_walk *walk = context;
    if (v.level_a != v.level_b)
        expand_uneven(walk, v, walk_visit, walk, worker);
    else if (v.level_a > 0)
        expand_level(walk, v, walk_visit, walk, worker);
    else
        visit_leaves(walk, v, worker);
}

static void append_visit(void *context, rdli_visit v, unsigned worker)
{
    (void)worker;
    rdli_walk *walk = context;
    ((rdli_visit *)walk->visit_room.data)[walk->visit_count++] = v;
}

/* Opens visits in order, level by level, until there are enough tasks. */
static rdl_status make_tasks(rdli_memory *memory, rdli_walk *walk)
{
    const rdli_tree *a = walk->a.tree, *b = walk->b.tree;
    const size_t room = TASKS + RDLI_WIDE * RDLI_WIDE;
    if (!rdli_room_reserve(memory, &walk->visit_room, 2 * room, sizeof(rdli_visit), false))
        return RDL_NO_MEMORY;
    walk->visit_count = 0;
    append_visit(walk, (rdli_visit){a->levels - 1, b->levels - 1, 0, 0}, 0);
    for (bool grown = true; grown && walk->visit_count < TASKS;) {
        rdli_visit *list = walk->visit_room.data, *copy = list + room;
        size_t count = walk->visit_count, i = 0;
        memcpy(copy, list, count * sizeof *list);
        walk->visit_count = 0;
        grown = false;
        for (; i < count && walk->visit_count + (count - i) < TASKS; i++) {
            if (copy[i].level_a == 0 && copy[i].level_b == 0) {
                append_visit(walk, copy[i], 0);
                continue;
            }
            grown = true;
            if (copy[i].level_a != copy[i].level_b)
                expand_uneven(walk, copy[i], append_visit, walk, 0);
            else
                expand_level(walk, copy[i], append_visit, walk, 0);
        }
        for (; i < count; i++)
            append_visit(walk, copy[i], 0);
    }
    return RDL_OK;
}

static void walk_task(void *data, size_t index, unsigned worker)
{
    walk_job *job = data;
    if (__atomic_load_n(&job->cancelled, __ATOMIC_RELAXED))
        return;
    if (worker == 0 && rdli_cancelled(job->workers))
        __atomic_store_n(&job->cancelled, true, __ATOMIC_RELAXED);
    walk_visit(job->walk, ((const rdli_visit *)job->walk->visit_room.data)[index], worker);
}

rdl_status rdli_walk_run(rdli_memory *memory, rdli_workers *workers, rdli_walk *walk, size_t *count)
{
    *count = 0;
    rdl_status status = rdli_sink_open(memory, walk->sink, rdli_workers_count(workers), 0);
    if (status != RDL_OK || walk->a.tree->levels == 0 || walk->b.tree->levels == 0)
        return status;
    status = make_tasks(memory, walk);
    if (status != RDL_OK)
        return status;
    for (;;) {
        walk_job job = {walk, workers, false};
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
