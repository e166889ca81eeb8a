/* Recording from a host: a recorder is attached to the engine, the loop stays as it is. A thread falls on a plate; only
 * steps in which something was moved are written, each with the step before it. The file replays with
 * `raddle replay recorded.h5`.
 * Build: cc -std=c17 recorder.c $(pkg-config --cflags --libs raddle_shot) */
#include <math.h>
#include <stdio.h>

#include <raddle/recorder.h>

enum { VERTICES = 6, STEPS = 8 };

static int complain(const char *what, rdl_status status, const rdl_fault *fault)
{
    fprintf(stderr, "%s: %s (%s %llu)\n", what, rdl_status_text(status), fault->field,
            (unsigned long long)fault->index);
    return 1;
}

/* Vertices 0 to 2: a thread, 9 mm above a plate; 3 to 5: the plate, driven by the host. */
static rdl_status play(rdl_engine *engine, rdl_recorder *recorder, rdl_fault *fault)
{
    double now[VERTICES][3] = {{-0.01, 0, 0.009}, {0, 0, 0.009}, {0.01, 0, 0.009}, {-1, -1, 0}, {2, -1, 0}, {-1, 2, 0}};
    for (int k = 0; k < STEPS; k++) {
        double next[VERTICES][3];
        for (int v = 0; v < VERTICES; v++)
            for (int c = 0; c < 3; c++)
                next[v][c] = now[v][c] - (v < 3 && c == 2 ? 0.002 : 0);
        const rdl_step step = {.size = sizeof step, .start = {now, 0, RDL_FLOAT64}, .proposed = {next, 0, RDL_FLOAT64},
                               .delivered = {next, 0, RDL_FLOAT64}, .duration = 1.0 / 48};
        rdl_recorder_mark(recorder, k / 48.0, (uint32_t)k / 2);
        rdl_status status = rdl_engine_step(engine, &step, NULL, fault);
        if (status != RDL_OK)
            return status;
        for (int v = 0; v < VERTICES; v++)
            for (int c = 0; c < 3; c++)
                now[v][c] = next[v][c];
    }
    return RDL_OK;
}

int main(void)
{
    const rdl_part parts[] = {{"thread", RDL_STRANDS, 0.0005, 0}, {"plate", RDL_BODY, 0, 0}};
    const uint32_t part[VERTICES] = {0, 0, 0, 1, 1, 1}, segments[2][2] = {{0, 1}, {1, 2}}, triangles[1][3] = {{3, 4, 5}};
    const double mass[VERTICES] = {1e-6, 1e-6, 1e-6, INFINITY, INFINITY, INFINITY};
    const rdl_scene scene = {.size = sizeof scene, .part_count = 2, .parts = parts, .vertex_count = VERTICES,
                             .vertex_part = part, .mass = mass, .segment_count = 2, .segments = segments,
                             .triangle_count = 1, .triangles = triangles};
    rdl_engine *engine = NULL;
    rdl_recorder *recorder = NULL;
    rdl_recorder_options options;
    rdl_fault fault = {0, ""};
    size_t frames = 0;
    rdl_status status = rdl_engine_create(&scene, NULL, NULL, &engine, &fault);
    if (status != RDL_OK)
        return complain("the scene", status, &fault);
    rdl_recorder_options_default(&options);
    options.triggers = RDL_TRIGGER_RESOLVED | RDL_TRIGGER_PINCHED | RDL_TRIGGER_TANGLED;
    options.steps_before = 1;
    options.overwrite = 1;
    status = rdl_recorder_create("recorded.h5", engine, &scene, &options, &recorder, &fault);
    if (status != RDL_OK)
        return complain("recorded.h5", status, &fault);
    status = play(engine, recorder, &fault);
    if (status != RDL_OK)
        return complain("a step", status, &fault);
    rdl_recorder_state(recorder, &frames, &fault);
    status = rdl_recorder_finish(recorder, &fault);
    if (status != RDL_OK)
        return complain("recorded.h5", status, &fault);
    printf("%d steps, %zu recorded\n", STEPS, frames);
    rdl_engine_destroy(engine);
    return 0;
}
