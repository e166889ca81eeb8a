/* info.c: `raddle info`: what a shot holds. */
#include <inttypes.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>

#include "cli.h"
#include "verbs.h"

static const cli_option options[] = {
    {"frames", NULL, "list every frame"},
    {"json", NULL, "print one JSON object"},
};

static const cli_spec spec = {.verb = "info",
                              .operands = "SHOT",
                              .summary = "Says what a shot holds: parts, counts, frames, verdicts, settings, sizes.",
                              .options = options,
                              .option_count = sizeof options / sizeof options[0],
                              .operands_min = 1,
                              .operands_max = 1};

static const char *const kinds[] = {"strands", "cloth", "body"};
static const char *const verdicts[] = {"clear", "resolved", "pinched", "tangled"};

static const struct {
    unsigned bit;
    const char *name;
} contents[] = {
    {RDL_SHOT_START, "start"},     {RDL_SHOT_PROPOSED, "proposed"},   {RDL_SHOT_DELIVERED, "delivered"},
    {RDL_SHOT_VERDICT, "verdict"}, {RDL_SHOT_WAYPOINTS, "waypoints"}, {RDL_SHOT_MEMORY, "memory"},
    {RDL_SHOT_PICTURE, "picture"}, {RDL_SHOT_RULES, "rules"},
};

enum { CONTENTS = sizeof contents / sizeof contents[0] };

typedef struct part_counts {
    size_t vertices, driven, segments, triangles;
} part_counts;

typedef struct summary {
    const char *path;
    rdl_shot *shot;
    const rdl_scene *scene;
    const rdl_shot_info *about;
    uint64_t file_bytes;
    part_counts *parts;
    size_t verdict_frames[4], waypoints, memory_bytes;
    double first_time, last_time;
    json_t *frames; /* with --frames and --json */
    bool list, json;
} summary;

static void count_parts(summary *s)
{
    const rdl_scene *scene = s->scene;
    for (size_t v = 0; v < scene->vertex_count; v++) {
        s->parts[scene->vertex_part[v]].vertices++;
        s->parts[scene->vertex_part[v]].driven += isinf(scene->mass[v]) != 0;
    }
    for (size_t i = 0; i < scene->segment_count; i++)
        s->parts[scene->vertex_part[scene->segments[i][0]]].segments++;
    for (size_t i = 0; i < scene->triangle_count; i++)
        s->parts[scene->vertex_part[scene->triangles[i][0]]].triangles++;
}

static void list_frame(summary *s, size_t k, const rdl_shot_frame *frame)
{
    bool judged = (s->about->contents & RDL_SHOT_VERDICT) != 0;
    if (s->json) {
        json_t *row = json_pack("{s:I, s:f, s:I, s:I}", "frame", (json_int_t)k, "time_s", frame->time, "waypoints",
                                (json_int_t)frame->waypoint_count, "memory_bytes", (json_int_t)frame->memory_bytes);
        if (judged)
            json_object_set_new(row, "verdict", json_string(verdicts[frame->verdict]));
        if ((s->about->contents & RDL_SHOT_PICTURE) != 0)
            json_object_set_new(row, "picture", json_integer(frame->picture));
        json_array_append_new(s->frames, row);
        return;
    }
    printf("frame %zu: time %.9g s", k, frame->time);
    if ((s->about->contents & RDL_SHOT_PICTURE) != 0)
        printf(", picture %" PRIu32, frame->picture);
    if (judged)
        printf(", %s", verdicts[frame->verdict]);
    printf(", %zu way-points, %zu bytes of memory\n", frame->waypoint_count, frame->memory_bytes);
}

/* Reads every frame but not its positions. */
static int read_frames(summary *s)
{
    for (size_t k = 0; k < s->about->frame_count; k++) {
        rdl_shot_frame frame;
        rdl_fault fault = {0, ""};
        rdl_status status = rdl_shot_read_frame(s->shot, k, &frame, &fault);
        if (status != RDL_OK)
            return cli_fail("info", s->path, (long long)k, status, &fault);
        if (cli_interrupted())
            return CLI_INTERRUPTED;
        s->first_time = k == 0 ? frame.time : s->first_time;
        s->last_time = frame.time;
        s->verdict_frames[frame.verdict]++;
        s->waypoints += frame.waypoint_count;
        s->memory_bytes += frame.memory_bytes;
        if (s->list)
            list_frame(s, k, &frame);
        cli_progress("info", k + 1, s->about->frame_count);
    }
    return CLI_DONE;
}

static void print_text(const summary *s)
{
    const rdl_scene *scene = s->scene;
    const rdl_shot_info *about = s->about;
    printf("%s: %" PRIu64 " bytes, %s\n", cli_clean(s->path), s->file_bytes,
           about->complete ? "complete" : "an unfinished recording");
    printf("created by: %s\n", about->created_by[0] != '\0' ? cli_clean(about->created_by) : "(not said)");
    printf("%zu frames, %.9g s to %.9g s, positions as float%d\n", about->frame_count, s->first_time, s->last_time,
           about->host_bits);
    printf("holds:");
    for (size_t i = 0; i < CONTENTS; i++)
        if ((about->contents & contents[i].bit) != 0)
            printf(" %s", contents[i].name);
    printf("\n%zu vertices%s, %zu segments, %zu triangles, %zu muted part pairs, %zu attachments, %zu pair frictions\n",
           scene->vertex_count, about->has_mass ? "" : " (no masses recorded)", scene->segment_count,
           scene->triangle_count, scene->muted_count, scene->attachment_count, scene->pair_friction_count);
    for (size_t p = 0; p < scene->part_count; p++)
        printf("part %zu \"%s\": %s, %zu vertices (%zu driven), %zu segments, %zu triangles, half-thickness %.9g m, "
               "friction %.9g\n",
               p, cli_clean(scene->parts[p].name), kinds[scene->parts[p].kind], s->parts[p].vertices,
               s->parts[p].driven, s->parts[p].segments, s->parts[p].triangles, scene->parts[p].half_thickness,
               scene->parts[p].friction);
    if ((about->contents & RDL_SHOT_VERDICT) != 0)
        printf("verdicts: %zu clear, %zu resolved, %zu pinched, %zu tangled\n", s->verdict_frames[0],
               s->verdict_frames[1], s->verdict_frames[2], s->verdict_frames[3]);
    if ((about->contents & RDL_SHOT_WAYPOINTS) != 0)
        printf("%zu way-points, %zu bytes of memory\n", s->waypoints, s->memory_bytes);
    if (!about->has_settings)
        return;
    size_t count = 0;
    const rdl_setting_info *table = rdl_settings_table(&count);
    printf("settings of engine %s:", about->engine_version != NULL ? cli_clean(about->engine_version) : "(not said)");
    for (size_t row = 0; row < count; row++) {
        double value;
        memcpy(&value, (const char *)&about->settings + table[row].offset, sizeof value);
        printf("%s %s %.9g", row > 0 ? "," : "", table[row].name, value);
    }
    if (about->unknown_setting != NULL)
        printf(", and %s, which this version does not have", cli_clean(about->unknown_setting));
    printf("\n");
}

static json_t *settings_json(const rdl_shot_info *about)
{
    size_t count = 0;
    const rdl_setting_info *table = rdl_settings_table(&count);
    json_t *object = json_object();
    for (size_t row = 0; row < count; row++) {
        double value;
        memcpy(&value, (const char *)&about->settings + table[row].offset, sizeof value);
        json_object_set_new(object, table[row].name, json_real(value));
    }
    return object;
}

static json_t *make_json(const summary *s)
{
    const rdl_shot_info *about = s->about;
    json_t *parts = json_array(), *held = json_array();
    for (size_t p = 0; p < s->scene->part_count; p++) {
        const rdl_part *part = &s->scene->parts[p];
        json_array_append_new(
            parts, json_pack("{s:s, s:s, s:f, s:f, s:I, s:I, s:I, s:I}", "name", part->name, "kind", kinds[part->kind],
                             "half_thickness_m", part->half_thickness, "friction", part->friction, "vertices",
                             (json_int_t)s->parts[p].vertices, "driven", (json_int_t)s->parts[p].driven, "segments",
                             (json_int_t)s->parts[p].segments, "triangles", (json_int_t)s->parts[p].triangles));
    }
    for (size_t i = 0; i < CONTENTS; i++)
        if ((about->contents & contents[i].bit) != 0)
            json_array_append_new(held, json_string(contents[i].name));
    json_t *object = json_pack(
        "{s:o, s:I, s:b, s:s, s:I, s:I, s:i, s:f, s:f, s:b, s:o, s:o, s:I, s:I, s:I, s:I, s:I}", "file",
        cli_json_text(s->path), "bytes", (json_int_t)s->file_bytes, "complete", about->complete, "created_by",
        about->created_by, "frames", (json_int_t)about->frame_count, "vertices", (json_int_t)s->scene->vertex_count,
        "host_bits", about->host_bits, "first_time_s", s->first_time, "last_time_s", s->last_time, "has_mass",
        about->has_mass, "holds", held, "parts", parts, "muted_parts", (json_int_t)s->scene->muted_count, "attachments",
        (json_int_t)s->scene->attachment_count, "pair_frictions", (json_int_t)s->scene->pair_friction_count,
        "waypoints", (json_int_t)s->waypoints, "memory_bytes", (json_int_t)s->memory_bytes);
    if ((about->contents & RDL_SHOT_VERDICT) != 0)
        for (size_t i = 0; i < 4; i++)
            json_object_set_new(object, verdicts[i], json_integer((json_int_t)s->verdict_frames[i]));
    if (about->has_settings)
        json_object_set_new(object, "settings", settings_json(about));
    if (about->engine_version != NULL)
        json_object_set_new(object, "engine_version", json_string(about->engine_version));
    if (about->unknown_setting != NULL)
        json_object_set_new(object, "unknown_setting", cli_json_text(about->unknown_setting));
    if (s->frames != NULL)
        json_object_set(object, "frame_list", s->frames);
    return object;
}

int verb_info(int argc, char **argv)
{
    cli_line line;
    int code = CLI_DONE;
    summary s = {0};
    if (!cli_read(&spec, argc, argv, &line, &code))
        return code;
    s.path = line.operands[0];
    s.list = cli_value(&spec, &line, "frames") != NULL;
    s.json = cli_value(&spec, &line, "json") != NULL;
    if (!cli_open_shot("info", s.path, &s.shot, &code))
        return code;
    s.scene = rdl_shot_scene(s.shot);
    s.about = rdl_shot_describe(s.shot);
    s.parts = calloc(s.scene->part_count, sizeof *s.parts);
    struct stat on_disk;
    s.file_bytes = stat(s.path, &on_disk) == 0 ? (uint64_t)on_disk.st_size : 0;
    s.frames = s.json && s.list ? json_array() : NULL;
    if (s.parts == NULL) {
        code = cli_fail("info", s.path, -1, RDL_NO_MEMORY, NULL);
    } else {
        count_parts(&s);
        code = read_frames(&s);
        cli_progress_end();
    }
    if (code == CLI_DONE && s.json)
        code = cli_print_json("info", make_json(&s), code);
    else if (code == CLI_DONE)
        print_text(&s);
    json_decref(s.frames);
    free(s.parts);
    rdl_shot_close(s.shot);
    return code;
}
