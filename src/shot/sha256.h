/* shot/sha256.h: SHA-256 after FIPS 180-4. Included by src/shot only. */
#ifndef RDLI_SHA256_H
#define RDLI_SHA256_H

#include "base/internal.h"

typedef struct rdli_sha256 {
    uint32_t state[8];
    uint64_t bytes;    /* taken so far */
    uint8_t block[64]; /* the last bytes % 64 of them */
} rdli_sha256;

void rdli_sha256_begin(rdli_sha256 *hash);
void rdli_sha256_add(rdli_sha256 *hash, const void *data, size_t bytes);
void rdli_sha256_end(rdli_sha256 *hash, uint8_t digest[32]);

#endif
