/* flow/boxes.h: swept boxes, grown by half-thickness, rounded outward to float; closed. They are those of a frame that moves
 * by `shift` over the step, so that what everything shares of its motion does not make them larger. */
#ifndef RDLI_FLOW_BOXES_H
#define RDLI_FLOW_BOXES_H

#include "raddle/tree.h"

typedef struct rdli_boxes {
    rdl_box *vertices, *edges, *triangles;
    double shift[3]; /* m */
} rdli_boxes;

#endif
