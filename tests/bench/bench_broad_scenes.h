/* tests/bench/bench_broad_scenes.h: moving triangles and segments for the broad-phase benchmark, as swept boxes. */
#ifndef BENCH_BROAD_SCENES_H
#define BENCH_BROAD_SCENES_H

#include <stddef.h>
#include <stdint.h>

#include "raddle/tree.h"

enum {
    SCENE_CLOTH,   /* stacked sheets with wrinkles that slide over each other */
    SCENE_STRANDS, /* clumps of curls that swing */
    SCENE_ROPE,    /* cloth wound round a rope in layers */
    SCENE_MIXED,   /* half sheets, half curls that lie on them */
    SCENE_TINY,    /* a tenth of the elements in a knot of a few millimetres, the rest scattered over a kilometre */
    SCENE_FLYING,  /* sheets that fly through each other, 10 cm a step */
    SCENE_ASLANT,  /* the same, closer and obliquely: five hundred pairs per box */
    SCENE_QUIET,   /* one sheet with long waves that touches nothing, not even itself */
    SCENE_COUNT
};

/* Sheets of side x side vertices come first, then curls. */
typedef struct bench_layout {
    size_t sheets, side, curls, sheet_vertices;
} bench_layout;

typedef struct bench_scene {
    int kind;
    bench_layout layout;
    size_t vertex_count, element_count;
    uint32_t (*elements)[3]; /* vertices; a segment repeats its last */
    float (*start)[3], (*end)[3];
    double half;             /* half-thickness of every element, m */
    rdl_box *boxes;
} bench_scene;

const char *bench_scene_name(int kind);
/* About `elements` elements; NULL when memory is short. */
bench_scene *bench_scene_new(int kind, size_t elements);
/* Positions and boxes of step number `step`. */
void bench_scene_move(bench_scene *scene, int step);
/* Only the boxes, from the positions. */
void bench_scene_boxes(bench_scene *scene);
void bench_scene_free(bench_scene *scene);

#endif
