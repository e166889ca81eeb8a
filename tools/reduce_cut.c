/* reduce_cut.c: a sub-scene on its own. */
#include <stdlib.h>
#include <string.h>

#include "reduce.h"

enum { NOT_KEPT = UINT32_MAX };

typedef struct cutter {
    const scenario *whole;
    const uint8_t *keep;
    reduced *out;
    uint32_t *vertex_of, *part_of; /* new numbers by old ones */
    size_t vertices, parts, segments, triangles;
} cutter;

static void *room(size_t count, size_t item)
{
    return calloc(count > 0 ? count : 1, item);
}

static void mark(cutter *c, const uint32_t *vertices, size_t count)
{
    for (size_t i = 0; i < count; i++) {
        c->vertex_of[vertices[i]] = 0;
        c->part_of[c->whole->scene.vertex_part[vertices[i]]] = 0;
    }
}

/* Numbers what is kept, in the old order. */
static void number(cutter *c)
{
    const rdl_scene *scene = &c->whole->scene;
    for (size_t v = 0; v < scene->vertex_count; v++)
        c->vertex_of[v] = NOT_KEPT;
    for (size_t p = 0; p < scene->part_count; p++)
        c->part_of[p] = NOT_KEPT;
    for (size_t s = 0; s < scene->segment_count; s++)
        if (c->keep[s]) {
            mark(c, scene->segments[s], 2);
            c->segments++;
        }
    for (size_t t = 0; t < scene->triangle_count; t++)
        if (c->keep[scene->segment_count + t]) {
            mark(c, scene->triangles[t], 3);
            c->triangles++;
        }
    for (size_t v = 0; v < scene->vertex_count; v++)
        if (c->vertex_of[v] != NOT_KEPT)
            c->vertex_of[v] = (uint32_t)c->vertices++;
    for (size_t p = 0; p < scene->part_count; p++)
        if (c->part_of[p] != NOT_KEPT)
            c->part_of[p] = (uint32_t)c->parts++;
}

static void fill_vertices(cutter *c, const double *start, const double *proposed)
{
    const scenario *whole = c->whole;
    const rdl_scene *scene = &whole->scene;
    reduced *out = c->out;
    for (size_t v = 0; v < scene->vertex_count; v++) {
        uint32_t n = c->vertex_of[v];
        if (n == NOT_KEPT)
            continue;
        out->origin[n] = (uint32_t)v;
        out->vertex_part[n] = c->part_of[scene->vertex_part[v]];
        out->mass[n] = whole->mass != NULL ? whole->mass[v] : scene->mass[v];
        if (scene->half_thickness != NULL)
            out->half[n] = scene->half_thickness[v];
        memcpy(out->s.start + 3 * (size_t)n, start + 3 * v, 3 * sizeof(double));
        memcpy(out->s.proposed + 3 * (size_t)n, proposed + 3 * v, 3 * sizeof(double));
    }
    for (size_t p = 0; p < scene->part_count; p++)
        if (c->part_of[p] != NOT_KEPT)
            out->parts[c->part_of[p]] = scene->parts[p];
}

static void fill_elements(cutter *c)
{
    const rdl_scene *scene = &c->whole->scene;
    reduced *out = c->out;
    size_t next = 0, count = 0;
    for (size_t s = 0; s < scene->segment_count; s++) {
        if (!c->keep[s])
            continue;
        for (size_t k = 0; k < 2; k++)
            out->segments[next][k] = c->vertex_of[scene->segments[s][k]];
        next++;
        out->element_origin[count++] = (uint32_t)s;
    }
    next = 0;
    for (size_t t = 0; t < scene->triangle_count; t++) {
        if (!c->keep[scene->segment_count + t])
            continue;
        for (size_t k = 0; k < 3; k++)
            out->triangles[next][k] = c->vertex_of[scene->triangles[t][k]];
        next++;
        out->element_origin[count++] = (uint32_t)t;
    }
}

static size_t keep_pairs(const uint32_t *number_of, const uint32_t (*rows)[2], size_t count, uint32_t (*out)[2])
{
    size_t kept = 0;
    for (size_t k = 0; k < count; k++) {
        uint32_t a = number_of[rows[k][0]], b = number_of[rows[k][1]];
        if (a == NOT_KEPT || b == NOT_KEPT)
            continue;
        out[kept][0] = a;
        out[kept++][1] = b;
    }
    return kept;
}

/* Muting of the step becomes muting of the scene. */
static void fill_rules(cutter *c)
{
    const scenario *whole = c->whole;
    const rdl_scene *scene = &whole->scene;
    reduced *out = c->out;
    rdl_scene *made = &out->s.scene;
    made->muted_count = keep_pairs(c->part_of, scene->muted_parts, scene->muted_count, out->muted);
    made->muted_count += keep_pairs(c->part_of, whole->recorded.muted_parts, whole->recorded.muted_count,
                                    out->muted + made->muted_count);
    made->attachment_count = keep_pairs(c->vertex_of, scene->attachments, scene->attachment_count, out->attachments);
    for (size_t k = 0; k < scene->pair_friction_count; k++) {
        rdl_pair_friction row = scene->pair_friction[k];
        row.part[0] = c->part_of[row.part[0]];
        row.part[1] = c->part_of[row.part[1]];
        if (row.part[0] != NOT_KEPT && row.part[1] != NOT_KEPT)
            out->pair_friction[made->pair_friction_count++] = row;
    }
}

static bool take_room(cutter *c)
{
    const rdl_scene *scene = &c->whole->scene;
    reduced *out = c->out;
    size_t n = c->vertices, elements = c->segments + c->triangles;
    out->parts = room(c->parts, sizeof *out->parts);
    out->vertex_part = room(n, sizeof *out->vertex_part);
    out->segments = room(c->segments, sizeof *out->segments);
    out->triangles = room(c->triangles, sizeof *out->triangles);
    out->muted = room(scene->muted_count + c->whole->recorded.muted_count, sizeof *out->muted);
    out->attachments = room(scene->attachment_count, sizeof *out->attachments);
    out->mass = room(n, sizeof *out->mass);
    out->half = room(n, sizeof *out->half);
    out->pair_friction = room(scene->pair_friction_count, sizeof *out->pair_friction);
    out->origin = room(n, sizeof *out->origin);
    out->element_origin = room(elements, sizeof *out->element_origin);
    out->s.start = room(n, 3 * sizeof(double));
    out->s.proposed = room(n, 3 * sizeof(double));
    out->s.delivered = room(n, 3 * sizeof(double));
    return out->parts && out->vertex_part && out->segments && out->triangles && out->muted && out->attachments &&
           out->mass && out->half && out->pair_friction && out->origin && out->element_origin && out->s.start &&
           out->s.proposed && out->s.delivered;
}

static void describe(cutter *c)
{
    const scenario *whole = c->whole;
    reduced *out = c->out;
    out->s.settings = whole->settings;
    out->s.host_bits = whole->host_bits;
    out->s.frame = whole->frame;
    out->s.recorded = (rdl_shot_frame){.time = whole->recorded.time,
                                       .picture = whole->recorded.picture,
                                       .duration = whole->recorded.duration,
                                       .seconds_max = whole->recorded.seconds_max,
                                       .passes_max = whole->recorded.passes_max};
    out->s.scene = (rdl_scene){.size = sizeof out->s.scene,
                               .part_count = c->parts,
                               .parts = out->parts,
                               .vertex_count = c->vertices,
                               .vertex_part = out->vertex_part,
                               .mass = out->mass,
                               .half_thickness = whole->scene.half_thickness != NULL ? out->half : NULL,
                               .segment_count = c->segments,
                               .segments = (const uint32_t(*)[2])out->segments,
                               .triangle_count = c->triangles,
                               .triangles = (const uint32_t(*)[3])out->triangles,
                               .muted_parts = (const uint32_t(*)[2])out->muted,
                               .attachments = (const uint32_t(*)[2])out->attachments,
                               .pair_friction = out->pair_friction};
}

static bool take_memory(cutter *c)
{
    const scenario *whole = c->whole;
    bool all = c->segments == whole->scene.segment_count && c->triangles == whole->scene.triangle_count &&
               c->vertices == whole->scene.vertex_count;
    size_t bytes = whole->recorded.memory_bytes;
    if (!all || !whole->has_memory || bytes == 0)
        return true;
    c->out->s.memory = malloc(bytes);
    if (c->out->s.memory == NULL)
        return false;
    memcpy(c->out->s.memory, whole->memory, bytes);
    c->out->s.has_memory = true;
    c->out->s.recorded.memory = c->out->s.memory;
    c->out->s.recorded.memory_bytes = bytes;
    return true;
}

bool reduced_cut(const scenario *whole, const uint8_t *keep, const double *start, const double *proposed, reduced *out)
{
    cutter c = {.whole = whole, .keep = keep, .out = out};
    memset(out, 0, sizeof *out);
    c.vertex_of = room(whole->scene.vertex_count, sizeof *c.vertex_of);
    c.part_of = room(whole->scene.part_count, sizeof *c.part_of);
    bool done = c.vertex_of != NULL && c.part_of != NULL;
    if (done)
        number(&c);
    done = done && take_room(&c);
    if (done) {
        describe(&c);
        fill_vertices(&c, start, proposed);
        fill_elements(&c);
        fill_rules(&c);
        done = take_memory(&c);
    }
    free(c.vertex_of);
    free(c.part_of);
    if (!done)
        reduced_release(out);
    return done;
}

void reduced_release(reduced *r)
{
    scenario_release(&r->s);
    free(r->parts);
    free(r->vertex_part);
    free(r->segments);
    free(r->triangles);
    free(r->muted);
    free(r->attachments);
    free(r->mass);
    free(r->half);
    free(r->pair_friction);
    free(r->origin);
    free(r->element_origin);
    memset(r, 0, sizeof *r);
}
