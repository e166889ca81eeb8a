/* alloc/scarce.h: a host whose allocator counts, and refuses one call on demand. */
#ifndef ALLOC_SCARCE_H
#define ALLOC_SCARCE_H

#include "raddle/host.h"

typedef struct scarce {
    size_t calls;     /* allocations asked for, the refused one included */
    size_t refuse_at; /* the call, counted from 1, that is refused; 0 = none */
    size_t refused;
    size_t blocks, bytes; /* not yet given back */
    size_t mismatches;    /* given back with another byte count, or not ours */
} scarce;

/* A host that lends `memory`, with that many threads. */
rdl_host scarce_host(scarce *memory, unsigned threads);
/* Starts to count calls anew and arms the refusal. */
void scarce_arm(scarce *memory, size_t refuse_at);

#endif
