/* alloc/little.h: a small scene with every kind of part, and one step in which much touches. */
#ifndef ALLOC_LITTLE_H
#define ALLOC_LITTLE_H

#include "raddle/scene.h"

enum {
    LITTLE_SIDE = 6, /* vertices along a side of the sheet */
    LITTLE_SHEET = LITTLE_SIDE * LITTLE_SIDE,
    LITTLE_STRAND = 8,
    LITTLE_PLATE = 4,
    LITTLE_VERTICES = LITTLE_SHEET + LITTLE_STRAND + LITTLE_PLATE,
    LITTLE_TRIANGLES = 2 * (LITTLE_SIDE - 1) * (LITTLE_SIDE - 1) + 2
};

/* A sheet above a fixed plate, with a strand above the sheet; in the proposal the sheet falls through the plate and the
 * strand through the sheet. */
typedef struct little {
    rdl_part parts[3];
    uint32_t vertex_part[LITTLE_VERTICES];
    double mass[LITTLE_VERTICES];
    uint32_t segments[LITTLE_STRAND - 1][2];
    uint32_t triangles[LITTLE_TRIANGLES][3];
    uint32_t attachments[1][2];
    rdl_pair_friction friction[1];
    double start[LITTLE_VERTICES][3], proposed[LITTLE_VERTICES][3], delivered[LITTLE_VERTICES][3];
    rdl_scene scene;
    rdl_step step;
} little;

/* Fills *l; the scene and the step point into it. */
void little_make(little *l);

#endif
