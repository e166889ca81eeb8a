/* scenes/judge_pairs.c: all pairs of a step, by sorting boxes along one axis; see judge.h. */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "filter.h"
#include "judge.h"
#include "oracle.h"

typedef struct box {
    double lo[3], hi[3];
    uint32_t id;
    bool second; /* of the second kind, where two kinds meet */
} box;

enum { PIECES = 70 }; /* way-points of a step, at most, and one */
static const double share = 0.5;

void judge_vertices(const judge *j, uint32_t kind, uint32_t first, uint32_t second, uint32_t vertex[4])
{
    if (kind == RDL_POINT_TRIANGLE) {
        vertex[0] = first;
        memcpy(vertex + 1, j->w->triangles[second], 3 * sizeof *vertex);
    } else {
        memcpy(vertex, j->edges[first], 2 * sizeof *vertex);
        memcpy(vertex + 2, j->edges[second], 2 * sizeof *vertex);
    }
}

static double half_of(const world *w, uint32_t v)
{
    return w->parts[w->vertex_part[v]].half_thickness;
}

double judge_gap(const judge *j, const uint32_t vertex[4], int kind)
{
    (void)kind;
    return half_of(j->w, vertex[0]) + half_of(j->w, vertex[3]);
}

static bool is_attached(const world *w, uint32_t a, uint32_t b)
{
    for (size_t i = 0; i < w->attachment_count; i++) {
        const uint32_t *pair = w->attachments[i];
        if ((pair[0] == a && pair[1] == b) || (pair[0] == b && pair[1] == a))
            return true;
    }
    return false;
}

bool judge_is_active(const judge *j, const uint32_t *a, int a_count, const uint32_t *b, int b_count)
{
    const world *w = j->w;
    bool driven = true;
    for (int i = 0; i < a_count; i++)
        driven = driven && world_is_driven(w, a[i]);
    for (int i = 0; i < b_count; i++)
        driven = driven && world_is_driven(w, b[i]);
    if (driven)
        return false;
    for (size_t m = 0; m < w->muted_count; m++) {
        uint32_t p = w->vertex_part[a[0]], q = w->vertex_part[b[0]];
        if ((w->muted[m][0] == p && w->muted[m][1] == q) || (w->muted[m][0] == q && w->muted[m][1] == p))
            return false;
    }
    for (int i = 0; i < a_count; i++)
        for (int k = 0; k < b_count; k++)
            if (a[i] == b[k] || is_attached(w, a[i], b[k]))
                return false;
    return true;
}

static int compare_named(const rdl_named_pair *row, uint32_t kind, uint32_t first, uint32_t second)
{
    if (row->kind != kind)
        return row->kind < kind ? -1 : 1;
    if (row->first != first)
        return row->first < first ? -1 : 1;
    return row->second < second ? -1 : row->second > second;
}

bool judge_names(const rdl_report *report, uint32_t kind, uint32_t first, uint32_t second)
{
    size_t lo = 0, hi = report->named_count;
    while (lo < hi) {
        size_t middle = lo + (hi - lo) / 2;
        int order = compare_named(&report->named[middle], kind, first, second);
        if (order == 0)
            return true;
        if (order < 0)
            lo = middle + 1;
        else
            hi = middle;
    }
    return false;
}

static void grow(box *b, const double x[3])
{
    for (int k = 0; k < 3; k++) {
        b->lo[k] = fmin(b->lo[k], x[k]);
        b->hi[k] = fmax(b->hi[k], x[k]);
    }
}

/* Everything that the corners pass through, in the proposal too, grown by the half-thickness. */
static box box_of(const judge *j, const judge_step *step, const uint32_t *corner, int count, uint32_t id, bool second,
                  bool grown)
{
    const rdl_report *r = step->report;
    box b = {{INFINITY, INFINITY, INFINITY}, {-INFINITY, -INFINITY, -INFINITY}, id, second};
    for (int c = 0; c < count; c++) {
        grow(&b, step->start[corner[c]]);
        grow(&b, step->proposed[corner[c]]);
        grow(&b, step->delivered[corner[c]]);
        for (size_t p = 0; p < r->waypoint_count; p++)
            grow(&b, r->waypoint_positions + 3 * (p * j->w->vertex_count + corner[c]));
    }
    double reach = grown ? half_of(j->w, corner[0]) * (1.0 + 1e-5) : 0.0;
    for (int k = 0; k < 3; k++) {
        b.lo[k] -= reach;
        b.hi[k] += reach;
    }
    return b;
}

static int by_low_x(const void *a, const void *b)
{
    double x = ((const box *)a)->lo[0], y = ((const box *)b)->lo[0];
    return x < y ? -1 : x > y;
}

static void add_pair(judge_pair **list, size_t *count, size_t *room, uint32_t first, uint32_t second)
{
    if (*count == *room) {
        *room = *room == 0 ? 1024 : 2 * *room;
        *list = realloc(*list, *room * sizeof **list);
        if (*list == NULL)
            exit(EXIT_FAILURE);
    }
    (*list)[(*count)++] = (judge_pair){first, second};
}

/* Overlapping boxes: all couples, or with `two_kinds` those of a first with a second. Fills j->found. */
static void overlap(judge *j, box *boxes, size_t count, bool two_kinds)
{
    j->found_count = 0;
    qsort(boxes, count, sizeof *boxes, by_low_x);
    for (size_t a = 0; a < count; a++)
        for (size_t b = a + 1; b < count && boxes[b].lo[0] <= boxes[a].hi[0]; b++) {
            const box *p = &boxes[a], *q = &boxes[b];
            if (two_kinds ? p->second == q->second : false)
                continue;
            if (p->lo[1] > q->hi[1] || q->lo[1] > p->hi[1] || p->lo[2] > q->hi[2] || q->lo[2] > p->hi[2])
                continue;
            bool swap = two_kinds ? p->second : p->id > q->id;
            add_pair(&j->found, &j->found_count, &j->found_room, swap ? q->id : p->id, swap ? p->id : q->id);
        }
}

static void candidates(judge *j, const judge_step *step, uint32_t kind)
{
    static box boxes[WORLD_VERTICES + 4 * WORLD_ELEMENTS];
    size_t count = 0;
    if (kind == RDL_EDGE_EDGE)
        for (uint32_t e = 0; e < j->edge_count; e++)
            boxes[count++] = box_of(j, step, j->edges[e], 2, e, false, true);
    else {
        for (uint32_t v = 0; v < j->w->vertex_count; v++)
            boxes[count++] = box_of(j, step, &v, 1, v, false, true);
        for (uint32_t t = 0; t < j->w->triangle_count; t++)
            boxes[count++] = box_of(j, step, j->w->triangles[t], 3, t, true, true);
    }
    overlap(j, boxes, count, kind == RDL_POINT_TRIANGLE);
}

static size_t load_pieces(const judge *j, const judge_step *step, const uint32_t vertex[4], rdl_motion pieces[PIECES])
{
    const rdl_report *r = step->report;
    size_t count = r->waypoint_count + 1;
    for (int i = 0; i < 4; i++) {
        const double *from = step->start[vertex[i]];
        for (size_t p = 0; p < count; p++) {
            const double *to = p + 1 < count ? r->waypoint_positions + 3 * (p * j->w->vertex_count + vertex[i])
                                             : step->delivered[vertex[i]];
            memcpy(pieces[p].start[i], from, sizeof pieces[p].start[i]);
            memcpy(pieces[p].end[i], to, sizeof pieces[p].end[i]);
            from = to;
        }
    }
    return count;
}

/* Exact where the filter cannot tell; the end alone is cheap to decide exactly. */
static oracle_apart decide(judge *j, uint32_t kind, const rdl_motion *pieces, size_t count, double gap)
{
    filter_answer quick = filter_pair((int)kind, pieces, count, gap, share);
    oracle_apart answer = {true, false, true, true};
    j->pairs++;
    if (quick.end_sure && quick.path_sure)
        return answer;
    j->exact++;
    if (!quick.path_sure)
        return oracle_pair_apart((int)kind, pieces, count, gap, share);
    rdl_motion whole = pieces[0];
    memcpy(whole.end, pieces[count - 1].end, sizeof whole.end);
    answer.apart = answer.end_kept = oracle_end_keeps_floor((int)kind, &whole, gap);
    return answer;
}

static void report_pair(judge *j, const judge_step *step, uint32_t kind, judge_pair pair, const rdl_motion *pieces,
                        size_t count, double gap, oracle_apart answer)
{
    double direction[3];
    judge_fault(j, step->number, "%s %u %u (parts %s, %s): %s%s; gap %.9g start %.17g end %.17g, %zu pieces",
                kind == RDL_POINT_TRIANGLE ? "PT" : "EE", pair.first, pair.second,
                j->w->parts[j->w->vertex_part[kind == RDL_POINT_TRIANGLE ? pair.first : j->edges[pair.first][0]]].name,
                j->w->parts[j->w->vertex_part[kind == RDL_POINT_TRIANGLE ? j->w->triangles[pair.second][0]
                                                                         : j->edges[pair.second][0]]].name,
                answer.end_kept ? "" : "end below its floor ", answer.path_kept ? "" : "path below its floor", gap,
                filter_distance((int)kind, (const double(*)[3])pieces[0].start, direction),
                filter_distance((int)kind, (const double(*)[3])pieces[count - 1].end, direction), count);
}

static void judge_kind(judge *j, const judge_step *step, uint32_t kind)
{
    static rdl_motion pieces[PIECES];
    candidates(j, step, kind);
    for (size_t i = 0; i < j->found_count; i++) {
        judge_pair pair = j->found[i];
        uint32_t vertex[4];
        int firsts = kind == RDL_POINT_TRIANGLE ? 1 : 2;
        judge_vertices(j, kind, pair.first, pair.second, vertex);
        if (!judge_is_active(j, vertex, firsts, vertex + firsts, 4 - firsts))
            continue;
        uint8_t who = 1;
        for (int k = 0; k < 4; k++)
            who = world_is_driven(j->w, vertex[k]) ? 2 : who;
        for (int k = 0; k < 4; k++)
            j->near[vertex[k]] |= who;
        if (judge_names(step->report, kind, pair.first, pair.second))
            continue;
        size_t count = load_pieces(j, step, vertex, pieces);
        double gap = judge_gap(j, vertex, (int)kind);
        oracle_apart answer = decide(j, kind, pieces, count, gap);
        if (!answer.apart)
            report_pair(j, step, kind, pair, pieces, count, gap, answer);
    }
}

void judge_paths(judge *j, const judge_step *step)
{
    memset(j->near, 0, j->w->vertex_count);
    if (step->report->waypoint_count + 1 > PIECES) {
        judge_fault(j, step->number, "%zu way-points", step->report->waypoint_count);
        return;
    }
    judge_kind(j, step, RDL_POINT_TRIANGLE);
    judge_kind(j, step, RDL_EDGE_EDGE);
}

bool judge_proposal_fails(judge *j, const judge_step *step)
{
    rdl_report none = {.size = sizeof none};
    judge_step straight = *step;
    straight.delivered = step->proposed;
    straight.report = &none;
    static rdl_motion motion[PIECES];
    for (uint32_t kind = 0; kind < 2; kind++) {
        candidates(j, &straight, kind);
        for (size_t i = 0; i < j->found_count; i++) {
            uint32_t vertex[4];
            int firsts = kind == RDL_POINT_TRIANGLE ? 1 : 2;
            judge_vertices(j, kind, j->found[i].first, j->found[i].second, vertex);
            if (!judge_is_active(j, vertex, firsts, vertex + firsts, 4 - firsts))
                continue;
            load_pieces(j, &straight, vertex, motion);
            if (!decide(j, kind, motion, 1, judge_gap(j, vertex, (int)kind)).apart)
                return true;
        }
    }
    return false;
}

void judge_find_pierces(judge *j, rows x, judge_pair **pierces, size_t *count, size_t *room)
{
    static box boxes[4 * WORLD_ELEMENTS];
    rdl_report none = {.size = sizeof none};
    judge_step still = {.start = x, .proposed = x, .delivered = x, .report = &none};
    size_t boxed = 0;
    for (uint32_t e = 0; e < j->edge_count; e++)
        boxes[boxed++] = box_of(j, &still, j->edges[e], 2, e, false, false);
    for (uint32_t t = 0; t < j->w->triangle_count; t++)
        boxes[boxed++] = box_of(j, &still, j->w->triangles[t], 3, t, true, false);
    overlap(j, boxes, boxed, true);
    *count = 0;
    for (size_t i = 0; i < j->found_count; i++) {
        const uint32_t *e = j->edges[j->found[i].first], *t = j->w->triangles[j->found[i].second];
        double edge[2][3], corner[3][3];
        if (!judge_is_active(j, e, 2, t, 3))
            continue;
        for (int k = 0; k < 2; k++)
            memcpy(edge[k], x[e[k]], sizeof edge[k]);
        for (int k = 0; k < 3; k++)
            memcpy(corner[k], x[t[k]], sizeof corner[k]);
        if (filter_misses((const double(*)[3])edge, (const double(*)[3])corner))
            continue;
        j->exact++;
        if (oracle_edge_against_triangle((const double(*)[3])edge, (const double(*)[3])corner) == ORACLE_PIERCE)
            add_pair(pierces, count, room, j->found[i].first, j->found[i].second);
    }
}
