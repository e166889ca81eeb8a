/* flow/motion.h: the straight paths of all vertices over the step or sub-step. */
#ifndef RDLI_FLOW_MOTION_H
#define RDLI_FLOW_MOTION_H

#include <stdint.h>

typedef struct rdli_motion {
    const double (*start)[3], (*end)[3]; /* vertex_count rows, m */
    const uint8_t *awake;                /* NULL, or 1 per vertex whose end changed since the last detection:
                                            only pairs with at least one awake vertex are wanted */
} rdli_motion;

#endif
