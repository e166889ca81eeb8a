/* broad/build.c: the order of the elements: recursive splits along the longest axis of the box centres, at places that
 * keep every pack full. Classes are kept together: a range of several classes is split by class first, so that no more
 * than one pack a level holds two classes. Ties are broken by element number, so the order depends on the input alone. */
#include "broad/tree.h"

typedef struct item {
    float centre[3];
    uint32_t element;
} item;

typedef struct range {
    size_t first, last; /* [first, last) */
    size_t unit;        /* splits are at first + a multiple of unit */
    bool mixed;         /* may hold several classes */
} range;

enum { RANGES = 64 };   /* subtrees that are built as one task each */

typedef struct build_job {
    item *items;
    const uint8_t *classes;
    range ranges[RANGES];
    uint32_t *order;
} build_job;

/* classes: NULL, or the first key. */
static bool before(const item *a, const item *b, unsigned axis, const uint8_t *classes)
{
    if (classes != NULL && classes[a->element] != classes[b->element])
        return classes[a->element] < classes[b->element];
    return a->centre[axis] < b->centre[axis] || (a->centre[axis] == b->centre[axis] && a->element < b->element);
}

static unsigned longest_axis(const item *items, size_t count)
{
    float lo[3], hi[3];
    memcpy(lo, items[0].centre, sizeof lo);
    memcpy(hi, items[0].centre, sizeof hi);
    for (size_t i = 1; i < count; i++)
        for (unsigned k = 0; k < 3; k++) {
            lo[k] = items[i].centre[k] < lo[k] ? items[i].centre[k] : lo[k];
            hi[k] = items[i].centre[k] > hi[k] ? items[i].centre[k] : hi[k];
        }
    unsigned axis = 0;
    for (unsigned k = 1; k < 3; k++)
        if ((double)hi[k] - (double)lo[k] > (double)hi[axis] - (double)lo[axis])
            axis = k;
    return axis;
}

static void exchange(item *a, item *b)
{
    item t = *a;
    *a = *b;
    *b = t;
}

/* Hoare 1961: afterwards the `middle` smallest items come first. The pivot places are drawn from a fixed sequence, so no
 * particular input order is slow. */
static void select_smallest(item *items, size_t count, size_t middle, unsigned axis, const uint8_t *classes)
{
    size_t lo = 0, hi = count - 1;
    uint64_t draw = 0x9E3779B97F4A7C15u;
    while (lo < hi) {
        draw = draw * 6364136223846793005u + 1442695040888963407u;
        item pivot = items[lo + (size_t)(draw >> 33) % (hi - lo + 1)];
        size_t i = lo, j = hi;
        for (;;) {
            while (before(&items[i], &pivot, axis, classes))
                i++;
            while (before(&pivot, &items[j], axis, classes))
                j--;
            if (i >= j)
                break;
            exchange(&items[i++], &items[j--]);
        }
        if (i == j && !before(&items[i], &pivot, axis, classes) && !before(&pivot, &items[i], axis, classes)) {
            if (middle == i || middle == i + 1)
                return;
            if (middle < i)
                hi = i - 1;
            else
                lo = i + 1;
        } else if (middle <= j) {
            hi = j;
        } else {
            lo = j + 1;
        }
    }
}

static bool one_class(const item *items, size_t count, const uint8_t *classes)
{
    for (size_t i = 1; i < count; i++)
        if (classes[items[i].element] != classes[items[0].element])
            return false;
    return true;
}

/* Splits r in two if it has more than one unit; else makes the unit smaller. False when r fits one pack. */
static bool split(item *items, const uint8_t *classes, range *r, range *right)
{
    size_t count = r->last - r->first;
    while (r->unit > RDLI_WIDE && count <= r->unit)
        r->unit /= RDLI_WIDE;
    if (count <= r->unit)
        return false;
    size_t units = (count + r->unit - 1) / r->unit;
    size_t middle = (units + 1) / 2 * r->unit;
    r->mixed = r->mixed && !one_class(items + r->first, count, classes);
    select_smallest(items + r->first, count, middle, longest_axis(items + r->first, count), r->mixed ? classes : NULL);
    *right = (range){r->first + middle, r->last, r->unit, r->mixed};
    r->last = r->first + middle;
    return true;
}

static void build_range(item *items, const uint8_t *classes, range r)
{
    range right;
    while (split(items, classes, &r, &right)) {
        build_range(items, classes, right); /* depth: the logarithm of the count, as the halves are even up to one unit */
    }
}

static void build_task(void *data, size_t index, unsigned worker)
{
    (void)worker;
    build_job *job = data;
    range r = job->ranges[index];
    build_range(job->items, job->classes, r);
    for (size_t i = r.first; i < r.last; i++)
        job->order[i] = job->items[i].element;
}

void rdli_tree_arrange(rdli_workers *workers, rdli_tree *tree, const rdl_box *boxes, const uint8_t *classes)
{
    if (tree->count == 0)
        return;
    build_job job = {.items = tree->item_room.data, .classes = classes, .order = tree->order};
    for (uint32_t e = 0; e < tree->count; e++) {
        for (unsigned k = 0; k < 3; k++)
            job.items[e].centre[k] = 0.5f * boxes[e].lo[k] + 0.5f * boxes[e].hi[k];
        job.items[e].element = e;
    }
    size_t unit = 1;
    for (unsigned level = 0; level < tree->levels; level++)
        unit *= RDLI_WIDE;
    size_t ranges = 1;
    job.ranges[0] = (range){0, tree->count, unit, classes != NULL};
    for (bool grown = true; grown && ranges <= RANGES / 2;) {
        grown = false;
        for (size_t r = ranges; r-- > 0 && ranges < RANGES;)
            if (job.ranges[r].last - job.ranges[r].first > tree->count / RANGES + RDLI_WIDE &&
                split(job.items, classes, &job.ranges[r], &job.ranges[ranges])) {
                ranges++;
                grown = true;
            }
    }
    rdli_parallel_for(workers, ranges, build_task, &job);
}
