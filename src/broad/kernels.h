/* broad/kernels.h: the inner loops, compiled twice from one text: portable and with AVX2. Both give the same results to
 * the last bit, since they only compare, select and move. Included by the broad folder only. */
#ifndef RDLI_KERNELS_H
#define RDLI_KERNELS_H

#include "broad/query.h"

typedef struct rdli_kernels {
    /* Refits level 0 for packs [first, last), or those of them that have a flag in stale (unless that is NULL), writes their
     * boxes into level 1 (or the crown), and returns the sum of the extents that the packs add to the mean of their
     * elements. first is a multiple of 8; so is last, unless it is the end of the level. */
    double (*refit_elements)(rdli_tree *tree, const rdl_box *boxes, const uint8_t *stale, uint32_t first, uint32_t last);
    /* Writes the boxes of the packs [first, last) of `level` > 0 into the level above. */
    void (*refit_inner)(rdli_tree *tree, unsigned level, uint32_t first, uint32_t last);
    /* Finds the pairs of one group (query.h), unless it is done. */
    void (*match_group)(rdli_query *query, uint32_t group, unsigned worker);
} rdli_kernels;

/* vector: use AVX2 where the machine has it. */
const rdli_kernels *rdli_kernels_choose(bool vector);

extern const rdli_kernels rdli_kernels_portable;
#if defined(__x86_64__) && defined(__GNUC__)
#define RDLI_HAVE_AVX2 1
extern const rdli_kernels rdli_kernels_avx2;
#endif

#endif
