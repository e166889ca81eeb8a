/* shot/scene.c: see scene.h. */
#include "shot/scene.h"

enum { ROWS_MAX = 0x7fffffff };

static rdl_status check_lists(const rdl_scene *scene, rdl_fault *fault)
{
    const struct {
        size_t count;
        const void *data;
        const char *field;
    } lists[] = {
        {scene->part_count, scene->parts, "parts/name"},
        {scene->vertex_count, scene->vertex_part, "mesh/part"},
        {scene->vertex_count, scene->mass, "mesh/mass"},
        {scene->segment_count, scene->segments, "mesh/segments"},
        {scene->triangle_count, scene->triangles, "mesh/triangles"},
        {scene->muted_count, scene->muted_parts, "rules/muted_parts"},
        {scene->attachment_count, scene->attachments, "rules/attachments"},
        {scene->pair_friction_count, scene->pair_friction, "rules/pair_friction"},
    };
    for (size_t k = 0; k < sizeof lists / sizeof lists[0]; k++) {
        if (lists[k].count > ROWS_MAX)
            return rdli_fault_set(fault, RDL_TOO_LARGE, lists[k].field, lists[k].count);
        if (lists[k].count > 0 && lists[k].data == NULL)
            return rdli_fault_set(fault, RDL_BAD_ARGUMENT, lists[k].field, 0);
    }
    if (scene->part_count == 0 || scene->vertex_count == 0)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, scene->part_count == 0 ? "parts/name" : "mesh/part", 0);
    return RDL_OK;
}

static rdl_status check_parts(const rdl_scene *scene, rdl_fault *fault)
{
    for (size_t p = 0; p < scene->part_count; p++) {
        const rdl_part *part = &scene->parts[p];
        if (part->kind < RDL_STRANDS || part->kind > RDL_BODY)
            return rdli_fault_set(fault, RDL_OUT_OF_RANGE, "parts/kind", p);
        if (!isfinite(part->half_thickness) || part->half_thickness < 0)
            return rdli_fault_set(fault, RDL_BAD_THICKNESS, "parts/half_thickness", p);
        if (!isfinite(part->friction) || part->friction < 0)
            return rdli_fault_set(fault, isfinite(part->friction) ? RDL_OUT_OF_RANGE : RDL_NOT_FINITE, "parts/friction",
                                  p);
    }
    return RDL_OK;
}

static rdl_status check_vertices(const rdl_scene *scene, rdl_fault *fault)
{
    for (size_t v = 0; v < scene->vertex_count; v++) {
        if (scene->vertex_part[v] >= scene->part_count)
            return rdli_fault_set(fault, RDL_OUT_OF_RANGE, "mesh/part", v);
        if (!(scene->mass[v] > 0)) /* NaN fails too; infinity is a driven vertex */
            return rdli_fault_set(fault, RDL_BAD_MASS, "mesh/mass", v);
        if (scene->half_thickness != NULL && (!isfinite(scene->half_thickness[v]) || scene->half_thickness[v] < 0))
            return rdli_fault_set(fault, RDL_BAD_THICKNESS, "mesh/half_thickness", v);
    }
    return RDL_OK;
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
    /* Segments make strands, triangles make cloth and bodies. */
    if ((scene->parts[part].kind == RDL_STRANDS) != (corners == 2))
        return rdli_fault_set(fault, RDL_OUT_OF_RANGE, field, index);
    return RDL_OK;
}

static rdl_status check_rules(const rdl_scene *scene, rdl_fault *fault)
{
    for (size_t k = 0; k < scene->muted_count; k++)
        if (scene->muted_parts[k][0] >= scene->part_count || scene->muted_parts[k][1] >= scene->part_count)
            return rdli_fault_set(fault, RDL_OUT_OF_RANGE, "rules/muted_parts", k);
    for (size_t k = 0; k < scene->attachment_count; k++) {
        const uint32_t *pair = scene->attachments[k];
        if (pair[0] >= scene->vertex_count || pair[1] >= scene->vertex_count)
            return rdli_fault_set(fault, RDL_OUT_OF_RANGE, "rules/attachments", k);
        if (pair[0] == pair[1])
            return rdli_fault_set(fault, RDL_REPEATED_VERTEX, "rules/attachments", k);
    }
    for (size_t k = 0; k < scene->pair_friction_count; k++) {
        const rdl_pair_friction *row = &scene->pair_friction[k];
        if (row->part[0] >= scene->part_count || row->part[1] >= scene->part_count)
            return rdli_fault_set(fault, RDL_OUT_OF_RANGE, "rules/pair_friction", k);
        if (!isfinite(row->friction) || row->friction < 0)
            return rdli_fault_set(fault, isfinite(row->friction) ? RDL_OUT_OF_RANGE : RDL_NOT_FINITE,
                                  "rules/pair_friction", k);
    }
    return RDL_OK;
}

rdl_status rdli_shot_scene_check(const rdl_scene *scene, rdl_fault *fault)
{
    rdl_status status = check_lists(scene, fault);
    if (status == RDL_OK)
        status = check_parts(scene, fault);
    if (status == RDL_OK)
        status = check_vertices(scene, fault);
    for (size_t s = 0; status == RDL_OK && s < scene->segment_count; s++)
        status = check_element(scene, scene->segments[s], 2, "mesh/segments", s, fault);
    for (size_t t = 0; status == RDL_OK && t < scene->triangle_count; t++)
        status = check_element(scene, scene->triangles[t], 3, "mesh/triangles", t, fault);
    if (status == RDL_OK)
        status = check_rules(scene, fault);
    return status;
}
