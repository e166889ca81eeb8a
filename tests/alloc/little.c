/* alloc/little.c: see little.h. */
#include "little.h"

#include <math.h>
#include <string.h>

static void place(little *l, uint32_t vertex, uint32_t part, double mass, double x, double y, double z, double fall)
{
    const double from[3] = {x, y, z}, to[3] = {x + 0.01 * fall, y, z - fall};
    memcpy(l->start[vertex], from, sizeof from);
    memcpy(l->proposed[vertex], to, sizeof to);
    l->vertex_part[vertex] = part;
    l->mass[vertex] = mass;
}

static void add_triangle(little *l, size_t *next, uint32_t a, uint32_t b, uint32_t c)
{
    const uint32_t corners[3] = {a, b, c};
    memcpy(l->triangles[(*next)++], corners, sizeof corners);
}

static void make_sheet(little *l, size_t *triangle)
{
    for (uint32_t row = 0; row < LITTLE_SIDE; row++)
        for (uint32_t column = 0; column < LITTLE_SIDE; column++) {
            uint32_t v = row * LITTLE_SIDE + column;
            double bump = 0.002 * (double)((row * 5 + column * 3) % 7);
            place(l, v, 0, 1e-4, 0.02 * column, 0.02 * row, 0.01 + bump, 0.03);
            if (row + 1 < LITTLE_SIDE && column + 1 < LITTLE_SIDE) {
                add_triangle(l, triangle, v, v + 1, v + LITTLE_SIDE);
                add_triangle(l, triangle, v + 1, v + LITTLE_SIDE + 1, v + LITTLE_SIDE);
            }
        }
}

static void make_strand(little *l)
{
    for (uint32_t i = 0; i < LITTLE_STRAND; i++) {
        place(l, LITTLE_SHEET + i, 1, 2e-5, 0.005 + 0.012 * i, 0.031 + 0.004 * i, 0.04, 0.09);
        if (i > 0) {
            l->segments[i - 1][0] = LITTLE_SHEET + i - 1;
            l->segments[i - 1][1] = LITTLE_SHEET + i;
        }
    }
}

static void make_plate(little *l, size_t *triangle)
{
    const uint32_t first = LITTLE_SHEET + LITTLE_STRAND;
    place(l, first, 2, INFINITY, -0.3, -0.3, 0, 0);
    place(l, first + 1, 2, INFINITY, 0.4, -0.3, 0, 0);
    place(l, first + 2, 2, INFINITY, 0.4, 0.4, 0, 0);
    place(l, first + 3, 2, INFINITY, -0.3, 0.4, 0, 0);
    add_triangle(l, triangle, first, first + 1, first + 2);
    add_triangle(l, triangle, first, first + 2, first + 3);
}

void little_make(little *l)
{
    memset(l, 0, sizeof *l);
    l->parts[0] = (rdl_part){"sheet", RDL_CLOTH, 5e-4, 0.3};
    l->parts[1] = (rdl_part){"strand", RDL_STRANDS, 1e-3, 0.2};
    l->parts[2] = (rdl_part){"plate", RDL_BODY, 0, 0.1};
    size_t triangle = 0;
    make_sheet(l, &triangle);
    make_strand(l);
    make_plate(l, &triangle);
    l->attachments[0][0] = 0;
    l->attachments[0][1] = LITTLE_SHEET;
    l->friction[0] = (rdl_pair_friction){{0, 2}, 0.25};
    l->scene = (rdl_scene){.size = sizeof(rdl_scene), .part_count = 3, .parts = l->parts,
                           .vertex_count = LITTLE_VERTICES, .vertex_part = l->vertex_part, .mass = l->mass,
                           .segment_count = LITTLE_STRAND - 1, .segments = (const uint32_t (*)[2])l->segments,
                           .triangle_count = LITTLE_TRIANGLES, .triangles = (const uint32_t (*)[3])l->triangles,
                           .attachment_count = 1, .attachments = (const uint32_t (*)[2])l->attachments,
                           .pair_friction_count = 1, .pair_friction = l->friction};
    l->step = (rdl_step){.size = sizeof(rdl_step), .start = {l->start, 0, RDL_FLOAT64},
                         .proposed = {l->proposed, 0, RDL_FLOAT64}, .delivered = {l->delivered, 0, RDL_FLOAT64},
                         .duration = 1.0 / 48};
}
