/* version.c: `raddle --version`: what was built, what runs, and whether digests come out right on this machine. */
#include <math.h>
#include <string.h>

#include "scenario.h"
#include "verbs.h"

#include "cli.h"

/* SHA-256 of the six numbers below as little-endian float64, by another program. */
static const uint8_t known[32] = {0x36, 0x41, 0x36, 0xa4, 0x73, 0x06, 0x43, 0x62, 0xb6, 0xb9, 0x07,
                                  0x51, 0x71, 0x1a, 0xec, 0xf3, 0x7d, 0x79, 0xd6, 0x8d, 0x6c, 0x45,
                                  0xc2, 0x10, 0x9c, 0x88, 0xe0, 0x3a, 0xb9, 0x78, 0x71, 0xf1};

static bool digest_is_right(void)
{
    static const double numbers[6] = {0.5, -1.25, 3, 1e-300, -0.0, 0x1p70};
    uint8_t digest[32];
    rdl_shot_digest(numbers, 2, RDL_FLOAT64, digest);
    return memcmp(digest, known, sizeof known) == 0;
}

/* A strip of cloth against a plate: a step with contacts, under the given code path. */
static bool step_digest(double vector, unsigned threads, uint8_t digest[32])
{
    enum { N = 9 };
    static const rdl_part parts[2] = {{"strip", RDL_CLOTH, 0.001, 0}, {"plate", RDL_BODY, 0, 0}};
    static const uint32_t part[N] = {0, 0, 0, 0, 0, 0, 1, 1, 1};
    static const uint32_t triangles[5][3] = {{0, 1, 2}, {1, 3, 2}, {2, 3, 4}, {3, 5, 4}, {6, 7, 8}};
    static const double mass[N] = {1, 1, 1, 1, 1, 1, INFINITY, INFINITY, INFINITY};
    double start[N][3] = {{0, 0, 0.01}, {0, 0.1, 0.012}, {0.1, 0, 0.011}, {0.1, 0.1, 0.013}, {0.2, 0, 0.01},
                          {0.2, 0.1, 0.014}, {-1, -1, 0}, {3, -1, 0}, {-1, 3, 0}};
    double proposed[N][3], delivered[N][3];
    const rdl_scene scene = {.size = sizeof scene, .part_count = 2, .parts = parts, .vertex_count = N,
                             .vertex_part = part, .mass = mass, .triangle_count = 5, .triangles = triangles};
    const rdl_host host = {.size = sizeof host, .threads = threads};
    rdl_settings settings;
    rdl_engine *engine = NULL;
    rdl_settings_default(&settings);
    settings.vector = vector;
    memcpy(proposed, start, sizeof proposed);
    for (int v = 0; v < 6; v++)
        proposed[v][2] -= 0.02;
    const rdl_step step = {.size = sizeof step, .start = {start, 0, RDL_FLOAT64}, .proposed = {proposed, 0, RDL_FLOAT64},
                           .delivered = {delivered, 0, RDL_FLOAT64}, .duration = 0.03125};
    bool done = rdl_engine_create(&scene, &settings, &host, &engine, NULL) == RDL_OK &&
                rdl_engine_step(engine, &step, NULL, NULL) == RDL_OK;
    rdl_engine_destroy(engine);
    if (done)
        rdl_shot_digest(delivered[0], N, RDL_FLOAT64, digest);
    return done;
}

static bool paths_agree(void)
{
    uint8_t plain[32], vector[32], threads[32];
    return step_digest(0, 1, plain) && step_digest(1, 1, vector) && step_digest(1, 4, threads) &&
           memcmp(plain, vector, sizeof plain) == 0 && memcmp(plain, threads, sizeof plain) == 0;
}

int print_version(void)
{
    bool digest = digest_is_right(), paths = paths_agree();
    const char *path = "portable";
#if defined(__x86_64__) && defined(__GNUC__)
    if (__builtin_cpu_supports("avx2"))
        path = "AVX2";
#endif
    printf("raddle %s\n", rdl_version());
#ifdef NDEBUG
    printf("build: %s, assertions off, shot format 1\n", __VERSION__);
#else
    printf("build: %s, assertions on, shot format 1\n", __VERSION__);
#endif
    printf("code path: %s\n", path);
    printf("digest self-test: %s; vector code, portable code and threads: %s\n", digest ? "right" : "WRONG",
           paths ? "same bits" : "OTHER BITS");
    return digest && paths ? CLI_DONE : CLI_FINDINGS;
}
