/* intake/build.c: a checked scene -> owned mesh: unique edges, element thicknesses, exclusion sets. */
#include "intake/intake.h"

void rdli_mute(uint64_t *bits, uint32_t part_count, uint32_t p, uint32_t q)
{
    size_t at = (size_t)p * part_count + q, mirrored = (size_t)q * part_count + p;
    bits[at / 64] |= (uint64_t)1 << (at % 64);
    bits[mirrored / 64] |= (uint64_t)1 << (mirrored % 64);
}

bool rdli_is_muted(const uint64_t *bits, uint32_t part_count, uint32_t p, uint32_t q)
{
    size_t at = (size_t)p * part_count + q;
    return (bits[at / 64] >> (at % 64)) & 1u;
}

/* Least significant digit first radix sort of 64-bit keys: stable, linear, no recursion. */
static void sort_keys(uint64_t *keys, uint64_t *other, size_t count)
{
    for (unsigned shift = 0; shift < 64; shift += 8) {
        size_t start[257] = { 0 };
        for (size_t i = 0; i < count; i++)
            start[((keys[i] >> shift) & 255u) + 1]++;
        for (size_t d = 0; d < 256; d++)
            start[d + 1] += start[d];
        for (size_t i = 0; i < count; i++)
            other[start[(keys[i] >> shift) & 255u]++] = keys[i];
        uint64_t *swap = keys; /* eight passes: the result ends in the first array */
        keys = other;
        other = swap;
    }
}

static uint64_t pair_key(uint32_t a, uint32_t b)
{
    return a < b ? (uint64_t)a << 32 | b : (uint64_t)b << 32 | a;
}

static size_t unique_keys(uint64_t *keys, size_t count)
{
    size_t kept = 0;
    for (size_t i = 0; i < count; i++)
        if (kept == 0 || keys[i] != keys[kept - 1])
            keys[kept++] = keys[i];
    return kept;
}

static rdl_status build_edges(rdli_scene *store, const rdl_scene *scene, rdli_memory *memory)
{
    size_t all = scene->segment_count + 3 * scene->triangle_count;
    uint64_t *keys = rdli_take(memory, 2 * all, sizeof *keys);
    if (keys == NULL)
        return RDL_NO_MEMORY;
    size_t n = 0;
    for (size_t s = 0; s < scene->segment_count; s++)
        keys[n++] = pair_key(scene->segments[s][0], scene->segments[s][1]);
    for (size_t t = 0; t < scene->triangle_count; t++)
        for (int k = 0; k < 3; k++)
            keys[n++] = pair_key(scene->triangles[t][k], scene->triangles[t][(k + 1) % 3]);
    sort_keys(keys, keys + all, n);
    size_t unique = unique_keys(keys, n);
    rdl_status status = RDL_NO_MEMORY;
    if (rdli_room_reserve(memory, &store->edges, unique, 2 * sizeof(uint32_t), false)) {
        uint32_t (*edges)[2] = store->edges.data;
        for (size_t e = 0; e < unique; e++) {
            edges[e][0] = (uint32_t)(keys[e] >> 32);
            edges[e][1] = (uint32_t)keys[e];
        }
        store->mesh.edges = store->edges.data;
        store->mesh.edge_count = (uint32_t)unique;
        status = RDL_OK;
    }
    rdli_give(memory, keys, 2 * all, sizeof *keys);
    return status;
}

static rdl_status build_attachments(rdli_scene *store, const rdl_scene *scene, rdli_memory *memory)
{
    size_t n = scene->vertex_count, count = scene->attachment_count;
    if (!rdli_room_reserve(memory, &store->attached_first, n + 1, sizeof(uint32_t), false)
        || !rdli_room_reserve(memory, &store->attached, 2 * count + 1, sizeof(uint32_t), false))
        return RDL_NO_MEMORY;
    uint32_t *first = store->attached_first.data, *attached = store->attached.data;
    memset(first, 0, (n + 1) * sizeof *first);
    if (count > 0) {
        uint64_t *keys = rdli_take(memory, 4 * count, sizeof *keys);
        if (keys == NULL)
            return RDL_NO_MEMORY;
        for (size_t k = 0; k < count; k++) {
            uint64_t a = scene->attachments[k][0], b = scene->attachments[k][1];
            keys[2 * k] = a << 32 | b;
            keys[2 * k + 1] = b << 32 | a;
        }
        sort_keys(keys, keys + 2 * count, 2 * count);
        size_t unique = unique_keys(keys, 2 * count);
        for (size_t k = 0; k < unique; k++) {
            first[(keys[k] >> 32) + 1]++;
            attached[k] = (uint32_t)keys[k];
        }
        for (size_t v = 0; v < n; v++)
            first[v + 1] += first[v];
        rdli_give(memory, keys, 4 * count, sizeof *keys);
    }
    store->mesh.attached_first = first;
    store->mesh.attached = attached;
    store->mesh.attachment_count = (uint32_t)count;
    return RDL_OK;
}

static rdl_status reserve_arrays(rdli_scene *store, const rdl_scene *scene, rdli_memory *memory)
{
    size_t n = scene->vertex_count, p = scene->part_count, t = scene->triangle_count;
    size_t words = (p * p + 63) / 64;
    bool fits = rdli_room_reserve(memory, &store->vertex_part, n, sizeof(uint32_t), false)
        && rdli_room_reserve(memory, &store->vertex_half, n, sizeof(double), false)
        && rdli_room_reserve(memory, &store->mass, n, sizeof(double), false)
        && rdli_room_reserve(memory, &store->driven, n, 1, false)
        && rdli_room_reserve(memory, &store->triangles, t, 3 * sizeof(uint32_t), false)
        && rdli_room_reserve(memory, &store->triangle_half, t, sizeof(double), false)
        && rdli_room_reserve(memory, &store->edge_half, store->mesh.edge_count, sizeof(double), false)
        && rdli_room_reserve(memory, &store->muted, words, sizeof(uint64_t), false)
        && rdli_room_reserve(memory, &store->part_kind, p, sizeof(int), false)
        && rdli_room_reserve(memory, &store->part_friction, p, sizeof(double), false)
        && rdli_room_reserve(memory, &store->pair_friction, scene->pair_friction_count, sizeof(rdl_pair_friction), false);
    return fits ? RDL_OK : RDL_NO_MEMORY;
}

static void fill_thickness(rdli_scene *store)
{
    const rdli_mesh *mesh = &store->mesh;
    const double *h = mesh->vertex_half;
    double *edge = store->edge_half.data, *triangle = store->triangle_half.data;
    for (size_t e = 0; e < mesh->edge_count; e++)
        edge[e] = fmax(h[mesh->edges[e][0]], h[mesh->edges[e][1]]);
    for (size_t t = 0; t < mesh->triangle_count; t++) {
        const uint32_t *c = mesh->triangles[t];
        triangle[t] = fmax(h[c[0]], fmax(h[c[1]], h[c[2]]));
    }
}

static void fill_arrays(rdli_scene *store, const rdl_scene *scene)
{
    rdli_mesh *mesh = &store->mesh;
    size_t n = scene->vertex_count, p = scene->part_count;
    memcpy(store->vertex_part.data, scene->vertex_part, n * sizeof(uint32_t));
    memcpy(store->mass.data, scene->mass, n * sizeof(double));
    if (scene->triangle_count > 0)
        memcpy(store->triangles.data, scene->triangles, scene->triangle_count * sizeof *scene->triangles);
    double *half = store->vertex_half.data;
    uint8_t *driven = store->driven.data;
    for (size_t v = 0; v < n; v++) {
        const rdl_part *part = &scene->parts[scene->vertex_part[v]];
        half[v] = scene->half_thickness != NULL ? scene->half_thickness[v] : part->half_thickness;
        driven[v] = isinf(scene->mass[v]) ? 1 : 0;
    }
    for (size_t k = 0; k < p; k++) {
        ((int *)store->part_kind.data)[k] = scene->parts[k].kind;
        ((double *)store->part_friction.data)[k] = scene->parts[k].friction;
    }
    uint64_t *muted = store->muted.data;
    memset(muted, 0, (p * p + 63) / 64 * sizeof *muted);
    for (size_t k = 0; k < scene->muted_count; k++)
        rdli_mute(muted, (uint32_t)p, scene->muted_parts[k][0], scene->muted_parts[k][1]);
    if (scene->pair_friction_count > 0)
        memcpy(store->pair_friction.data, scene->pair_friction, scene->pair_friction_count * sizeof(rdl_pair_friction));
    store->pair_friction_count = scene->pair_friction_count;
    store->segment_count = scene->segment_count;
    mesh->vertex_count = (uint32_t)n;
    mesh->triangle_count = (uint32_t)scene->triangle_count;
    mesh->part_count = (uint32_t)p;
    mesh->triangles = store->triangles.data;
    mesh->vertex_part = store->vertex_part.data;
    mesh->vertex_half = half;
    mesh->edge_half = store->edge_half.data;
    mesh->triangle_half = store->triangle_half.data;
    mesh->muted = muted;
    mesh->driven = driven;
    fill_thickness(store);
}

rdl_status rdli_scene_build(rdli_scene *store, const rdl_scene *scene, rdli_memory *memory)
{
    memset(store, 0, sizeof *store);
    rdl_status status = build_edges(store, scene, memory);
    if (status == RDL_OK)
        status = reserve_arrays(store, scene, memory);
    if (status == RDL_OK)
        status = build_attachments(store, scene, memory);
    if (status == RDL_OK)
        fill_arrays(store, scene);
    return status;
}

void rdli_scene_release(rdli_scene *store, rdli_memory *memory)
{
    rdli_room *rooms[] = { &store->edges, &store->triangles, &store->vertex_part, &store->vertex_half, &store->edge_half,
        &store->triangle_half, &store->muted, &store->attached_first, &store->attached, &store->part_kind,
        &store->part_friction, &store->mass, &store->driven, &store->pair_friction };
    for (size_t k = 0; k < sizeof rooms / sizeof rooms[0]; k++)
        rdli_room_release(memory, rooms[k]);
    memset(store, 0, sizeof *store);
}
