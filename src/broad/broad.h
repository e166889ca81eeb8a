/* broad/broad.h: boxes -> candidate pairs. Included by driver only. */
#ifndef RDLI_BROAD_H
#define RDLI_BROAD_H

#include "base/workers.h"
#include "flow/boxes.h"
#include "flow/mesh.h"
#include "flow/motion.h"
#include "flow/pairs.h"

/* 16 million pairs of a kind take 200 MiB as rows and as a list. A step of a million elements in touch has some hundred
 * thousand, wound up tightly fourteen million. */
enum { RDLI_PAIRS_MAX = 1 << 24 };

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

/* Where the pairs of a kind exceed the budget, the two functions above give the first part of the list and set pairs->more;
 * this one gives the next part, with the same mesh, and so on until more is false. The parts one after the other, kind by
 * kind, are the whole list. Same errors. */
rdl_status rdli_broad_more(rdli_broad *broad, const rdli_mesh *mesh, rdli_pairs *pairs);
/* The budget: pairs of one kind that are kept at once. The pairs of one element are never parted, so it may be exceeded by
 * these. Starts at RDLI_PAIRS_MAX. */
void rdli_broad_limit(rdli_broad *broad, size_t pairs_max);

/* Looks for (edge, triangle) couples with overlapping boxes, by the same rules; mesh->driven NULL: nothing is driven.
 * boxes->vertices is not read. Errors: RDL_NO_MEMORY. */
rdl_status rdli_broad_couples_begin(rdli_broad *broad, const rdli_mesh *mesh, const rdli_boxes *boxes);
/* The first part of their list, then the next, while *more; sorted by (edge, triangle). Errors as above. */
rdl_status rdli_broad_couples(rdli_broad *broad, const rdli_mesh *mesh, const rdli_pair **couples, size_t *count, bool *more);
/* Gives back the room of the couples, which are seldom wanted. */
void rdli_broad_couples_end(rdli_broad *broad);

#endif
