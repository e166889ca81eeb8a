/* model.c: building the host's model: parts, springs, membranes, matrices' patterns. */
#include "host.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <raddle/scene.h>

/* Grows *array from `count` to count + more elements, the new ones zero. */
static int grow(void *array, size_t count, size_t more, size_t size)
{
    void *old, *moved;
    memcpy(&old, array, sizeof old);
    moved = realloc(old, (count + more) * size + 1);
    if (!moved)
        return 0;
    memset((char *)moved + count * size, 0, more * size);
    memcpy(array, &moved, sizeof moved);
    return 1;
}

host *host_create(void)
{
    host *h = calloc(1, sizeof *h);
    if (!h)
        return NULL;
    h->gravity[2] = -9.81;
    h->air = (host_air){.density = 1.2, .cloth_drag = 1.2, .strand_drag = 1.1};
    h->damping = 0.004;
    h->solver_tolerance = 1e-3; /* leaves about 5e-4 m/s */
    h->solver_limit = 300;
    return h;
}

void host_destroy(host *h)
{
    if (!h)
        return;
    void *owned[] = {h->parts, h->vertex_part, h->own_mass, h->mass, h->driven, h->position, h->velocity, h->proposed,
                     h->proposed_velocity, h->target, h->support, h->membranes, h->springs, h->pulls, h->bends,
                     h->triangles, h->segments, h->joins, h->matrix.block, h->matrix.diagonal, h->bending.value,
                     h->bending.diagonal, h->couplings, h->force, h->solver.filter, h->solver.upper, h->solver.pivot,
                     h->solver.inverse, h->solver.residual, h->solver.direction, h->solver.image, h->solver.scaled};
    for (size_t k = 0; k < sizeof owned / sizeof owned[0]; k++)
        free(owned[k]);
    host_pattern_free(&h->matrix.pattern);
    host_pattern_free(&h->bending.pattern);
    free(h);
}

/* Appends a part with its vertices, at rest at the given places and still without mass. */
static int add_part(host *h, const char *name, int kind, double half_thickness, double friction, size_t count,
                    const double (*position)[3], size_t *first)
{
    size_t n = h->vertex_count;
    if (count == 0 || n + count >= UINT32_MAX || (kind != RDL_BODY && h->soft_count != n))
        return 0;
    if (!grow(&h->parts, h->part_count, 1, sizeof *h->parts) ||
        !grow(&h->vertex_part, n, count, sizeof *h->vertex_part) ||
        !grow(&h->own_mass, n, count, sizeof *h->own_mass) || !grow(&h->mass, n, count, sizeof *h->mass) ||
        !grow(&h->driven, n, count, sizeof *h->driven) || !grow(&h->position, n, count, sizeof *h->position) ||
        !grow(&h->velocity, n, count, sizeof *h->velocity) || !grow(&h->proposed, n, count, sizeof *h->proposed) ||
        !grow(&h->proposed_velocity, n, count, sizeof *h->proposed_velocity) ||
        !grow(&h->target, n, count, sizeof *h->target) || !grow(&h->support, n, count, sizeof *h->support))
        return 0;
    host_part *part = &h->parts[h->part_count];
    snprintf(part->name, sizeof part->name, "%s", name);
    part->kind = kind;
    part->half_thickness = half_thickness;
    part->friction = friction;
    part->first_vertex = n;
    part->vertex_count = count;
    for (size_t i = 0; i < count; i++) {
        h->vertex_part[n + i] = (uint32_t)h->part_count;
        memcpy(h->position[n + i], position[i], sizeof position[i]);
        memcpy(h->target[n + i], position[i], sizeof position[i]);
    }
    h->part_count++;
    h->vertex_count += count;
    if (kind != RDL_BODY)
        h->soft_count = h->vertex_count;
    if (first)
        *first = n;
    return 1;
}

static int add_triangles(host *h, size_t first, size_t count, size_t triangle_count, const uint32_t (*triangles)[3])
{
    if (!grow(&h->triangles, h->triangle_count, triangle_count, sizeof *h->triangles))
        return 0;
    for (size_t t = 0; t < triangle_count; t++)
        for (int k = 0; k < 3; k++) {
            if (triangles[t][k] >= count)
                return 0;
            h->triangles[h->triangle_count + t][k] = (uint32_t)first + triangles[t][k];
        }
    h->triangle_count += triangle_count;
    return 1;
}

/* Gradients of a linear function over the flat triangle: w_u = sum grad_u[i] x_i, w_v alike. */
static int shape_membrane(host_membrane *m, const double p[3][2])
{
    double au = p[1][0] - p[0][0], av = p[1][1] - p[0][1], bu = p[2][0] - p[0][0], bv = p[2][1] - p[0][1];
    double twice = au * bv - av * bu;
    if (!(fabs(twice) > 0))
        return 0;
    m->area = 0.5 * fabs(twice);
    m->grad_u[1] = bv / twice;
    m->grad_u[2] = -av / twice;
    m->grad_v[1] = -bu / twice;
    m->grad_v[2] = au / twice;
    m->grad_u[0] = -(m->grad_u[1] + m->grad_u[2]);
    m->grad_v[0] = -(m->grad_v[1] + m->grad_v[2]);
    return 1;
}

/* One hinge over the edge 0-1 with the opposite corners 2 and 3 of a flat rest shape: energy
 * 1/2 stiffness 3 / (A0 + A1) |sum K_i x_i|^2, K from cotangents (Bergou et al. 2006, A quadratic bending model for
 * inextensible surfaces, section 3). */
static void shape_hinge(host_bend *bend, const uint32_t v[4], const double (*pattern)[2], size_t first, double stiffness)
{
    double cotangent[2][2], area = 0;
    const double *end[2] = {pattern[v[0] - first], pattern[v[1] - first]};
    for (int side = 0; side < 2; side++) {
        const double *tip = pattern[v[2 + side] - first];
        for (int e = 0; e < 2; e++) { /* angle at end e, between the hinge and the tip */
            double hx = end[1 - e][0] - end[e][0], hy = end[1 - e][1] - end[e][1];
            double tx = tip[0] - end[e][0], ty = tip[1] - end[e][1];
            double cross = fabs(hx * ty - hy * tx);
            cotangent[side][e] = (hx * tx + hy * ty) / cross;
            if (e == 0)
                area += 0.5 * cross;
        }
    }
    bend->count = 4;
    memcpy(bend->vertex, v, sizeof bend->vertex);
    bend->weight[0] = cotangent[0][1] + cotangent[1][1];
    bend->weight[1] = cotangent[0][0] + cotangent[1][0];
    bend->weight[2] = -(cotangent[0][0] + cotangent[0][1]);
    bend->weight[3] = -(cotangent[1][0] + cotangent[1][1]);
    bend->stiffness = stiffness * 3.0 / area;
}

typedef struct side {
    uint32_t low, high, tip;
} side;

static int compare_sides(const void *left, const void *right)
{
    const side *a = left, *b = right;
    if (a->low != b->low)
        return a->low < b->low ? -1 : 1;
    if (a->high != b->high)
        return a->high < b->high ? -1 : 1;
    return a->tip < b->tip ? -1 : a->tip > b->tip;
}

static int add_hinges(host *h, size_t first, const double (*pattern)[2], double stiffness, size_t from)
{
    size_t count = 3 * (h->triangle_count - from), hinges = 0;
    side *sides = malloc(count * sizeof *sides);
    if (!sides)
        return 0;
    for (size_t k = 0; k < count; k++) {
        const uint32_t *t = h->triangles[from + k / 3];
        uint32_t a = t[k % 3], b = t[(k + 1) % 3];
        sides[k] = (side){a < b ? a : b, a < b ? b : a, t[(k + 2) % 3]};
    }
    qsort(sides, count, sizeof *sides, compare_sides);
    int done = grow(&h->bends, h->bend_count, count / 2, sizeof *h->bends);
    for (size_t k = 0; done && k + 1 < count; k++) {
        if (sides[k].low != sides[k + 1].low || sides[k].high != sides[k + 1].high)
            continue;
        const uint32_t v[4] = {sides[k].low, sides[k].high, sides[k].tip, sides[k + 1].tip};
        shape_hinge(&h->bends[h->bend_count + hinges++], v, pattern, first, stiffness);
    }
    h->bend_count += hinges;
    free(sides);
    return done;
}

int host_add_cloth(host *h, const char *name, const host_fabric *fabric, size_t count, const double (*pattern)[2],
                   const double (*position)[3], size_t triangle_count, const uint32_t (*triangles)[3], size_t *first)
{
    size_t begin, from = h->triangle_count;
    if (!add_part(h, name, RDL_CLOTH, fabric->half_thickness, fabric->friction, count, position, &begin) ||
        !add_triangles(h, begin, count, triangle_count, triangles) ||
        !grow(&h->membranes, h->membrane_count, triangle_count, sizeof *h->membranes))
        return 0;
    for (size_t t = 0; t < triangle_count; t++) {
        host_membrane *m = &h->membranes[h->membrane_count + t];
        double corner[3][2];
        for (int k = 0; k < 3; k++)
            memcpy(corner[k], pattern[triangles[t][k]], sizeof corner[k]);
        if (!shape_membrane(m, (const double (*)[2])corner))
            return 0;
        m->stretch = fabric->stretch;
        m->shear = fabric->shear;
        for (int k = 0; k < 3; k++) {
            m->vertex[k] = h->triangles[from + t][k];
            h->own_mass[m->vertex[k]] += fabric->mass_per_area * m->area / 3.0;
        }
    }
    h->membrane_count += triangle_count;
    if (first)
        *first = begin;
    return add_hinges(h, begin, pattern, fabric->bending, from);
}

static double distance(const double a[3], const double b[3])
{
    double d[3] = {b[0] - a[0], b[1] - a[1], b[2] - a[2]};
    return sqrt(d[0] * d[0] + d[1] * d[1] + d[2] * d[2]);
}

/* One strand from vertex `root` on. Bending is that of a thin rod whose segments keep their length: energy
 * 1/2 B kappa^2 l per inner point with kappa = |x0 / l0 - (1 / l0 + 1 / l1) x1 + x2 / l1| / l, l their mean length;
 * quadratic, so that its stiffness is constant, and 0 for a straight strand. */
static int shape_strand(host *h, const host_yarn *yarn, size_t root, size_t points)
{
    double before = 0;
    for (size_t s = 0; s + 1 < points; s++) {
        uint32_t a = (uint32_t)(root + s), b = a + 1;
        double length = distance(h->position[a], h->position[b]);
        if (!(length > 0))
            return 0;
        h->segments[h->segment_count][0] = a;
        h->segments[h->segment_count++][1] = b;
        h->springs[h->spring_count++] = (host_spring){{a, b}, 0, length, yarn->stretch / length, 2 * yarn->radius};
        h->own_mass[a] += 0.5 * yarn->mass_per_length * length;
        h->own_mass[b] += 0.5 * yarn->mass_per_length * length;
        if (s) {
            double mean = 0.5 * (before + length);
            host_bend *bend = &h->bends[h->bend_count++];
            *bend = (host_bend){{a - 1, a, b, 0}, 3, {1 / before, -(1 / before + 1 / length), 1 / length, 0},
                                yarn->bending / mean};
        }
        before = length;
    }
    return 1;
}

int host_add_strands(host *h, const char *name, const host_yarn *yarn, size_t strand_count, size_t points_each,
                     const double (*position)[3], size_t *first)
{
    size_t begin, count = strand_count * points_each;
    if (points_each < 2 || !add_part(h, name, RDL_STRANDS, yarn->radius, yarn->friction, count, position, &begin) ||
        !grow(&h->segments, h->segment_count, count, sizeof *h->segments) ||
        !grow(&h->springs, h->spring_count, count, sizeof *h->springs) ||
        !grow(&h->bends, h->bend_count, count, sizeof *h->bends))
        return 0;
    for (size_t s = 0; s < strand_count; s++)
        if (!shape_strand(h, yarn, begin + s * points_each, points_each))
            return 0;
    if (first)
        *first = begin;
    return 1;
}

int host_add_body(host *h, const char *name, double half_thickness, double friction, size_t count,
                  const double (*position)[3], size_t triangle_count, const uint32_t (*triangles)[3], size_t *first)
{
    size_t begin;
    if (!add_part(h, name, RDL_BODY, half_thickness, friction, count, position, &begin) ||
        !add_triangles(h, begin, count, triangle_count, triangles))
        return 0;
    for (size_t i = begin; i < begin + count; i++) {
        h->own_mass[i] = INFINITY;
        h->driven[i] = 1;
    }
    if (first)
        *first = begin;
    return 1;
}

int host_join(host *h, uint32_t a, uint32_t b, double stiffness)
{
    if (a >= h->soft_count || b >= h->soft_count || a == b ||
        !grow(&h->joins, h->join_count, 1, sizeof *h->joins) ||
        !grow(&h->springs, h->spring_count, 1, sizeof *h->springs))
        return 0;
    h->joins[h->join_count][0] = a;
    h->joins[h->join_count++][1] = b;
    h->springs[h->spring_count++] = (host_spring){{a, b}, 0, distance(h->position[a], h->position[b]), stiffness, 0};
    return 1;
}

int host_add_pull(host *h, uint32_t vertex, double stiffness, double force_max)
{
    if (vertex >= h->soft_count || !grow(&h->pulls, h->pull_count, 1, sizeof *h->pulls))
        return 0;
    host_pull *pull = &h->pulls[h->pull_count++];
    *pull = (host_pull){vertex, {0, 0, 0}, stiffness, force_max};
    memcpy(pull->target, h->position[vertex], sizeof pull->target);
    return 1;
}
