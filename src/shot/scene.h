/* shot/scene.h: checks that a scene holds together, for the writer (scenes of hosts) and the reader (scenes of files).
 * Included by src/shot only. */
#ifndef RDLI_SHOT_SCENE_H
#define RDLI_SHOT_SCENE_H

#include "base/internal.h"
#include "raddle/scene.h"

/* Faults name the dataset of the shot file. What only matters to an engine (loose vertices, a gap of 0) is allowed: a
 * sequence of poses may well have them. */
rdl_status rdli_shot_scene_check(const rdl_scene *scene, rdl_fault *fault);

#endif
