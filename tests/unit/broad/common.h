/* tests/unit/broad/common.h: random numbers, random boxes, a counting and failing allocator, collected pairs. */
#ifndef TEST_BROAD_COMMON_H
#define TEST_BROAD_COMMON_H

#include <stdbool.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include "raddle/host.h"
#include "raddle/tree.h"

/* SplitMix64 (Steele, Lea, Flood 2014). */
static inline uint64_t draw_bits(uint64_t *state)
{
    uint64_t z = *state += 0x9E3779B97F4A7C15u;
    z = (z ^ z >> 30) * 0xBF58476D1CE4E5B9u;
    z = (z ^ z >> 27) * 0x94D049BB133111EBu;
    return z ^ z >> 31;
}

/* Uniform in [0, 1). */
static inline double draw(uint64_t *state)
{
    return (double)(draw_bits(state) >> 11) * 0x1p-53;
}

/* Allocator that counts, and fails at call number fail_at (1 = first; 0 = never). */
typedef struct ledger {
    size_t calls, live, live_bytes, fail_at;
} ledger;

static inline void *ledger_allocate(void *user, size_t bytes)
{
    ledger *l = user;
    if (++l->calls == l->fail_at)
        return NULL;
    l->live++;
    l->live_bytes += bytes;
    return aligned_alloc(64, (bytes + 63) / 64 * 64);
}

static inline void ledger_release(void *user, void *memory, size_t bytes)
{
    ledger *l = user;
    l->live--;
    l->live_bytes -= bytes;
    free(memory);
}

static inline rdl_host ledger_host(ledger *l, unsigned threads)
{
    rdl_host host;
    memset(&host, 0, sizeof host);
    host.size = sizeof host;
    host.threads = threads;
    host.user = l;
    host.allocate = ledger_allocate;
    host.release = ledger_release;
    return host;
}

static inline bool boxes_overlap(const rdl_box *a, const rdl_box *b)
{
    for (int k = 0; k < 3; k++)
        if (a->lo[k] > b->hi[k] || b->lo[k] > a->hi[k])
            return false;
    return true;
}

static inline int compare_pairs(const void *x, const void *y)
{
    const uint32_t *a = x, *b = y;
    if (a[0] != b[0])
        return a[0] < b[0] ? -1 : 1;
    return a[1] < b[1] ? -1 : a[1] > b[1];
}

#endif
