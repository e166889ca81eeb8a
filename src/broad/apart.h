/* broad/apart.h: the room of the certificate that drops pairs which stay apart. Included by the broad folder only. */
#ifndef RDLI_APART_H
#define RDLI_APART_H

#include "base/workers.h"
#include "broad/tree.h"
#include "flow/mesh.h"
#include "flow/motion.h"

/* A vertex on a grid of step q, a power of two, about a centre: coordinates as whole numbers of steps within 2^29, so
 * that differences are exact, which differences of floats far from the origin are not. */
typedef struct rdli_record {
    int32_t start[3];
    float half; /* half-thickness in steps, rounded up; infinity: not on the grid, nothing can be certified */
    int32_t end[3];
    int32_t spare;
} rdli_record;

typedef struct rdli_apart {
    rdli_room record_room;
    const rdli_record *records;
} rdli_apart;

/* Fills the records. vertices: the tree of all vertex boxes, which enclose the whole motion in the frame that moves by
 * `shift`; the records are those of that frame. Errors: RDL_NO_MEMORY. */
rdl_status rdli_apart_fill(rdli_memory *memory, rdli_workers *workers, rdli_apart *apart, const rdli_mesh *mesh,
                           const rdli_motion *motion, const rdli_tree *vertices, const double shift[3]);

#endif
