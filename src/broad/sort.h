/* broad/sort.h: the pair list in order. Included by the broad folder only. */
#ifndef RDLI_SORT_H
#define RDLI_SORT_H

#include "broad/kernels.h"

typedef struct rdli_sort {
    rdli_room parted, count_room, scratch_room;
} rdli_sort;

/* Sorts what a sink holds that is closed and not full, by (first, second); first < firsts, second < seconds, no pair
 * twice. *pairs points into the sink and is valid until that is opened again. Linear in the number of pairs, whatever
 * their distribution. Errors: RDL_NO_MEMORY. */
rdl_status rdli_sort_pairs(rdli_memory *memory, rdli_workers *workers, const rdli_kernels *kernels, rdli_sort *sort,
                           rdli_sink *sink, size_t count, uint32_t firsts, uint32_t seconds, const rdli_pair **pairs);
void rdli_sort_release(rdli_memory *memory, rdli_sort *sort);

#endif
