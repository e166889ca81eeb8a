/* flow/mesh.h: topology and rules of a scene, as the stages see them. Plain data, no functions; written by intake. */
#ifndef RDLI_FLOW_MESH_H
#define RDLI_FLOW_MESH_H

#include <stdint.h>

typedef struct rdli_mesh {
    uint32_t vertex_count, edge_count, triangle_count, part_count;
    const uint32_t (*edges)[2];        /* unique, lower vertex first, sorted by vertex pair */
    const uint32_t (*triangles)[3];
    const uint32_t *vertex_part;
    const double *vertex_half;         /* half-thickness of each vertex, m */
    const double *edge_half;           /* largest of the edge's vertices */
    const double *triangle_half;
    const uint64_t *muted;             /* bit (p * part_count + q): parts p and q ignore each other; symmetric */
    const uint32_t *attached_first;    /* vertex_count + 1: rows of attached */
    const uint32_t *attached;          /* sorted vertex ids that vertex v is attached to; symmetric */
    uint32_t attachment_count;         /* 0: the two arrays above need not be looked at */
    const uint8_t *driven;             /* 1 = infinite mass in this step */
} rdli_mesh;

#endif
