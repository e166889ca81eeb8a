/* broad/broad.h: boxes -> candidate pairs. Included by driver only. */
#ifndef RDLI_BROAD_H
#define RDLI_BROAD_H

#include "base/workers.h"
#include "flow/boxes.h"
#include "flow/mesh.h"
#include "flow/motion.h"
#include "flow/pairs.h"

/* Trees kept from step to step, and the room of the pair list. */
typedef struct rdli_broad rdli_broad;

rdl_status rdli_broad_create(rdli_memory *memory, rdli_workers *workers, rdli_broad **broad);
void rdli_broad_destroy(rdli_broad *broad);

/* Vector instructions where the machine has them (so after creation), or portable code: the same lists. */
void rdli_broad_use_vector(rdli_broad *broad, bool vector);

/* The pairs of rdli_broad_pairs (awake: motion->awake) without those that certainly stay further apart than the sum of
 * their half-thicknesses during the whole motion. boxes were filled from the same motion. Same errors. */
rdl_status rdli_broad_near_pairs(rdli_broad *broad, const rdli_mesh *mesh, const rdli_motion *motion,
                                 const rdli_boxes *boxes, rdli_pairs *pairs);

/* All point-triangle and edge-edge pairs with overlapping boxes, sorted, each once, without: shared vertices, muted
 * parts, attachments, pairs of which all four vertices are driven, and (where awake is given) pairs of which no vertex is
 * awake. The list is owned by broad and valid until its next call. Every vertex, edge and triangle of the mesh takes part.
 * The boxes come from rdli_bounds_fill; with awake, elements are taken to be where they were in the last call unless the
 * box of one of their vertices has changed.
 * Errors: RDL_NO_MEMORY, RDL_CANCELLED. Allocates only when it needs more room than ever before. */
rdl_status rdli_broad_pairs(rdli_broad *broad, const rdli_mesh *mesh, const rdli_boxes *boxes, const uint8_t *awake,
                            rdli_pairs *pairs);

#endif
