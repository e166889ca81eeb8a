/* driver/rest.c: see rest.h. One tree over edges and triangles; exact predicate for each edge-triangle couple. */
#include "driver/rest.h"

#include "broad/selfpairs.h"
#include "intake/intake.h"
#include "narrow/narrow.h"

typedef struct search {
    const rdli_mesh *mesh;
    const double (*positions)[3];
    bool include_driven;
    const rdli_pair *pairs;
    size_t pair_count;
    uint8_t *relation;
} search;

enum { CHUNK = 512 };

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

static bool attached(const rdli_mesh *mesh, uint32_t a, uint32_t b)
{
    for (uint32_t i = mesh->attached_first[a]; i < mesh->attached_first[a + 1]; i++)
        if (mesh->attached[i] == b)
            return true;
    return false;
}

bool rdli_rest_excluded(const rdli_mesh *mesh, uint32_t edge, uint32_t triangle, bool include_driven)
{
    const uint32_t *e = mesh->edges[edge], *t = mesh->triangles[triangle];
    bool driven = mesh->driven[e[0]] && mesh->driven[e[1]];
    for (int j = 0; j < 3; j++)
        driven = driven && mesh->driven[t[j]];
    if (driven && !include_driven)
        return true;
    if (rdli_is_muted(mesh->muted, mesh->part_count, mesh->vertex_part[e[0]], mesh->vertex_part[t[0]]))
        return true;
    for (int i = 0; i < 2; i++)
        for (int j = 0; j < 3; j++)
            if (e[i] == t[j] || (mesh->attachment_count > 0 && attached(mesh, e[i], t[j])))
                return true;
    return false;
}

static void relate_chunk(void *data, size_t chunk, unsigned worker)
{
    (void)worker;
    search *s = data;
    const rdli_mesh *mesh = s->mesh;
    size_t end = (chunk + 1) * CHUNK < s->pair_count ? (chunk + 1) * CHUNK : s->pair_count;
    for (size_t i = chunk * CHUNK; i < end; i++) {
        uint32_t a = s->pairs[i].first, b = s->pairs[i].second;
        s->relation[i] = RDL_REST_APART;
        if (a >= mesh->edge_count || b < mesh->edge_count) /* edges come first: only edge-triangle couples */
            continue;
        uint32_t triangle = b - mesh->edge_count;
        if (rdli_rest_excluded(mesh, a, triangle, s->include_driven))
            continue;
        double edge[2][3], corner[3][3];
        for (int k = 0; k < 2; k++)
            memcpy(edge[k], s->positions[mesh->edges[a][k]], sizeof edge[k]);
        for (int k = 0; k < 3; k++)
            memcpy(corner[k], s->positions[mesh->triangles[triangle][k]], sizeof corner[k]);
        s->relation[i] = (uint8_t)rdli_edge_against_triangle((const double (*)[3])edge, (const double (*)[3])corner);
    }
}

static rdl_status collect(rdli_memory *memory, rdli_workers *workers, search *s, rdli_room *out, size_t *count)
{
    rdli_room relations = { NULL, 0 };
    if (!rdli_room_reserve(memory, &relations, s->pair_count, 1, false))
        return RDL_NO_MEMORY;
    s->relation = relations.data;
    rdli_parallel_for(workers, (s->pair_count + CHUNK - 1) / CHUNK, relate_chunk, s);
    size_t found = 0;
    for (size_t i = 0; i < s->pair_count; i++)
        found += s->relation[i] != RDL_REST_APART;
    rdl_status status = rdli_room_reserve(memory, out, found, sizeof(rdl_tangle), false) ? RDL_OK : RDL_NO_MEMORY;
    rdl_tangle *items = out->data;
    *count = 0;
    for (size_t i = 0; status == RDL_OK && i < s->pair_count; i++)
        if (s->relation[i] != RDL_REST_APART) {
            rdl_tangle *item = &items[(*count)++];
            memcpy(item->edge, s->mesh->edges[s->pairs[i].first], sizeof item->edge);
            item->triangle = s->pairs[i].second - s->mesh->edge_count;
            item->relation = s->relation[i];
        }
    rdli_room_release(memory, &relations);
    return status;
}

rdl_status rdli_rest_find(rdli_memory *memory, rdli_workers *workers, const rdli_mesh *mesh,
                          const double (*positions)[3], bool include_driven, rdli_room *out, size_t *count)
{
    *count = 0;
    uint32_t total = mesh->edge_count + mesh->triangle_count;
    if (mesh->triangle_count == 0)
        return RDL_OK;
    rdl_box *boxes = rdli_take(memory, total, sizeof *boxes);
    if (boxes == NULL)
        return RDL_NO_MEMORY;
    for (uint32_t e = 0; e < mesh->edge_count; e++)
        box_of(positions, mesh->edges[e], 2, &boxes[e]);
    for (uint32_t t = 0; t < mesh->triangle_count; t++)
        box_of(positions, mesh->triangles[t], 3, &boxes[mesh->edge_count + t]);
    rdli_selfpairs *pairs = NULL;
    search s = { .mesh = mesh, .positions = positions, .include_driven = include_driven };
    rdl_status status = rdli_selfpairs_create(memory, workers, boxes, total, &pairs);
    if (status == RDL_OK)
        status = rdli_selfpairs_find(pairs, NULL, &s.pairs, &s.pair_count);
    if (status == RDL_OK)
        status = collect(memory, workers, &s, out, count);
    rdli_selfpairs_destroy(pairs);
    rdli_give(memory, boxes, total, sizeof *boxes);
    return status;
}
