/* raddle/rest.h: tangles at rest, by exact predicates. No engine needed.
 * Usable from C17 and C++17. */
#ifndef RADDLE_REST_H
#define RADDLE_REST_H

#include "host.h"
#include "scene.h"

#ifdef __cplusplus
extern "C" {
#endif

enum {
    RDL_REST_APART = 0,
    RDL_REST_CONTACT = 1, /* they meet, but not piercing: a vertex on the face, coplanar overlap, an end on a border */
    RDL_REST_PIERCE = 2   /* the edge meets the closed triangle and its ends lie strictly on both sides of its plane */
};

/* Exact relation of the edge edge[0]-edge[1] and the closed triangle, for the given finite doubles, whatever their
 * size (Shewchuk 1997 orientation signs). Degenerate triangles never pierce. No allocation; safe from any thread. */
RDL_API int rdl_edge_against_triangle(const double edge[2][3], const double triangle[3][3]);

typedef struct rdl_tangle {
    uint32_t edge[2];  /* vertex ids, lower first */
    uint32_t triangle; /* triangle id */
    uint32_t relation; /* RDL_REST_PIERCE or RDL_REST_CONTACT */
} rdl_tangle;

typedef struct rdl_tangles {
    size_t count;
    rdl_tangle *items; /* sorted by (edge, triangle) */
} rdl_tangles;

/* All edges (strand segments and triangle edges) that pierce or meet a triangle of the scene at `positions`, without
 * pairs that share a vertex, attachments, muted parts, and pairs of which all vertices are driven unless
 * include_driven is set. *tangles is owned by the caller until rdl_tangles_release with the same host.
 * Errors: as rdl_engine_create for the scene, RDL_NOT_FINITE for positions. Safe from any thread. */
RDL_API rdl_status rdl_find_tangles(const rdl_scene *scene, const rdl_view *positions, int include_driven,
                                    const rdl_host *host, rdl_tangles *tangles, rdl_fault *fault);
RDL_API void rdl_tangles_release(rdl_tangles *tangles, const rdl_host *host);

#ifdef __cplusplus
}
#endif
#endif
