/* base/memory.c: see memory.h. */
#include "base/memory.h"

#include <stdlib.h>

enum { ALIGNMENT = 64 }; /* a cache line, and enough for every vector load */

static void *libc_allocate(void *user, size_t bytes)
{
    (void)user;
    if (bytes > SIZE_MAX - ALIGNMENT)
        return NULL;
    return aligned_alloc(ALIGNMENT, (bytes + ALIGNMENT - 1) / ALIGNMENT * ALIGNMENT);
}

static void libc_release(void *user, void *memory, size_t bytes)
{
    (void)user;
    (void)bytes;
    free(memory);
}

rdl_status rdli_memory_init(rdli_memory *memory, const rdl_host *host)
{
    bool own = host == NULL || (host->allocate == NULL && host->release == NULL);
    if (!own && (host->allocate == NULL || host->release == NULL))
        return RDL_BAD_ARGUMENT;
    memory->user = own ? NULL : host->user;
    memory->allocate = own ? libc_allocate : host->allocate;
    memory->release = own ? libc_release : host->release;
    memory->bytes_in_use = 0;
    return RDL_OK;
}

void *rdli_take(rdli_memory *memory, size_t count, size_t item)
{
    if (count == 0 || item == 0 || count > (SIZE_MAX / 2) / item)
        return NULL;
    void *data = memory->allocate(memory->user, count * item);
    if (data != NULL)
        memory->bytes_in_use += count * item;
    return data;
}

void rdli_give(rdli_memory *memory, void *data, size_t count, size_t item)
{
    if (data == NULL)
        return;
    memory->bytes_in_use -= count * item;
    memory->release(memory->user, data, count * item);
}

bool rdli_room_reserve(rdli_memory *memory, rdli_room *room, size_t count, size_t item, bool keep)
{
    if (item != 0 && count > (SIZE_MAX / 4) / item)
        return false;
    size_t need = count * item;
    if (need <= room->bytes)
        return true;
    size_t grown = room->bytes + room->bytes / 2;
    size_t bytes = need > grown ? need : grown;
    bytes = (bytes + ALIGNMENT - 1) / ALIGNMENT * ALIGNMENT;
    void *data = rdli_take(memory, bytes, 1);
    if (data == NULL)
        return false;
    if (keep && room->data != NULL)
        memcpy(data, room->data, room->bytes);
    rdli_give(memory, room->data, room->bytes, 1);
    room->data = data;
    room->bytes = bytes;
    return true;
}

void rdli_room_release(rdli_memory *memory, rdli_room *room)
{
    rdli_give(memory, room->data, room->bytes, 1);
    room->data = NULL;
    room->bytes = 0;
}
