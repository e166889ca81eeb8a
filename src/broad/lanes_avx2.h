/* broad/lanes_avx2.h: eight lanes in AVX2. Included by kernels_avx2.c only; see lanes_portable.h for what each does. */
#ifndef RDLI_LANES_H
#define RDLI_LANES_H

#include "broad/kernels.h"

#include <immintrin.h>

#define LANES_KERNELS rdli_kernels_avx2

typedef struct lanes_box {
    __m256 lo[3], hi[3];
} lanes_box;

static inline lanes_box lanes_spread(const rdli_pack *pack, unsigned i)
{
    lanes_box box;
    for (unsigned k = 0; k < 3; k++) {
        box.lo[k] = _mm256_broadcast_ss(&pack->lo[k][i]);
        box.hi[k] = _mm256_broadcast_ss(&pack->hi[k][i]);
    }
    return box;
}

static inline __m256 lanes_overlap_axis(__m256 lo, __m256 hi, const float *other_lo, const float *other_hi)
{
    return _mm256_and_ps(_mm256_cmp_ps(lo, _mm256_loadu_ps(other_hi), _CMP_LE_OQ),
                         _mm256_cmp_ps(hi, _mm256_loadu_ps(other_lo), _CMP_GE_OQ));
}

static inline unsigned lanes_overlap(lanes_box box, const rdli_pack *pack)
{
    __m256 x = lanes_overlap_axis(box.lo[0], box.hi[0], pack->lo[0], pack->hi[0]);
    __m256 y = lanes_overlap_axis(box.lo[1], box.hi[1], pack->lo[1], pack->hi[1]);
    __m256 z = lanes_overlap_axis(box.lo[2], box.hi[2], pack->lo[2], pack->hi[2]);
    return (unsigned)_mm256_movemask_ps(_mm256_and_ps(x, _mm256_and_ps(y, z)));
}

static inline unsigned lanes_overlap_listed(lanes_box box, const rdli_list *list, size_t at)
{
    __m256 x = lanes_overlap_axis(box.lo[0], box.hi[0], list->lo[0] + at, list->hi[0] + at);
    __m256 y = lanes_overlap_axis(box.lo[1], box.hi[1], list->lo[1] + at, list->hi[1] + at);
    __m256 z = lanes_overlap_axis(box.lo[2], box.hi[2], list->lo[2] + at, list->hi[2] + at);
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

/* Ids are below 2^31, so signed comparisons serve. */
static inline unsigned lanes_above(const uint32_t *eight, uint32_t value)
{
    __m256i above = _mm256_cmpgt_epi32(lanes_ids(eight), _mm256_set1_epi32((int)value));
    return (unsigned)_mm256_movemask_ps(_mm256_castsi256_ps(above));
}

/* For every mask the places of its set bits, lowest first, a byte each. */
#define BIT(m, i) ((uint64_t)((m) >> (i)) & 1)
#define BELOW_2(m) (BIT(m, 0) + BIT(m, 1))
#define BELOW_4(m) (BELOW_2(m) + BIT(m, 2) + BIT(m, 3))
#define BELOW_6(m) (BELOW_4(m) + BIT(m, 4) + BIT(m, 5))
#define PLACE(m, i, below) (BIT(m, i) * (uint64_t)(i) << 8 * (below))
#define ENTRY(m)                                                                                                   \
    (PLACE(m, 1, BIT(m, 0)) | PLACE(m, 2, BELOW_2(m)) | PLACE(m, 3, BELOW_2(m) + BIT(m, 2)) | PLACE(m, 4, BELOW_4(m)) | \
     PLACE(m, 5, BELOW_4(m) + BIT(m, 4)) | PLACE(m, 6, BELOW_6(m)) | PLACE(m, 7, BELOW_6(m) + BIT(m, 6)))
#define ENTRIES_4(m) ENTRY(m), ENTRY((m) + 1), ENTRY((m) + 2), ENTRY((m) + 3)
#define ENTRIES_16(m) ENTRIES_4(m), ENTRIES_4((m) + 4), ENTRIES_4((m) + 8), ENTRIES_4((m) + 12)
#define ENTRIES_64(m) ENTRIES_16(m), ENTRIES_16((m) + 16), ENTRIES_16((m) + 32), ENTRIES_16((m) + 48)
static const uint64_t lanes_place_table[256] = {ENTRIES_64(0), ENTRIES_64(64), ENTRIES_64(128), ENTRIES_64(192)};
#undef ENTRIES_64
#undef ENTRIES_16
#undef ENTRIES_4
#undef ENTRY
#undef PLACE
#undef BELOW_6
#undef BELOW_4
#undef BELOW_2
#undef BIT

/* A table rather than pdep and pext: it is as fast where those are fast, and many processors do them in microcode. */
static inline __m256i lanes_places(unsigned mask)
{
    return _mm256_cvtepu8_epi32(_mm_loadl_epi64((const __m128i *)(const void *)&lanes_place_table[mask]));
}

static inline uint32_t *lanes_compress(uint32_t *to, const uint32_t *ids, unsigned mask)
{
    _mm256_storeu_si256((__m256i *)(void *)to, _mm256_permutevar8x32_epi32(lanes_ids(ids), lanes_places(mask)));
    return to + _mm_popcnt_u32(mask);
}

static inline void lanes_pick(float *to, const float *from, __m256i places)
{
    _mm256_storeu_ps(to, _mm256_permutevar8x32_ps(_mm256_loadu_ps(from), places));
}

static inline void lanes_pick_ids(uint32_t *to, const uint32_t *from, __m256i places)
{
    _mm256_storeu_si256((__m256i *)(void *)to, _mm256_permutevar8x32_epi32(lanes_ids(from), places));
}

static inline void lanes_append_children(rdli_list *list, size_t count, const rdli_pack *pack, uint32_t first,
                                         const uint32_t *highest, unsigned mask)
{
    const __m256i places = lanes_places(mask);
    for (unsigned k = 0; k < 3; k++) {
        lanes_pick(list->lo[k] + count, pack->lo[k], places);
        lanes_pick(list->hi[k] + count, pack->hi[k], places);
    }
    lanes_pick_ids(list->highest + count, highest, places);
    _mm256_storeu_si256((__m256i *)(void *)(list->packs + count), _mm256_add_epi32(_mm256_set1_epi32((int)first), places));
}

static inline void lanes_append_listed(rdli_list *list, size_t count, const rdli_list *from, size_t at, unsigned mask)
{
    const __m256i places = lanes_places(mask);
    for (unsigned k = 0; k < 3; k++) {
        lanes_pick(list->lo[k] + count, from->lo[k] + at, places);
        lanes_pick(list->hi[k] + count, from->hi[k] + at, places);
    }
    lanes_pick_ids(list->packs + count, from->packs + at, places);
    lanes_pick_ids(list->highest + count, from->highest + at, places);
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

enum { LANES_REALS = 8 };
typedef __m256 lanes_real;

static inline lanes_real lanes_add(lanes_real a, lanes_real b)
{
    return _mm256_add_ps(a, b);
}

static inline lanes_real lanes_sub(lanes_real a, lanes_real b)
{
    return _mm256_sub_ps(a, b);
}

static inline lanes_real lanes_mul(lanes_real a, lanes_real b)
{
    return _mm256_mul_ps(a, b);
}

static inline lanes_real lanes_div(lanes_real a, lanes_real b)
{
    return _mm256_div_ps(a, b);
}

static inline lanes_real lanes_min(lanes_real a, lanes_real b)
{
    return _mm256_min_ps(a, b);
}

static inline lanes_real lanes_max(lanes_real a, lanes_real b)
{
    return _mm256_max_ps(a, b);
}

static inline lanes_real lanes_all(float x)
{
    return _mm256_set1_ps(x);
}

static inline lanes_real lanes_abs(lanes_real a)
{
    return _mm256_andnot_ps(_mm256_set1_ps(-0.0f), a);
}

static inline unsigned lanes_less(lanes_real a, lanes_real b)
{
    return (unsigned)_mm256_movemask_ps(_mm256_cmp_ps(a, b, _CMP_LT_OQ));
}

static inline lanes_real lanes_choose_less(lanes_real a, lanes_real b, lanes_real x, lanes_real y)
{
    return _mm256_blendv_ps(y, x, _mm256_cmp_ps(a, b, _CMP_LT_OQ));
}

typedef __m256i lanes_bits;

static inline lanes_bits lanes_same(int32_t x)
{
    return _mm256_set1_epi32(x);
}

static inline lanes_real lanes_as_real(lanes_bits bits)
{
    return _mm256_castsi256_ps(bits);
}

static inline lanes_real lanes_difference(lanes_bits a, lanes_bits b)
{
    return _mm256_cvtepi32_ps(_mm256_sub_epi32(a, b));
}

static inline __m256 lanes_two_halves(const int32_t *low, const int32_t *high)
{
    __m256i both = _mm256_castsi128_si256(_mm_load_si128((const __m128i *)(const void *)low));
    return _mm256_castsi256_ps(_mm256_inserti128_si256(both, _mm_load_si128((const __m128i *)(const void *)high), 1));
}

static inline void lanes_records(const rdli_record *records, const uint32_t *vertices, size_t stride, const uint32_t *ids,
                                 lanes_bits members[8])
{
    __m256 start[4], end[4]; /* of ids i and i + 4, one in each half */
    for (unsigned i = 0; i < 4; i++) {
        const rdli_record *low = &records[vertices[stride * ids[i]]], *high = &records[vertices[stride * ids[i + 4]]];
        start[i] = lanes_two_halves(low->start, high->start);
        end[i] = lanes_two_halves(low->end, high->end);
    }
    lanes_transpose(start);
    lanes_transpose(end);
    for (unsigned k = 0; k < 4; k++) {
        members[k] = _mm256_castps_si256(start[k]);
        members[4 + k] = _mm256_castps_si256(end[k]);
    }
}

enum { LANES_RANKED = 64 };

/* How many of ids[0 .. count - 1] are below each of own[0 .. 8 vectors - 1]; vectors is a constant in every call. A
 * comparison that holds gives -1. */
static inline __attribute__((always_inline)) void lanes_rank_some(const uint32_t *own, const unsigned vectors,
                                                                  const uint32_t *ids, size_t count, uint32_t *rank)
{
    const __m256i own_0 = lanes_ids(own), own_1 = lanes_ids(own + 8);
    const __m256i own_2 = vectors > 2 ? lanes_ids(own + 16) : own_1, own_3 = vectors > 3 ? lanes_ids(own + 24) : own_1;
    __m256i sum_0 = _mm256_setzero_si256(), sum_1 = sum_0, sum_2 = sum_0, sum_3 = sum_0;
#pragma GCC unroll 4
    for (size_t j = 0; j < count; j++) {
        const __m256i other = _mm256_set1_epi32((int)ids[j]);
        sum_0 = _mm256_sub_epi32(sum_0, _mm256_cmpgt_epi32(own_0, other));
        sum_1 = _mm256_sub_epi32(sum_1, _mm256_cmpgt_epi32(own_1, other));
        if (vectors > 2)
            sum_2 = _mm256_sub_epi32(sum_2, _mm256_cmpgt_epi32(own_2, other));
        if (vectors > 3)
            sum_3 = _mm256_sub_epi32(sum_3, _mm256_cmpgt_epi32(own_3, other));
    }
    _mm256_storeu_si256((__m256i *)(void *)rank, sum_0);
    _mm256_storeu_si256((__m256i *)(void *)(rank + 8), sum_1);
    if (vectors > 2)
        _mm256_storeu_si256((__m256i *)(void *)(rank + 16), sum_2);
    if (vectors > 3)
        _mm256_storeu_si256((__m256i *)(void *)(rank + 24), sum_3);
}

static inline void lanes_rank(uint32_t *ids, size_t count, uint32_t *to)
{
    uint32_t rank[LANES_RANKED];
    size_t done = 0;
    for (; count - done > 24; done += done + 32 < count ? 32 : count - done)
        lanes_rank_some(ids + done, 4, ids, count, rank + done);
    if (count - done > 16)
        lanes_rank_some(ids + done, 3, ids, count, rank + done);
    else if (count - done > 0)
        lanes_rank_some(ids + done, 2, ids, count, rank + done);
    for (size_t i = 0; i < count; i++)
        to[rank[i]] = ids[i];
}

#endif
