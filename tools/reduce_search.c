/* reduce_search.c: delta debugging (Zeller & Hildebrandt 2002): parts, connected pieces, the neighbourhood of what was
 * found, elements, then the motion. Candidates are tested in blocks, in parallel, and the first in order that holds is
 * taken: what comes out does not depend on the number of jobs. */
#include <math.h>
#include <pthread.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "reduce.h"

enum { JOBS_MAX = 64 };

typedef struct candidate {
    reducer *r;
    uint8_t *mask;
    double *start, *proposed; /* of the whole scene */
    size_t number;
    finding found;
} candidate;

static void *test_candidate(void *data)
{
    candidate *c = data;
    reduced cut;
    memset(&c->found, 0, sizeof c->found);
    if (!reduced_cut(c->r->whole, c->mask, c->start, c->proposed, &cut))
        return NULL;
    predicate_test(&c->r->keep, &cut, c->number, &c->found);
    reduced_release(&cut);
    return NULL;
}

/* Tests all; the commands of KEEP_COMMAND write through HDF5, which takes one thread at a time. */
static void test_all(reducer *r, candidate *list, size_t count)
{
    pthread_t threads[JOBS_MAX];
    bool begun[JOBS_MAX] = {false};
    for (size_t k = 0; k < count; k++) {
        list[k].number = r->tests++;
        begun[k] = k + 1 < count && r->keep.kind != KEEP_COMMAND &&
                   pthread_create(&threads[k], NULL, test_candidate, &list[k]) == 0;
        if (!begun[k])
            test_candidate(&list[k]);
    }
    for (size_t k = 0; k < count; k++)
        if (begun[k])
            pthread_join(threads[k], NULL);
}

bool reduce_try(reducer *r, const uint8_t *mask, const double *start, const double *proposed, finding *found)
{
    candidate c = {.r = r, .mask = (uint8_t *)mask, .start = (double *)start, .proposed = (double *)proposed,
                   .number = r->tests++};
    test_candidate(&c);
    *found = c.found;
    return c.found.holds;
}

static bool should_stop(reducer *r)
{
    r->out_of_time = r->out_of_time || (r->seconds_max > 0 && cli_clock() - r->begun > r->seconds_max);
    return r->out_of_time || cli_interrupted() != 0;
}

static size_t count_kept(const reducer *r, const uint8_t *mask)
{
    size_t kept = 0;
    for (size_t e = 0; e < r->element_count; e++)
        kept += mask[e];
    return kept;
}

static void accept(reducer *r, const candidate *c)
{
    size_t n = 3 * r->whole->scene.vertex_count;
    memcpy(r->mask, c->mask, r->element_count);
    memcpy(r->start, c->start, n * sizeof(double));
    memcpy(r->proposed, c->proposed, n * sizeof(double));
    r->best = c->found;
    r->kept = count_kept(r, r->mask);
    if (r->improved != NULL)
        r->improved(r, r->user);
}

/* ---- candidates ---- */

/* A change of the best: unit k of it is described by whoever makes it. False: it changes nothing. */
typedef bool apply_unit(reducer *r, const void *plan, size_t unit, candidate *c);

static bool make_candidate(reducer *r, candidate *c)
{
    size_t n = 3 * r->whole->scene.vertex_count;
    c->r = r;
    c->mask = malloc(r->element_count + 1);
    c->start = malloc(n * sizeof(double));
    c->proposed = malloc(n * sizeof(double));
    if (c->mask == NULL || c->start == NULL || c->proposed == NULL)
        return false;
    memcpy(c->mask, r->mask, r->element_count);
    memcpy(c->start, r->start, n * sizeof(double));
    memcpy(c->proposed, r->proposed, n * sizeof(double));
    return true;
}

static void drop_candidate(candidate *c)
{
    free(c->mask);
    free(c->start);
    free(c->proposed);
}

/* Takes units 0 to count - 1 in turn, each over the best so far; returns how many held. *first: -1, or the first. */
static rdl_status take_first(reducer *r, const void *plan, apply_unit *apply, size_t count, size_t *next, bool *held)
{
    candidate list[JOBS_MAX];
    size_t filled = 0, unit_of[JOBS_MAX];
    bool memory = true;
    *held = false;
    while (*next < count && filled < r->jobs && memory) {
        memset(&list[filled], 0, sizeof list[filled]);
        memory = make_candidate(r, &list[filled]);
        bool changes = memory && apply(r, plan, *next, &list[filled]);
        if (changes)
            unit_of[filled++] = *next;
        else
            drop_candidate(&list[filled]);
        ++*next;
    }
    test_all(r, list, memory ? filled : 0);
    for (size_t k = 0; k < filled; k++) {
        if (memory && !*held && list[k].found.holds) {
            accept(r, &list[k]);
            *held = true;
            *next = unit_of[k] + 1;
        }
        drop_candidate(&list[k]);
    }
    return memory ? RDL_OK : RDL_NO_MEMORY;
}

/* Every unit once, in turn. */
static rdl_status take_each(reducer *r, const void *plan, apply_unit *apply, size_t count)
{
    rdl_status status = RDL_OK;
    for (size_t next = 0; status == RDL_OK && next < count && !should_stop(r);) {
        bool held;
        status = take_first(r, plan, apply, count, &next, &held);
    }
    return status;
}

/* ---- delta debugging over a list of things that can be left out ---- */

typedef struct left_out {
    uint32_t *items; /* still there */
    size_t count, pieces;
    void (*leave)(reducer *r, candidate *c, const void *what, uint32_t item);
    const void *what;
} left_out;

static size_t piece_begin(const left_out *list, size_t piece)
{
    return piece * list->count / list->pieces;
}

/* Leaves out one piece of the list. */
static bool leave_piece(reducer *r, const void *plan, size_t piece, candidate *c)
{
    const left_out *list = plan;
    size_t end = piece_begin(list, piece + 1);
    for (size_t i = piece_begin(list, piece); i < end; i++)
        list->leave(r, c, list->what, list->items[i]);
    return end > piece_begin(list, piece);
}

/* ddmin with complements: pieces are left out, ever smaller ones, until no single item can be. */
static rdl_status leave_out(reducer *r, left_out *list)
{
    rdl_status status = RDL_OK;
    list->pieces = list->count < 2 ? list->count : 2;
    while (status == RDL_OK && list->count > 0 && !should_stop(r)) {
        bool any = false;
        size_t next = 0;
        while (status == RDL_OK && next < list->pieces && !should_stop(r)) {
            bool held;
            status = take_first(r, list, leave_piece, list->pieces, &next, &held);
            if (!held)
                continue;
            size_t piece = next - 1, begin = piece_begin(list, piece), end = piece_begin(list, piece + 1);
            memmove(list->items + begin, list->items + end, (list->count - end) * sizeof *list->items);
            size_t left = list->count - (end - begin);
            /* Pieces keep their size: the next one begins where this one did. */
            list->pieces = left == 0 ? 0 : list->pieces > 1 ? list->pieces - 1 : 1;
            list->count = left;
            next = piece;
            any = true;
        }
        if (list->pieces >= list->count && !any)
            break;
        if (list->pieces < list->count)
            list->pieces = 2 * list->pieces < list->count ? 2 * list->pieces : list->count;
    }
    return status;
}

/* ---- what can be left out ---- */

static const uint32_t *corners_of(const rdl_scene *scene, size_t element, size_t *count)
{
    bool segment = element < scene->segment_count;
    *count = segment ? 2 : 3;
    return segment ? scene->segments[element] : scene->triangles[element - scene->segment_count];
}

/* what: the group of each element. */
static void leave_group(reducer *r, candidate *c, const void *what, uint32_t group)
{
    const uint32_t *group_of = what;
    for (size_t e = 0; e < r->element_count; e++)
        if (group_of[e] == group)
            c->mask[e] = 0;
}

static void leave_element(reducer *r, candidate *c, const void *what, uint32_t element)
{
    (void)r;
    (void)what;
    c->mask[element] = 0;
}

static void leave_motion(reducer *r, candidate *c, const void *what, uint32_t vertex)
{
    (void)r;
    (void)what;
    memcpy(c->proposed + 3 * (size_t)vertex, c->start + 3 * (size_t)vertex, 3 * sizeof(double));
}

static rdl_status leave_groups(reducer *r, const uint32_t *group_of, size_t groups)
{
    uint32_t *items = malloc((groups + 1) * sizeof *items);
    if (items == NULL)
        return RDL_NO_MEMORY;
    for (size_t g = 0; g < groups; g++)
        items[g] = (uint32_t)g;
    left_out list = {.items = items, .count = groups, .leave = leave_group, .what = group_of};
    rdl_status status = leave_out(r, &list);
    free(items);
    return status;
}

static uint32_t root_of(uint32_t *parent, uint32_t v)
{
    while (parent[v] != v)
        v = parent[v] = parent[parent[v]];
    return v;
}

/* Groups of what is still there: by part, or connected through shared vertices. */
static rdl_status leave_parts_or_pieces(reducer *r, bool pieces)
{
    const rdl_scene *scene = &r->whole->scene;
    size_t n = scene->vertex_count, groups = 0, count;
    uint32_t *parent = malloc(n * sizeof *parent), *label = malloc(n * sizeof *label);
    uint32_t *group_of = malloc((r->element_count + 1) * sizeof *group_of);
    rdl_status status = parent != NULL && label != NULL && group_of != NULL ? RDL_OK : RDL_NO_MEMORY;
    for (size_t v = 0; status == RDL_OK && v < n; v++) {
        parent[v] = (uint32_t)v;
        label[v] = UINT32_MAX;
    }
    for (size_t e = 0; status == RDL_OK && pieces && e < r->element_count; e++) {
        const uint32_t *corner = corners_of(scene, e, &count);
        for (size_t k = 1; r->mask[e] && k < count; k++)
            parent[root_of(parent, corner[k])] = root_of(parent, corner[0]);
    }
    for (size_t e = 0; status == RDL_OK && e < r->element_count; e++) {
        const uint32_t *corner = corners_of(scene, e, &count);
        uint32_t key = pieces ? root_of(parent, corner[0]) : scene->vertex_part[corner[0]];
        group_of[e] = UINT32_MAX;
        if (!r->mask[e])
            continue;
        if (label[key] == UINT32_MAX)
            label[key] = (uint32_t)groups++;
        group_of[e] = label[key];
    }
    if (status == RDL_OK && groups > 1)
        status = leave_groups(r, group_of, groups);
    free(parent);
    free(label);
    free(group_of);
    return status;
}

/* ---- elements, nearest to what was found first ---- */

typedef struct ranked {
    double square; /* m^2 from the place */
    uint32_t element;
} ranked;

static int compare_ranked(const void *a, const void *b)
{
    const ranked *x = a, *y = b;
    if (x->square != y->square)
        return x->square < y->square ? -1 : 1;
    return x->element < y->element ? -1 : x->element > y->element;
}

static double distance_to(const reducer *r, size_t element)
{
    size_t count;
    const uint32_t *corner = corners_of(&r->whole->scene, element, &count);
    double least = HUGE_VAL;
    for (size_t k = 0; k < count; k++) {
        double square = 0;
        for (size_t c = 0; c < 3; c++) {
            double d = r->start[3 * (size_t)corner[k] + c] - r->best.place[c];
            square += d * d;
        }
        least = fmin(least, square);
    }
    return least;
}

static ranked *rank_elements(const reducer *r, size_t *count)
{
    ranked *list = malloc((r->element_count + 1) * sizeof *list);
    *count = 0;
    for (size_t e = 0; list != NULL && e < r->element_count; e++)
        if (r->mask[e])
            list[(*count)++] = (ranked){r->best.has_place ? distance_to(r, e) : 0, (uint32_t)e};
    if (list != NULL)
        qsort(list, *count, sizeof *list, compare_ranked);
    return list;
}

typedef struct ball {
    const ranked *list;
    size_t count;
} ball;

/* Unit k: only the 2^(k + 2) elements that are nearest to the place. */
static bool keep_ball(reducer *r, const void *plan, size_t unit, candidate *c)
{
    const ball *b = plan;
    size_t size = (size_t)4 << unit;
    if (size >= b->count)
        return false;
    memset(c->mask, 0, r->element_count);
    for (size_t i = 0; i < size; i++)
        c->mask[b->list[i].element] = 1;
    return true;
}

static rdl_status shrink_to_ball(reducer *r)
{
    ball b;
    ranked *list = rank_elements(r, &b.count);
    if (list == NULL)
        return RDL_NO_MEMORY;
    b.list = list;
    rdl_status status = RDL_OK;
    bool held = false;
    for (size_t next = 0; r->best.has_place && status == RDL_OK && !held && next < 30 && !should_stop(r);)
        status = take_first(r, &b, keep_ball, 30, &next, &held);
    free(list);
    return status;
}

static rdl_status leave_elements(reducer *r)
{
    size_t count;
    ranked *list = rank_elements(r, &count);
    uint32_t *items = malloc((r->element_count + 1) * sizeof *items);
    rdl_status status = list != NULL && items != NULL ? RDL_OK : RDL_NO_MEMORY;
    for (size_t i = 0; status == RDL_OK && i < count; i++)
        items[i] = list[count - 1 - i].element; /* the farthest go first */
    left_out plan = {.items = items, .count = count, .leave = leave_element};
    if (status == RDL_OK)
        status = leave_out(r, &plan);
    free(list);
    free(items);
    return status;
}

/* ---- motion ---- */

static void mark_used(const reducer *r, uint8_t *used)
{
    const rdl_scene *scene = &r->whole->scene;
    size_t count;
    memset(used, 0, scene->vertex_count);
    for (size_t e = 0; e < r->element_count; e++) {
        const uint32_t *corner = corners_of(scene, e, &count);
        for (size_t k = 0; r->mask[e] && k < count; k++)
            used[corner[k]] = 1;
    }
}

static rdl_status rest_vertices(reducer *r, const uint8_t *used)
{
    size_t n = r->whole->scene.vertex_count, count = 0;
    uint32_t *items = malloc((n + 1) * sizeof *items);
    if (items == NULL)
        return RDL_NO_MEMORY;
    for (size_t v = 0; v < n; v++)
        if (used[v] && memcmp(r->start + 3 * v, r->proposed + 3 * v, 3 * sizeof(double)) != 0)
            items[count++] = (uint32_t)v;
    left_out plan = {.items = items, .count = count, .leave = leave_motion};
    rdl_status status = leave_out(r, &plan);
    free(items);
    return status;
}

/* A number with fewer decimal digits; a float host keeps to its own numbers. */
static double rounder(const reducer *r, double x, int digits)
{
    char text[40];
    snprintf(text, sizeof text, "%.*g", digits, x);
    double y = strtod(text, NULL);
    return r->whole->host_bits == RDL_FLOAT32 ? (double)(float)y : y;
}

typedef struct rounding {
    uint32_t *vertices; /* that the kept elements use */
    size_t count;
    bool one_by_one;
    int digits;
} rounding;

/* One by one: unit is a place in the list. All together: unit = digits - 1. */
static bool round_unit(reducer *r, const void *plan, size_t unit, candidate *c)
{
    const rounding *way = plan;
    size_t first = way->one_by_one ? unit : 0, end = way->one_by_one ? unit + 1 : way->count;
    int digits = way->one_by_one ? way->digits : (int)unit + 1;
    bool changes = false;
    for (size_t i = first; i < end; i++)
        for (size_t k = 3 * (size_t)way->vertices[i]; k < 3 * (size_t)way->vertices[i] + 3; k++) {
            c->start[k] = rounder(r, r->start[k], digits);
            c->proposed[k] = rounder(r, r->proposed[k], digits);
            changes = changes || memcmp(&c->start[k], &r->start[k], sizeof(double)) != 0 ||
                      memcmp(&c->proposed[k], &r->proposed[k], sizeof(double)) != 0;
        }
    return changes;
}

static rdl_status round_numbers(reducer *r, const uint8_t *used)
{
    size_t n = r->whole->scene.vertex_count;
    rounding way = {.vertices = malloc((n + 1) * sizeof *way.vertices)};
    rdl_status status = way.vertices != NULL ? RDL_OK : RDL_NO_MEMORY;
    bool held = false;
    for (size_t v = 0; status == RDL_OK && v < n; v++)
        if (used[v])
            way.vertices[way.count++] = (uint32_t)v;
    for (size_t next = 0; status == RDL_OK && !held && next < 16 && !should_stop(r);)
        status = take_first(r, &way, round_unit, 16, &next, &held);
    way.one_by_one = true;
    for (way.digits = 1; status == RDL_OK && way.digits <= 4 && r->kept <= 64; way.digits++)
        status = take_each(r, &way, round_unit, way.count);
    free(way.vertices);
    return status;
}

static rdl_status simplify_motion(reducer *r)
{
    uint8_t *used = malloc(r->whole->scene.vertex_count + 1);
    if (used == NULL)
        return RDL_NO_MEMORY;
    mark_used(r, used);
    rdl_status status = rest_vertices(r, used);
    if (status == RDL_OK)
        status = round_numbers(r, used);
    free(used);
    return status;
}

rdl_status reduce_search(reducer *r)
{
    r->kept = count_kept(r, r->mask);
    r->jobs = r->jobs < 1 ? 1 : r->jobs > JOBS_MAX ? JOBS_MAX : r->jobs;
    rdl_status status = leave_parts_or_pieces(r, false);
    if (status == RDL_OK)
        status = shrink_to_ball(r);
    if (status == RDL_OK)
        status = leave_parts_or_pieces(r, true);
    /* Simpler motion may let further elements go, and the other way round. */
    for (int round = 0; round < 3 && status == RDL_OK && !should_stop(r); round++) {
        size_t before = r->kept;
        status = leave_elements(r);
        if (status == RDL_OK && (round == 0 || r->kept < before))
            status = simplify_motion(r);
        if (round > 0 && r->kept == before)
            break;
    }
    return status == RDL_OK && cli_interrupted() ? RDL_CANCELLED : status;
}
