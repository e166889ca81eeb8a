/* export.c: `raddle export`: frames of a shot as numbered OBJ or PLY files. */
#include <inttypes.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include "export.h"
#include "verbs.h"

static const cli_option options[] = {
    {"o", "PREFIX", "files PREFIX0000.obj, PREFIX0001.obj, ...; a folder if PREFIX ends with / or is one"},
    {"format", "obj|ply", "format of the files (default obj)"},
    {"frames", "A:B", "frames A to B, both included (default all); A or B alone may be left out"},
    {"which", "NAME", "delivered, start or proposed (default: the first of these that the shot has)"},
    {"vtkhdf", NULL, "one VTKHDF file named PREFIX (UnstructuredGrid; of several frames: with time steps)"},
    {"scrambled", NULL, "one shot named PREFIX, moved by a random rigid motion, parts renamed: start and proposed only"},
    {"seed", "N", "which rigid motion (default 1)"},
    {"force", NULL, "replace files that exist"},
};

static const cli_spec spec = {
    .verb = "export",
    .operands = "SHOT",
    .summary = "Writes frames of a shot as a numbered sequence of mesh files, for viewers and other tools.",
    .notes = "Parts become groups (OBJ) or a property of each face and edge (PLY); strands become lines (OBJ) or edges "
             "(PLY).\n"
             "Numbers are written so that they read back as the same doubles.",
    .options = options,
    .option_count = sizeof options / sizeof options[0],
    .operands_min = 1,
    .operands_max = 1};

static void file_name(const exporter *e, size_t frame, char name[4096])
{
    bool slash = e->folder && e->prefix[strlen(e->prefix) - 1] != '/';
    snprintf(name, 4096, "%s%s%0*zu.%s", e->prefix, slash ? "/" : "", (int)e->width, frame, e->extension);
}

/* Names of parts are free text; group names of OBJ end at blanks. */
static void write_group(FILE *out, const char *name)
{
    fputs("g ", out);
    for (const unsigned char *c = (const unsigned char *)name; *c != '\0'; c++)
        fputc(*c <= ' ' || *c == 0x7f ? '_' : *c, out);
    fputs(name[0] == '\0' ? "part\n" : "\n", out);
}

static void write_obj(const exporter *e, FILE *out)
{
    const rdl_scene *scene = e->scene;
    for (size_t v = 0; v < scene->vertex_count; v++)
        fprintf(out, "v %.17g %.17g %.17g\n", e->positions[3 * v], e->positions[3 * v + 1], e->positions[3 * v + 2]);
    for (uint32_t p = 0; p < scene->part_count; p++) {
        write_group(out, scene->parts[p].name);
        for (size_t s = 0; s < scene->segment_count; s++)
            if (scene->vertex_part[scene->segments[s][0]] == p)
                fprintf(out, "l %" PRIu32 " %" PRIu32 "\n", scene->segments[s][0] + 1, scene->segments[s][1] + 1);
        for (size_t t = 0; t < scene->triangle_count; t++)
            if (scene->vertex_part[scene->triangles[t][0]] == p)
                fprintf(out, "f %" PRIu32 " %" PRIu32 " %" PRIu32 "\n", scene->triangles[t][0] + 1,
                        scene->triangles[t][1] + 1, scene->triangles[t][2] + 1);
    }
}

static void write_ply(const exporter *e, FILE *out)
{
    const rdl_scene *scene = e->scene;
    fprintf(out, "ply\nformat ascii 1.0\n");
    for (size_t p = 0; p < scene->part_count; p++)
        fprintf(out, "comment part %zu %s\n", p, cli_clean(scene->parts[p].name));
    fprintf(out, "element vertex %zu\nproperty double x\nproperty double y\nproperty double z\n", scene->vertex_count);
    fprintf(out, "element face %zu\nproperty list uchar int vertex_indices\nproperty int part\n",
            scene->triangle_count);
    if (scene->segment_count > 0)
        fprintf(out, "element edge %zu\nproperty int vertex1\nproperty int vertex2\nproperty int part\n",
                scene->segment_count);
    fprintf(out, "end_header\n");
    for (size_t v = 0; v < scene->vertex_count; v++)
        fprintf(out, "%.17g %.17g %.17g\n", e->positions[3 * v], e->positions[3 * v + 1], e->positions[3 * v + 2]);
    for (size_t t = 0; t < scene->triangle_count; t++)
        fprintf(out, "3 %" PRIu32 " %" PRIu32 " %" PRIu32 " %" PRIu32 "\n", scene->triangles[t][0],
                scene->triangles[t][1], scene->triangles[t][2], scene->vertex_part[scene->triangles[t][0]]);
    for (size_t s = 0; s < scene->segment_count; s++)
        fprintf(out, "%" PRIu32 " %" PRIu32 " %" PRIu32 "\n", scene->segments[s][0], scene->segments[s][1],
                scene->vertex_part[scene->segments[s][0]]);
}

static int export_frame(exporter *e, size_t frame)
{
    cli_output output;
    rdl_fault fault = {0, ""};
    char name[4096];
    int code = CLI_DONE;
    rdl_status status = rdl_shot_read_positions(e->shot, frame, e->which, e->positions, &fault);
    if (status != RDL_OK)
        return cli_fail("export", e->path, (long long)frame, status, &fault);
    file_name(e, frame, name);
    if (!cli_output_begin(&output, "export", name, e->force, &code))
        return code;
    if (e->ply)
        write_ply(e, output.file);
    else
        write_obj(e, output.file);
    return cli_output_end(&output, "export", &code) ? CLI_DONE : code;
}

/* All files or none: nothing may be in the way of any of them, and a failure takes back those already written. */
static int export_all(exporter *e)
{
    char name[4096];
    int code = CLI_DONE;
    size_t count = e->last + 1 - e->first;
    for (size_t k = e->first; !e->force && k <= e->last; k++) {
        file_name(e, k, name);
        if (access(name, F_OK) == 0)
            return cli_fail("export", name, -1, RDL_FILE_EXISTS, NULL);
    }
    size_t k = e->first;
    for (; code == CLI_DONE && k <= e->last; k++) {
        code = cli_interrupted() ? CLI_INTERRUPTED : export_frame(e, k);
        cli_progress("export", k + 1 - e->first, count);
        if (code != CLI_DONE)
            break;
    }
    cli_progress_end();
    for (size_t done = e->first; code != CLI_DONE && done < k; done++) {
        file_name(e, done, name);
        unlink(name);
    }
    return code;
}

static bool read_bound(const char *text, size_t length, size_t *bound)
{
    char digits[20], *end = NULL;
    if (length == 0)
        return true;
    if (length >= sizeof digits || text[0] < '0' || text[0] > '9')
        return false;
    memcpy(digits, text, length);
    digits[length] = '\0';
    *bound = (size_t)strtoull(digits, &end, 10);
    return *end == '\0';
}

static bool read_frames(exporter *e, const char *text, size_t count)
{
    e->first = 0;
    e->last = count - 1;
    if (text == NULL)
        return true;
    const char *colon = strchr(text, ':');
    size_t left = colon != NULL ? (size_t)(colon - text) : strlen(text);
    bool fine = read_bound(text, left, &e->first);
    if (colon != NULL)
        fine = fine && read_bound(colon + 1, strlen(colon + 1), &e->last);
    else
        e->last = e->first;
    if (!fine || text[0] == '\0' || e->first > e->last || e->last >= count) {
        cli_error("export", "--frames: %s does not name frames of a shot of %zu", cli_clean(text), count);
        return false;
    }
    return true;
}

static bool read_which(exporter *e, const char *text, unsigned contents)
{
    static const struct {
        const char *name;
        unsigned bit;
    } states[] = {{"delivered", RDL_SHOT_DELIVERED}, {"start", RDL_SHOT_START}, {"proposed", RDL_SHOT_PROPOSED}};
    for (size_t i = 0; i < 3; i++)
        if ((contents & states[i].bit) != 0 && (text == NULL || strcmp(text, states[i].name) == 0)) {
            e->which = states[i].bit;
            return true;
        }
    cli_error("export", "--which: the shot has no %s positions", cli_clean(text));
    return false;
}

static int run(exporter *e, const cli_line *line)
{
    struct stat info;
    int code = CLI_DONE;
    if (!cli_open_shot("export", e->path, &e->shot, &code))
        return code;
    const rdl_shot_info *about = rdl_shot_describe(e->shot);
    e->scene = rdl_shot_scene(e->shot);
    if (about->frame_count == 0) {
        cli_error("export", "%s: the shot has no frames", cli_clean(e->path));
        return CLI_BAD_INPUT;
    }
    if (!read_frames(e, cli_value(&spec, line, "frames"), about->frame_count) ||
        !read_which(e, cli_value(&spec, line, "which"), about->contents))
        return CLI_BAD_INPUT;
    e->folder = stat(e->prefix, &info) == 0 && S_ISDIR(info.st_mode);
    e->width = 4;
    for (size_t top = 10000; about->frame_count > top; top *= 10)
        e->width++;
    e->positions = malloc(3 * e->scene->vertex_count * sizeof *e->positions);
    if (e->positions == NULL)
        return cli_fail("export", e->path, -1, RDL_NO_MEMORY, NULL);
    code = e->scrambled ? export_scrambled(e, (uint64_t)e->seed) : e->vtk ? export_vtk(e) : export_all(e);
    if (code == CLI_DONE)
        printf("%zu files\n", e->scrambled || e->vtk ? 1 : e->last + 1 - e->first);
    return code;
}

int verb_export(int argc, char **argv)
{
    cli_line line;
    int code = CLI_DONE;
    exporter e = {0};
    if (!cli_read(&spec, argc, argv, &line, &code))
        return code;
    const char *format = cli_value(&spec, &line, "format");
    e.path = line.operands[0];
    e.prefix = cli_value(&spec, &line, "o");
    e.force = cli_value(&spec, &line, "force") != NULL;
    e.ply = format != NULL && strcmp(format, "ply") == 0;
    e.extension = e.ply ? "ply" : "obj";
    if (e.prefix == NULL || e.prefix[0] == '\0') {
        cli_error("export", "-o PREFIX is missing: where to write the files");
        return CLI_BAD_INPUT;
    }
    if (format != NULL && strcmp(format, "obj") != 0 && !e.ply) {
        cli_error("export", "--format: %s is neither obj nor ply", cli_clean(format));
        return CLI_BAD_INPUT;
    }
    const char *seed = cli_value(&spec, &line, "seed");
    e.seed = 1;
    e.scrambled = cli_value(&spec, &line, "scrambled") != NULL;
    e.vtk = cli_value(&spec, &line, "vtkhdf") != NULL;
    if (seed != NULL && !cli_number(&spec, "seed", seed, 0, 1e9, true, &e.seed))
        return CLI_BAD_INPUT;
    if (e.scrambled + e.vtk + (format != NULL) > 1) {
        cli_error("export", "--format, --vtkhdf and --scrambled exclude each other");
        return CLI_BAD_INPUT;
    }
    if (strlen(e.prefix) > 4000) {
        cli_error("export", "%s: the name is too long", cli_clean(e.prefix));
        return CLI_BAD_INPUT;
    }
    code = run(&e, &line);
    free(e.positions);
    rdl_shot_close(e.shot);
    return code;
}
