/* flow/pairs.h: candidate pairs, each exactly once, sorted by (kind, first, second). */
#ifndef RDLI_FLOW_PAIRS_H
#define RDLI_FLOW_PAIRS_H

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

typedef struct rdli_pair {
    uint32_t first, second; /* PT: vertex, triangle. EE: lower edge id, higher edge id */
} rdli_pair;

typedef struct rdli_pairs {
    const rdli_pair *point_triangle, *edge_edge;
    size_t point_triangle_count, edge_edge_count;
    bool more; /* a part of the list: the pairs of each kind go on in the next part */
} rdli_pairs;

#endif
