/* driver/rest.c: see rest.h. The broad phase finds the couples, a filter in doubles drops most of them, an exact predicate
 * decides the others. */
#include "driver/rest.h"

#include "narrow/narrow.h"

typedef struct search {
    const rdli_mesh *mesh;
    const double (*positions)[3];
    rdli_boxes boxes;
    const rdli_pair *couples;
    size_t couple_count;
    uint8_t *relation;
} search;

enum { CHUNK = 512, BOX_CHUNK = 4096 }; /* couples, and elements, per task */

static float down(double x)
{
    float f = x >= FLT_MAX ? FLT_MAX : x <= -FLT_MAX ? -FLT_MAX : (float)x;
    return (double)f > x ? nextafterf(f, -FLT_MAX) : f;
}

static float up(double x)
{
    return -down(-x);
}

static void box_of(const double (*positions)[3], const uint32_t *corner, int corners, rdl_box *box)
{
    for (int k = 0; k < 3; k++) {
        double lo = positions[corner[0]][k], hi = lo;
        for (int c = 1; c < corners; c++) {
            lo = fmin(lo, positions[corner[c]][k]);
            hi = fmax(hi, positions[corner[c]][k]);
        }
        box->lo[k] = down(lo);
        box->hi[k] = up(hi);
    }
}

/* Chunks of edges, then of triangles, in one loop. */
static void box_chunk(void *data, size_t chunk, unsigned worker)
{
    (void)worker;
    const search *s = data;
    const rdli_mesh *mesh = s->mesh;
    const size_t edge_chunks = ((size_t)mesh->edge_count + BOX_CHUNK - 1) / BOX_CHUNK;
    const bool edges = chunk < edge_chunks;
    const size_t first = (edges ? chunk : chunk - edge_chunks) * BOX_CHUNK, count = edges ? mesh->edge_count : mesh->triangle_count;
    for (size_t i = first; i < first + BOX_CHUNK && i < count; i++)
        if (edges)
            box_of(s->positions, mesh->edges[i], 2, &s->boxes.edges[i]);
        else
            box_of(s->positions, mesh->triangles[i], 3, &s->boxes.triangles[i]);
}

static void cross(const double a[3], const double b[3], double c[3])
{
    for (int k = 0; k < 3; k++)
        c[k] = a[(k + 1) % 3] * b[(k + 2) % 3] - a[(k + 2) % 3] * b[(k + 1) % 3];
}

/* Whether the plane across d through space separates the two for sure. x: ends of the edge, then corners, from the first
 * corner. d is what it is. A component of x has one rounding, a product one more, the sums two; 16 units of 2^-53 of the sum of
 * absolute values cover that in any rounding mode, the constant covers underflow. Overflow gives infinity - infinity, which
 * compares as "no". */
static bool separates(const double d[3], const double x[5][3])
{
    double lo[2] = { INFINITY, INFINITY }, hi[2] = { -INFINITY, -INFINITY };
    for (int i = 0; i < 5; i++) {
        const double a = d[0] * x[i][0], b = d[1] * x[i][1], c = d[2] * x[i][2], sum = a + b + c;
        const double slack = 0x1p-49 * (fabs(a) + fabs(b) + fabs(c)) + 0x1p-1060;
        const int side = i >= 2;
        lo[side] = sum - slack < lo[side] ? sum - slack : lo[side];
        hi[side] = sum + slack > hi[side] ? sum + slack : hi[side];
        if (!(sum - slack >= -DBL_MAX && sum + slack <= DBL_MAX))
            return false;
    }
    return lo[0] > hi[1] || lo[1] > hi[0];
}

/* Neighbours in a sheet lie in nearly one plane, so besides the normal the directions within the plane are tried: across the
 * triangle's sides and across the edge. */
static bool surely_apart(const double edge[2][3], const double corner[3][3])
{
    double x[5][3], normal[3], along[4][3], across[3];
    for (int i = 0; i < 5; i++)
        for (int k = 0; k < 3; k++)
            x[i][k] = (i < 2 ? edge[i][k] : corner[i - 2][k]) - corner[0][k];
    for (int k = 0; k < 3; k++) {
        along[0][k] = x[3][k];
        along[1][k] = x[4][k];
        along[2][k] = x[4][k] - x[3][k];
        along[3][k] = x[1][k] - x[0][k];
    }
    cross(x[3], x[4], normal);
    if (separates(normal, (const double (*)[3])x))
        return true;
    for (int i = 0; i < 4; i++) {
        cross(normal, along[i], across);
        if (separates(across, (const double (*)[3])x))
            return true;
    }
    return false;
}

static void relate_chunk(void *data, size_t chunk, unsigned worker)
{
    (void)worker;
    search *s = data;
    size_t end = (chunk + 1) * CHUNK < s->couple_count ? (chunk + 1) * CHUNK : s->couple_count;
    for (size_t i = chunk * CHUNK; i < end; i++) {
        const uint32_t *e = s->mesh->edges[s->couples[i].first], *t = s->mesh->triangles[s->couples[i].second];
        double edge[2][3], corner[3][3];
        for (int k = 0; k < 2; k++)
            memcpy(edge[k], s->positions[e[k]], sizeof edge[k]);
        for (int k = 0; k < 3; k++)
            memcpy(corner[k], s->positions[t[k]], sizeof corner[k]);
        s->relation[i] = RDL_REST_APART;
        if (!surely_apart((const double (*)[3])edge, (const double (*)[3])corner))
            s->relation[i] = (uint8_t)rdli_edge_against_triangle((const double (*)[3])edge, (const double (*)[3])corner);
    }
}

/* Decides the couples and appends to the rows in *out. */
static rdl_status relate(rdli_memory *memory, rdli_workers *workers, search *s, rdli_room *relations, rdli_room *out,
                         size_t *count)
{
    if (!rdli_room_reserve(memory, relations, s->couple_count, 1, false))
        return RDL_NO_MEMORY;
    s->relation = relations->data;
    rdli_parallel_for(workers, (s->couple_count + CHUNK - 1) / CHUNK, relate_chunk, s);
    size_t found = *count;
    for (size_t i = 0; i < s->couple_count; i++)
        found += s->relation[i] != RDL_REST_APART;
    if (!rdli_room_reserve(memory, out, found, sizeof(rdl_tangle), true))
        return RDL_NO_MEMORY;
    rdl_tangle *items = out->data;
    for (size_t i = 0; i < s->couple_count; i++)
        if (s->relation[i] != RDL_REST_APART) {
            rdl_tangle *item = &items[(*count)++];
            memcpy(item->edge, s->mesh->edges[s->couples[i].first], sizeof item->edge);
            item->triangle = s->couples[i].second;
            item->relation = s->relation[i];
        }
    return RDL_OK;
}

static rdl_status search_all(rdli_memory *memory, rdli_workers *workers, rdli_broad *broad, search *s, rdli_room *out,
                             size_t *count)
{
    rdli_room relations = { NULL, 0 };
    bool more = true;
    rdl_status status = rdli_broad_couples_begin(broad, s->mesh, &s->boxes);
    while (status == RDL_OK && more) {
        status = rdli_broad_couples(broad, s->mesh, &s->couples, &s->couple_count, &more);
        if (status == RDL_OK && s->couple_count > 0)
            status = relate(memory, workers, s, &relations, out, count);
    }
    rdli_broad_couples_end(broad);
    rdli_room_release(memory, &relations);
    return status;
}

rdl_status rdli_rest_find(rdli_memory *memory, rdli_workers *workers, const rdli_mesh *mesh,
                          const double (*positions)[3], bool include_driven, rdli_broad *broad, rdli_room *out, size_t *count)
{
    *count = 0;
    if (mesh->triangle_count == 0)
        return RDL_OK;
    rdli_mesh ruled = *mesh;
    if (include_driven)
        ruled.driven = NULL;
    const size_t total = (size_t)mesh->edge_count + mesh->triangle_count;
    const size_t chunks = total / BOX_CHUNK + 2;
    rdl_box *boxes = rdli_take(memory, total, sizeof *boxes);
    if (boxes == NULL)
        return RDL_NO_MEMORY;
    search s = { .mesh = &ruled, .positions = positions, .boxes = { NULL, boxes, boxes + mesh->edge_count } };
    rdli_parallel_for(workers, chunks, box_chunk, &s);
    rdli_broad *own = NULL;
    rdl_status status = broad == NULL ? rdli_broad_create(memory, workers, &own) : RDL_OK;
    if (status == RDL_OK)
        status = search_all(memory, workers, broad == NULL ? own : broad, &s, out, count);
    rdli_broad_destroy(own);
    rdli_give(memory, boxes, total, sizeof *boxes);
    return status;
}
