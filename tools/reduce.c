/* reduce.c: `raddle reduce`: the smallest scene and the plainest motion that still show a failure. */
#include "reduce.h"

#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "verbs.h"

static const cli_option options[] = {
    {"frame", "K", "the frame to reduce (default 0; of poses: the motion from pose K - 1 to pose K)"},
    {"keep", "WHAT", "what must still show: see below"},
    {"as-given", NULL, "crossing and intersect: judge start -> proposed, without the engine"},
    {"o", "SHOT", "the shot to write; its mesh, still and C test lie beside it"},
    {"force", NULL, "replace what is there"},
    {"resume", NULL, "go on from SHOT where an earlier run ended"},
    {"jobs", "N", "tests at a time (default: all processors); the result does not depend on it"},
    {"seconds", "S", "end after S seconds with the best so far"},
    {"json", NULL, "print one JSON object"},
};

static const cli_spec spec = {
    .verb = "reduce",
    .operands = "SHOT",
    .summary = "Cuts a frame down by delta debugging: parts, connected pieces, elements and motion go as long as what is\n"
               "to be kept still shows. Writes a shot, a mesh (.obj), a still (.png) and a self-contained C test (.c).",
    .notes = "WHAT is one of\n"
             "  verdict:NAME     the engine's verdict: clear, resolved, pinched or tangled\n"
             "  crossing         a pair crosses on the way that the engine delivers (--as-given: on the proposed one)\n"
             "  intersect        an edge pierces a triangle at the start or the end\n"
             "  missed           a crossing on the delivered way, and the verdict is clear or resolved\n"
             "  differs          the bits depend on threads or vector code, or on a setting given here\n"
             "  NUMBER>BOUND     passes, pairs, touches, zones, substeps, held or correction (m) of the report\n"
             "  command:TEXT     a shell command, given a shot as \"$1\", ends as it does for the whole frame\n"
             "An interrupt keeps the best so far (exit code 130).",
    .options = options,
    .option_count = sizeof options / sizeof options[0],
    .operands_min = 1,
    .operands_max = 1,
    .settings = true};

typedef struct job {
    const char *path, *out, *stem;
    char *stem_room;
    bool json, force, resume;
    size_t frame;
    rdl_shot *shot;
    scenario s;
    reducer r;
    size_t elements_before, vertices_before;
    double saved; /* when the best was last written */
    int write_code;
} job;

static size_t elements_of(const rdl_scene *scene)
{
    return scene->segment_count + scene->triangle_count;
}

static int write_best(job *j, bool all)
{
    reduced best;
    char path[4200];
    if (!reduced_cut(&j->s, j->r.mask, j->r.start, j->r.proposed, &best))
        return cli_fail("reduce", j->out, -1, RDL_NO_MEMORY, NULL);
    int code = reduce_write_shot(&best, &j->r.keep, j->out);
    if (code == CLI_DONE && all) {
        snprintf(path, sizeof path, "%s.obj", j->stem);
        code = reduce_write_mesh(&best, path);
        snprintf(path, sizeof path, "%s.c", j->stem);
        if (code == CLI_DONE && j->r.keep.kind != KEEP_COMMAND)
            code = reduce_write_test(&best, &j->r.keep, &j->r.best, path);
        snprintf(path, sizeof path, "%s.png", j->stem);
        if (code == CLI_DONE)
            code = reduce_write_still(&best, &j->r.best, path);
    }
    reduced_release(&best);
    return code;
}

/* Progress, and a best that outlives a kill. */
static void on_improved(reducer *r, void *user)
{
    enum { SAVE_EVERY = 5 };
    job *j = user;
    double now = cli_clock();
    if (isatty(STDERR_FILENO)) {
        fprintf(stderr, "\rraddle reduce: %zu of %zu elements, %zu tests\033[K", r->kept, r->element_count, r->tests);
        fflush(stderr);
    }
    if (now - j->saved < SAVE_EVERY || r->keep.kind == KEEP_COMMAND)
        return;
    j->saved = now;
    j->write_code = write_best(j, false);
}

static bool in_the_way(const job *j)
{
    static const char *const endings[] = {".obj", ".c", ".png"};
    char path[4200];
    if (j->force || j->resume)
        return false;
    for (size_t k = 0; k < 4; k++) {
        if (k == 0)
            snprintf(path, sizeof path, "%s", j->out);
        else
            snprintf(path, sizeof path, "%s%s", j->stem, endings[k - 1]);
        if (access(path, F_OK) == 0) {
            cli_fail("reduce", path, -1, RDL_FILE_EXISTS, NULL);
            return true;
        }
    }
    return false;
}

static int open_frame(job *j)
{
    int code = CLI_DONE;
    rdl_fault fault = {0, ""};
    bool go_on = j->resume && access(j->out, F_OK) == 0;
    const char *path = go_on ? j->out : j->path;
    if (!cli_open_shot("reduce", path, &j->shot, &code))
        return code;
    const rdl_shot_info *about = rdl_shot_describe(j->shot);
    size_t frame = go_on ? 0 : j->frame;
    unsigned steps = RDL_SHOT_START | RDL_SHOT_PROPOSED;
    bool poses = (about->contents & steps) != steps;
    if (about->unknown_setting != NULL) {
        cli_error("reduce", "%s: settings/%s: this version does not have that setting", cli_clean(path),
                  cli_clean(about->unknown_setting));
        return CLI_BAD_INPUT;
    }
    if (poses && (about->contents & RDL_SHOT_DELIVERED) == 0) {
        cli_error("reduce", "%s: frames/proposed is missing", cli_clean(path));
        return CLI_BAD_INPUT;
    }
    if (frame >= about->frame_count || (poses && frame == 0)) {
        cli_error("reduce", "%s: --frame %zu: the shot has %s %d to %lld", cli_clean(path), frame,
                  poses ? "motions to poses" : "frames", poses, (long long)about->frame_count - 1);
        return CLI_BAD_INPUT;
    }
    if (poses && j->r.keep.kind != KEEP_CROSSING && j->r.keep.kind != KEEP_INTERSECT &&
        j->r.keep.kind != KEEP_COMMAND) {
        cli_error("reduce", "%s: poses alone have crossings and intersections, not %s", cli_clean(path),
                  cli_clean(j->r.keep.text));
        return CLI_BAD_INPUT;
    }
    j->r.keep.as_given = j->r.keep.as_given || poses;
    rdl_status status = scenario_read(&j->s, j->shot, frame, &fault);
    return status == RDL_OK ? CLI_DONE : cli_fail("reduce", path, (long long)frame, status, &fault);
}

static int begin_search(job *j)
{
    reducer *r = &j->r;
    const rdl_scene *scene = &j->s.scene;
    size_t state = 3 * scene->vertex_count * sizeof(double);
    r->whole = &j->s;
    r->element_count = elements_of(scene);
    j->elements_before = r->element_count;
    j->vertices_before = scene->vertex_count;
    r->mask = malloc(r->element_count + 1);
    r->start = malloc(state);
    r->proposed = malloc(state);
    if (r->mask == NULL || r->start == NULL || r->proposed == NULL)
        return cli_fail("reduce", j->path, -1, RDL_NO_MEMORY, NULL);
    memset(r->mask, 1, r->element_count);
    memcpy(r->start, j->s.start, state);
    memcpy(r->proposed, j->s.proposed, state);
    r->improved = on_improved;
    r->user = j;
    r->begun = j->saved = cli_clock();
    if (r->keep.kind == KEEP_COMMAND) { /* the code to look for */
        finding first;
        r->keep.exit_code = -2;
        reduce_try(r, r->mask, r->start, r->proposed, &first);
        int code = 0;
        if (cli_interrupted())
            return CLI_INTERRUPTED;
        if (sscanf(first.what, "the command ends with code %d", &code) != 1 || code < 0) {
            cli_error("reduce", "--keep: the command could not be run");
            return CLI_NOT_FINISHED;
        }
        r->keep.exit_code = code;
    }
    /* What does not need the engine's memory is shown without it. */
    bool had_memory = j->s.has_memory;
    j->s.has_memory = false;
    if (reduce_try(r, r->mask, r->start, r->proposed, &r->best))
        return CLI_DONE;
    j->s.has_memory = had_memory;
    if (had_memory && reduce_try(r, r->mask, r->start, r->proposed, &r->best)) {
        cli_error("reduce", "%s: frame %zu: shows only with the engine's recorded memory, which belongs to the whole scene: "
                            "only the motion is reduced", cli_clean(j->path), j->frame);
        return CLI_DONE;
    }
    if (cli_interrupted())
        return CLI_INTERRUPTED; /* nothing was found out */
    cli_error("reduce", "%s: frame %zu does not show: %s", cli_clean(j->path), j->frame, cli_clean(r->keep.text));
    return CLI_BAD_INPUT;
}

static json_t *make_json(const job *j, const reduced *best)
{
    json_t *vertices = json_array(), *elements = json_array();
    for (size_t v = 0; v < best->s.scene.vertex_count; v++)
        json_array_append_new(vertices, json_integer(best->origin[v]));
    for (size_t e = 0; e < elements_of(&best->s.scene); e++)
        json_array_append_new(elements,
                              json_pack("{s:s, s:I}", "kind", e < best->s.scene.segment_count ? "segment" : "triangle",
                                        "was", (json_int_t)best->element_origin[e]));
    return json_pack("{s:o, s:o, s:I, s:o, s:s, s:I, s:I, s:I, s:I, s:I, s:f, s:b, s:o, s:o}", "file", cli_json_text(j->path),
                     "output", cli_json_text(j->out), "frame", (json_int_t)j->frame, "keep",
                     cli_json_text(j->r.keep.text), "what", j->r.best.what, "elements_before",
                     (json_int_t)j->elements_before, "elements", (json_int_t)elements_of(&best->s.scene),
                     "vertices_before", (json_int_t)j->vertices_before, "vertices",
                     (json_int_t)best->s.scene.vertex_count, "tests", (json_int_t)j->r.tests, "seconds",
                     cli_clock() - j->r.begun, "out_of_time", (int)j->r.out_of_time, "vertices_were", vertices,
                     "elements_were", elements);
}

static int say(const job *j, int code)
{
    reduced best;
    if (!reduced_cut(&j->s, j->r.mask, j->r.start, j->r.proposed, &best))
        return cli_fail("reduce", j->out, -1, RDL_NO_MEMORY, NULL);
    if (j->json) {
        code = cli_print_json("reduce", make_json(j, &best), code);
    } else {
        printf("%s: %s\n", cli_clean(j->r.keep.text), j->r.best.what);
        printf("%zu of %zu elements, %zu of %zu vertices, after %zu tests%s\n", elements_of(&best.s.scene),
               j->elements_before, best.s.scene.vertex_count, j->vertices_before, j->r.tests,
               j->r.out_of_time ? "; out of time" : "");
        printf("%s\n", cli_clean(j->out));
    }
    reduced_release(&best);
    return code;
}

static int run(job *j)
{
    int code = begin_search(j);
    if (code != CLI_DONE)
        return code;
    rdl_status status = reduce_search(&j->r);
    cli_progress_end();
    if (isatty(STDERR_FILENO))
        fprintf(stderr, "\r\033[K");
    if (status == RDL_NO_MEMORY)
        return cli_fail("reduce", j->path, (long long)j->frame, status, NULL);
    code = write_best(j, true);
    if (code == CLI_DONE)
        code = j->write_code;
    if (code != CLI_DONE)
        return code;
    code = say(j, CLI_DONE);
    return status == RDL_CANCELLED && code == CLI_DONE ? CLI_INTERRUPTED : code;
}

static bool take_numbers(job *j, const cli_line *line)
{
    const char *frame = cli_value(&spec, line, "frame"), *jobs = cli_value(&spec, line, "jobs");
    const char *seconds = cli_value(&spec, line, "seconds");
    long processors = sysconf(_SC_NPROCESSORS_ONLN);
    double k = 0, n = processors > 0 ? (double)processors : 1;
    if ((frame != NULL && !cli_number(&spec, "frame", frame, 0, 2147483647, true, &k)) ||
        (jobs != NULL && !cli_number(&spec, "jobs", jobs, 1, 64, true, &n)) ||
        (seconds != NULL && !cli_number(&spec, "seconds", seconds, 0.001, 1e9, false, &j->r.seconds_max)))
        return false;
    j->frame = (size_t)k;
    j->r.jobs = (size_t)n;
    return true;
}

static bool take_settings(job *j, const cli_line *line)
{
    predicate *keep = &j->r.keep;
    keep->settings = j->s.settings;
    keep->other = keep->settings;
    rdl_settings *overridden = keep->kind == KEEP_DIFFERS ? &keep->other : &keep->settings;
    for (size_t row = 0; row < CLI_SETTINGS_MAX; row++)
        keep->has_other = keep->has_other || (keep->kind == KEEP_DIFFERS && line->settings[row] != NULL);
    return cli_settings(&spec, line, overridden);
}

static int take_all(job *j, const cli_line *line)
{
    const char *keep = cli_value(&spec, line, "keep");
    j->path = line->operands[0];
    j->out = cli_value(&spec, line, "o");
    j->json = cli_value(&spec, line, "json") != NULL;
    j->force = cli_value(&spec, line, "force") != NULL;
    j->resume = cli_value(&spec, line, "resume") != NULL;
    if (j->out == NULL || keep == NULL) {
        cli_error("reduce", j->out == NULL ? "-o SHOT is missing: where to write the result"
                                           : "--keep WHAT is missing: what must still show");
        return CLI_BAD_INPUT;
    }
    if (strlen(j->out) > 4000) {
        cli_error("reduce", "%s: the name is too long", cli_clean(j->out));
        return CLI_BAD_INPUT;
    }
    j->stem_room = malloc(strlen(j->out) + 1);
    if (j->stem_room == NULL)
        return cli_fail("reduce", j->out, -1, RDL_NO_MEMORY, NULL);
    strcpy(j->stem_room, j->out);
    char *dot = strrchr(j->stem_room, '.'), *slash = strrchr(j->stem_room, '/');
    if (dot != NULL && dot != j->stem_room && (slash == NULL || dot > slash + 1))
        *dot = '\0';
    j->stem = j->stem_room;
    j->r.keep.scratch = j->stem;
    j->r.keep.as_given = cli_value(&spec, line, "as-given") != NULL;
    return predicate_read(keep, &j->r.keep) && take_numbers(j, line) ? CLI_DONE : CLI_BAD_INPUT;
}

int verb_reduce(int argc, char **argv)
{
    static cli_line line; /* too large for some stacks */
    static job j;
    int code = CLI_DONE;
    if (!cli_read(&spec, argc, argv, &line, &code))
        return code;
    code = take_all(&j, &line);
    rdl_settings defaults;
    rdl_settings_default(&defaults);
    if (code == CLI_DONE && !cli_settings(&spec, &line, &defaults))
        code = CLI_BAD_INPUT; /* before anything is opened */
    if (code == CLI_DONE && !in_the_way(&j)) {
        code = open_frame(&j);
        if (code == CLI_DONE)
            code = take_settings(&j, &line) ? run(&j) : CLI_BAD_INPUT;
    } else if (code == CLI_DONE) {
        code = CLI_BAD_INPUT;
    }
    scenario_release(&j.s);
    rdl_shot_close(j.shot);
    free(j.r.mask);
    free(j.r.start);
    free(j.r.proposed);
    free(j.stem_room);
    return code;
}
