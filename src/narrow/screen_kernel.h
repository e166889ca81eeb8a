/* narrow/screen_kernel.h: body of the screen; included once per instruction set with SCREEN_NAME and SCREEN_WIDTH set.
 *
 * Every lane does the same operations in the same order whatever the width, so all variants give the same bits. The only
 * choices are selections by comparisons. */
#include "narrow/filter.h"
#include "narrow/screen.h"

static_assert(RDLI_LANES % SCREEN_WIDTH == 0, "whole vectors");

typedef double vec __attribute__((vector_size(8 * SCREEN_WIDTH)));
typedef int64_t bits __attribute__((vector_size(8 * SCREEN_WIDTH)));

#define SCREEN_INLINE static inline __attribute__((always_inline))

typedef struct vec3 {
    vec c[3];
} vec3;

/* Difference vectors as in rdli_frame, [0] at the start and [1] at the end. */
typedef struct block {
    vec3 w[2], u[2], v[2];
    vec gap, pad;
} block;

SCREEN_INLINE vec pick(bits which, vec a, vec b)
{
    return (vec)((which & (bits)a) | (~which & (bits)b));
}

SCREEN_INLINE vec absolute(vec a)
{
    return (vec)((bits)a & INT64_MAX);
}

SCREEN_INLINE vec larger(vec a, vec b)
{
    return pick(a > b, a, b);
}

SCREEN_INLINE vec smaller(vec a, vec b)
{
    return pick(a < b, a, b);
}

SCREEN_INLINE vec dot(const vec3 *a, const vec3 *b)
{
    return a->c[0] * b->c[0] + a->c[1] * b->c[1] + a->c[2] * b->c[2];
}

SCREEN_INLINE vec load(const double *from)
{
    vec a;
    memcpy(&a, from, sizeof a);
    return a;
}

SCREEN_INLINE vec3 difference(const rdli_lanes *lanes, int half, int end, int i, int j)
{
    vec3 d;
    for (int k = 0; k < 3; k++)
        d.c[k] = load(&lanes->x[12 * end + 3 * i + k][half]) - load(&lanes->x[12 * end + 3 * j + k][half]);
    return d;
}

SCREEN_INLINE block load_block(int kind, const rdli_lanes *lanes, int half)
{
    block b;
    bool edges = kind == RDL_EDGE_EDGE;
    vec size = load(lanes->gap + half) * 0;
    for (int end = 0; end < 2; end++) {
        b.w[end] = difference(lanes, half, end, edges ? 2 : 0, edges ? 0 : 1);
        b.u[end] = difference(lanes, half, end, edges ? 1 : 2, edges ? 0 : 1);
        b.v[end] = difference(lanes, half, end, 3, edges ? 2 : 1);
        for (int k = 0; k < 3; k++)
            size = larger(larger(size, absolute(b.w[end].c[k])), larger(absolute(b.u[end].c[k]), absolute(b.v[end].c[k])));
    }
    b.gap = load(lanes->gap + half);
    /* three rounded vectors, five roundings in a dot product of terms up to size |d|: 3 x 6 x sqrt(3) x 2^-52 < 2^-47 */
    b.pad = 0x1p-47 * size + RDLI_UNDERFLOW;
    return b;
}

/* Least projection of the control points at one end, from those of w, u, v. */
SCREEN_INLINE vec least(int kind, vec w, vec u, vec v)
{
    if (kind == RDL_POINT_TRIANGLE)
        return w - larger(larger(u, v), u * 0);
    return smaller(u, u * 0) - w - larger(v, v * 0);
}

/* All ones where the direction d, or its opposite, separates by more than the gap during the whole motion. */
SCREEN_INLINE bits separates(int kind, const block *b, const vec3 *d)
{
    vec w[2], u[2], v[2];
    for (int end = 0; end < 2; end++) {
        w[end] = dot(&b->w[end], d);
        u[end] = dot(&b->u[end], d);
        v[end] = dot(&b->v[end], d);
    }
    vec one = smaller(least(kind, w[0], u[0], v[0]), least(kind, w[1], u[1], v[1]));
    vec other = smaller(least(kind, -w[0], -u[0], -v[0]), least(kind, -w[1], -u[1], -v[1]));
    vec best = larger(one, other), bound = (b->gap + b->pad) * (b->gap + b->pad) * dot(d, d) * (1 + 0x1p-48);
    return (best > RDLI_UNDERFLOW) & (best * best > bound + RDLI_UNDERFLOW);
}

SCREEN_INLINE vec3 middle(const vec3 a[2])
{
    vec3 m;
    for (int k = 0; k < 3; k++)
        m.c[k] = 0.5 * (a[0].c[k] + a[1].c[k]);
    return m;
}

/* Component k of a x b. */
SCREEN_INLINE vec cross(const vec3 *a, const vec3 *b, int k)
{
    int i = (k + 1) % 3, j = (k + 2) % 3;
    return a->c[i] * b->c[j] - a->c[j] * b->c[i];
}

SCREEN_INLINE bits by_directions(int kind, const block *b)
{
    vec3 w = middle(b->w), u = middle(b->u), v = middle(b->v), n, c;
    for (int k = 0; k < 3; k++) {
        n.c[k] = cross(&u, &v, k);
        c.c[k] = kind == RDL_POINT_TRIANGLE ? 3 * w.c[k] - (u.c[k] + v.c[k]) : 2 * w.c[k] + (v.c[k] - u.c[k]);
    }
    return separates(kind, b, &n) | separates(kind, b, &c);
}

/* All ones where the four coefficients of w . (u x v) have one certified sign. */
SCREEN_INLINE bits by_cubic(const block *b)
{
    vec f[4], size = b->gap * 0;
    for (int i = 0; i < 4; i++)
        f[i] = size;
    for (int k = 0; k < 3; k++) {
        int i = (k + 1) % 3, j = (k + 2) % 3;
        vec n0 = cross(&b->u[0], &b->v[0], k), n2 = cross(&b->u[1], &b->v[1], k), w0 = b->w[0].c[k], w1 = b->w[1].c[k];
        vec n1 = cross(&b->u[0], &b->v[1], k) + cross(&b->u[1], &b->v[0], k); /* twice the middle coefficient */
        f[0] += w0 * n0;
        f[1] += w0 * n1 + w1 * n0; /* three times the coefficient */
        f[2] += w1 * n1 + w0 * n2;
        f[3] += w1 * n2;
        vec ui = larger(absolute(b->u[0].c[i]), absolute(b->u[1].c[i]));
        vec uj = larger(absolute(b->u[0].c[j]), absolute(b->u[1].c[j]));
        vec vi = larger(absolute(b->v[0].c[i]), absolute(b->v[1].c[i]));
        vec vj = larger(absolute(b->v[0].c[j]), absolute(b->v[1].c[j]));
        size += larger(absolute(w0), absolute(w1)) * (ui * vj + uj * vi);
    }
    /* at most three times size in a sum; 3 differences, 2 products, 2 sums in n, 1 + 3 sums: 11 roundings */
    vec bound = size * (64 * 0x1p-52) + RDLI_UNDERFLOW;
    bits plus = (f[0] > bound) & (f[1] > bound) & (f[2] > bound) & (f[3] > bound);
    bits minus = (-f[0] > bound) & (-f[1] > bound) & (-f[2] > bound) & (-f[3] > bound);
    return plus | minus;
}

void SCREEN_NAME(int kind, const rdli_lanes *lanes, uint8_t verdict[RDLI_LANES])
{
    for (int half = 0; half < RDLI_LANES; half += SCREEN_WIDTH) {
        block b = load_block(kind, lanes, half);
        bits apart = kind == RDL_POINT_TRIANGLE ? by_directions(RDL_POINT_TRIANGLE, &b) : by_directions(RDL_EDGE_EDGE, &b);
        bits undecided = ~apart & (b.gap == 0);
        bool ask = false;
        for (int i = 0; i < SCREEN_WIDTH; i++)
            ask = ask || undecided[i];
        bits cubic = undecided;
        if (ask)
            cubic &= by_cubic(&b);
        for (int i = 0; i < SCREEN_WIDTH; i++)
            verdict[half + i] = apart[i] ? RDLI_SCREEN_DIRECTION : ask && cubic[i] ? RDLI_SCREEN_CUBIC : RDLI_SCREEN_OPEN;
    }
}
