/* export.h: what the files of `raddle export` share. */
#ifndef RADDLE_TOOLS_EXPORT_H
#define RADDLE_TOOLS_EXPORT_H

#include "cli.h"

typedef struct exporter {
    const char *path, *prefix, *extension;
    rdl_shot *shot;
    const rdl_scene *scene;
    unsigned which;
    size_t first, last, width, written;
    bool ply, force, folder, scrambled, vtk;
    double seed;
    double *positions;
} exporter;

/* Frames first to last as a shot that can leave the house; prefix is its name. */
int export_scrambled(exporter *e, uint64_t seed);
/* Frames first to last as one VTKHDF file (UnstructuredGrid); prefix is its name. */
int export_vtk(exporter *e);

#endif
