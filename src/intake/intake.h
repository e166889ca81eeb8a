/* intake/intake.h: host views -> checked, owned data. Included by driver and api. */
#ifndef RDLI_INTAKE_H
#define RDLI_INTAKE_H

#include "base/memory.h"
#include "flow/mesh.h"
#include "raddle/scene.h"

/* The scene as the engine owns it: the mesh that the stages see, and the rooms behind its arrays. */
typedef struct rdli_scene {
    rdli_mesh mesh;
    size_t segment_count;
    rdli_room edges, triangles, vertex_part, vertex_half, edge_half, triangle_half, muted, attached_first, attached;
    rdli_room part_kind, part_friction, mass, driven, pair_friction;
    size_t pair_friction_count;
} rdli_scene;

/* Finds the first offender of a scene; no allocation beyond `memory` scratch. RDL_OK when the scene is sound. */
rdl_status rdli_scene_check(const rdl_scene *scene, rdli_memory *memory, rdl_fault *fault);
/* Copies a checked scene and builds its edges, element thicknesses and exclusion sets. RDL_NO_MEMORY leaves *store
 * ready for rdli_scene_release. */
rdl_status rdli_scene_build(rdli_scene *store, const rdl_scene *scene, rdli_memory *memory);
void rdli_scene_release(rdli_scene *store, rdli_memory *memory);

/* Marks parts p and q as ignoring each other. */
void rdli_mute(uint64_t *bits, uint32_t part_count, uint32_t p, uint32_t q);
bool rdli_is_muted(const uint64_t *bits, uint32_t part_count, uint32_t p, uint32_t q);

/* Checks a view of N x 3 numbers and that all are finite; field names it in the fault. */
rdl_status rdli_view_check(const rdl_view *view, size_t vertex_count, const char *field, rdl_fault *fault);
/* Copies a checked view into packed doubles. */
void rdli_view_read(const rdl_view *view, size_t vertex_count, double (*positions)[3]);
/* Writes packed doubles, which must be representable in the view's format. */
void rdli_view_write(const rdl_output_view *view, size_t vertex_count, const double (*positions)[3]);
rdl_status rdli_output_check(const rdl_output_view *view, const char *field, rdl_fault *fault);
rdl_status rdli_mass_check(const double *mass, size_t vertex_count, rdl_fault *fault);

#endif
