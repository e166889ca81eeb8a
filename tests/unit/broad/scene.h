/* tests/unit/broad/scene.h: a small scene with everything that the rules know, and the stage under test. */
#ifndef TEST_BROAD_SCENE_H
#define TEST_BROAD_SCENE_H

#include "bounds/bounds.h"
#include "broad/broad.h"
#include "common.h"

/* A scene that owns its arrays: strands of four vertices, two cloth sheets, two bodies. */
typedef struct scene {
    rdli_mesh mesh;
    uint32_t (*edges)[2], (*triangles)[3], *vertex_part, *attached_first, *attached;
    double *vertex_half, *edge_half, *triangle_half, (*start)[3], (*end)[3];
    uint64_t *muted;
    uint8_t *driven, *awake;
    rdli_boxes boxes;
} scene;

enum { GRID = 9, STRANDS = 40, STRAND = 4, SHEETS = 4, PARTS = 2 + SHEETS };

/* The last two sheets are driven bodies; one vertex of the first sheet is pinned. */
scene *make_scene(uint64_t seed);
void free_scene(scene *s);
/* Draws places, and motion up to half of `motion` on each axis. */
void place(scene *s, uint64_t seed, double motion);
void mute(scene *s, uint32_t p, uint32_t q);
/* One attachment: vertices v < w. */
void attach(scene *s, uint32_t v, uint32_t w);

/* Whether the rules allow a pair of elements with the vertices a and b. */
bool wanted(const scene *s, const uint8_t *awake, const uint32_t *a, unsigned na, const uint32_t *b, unsigned nb);

typedef struct stage {
    ledger ledger;
    rdl_host host;
    rdli_memory memory;
    rdli_workers *workers;
    rdli_broad *broad;
} stage;

/* fail_at: number of the allocation that fails, 0 = none. */
rdl_status open_stage(stage *st, unsigned threads, size_t fail_at);
void close_stage(stage *st);
/* All boxes of the scene. */
void fill(scene *s, stage *st);

#endif
