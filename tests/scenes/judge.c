/* scenes/judge.c: see judge.h. */
#include "judge.h"

#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "loops.h"
#include "oracle.h"

void judge_fault(judge *j, unsigned step, const char *format, ...)
{
    char text[200];
    va_list list;
    va_start(list, format);
    (void)vsnprintf(text, sizeof text, format, list);
    va_end(list);
    if (j->faults++ == 0)
        (void)snprintf(j->first_fault, sizeof j->first_fault, "step %u: %.180s", step, text);
    if (j->verbose && j->faults <= 20)
        printf("    FAULT step %u: %s\n", step, text);
}

static int compare_rows(const void *a, const void *b)
{
    const uint32_t *x = a, *y = b;
    if (x[0] != y[0])
        return x[0] < y[0] ? -1 : 1;
    return x[1] < y[1] ? -1 : x[1] > y[1];
}

static void find_edges(judge *j)
{
    const world *w = j->w;
    size_t count = 0, kept = 0;
    j->edges = calloc(w->segment_count + 3 * w->triangle_count, sizeof *j->edges);
    if (j->edges == NULL)
        exit(EXIT_FAILURE);
    for (size_t s = 0; s < w->segment_count; s++)
        memcpy(j->edges[count++], w->segments[s], sizeof *j->edges);
    for (size_t t = 0; t < w->triangle_count; t++)
        for (int k = 0; k < 3; k++) {
            j->edges[count][0] = w->triangles[t][k];
            j->edges[count++][1] = w->triangles[t][(k + 1) % 3];
        }
    for (size_t e = 0; e < count; e++)
        if (j->edges[e][0] > j->edges[e][1]) {
            uint32_t higher = j->edges[e][0];
            j->edges[e][0] = j->edges[e][1];
            j->edges[e][1] = higher;
        }
    qsort(j->edges, count, sizeof *j->edges, compare_rows);
    for (size_t e = 0; e < count; e++)
        if (kept == 0 || compare_rows(j->edges[kept - 1], j->edges[e]) != 0)
            memmove(j->edges[kept++], j->edges[e], sizeof *j->edges);
    j->edge_count = kept;
}

/* Links every loop with every other; a pair whose number cannot be told gets LONG_MIN of no use later, so it is a
 * fault. */
static bool find_linking(judge *j, const double (*x)[3], long linking[])
{
    const world *w = j->w;
    bool sure = true;
    for (size_t a = 0; a < w->loop_count; a++)
        for (size_t b = a + 1; b < w->loop_count; b++) {
            double off;
            sure = oracle_linking_number(x + w->loops[a].first, w->loops[a].count, x + w->loops[b].first,
                                         w->loops[b].count, &linking[a * WORLD_LOOPS + b], &off)
                   && sure;
        }
    return sure;
}

static void search_pierces(judge *j, const double (*x)[3])
{
    judge_find_pierces(j, x, &j->pierces, &j->pierce_count, &j->pierce_room);
    if (j->pierce_count > 1)
        qsort(j->pierces, j->pierce_count, sizeof *j->pierces, compare_rows);
}

void judge_begin(judge *j, const world *w, bool verbose)
{
    memset(j, 0, sizeof *j);
    j->w = w;
    j->verbose = verbose;
    j->near = calloc(w->vertex_count, sizeof *j->near);
    j->group = calloc(w->vertex_count, sizeof *j->group);
    if (j->near == NULL || j->group == NULL)
        exit(EXIT_FAILURE);
    find_edges(j);
    search_pierces(j, w->x);
    if (!find_linking(j, w->x, j->linking))
        judge_fault(j, 0, "the linking numbers of the start are unclear");
}

void judge_end(judge *j)
{
    free(j->edges);
    free(j->pierces);
    free(j->found);
    free(j->near);
    free(j->group);
}

/* Names of why `why` or, with `also`, of a second reason. */
static size_t count_names(const rdl_report *r, uint32_t why, uint32_t also)
{
    size_t count = 0;
    for (size_t i = 0; i < r->named_count; i++)
        count += r->named[i].why == why || r->named[i].why == also;
    return count;
}

/* Exactly the edges and triangles that intersect at the start are named. */
static void judge_tangle_names(judge *j, const judge_step *step)
{
    const rdl_report *r = step->report;
    size_t named = count_names(r, RDL_WHY_INTERSECTS_AT_START, RDL_WHY_INTERSECTS_AT_START);
    if (named != j->pierce_count)
        judge_fault(j, step->number, "%zu tangles at the start, %zu named", j->pierce_count, named);
    for (size_t i = 0; i < j->pierce_count; i++)
        if (!judge_names(r, RDL_EDGE_TRIANGLE, j->pierces[i].first, j->pierces[i].second))
            judge_fault(j, step->number, "edge %u pierces triangle %u at the start: not named", j->pierces[i].first,
                        j->pierces[i].second);
}

/* What is named in contact at the start has a start distance of exactly 0. */
static void judge_contact_names(judge *j, const judge_step *step)
{
    mpq_t square;
    mpq_init(square);
    for (size_t i = 0; i < step->report->named_count; i++) {
        const rdl_named_pair *row = &step->report->named[i];
        uint32_t vertex[4];
        double x[4][3];
        if (row->why != RDL_WHY_CONTACT_AT_START)
            continue;
        judge_vertices(j, row->kind, row->first, row->second, vertex);
        for (int k = 0; k < 4; k++)
            memcpy(x[k], step->start[vertex[k]], sizeof x[k]);
        oracle_rest_distance2((int)row->kind, (const double(*)[3])x, square);
        if (mpq_sgn(square) != 0)
            judge_fault(j, step->number, "named in contact at the start, but apart: kind %u, %u %u", row->kind,
                        row->first, row->second);
    }
    mpq_clear(square);
}

static void judge_verdict(judge *j, const judge_step *step)
{
    const rdl_report *r = step->report;
    size_t n = j->w->vertex_count;
    bool moved = memcmp(step->proposed, step->delivered, n * 3 * sizeof(double)) != 0;
    rdl_verdict right = moved ? RDL_RESOLVED : RDL_CLEAR;
    if (count_names(r, RDL_WHY_NO_ROOM, RDL_WHY_BUDGET) > 0)
        right = RDL_PINCHED;
    if (j->pierce_count > 0 || count_names(r, RDL_WHY_REMEMBERED_CROSSING, RDL_WHY_REMEMBERED_CROSSING) > 0)
        right = RDL_TANGLED;
    if (r->verdict != right)
        judge_fault(j, step->number, "verdict %d, should be %d", (int)r->verdict, (int)right);
    if ((step->verdicts >> r->verdict & 1u) == 0)
        judge_fault(j, step->number, "verdict %d is not one of this scene (%zu named)", (int)r->verdict,
                    r->named_count);
    judge_tangle_names(j, step);
    judge_contact_names(j, step);
    if (r->verdict == RDL_RESOLVED && moved && !judge_proposal_fails(j, step))
        judge_fault(j, step->number, "something was moved, but all proposed pairs are apart");
}

static void judge_rest(judge *j, const judge_step *step)
{
    judge_pair *before = j->pierces;
    size_t before_count = j->pierce_count;
    j->pierces = NULL;
    j->pierce_count = j->pierce_room = 0;
    search_pierces(j, step->delivered);
    for (size_t i = 0, k = 0; i < j->pierce_count; i++) {
        while (k < before_count && compare_rows(&before[k], &j->pierces[i]) < 0)
            k++;
        if (k == before_count || compare_rows(&before[k], &j->pierces[i]) != 0)
            judge_fault(j, step->number, "new: edge %u (%u %u) pierces triangle %u", j->pierces[i].first,
                        j->edges[j->pierces[i].first][0], j->edges[j->pierces[i].first][1], j->pierces[i].second);
    }
    free(before);
    long linking[WORLD_LOOPS * WORLD_LOOPS] = {0};
    if (!find_linking(j, step->delivered, linking))
        judge_fault(j, step->number, "linking numbers are unclear");
    else if (memcmp(linking, j->linking, sizeof linking) != 0)
        judge_fault(j, step->number, "a linking number changed");
}

/* Driven vertices go where they were sent, and so does all that nothing comes near. */
static void judge_bits(judge *j, const judge_step *step)
{
    const rdl_report *r = step->report;
    size_t lost = 0, sent = 0, untold = 0;
    uint32_t example = 0;
    double far = 0.0;
    for (uint32_t v = 0; v < j->w->vertex_count; v++) {
        bool moved = memcmp(step->delivered[v], step->proposed[v], sizeof step->delivered[v]) != 0;
        bool driven = world_is_driven(j->w, v);
        sent += moved && driven;
        if (moved && !driven && !j->near[v]) {
            lost++;
            for (int k = 0; k < 3; k++)
                if (fabs(step->delivered[v][k] - step->proposed[v][k]) > far) {
                    far = fabs(step->delivered[v][k] - step->proposed[v][k]);
                    example = v;
                }
        }
        untold += r->moved != NULL && r->moved[v] != (moved ? 1 : 0);
    }
    if (sent > 0)
        judge_fault(j, step->number, "%zu driven vertices not where the host sent them", sent);
    if (lost > 0)
        judge_fault(j, step->number, "%zu vertices that nothing comes near were moved, vertex %u by %.3g m", lost,
                    example, far);
    if (untold > 0)
        judge_fault(j, step->number, "the report's list of moved vertices is wrong for %zu", untold);
}

void judge_the_step(judge *j, const judge_step *step)
{
    judge_verdict(j, step);
    judge_paths(j, step);
    judge_bits(j, step);
    judge_books(j, step);
    judge_rest(j, step);
}
