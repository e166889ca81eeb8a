/* scenes/parts.h: helpers that the scenes share. */
#ifndef SCENES_PARTS_H
#define SCENES_PARTS_H

#include "play.h"

/* Verdicts of a step: for scenes in which the same ones are right all the time. */
unsigned accept_clear(const world *w, unsigned step);
unsigned accept_free(const world *w, unsigned step);    /* clear or resolved */
unsigned accept_tangled(const world *w, unsigned step);

/* proposed[v] = (home + shift) in scaled units, for the vertices of a part. */
void move_part(const world *w, uint32_t part, const double shift[3], double (*proposed)[3]);
/* The same for one vertex. */
void move_vertex(const world *w, uint32_t v, const double shift[3], double (*proposed)[3]);
/* Fault unless at least `least` steps had one of the verdicts 1..3. */
void expect_action(judge *j, unsigned steps, const uint64_t verdicts[4], unsigned least);
/* Distance of two vertices, metres before scaling. */
double stretch_between(const world *w, uint32_t a, uint32_t b);

#endif
