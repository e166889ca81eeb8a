/* Writes a shot of two frames and reads it back: one strand that falls freely.
 * Build: cc -std=c17 record.c $(pkg-config --cflags --libs raddle_shot) */
#include <stdio.h>

#include <raddle/shot.h>

enum { VERTICES = 3, FRAMES = 2 };

static int complain(const char *what, rdl_status status, const rdl_fault *fault)
{
    fprintf(stderr, "%s: %s (%s %llu)\n", what, rdl_status_text(status), fault->field,
            (unsigned long long)fault->index);
    return 1;
}

/* Frame k: the strand at rest, then one step lower. Delivered is what the engine would have handed back. */
static rdl_status record(rdl_shot_writer *writer, rdl_fault *fault)
{
    double now[VERTICES][3], next[VERTICES][3];
    for (int k = 0; k < FRAMES; k++) {
        for (int v = 0; v < VERTICES; v++) {
            now[v][0] = next[v][0] = 0.01 * v;
            now[v][1] = next[v][1] = 0;
            now[v][2] = 1 - 0.125 * k;
            next[v][2] = 1 - 0.125 * (k + 1);
        }
        const rdl_shot_frame frame = {.time = k / 24.0, .picture = (uint32_t)k, .start = now[0], .proposed = next[0],
                                      .delivered = next[0]};
        rdl_status status = rdl_shot_append(writer, &frame, fault);
        if (status != RDL_OK)
            return status;
    }
    return RDL_OK;
}

static int read_back(const char *path)
{
    rdl_fault fault = {0, ""};
    rdl_shot *shot = NULL;
    double last[VERTICES][3];
    rdl_status status = rdl_shot_open(path, &shot, &fault);
    if (status != RDL_OK)
        return complain(path, status, &fault);
    const rdl_shot_info *info = rdl_shot_describe(shot);
    const rdl_scene *scene = rdl_shot_scene(shot);
    status = rdl_shot_read_positions(shot, info->frame_count - 1, RDL_SHOT_DELIVERED, last[0], &fault);
    if (status == RDL_OK)
        printf("part \"%s\": %zu vertices, %zu frames, last height %g m\n", scene->parts[0].name, info->vertex_count,
               info->frame_count, last[0][2]);
    rdl_shot_close(shot);
    return status == RDL_OK ? 0 : complain(path, status, &fault);
}

int main(void)
{
    const char *path = "falling.h5";
    const rdl_part part = {"strand", RDL_STRANDS, 0.0005, 0};
    const uint32_t vertex_part[VERTICES] = {0, 0, 0}, segments[VERTICES - 1][2] = {{0, 1}, {1, 2}};
    const double mass[VERTICES] = {1e-5, 1e-5, 1e-5};
    const rdl_scene scene = {.size = sizeof scene, .part_count = 1, .parts = &part, .vertex_count = VERTICES,
                             .vertex_part = vertex_part, .mass = mass, .segment_count = VERTICES - 1,
                             .segments = segments};
    rdl_shot_options options;
    rdl_shot_writer *writer = NULL;
    rdl_fault fault = {0, ""};

    rdl_shot_options_default(&options);
    options.contents = RDL_SHOT_START | RDL_SHOT_PROPOSED | RDL_SHOT_DELIVERED;
    options.overwrite = 1;
    options.created_by = "record.c";
    rdl_status status = rdl_shot_create(path, &scene, &options, &writer, &fault);
    if (status != RDL_OK)
        return complain(path, status, &fault);
    status = record(writer, &fault);
    if (status != RDL_OK) {
        rdl_shot_discard(writer);
        return complain(path, status, &fault);
    }
    status = rdl_shot_finish(writer, &fault);
    if (status != RDL_OK)
        return complain(path, status, &fault);
    return read_back(path);
}
