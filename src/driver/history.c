/* driver/history.c: what a step inherits: intersections at the start, remembered crossings. */
#include "driver/rest.h"
#include "driver/stages.h"

rdl_status rdli_name_pair(rdl_engine *engine, uint32_t kind, uint32_t first, uint32_t second, uint32_t why)
{
    if (!rdli_room_reserve(&engine->memory, &engine->named, engine->named_count + 1, sizeof(rdl_named_pair), true))
        return RDL_NO_MEMORY;
    rdl_named_pair *row = (rdl_named_pair *)engine->named.data + engine->named_count++;
    row->kind = kind;
    row->first = first;
    row->second = second;
    row->why = why;
    return RDL_OK;
}

/* Sign of the volume that a pair spans: PT of the point over the triangle, EE of the two edges. It only tells sides of
 * pairs that are known to have crossed, so plain doubles do. */
static int side_of(const rdli_mesh *mesh, const rdli_crossing *crossing, const double (*x)[3])
{
    uint32_t v[4];
    double w[3], a[3], b[3];
    rdli_pair_vertices(mesh, crossing->kind, crossing->first, crossing->second, v);
    bool point = crossing->kind == RDL_POINT_TRIANGLE;
    for (int k = 0; k < 3; k++) {
        w[k] = point ? x[v[0]][k] - x[v[1]][k] : x[v[2]][k] - x[v[0]][k];
        a[k] = point ? x[v[2]][k] - x[v[1]][k] : x[v[1]][k] - x[v[0]][k];
        b[k] = point ? x[v[3]][k] - x[v[1]][k] : x[v[3]][k] - x[v[2]][k];
    }
    double volume = w[0] * (a[1] * b[2] - a[2] * b[1]) + w[1] * (a[2] * b[0] - a[0] * b[2])
        + w[2] * (a[0] * b[1] - a[1] * b[0]);
    return (volume > 0.0) - (volume < 0.0);
}

static int compare(const rdli_crossing *a, uint32_t kind, uint32_t first, uint32_t second)
{
    if (a->kind != kind)
        return a->kind < kind ? -1 : 1;
    if (a->first != first)
        return a->first < first ? -1 : 1;
    if (a->second != second)
        return a->second < second ? -1 : 1;
    return 0;
}

rdl_status rdli_remember_crossing(rdl_engine *engine, const rdli_hit *hit, const double (*before)[3])
{
    size_t count = engine->crossing_count, at = 0;
    if (!rdli_room_reserve(&engine->memory, &engine->crossings, count + 1, sizeof(rdli_crossing), true))
        return RDL_NO_MEMORY;
    rdli_crossing *rows = engine->crossings.data;
    while (at < count && compare(&rows[at], hit->kind, hit->first, hit->second) < 0)
        at++;
    if (at < count && compare(&rows[at], hit->kind, hit->first, hit->second) == 0)
        return RDL_OK;
    memmove(&rows[at + 1], &rows[at], (count - at) * sizeof *rows);
    rows[at].kind = hit->kind;
    rows[at].first = hit->first;
    rows[at].second = hit->second;
    rows[at].side = side_of(&engine->mesh, &rows[at], before);
    engine->crossing_count++;
    return RDL_OK;
}

static rdl_status name_intersections(rdl_engine *engine)
{
    rdli_room rows = { NULL, 0 };
    size_t count;
    rdl_status status = rdli_rest_find(&engine->memory, engine->workers, &engine->mesh, engine->start.data, false,
                                       engine->broad, &rows, &count);
    const rdl_tangle *tangles = rows.data;
    const uint32_t (*edges)[2] = engine->mesh.edges;
    for (size_t i = 0; status == RDL_OK && i < count; i++) {
        if (tangles[i].relation != RDL_REST_PIERCE)
            continue;
        uint32_t lo = 0, hi = engine->mesh.edge_count - 1;
        while (lo < hi) { /* edges are sorted by vertex pair */
            uint32_t middle = lo + (hi - lo) / 2;
            bool below = edges[middle][0] < tangles[i].edge[0]
                || (edges[middle][0] == tangles[i].edge[0] && edges[middle][1] < tangles[i].edge[1]);
            if (below)
                lo = middle + 1;
            else
                hi = middle;
        }
        status = rdli_name_pair(engine, RDL_EDGE_TRIANGLE, lo, tangles[i].triangle, RDL_WHY_INTERSECTS_AT_START);
    }
    rdli_room_release(&engine->memory, &rows);
    return status;
}

rdl_status rdli_history_begin(rdl_engine *engine)
{
    size_t n = engine->mesh.vertex_count;
    uint8_t *released = engine->released.data;
    const rdli_crossing *crossings = engine->crossings.data;
    rdl_status status = RDL_OK;
    memset(released, 0, n);
    for (size_t i = 0; status == RDL_OK && i < engine->crossing_count; i++) {
        uint32_t v[4];
        rdli_pair_vertices(&engine->mesh, crossings[i].kind, crossings[i].first, crossings[i].second, v);
        for (int k = 0; k < 4; k++)
            if (!engine->mesh.driven[v[k]])
                released[v[k]] = 1;
        status = rdli_name_pair(engine, crossings[i].kind, crossings[i].first, crossings[i].second,
                                RDL_WHY_REMEMBERED_CROSSING);
    }
    /* Delivered bits that were certified from an untangled start are untangled: no search needed. */
    bool same = engine->known && memcmp(engine->start.data, engine->last.data, n * 3 * sizeof(double)) == 0;
    if (status == RDL_OK && !same)
        status = name_intersections(engine);
    return status;
}

rdl_status rdli_history_end(rdl_engine *engine)
{
    rdli_crossing *rows = engine->crossings.data;
    size_t kept = 0;
    for (size_t i = 0; i < engine->crossing_count; i++)
        if (side_of(&engine->mesh, &rows[i], engine->trial.data) != rows[i].side)
            rows[kept++] = rows[i];
    engine->crossing_count = kept;
    bool clean = kept == 0;
    const rdl_named_pair *named = engine->named.data;
    for (size_t i = 0; i < engine->named_count; i++)
        clean = clean && named[i].why != RDL_WHY_INTERSECTS_AT_START && named[i].why != RDL_WHY_CONTACT_AT_START;
    memcpy(engine->last.data, engine->trial.data, engine->mesh.vertex_count * 3 * sizeof(double));
    engine->known = clean;
    return RDL_OK;
}
