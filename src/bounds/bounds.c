/* bounds/bounds.c: swept boxes.
 *
 * Promise: if two elements A and B come within h_A + h_B (their half-thicknesses) at some time of the step, their boxes
 * overlap, whatever the rounding.
 * Proof. Let p in A and q in B be the points with |p - q| <= h_A + h_B at that time, and k an axis. A point of an element
 * is at all times a convex combination of the element's vertices at start and end, so m_A <= p_k <= M_A with the least
 * and largest coordinate m_A, M_A of those vertices; the same holds for B. Then
 *     m_A - h_A <= p_k - h_A <= q_k + h_B <= M_B + h_B,
 * and with A and B exchanged, so the exact intervals [m - h, M + h] overlap on every axis. Let C clamp to the float
 * range. What we store is L(m - h) and U(M + h) with L(x) <= C(x) <= U(x) (below), and C is monotone, so
 *     L(m_A - h_A) <= C(m_A - h_A) <= C(M_B + h_B) <= U(M_B + h_B).
 * L(x) is: subtract in double, clamp, convert to float, and step to the next float below. Every IEEE rounding, in any
 * rounding mode, is monotone and keeps numbers that it can represent. Let f be the converted value and g the float below
 * it. Were C(x) < g, then, g being a double and a float, neither rounding could have lifted the value above g; but f > g. So
 * g <= C(x). A step below the smallest float is clamped back to it, where C(x) lies too. U is the mirror image. */
#include "bounds/bounds.h"

typedef struct fill_job {
    const rdli_mesh *mesh;
    const rdli_motion *motion;
    rdli_boxes *boxes;
} fill_job;

enum { BLOCK = 4096 }; /* elements per task: long enough to hide the hand-out, short enough to balance */

static double least(double a, double b)
{
    return a < b ? a : b;
}

static double largest(double a, double b)
{
    return a > b ? a : b;
}

static float clamped(double x)
{
    return (float)least(largest(x, -(double)FLT_MAX), (double)FLT_MAX);
}

/* The next float away from zero for away > 0, towards zero for away < 0; f is finite and not zero. */
static float stepped(float f, int32_t away)
{
    int32_t bits;
    memcpy(&bits, &f, sizeof bits);
    bits += away;
    memcpy(&f, &bits, sizeof bits);
    return f;
}

static float rounded_down(double x)
{
    float f = clamped(x);
    f = f > 0.0f ? stepped(f, -1) : f < 0.0f ? stepped(f, 1) : -FLT_TRUE_MIN;
    return f < -FLT_MAX ? -FLT_MAX : f;
}

static float rounded_up(double x)
{
    return -rounded_down(-x);
}

static rdl_box swept(const rdli_motion *motion, const uint32_t *vertices, unsigned count, double half)
{
    rdl_box box;
    for (unsigned k = 0; k < 3; k++) {
        double lo = motion->start[vertices[0]][k], hi = lo;
        for (unsigned i = 0; i < count; i++) {
            double s = motion->start[vertices[i]][k], e = motion->end[vertices[i]][k];
            lo = least(lo, least(s, e));
            hi = largest(hi, largest(s, e));
        }
        box.lo[k] = rounded_down(lo - half);
        box.hi[k] = rounded_up(hi + half);
    }
    return box;
}

static size_t blocks(uint32_t count)
{
    return ((size_t)count + BLOCK - 1) / BLOCK;
}

static uint32_t block_end(size_t index, uint32_t count)
{
    size_t end = (index + 1) * BLOCK;
    return end < count ? (uint32_t)end : count;
}

/* Blocks of vertices, then of edges, then of triangles, in one loop. */
static void fill_block(void *data, size_t index, unsigned worker)
{
    (void)worker;
    const fill_job *job = data;
    const rdli_mesh *mesh = job->mesh;
    if (index < blocks(mesh->vertex_count)) {
        for (uint32_t i = (uint32_t)(index * BLOCK), end = block_end(index, mesh->vertex_count); i < end; i++)
            job->boxes->vertices[i] = swept(job->motion, &i, 1, mesh->vertex_half[i]);
        return;
    }
    index -= blocks(mesh->vertex_count);
    if (index < blocks(mesh->edge_count)) {
        for (uint32_t i = (uint32_t)(index * BLOCK), end = block_end(index, mesh->edge_count); i < end; i++)
            job->boxes->edges[i] = swept(job->motion, mesh->edges[i], 2, mesh->edge_half[i]);
        return;
    }
    index -= blocks(mesh->edge_count);
    for (uint32_t i = (uint32_t)(index * BLOCK), end = block_end(index, mesh->triangle_count); i < end; i++)
        job->boxes->triangles[i] = swept(job->motion, mesh->triangles[i], 3, mesh->triangle_half[i]);
}

void rdli_bounds_fill(const rdli_mesh *mesh, const rdli_motion *motion, rdli_workers *workers, rdli_boxes *boxes)
{
    fill_job job = {mesh, motion, boxes};
    size_t count = blocks(mesh->vertex_count) + blocks(mesh->edge_count) + blocks(mesh->triangle_count);
    rdli_parallel_for(workers, count, fill_block, &job);
}
