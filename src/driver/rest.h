/* driver/rest.h: intersections of a state at rest. Included by driver and api. */
#ifndef RDLI_REST_H
#define RDLI_REST_H

#include "base/workers.h"
#include "broad/broad.h"
#include "flow/mesh.h"
#include "raddle/rest.h"

/* All edges that pierce or meet a triangle at `positions`, sorted by (edge, triangle), without shared vertices,
 * attachments, muted parts and, unless include_driven, couples of driven vertices alone. broad: whose
 * trees serve, or NULL for new ones. The rows are in *out (rdl_tangle), *count of them. Errors: RDL_NO_MEMORY, RDL_CANCELLED. */
rdl_status rdli_rest_find(rdli_memory *memory, rdli_workers *workers, const rdli_mesh *mesh,
                          const double (*positions)[3], bool include_driven, rdli_broad *broad, rdli_room *out, size_t *count);

#endif
