/* intake/check.c: validation of a scene, one offender at a time, in a fixed order. */
#include "intake/intake.h"

enum { COUNT_MAX = 0x7fffffff }; /* index width: 32 bit with room for 2 n + 1 */

static rdl_status check_frame(const rdl_scene *scene, rdl_fault *fault)
{
    if (scene->size < sizeof(rdl_scene))
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "size", 0);
    if (scene->part_count == 0 || scene->vertex_count == 0)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, scene->part_count == 0 ? "part_count" : "vertex_count", 0);
    const struct { size_t count; const void *data; const char *field; } lists[] = {
        { scene->part_count, scene->parts, "parts" },
        { scene->vertex_count, scene->vertex_part, "vertex_part" },
        { scene->vertex_count, scene->mass, "mass" },
        { scene->segment_count, scene->segments, "segments" },
        { scene->triangle_count, scene->triangles, "triangles" },
        { scene->muted_count, scene->muted_parts, "muted_parts" },
        { scene->attachment_count, scene->attachments, "attachments" },
        { scene->pair_friction_count, scene->pair_friction, "pair_friction" },
    };
    for (size_t k = 0; k < sizeof lists / sizeof lists[0]; k++) {
        if (lists[k].count > COUNT_MAX)
            return rdli_fault_set(fault, RDL_TOO_LARGE, lists[k].field, lists[k].count);
        if (lists[k].count > 0 && lists[k].data == NULL)
            return rdli_fault_set(fault, RDL_BAD_ARGUMENT, lists[k].field, 0);
    }
    /* Unique edges may be three per triangle. */
    if (scene->segment_count + 3 * scene->triangle_count > COUNT_MAX)
        return rdli_fault_set(fault, RDL_TOO_LARGE, "triangles", scene->triangle_count);
    if (scene->part_count > 0xffff)
        return rdli_fault_set(fault, RDL_TOO_LARGE, "parts", scene->part_count);
    return RDL_OK;
}

static bool is_thickness(double h)
{
    return isfinite(h) && h >= 0.0;
}

static bool is_friction(double mu)
{
    return isfinite(mu) && mu >= 0.0;
}

static rdl_status check_parts(const rdl_scene *scene, rdl_fault *fault)
{
    for (size_t p = 0; p < scene->part_count; p++) {
        const rdl_part *part = &scene->parts[p];
        if (part->kind < RDL_STRANDS || part->kind > RDL_BODY)
            return rdli_fault_set(fault, RDL_OUT_OF_RANGE, "parts.kind", p);
        if (!is_thickness(part->half_thickness))
            return rdli_fault_set(fault, RDL_BAD_THICKNESS, "parts.half_thickness", p);
        if (!is_friction(part->friction))
            return rdli_fault_set(fault, isfinite(part->friction) ? RDL_OUT_OF_RANGE : RDL_NOT_FINITE,
                                  "parts.friction", p);
    }
    return RDL_OK;
}

rdl_status rdli_mass_check(const double *mass, size_t vertex_count, rdl_fault *fault)
{
    for (size_t v = 0; v < vertex_count; v++)
        if (!(mass[v] > 0.0)) /* NaN fails too */
            return rdli_fault_set(fault, RDL_BAD_MASS, "mass", v);
    return RDL_OK;
}

static rdl_status check_vertices(const rdl_scene *scene, rdl_fault *fault)
{
    for (size_t v = 0; v < scene->vertex_count; v++)
        if (scene->vertex_part[v] >= scene->part_count)
            return rdli_fault_set(fault, RDL_OUT_OF_RANGE, "vertex_part", v);
    for (size_t v = 0; scene->half_thickness != NULL && v < scene->vertex_count; v++)
        if (!is_thickness(scene->half_thickness[v]))
            return rdli_fault_set(fault, RDL_BAD_THICKNESS, "half_thickness", v);
    return rdli_mass_check(scene->mass, scene->vertex_count, fault);
}

static rdl_status check_element(const rdl_scene *scene, const uint32_t *corner, size_t corners, const char *field,
                                size_t index, rdl_fault *fault)
{
    for (size_t k = 0; k < corners; k++)
        if (corner[k] >= scene->vertex_count)
            return rdli_fault_set(fault, RDL_OUT_OF_RANGE, field, index);
    for (size_t k = 0; k < corners; k++)
        if (corner[k] == corner[(k + 1) % corners])
            return rdli_fault_set(fault, RDL_REPEATED_VERTEX, field, index);
    uint32_t part = scene->vertex_part[corner[0]];
    for (size_t k = 1; k < corners; k++)
        if (scene->vertex_part[corner[k]] != part)
            return rdli_fault_set(fault, RDL_MIXED_PARTS, field, index);
    bool strands = scene->parts[part].kind == RDL_STRANDS;
    if (strands != (corners == 2)) /* segments make strands, triangles make cloth and bodies */
        return rdli_fault_set(fault, RDL_OUT_OF_RANGE, field, index);
    return RDL_OK;
}

static rdl_status check_elements(const rdl_scene *scene, rdli_memory *memory, rdl_fault *fault)
{
    rdl_status status = RDL_OK;
    size_t n = scene->vertex_count;
    uint8_t *used = rdli_take(memory, n, 1);
    if (used == NULL)
        return RDL_NO_MEMORY;
    memset(used, 0, n);
    for (size_t s = 0; status == RDL_OK && s < scene->segment_count; s++) {
        status = check_element(scene, scene->segments[s], 2, "segments", s, fault);
        for (size_t k = 0; status == RDL_OK && k < 2; k++)
            used[scene->segments[s][k]] = 1;
    }
    for (size_t t = 0; status == RDL_OK && t < scene->triangle_count; t++) {
        status = check_element(scene, scene->triangles[t], 3, "triangles", t, fault);
        for (size_t k = 0; status == RDL_OK && k < 3; k++)
            used[scene->triangles[t][k]] = 1;
    }
    for (size_t v = 0; status == RDL_OK && v < n; v++)
        if (!used[v])
            status = rdli_fault_set(fault, RDL_LOOSE_VERTEX, "vertex_part", v);
    rdli_give(memory, used, n, 1);
    return status;
}

static rdl_status check_rules(const rdl_scene *scene, rdl_fault *fault)
{
    for (size_t k = 0; k < scene->muted_count; k++)
        if (scene->muted_parts[k][0] >= scene->part_count || scene->muted_parts[k][1] >= scene->part_count)
            return rdli_fault_set(fault, RDL_OUT_OF_RANGE, "muted_parts", k);
    for (size_t k = 0; k < scene->attachment_count; k++) {
        const uint32_t *a = scene->attachments[k];
        if (a[0] >= scene->vertex_count || a[1] >= scene->vertex_count)
            return rdli_fault_set(fault, RDL_OUT_OF_RANGE, "attachments", k);
        if (a[0] == a[1])
            return rdli_fault_set(fault, RDL_REPEATED_VERTEX, "attachments", k);
    }
    for (size_t k = 0; k < scene->pair_friction_count; k++) {
        const rdl_pair_friction *row = &scene->pair_friction[k];
        if (row->part[0] >= scene->part_count || row->part[1] >= scene->part_count)
            return rdli_fault_set(fault, RDL_OUT_OF_RANGE, "pair_friction", k);
        if (!is_friction(row->friction))
            return rdli_fault_set(fault, isfinite(row->friction) ? RDL_OUT_OF_RANGE : RDL_NOT_FINITE,
                                  "pair_friction", k);
    }
    return RDL_OK;
}

/* A pair of elements keeps the sum of the two elements' half-thicknesses, and an element uses the largest of its
 * vertices; a point counts by itself. So the smallest gap between two parts is the sum of their smallest vertices'. */
static rdl_status check_gaps(const rdl_scene *scene, rdli_memory *memory, rdl_fault *fault)
{
    size_t parts = scene->part_count;
    double *thin = rdli_take(memory, parts, sizeof *thin);
    uint8_t *free_part = rdli_take(memory, parts, 1);
    rdl_status status = thin != NULL && free_part != NULL ? RDL_OK : RDL_NO_MEMORY;
    for (size_t p = 0; status == RDL_OK && p < parts; p++) {
        thin[p] = DBL_MAX;
        free_part[p] = 0;
    }
    for (size_t v = 0; status == RDL_OK && v < scene->vertex_count; v++) {
        uint32_t p = scene->vertex_part[v];
        double h = scene->half_thickness != NULL ? scene->half_thickness[v] : scene->parts[p].half_thickness;
        thin[p] = h < thin[p] ? h : thin[p];
        if (!isinf(scene->mass[v]))
            free_part[p] = 1;
    }
    for (size_t p = 0; status == RDL_OK && p < parts; p++) {
        if (thin[p] != 0.0)
            continue;
        for (size_t q = 0; status == RDL_OK && q < parts; q++) {
            bool muted = false;
            for (size_t k = 0; thin[q] == 0.0 && k < scene->muted_count; k++) {
                const uint32_t *m = scene->muted_parts[k];
                muted = muted || (m[0] == p && m[1] == q) || (m[0] == q && m[1] == p);
            }
            /* Parts that are driven altogether never act on each other. */
            if (thin[q] == 0.0 && !muted && (free_part[p] || free_part[q]))
                status = rdli_fault_set(fault, RDL_ZERO_GAP, "half_thickness", p < q ? q : p);
        }
    }
    rdli_give(memory, thin, parts, sizeof *thin);
    rdli_give(memory, free_part, parts, 1);
    return status;
}

rdl_status rdli_scene_check(const rdl_scene *scene, rdli_memory *memory, rdl_fault *fault)
{
    if (scene == NULL)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "scene", 0);
    rdl_status status = check_frame(scene, fault);
    if (status == RDL_OK)
        status = check_parts(scene, fault);
    if (status == RDL_OK)
        status = check_vertices(scene, fault);
    if (status == RDL_OK)
        status = check_elements(scene, memory, fault);
    if (status == RDL_OK)
        status = check_rules(scene, fault);
    if (status == RDL_OK)
        status = check_gaps(scene, memory, fault);
    return status;
}
