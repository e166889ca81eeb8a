/* planted.c: a defect on purpose, for tests only: the linker puts this between the driver and the broad phase
 * (--wrap=rdli_broad_near_pairs), and edge pairs of two different parts are lost. Replay has to find it, and reduce to bring
 * it down to a few elements. */
#include "broad/broad.h"

rdl_status __real_rdli_broad_near_pairs(rdli_broad *broad, const rdli_mesh *mesh, const rdli_motion *motion,
                                        const rdli_boxes *boxes, rdli_pairs *pairs);
rdl_status __wrap_rdli_broad_near_pairs(rdli_broad *broad, const rdli_mesh *mesh, const rdli_motion *motion,
                                        const rdli_boxes *boxes, rdli_pairs *pairs);

rdl_status __wrap_rdli_broad_near_pairs(rdli_broad *broad, const rdli_mesh *mesh, const rdli_motion *motion,
                                        const rdli_boxes *boxes, rdli_pairs *pairs)
{
    rdl_status status = __real_rdli_broad_near_pairs(broad, mesh, motion, boxes, pairs);
    rdli_pair *rows = (rdli_pair *)(uintptr_t)pairs->edge_edge; /* the list is the broad phase's own room */
    size_t kept = 0;
    for (size_t i = 0; status == RDL_OK && i < pairs->edge_edge_count; i++)
        if (mesh->vertex_part[mesh->edges[rows[i].first][0]] == mesh->vertex_part[mesh->edges[rows[i].second][0]])
            rows[kept++] = rows[i];
    if (status == RDL_OK)
        pairs->edge_edge_count = kept;
    return status;
}
