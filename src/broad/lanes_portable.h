/* broad/lanes_portable.h: eight lanes in plain C. Included by kernels_portable.c only; lanes_avx2.h is its twin. */
#ifndef RDLI_LANES_H
#define RDLI_LANES_H

#include "broad/kernels.h"

#define LANES_KERNELS rdli_kernels_portable

typedef rdli_pack lanes_pack;

static inline lanes_pack lanes_load(const rdli_pack *pack)
{
    return *pack;
}

/* Bit j: box j of `eight` overlaps box i of pack. Boxes are closed. */
static inline unsigned lanes_overlap(const rdli_pack *pack, unsigned i, lanes_pack eight)
{
    unsigned mask = 0;
    for (unsigned j = 0; j < RDLI_WIDE; j++) {
        bool hit = true;
        for (unsigned k = 0; k < 3; k++)
            hit &= (pack->lo[k][i] <= eight.hi[k][j]) & (eight.lo[k][j] <= pack->hi[k][i]);
        mask |= (unsigned)hit << j;
    }
    return mask;
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

/* Bit j: eight[j] lies in [lo, hi). */
static inline unsigned lanes_within(const uint32_t *eight, uint32_t lo, uint32_t hi)
{
    unsigned mask = 0;
    for (unsigned j = 0; j < RDLI_WIDE; j++)
        mask |= (unsigned)(eight[j] >= lo && eight[j] < hi) << j;
    return mask;
}

/* Appends the children in mask of a level-1 pack to the list, as entries from `count` on; first_child: number of child
 * 0; highest: of the level-0 packs. Writes eight places. */
static inline void lanes_append(rdli_scratch *scratch, size_t count, const rdli_pack *pack, uint32_t first_child,
                                const uint32_t *highest, unsigned mask)
{
    for (; mask != 0; mask &= mask - 1, count++) {
        unsigned i = (unsigned)__builtin_ctz(mask);
        for (unsigned k = 0; k < 3; k++) {
            scratch->list_lo[k][count] = pack->lo[k][i];
            scratch->list_hi[k][count] = pack->hi[k][i];
        }
        scratch->list_packs[count] = first_child + i;
        scratch->list_highest[count] = highest[first_child + i];
    }
}

/* Eight entries of the list. */
static inline rdli_pack lanes_listed(const rdli_scratch *scratch, size_t at)
{
    rdli_pack eight;
    for (unsigned k = 0; k < 3; k++) {
        memcpy(eight.lo[k], scratch->list_lo[k] + at, sizeof eight.lo[k]);
        memcpy(eight.hi[k], scratch->list_hi[k] + at, sizeof eight.hi[k]);
    }
    return eight;
}

/* Bit j: box j of `eight` overlaps entry `entry` of the list. */
static inline unsigned lanes_overlap_entry(const rdli_scratch *scratch, size_t entry, lanes_pack eight)
{
    rdli_pack one;
    for (unsigned k = 0; k < 3; k++) {
        one.lo[k][0] = scratch->list_lo[k][entry];
        one.hi[k][0] = scratch->list_hi[k][entry];
    }
    return lanes_overlap(&one, 0, eight);
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

/* Sorts `count` <= LANES_RANKED distinct ids below 2^31; up to seven ids behind them may be overwritten. */
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
