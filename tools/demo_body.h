/* demo_body.h: the mesh body of the demo, read at run time from an installed package. */
#ifndef RADDLE_TOOLS_DEMO_BODY_H
#define RADDLE_TOOLS_DEMO_BODY_H

#include "mesh.h"

/* Where Debian's package assimp-testmodels puts the human figure by Tobias Rittig ("redistribution and reuse allowed
 * for any purpose"): 4,282 vertices, closed. */
#define DEMO_BODY_FILE "/usr/share/assimp/models/BLEND/HUMAN.blend"

/* Reads the file, joins vertices of equal position, stands the figure on z = 0 above the origin and scales it to
 * `height` metres. Returns 1, or 0 with one clear sentence in why: unreadable, not closed, or cutting itself. To be freed
 * with mesh_free. */
int demo_body_load(const char *path, double height, mesh *body, char *why, size_t why_size);

#endif
