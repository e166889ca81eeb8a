/* scenes/world.h: a small scene with its state: parts, elements, links of the test's own host, and builders of simple
 * shapes. Built in metres; world_finish then multiplies every length by a power of two, so that one scene can be
 * played at any scale. */
#ifndef SCENES_WORLD_H
#define SCENES_WORLD_H

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#include "raddle/scene.h"

enum {
    WORLD_PARTS = 16,
    WORLD_VERTICES = 1600,
    WORLD_ELEMENTS = 1600,
    WORLD_LINKS = 12000,
    WORLD_LOOPS = 4,
    WORLD_RULES = 16
};

/* Two vertices that want a distance. give: share of the error that one pass takes away, 1 for stretch, less for
 * bending; pull_only: resists stretching alone. */
typedef struct world_link {
    uint32_t a, b;
    double rest, give;
    bool pull_only;
} world_link;

/* A closed strand, for linking numbers. */
typedef struct world_loop {
    uint32_t first, count;
} world_loop;

typedef struct world {
    size_t part_count, vertex_count, segment_count, triangle_count, link_count, loop_count;
    size_t muted_count, attachment_count;
    rdl_part parts[WORLD_PARTS];
    uint32_t part_first[WORLD_PARTS + 1]; /* vertices of a part are consecutive */
    uint32_t vertex_part[WORLD_VERTICES];
    double mass[WORLD_VERTICES];
    double home[WORLD_VERTICES][3]; /* where it began, in metres before scaling */
    double x[WORLD_VERTICES][3], v[WORLD_VERTICES][3];
    uint32_t segments[WORLD_ELEMENTS][2], triangles[WORLD_ELEMENTS][3];
    world_link links[WORLD_LINKS];
    world_loop loops[WORLD_LOOPS];
    uint32_t muted[WORLD_RULES][2], attachments[WORLD_RULES][2];
    double gravity[3];   /* m/s^2 */
    double duration;     /* s, one step */
    double drag;         /* share of the velocity lost in a step */
    int relax_passes;    /* over all links, in each step */
    bool by_impulse;     /* velocities by the report's impulses, else from delivered positions */
    double scale;        /* lengths are those of the builders times this power of two */
    int format;          /* RDL_FLOAT32 or RDL_FLOAT64 */
} world;

/* An empty world: 1/50 s, no gravity, 8 passes. */
world *world_create(void);
void world_destroy(world *w);
/* Multiplies all lengths and rounds to the format. The last call of building. */
void world_finish(world *w, double scale, int format);
void world_describe(const world *w, rdl_scene *scene);
bool world_is_driven(const world *w, uint32_t v);
size_t world_elements(const world *w);

/* Builders. All return the first vertex. mass: of each vertex, infinity = driven. */
uint32_t world_part(world *w, const char *name, int kind, double half_thickness);
uint32_t world_vertex(world *w, const double x[3], double mass);
void world_triangle(world *w, uint32_t a, uint32_t b, uint32_t c);
void world_link_pair(world *w, uint32_t a, uint32_t b, double give, bool pull_only);
void world_set_driven(world *w, uint32_t v);
/* (nu + 1) x (nv + 1) vertices, corner + i/nu u + j/nv v; vertex first + i (nv + 1) + j. Links when mass is finite. */
uint32_t world_sheet(world *w, const double corner[3], const double u[3], const double v[3], unsigned nu, unsigned nv,
                     double mass);
/* A polyline through given points. */
uint32_t world_strand(world *w, const double (*points)[3], size_t count, bool closed, double mass);
/* `segments` equal pieces from a to b. */
uint32_t world_line(world *w, const double a[3], const double b[3], unsigned segments, double mass);
/* Surface of revolution about z through (radius, height) rings: a funnel. Driven. */
uint32_t world_turned(world *w, const double (*profile)[2], unsigned rings, unsigned around);
/* Closed box, driven, 12 triangles. */
uint32_t world_box(world *w, const double lo[3], const double hi[3]);
/* Closed octahedron, driven, 8 triangles. */
uint32_t world_octahedron(world *w, const double centre[3], double radius);

#endif
