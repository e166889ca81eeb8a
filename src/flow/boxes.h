/* flow/boxes.h: swept boxes, grown by half-thickness, rounded outward to float; closed. */
#ifndef RDLI_FLOW_BOXES_H
#define RDLI_FLOW_BOXES_H

#include "raddle/tree.h"

typedef struct rdli_boxes {
    rdl_box *vertices, *edges, *triangles;
} rdli_boxes;

#endif
