/* shot/sha256.c: SHA-256. [FIPS 180-4] Secure Hash Standard, NIST 2015: functions of section 4.1.2, constants of 4.2.2,
 * padding of 5.1.1, initial value of 5.3.3, computation of 6.2.2.
 * Why our own: the digest is all that we need of a cryptographic library, and hosts link many of those already. */
#include "shot/sha256.h"

static const uint32_t round_constants[64] = {
    /* [FIPS 180-4, 4.2.2] */
    0x428a2f98, 0x71374491, 0xb5c0fbcf, 0xe9b5dba5, 0x3956c25b, 0x59f111f1, 0x923f82a4, 0xab1c5ed5,
    0xd807aa98, 0x12835b01, 0x243185be, 0x550c7dc3, 0x72be5d74, 0x80deb1fe, 0x9bdc06a7, 0xc19bf174,
    0xe49b69c1, 0xefbe4786, 0x0fc19dc6, 0x240ca1cc, 0x2de92c6f, 0x4a7484aa, 0x5cb0a9dc, 0x76f988da,
    0x983e5152, 0xa831c66d, 0xb00327c8, 0xbf597fc7, 0xc6e00bf3, 0xd5a79147, 0x06ca6351, 0x14292967,
    0x27b70a85, 0x2e1b2138, 0x4d2c6dfc, 0x53380d13, 0x650a7354, 0x766a0abb, 0x81c2c92e, 0x92722c85,
    0xa2bfe8a1, 0xa81a664b, 0xc24b8b70, 0xc76c51a3, 0xd192e819, 0xd6990624, 0xf40e3585, 0x106aa070,
    0x19a4c116, 0x1e376c08, 0x2748774c, 0x34b0bcb5, 0x391c0cb3, 0x4ed8aa4a, 0x5b9cca4f, 0x682e6ff3,
    0x748f82ee, 0x78a5636f, 0x84c87814, 0x8cc70208, 0x90befffa, 0xa4506ceb, 0xbef9a3f7, 0xc67178f2,
};

static uint32_t turn(uint32_t x, unsigned n)
{
    return (x >> n) | (x << (32 - n));
}

/* One round of [FIPS 180-4, 6.2.2 step 3], with the eight working variables renamed instead of moved. */
#define ROUND(a, b, c, d, e, f, g, h, t)                                                                               \
    do {                                                                                                               \
        uint32_t t1 =                                                                                                  \
            (h) + (turn(e, 6) ^ turn(e, 11) ^ turn(e, 25)) + (((e) & (f)) ^ (~(e) & (g))) + round_constants[t] + w[t]; \
        uint32_t t2 = (turn(a, 2) ^ turn(a, 13) ^ turn(a, 22)) + (((a) & (b)) ^ ((a) & (c)) ^ ((b) & (c)));            \
        (d) += t1;                                                                                                     \
        (h) = t1 + t2;                                                                                                 \
    } while (0)

static void take_block(uint32_t state[8], const uint8_t *block)
{
    uint32_t w[64];
    for (size_t t = 0; t < 16; t++)
        w[t] = (uint32_t)block[4 * t] << 24 | (uint32_t)block[4 * t + 1] << 16 | (uint32_t)block[4 * t + 2] << 8 |
               (uint32_t)block[4 * t + 3];
    for (size_t t = 16; t < 64; t++) {
        uint32_t s0 = turn(w[t - 15], 7) ^ turn(w[t - 15], 18) ^ (w[t - 15] >> 3);
        uint32_t s1 = turn(w[t - 2], 17) ^ turn(w[t - 2], 19) ^ (w[t - 2] >> 10);
        w[t] = s1 + w[t - 7] + s0 + w[t - 16];
    }
    uint32_t a = state[0], b = state[1], c = state[2], d = state[3];
    uint32_t e = state[4], f = state[5], g = state[6], h = state[7];
    for (size_t t = 0; t < 64; t += 8) {
        ROUND(a, b, c, d, e, f, g, h, t);
        ROUND(h, a, b, c, d, e, f, g, t + 1);
        ROUND(g, h, a, b, c, d, e, f, t + 2);
        ROUND(f, g, h, a, b, c, d, e, t + 3);
        ROUND(e, f, g, h, a, b, c, d, t + 4);
        ROUND(d, e, f, g, h, a, b, c, t + 5);
        ROUND(c, d, e, f, g, h, a, b, t + 6);
        ROUND(b, c, d, e, f, g, h, a, t + 7);
    }
    const uint32_t sum[8] = {a, b, c, d, e, f, g, h};
    for (size_t i = 0; i < 8; i++)
        state[i] += sum[i];
}

void rdli_sha256_begin(rdli_sha256 *hash)
{
    static const uint32_t first[8] = {
        /* [FIPS 180-4, 5.3.3] */
        0x6a09e667, 0xbb67ae85, 0x3c6ef372, 0xa54ff53a, 0x510e527f, 0x9b05688c, 0x1f83d9ab, 0x5be0cd19,
    };
    memcpy(hash->state, first, sizeof first);
    hash->bytes = 0;
}

void rdli_sha256_add(rdli_sha256 *hash, const void *data, size_t bytes)
{
    const uint8_t *next = data;
    size_t held = (size_t)(hash->bytes % 64);
    hash->bytes += bytes;
    while (bytes > 0) {
        if (held == 0 && bytes >= 64) {
            take_block(hash->state, next);
            next += 64;
            bytes -= 64;
            continue;
        }
        size_t part = bytes < 64 - held ? bytes : 64 - held;
        memcpy(hash->block + held, next, part);
        held += part;
        next += part;
        bytes -= part;
        if (held == 64) {
            take_block(hash->state, hash->block);
            held = 0;
        }
    }
}

void rdli_sha256_end(rdli_sha256 *hash, uint8_t digest[32])
{
    static const uint8_t padding[64] = {0x80};
    uint64_t bits = hash->bytes * 8;
    size_t held = (size_t)(hash->bytes % 64);
    rdli_sha256_add(hash, padding, held < 56 ? 56 - held : 120 - held);
    uint8_t length[8];
    for (size_t i = 0; i < 8; i++)
        length[i] = (uint8_t)(bits >> (56 - 8 * i));
    rdli_sha256_add(hash, length, sizeof length);
    for (size_t i = 0; i < 32; i++)
        digest[i] = (uint8_t)(hash->state[i / 4] >> (24 - 8 * (i % 4)));
}
