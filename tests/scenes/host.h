/* scenes/host.h: the tests' own little host: x1 = x0 + v dt + g dt^2, then passes over the links (position based:
 * Mueller, Heidelberger, Hennix, Ratcliff 2007, without collisions). */
#ifndef SCENES_HOST_H
#define SCENES_HOST_H

#include "raddle/report.h"
#include "world.h"

/* Positions of the driven vertices at the end of a step must be in proposed before; all others are filled. */
void host_propose(const world *w, double (*proposed)[3]);
void host_round(const world *w, double (*proposed)[3]);
/* Moves on: positions and velocities. report may be NULL. */
void host_accept(world *w, const double (*proposed)[3], const double (*delivered)[3], const rdl_report *report);

#endif
