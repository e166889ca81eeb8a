/* broad/lanes_avx2.h: eight lanes in AVX2. Included by kernels_avx2.c only; see lanes_portable.h for what each does. */
#ifndef RDLI_LANES_H
#define RDLI_LANES_H

#include "broad/kernels.h"

#include <immintrin.h>

#define LANES_KERNELS rdli_kernels_avx2

typedef struct lanes_pack {
    __m256 lo[3], hi[3];
} lanes_pack;

static inline lanes_pack lanes_load(const rdli_pack *pack)
{
    lanes_pack eight;
    for (unsigned k = 0; k < 3; k++) {
        eight.lo[k] = _mm256_load_ps(pack->lo[k]);
        eight.hi[k] = _mm256_load_ps(pack->hi[k]);
    }
    return eight;
}

static inline unsigned lanes_overlap(const rdli_pack *pack, unsigned i, lanes_pack eight)
{
    __m256 x = _mm256_and_ps(_mm256_cmp_ps(_mm256_broadcast_ss(&pack->lo[0][i]), eight.hi[0], _CMP_LE_OQ),
                             _mm256_cmp_ps(eight.lo[0], _mm256_broadcast_ss(&pack->hi[0][i]), _CMP_LE_OQ));
    __m256 y = _mm256_and_ps(_mm256_cmp_ps(_mm256_broadcast_ss(&pack->lo[1][i]), eight.hi[1], _CMP_LE_OQ),
                             _mm256_cmp_ps(eight.lo[1], _mm256_broadcast_ss(&pack->hi[1][i]), _CMP_LE_OQ));
    __m256 z = _mm256_and_ps(_mm256_cmp_ps(_mm256_broadcast_ss(&pack->lo[2][i]), eight.hi[2], _CMP_LE_OQ),
                             _mm256_cmp_ps(eight.lo[2], _mm256_broadcast_ss(&pack->hi[2][i]), _CMP_LE_OQ));
    return (unsigned)_mm256_movemask_ps(_mm256_and_ps(x, _mm256_and_ps(y, z)));
}

static inline __m256i lanes_ids(const uint32_t *eight)
{
    return _mm256_loadu_si256((const __m256i *)(const void *)eight);
}

static inline unsigned lanes_equal(uint32_t value, const uint32_t *eight)
{
    __m256i equal = _mm256_cmpeq_epi32(_mm256_set1_epi32((int)value), lanes_ids(eight));
    return (unsigned)_mm256_movemask_ps(_mm256_castsi256_ps(equal));
}

static inline unsigned lanes_within(const uint32_t *eight, uint32_t lo, uint32_t hi)
{
    __m256i ids = lanes_ids(eight); /* all below 2^31, so signed comparisons serve */
    __m256i below = _mm256_cmpgt_epi32(_mm256_set1_epi32((int)lo), ids);
    __m256i inside = _mm256_andnot_si256(below, _mm256_cmpgt_epi32(_mm256_set1_epi32((int)hi), ids));
    return (unsigned)_mm256_movemask_ps(_mm256_castsi256_ps(inside));
}

enum { LANES_SORTED, LANES_A_FIRST, LANES_B_FIRST };

static inline rdli_pair *lanes_put(rdli_pair *to, uint32_t id, const uint32_t *ids, unsigned mask, int order)
{
    /* The places of the set bits of mask, lowest first: pext of the bytes 0..7. */
    uint64_t places = _pext_u64(0x0706050403020100u, _pdep_u64(mask, 0x0101010101010101u) * 0xFF);
    __m256i others = _mm256_permutevar8x32_epi32(lanes_ids(ids), _mm256_cvtepu8_epi32(_mm_cvtsi64_si128((long long)places)));
    __m256i own = _mm256_set1_epi32((int)id), first, second;
    if (order == LANES_SORTED) {
        first = _mm256_min_epu32(own, others);
        second = _mm256_max_epu32(own, others);
    } else {
        first = order == LANES_A_FIRST ? own : others;
        second = order == LANES_A_FIRST ? others : own;
    }
    __m256i low = _mm256_unpacklo_epi32(first, second), high = _mm256_unpackhi_epi32(first, second);
    _mm256_storeu_si256((__m256i *)(void *)to, _mm256_permute2x128_si256(low, high, 0x20));
    _mm256_storeu_si256((__m256i *)(void *)(to + 4), _mm256_permute2x128_si256(low, high, 0x31));
    return to + _mm_popcnt_u32(mask);
}

/* Four rows (a b c d) per 128-bit half become four columns. */
static inline void lanes_transpose(__m256 rows[4])
{
    __m256 t0 = _mm256_unpacklo_ps(rows[0], rows[1]), t1 = _mm256_unpacklo_ps(rows[2], rows[3]);
    __m256 t2 = _mm256_unpackhi_ps(rows[0], rows[1]), t3 = _mm256_unpackhi_ps(rows[2], rows[3]);
    rows[0] = _mm256_shuffle_ps(t0, t1, 0x44);
    rows[1] = _mm256_shuffle_ps(t0, t1, 0xEE);
    rows[2] = _mm256_shuffle_ps(t2, t3, 0x44);
    rows[3] = _mm256_shuffle_ps(t2, t3, 0xEE);
}

static inline double lanes_sum(__m128 first_three)
{
    float v[4];
    _mm_storeu_ps(v, first_three);
    return (double)v[0] + (double)v[1] + (double)v[2];
}

static inline double lanes_gather(const rdl_box *boxes, const uint32_t *elements, rdli_pack *pack, rdli_pack *above,
                                  unsigned place)
{
    __m256 front[4], back[4]; /* lo.x lo.y lo.z hi.x, and lo.z hi.x hi.y hi.z, of boxes i and i + 4 */
    for (unsigned i = 0; i < 4; i++) {
        const rdl_box *low = &boxes[elements[i]], *high = &boxes[elements[i + 4]];
        front[i] = _mm256_insertf128_ps(_mm256_castps128_ps256(_mm_loadu_ps(low->lo)), _mm_loadu_ps(high->lo), 1);
        back[i] = _mm256_insertf128_ps(_mm256_castps128_ps256(_mm_loadu_ps(low->lo + 2)), _mm_loadu_ps(high->lo + 2), 1);
    }
    __m256 lo = _mm256_min_ps(_mm256_min_ps(front[0], front[1]), _mm256_min_ps(front[2], front[3]));
    __m256 hi = _mm256_max_ps(_mm256_max_ps(back[0], back[1]), _mm256_max_ps(back[2], back[3]));
    __m128 least = _mm_min_ps(_mm256_castps256_ps128(lo), _mm256_extractf128_ps(lo, 1));
    __m128 most = _mm_max_ps(_mm256_castps256_ps128(hi), _mm256_extractf128_ps(hi, 1));
    float low[4], high[4];
    _mm_storeu_ps(low, least);
    _mm_storeu_ps(high, most);
    for (unsigned k = 0; k < 3; k++) {
        above->lo[k][place] = low[k];
        above->hi[k][place] = high[k + 1];
    }
    lanes_transpose(front);
    lanes_transpose(back);
    for (unsigned k = 0; k < 3; k++) {
        _mm256_store_ps(pack->lo[k], front[k]);
        _mm256_store_ps(pack->hi[k], back[k + 1]);
    }
    __m256 extents = _mm256_add_ps(_mm256_sub_ps(back[1], front[0]),
                                   _mm256_add_ps(_mm256_sub_ps(back[2], front[1]), _mm256_sub_ps(back[3], front[2])));
    float own[8];
    _mm256_storeu_ps(own, extents);
    double inner = 0;
    for (unsigned i = 0; i < RDLI_WIDE; i++)
        inner += (double)own[i];
    return RDLI_WIDE * lanes_sum(_mm_sub_ps(_mm_shuffle_ps(most, most, 0x39), least)) - inner;
}

static inline float lanes_least(__m256 v)
{
    __m128 m = _mm_min_ps(_mm256_castps256_ps128(v), _mm256_extractf128_ps(v, 1));
    m = _mm_min_ps(m, _mm_movehl_ps(m, m));
    return _mm_cvtss_f32(_mm_min_ss(m, _mm_shuffle_ps(m, m, 1)));
}

static inline float lanes_most(__m256 v)
{
    __m128 m = _mm_max_ps(_mm256_castps256_ps128(v), _mm256_extractf128_ps(v, 1));
    m = _mm_max_ps(m, _mm_movehl_ps(m, m));
    return _mm_cvtss_f32(_mm_max_ss(m, _mm_shuffle_ps(m, m, 1)));
}

static inline void lanes_bound(const rdli_pack *pack, rdli_pack *above, unsigned place)
{
    for (unsigned k = 0; k < 3; k++) {
        above->lo[k][place] = lanes_least(_mm256_load_ps(pack->lo[k]));
        above->hi[k][place] = lanes_most(_mm256_load_ps(pack->hi[k]));
    }
}

enum { LANES_RANKED = 64 };
static inline void lanes_rank(uint32_t *ids, size_t count, rdli_pair *pairs)
{
    uint32_t rank[LANES_RANKED];
    for (size_t b = 0; b < count; b += RDLI_WIDE) {
        __m256i own = lanes_ids(ids + b), sum = _mm256_setzero_si256();
        for (size_t j = 0; j < count; j++) /* a comparison that holds gives -1 */
            sum = _mm256_sub_epi32(sum, _mm256_cmpgt_epi32(own, _mm256_set1_epi32((int)ids[j])));
        _mm256_storeu_si256((__m256i *)(void *)(rank + b), sum);
    }
    for (size_t i = 0; i < count; i++)
        pairs[rank[i]].second = ids[i];
}

#endif
