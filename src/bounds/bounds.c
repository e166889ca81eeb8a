/* bounds/bounds.c: swept boxes: of the vertices from their motion, of the elements from the boxes of their vertices.
 *
 * Promise: if two elements A and B come within h_A + h_B (their half-thicknesses) at some time of the step, their boxes
 * overlap, whatever the rounding.
 * Proof. Let p in A and q in B be the points with |p - q| <= h_A + h_B at that time, and k an axis. A point of an element
 * is at all times a convex combination of the element's vertices at start and end, so m_A <= p_k <= M_A with the least
 * and largest coordinate m_A, M_A of those vertices; the same holds for B. Then
 *     m_A - h_A <= p_k - h_A <= q_k + h_B <= M_B + h_B,
 * and with A and B exchanged, so the exact intervals [m - h, M + h] overlap on every axis. Let C clamp to the float
 * range; it is monotone. It is enough to store a lower bound not above C(m - h) and an upper bound not below C(M + h).
 *
 * L(x) below is such a lower bound for a difference x = a - b of doubles: subtract in double, clamp, convert to float,
 * and go down by a float at least. Every IEEE rounding, in any rounding mode, is monotone and keeps numbers that it can
 * represent. Let f be the converted value and g the float below it. Were C(x) < g, then, g being a double and a float,
 * neither rounding could have lifted the value above g; but f > g. So g <= C(x). Going down: f - |f| 2^-23 is not above
 * g, since |f| 2^-23 is at least the distance of g for normal f, and g is representable; for subnormal f the second
 * subtraction, of the smallest float, is exact and gives g. What falls off the range is clamped back, where C(x) lies.
 *
 * The box of an element with half-thickness h is the union of its vertices' boxes, each grown by h - h_v >= 0 more: the
 * vertex's bound is not above C(m_v - h_v), the double d is not below h - h_v, so L(bound - d) <= C(m_v - h). Where
 * h = h_v, which is the rule, the union is taken as it is. So the boxes of elements change only where those of
 * their vertices do, which the incremental fill and the broad phase rely on.
 *
 * Common motion. Distances do not change when every vertex is moved by -t s at time t, so boxes of the motion from start to
 * end - s serve as well, with one shift s for all, and they are smaller when s is what most vertices share. y = end - s
 * is rounded, by less than 2^-52 |y| in any mode (differences of doubles do not underflow). Its lower bound is
 * y' = y - 2^-51 |y|, after one more rounding of at most 2^-52 |y|, so y' <= end - s; above likewise. The proof goes through with
 * y' in the place of the end. */
#include "bounds/bounds.h"

typedef struct fill_job {
    const rdli_mesh *mesh;
    const rdli_motion *motion;
    rdli_boxes *boxes;
    bool everything; /* also boxes of elements without an awake vertex */
    double slack[3]; /* 2^-51 where there is a shift */
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

static float rounded_down(double x)
{
    float f = (float)least(largest(x, -(double)FLT_MAX), (double)FLT_MAX);
    f = f - fabsf(f) * 0x1p-23f - FLT_TRUE_MIN;
    return f < -FLT_MAX ? -FLT_MAX : f;
}

static float rounded_up(double x)
{
    return -rounded_down(-x);
}

static rdl_box vertex_box(const fill_job *job, uint32_t v)
{
    const double *start = job->motion->start[v], *end = job->motion->end[v], half = job->mesh->vertex_half[v];
    rdl_box box;
    for (unsigned k = 0; k < 3; k++) {
        const double there = least(largest(end[k] - job->boxes->shift[k], -DBL_MAX), DBL_MAX);
        const double slack = fabs(there) * job->slack[k];
        box.lo[k] = rounded_down(least(start[k], there - slack) - half);
        box.hi[k] = rounded_up(largest(start[k], there + slack) + half);
    }
    return box;
}

/* half >= half of each vertex. */
static rdl_box element_box(const fill_job *job, const uint32_t *vertices, unsigned count, double half)
{
    rdl_box box = {{FLT_MAX, FLT_MAX, FLT_MAX}, {-FLT_MAX, -FLT_MAX, -FLT_MAX}};
    for (unsigned i = 0; i < count; i++) {
        rdl_box own = job->boxes->vertices[vertices[i]];
        const double vertex_half = job->mesh->vertex_half[vertices[i]];
        if (half != vertex_half) {
            const double more = (half - vertex_half) * (1 + 0x1p-50); /* outweighs the rounding of the difference */
            for (unsigned k = 0; k < 3; k++) {
                own.lo[k] = rounded_down((double)own.lo[k] - more);
                own.hi[k] = rounded_up((double)own.hi[k] + more);
            }
        }
        for (unsigned k = 0; k < 3; k++) {
            box.lo[k] = own.lo[k] < box.lo[k] ? own.lo[k] : box.lo[k];
            box.hi[k] = own.hi[k] > box.hi[k] ? own.hi[k] : box.hi[k];
        }
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

/* All vertices: that costs little, and shows whether a sleeping one has moved after all. */
static void fill_vertices(void *data, size_t index, unsigned worker)
{
    (void)worker;
    fill_job *job = data;
    const uint8_t *awake = job->motion->awake;
    unsigned surprise = 0;
    for (uint32_t v = (uint32_t)(index * BLOCK), end = block_end(index, job->mesh->vertex_count); v < end; v++) {
        const rdl_box box = vertex_box(job, v);
        if (awake != NULL && awake[v] == 0)
            surprise |= memcmp(&box, &job->boxes->vertices[v], sizeof box) != 0;
        job->boxes->vertices[v] = box;
    }
    if (surprise)
        __atomic_store_n(&job->everything, true, __ATOMIC_RELAXED);
}

static bool wanted(const fill_job *job, const uint32_t *vertices, unsigned count)
{
    unsigned any = job->everything;
    for (unsigned i = 0; !job->everything && i < count; i++)
        any |= job->motion->awake[vertices[i]];
    return any != 0;
}

/* Blocks of edges, then of triangles, in one loop. */
static void fill_elements(void *data, size_t index, unsigned worker)
{
    (void)worker;
    const fill_job *job = data;
    const rdli_mesh *mesh = job->mesh;
    if (index < blocks(mesh->edge_count)) {
        for (uint32_t i = (uint32_t)(index * BLOCK), end = block_end(index, mesh->edge_count); i < end; i++)
            if (wanted(job, mesh->edges[i], 2))
                job->boxes->edges[i] = element_box(job, mesh->edges[i], 2, mesh->edge_half[i]);
        return;
    }
    index -= blocks(mesh->edge_count);
    for (uint32_t i = (uint32_t)(index * BLOCK), end = block_end(index, mesh->triangle_count); i < end; i++)
        if (wanted(job, mesh->triangles[i], 3))
            job->boxes->triangles[i] = element_box(job, mesh->triangles[i], 3, mesh->triangle_half[i]);
}

enum { SAMPLES = 1024 };

/* The number in the middle of x, in order of size; x is put in some order. Selection after Hoare 1961. */
static double middle_of(double *x, size_t count)
{
    ptrdiff_t lo = 0, hi = (ptrdiff_t)count - 1;
    const ptrdiff_t middle = (ptrdiff_t)(count / 2);
    while (lo < hi) {
        const double pivot = x[lo + (hi - lo) / 2];
        ptrdiff_t i = lo, j = hi;
        while (i <= j) {
            while (x[i] < pivot)
                i++;
            while (pivot < x[j])
                j--;
            if (i <= j) {
                const double swapped = x[i];
                x[i++] = x[j];
                x[j--] = swapped;
            }
        }
        if (middle <= j)
            hi = j;
        else if (middle >= i)
            lo = i;
        else
            break;
    }
    return x[middle];
}

/* The median of the displacements along axis k, where that leaves at most half of them; else nothing. A sample of the vertices
 * tells: any shift is right, a good one saves time. */
static double common_motion(const rdli_mesh *mesh, const rdli_motion *motion, unsigned k)
{
    double x[SAMPLES] = {0}, before = 0, after = 0;
    const size_t count = mesh->vertex_count < SAMPLES ? mesh->vertex_count : SAMPLES;
    for (size_t i = 0; i < count; i++) {
        const size_t v = i * mesh->vertex_count / count;
        x[i] = motion->end[v][k] - motion->start[v][k];
    }
    if (count == 0)
        return 0;
    const double shift = middle_of(x, count);
    for (size_t i = 0; i < count; i++) {
        before += fabs(x[i]);
        after += fabs(x[i] - shift);
    }
    return isfinite(shift) && after <= 0.5 * before ? shift : 0;
}

void rdli_bounds_fill(const rdli_mesh *mesh, const rdli_motion *motion, rdli_workers *workers, rdli_boxes *boxes)
{
    fill_job job = {mesh, motion, boxes, motion->awake == NULL, {0}};
    for (unsigned k = 0; k < 3; k++) {
        if (motion->awake == NULL)
            boxes->shift[k] = common_motion(mesh, motion, k);
        job.slack[k] = boxes->shift[k] == 0 ? 0 : 0x1p-51;
    }
    rdli_parallel_for(workers, blocks(mesh->vertex_count), fill_vertices, &job);
    rdli_parallel_for(workers, blocks(mesh->edge_count) + blocks(mesh->triangle_count), fill_elements, &job);
}
