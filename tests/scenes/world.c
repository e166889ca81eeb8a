/* scenes/world.c: see world.h. */
#include "world.h"

#include <assert.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

world *world_create(void)
{
    world *w = calloc(1, sizeof *w);
    if (w == NULL)
        exit(EXIT_FAILURE);
    w->duration = 0.02;
    w->relax_passes = 8;
    w->scale = 1.0;
    w->format = RDL_FLOAT64;
    return w;
}

void world_destroy(world *w)
{
    free(w);
}

void world_finish(world *w, double scale, int format)
{
    w->scale = scale;
    w->format = format;
    for (size_t p = 0; p < w->part_count; p++)
        w->parts[p].half_thickness *= scale;
    for (size_t i = 0; i < w->vertex_count; i++)
        for (int k = 0; k < 3; k++) {
            double x = w->home[i][k] * scale;
            w->x[i][k] = format == RDL_FLOAT32 ? (double)(float)x : x;
            w->v[i][k] *= scale;
        }
    for (size_t i = 0; i < w->link_count; i++)
        w->links[i].rest *= scale;
    for (int k = 0; k < 3; k++)
        w->gravity[k] *= scale;
}

void world_describe(const world *w, rdl_scene *scene)
{
    memset(scene, 0, sizeof *scene);
    scene->size = sizeof *scene;
    scene->part_count = w->part_count;
    scene->parts = w->parts;
    scene->vertex_count = w->vertex_count;
    scene->vertex_part = w->vertex_part;
    scene->mass = w->mass;
    scene->segment_count = w->segment_count;
    scene->segments = w->segments;
    scene->triangle_count = w->triangle_count;
    scene->triangles = w->triangles;
    scene->muted_count = w->muted_count;
    scene->muted_parts = w->muted;
    scene->attachment_count = w->attachment_count;
    scene->attachments = w->attachments;
}

bool world_is_driven(const world *w, uint32_t v)
{
    return isinf(w->mass[v]);
}

size_t world_elements(const world *w)
{
    return w->segment_count + w->triangle_count;
}

uint32_t world_part(world *w, const char *name, int kind, double half_thickness)
{
    assert(w->part_count < WORLD_PARTS);
    rdl_part *part = &w->parts[w->part_count];
    part->name = name;
    part->kind = kind;
    part->half_thickness = half_thickness;
    w->part_first[w->part_count] = (uint32_t)w->vertex_count;
    w->part_count++;
    w->part_first[w->part_count] = (uint32_t)w->vertex_count;
    return (uint32_t)w->part_count - 1;
}

uint32_t world_vertex(world *w, const double x[3], double mass)
{
    assert(w->vertex_count < WORLD_VERTICES && w->part_count > 0);
    uint32_t v = (uint32_t)w->vertex_count++;
    memcpy(w->home[v], x, sizeof w->home[v]);
    w->mass[v] = mass;
    w->vertex_part[v] = (uint32_t)w->part_count - 1;
    w->part_first[w->part_count] = (uint32_t)w->vertex_count;
    return v;
}

void world_triangle(world *w, uint32_t a, uint32_t b, uint32_t c)
{
    assert(w->triangle_count < WORLD_ELEMENTS);
    uint32_t *t = w->triangles[w->triangle_count++];
    t[0] = a;
    t[1] = b;
    t[2] = c;
}

static void segment(world *w, uint32_t a, uint32_t b)
{
    assert(w->segment_count < WORLD_ELEMENTS);
    uint32_t *s = w->segments[w->segment_count++];
    s[0] = a;
    s[1] = b;
}

void world_link_pair(world *w, uint32_t a, uint32_t b, double give, bool pull_only)
{
    assert(w->link_count < WORLD_LINKS);
    double square = 0.0;
    for (int k = 0; k < 3; k++)
        square += (w->home[a][k] - w->home[b][k]) * (w->home[a][k] - w->home[b][k]);
    world_link *link = &w->links[w->link_count++];
    *link = (world_link){a, b, sqrt(square), give, pull_only};
}

void world_set_driven(world *w, uint32_t v)
{
    w->mass[v] = INFINITY;
}

static void link_sheet(world *w, uint32_t first, unsigned nu, unsigned nv)
{
    unsigned row = nv + 1;
    for (unsigned i = 0; i <= nu; i++)
        for (unsigned j = 0; j <= nv; j++) {
            uint32_t v = first + i * row + j;
            if (i < nu)
                world_link_pair(w, v, v + row, 1.0, false);
            if (j < nv)
                world_link_pair(w, v, v + 1, 1.0, false);
            if (i < nu && j < nv) {
                world_link_pair(w, v, v + row + 1, 0.3, false);
                world_link_pair(w, v + 1, v + row, 0.3, false);
            }
            if (i + 2 <= nu)
                world_link_pair(w, v, v + 2 * row, 0.1, false);
            if (j + 2 <= nv)
                world_link_pair(w, v, v + 2, 0.1, false);
        }
}

uint32_t world_sheet(world *w, const double corner[3], const double u[3], const double v[3], unsigned nu, unsigned nv,
                     double mass)
{
    uint32_t first = (uint32_t)w->vertex_count;
    unsigned row = nv + 1;
    for (unsigned i = 0; i <= nu; i++)
        for (unsigned j = 0; j <= nv; j++) {
            double x[3];
            for (int k = 0; k < 3; k++)
                x[k] = corner[k] + u[k] * i / nu + v[k] * j / nv;
            world_vertex(w, x, mass);
        }
    for (unsigned i = 0; i < nu; i++)
        for (unsigned j = 0; j < nv; j++) {
            uint32_t a = first + i * row + j, b = a + row;
            if ((i + j) % 2 == 0) {
                world_triangle(w, a, b, b + 1);
                world_triangle(w, a, b + 1, a + 1);
            } else {
                world_triangle(w, a, b, a + 1);
                world_triangle(w, b, b + 1, a + 1);
            }
        }
    if (isfinite(mass))
        link_sheet(w, first, nu, nv);
    return first;
}

uint32_t world_strand(world *w, const double (*points)[3], size_t count, bool closed, double mass)
{
    uint32_t first = (uint32_t)w->vertex_count, n = (uint32_t)count;
    for (size_t i = 0; i < count; i++)
        world_vertex(w, points[i], mass);
    for (uint32_t i = 0; i < n; i++) {
        if (i + 1 < n || closed) {
            segment(w, first + i, first + (i + 1) % n);
            world_link_pair(w, first + i, first + (i + 1) % n, 1.0, false);
        }
        if (i + 2 < n || closed)
            world_link_pair(w, first + i, first + (i + 2) % n, 0.1, false);
    }
    if (closed) {
        assert(w->loop_count < WORLD_LOOPS);
        w->loops[w->loop_count++] = (world_loop){first, n};
    }
    return first;
}

uint32_t world_line(world *w, const double a[3], const double b[3], unsigned segments, double mass)
{
    static double points[WORLD_VERTICES][3];
    for (unsigned i = 0; i <= segments; i++)
        for (int k = 0; k < 3; k++)
            points[i][k] = a[k] + (b[k] - a[k]) * i / segments;
    return world_strand(w, (const double(*)[3])points, segments + 1, false, mass);
}

uint32_t world_turned(world *w, const double (*profile)[2], unsigned rings, unsigned around)
{
    uint32_t first = (uint32_t)w->vertex_count;
    for (unsigned r = 0; r < rings; r++)
        for (unsigned i = 0; i < around; i++) {
            double angle = 2.0 * 3.141592653589793 * i / around;
            double x[3] = {profile[r][0] * cos(angle), profile[r][0] * sin(angle), profile[r][1]};
            world_vertex(w, x, INFINITY);
        }
    for (unsigned r = 0; r + 1 < rings; r++)
        for (unsigned i = 0; i < around; i++) {
            uint32_t a = first + r * around + i, b = first + r * around + (i + 1) % around;
            world_triangle(w, a, b, b + around);
            world_triangle(w, a, b + around, a + around);
        }
    return first;
}

uint32_t world_box(world *w, const double lo[3], const double hi[3])
{
    /* Corner c has hi where its bits are set: x 1, y 2, z 4. */
    static const uint32_t faces[12][3] = {{0, 2, 1}, {1, 2, 3}, {4, 5, 6}, {5, 7, 6}, {0, 1, 4}, {1, 5, 4},
                                          {2, 6, 3}, {3, 6, 7}, {0, 4, 2}, {2, 4, 6}, {1, 3, 5}, {3, 7, 5}};
    uint32_t first = (uint32_t)w->vertex_count;
    for (unsigned c = 0; c < 8; c++) {
        double x[3] = {c & 1u ? hi[0] : lo[0], c & 2u ? hi[1] : lo[1], c & 4u ? hi[2] : lo[2]};
        world_vertex(w, x, INFINITY);
    }
    for (int f = 0; f < 12; f++)
        world_triangle(w, first + faces[f][0], first + faces[f][1], first + faces[f][2]);
    return first;
}

uint32_t world_octahedron(world *w, const double centre[3], double radius)
{
    uint32_t first = (uint32_t)w->vertex_count;
    for (unsigned c = 0; c < 6; c++) {
        double x[3] = {centre[0], centre[1], centre[2]};
        x[c / 2] += c % 2 == 0 ? radius : -radius;
        world_vertex(w, x, INFINITY);
    }
    for (uint32_t o = 0; o < 8; o++) {
        uint32_t a = o & 1u, b = 2 + (o >> 1 & 1u), c = 4 + (o >> 2 & 1u);
        bool turn = ((o & 1u) + (o >> 1 & 1u) + (o >> 2 & 1u)) % 2 == 1;
        world_triangle(w, first + a, first + (turn ? c : b), first + (turn ? b : c));
    }
    return first;
}
