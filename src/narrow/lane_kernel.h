/* narrow/lane_kernel.h: vectors of LANE_WIDTH doubles, one pair to a lane. Included once per instruction set, with LANE_WIDTH set;
 * inside narrow only.
 *
 * Every lane does the same operations in the same order whatever the width, so all variants give the same bits. The only
 * choices are selections by comparisons. */
#include "narrow/filter.h"
#include "narrow/lanes.h"

#if defined(__x86_64__)
#include <immintrin.h>
#endif

static_assert(LANE_WIDTH == 2 || LANE_WIDTH == 4, "four lanes are one vector of AVX2, or two halves");

typedef double vec __attribute__((vector_size(8 * LANE_WIDTH)));
typedef int64_t bits __attribute__((vector_size(8 * LANE_WIDTH)));

#define LANE_INLINE static inline __attribute__((always_inline, unused))

/* One unit of 2^-52 per rounding holds in every rounding mode. */
#define UNIT 0x1p-52

typedef struct vec3 {
    vec c[3];
} vec3;

/* Difference vectors as in rdli_frame. */
typedef struct frames {
    vec3 w, u, v;
} frames;

/* a where `which` is all ones, b where it is 0. */
LANE_INLINE vec pick(bits which, vec a, vec b)
{
#if defined(__x86_64__) && LANE_WIDTH == 4
    return (vec)_mm256_blendv_pd((__m256d)b, (__m256d)a, (__m256d)which);
#else
    return (vec)((which & (bits)a) | (~which & (bits)b));
#endif
}

LANE_INLINE vec absolute(vec a)
{
    return (vec)((bits)a & INT64_MAX);
}

LANE_INLINE vec larger(vec a, vec b)
{
#if defined(__x86_64__) && LANE_WIDTH == 4
    return (vec)_mm256_max_pd((__m256d)a, (__m256d)b);
#elif defined(__x86_64__) && LANE_WIDTH == 2
    return (vec)_mm_max_pd((__m128d)a, (__m128d)b);
#else
    return pick(a > b, a, b);
#endif
}

LANE_INLINE vec smaller(vec a, vec b)
{
#if defined(__x86_64__) && LANE_WIDTH == 4
    return (vec)_mm256_min_pd((__m256d)a, (__m256d)b);
#elif defined(__x86_64__) && LANE_WIDTH == 2
    return (vec)_mm_min_pd((__m128d)a, (__m128d)b);
#else
    return pick(a < b, a, b);
#endif
}

LANE_INLINE vec root(vec a)
{
#if defined(__x86_64__) && LANE_WIDTH == 4
    return (vec)_mm256_sqrt_pd((__m256d)a);
#elif defined(__x86_64__) && LANE_WIDTH == 2
    return (vec)_mm_sqrt_pd((__m128d)a);
#else
    for (int i = 0; i < LANE_WIDTH; i++)
        a[i] = sqrt(a[i]);
    return a;
#endif
}

/* One bit per lane. */
LANE_INLINE unsigned mask_of(bits a)
{
#if defined(__x86_64__) && LANE_WIDTH == 4
    return (unsigned)_mm256_movemask_pd((__m256d)a);
#elif defined(__x86_64__) && LANE_WIDTH == 2
    return (unsigned)_mm_movemask_pd((__m128d)a);
#else
    unsigned mask = 0;
    for (int i = 0; i < LANE_WIDTH; i++)
        mask |= (unsigned)(a[i] & 1) << i;
    return mask;
#endif
}

LANE_INLINE vec all(double x)
{
#if LANE_WIDTH == 4
    return (vec){x, x, x, x};
#else
    return (vec){x, x};
#endif
}

LANE_INLINE vec load(const double *from)
{
    vec a;
    memcpy(&a, from, sizeof a);
    return a;
}

LANE_INLINE void store(vec a, double *to)
{
    memcpy(to, &a, sizeof a);
}

LANE_INLINE vec dot(const vec3 *a, const vec3 *b)
{
    return a->c[0] * b->c[0] + a->c[1] * b->c[1] + a->c[2] * b->c[2];
}

/* Component k of a x b. */
LANE_INLINE vec cross(const vec3 *a, const vec3 *b, int k)
{
    int i = (k + 1) % 3, j = (k + 2) % 3;
    return a->c[i] * b->c[j] - a->c[j] * b->c[i];
}

LANE_INLINE vec3 minus(const vec3 *a, const vec3 *b)
{
    return (vec3){{a->c[0] - b->c[0], a->c[1] - b->c[1], a->c[2] - b->c[2]}};
}

LANE_INLINE vec3 negative(const vec3 *a)
{
    return (vec3){{-a->c[0], -a->c[1], -a->c[2]}};
}

LANE_INLINE vec3 choose(bits which, const vec3 *a, const vec3 *b)
{
    return (vec3){{pick(which, a->c[0], b->c[0]), pick(which, a->c[1], b->c[1]), pick(which, a->c[2], b->c[2])}};
}

LANE_INLINE vec3 mixed(const vec3 *a, const vec3 *b, vec s, vec t)
{
    vec3 m;
    for (int k = 0; k < 3; k++)
        m.c[k] = s * a->c[k] + t * b->c[k];
    return m;
}

/* As rdli_frame_mix. */
LANE_INLINE frames frames_at(const frames at[2], vec t)
{
    vec s = 1 - t;
    return (frames){mixed(&at[0].w, &at[1].w, s, t), mixed(&at[0].u, &at[1].u, s, t), mixed(&at[0].v, &at[1].v, s, t)};
}

LANE_INLINE vec largest_of(vec size, const vec3 *a)
{
    return larger(larger(size, absolute(a->c[0])), larger(absolute(a->c[1]), absolute(a->c[2])));
}

LANE_INLINE vec frames_size(const frames *f)
{
    return largest_of(largest_of(largest_of(all(0), &f->w), &f->u), &f->v);
}

/* Positions of the lanes' pairs. */
typedef struct points {
    vec3 x[2][4];
} points;

/* Two neighbouring doubles of each lane's row: a transposition. */
LANE_INLINE void load_two(const double *const from[LANE_WIDTH], int place, vec *first, vec *second)
{
#if LANE_WIDTH == 4
    __m256d even = _mm256_castpd128_pd256(_mm_loadu_pd(from[0] + place));
    __m256d odd = _mm256_castpd128_pd256(_mm_loadu_pd(from[1] + place));
    even = _mm256_insertf128_pd(even, _mm_loadu_pd(from[2] + place), 1);
    odd = _mm256_insertf128_pd(odd, _mm_loadu_pd(from[3] + place), 1);
    *first = (vec)_mm256_unpacklo_pd(even, odd);
    *second = (vec)_mm256_unpackhi_pd(even, odd);
#else
    *first = (vec){from[0][place], from[1][place]};
    *second = (vec){from[0][place + 1], from[1][place + 1]};
#endif
}

LANE_INLINE void store_two(vec first, vec second, double *const to[LANE_WIDTH], int place)
{
#if LANE_WIDTH == 4
    __m256d even = _mm256_unpacklo_pd((__m256d)first, (__m256d)second);
    __m256d odd = _mm256_unpackhi_pd((__m256d)first, (__m256d)second);
    _mm_storeu_pd(to[0] + place, _mm256_castpd256_pd128(even));
    _mm_storeu_pd(to[1] + place, _mm256_castpd256_pd128(odd));
    _mm_storeu_pd(to[2] + place, _mm256_extractf128_pd(even, 1));
    _mm_storeu_pd(to[3] + place, _mm256_extractf128_pd(odd, 1));
#else
    for (int i = 0; i < LANE_WIDTH; i++) {
        to[i][place] = first[i];
        to[i][place + 1] = second[i];
    }
#endif
}

LANE_INLINE void load_points(const rdli_quad *quad, int half, points *p)
{
    vec *value = &p->x[0][0].c[0];
    const double *from[LANE_WIDTH];
    for (int i = 0; i < LANE_WIDTH; i++)
        from[i] = (const double *)quad->motion[half + i];
    for (int place = 0; place < 24; place += 2)
        load_two(from, place, &value[place], &value[place + 1]);
}

LANE_INLINE frames frames_of(int kind, const vec3 x[4])
{
    bool edges = kind == RDL_EDGE_EDGE;
    return (frames){minus(&x[edges ? 2 : 0], &x[edges ? 0 : 1]), minus(&x[edges ? 1 : 2], &x[edges ? 0 : 1]),
        minus(&x[3], &x[edges ? 2 : 1])};
}

/* Least projection of the control points at one end, from those of w, u, v. */
LANE_INLINE vec least(int kind, vec w, vec u, vec v)
{
    if (kind == RDL_POINT_TRIANGLE)
        return w - larger(larger(u, v), all(0));
    return smaller(u, all(0)) - w - larger(v, all(0));
}
