/* mesh.h: a triangle mesh as it comes from a file, and what is wrong with it. */
#ifndef RADDLE_TOOLS_MESH_H
#define RADDLE_TOOLS_MESH_H

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

typedef struct mesh {
    double (*points)[3];
    size_t point_count;
    uint32_t (*faces)[3];
    size_t face_count;
    size_t source_points, welded, unused, dropped_faces, double_faces, skipped_lines;
} mesh;

/* One edge of the mesh that is not shared by exactly two faces of opposite direction. */
typedef struct mesh_hole {
    uint32_t first, edges; /* a vertex of it, and its length in edges */
} mesh_hole;

typedef struct mesh_faults {
    mesh_hole *holes;
    size_t hole_count, open_edges, branched_edges;
    uint32_t *flipped; /* faces that run against a neighbour */
    size_t flipped_count;
} mesh_faults;

/* Joins points with equal bits (-0 counts as 0), drops faces that name a point twice, faces given twice, and points
 * that no face uses. Order is kept. False: no memory. */
bool mesh_weld(mesh *m);
/* Finds borders, edges of more than two faces, and faces that run against their neighbours. False: no memory. */
bool mesh_inspect(const mesh *m, mesh_faults *faults);
void mesh_faults_free(mesh_faults *faults);
/* Which point of `welded` each point of `raw` became: by their bits; UINT32_MAX: none. raw is the mesh before mesh_weld.
 * False: no memory. */
bool mesh_follow(const mesh *raw, const mesh *welded, uint32_t *became);
void mesh_free(mesh *m);

#endif
