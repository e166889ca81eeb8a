/* broad/lanes_portable.h: eight lanes in plain C. Included by kernels_portable.c only; lanes_avx2.h is its twin. */
#ifndef RDLI_LANES_H
#define RDLI_LANES_H

#include "broad/kernels.h"

#define LANES_KERNELS rdli_kernels_portable

/* One box, to be tried against eight. */
typedef struct lanes_box {
    float lo[3], hi[3];
} lanes_box;

static inline lanes_box lanes_spread(const rdli_pack *pack, unsigned i)
{
    return (lanes_box){{pack->lo[0][i], pack->lo[1][i], pack->lo[2][i]}, {pack->hi[0][i], pack->hi[1][i], pack->hi[2][i]}};
}

static inline unsigned lanes_overlap_bounds(lanes_box box, const float *const lo[3], const float *const hi[3])
{
    unsigned mask = 0;
    for (unsigned j = 0; j < RDLI_WIDE; j++) {
        bool hit = true;
        for (unsigned k = 0; k < 3; k++)
            hit &= (box.lo[k] <= hi[k][j]) & (lo[k][j] <= box.hi[k]);
        mask |= (unsigned)hit << j;
    }
    return mask;
}

/* Bit j: the box overlaps box j of the pack. Boxes are closed. */
static inline unsigned lanes_overlap(lanes_box box, const rdli_pack *pack)
{
    const float *const lo[3] = {pack->lo[0], pack->lo[1], pack->lo[2]};
    const float *const hi[3] = {pack->hi[0], pack->hi[1], pack->hi[2]};
    return lanes_overlap_bounds(box, lo, hi);
}

/* The same for the entries at .. at + 7 of a list. */
static inline unsigned lanes_overlap_listed(lanes_box box, const rdli_list *list, size_t at)
{
    const float *const lo[3] = {list->lo[0] + at, list->lo[1] + at, list->lo[2] + at};
    const float *const hi[3] = {list->hi[0] + at, list->hi[1] + at, list->hi[2] + at};
    return lanes_overlap_bounds(box, lo, hi);
}

/* Bit j: eight[j] == value. */
static inline unsigned lanes_equal(uint32_t value, const uint32_t *eight)
{
    unsigned mask = 0;
    for (unsigned j = 0; j < RDLI_WIDE; j++)
        mask |= (unsigned)(eight[j] == value) << j;
    return mask;
}

/* Bit j: eight[j] > value. */
static inline unsigned lanes_above(const uint32_t *eight, uint32_t value)
{
    unsigned mask = 0;
    for (unsigned j = 0; j < RDLI_WIDE; j++)
        mask |= (unsigned)(eight[j] > value) << j;
    return mask;
}

/* Appends the children in mask of a level-1 pack to a list of `count` entries; first: number of child 0; highest: of the
 * eight children. Like the next function it may write eight places. */
static inline void lanes_append_children(rdli_list *list, size_t count, const rdli_pack *pack, uint32_t first,
                                         const uint32_t *highest, unsigned mask)
{
    for (; mask != 0; mask &= mask - 1, count++) {
        unsigned i = (unsigned)__builtin_ctz(mask);
        for (unsigned k = 0; k < 3; k++) {
            list->lo[k][count] = pack->lo[k][i];
            list->hi[k][count] = pack->hi[k][i];
        }
        list->packs[count] = first + i;
        list->highest[count] = highest[i];
    }
}

/* Appends the entries in mask of from[at .. at + 7]. */
static inline void lanes_append_listed(rdli_list *list, size_t count, const rdli_list *from, size_t at, unsigned mask)
{
    for (; mask != 0; mask &= mask - 1, count++) {
        size_t i = at + (unsigned)__builtin_ctz(mask);
        for (unsigned k = 0; k < 3; k++) {
            list->lo[k][count] = from->lo[k][i];
            list->hi[k][count] = from->hi[k][i];
        }
        list->packs[count] = from->packs[i];
        list->highest[count] = from->highest[i];
    }
}

/* Writes ids[j] for the bits j of mask, lowest first; returns the place behind. Room for 8 is needed. */
static inline uint32_t *lanes_compress(uint32_t *to, const uint32_t *ids, unsigned mask)
{
    for (; mask != 0; mask &= mask - 1)
        *to++ = ids[__builtin_ctz(mask)];
    return to;
}

static inline void lanes_store_box(rdli_pack *pack, unsigned place, const float lo[3], const float hi[3])
{
    for (unsigned k = 0; k < 3; k++) {
        pack->lo[k][place] = lo[k];
        pack->hi[k][place] = hi[k];
    }
}

/* Loads the boxes of eight elements into a pack, and its bound into place `place` of the pack above. Returns eight times
 * the extent that the bound adds to the mean of the boxes. */
static inline double lanes_gather(const rdl_box *boxes, const uint32_t *elements, rdli_pack *pack, rdli_pack *above,
                                  unsigned place)
{
    float lo[3], hi[3];
    double extent = 0;
    memcpy(lo, boxes[elements[0]].lo, sizeof lo);
    memcpy(hi, boxes[elements[0]].hi, sizeof hi);
    for (unsigned i = 0; i < RDLI_WIDE; i++) {
        const rdl_box *box = &boxes[elements[i]];
        lanes_store_box(pack, i, box->lo, box->hi);
        for (unsigned k = 0; k < 3; k++) {
            lo[k] = box->lo[k] < lo[k] ? box->lo[k] : lo[k];
            hi[k] = box->hi[k] > hi[k] ? box->hi[k] : hi[k];
            extent -= (double)box->hi[k] - (double)box->lo[k];
        }
    }
    lanes_store_box(above, place, lo, hi);
    for (unsigned k = 0; k < 3; k++)
        extent += RDLI_WIDE * ((double)hi[k] - (double)lo[k]);
    return extent;
}

/* The bound of a pack into place `place` of the pack above. */
static inline void lanes_bound(const rdli_pack *pack, rdli_pack *above, unsigned place)
{
    for (unsigned k = 0; k < 3; k++) {
        float lo = pack->lo[k][0], hi = pack->hi[k][0];
        for (unsigned i = 1; i < RDLI_WIDE; i++) {
            lo = pack->lo[k][i] < lo ? pack->lo[k][i] : lo;
            hi = pack->hi[k][i] > hi ? pack->hi[k][i] : hi;
        }
        above->lo[k][place] = lo;
        above->hi[k][place] = hi;
    }
}

/* Floats are handled LANES_REALS at a time: one here, eight in AVX2. Minimum and maximum give the second operand where
 * the comparison fails, also for NaN. */
enum { LANES_REALS = 1 };
typedef float lanes_real;

static inline lanes_real lanes_add(lanes_real a, lanes_real b)
{
    return a + b;
}

static inline lanes_real lanes_sub(lanes_real a, lanes_real b)
{
    return a - b;
}

static inline lanes_real lanes_mul(lanes_real a, lanes_real b)
{
    return a * b;
}

static inline lanes_real lanes_div(lanes_real a, lanes_real b)
{
    return a / b;
}

static inline lanes_real lanes_min(lanes_real a, lanes_real b)
{
    return a < b ? a : b;
}

static inline lanes_real lanes_max(lanes_real a, lanes_real b)
{
    return a > b ? a : b;
}

static inline lanes_real lanes_all(float x)
{
    return x;
}

static inline lanes_real lanes_abs(lanes_real a)
{
    return fabsf(a);
}

/* Bit i: a < b in lane i. */
static inline unsigned lanes_less(lanes_real a, lanes_real b)
{
    return a < b;
}

/* a < b ? x : y. */
static inline lanes_real lanes_choose_less(lanes_real a, lanes_real b, lanes_real x, lanes_real y)
{
    return a < b ? x : y;
}

/* Whole numbers, or floats as they lie in memory. */
typedef int32_t lanes_bits;

static inline lanes_bits lanes_same(int32_t x)
{
    return x;
}

static inline lanes_real lanes_as_real(lanes_bits bits)
{
    lanes_real r;
    memcpy(&r, &bits, sizeof r);
    return r;
}

/* a - b as floats. */
static inline lanes_real lanes_difference(lanes_bits a, lanes_bits b)
{
    return (float)(a - b);
}

/* The eight members of the records of vertices[stride * ids[i]], turned so that lane i belongs to ids[i]. */
static inline void lanes_records(const rdli_record *records, const uint32_t *vertices, size_t stride, const uint32_t *ids,
                                 lanes_bits members[8])
{
    memcpy(members, &records[vertices[stride * ids[0]]], 8 * sizeof(lanes_bits));
}

/* Sorts `count` <= LANES_RANKED distinct ids below 2^31; 31 more places behind them are read. */
enum { LANES_RANKED = 64 };
static inline void lanes_rank(uint32_t *ids, size_t count, uint32_t *to)
{
    for (size_t i = 0; i < count; i++) {
        size_t rank = 0;
        for (size_t j = 0; j < count; j++)
            rank += ids[j] < ids[i];
        to[rank] = ids[i];
    }
}

#endif
