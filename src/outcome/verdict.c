/* outcome/verdict.c: see verdict.h. */
#include "outcome/verdict.h"

#include "base/vector.h"

static bool before(const rdl_named_pair *a, const rdl_named_pair *b)
{
    if (a->kind != b->kind)
        return a->kind < b->kind;
    if (a->first != b->first)
        return a->first < b->first;
    if (a->second != b->second)
        return a->second < b->second;
    return a->why < b->why;
}

static void sift(rdl_named_pair *rows, size_t root, size_t count)
{
    rdl_named_pair moving = rows[root];
    for (size_t child; (child = 2 * root + 1) < count; root = child) {
        if (child + 1 < count && before(&rows[child], &rows[child + 1]))
            child++;
        if (!before(&moving, &rows[child]))
            break;
        rows[root] = rows[child];
    }
    rows[root] = moving;
}

/* Heap sort: in place, no recursion, no allocation (libc's qsort may allocate). */
void rdli_sort_named(rdl_named_pair *named, size_t *count)
{
    size_t n = *count;
    for (size_t i = n / 2; i-- > 0;)
        sift(named, i, n);
    for (size_t end = n; end-- > 1;) {
        rdl_named_pair last = named[0];
        named[0] = named[end];
        named[end] = last;
        sift(named, 0, end);
    }
    size_t kept = 0;
    for (size_t i = 0; i < n; i++)
        if (kept == 0 || before(&named[kept - 1], &named[i]))
            named[kept++] = named[i];
    *count = kept;
}

bool rdli_mark_moved(const double (*proposed)[3], const double (*delivered)[3], size_t vertex_count, uint8_t *moved)
{
    bool any = false;
    for (size_t v = 0; v < vertex_count; v++) {
        moved[v] = memcmp(proposed[v], delivered[v], sizeof proposed[v]) != 0;
        any = any || moved[v];
    }
    return any;
}

rdl_verdict rdli_verdict_of(const rdl_named_pair *named, size_t count, bool moved_any)
{
    rdl_verdict verdict = moved_any ? RDL_RESOLVED : RDL_CLEAR;
    for (size_t i = 0; i < count; i++) {
        rdl_verdict this_one = RDL_CLEAR;
        if (named[i].why == RDL_WHY_NO_ROOM || named[i].why == RDL_WHY_BUDGET)
            this_one = RDL_PINCHED;
        else if (named[i].why == RDL_WHY_INTERSECTS_AT_START || named[i].why == RDL_WHY_REMEMBERED_CROSSING)
            this_one = RDL_TANGLED;
        verdict = this_one > verdict ? this_one : verdict;
    }
    return verdict;
}

void rdli_corrections(const double (*proposed)[3], const double (*delivered)[3], const uint8_t *driven,
                      size_t vertex_count, double *worst, double *mean)
{
    double largest = 0.0, sum = 0.0;
    size_t movable = 0;
    for (size_t v = 0; v < vertex_count; v++) {
        double shift[3];
        if (driven[v])
            continue;
        rdli_subtract(delivered[v], proposed[v], shift);
        double length = rdli_length(shift);
        largest = fmax(largest, length);
        sum += length;
        movable++;
    }
    *worst = largest;
    *mean = movable > 0 ? sum / (double)movable : 0.0;
}
