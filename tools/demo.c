/* demo.c: `raddle demo`: options, and the table at the end. */
#include "demo.h"

#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include "cli.h"
#include "verbs.h"

static const cli_option OPTIONS[] = {
    {"o", "SHOT", "the shot to write [demo.h5]"},
    {"stills", "DIR", "folder of the stills [that of the shot]"},
    {"no-stills", NULL, "draw none"},
    {"no-response", NULL, "the integrator alone: delivered = proposed"},
    {"pictures", "N", "play the first N pictures of 24 a second [120]"},
    {"threads", "N", "threads of the engine [all processors]"},
    {"body", "FILE", "another closed mesh, z up, instead of the figure"},
    {"small", NULL, "a coarse cloth with few strands, and 12 pictures"},
    {"json", NULL, "one object on standard output instead of the table"},
    {"force", NULL, "replace existing files"}};

static const cli_spec SPEC = {
    .verb = "demo", .operands = "",
    .summary = "Lowers a fringed poncho over a figure and drags it over the shoulders while the figure turns: a small\n"
               "implicit integrator plays the scene, with raddle behind it. Writes the shot and three stills.",
    .options = OPTIONS, .option_count = sizeof OPTIONS / sizeof OPTIONS[0]};

static bool read_count(const cli_line *line, const char *name, double highest, double initial, double *value)
{
    const char *text = cli_value(&SPEC, line, name);
    *value = initial;
    return text == NULL || cli_number(&SPEC, name, text, 1, highest, true, value);
}

static bool read_options(const cli_line *line, demo_options *options)
{
    double pictures = 0, threads = 0;
    const char *shot = cli_value(&SPEC, line, "o"), *body = cli_value(&SPEC, line, "body");
    options->small = cli_value(&SPEC, line, "small") != NULL;
    options->json = cli_value(&SPEC, line, "json") != NULL;
    options->force = cli_value(&SPEC, line, "force") != NULL;
    options->stills = cli_value(&SPEC, line, "no-stills") == NULL;
    options->respond = cli_value(&SPEC, line, "no-response") == NULL;
    options->shot = shot != NULL ? shot : "demo.h5";
    options->body = body != NULL ? body : DEMO_BODY_FILE;
    options->folder = cli_value(&SPEC, line, "stills");
    if (!read_count(line, "pictures", 100000, options->small ? 12 : 120, &pictures) ||
        !read_count(line, "threads", RDL_THREADS_MAX, 0, &threads))
        return false;
    options->pictures = (size_t)pictures;
    options->threads = (unsigned)threads;
    return true;
}

/* ---- what was played, for people ---- */

static void print_scene(const demo_scene *scene, const demo_options *options)
{
    const host *h = scene->h;
    printf("A fringed poncho over a turning figure: %s\n\n",
           options->respond ? "the integrator with raddle behind it" : "the integrator alone, without raddle");
    printf("  cloth    %7zu triangles  %6zu vertices   0.25 kg/m^2, 1.5 mm thick\n", scene->cloth_triangle_count,
           h->parts[0].vertex_count);
    printf("  fringe   %7zu strands    %6zu segments   0.45 g/m, 1.2 mm thick\n", scene->strand_count,
           h->segment_count);
    printf("  figure   %7zu triangles  %6zu vertices   %.2f m tall, closed, does not cut itself\n",
           h->triangle_count - scene->cloth_triangle_count, scene->body_count, DEMO_HEIGHT);
    printf("  time     %7zu pictures   %6zu steps      %zu a picture, %.1f ms each\n\n", options->pictures,
           options->pictures * scene->steps_per_picture, scene->steps_per_picture, 1e3 * scene->step);
    fflush(stdout);
}

static void print_row(const char *left, double left_value, int digits, const char *right, double right_value)
{
    printf("  %-22s %12.*f     %-12s %9.2f s\n", left, digits, left_value, right, right_value);
}

static void print_table(const demo_result *r, const demo_options *options)
{
    double steps = r->steps ? (double)r->steps : 1;
    if (options->respond) {
        print_row("steps clear", (double)r->verdicts[RDL_CLEAR], 0, "integrator", r->host_seconds);
        print_row("steps resolved", (double)r->verdicts[RDL_RESOLVED], 0, "boxes", r->seconds[RDL_TIME_BOXES]);
        print_row("steps pinched", (double)r->verdicts[RDL_PINCHED], 0, "pairs", r->seconds[RDL_TIME_PAIRS]);
        print_row("steps tangled", (double)r->verdicts[RDL_TANGLED], 0, "touches", r->seconds[RDL_TIME_TOUCHES]);
        print_row("touches", (double)r->touches, 0, "response", r->seconds[RDL_TIME_RESPONSE]);
        print_row("zones", (double)r->zones, 0, "verify", r->seconds[RDL_TIME_VERIFY]);
        print_row("passes", (double)r->passes, 0, "raddle", r->seconds[RDL_TIME_TOTAL]);
        print_row("vertices corrected", (double)r->moved, 0, "shot file", r->shot_seconds);
        print_row("vertices held", (double)r->held, 0, "stills", r->stills_seconds);
        print_row("largest correction, mm", 1e3 * r->worst_correction, 3, "all", r->total_seconds);
    } else {
        print_row("steps", (double)r->steps, 0, "integrator", r->host_seconds);
        print_row("solver iterations", (double)r->solver_iterations, 0, "shot file", r->shot_seconds);
        print_row("a step", (double)r->solver_iterations / steps, 1, "all", r->total_seconds);
    }
    printf("\n  shot     %s\n", cli_clean(options->shot));
    for (size_t k = 0; k < r->still_count; k++)
        printf("  still    %s\n", cli_clean(r->stills[k]));
    if (!options->respond)
        printf("\n`raddle check` on this shot counts the crossings that raddle would have prevented.\n");
    if (r->interrupted)
        printf("\nInterrupted after %zu of %zu pictures; the shot holds what was played.\n", r->pictures,
               options->pictures);
}

static int print_json(const demo_scene *scene, const demo_result *r, const demo_options *options, int code)
{
    json_t *stills = json_array();
    for (size_t k = 0; k < r->still_count; k++)
        json_array_append_new(stills, cli_json_text(r->stills[k]));
    const double *s = r->seconds;
    json_t *seconds = json_pack("{s:f, s:f, s:f, s:f, s:f, s:f, s:f, s:f, s:f, s:f}", "boxes", s[RDL_TIME_BOXES],
                                "pairs", s[RDL_TIME_PAIRS], "touches", s[RDL_TIME_TOUCHES], "response",
                                s[RDL_TIME_RESPONSE], "verify", s[RDL_TIME_VERIFY], "total", s[RDL_TIME_TOTAL], "host",
                                r->host_seconds, "shot", r->shot_seconds, "stills", r->stills_seconds, "all",
                                r->total_seconds);
    json_t *object = json_pack(
        "{s:b, s:I, s:I, s:I, s:I, s:I, s:I, s:I, s:I, s:I, s:I, s:I, s:f, s:o, s:I, s:I, s:I, s:o, s:o, s:b}",
        "response", options->respond, "frames", (json_int_t)r->steps, "pictures", (json_int_t)r->pictures,
        "clear", (json_int_t)r->verdicts[RDL_CLEAR], "resolved", (json_int_t)r->verdicts[RDL_RESOLVED],
        "pinched", (json_int_t)r->verdicts[RDL_PINCHED], "tangled", (json_int_t)r->verdicts[RDL_TANGLED],
        "held", (json_int_t)r->held, "touches", (json_int_t)r->touches, "zones", (json_int_t)r->zones,
        "passes", (json_int_t)r->passes, "moved", (json_int_t)r->moved, "worst_correction_m", r->worst_correction,
        "seconds", seconds, "threads", (json_int_t)r->threads, "triangles", (json_int_t)scene->cloth_triangle_count,
        "strands", (json_int_t)scene->strand_count, "shot", cli_json_text(options->shot), "stills", stills,
        "interrupted", r->interrupted);
    return cli_print_json("demo", object, code);
}

/* The folder part of the shot's path. */
static char *folder_of(const char *path)
{
    const char *slash = strrchr(path, '/');
    size_t length = slash ? (size_t)(slash - path) : 1;
    char *folder = malloc(length + 2);
    if (folder) {
        memcpy(folder, slash ? path : ".", length);
        if (slash == path)
            folder[length++] = '/';
        folder[length] = '\0';
    }
    return folder;
}

/* Files that exist already are refused at once, not after minutes. Returns an exit code, or CLI_DONE to go on. */
static int may_write(const demo_options *options)
{
    struct stat info;
    if (options->stills && (stat(options->folder, &info) != 0 || !S_ISDIR(info.st_mode))) {
        cli_error("demo", "%s: no such folder", cli_clean(options->folder));
        return CLI_BAD_INPUT;
    }
    if (!options->force && access(options->shot, F_OK) == 0)
        return cli_fail("demo", options->shot, -1, RDL_FILE_EXISTS, NULL);
    for (int k = 0; options->stills && k < DEMO_STILLS; k++) {
        char path[DEMO_PATH];
        if (demo_still_path(options, k, path, sizeof path) >= sizeof path) {
            cli_error("demo", "%s: the name is too long", cli_clean(options->folder));
            return CLI_BAD_INPUT;
        }
        if (!options->force && access(path, F_OK) == 0)
            return cli_fail("demo", path, -1, RDL_FILE_EXISTS, NULL);
    }
    return CLI_DONE;
}

static int play(const demo_options *options)
{
    mesh body;
    demo_result result;
    char why[1200];
    if (!demo_body_load(options->body, DEMO_HEIGHT, &body, why, sizeof why)) {
        cli_error("demo", "%s", cli_clean(why));
        return CLI_BAD_INPUT;
    }
    demo_scene *scene = demo_scene_create(&body, options->small);
    mesh_free(&body);
    if (!scene) {
        cli_error("demo", "%s", rdl_status_text(RDL_NO_MEMORY));
        return CLI_NOT_FINISHED;
    }
    if (!options->json)
        print_scene(scene, options);
    int code = demo_play(scene, options, &result);
    if (code == CLI_DONE) {
        if (result.verdicts[RDL_PINCHED] || result.verdicts[RDL_TANGLED])
            code = CLI_FINDINGS;
        if (result.interrupted)
            code = CLI_INTERRUPTED;
        if (options->json)
            code = print_json(scene, &result, options, code);
        else
            print_table(&result, options);
    }
    demo_scene_destroy(scene);
    return code;
}

int verb_demo(int argc, char **argv)
{
    demo_options options;
    cli_line line;
    int code;
    if (!cli_read(&SPEC, argc, argv, &line, &code))
        return code;
    if (!read_options(&line, &options))
        return CLI_BAD_INPUT;
    char *folder = folder_of(options.shot);
    if (!folder) {
        cli_error("demo", "%s", rdl_status_text(RDL_NO_MEMORY));
        return CLI_NOT_FINISHED;
    }
    if (!options.folder)
        options.folder = folder;
    cli_catch_interrupts();
    code = may_write(&options);
    if (code == CLI_DONE)
        code = play(&options);
    free(folder);
    return code;
}
