/* couple.c: plugging raddle in behind an integrator. */
#include "couple.h"

#include <string.h>

void host_describe(const host *h, rdl_part parts[], rdl_scene *scene)
{
    for (size_t p = 0; p < h->part_count; p++) {
        parts[p].name = h->parts[p].name;
        parts[p].kind = h->parts[p].kind;
        parts[p].half_thickness = h->parts[p].half_thickness;
        parts[p].friction = h->parts[p].friction;
    }
    memset(scene, 0, sizeof *scene);
    scene->size = sizeof *scene;
    scene->part_count = h->part_count;
    scene->parts = parts;
    scene->vertex_count = h->vertex_count;
    scene->vertex_part = h->vertex_part;
    scene->mass = h->mass;
    scene->segment_count = h->segment_count;
    scene->segments = (const uint32_t (*)[2])h->segments;
    scene->triangle_count = h->triangle_count;
    scene->triangles = (const uint32_t (*)[3])h->triangles;
    scene->attachment_count = h->join_count;
    scene->attachments = (const uint32_t (*)[2])h->joins;
}

rdl_status host_resolve(const host *h, rdl_engine *engine, double h_step, double (*delivered)[3], rdl_report *report,
                        rdl_fault *fault)
{
    rdl_step step = {.size = sizeof step, .duration = h_step, .mass = h->mass};
    step.start = (rdl_view){h->position, 0, RDL_FLOAT64};
    step.proposed = (rdl_view){h->proposed, 0, RDL_FLOAT64};
    step.delivered = (rdl_output_view){delivered, 0, RDL_FLOAT64};
    report->size = sizeof *report;
    return rdl_engine_step(engine, &step, report, fault);
}
