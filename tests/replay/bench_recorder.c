/* bench_recorder SHOT [FRAMES]: what recording costs. Steps the frames of a shot without a recorder, and with one that
 * records every step (uncompressed and compressed), or waits for a trigger that never comes. Processor time of one
 * thread, the best of three rounds; the files go beside the shot and are removed. */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include <raddle/recorder.h>

typedef struct frames {
    size_t count, vertices;
    double *start, *proposed, *delivered;
    rdl_shot *shot;
} frames;

static double processor_seconds(void)
{
    struct timespec now;
    clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &now);
    return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}

static int load(frames *f, const char *path, size_t most)
{
    rdl_fault fault;
    if (rdl_shot_open(path, &f->shot, &fault) != RDL_OK)
        return 0;
    f->count = rdl_shot_describe(f->shot)->frame_count;
    f->count = f->count < most ? f->count : most;
    f->vertices = rdl_shot_scene(f->shot)->vertex_count;
    size_t state = 3 * f->vertices;
    f->start = malloc(f->count * state * sizeof(double));
    f->proposed = malloc(f->count * state * sizeof(double));
    f->delivered = malloc(state * sizeof(double));
    if (!f->start || !f->proposed || !f->delivered)
        return 0;
    for (size_t k = 0; k < f->count; k++)
        if (rdl_shot_read_positions(f->shot, k, RDL_SHOT_START, f->start + k * state, &fault) != RDL_OK ||
            rdl_shot_read_positions(f->shot, k, RDL_SHOT_PROPOSED, f->proposed + k * state, &fault) != RDL_OK)
            return 0;
    return 1;
}

/* way 0: no recorder, 1: every step, 2: compressed, 3: a trigger with five steps before. Negative: a call failed. */
static double run(frames *f, const char *path, int way)
{
    char name[4200];
    rdl_engine *engine = NULL;
    rdl_recorder *recorder = NULL;
    rdl_recorder_options options;
    rdl_fault fault;
    const rdl_host host = {.size = sizeof host, .threads = 1};
    size_t state = 3 * f->vertices;
    snprintf(name, sizeof name, "%.4000s.bench.h5", path);
    if (rdl_engine_create(rdl_shot_scene(f->shot), NULL, &host, &engine, &fault) != RDL_OK)
        return -1;
    rdl_recorder_options_default(&options);
    options.deflate = way == 2;
    options.overwrite = 1;
    options.triggers = way == 3 ? RDL_TRIGGER_ON_DEMAND : 0;
    options.steps_before = way == 3 ? 5 : 0;
    if (way > 0 && rdl_recorder_create(name, engine, rdl_shot_scene(f->shot), &options, &recorder, &fault) != RDL_OK)
        return -1;
    double begun = processor_seconds();
    for (size_t k = 0; k < f->count; k++) {
        const rdl_step step = {.size = sizeof step, .start = {f->start + k * state, 0, RDL_FLOAT64},
                               .proposed = {f->proposed + k * state, 0, RDL_FLOAT64},
                               .delivered = {f->delivered, 0, RDL_FLOAT64}, .duration = 1.0 / 48};
        if (rdl_engine_step(engine, &step, NULL, &fault) != RDL_OK)
            return -1;
    }
    double seconds = processor_seconds() - begun;
    rdl_recorder_discard(recorder);
    rdl_engine_destroy(engine);
    return seconds;
}

int main(int argc, char **argv)
{
    static const char *const names[] = {"no recorder", "every step, uncompressed", "every step, compressed",
                                        "waiting for a trigger"};
    frames f = {0};
    double best[4] = {1e300, 1e300, 1e300, 1e300};
    if (argc < 2 || !load(&f, argv[1], argc > 2 ? (size_t)strtoul(argv[2], NULL, 10) : 1000)) {
        fprintf(stderr, "usage: bench_recorder SHOT [FRAMES]\n");
        return 2;
    }
    for (int round = 0; round < 3; round++)
        for (int way = 0; way < 4; way++) {
            double seconds = run(&f, argv[1], way);
            if (seconds < 0)
                return 3;
            best[way] = seconds < best[way] ? seconds : best[way];
        }
    for (int way = 0; way < 4; way++)
        printf("%-26s %8.2f ms a step, %+6.1f %%\n", names[way], 1e3 * best[way] / (double)f.count,
               100 * (best[way] / best[0] - 1));
    free(f.start);
    free(f.proposed);
    free(f.delivered);
    rdl_shot_close(f.shot);
    return EXIT_SUCCESS;
}
