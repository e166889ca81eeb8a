/* broad/selfpairs.h: one tree over plain boxes, with itself. Included by the driver only. */
#ifndef RDLI_SELFPAIRS_H
#define RDLI_SELFPAIRS_H

#include "base/workers.h"
#include "flow/pairs.h"
#include "raddle/tree.h"

typedef struct rdli_selfpairs rdli_selfpairs;

/* Builds; boxes are valid. Errors: RDL_NO_MEMORY. */
rdl_status rdli_selfpairs_create(rdli_memory *memory, rdli_workers *workers, const rdl_box *boxes, uint32_t count,
                                 rdli_selfpairs **pairs);
/* Vector instructions where the machine has them (so after creation), or portable code: the same lists. */
void rdli_selfpairs_use_vector(rdli_selfpairs *pairs, bool vector);
/* The same number of valid boxes, moved. Allocates nothing. */
void rdli_selfpairs_update(rdli_selfpairs *pairs, const rdl_box *boxes);
/* All overlapping pairs, sorted; owned by the object until its next call. corners as in raddle/tree.h.
 * Errors: RDL_NO_MEMORY, RDL_CANCELLED. */
rdl_status rdli_selfpairs_find(rdli_selfpairs *pairs, const uint32_t *corners, const rdli_pair **list, size_t *count);
/* The same pairs in blocks, as raddle/tree.h says. The memory in use is bounded, whatever the number of pairs. */
rdl_status rdli_selfpairs_emit(rdli_selfpairs *pairs, const uint32_t *corners, rdl_emit_pairs *emit, void *user);
/* For tests: how many pairs may be kept at once while they are sorted. */
void rdli_selfpairs_limit(rdli_selfpairs *pairs, size_t pairs_max);
void rdli_selfpairs_destroy(rdli_selfpairs *pairs);

#endif
