/* replay.c: `raddle replay`: recorded steps once more, alone, and whether the same bits come out. */
#include "replay.h"

#include <inttypes.h>
#include <stdlib.h>
#include <string.h>

#include "verbs.h"

static const cli_option options[] = {
    {"frames", "A[:B]", "replay frames A to B only (default: all)"},
    {"threads", "N", "threads to use (default: all processors)"},
    {"against", "SHOT", "compare with another shot, or with the same one under its recorded settings"},
    {"explain", "PAIR", "tell the life of one pair in one frame: pt:VERTEX:TRIANGLE or ee:EDGE:EDGE"},
    {"trace", NULL, "keep what each stage did in the shot itself (group /trace)"},
    {"tap", NULL, "many shots: one line of the Test Anything Protocol for each"},
    {"json", NULL, "print one JSON object"},
};

const cli_spec replay_spec = {
    .verb = "replay",
    .operands = "SHOT...",
    .summary = "Steps the engine again from each recorded frame's own start, with its recorded memory and settings, and\n"
               "compares the delivered bits. Equal: exit code 0. Otherwise 1, and the first difference is named.",
    .notes = "An overridden setting is reported; with --against it holds for SHOT, not for the other side. Where a shot\n"
             "has a trace (--trace), the first event that differs is named, not only the first vertex.",
    .options = options,
    .option_count = sizeof options / sizeof options[0],
    .operands_min = 1,
    .operands_max = CLI_OPERANDS_MAX,
    .settings = true};

static bool read_range(replayer *r, int *code)
{
    unsigned long long first = 0, last = r->about->frame_count > 0 ? r->about->frame_count - 1 : 0;
    int used = 0;
    const char *text = r->range;
    *code = CLI_BAD_INPUT;
    if (text != NULL && (text[0] < '0' || text[0] > '9' || sscanf(text, "%llu%n", &first, &used) != 1)) {
        cli_error("replay", "--frames: %s is not a frame or A:B", cli_clean(text));
        return false;
    }
    if (text != NULL) {
        const char *rest = text + used;
        last = first;
        if (rest[0] == ':' && (rest[1] < '0' || rest[1] > '9' || sscanf(rest + 1, "%llu%n", &last, &used) != 1 ||
                               rest[1 + used] != '\0')) {
            cli_error("replay", "--frames: %s is not a frame or A:B", cli_clean(text));
            return false;
        }
        if (rest[0] != ':' && rest[0] != '\0') {
            cli_error("replay", "--frames: %s is not a frame or A:B", cli_clean(text));
            return false;
        }
    }
    if (first > last || last >= r->about->frame_count) {
        cli_error("replay", "%s: the shot has frames 0 to %lld, not %llu to %llu", cli_clean(r->path),
                  (long long)r->about->frame_count - 1, first, last);
        return false;
    }
    r->first = (size_t)first;
    r->last = (size_t)last;
    return true;
}

static int check_input(replayer *r)
{
    unsigned steps = RDL_SHOT_START | RDL_SHOT_PROPOSED;
    const char *missing = (r->about->contents & RDL_SHOT_START) == 0 ? "start" : "proposed";
    bool compares = r->against == NULL && r->explain == NULL && !r->trace;
    if ((r->about->contents & steps) == steps && compares && (r->about->contents & RDL_SHOT_DELIVERED) == 0) {
        cli_error("replay", "%s: frames/delivered is missing: nothing to compare with (raddle resolve makes it)",
                  cli_clean(r->path));
        return CLI_BAD_INPUT;
    }
    if ((r->about->contents & steps) != steps) {
        cli_error("replay", "%s: frames/%s is missing: nothing to replay", cli_clean(r->path), missing);
        return CLI_BAD_INPUT;
    }
    if (r->about->unknown_setting != NULL) {
        cli_error("replay", "%s: settings/%s: this version does not have that setting", cli_clean(r->path),
                  cli_clean(r->about->unknown_setting));
        return CLI_BAD_INPUT;
    }
    return CLI_DONE;
}

rdl_status replay_frame(replayer *r, size_t frame, scenario *s, rdl_fault *fault)
{
    rdl_status status = scenario_read(s, r->shot, frame, fault);
    if (status != RDL_OK)
        return status;
    bool wants = r->trace || r->against != NULL || r->explain != NULL;
    if (r->st.engine == NULL)
        status = stepper_create(&r->st, s, &r->settings, r->threads, wants, fault);
    /* Without recorded memory the engine's own lives on where the host went on from what it was given. */
    bool keep = frame > r->first && memcmp(s->start, r->st.result.delivered, 3 * s->scene.vertex_count * sizeof(double)) == 0;
    if (status == RDL_OK)
        status = stepper_run(&r->st, s, keep, fault);
    if (status != RDL_OK)
        scenario_release(s);
    return status;
}

/* The trace that the shot carries says more than the bits alone. */
static rdl_status look_at_trace(replayer *r, const scenario *s, difference *diff, rdl_fault *fault)
{
    const rdl_event *rows = NULL;
    size_t count = 0;
    rdl_status status = rdl_shot_trace_read(r->shot, s->frame, &rows, &count, fault);
    if (status != RDL_OK || rows == NULL)
        return status;
    r->st.wants_events = true;
    status = stepper_run(&r->st, s, true, fault);
    r->st.wants_events = r->trace;
    naming names = naming_of(s, &r->st);
    if (status == RDL_OK)
        events_differ(&names, r->st.events.rows, r->st.events.count, rows, count, diff);
    return status;
}

static rdl_status compare_frame(replayer *r, const scenario *s, rdl_fault *fault)
{
    static const char *const verdicts[] = {"clear", "resolved", "pinched", "tangled"};
    difference diff = {.frame = s->frame};
    naming names = naming_of(s, &r->st);
    bool differs = s->has_delivered && states_differ(&names, "delivered", r->st.result.delivered, s->delivered, &diff);
    rdl_verdict verdict = r->st.result.report.verdict;
    if (!differs && s->has_verdict && (uint8_t)verdict != s->recorded.verdict) {
        differs = diff.found = true;
        diff.stage = "verdict";
        snprintf(diff.here, NAME_ROOM, "%s", verdicts[verdict]);
        snprintf(diff.there, NAME_ROOM, "%s", verdicts[s->recorded.verdict]);
    }
    r->frames++;
    r->seconds += r->st.result.report.seconds[RDL_TIME_TOTAL];
    r->limited += s->recorded.seconds_max > 0;
    r->equal += s->has_delivered && !differs;
    if (!differs)
        return RDL_OK;
    rdl_status status = r->differing++ == 0 ? look_at_trace(r, s, &diff, fault) : RDL_OK;
    if (!r->diff.found)
        r->diff = diff;
    return status;
}

static rdl_status keep_trace(replayer *r, size_t frame, rdl_fault *fault)
{
    char note[64];
    snprintf(note, sizeof note, "engine %s%s", rdl_version(), r->overridden ? ", settings overridden" : "");
    rdl_status status = r->tracer == NULL ? rdl_shot_trace_begin(r->path, &r->tracer, fault) : RDL_OK;
    if (status == RDL_OK)
        status = rdl_shot_trace_add(r->tracer, frame, r->st.events.rows, r->st.events.count, note, fault);
    return status;
}

static int replay_all(replayer *r)
{
    for (size_t k = r->first; k <= r->last; k++) {
        rdl_fault fault = {0, ""};
        scenario s;
        rdl_status status = cli_interrupted() ? RDL_CANCELLED : replay_frame(r, k, &s, &fault);
        if (status == RDL_CANCELLED)
            return CLI_INTERRUPTED;
        if (status != RDL_OK) {
            snprintf(r->reason, sizeof r->reason, "frame %zu: %.60s: %.200s", k, fault.field, rdl_status_text(status));
            return r->tap ? CLI_BAD_INPUT : cli_fail("replay", r->path, (long long)k, status, &fault);
        }
        status = compare_frame(r, &s, &fault);
        if (status == RDL_OK && r->trace)
            status = keep_trace(r, k, &fault);
        scenario_release(&s);
        if (status != RDL_OK)
            return cli_fail("replay", r->path, (long long)k, status, &fault);
        cli_progress("replay", k - r->first + 1, r->last - r->first + 1);
    }
    cli_progress_end();
    rdl_fault fault = {0, ""};
    rdl_status status = r->tracer != NULL ? rdl_shot_trace_finish(r->tracer, &fault) : RDL_OK;
    r->tracer = NULL;
    if (status != RDL_OK)
        return cli_fail("replay", r->path, -1, status, &fault);
    return r->differing > 0 ? CLI_FINDINGS : CLI_DONE;
}

/* ---- what was overridden, and the result ---- */

static json_t *overrides_json(const replayer *r)
{
    size_t count = 0;
    const rdl_setting_info *table = rdl_settings_table(&count);
    json_t *object = json_object();
    for (size_t row = 0; row < count; row++) {
        double value;
        memcpy(&value, (const char *)&r->settings + table[row].offset, sizeof value);
        if (r->line->settings[row] != NULL)
            json_object_set_new(object, table[row].name, json_real(value));
    }
    return object;
}

static void print_overrides(const replayer *r)
{
    size_t count = 0;
    const rdl_setting_info *table = rdl_settings_table(&count);
    for (size_t row = 0; row < count; row++) {
        double value, recorded;
        memcpy(&value, (const char *)&r->settings + table[row].offset, sizeof value);
        memcpy(&recorded, (const char *)&r->about->settings + table[row].offset, sizeof recorded);
        if (r->line->settings[row] != NULL)
            printf("overridden: %s %.9g (%s %.9g)\n", table[row].name, value,
                   r->about->has_settings ? "recorded:" : "default:", recorded);
    }
}

static json_t *difference_json(const difference *diff)
{
    if (!diff->found)
        return json_null();
    return json_pack("{s:I, s:s, s:I, s:o, s:o, s:o}", "frame", (json_int_t)diff->frame, "stage", diff->stage,
                     "detection", (json_int_t)diff->detection, "element", cli_json_text(diff->element), "here",
                     cli_json_text(diff->here), "there", cli_json_text(diff->there));
}

static void print_difference(const replayer *r)
{
    const difference *diff = &r->diff;
    printf("first difference: frame %zu, %s", diff->frame, diff->stage);
    if (strcmp(diff->stage, "delivered") != 0 && strcmp(diff->stage, "verdict") != 0 &&
        strcmp(diff->stage, "input") != 0)
        printf(" of detection %" PRIu32, diff->detection);
    printf("%s%s\n  %s: %s\n  %s: %s\n", diff->element[0] != '\0' ? ": " : "", diff->element,
           r->against != NULL ? "this shot " : "now     ", diff->here, r->against != NULL ? "the other" : "recorded",
           diff->there);
}

static int say(replayer *r, int code)
{
    if (r->json)
        return cli_print_json(
            "replay",
            json_pack("{s:o, s:o, s:I, s:I, s:I, s:I, s:o, s:o, s:i, s:I, s:f}", "file", cli_json_text(r->path), "against",
                      r->against != NULL ? cli_json_text(r->against) : json_null(), "frames", (json_int_t)r->frames,
                      "equal", (json_int_t)r->equal, "differing", (json_int_t)r->differing, "first_frame",
                      (json_int_t)r->first, "first_difference", difference_json(&r->diff), "overridden",
                      overrides_json(r), "threads", (int)r->st.result.report.threads, "limited_in_time",
                      (json_int_t)r->limited, "seconds", r->seconds),
            code);
    print_overrides(r);
    if (r->diff.found)
        print_difference(r);
    if (r->limited > 0)
        printf("%zu frames had a limit in time, which gives up repeatable bits\n", r->limited);
    if (r->against != NULL)
        printf("%s and %s: %zu frames compared, %zu differ\n", cli_clean(r->path), cli_clean(r->against), r->frames,
               r->differing);
    else
        printf("%s: %zu frames replayed, %zu equal, %zu differ\n", cli_clean(r->path), r->frames, r->equal,
               r->differing);
    return code;
}

static void close_all(replayer *r)
{
    stepper_release(&r->st);
    stepper_release(&r->other_st);
    rdl_shot_close(r->shot);
    rdl_shot_close(r->other);
    rdl_shot_trace_discard(r->tracer);
}

/* One shot, from opening it to the exit code. */
static int run(replayer *r)
{
    int code = CLI_DONE;
    if (!cli_open_shot("replay", r->path, &r->shot, &code)) {
        snprintf(r->reason, sizeof r->reason, "the shot cannot be opened");
        return code;
    }
    r->about = rdl_shot_describe(r->shot);
    r->settings = r->about->settings;
    code = check_input(r);
    if (code != CLI_DONE)
        return code;
    if (!cli_settings(&replay_spec, r->line, &r->settings) || !read_range(r, &code))
        return CLI_BAD_INPUT;
    for (size_t row = 0; row < CLI_SETTINGS_MAX; row++)
        r->overridden = r->overridden || r->line->settings[row] != NULL;
    if (r->explain != NULL)
        return replay_explain(r);
    code = r->against != NULL ? replay_compare(r) : replay_all(r);
    if (r->tap || (code != CLI_DONE && code != CLI_FINDINGS))
        return code;
    return say(r, code);
}

/* One test line per shot. */
static int run_list(const replayer *plan, const cli_line *line)
{
    size_t bad = 0;
    printf("1..%zu\n", line->operand_count);
    for (size_t k = 0; k < line->operand_count; k++) {
        replayer r = *plan;
        r.path = line->operands[k];
        int code = run(&r);
        if (code == CLI_INTERRUPTED) {
            printf("Bail out! interrupted\n");
            close_all(&r);
            return code;
        }
        printf("%s %zu - %s\n", code == CLI_DONE ? "ok" : "not ok", k + 1, cli_clean(r.path));
        if (r.diff.found)
            printf("# frame %zu, %s: %s\n# now:      %s\n# recorded: %s\n", r.diff.frame, r.diff.stage, r.diff.element,
                   r.diff.here, r.diff.there);
        else if (code != CLI_DONE)
            printf("# %s\n", r.reason[0] != '\0' ? cli_clean(r.reason) : "not a shot to replay");
        fflush(stdout);
        bad += code != CLI_DONE;
        close_all(&r);
    }
    return bad > 0 ? CLI_FINDINGS : CLI_DONE;
}

int verb_replay(int argc, char **argv)
{
    static cli_line line; /* too large for some stacks */
    int code = CLI_DONE;
    double threads = 0;
    if (!cli_read(&replay_spec, argc, argv, &line, &code))
        return code;
    const char *threads_text = cli_value(&replay_spec, &line, "threads");
    replayer r = {.line = &line};
    r.range = cli_value(&replay_spec, &line, "frames");
    r.against = cli_value(&replay_spec, &line, "against");
    r.explain = cli_value(&replay_spec, &line, "explain");
    r.trace = cli_value(&replay_spec, &line, "trace") != NULL;
    r.tap = cli_value(&replay_spec, &line, "tap") != NULL;
    r.json = cli_value(&replay_spec, &line, "json") != NULL;
    if (threads_text != NULL && !cli_number(&replay_spec, "threads", threads_text, 1, RDL_THREADS_MAX, true, &threads))
        return CLI_BAD_INPUT;
    r.threads = (unsigned)threads;
    if (line.operand_count > 1 && !r.tap) {
        cli_error("replay", "unexpected argument %s (--tap takes many shots)", cli_clean(line.operands[1]));
        return CLI_BAD_INPUT;
    }
    if ((r.against != NULL) + (r.explain != NULL) + r.trace + r.tap > 1) {
        cli_error("replay", "--against, --explain, --trace and --tap exclude each other");
        return CLI_BAD_INPUT;
    }
    if (r.tap)
        return run_list(&r, &line);
    r.path = line.operands[0];
    code = run(&r);
    close_all(&r);
    return code;
}
