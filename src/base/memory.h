/* base/memory.h: allocation through the host's hooks, with a running count of bytes, and growing arrays.
 * A warm step allocates nothing because arrays keep their room. */
#ifndef RDLI_MEMORY_H
#define RDLI_MEMORY_H

#include "base/internal.h"

typedef struct rdli_memory {
    void *user;
    void *(*allocate)(void *user, size_t bytes);
    void (*release)(void *user, void *memory, size_t bytes);
    size_t bytes_in_use;
} rdli_memory;

/* host may be NULL: then 64-byte aligned memory of libc. RDL_BAD_ARGUMENT when only one of the two hooks is given. */
rdl_status rdli_memory_init(rdli_memory *memory, const rdl_host *host);
/* NULL on failure or when count * item overflows; bytes 0 gives NULL too. Contents are not cleared. Not thread-safe. */
void *rdli_take(rdli_memory *memory, size_t count, size_t item);
void rdli_give(rdli_memory *memory, void *data, size_t count, size_t item);

/* A block that only grows. Zero-initialise before first use. */
typedef struct rdli_room {
    void *data;
    size_t bytes;
} rdli_room;
/* Makes room for count items of `item` bytes; old contents are kept when keep is true. Growth is by half at least. */
bool rdli_room_reserve(rdli_memory *memory, rdli_room *room, size_t count, size_t item, bool keep);
void rdli_room_release(rdli_memory *memory, rdli_room *room);

#endif
