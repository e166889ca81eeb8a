/* judge.c: see judge.h. */
#include "judge.h"

#include <float.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { BATCH = 128 }; /* pairs per call of the query */

typedef struct worker {
    rdl_motion motions[2][BATCH];
    uint32_t ids[2][BATCH][2];
    size_t waiting[2];
    judge_finding *kept;
    size_t kept_count, kept_room;
    judge_counts counts;
    rdl_status status;
    rdl_fault fault;
} worker;

struct judge {
    const rdl_scene *scene;
    rdl_host host;
    size_t vertices, edges, triangles;
    uint32_t (*edge)[2];
    uint32_t (*corners)[4];
    rdl_box *boxes;
    rdl_tree *tree;
    uint8_t *muted; /* part_count x part_count */
    uint32_t *attached_first, *attached;
    worker *workers;
    size_t worker_count;
    bool list_driven;
    judge_finding *findings;
    size_t finding_room;
    /* of the call in progress */
    const double *from, *to;
    bool path, end;
    size_t most;
};

/* ---- elements ---- */

static int compare_edges(const void *a, const void *b)
{
    const uint32_t *x = a, *y = b;
    if (x[0] != y[0])
        return x[0] < y[0] ? -1 : 1;
    return x[1] == y[1] ? 0 : x[1] < y[1] ? -1 : 1;
}

static rdl_status make_edges(judge *j)
{
    const rdl_scene *scene = j->scene;
    size_t most = scene->segment_count + 3 * scene->triangle_count, count = 0, unique = 0;
    j->edge = malloc((most > 0 ? most : 1) * sizeof *j->edge);
    if (j->edge == NULL)
        return RDL_NO_MEMORY;
    for (size_t s = 0; s < scene->segment_count; s++, count++)
        memcpy(j->edge[count], scene->segments[s], sizeof j->edge[0]);
    for (size_t t = 0; t < scene->triangle_count; t++)
        for (size_t k = 0; k < 3; k++, count++) {
            j->edge[count][0] = scene->triangles[t][k];
            j->edge[count][1] = scene->triangles[t][(k + 1) % 3];
        }
    for (size_t e = 0; e < count; e++)
        if (j->edge[e][0] > j->edge[e][1]) {
            uint32_t lower = j->edge[e][1];
            j->edge[e][1] = j->edge[e][0];
            j->edge[e][0] = lower;
        }
    qsort(j->edge, count, sizeof j->edge[0], compare_edges);
    for (size_t e = 0; e < count; e++)
        if (e == 0 || compare_edges(j->edge[unique - 1], j->edge[e]) != 0)
            memmove(j->edge[unique++], j->edge[e], sizeof j->edge[0]);
    j->edges = unique;
    return RDL_OK;
}

/* Boxes in the order vertices, edges, triangles; unused corners repeat the first. */
static rdl_status make_corners(judge *j)
{
    size_t count = j->vertices + j->edges + j->triangles;
    if (count > INT32_MAX)
        return RDL_TOO_LARGE;
    j->corners = malloc(count * sizeof *j->corners);
    j->boxes = malloc(count * sizeof *j->boxes);
    if (j->corners == NULL || j->boxes == NULL)
        return RDL_NO_MEMORY;
    for (size_t i = 0; i < count; i++) {
        const uint32_t *of = i < j->vertices              ? NULL
                             : i < j->vertices + j->edges ? j->edge[i - j->vertices]
                                                          : j->scene->triangles[i - j->vertices - j->edges];
        size_t number = i < j->vertices ? 1 : i < j->vertices + j->edges ? 2 : 3;
        for (size_t k = 0; k < 4; k++)
            j->corners[i][k] = of == NULL ? (uint32_t)i : of[k < number ? k : 0];
    }
    return RDL_OK;
}

static rdl_status make_rules(judge *j)
{
    const rdl_scene *scene = j->scene;
    j->muted = calloc(scene->part_count, scene->part_count);
    j->attached_first = calloc(j->vertices + 1, sizeof *j->attached_first);
    j->attached = malloc((2 * scene->attachment_count + 1) * sizeof *j->attached);
    if (j->muted == NULL || j->attached_first == NULL || j->attached == NULL)
        return RDL_NO_MEMORY;
    for (size_t k = 0; k < scene->muted_count; k++) {
        const uint32_t *pair = scene->muted_parts[k];
        j->muted[pair[0] * scene->part_count + pair[1]] = 1;
        j->muted[pair[1] * scene->part_count + pair[0]] = 1;
    }
    for (size_t k = 0; k < scene->attachment_count; k++)
        for (size_t side = 0; side < 2; side++)
            j->attached_first[scene->attachments[k][side] + 1]++;
    for (size_t v = 0; v < j->vertices; v++)
        j->attached_first[v + 1] += j->attached_first[v];
    for (size_t k = 0; k < scene->attachment_count; k++)
        for (size_t side = 0; side < 2; side++)
            j->attached[j->attached_first[scene->attachments[k][side]]++] = scene->attachments[k][1 - side];
    for (size_t v = j->vertices; v > 0; v--) /* each start moved on to its end while filling */
        j->attached_first[v] = j->attached_first[v - 1];
    j->attached_first[0] = 0;
    return RDL_OK;
}

rdl_status judge_create(const rdl_scene *scene, unsigned threads, bool list_driven, judge **made)
{
    judge *j = calloc(1, sizeof *j);
    if (j == NULL)
        return RDL_NO_MEMORY;
    j->scene = scene;
    j->list_driven = list_driven;
    j->host = (rdl_host){.size = sizeof j->host, .threads = threads};
    j->vertices = scene->vertex_count;
    j->triangles = scene->triangle_count;
    j->worker_count = RDL_THREADS_MAX;
    j->workers = calloc(j->worker_count, sizeof *j->workers); /* untouched pages of idle workers cost nothing */
    rdl_status status = j->workers != NULL ? make_edges(j) : RDL_NO_MEMORY;
    if (status == RDL_OK)
        status = make_corners(j);
    if (status == RDL_OK)
        status = make_rules(j);
    if (status == RDL_OK)
        *made = j;
    else
        judge_destroy(j);
    return status;
}

void judge_destroy(judge *j)
{
    if (j == NULL)
        return;
    rdl_tree_destroy(j->tree);
    for (size_t w = 0; j->workers != NULL && w < j->worker_count; w++)
        free(j->workers[w].kept);
    free(j->workers);
    free(j->edge);
    free(j->corners);
    free(j->boxes);
    free(j->muted);
    free(j->attached_first);
    free(j->attached);
    free(j->findings);
    free(j);
}

const uint32_t (*judge_edges(const judge *j, size_t *count))[2]
{
    *count = j->edges;
    return (const uint32_t(*)[2])j->edge;
}

/* ---- boxes ---- */

/* Rounded outward; beyond float's range clamped, which keeps overlaps. */
static float round_down(double x)
{
    if (x <= -FLT_MAX)
        return -FLT_MAX;
    float f = x >= FLT_MAX ? FLT_MAX : (float)x;
    return (double)f > x ? nextafterf(f, -FLT_MAX) : f;
}

static float round_up(double x)
{
    return -round_down(-x);
}

static void fill_boxes(judge *j)
{
    size_t count = j->vertices + j->edges + j->triangles;
    for (size_t i = 0; i < count; i++)
        for (size_t c = 0; c < 3; c++) {
            double lo = HUGE_VAL, hi = -HUGE_VAL;
            for (size_t k = 0; k < 3; k++) {
                size_t v = j->corners[i][k];
                double a = j->from[3 * v + c], b = j->to[3 * v + c];
                lo = fmin(lo, fmin(a, b));
                hi = fmax(hi, fmax(a, b));
            }
            j->boxes[i].lo[c] = round_down(lo);
            j->boxes[i].hi[c] = round_up(hi);
        }
}

/* ---- findings ---- */

static int compare_findings(const void *a, const void *b)
{
    const judge_finding *x = a, *y = b;
    if (x->driven != y->driven)
        return x->driven < y->driven ? -1 : 1;
    if (x->kind != y->kind)
        return x->kind < y->kind ? -1 : 1;
    if (x->first != y->first)
        return x->first < y->first ? -1 : 1;
    return x->second == y->second ? 0 : x->second < y->second ? -1 : 1;
}

/* Keeps the first `most` findings in order, in room for a few more. */
static void keep(judge *j, worker *w, const judge_finding *finding)
{
    if (j->most == 0 || w->status != RDL_OK || (finding->driven && !j->list_driven))
        return;
    if (w->kept_count == w->kept_room) {
        size_t cap = 2 * j->most + 64;
        if (w->kept_count >= cap) {
            qsort(w->kept, w->kept_count, sizeof *w->kept, compare_findings);
            w->kept_count = j->most;
        } else {
            size_t room = w->kept_room > 0 ? 2 * w->kept_room : 64;
            room = room > cap ? cap : room;
            judge_finding *grown = realloc(w->kept, room * sizeof *grown);
            if (grown == NULL) {
                w->status = RDL_NO_MEMORY;
                return;
            }
            w->kept = grown;
            w->kept_room = room;
        }
    }
    w->kept[w->kept_count++] = *finding;
}

static bool are_attached(const judge *j, const uint32_t *a, size_t a_count, const uint32_t *b, size_t b_count)
{
    for (size_t i = 0; i < a_count; i++)
        for (uint32_t k = j->attached_first[a[i]]; k < j->attached_first[a[i] + 1]; k++)
            for (size_t n = 0; n < b_count; n++)
                if (j->attached[k] == b[n])
                    return true;
    return false;
}

static bool is_ignored(const judge *j, const uint32_t *a, size_t a_count, const uint32_t *b, size_t b_count)
{
    uint32_t p = j->scene->vertex_part[a[0]], q = j->scene->vertex_part[b[0]];
    return j->muted[p * j->scene->part_count + q] != 0 ||
           (j->scene->attachment_count > 0 && are_attached(j, a, a_count, b, b_count));
}

static bool all_driven(const judge *j, const uint32_t *a, size_t a_count, const uint32_t *b, size_t b_count)
{
    for (size_t i = 0; i < a_count; i++)
        if (!isinf(j->scene->mass[a[i]]))
            return false;
    for (size_t i = 0; i < b_count; i++)
        if (!isinf(j->scene->mass[b[i]]))
            return false;
    return true;
}

static void settle(judge *j, worker *w, int kind)
{
    rdl_touch touches[BATCH];
    size_t count = w->waiting[kind];
    w->waiting[kind] = 0;
    if (count == 0 || w->status != RDL_OK)
        return;
    w->status = rdl_find_touches(kind, count, (const rdl_motion *)w->motions[kind], NULL, touches, &w->fault);
    for (size_t i = 0; w->status == RDL_OK && i < count; i++) {
        if (!touches[i].touches)
            continue;
        if (touches[i].time_hi == 0) { /* at distance 0 already where the piece starts */
            w->counts.contacts++;
            continue;
        }
        const uint32_t *id = w->ids[kind][i];
        bool point = kind == RDL_POINT_TRIANGLE;
        const uint32_t *a = point ? &id[0] : j->edge[id[0]];
        const uint32_t *b = point ? j->scene->triangles[id[1]] : j->edge[id[1]];
        judge_finding finding = {
            touches[i].time_lo, touches[i].time_hi, point ? JUDGE_CROSSING_PT : JUDGE_CROSSING_EE, id[0], id[1], 0};
        finding.driven = all_driven(j, a, point ? 1 : 2, b, point ? 3 : 2);
        if (finding.driven)
            w->counts.driven_crossings++;
        else
            w->counts.crossings++;
        keep(j, w, &finding);
    }
}

static void load(const double *positions, const uint32_t *vertices, size_t count, double out[][3])
{
    for (size_t i = 0; i < count; i++)
        memcpy(out[i], positions + 3 * (size_t)vertices[i], sizeof out[0]);
}

static void ask_path(judge *j, worker *w, int kind, uint32_t first, uint32_t second)
{
    bool point = kind == RDL_POINT_TRIANGLE;
    const uint32_t *a = point ? &first : j->edge[first];
    const uint32_t *b = point ? j->scene->triangles[second] : j->edge[second];
    size_t a_count = point ? 1 : 2, b_count = 4 - a_count;
    if (is_ignored(j, a, a_count, b, b_count))
        return;
    w->counts.pairs++;
    size_t slot = w->waiting[kind]++;
    rdl_motion *motion = &w->motions[kind][slot];
    load(j->from, a, a_count, motion->start);
    load(j->from, b, b_count, motion->start + a_count);
    load(j->to, a, a_count, motion->end);
    load(j->to, b, b_count, motion->end + a_count);
    w->ids[kind][slot][0] = first;
    w->ids[kind][slot][1] = second;
    if (w->waiting[kind] == BATCH)
        settle(j, w, kind);
}

static void ask_rest(judge *j, worker *w, uint32_t edge, uint32_t triangle)
{
    const uint32_t *a = j->edge[edge], *b = j->scene->triangles[triangle];
    double ends[2][3], corners[3][3];
    if (is_ignored(j, a, 2, b, 3))
        return;
    w->counts.pairs++;
    load(j->to, a, 2, ends);
    load(j->to, b, 3, corners);
    if (rdl_edge_against_triangle((const double(*)[3])ends, (const double(*)[3])corners) != RDL_REST_PIERCE)
        return;
    judge_finding finding = {1, 1, JUDGE_TANGLE, edge, triangle, all_driven(j, a, 2, b, 3)};
    if (finding.driven)
        w->counts.driven_tangles++;
    else
        w->counts.tangles++;
    keep(j, w, &finding);
}

static void on_pairs(void *user, unsigned number, const uint32_t (*pairs)[2], size_t count)
{
    judge *j = user;
    worker *w = &j->workers[number];
    uint32_t edges_from = (uint32_t)j->vertices, triangles_from = (uint32_t)(j->vertices + j->edges);
    for (size_t i = 0; i < count && w->status == RDL_OK; i++) {
        uint32_t a = pairs[i][0], b = pairs[i][1]; /* a < b */
        bool edge_a = a >= edges_from && a < triangles_from;
        if (b >= triangles_from && a < edges_from && j->path)
            ask_path(j, w, RDL_POINT_TRIANGLE, a, b - triangles_from);
        else if (b >= edges_from && b < triangles_from && edge_a && j->path)
            ask_path(j, w, RDL_EDGE_EDGE, a - edges_from, b - edges_from);
        else if (b >= triangles_from && edge_a && j->end)
            ask_rest(j, w, a - edges_from, b - triangles_from);
    }
}

/* Empties the batches and joins what the workers found. */
static rdl_status gather(judge *j, judge_counts *counts, size_t *finding_count, rdl_fault *fault)
{
    size_t total = 0;
    for (size_t k = 0; k < j->worker_count; k++) {
        worker *w = &j->workers[k];
        settle(j, w, RDL_POINT_TRIANGLE);
        settle(j, w, RDL_EDGE_EDGE);
        if (w->status != RDL_OK) {
            *fault = w->fault;
            return w->status;
        }
        counts->tangles += w->counts.tangles;
        counts->crossings += w->counts.crossings;
        counts->driven_tangles += w->counts.driven_tangles;
        counts->driven_crossings += w->counts.driven_crossings;
        counts->contacts += w->counts.contacts;
        counts->pairs += w->counts.pairs;
        total += w->kept_count;
    }
    if (total > j->finding_room) {
        judge_finding *grown = realloc(j->findings, total * sizeof *grown);
        if (grown == NULL)
            return RDL_NO_MEMORY;
        j->findings = grown;
        j->finding_room = total;
    }
    size_t used = 0;
    for (size_t k = 0; k < j->worker_count; k++)
        for (size_t i = 0; i < j->workers[k].kept_count; i++)
            j->findings[used++] = j->workers[k].kept[i];
    if (used > 0)
        qsort(j->findings, used, sizeof *j->findings, compare_findings);
    *finding_count = used < j->most ? used : j->most;
    return RDL_OK;
}

rdl_status judge_piece(judge *j, const double *from, const double *to, bool path, bool end, size_t most,
                       judge_counts *counts, const judge_finding **findings, size_t *finding_count, rdl_fault *fault)
{
    size_t count = j->vertices + j->edges + j->triangles;
    j->from = from;
    j->to = to;
    j->path = path;
    j->end = end;
    j->most = most;
    memset(counts, 0, sizeof *counts);
    for (size_t k = 0; k < j->worker_count; k++) {
        worker *w = &j->workers[k];
        if (w->counts.pairs + w->kept_count + w->waiting[0] + w->waiting[1] == 0 && w->status == RDL_OK)
            continue;
        w->waiting[0] = w->waiting[1] = w->kept_count = 0;
        w->status = RDL_OK;
        memset(&w->counts, 0, sizeof w->counts);
    }
    fill_boxes(j);
    rdl_status status = j->tree == NULL ? rdl_tree_create(j->boxes, count, &j->host, &j->tree, fault)
                                        : rdl_tree_update(j->tree, (const rdl_box *)j->boxes, fault);
    if (status == RDL_OK)
        status = rdl_tree_self_pairs(j->tree, j->corners[0], on_pairs, j);
    if (status == RDL_OK)
        status = gather(j, counts, finding_count, fault);
    *findings = j->findings;
    return status;
}
