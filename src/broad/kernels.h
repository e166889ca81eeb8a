/* broad/kernels.h: the inner loops, compiled twice from one text: portable and with AVX2. Both give the same results to
 * the last bit, since they only compare, select and move. Included by the broad folder only. */
#ifndef RDLI_KERNELS_H
#define RDLI_KERNELS_H

#include "broad/walk.h"

typedef struct rdli_kernels {
    /* Refits level 0 for packs [first, last), writes their boxes into level 1 (or the crown), and returns the sum of the
     * extents that the packs add to the mean of their elements. first is a multiple of 8; so is last, unless it is the
     * end of the level. */
    double (*refit_elements)(rdli_tree *tree, const rdl_box *boxes, uint32_t first, uint32_t last);
    /* Writes the boxes of the packs [first, last) of `level` > 0 into the level above. */
    void (*refit_inner)(rdli_tree *tree, unsigned level, uint32_t first, uint32_t last);
    /* Appends the visits one level below v; v.level_a + v.level_b > 0. Room for 64 at least. Returns how many. */
    size_t (*expand)(const rdli_walk *walk, rdli_visit v, rdli_visit *children);
    /* Everything below v, in the order of `expand`; pairs go to the walk's sink. */
    void (*walk)(const rdli_walk *walk, rdli_visit v, unsigned worker);
    /* Sorts count > 1 pairs of one first by their seconds. bits: zero, and left zero: a bit set of `words` words, then its
     * summary (bit w: word w is not zero) of words / 64 + 1 words, then the summary of that. */
    void (*sort_row)(rdli_pair *pairs, size_t count, uint64_t *bits, size_t words);
} rdli_kernels;

/* vector: use AVX2 where the machine has it. */
const rdli_kernels *rdli_kernels_choose(bool vector);

extern const rdli_kernels rdli_kernels_portable;
#if defined(__x86_64__) && defined(__GNUC__)
#define RDLI_HAVE_AVX2 1
extern const rdli_kernels rdli_kernels_avx2;
#endif

#endif
