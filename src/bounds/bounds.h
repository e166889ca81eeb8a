/* bounds/bounds.h: motion -> boxes. Included by driver only. */
#ifndef RDLI_BOUNDS_H
#define RDLI_BOUNDS_H

#include "base/workers.h"
#include "flow/boxes.h"
#include "flow/mesh.h"
#include "flow/motion.h"

/* Fills boxes (room for every vertex, edge and triangle of the mesh; owned by the caller) and chooses their shift. The box of an element
 * encloses its vertices at start and end grown by the element's half-thickness; two elements whose distance is at most
 * the sum of their half-thicknesses anywhere in the step have overlapping boxes, whatever the rounding. Numbers beyond
 * the float range are clamped to it, which keeps that promise.
 * With motion->awake, boxes must hold an earlier fill of the same mesh, whose shift is kept; what depends on sleeping vertices only is then kept,
 * unless the box of a sleeping vertex turns out to have changed. The boxes are the same either way. */
void rdli_bounds_fill(const rdli_mesh *mesh, const rdli_motion *motion, rdli_workers *workers, rdli_boxes *boxes);

#endif
