/* reduce_write.c: the result of a reduction as a shot and as a mesh. */
#include <stdlib.h>
#include <string.h>

#include "reduce.h"

/* What the engine makes of it now goes into the shot, where there is an engine for it. */
static rdl_status fill_frame(const reduced *r, const predicate *p, stepper *st, void **memory, rdl_shot_frame *frame,
                             rdl_fault *fault)
{
    size_t bytes = 0;
    rdl_status status = stepper_create(st, &r->s, &p->settings, 1, false, fault);
    if (status != RDL_OK)
        return status;
    status = rdl_engine_memory_read(st->engine, NULL, &bytes);
    *memory = status == RDL_OK && !r->s.has_memory ? malloc(bytes > 0 ? bytes : 1) : NULL;
    if (*memory != NULL)
        status = rdl_engine_memory_read(st->engine, *memory, &bytes);
    if (status == RDL_OK)
        status = stepper_run(st, &r->s, false, fault);
    const rdl_report *report = &st->result.report;
    frame->verdict = (uint8_t)report->verdict;
    frame->delivered = st->result.delivered;
    frame->waypoint_count = report->waypoint_count;
    frame->waypoint_times = report->waypoint_times;
    frame->waypoint_positions = report->waypoint_positions;
    if (*memory != NULL) {
        frame->memory = *memory;
        frame->memory_bytes = bytes;
    }
    return status;
}

int reduce_write_shot(const reduced *r, const predicate *p, const char *path)
{
    rdl_shot_options options;
    rdl_shot_writer *writer = NULL;
    rdl_fault fault = {0, ""};
    rdl_shot_frame frame = r->s.recorded;
    stepper st;
    void *memory = NULL;
    memset(&st, 0, sizeof st);
    frame.start = r->s.start;
    frame.proposed = r->s.proposed;
    rdl_shot_options_default(&options);
    options.host_bits = r->s.host_bits;
    options.overwrite = 1;
    options.created_by = "raddle reduce " RDL_VERSION_TEXT;
    options.settings = &p->settings;
    options.contents = RDL_SHOT_STEP & ~(unsigned)RDL_SHOT_PICTURE;
    if (p->as_given || p->kind == KEEP_COMMAND || fill_frame(r, p, &st, &memory, &frame, &fault) != RDL_OK)
        options.contents = RDL_SHOT_START | RDL_SHOT_PROPOSED | RDL_SHOT_RULES;
    rdl_status status = rdl_shot_create(path, &r->s.scene, &options, &writer, &fault);
    if (status == RDL_OK)
        status = rdl_shot_append(writer, &frame, &fault);
    if (status == RDL_OK) {
        status = rdl_shot_finish(writer, &fault);
        writer = NULL;
    }
    rdl_shot_discard(writer);
    stepper_release(&st);
    free(memory);
    return status == RDL_OK ? CLI_DONE : cli_fail("reduce", path, -1, status, &fault);
}

static void write_state(FILE *file, const reduced *r, const double *state, const char *name, size_t first)
{
    const rdl_scene *scene = &r->s.scene;
    for (size_t v = 0; v < scene->vertex_count; v++)
        fprintf(file, "v %.17g %.17g %.17g\n", state[3 * v], state[3 * v + 1], state[3 * v + 2]);
    for (size_t p = 0; p < scene->part_count; p++) {
        fprintf(file, "g %s_part_%zu\n", name, p);
        for (size_t s = 0; s < scene->segment_count; s++)
            if (scene->vertex_part[scene->segments[s][0]] == p)
                fprintf(file, "l %zu %zu\n", first + scene->segments[s][0], first + scene->segments[s][1]);
        for (size_t t = 0; t < scene->triangle_count; t++)
            if (scene->vertex_part[scene->triangles[t][0]] == p)
                fprintf(file, "f %zu %zu %zu\n", first + scene->triangles[t][0], first + scene->triangles[t][1],
                        first + scene->triangles[t][2]);
    }
}

/* Start and proposed positions as two groups of one file. */
int reduce_write_mesh(const reduced *r, const char *path)
{
    cli_output output;
    int code = CLI_DONE;
    if (!cli_output_begin(&output, "reduce", path, true, &code))
        return code;
    fprintf(output.file, "# start and proposed positions, metres\n");
    write_state(output.file, r, r->s.start, "start", 1);
    write_state(output.file, r, r->s.proposed, "proposed", 1 + r->s.scene.vertex_count);
    return cli_output_end(&output, "reduce", &code) ? CLI_DONE : code;
}
