/* alloc/scarce.c: see scarce.h. Each block carries its size in front, in a header as long as the alignment. */
#include "scarce.h"

#include <stdint.h>
#include <stdlib.h>
#include <string.h>

enum { ALIGNMENT = 64, MARK = 0x5cac };

typedef struct block_head {
    size_t bytes;
    uint64_t mark;
} block_head;

static void *scarce_allocate(void *user, size_t bytes)
{
    scarce *memory = user;
    memory->calls++;
    if (memory->calls == memory->refuse_at) {
        memory->refused++;
        return NULL;
    }
    unsigned char *block = aligned_alloc(ALIGNMENT, ALIGNMENT + (bytes + ALIGNMENT - 1) / ALIGNMENT * ALIGNMENT);
    if (block == NULL)
        return NULL;
    block_head head = {bytes, MARK};
    memcpy(block, &head, sizeof head);
    /* Whoever reads before writing gets NaN and huge indices, the same in every run. */
    memset(block + ALIGNMENT, 0xff, bytes);
    memory->blocks++;
    memory->bytes += bytes;
    return block + ALIGNMENT;
}

static void scarce_release(void *user, void *data, size_t bytes)
{
    scarce *memory = user;
    unsigned char *block = (unsigned char *)data - ALIGNMENT;
    block_head head;
    memcpy(&head, block, sizeof head);
    if (head.mark != MARK || head.bytes != bytes) {
        memory->mismatches++;
        return;
    }
    memory->blocks--;
    memory->bytes -= bytes;
    memset(block, 0, sizeof head);
    free(block);
}

rdl_host scarce_host(scarce *memory, unsigned threads)
{
    rdl_host host = {.size = sizeof host, .threads = threads, .user = memory, .allocate = scarce_allocate,
                     .release = scarce_release};
    return host;
}

void scarce_arm(scarce *memory, size_t refuse_at)
{
    memory->calls = 0;
    memory->refuse_at = refuse_at;
    memory->refused = 0;
}
