/* shot/digest.c: the digest of delivered positions, over the bytes that the host was handed. */
#include "raddle/shot.h"
#include "shot/sha256.h"

enum { CHUNK = 512 }; /* numbers per call of the hash: small enough for any stack */

static void store_little(uint8_t *out, uint64_t bits, size_t bytes)
{
    for (size_t i = 0; i < bytes; i++)
        out[i] = (uint8_t)(bits >> (8 * i));
}

void rdl_shot_digest(const double *positions, size_t vertex_count, int host_bits, uint8_t digest[32])
{
    rdli_sha256 hash;
    uint8_t bytes[CHUNK * 8];
    size_t width = host_bits == RDL_FLOAT32 ? 4 : 8;
    rdli_sha256_begin(&hash);
    for (size_t done = 0; done < 3 * vertex_count;) {
        size_t count = 3 * vertex_count - done < CHUNK ? 3 * vertex_count - done : CHUNK;
        for (size_t i = 0; i < count; i++) {
            double wide = positions[done + i];
            float narrow = (float)wide;
            uint64_t bits = 0;
            uint32_t bits32;
            memcpy(&bits, &wide, sizeof bits);
            memcpy(&bits32, &narrow, sizeof bits32);
            store_little(bytes + width * i, width == 4 ? bits32 : bits, width);
        }
        rdli_sha256_add(&hash, bytes, width * count);
        done += count;
    }
    rdli_sha256_end(&hash, digest);
}
