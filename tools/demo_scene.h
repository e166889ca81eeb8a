/* demo_scene.h: the demo's scenario: a fringed poncho for a half-scale tailor's figure.
 *
 * Four hands hold the cloth above the figure, lower it over the head, and let go at front and back. The figure turns
 * under the cloth; the two hands that are left drag it over the shoulders, one way and the other, while the figure
 * turns back; then they let go. */
#ifndef RADDLE_TOOLS_DEMO_SCENE_H
#define RADDLE_TOOLS_DEMO_SCENE_H

#include "demo_body.h"
#include "host/host.h"

#define DEMO_HEIGHT 0.90        /* m, of the figure */
#define DEMO_PICTURE_RATE 24.0  /* pictures a second */

typedef struct demo_scene {
    host *h;
    double step;               /* s */
    size_t steps_per_picture;
    size_t strand_count, points_each;
    size_t cloth_first, strand_first, body_first, body_count, hand_count;
    size_t cloth_triangle_count; /* the first triangles of the host's list */
    uint8_t *triangle_colour;    /* per triangle of the host's list, see picture.h */
    uint8_t *segment_colour;
    double (*body_rest)[3];
    double (*hand_rest)[3];
} demo_scene;

/* small = 1: the same story with a coarse cloth and few strands, for tests. NULL: no memory. */
demo_scene *demo_scene_create(const mesh *body, int small);
void demo_scene_destroy(demo_scene *scene);
/* Tells the host's driven vertices and hands where to be at `time` (s), the end of the coming step. */
void demo_scene_direct(demo_scene *scene, double time);

#endif
