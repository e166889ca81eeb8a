/* Recorders and watches: what a host's steps leave in a file, and that looking changes nothing. */
#include <check.h>
#include <math.h>
#include <signal.h>
#include <stdbool.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/wait.h>
#include <time.h>
#include <unistd.h>

#include "raddle/recorder.h"
#include "raddle/watch.h"
#include "shot_support.h"

/* A square of cloth that is moved up and down over a driven plate by a host of a few lines. */
enum { SIDE = 5, CLOTH = SIDE * SIDE, COUNT = CLOTH + 4, FACES = 2 * (SIDE - 1) * (SIDE - 1) + 2, STEPS = 12 };

typedef struct world {
    uint32_t part[COUNT], faces[FACES][3];
    double mass[COUNT], now[COUNT][3], next[COUNT][3];
    float narrow[COUNT][3];
    rdl_part parts[2];
    rdl_scene scene;
    rdl_engine *engine;
    bool is_narrow; /* a host of floats */
    rdl_report report;
} world;

static void make_world(world *w)
{
    uint32_t face = 0;
    memset(w, 0, sizeof *w);
    for (uint32_t v = 0; v < COUNT; v++) {
        bool plate = v >= CLOTH;
        uint32_t corner = v - CLOTH;
        w->now[v][0] = plate ? (corner == 1 || corner == 2 ? 0.25 : -0.25) : 0.01 * (v / SIDE);
        w->now[v][1] = plate ? (corner >= 2 ? 0.25 : -0.25) : 0.01 * (v % SIDE);
        w->now[v][2] = plate ? 0 : 0.0625;
        w->mass[v] = plate ? INFINITY : 0.001;
        w->part[v] = plate;
    }
    for (uint32_t i = 0; i + 1 < SIDE; i++)
        for (uint32_t k = 0; k + 1 < SIDE; k++) {
            uint32_t a = i * SIDE + k, rows[2][3] = {{a, a + SIDE, a + 1}, {a + SIDE, a + SIDE + 1, a + 1}};
            memcpy(w->faces[face], rows, sizeof rows);
            face += 2;
        }
    const uint32_t plate[2][3] = {{CLOTH, CLOTH + 1, CLOTH + 2}, {CLOTH, CLOTH + 2, CLOTH + 3}};
    memcpy(w->faces[face], plate, sizeof plate);
    w->parts[0] = (rdl_part){"cloth", RDL_CLOTH, 0.0005, 0};
    w->parts[1] = (rdl_part){"plate", RDL_BODY, 0, 0};
    w->scene = (rdl_scene){.size = sizeof w->scene, .part_count = 2, .parts = w->parts, .vertex_count = COUNT,
                           .vertex_part = w->part, .mass = w->mass, .triangle_count = FACES,
                           .triangles = (const uint32_t(*)[3])w->faces};
    const rdl_host host = {.size = sizeof host, .threads = 1};
    rdl_fault fault = {0, ""};
    ck_assert_int_eq(rdl_engine_create(&w->scene, NULL, &host, &w->engine, &fault), RDL_OK);
}

/* Steps 4 to 6 push the cloth into the plate; delivered is written over proposed. */
static void step_world(world *w, int k, const double *mass)
{
    bool narrow = w->is_narrow;
    double down = k < 4 ? 0.01 : k < 7 ? 0.02 : -0.01;
    for (uint32_t v = 0; v < COUNT; v++)
        for (int c = 0; c < 3; c++)
            w->next[v][c] = w->now[v][c] - (c == 2 && v < CLOTH ? down + 0.0001 * (v % 3) : 0);
    rdl_step step = {.size = sizeof step, .start = {w->now, 0, RDL_FLOAT64}, .proposed = {w->next, 0, RDL_FLOAT64},
                     .delivered = {w->next, 0, RDL_FLOAT64}, .duration = 0.03125, .mass = mass, .passes_max = 30};
    if (narrow)
        step.delivered = (rdl_output_view){w->narrow, 0, RDL_FLOAT32};
    rdl_fault fault = {0, ""};
    w->report.size = sizeof w->report;
    ck_assert_int_eq(rdl_engine_step(w->engine, &step, &w->report, &fault), RDL_OK);
    memcpy(w->now, w->next, sizeof w->now);
    for (uint32_t v = 0; narrow && v < COUNT; v++)
        for (int c = 0; c < 3; c++)
            w->now[v][c] = (double)w->narrow[v][c];
}

static rdl_recorder *record(world *w, const char *name, const rdl_recorder_options *options)
{
    rdl_recorder *recorder = NULL;
    rdl_fault fault = {0, ""};
    ck_assert_int_eq(rdl_recorder_create(scratch(name), w->engine, &w->scene, options, &recorder, &fault), RDL_OK);
    return recorder;
}

static size_t finish(rdl_recorder *recorder, const char *name)
{
    rdl_fault fault = {0, ""};
    rdl_shot *shot = NULL;
    ck_assert_int_eq(rdl_recorder_finish(recorder, &fault), RDL_OK);
    ck_assert_int_eq(rdl_shot_open(scratch(name), &shot, &fault), RDL_OK);
    size_t frames = rdl_shot_describe(shot)->frame_count;
    rdl_shot_close(shot);
    return frames;
}

/* Each frame alone, in a fresh engine, with what the file says. */
static void replay(const char *name, size_t frames, unsigned threads, double vector)
{
    rdl_shot *shot = NULL;
    rdl_fault fault = {0, ""};
    ck_assert_int_eq(rdl_shot_open(scratch(name), &shot, &fault), RDL_OK);
    ck_assert_uint_eq(rdl_shot_describe(shot)->frame_count, frames);
    bool narrow = rdl_shot_describe(shot)->host_bits == RDL_FLOAT32;
    for (size_t k = 0; k < frames; k++) {
        static double start[COUNT][3], proposed[COUNT][3], recorded[COUNT][3], delivered[COUNT][3];
        static float small[COUNT][3];
        rdl_settings settings = rdl_shot_describe(shot)->settings;
        const rdl_host host = {.size = sizeof host, .threads = threads};
        rdl_engine *engine = NULL;
        rdl_shot_frame frame;
        settings.vector = vector;
        ck_assert_int_eq(rdl_engine_create(rdl_shot_scene(shot), &settings, &host, &engine, &fault), RDL_OK);
        ck_assert_int_eq(rdl_shot_read_positions(shot, k, RDL_SHOT_START, start[0], &fault), RDL_OK);
        ck_assert_int_eq(rdl_shot_read_positions(shot, k, RDL_SHOT_PROPOSED, proposed[0], &fault), RDL_OK);
        ck_assert_int_eq(rdl_shot_read_positions(shot, k, RDL_SHOT_DELIVERED, recorded[0], &fault), RDL_OK);
        ck_assert_int_eq(rdl_shot_read_frame(shot, k, &frame, &fault), RDL_OK);
        ck_assert_int_eq(rdl_engine_memory_write(engine, frame.memory, frame.memory_bytes), RDL_OK);
        rdl_step step = {.size = sizeof step, .start = {start, 0, RDL_FLOAT64}, .proposed = {proposed, 0, RDL_FLOAT64},
                         .delivered = {delivered, 0, RDL_FLOAT64}, .duration = frame.duration, .mass = frame.mass,
                         .muted_count = frame.muted_count, .muted_parts = frame.muted_parts,
                         .passes_max = frame.passes_max};
        if (narrow)
            step.delivered = (rdl_output_view){small, 0, RDL_FLOAT32};
        rdl_report report = {.size = sizeof report};
        ck_assert_int_eq(rdl_engine_step(engine, &step, &report, &fault), RDL_OK);
        for (uint32_t v = 0; narrow && v < COUNT; v++)
            for (int c = 0; c < 3; c++)
                delivered[v][c] = (double)small[v][c];
        ck_assert_mem_eq(delivered, recorded, sizeof delivered);
        ck_assert_uint_eq((unsigned)report.verdict, frame.verdict);
        rdl_engine_destroy(engine);
    }
    rdl_shot_close(shot);
}

START_TEST(every_step_replays_alone)
{
    static world w;
    make_world(&w);
    w.is_narrow = _i == 1;
    rdl_recorder_options options;
    rdl_recorder_options_default(&options);
    options.host_bits = _i == 1 ? RDL_FLOAT32 : RDL_FLOAT64;
    rdl_recorder *recorder = record(&w, "all.h5", &options);
    size_t resolved = 0;
    for (int k = 0; k < STEPS; k++) {
        rdl_recorder_mark(recorder, 10 + k, (uint32_t)(k / 3));
        step_world(&w, k, NULL);
        resolved += w.report.verdict == RDL_RESOLVED;
    }
    ck_assert_uint_gt(resolved, 0);
    ck_assert_uint_eq(finish(recorder, "all.h5"), STEPS);
    rdl_engine_destroy(w.engine);
    replay("all.h5", STEPS, 1, 1);
    replay("all.h5", STEPS, 2, 0);
    rdl_shot *shot = NULL;
    rdl_shot_frame frame;
    ck_assert_int_eq(rdl_shot_open(scratch("all.h5"), &shot, NULL), RDL_OK);
    ck_assert_int_eq(rdl_shot_read_frame(shot, 7, &frame, NULL), RDL_OK);
    ck_assert_double_eq(frame.time, 17);
    ck_assert_uint_eq(frame.picture, 2);
    ck_assert_double_eq(frame.duration, 0.03125);
    ck_assert_uint_eq(frame.passes_max, 30);
    rdl_shot_close(shot);
}
END_TEST

/* Masses of one step that are not the scene's belong to its frame. */
START_TEST(masses_of_a_step_are_kept)
{
    static world w;
    static double heavy[COUNT];
    make_world(&w);
    rdl_recorder *recorder = record(&w, "mass.h5", NULL);
    for (uint32_t v = 0; v < COUNT; v++)
        heavy[v] = v == 0 ? INFINITY : v == 7 ? 3 : w.mass[v];
    for (int k = 0; k < STEPS; k++)
        step_world(&w, k, k == 5 ? heavy : k == 6 ? w.mass : NULL);
    ck_assert_uint_eq(finish(recorder, "mass.h5"), STEPS);
    rdl_engine_destroy(w.engine);
    replay("mass.h5", STEPS, 1, 1);
    rdl_shot *shot = NULL;
    rdl_shot_frame frame;
    ck_assert_int_eq(rdl_shot_open(scratch("mass.h5"), &shot, NULL), RDL_OK);
    ck_assert_int_eq(rdl_shot_read_frame(shot, 5, &frame, NULL), RDL_OK);
    ck_assert_ptr_nonnull(frame.mass);
    ck_assert_mem_eq(frame.mass, heavy, sizeof heavy);
    ck_assert_int_eq(rdl_shot_read_frame(shot, 6, &frame, NULL), RDL_OK);
    ck_assert_ptr_null(frame.mass);
    ck_assert_double_eq(frame.time, 7 * 0.03125);
    rdl_shot_close(shot);
}
END_TEST

/* Two recorders at once: the one with a trigger holds the first resolved step, the two before it, and those that follow. */
START_TEST(a_trigger_brings_the_steps_before_it)
{
    static world w;
    make_world(&w);
    rdl_recorder_options options;
    rdl_recorder_options_default(&options);
    options.triggers = RDL_TRIGGER_RESOLVED;
    options.steps_before = 2;
    rdl_recorder *all = record(&w, "every.h5", NULL), *some = record(&w, "some.h5", &options);
    int first = -1, picked = 0;
    for (int k = 0; k < STEPS; k++) {
        step_world(&w, k, NULL);
        bool resolved = w.report.verdict == RDL_RESOLVED;
        picked += resolved;
        first = resolved && first < 0 ? k : first;
    }
    ck_assert_int_ge(first, 3);
    size_t frames = finish(some, "some.h5");
    ck_assert_uint_eq(frames, (size_t)picked + 2);
    ck_assert_uint_eq(finish(all, "every.h5"), STEPS);
    rdl_engine_destroy(w.engine);
    replay("some.h5", frames, 1, 1);
    rdl_shot *shot = NULL;
    rdl_shot_frame frame;
    ck_assert_int_eq(rdl_shot_open(scratch("some.h5"), &shot, NULL), RDL_OK);
    ck_assert_int_eq(rdl_shot_read_frame(shot, 0, &frame, NULL), RDL_OK);
    ck_assert_double_eq(frame.time, (first - 2 + 1) * 0.03125);
    rdl_shot_close(shot);
}
END_TEST

START_TEST(other_triggers_pick_what_they_say)
{
    static const struct {
        unsigned triggers;
        double correction, seconds;
        uint64_t passes;
        int expected; /* frames; -1: as many as were resolved */
    } cases[] = {{RDL_TRIGGER_CORRECTION, 1e-6, 0, 0, -1}, {RDL_TRIGGER_CORRECTION, 10, 0, 0, 0},
                 {RDL_TRIGGER_SECONDS, 0, 0, 0, STEPS},    {RDL_TRIGGER_SECONDS, 0, 1e6, 0, 0},
                 {RDL_TRIGGER_PASSES, 0, 0, 0, STEPS},     {RDL_TRIGGER_PASSES, 0, 0, 1, -1},
                 {RDL_TRIGGER_PINCHED | RDL_TRIGGER_TANGLED | RDL_TRIGGER_HELD, 0, 0, 0, 0}};
    static world w;
    make_world(&w);
    rdl_recorder_options options;
    rdl_recorder_options_default(&options);
    options.triggers = cases[_i].triggers;
    options.correction_above = cases[_i].correction;
    options.seconds_above = cases[_i].seconds;
    options.passes_above = cases[_i].passes;
    rdl_recorder *recorder = record(&w, "picked.h5", &options);
    size_t resolved = 0, recorded = 0;
    for (int k = 0; k < STEPS; k++) {
        step_world(&w, k, NULL);
        resolved += w.report.verdict == RDL_RESOLVED;
    }
    ck_assert_int_eq(rdl_recorder_state(recorder, &recorded, NULL), RDL_OK);
    ck_assert_uint_eq(recorded, cases[_i].expected < 0 ? resolved : (size_t)cases[_i].expected);
    ck_assert_int_eq(rdl_recorder_finish(recorder, NULL), RDL_OK);
    ck_assert_int_eq(file_exists(scratch("picked.h5")), recorded > 0);
    ck_assert_int_eq(file_exists(scratch("picked.h5.part")), 0);
    rdl_engine_destroy(w.engine);
}
END_TEST

START_TEST(a_host_may_ask_for_the_last_steps)
{
    static world w;
    make_world(&w);
    rdl_recorder_options options;
    rdl_recorder_options_default(&options);
    options.triggers = RDL_TRIGGER_ON_DEMAND;
    options.steps_before = 3;
    rdl_recorder *recorder = record(&w, "asked.h5", &options);
    for (int k = 0; k < STEPS; k++) {
        step_world(&w, k, NULL);
        if (k == 7)
            ck_assert_int_eq(rdl_recorder_dump(recorder, NULL), RDL_OK);
    }
    ck_assert_uint_eq(finish(recorder, "asked.h5"), 3);
    rdl_engine_destroy(w.engine);
    replay("asked.h5", 3, 1, 1);
}
END_TEST

START_TEST(what_goes_wrong_is_noted_and_no_step_fails)
{
    static world w;
    make_world(&w);
    rdl_recorder_options options;
    rdl_recorder *recorder = NULL;
    rdl_fault fault = {0, ""};
    static const struct {
        size_t offset;
        double value;
        const char *field;
    } bad[] = {{offsetof(rdl_recorder_options, seconds_above), -1, "seconds_above"},
               {offsetof(rdl_recorder_options, correction_above), NAN, "correction_above"}};
    for (size_t k = 0; k < 2; k++) {
        rdl_recorder_options_default(&options);
        memcpy((char *)&options + bad[k].offset, &bad[k].value, sizeof(double));
        ck_assert_int_eq(rdl_recorder_create(scratch("bad.h5"), w.engine, &w.scene, &options, &recorder, &fault),
                         RDL_OUT_OF_RANGE);
        ck_assert_str_eq(fault.field, bad[k].field);
    }
    rdl_recorder_options_default(&options);
    options.triggers = 1024;
    ck_assert_int_eq(rdl_recorder_create(scratch("bad.h5"), w.engine, &w.scene, &options, &recorder, &fault),
                     RDL_BAD_ARGUMENT);
    ck_assert_int_eq(rdl_recorder_create(scratch("bad.h5"), NULL, &w.scene, NULL, &recorder, &fault), RDL_BAD_ARGUMENT);
    ck_assert_int_eq(rdl_recorder_create(scratch("no/such/bad.h5"), w.engine, &w.scene, NULL, &recorder, &fault),
                     RDL_NO_FILE);
    ck_assert_ptr_null(recorder);
    ck_assert_int_eq(file_exists(scratch("bad.h5.part")), 0);
    rdl_recorder_options_default(&options);
    options.host_bits = RDL_FLOAT32; /* the host delivers doubles */
    recorder = record(&w, "bits.h5", &options);
    step_world(&w, 0, NULL);
    ck_assert_int_eq(rdl_recorder_state(recorder, NULL, &fault), RDL_BAD_ARGUMENT);
    ck_assert_str_eq(fault.field, "delivered");
    ck_assert_int_eq(rdl_recorder_finish(recorder, &fault), RDL_BAD_ARGUMENT);
    ck_assert_int_eq(file_exists(scratch("bits.h5.part")), 1);
    rdl_recorder_keep(NULL);
    rdl_recorder_discard(NULL);
    recorder = record(&w, "gone.h5", NULL);
    rdl_recorder_discard(recorder);
    ck_assert_int_eq(file_exists(scratch("gone.h5.part")), 0);
    step_world(&w, 1, NULL); /* nobody watches any more */
    rdl_engine_destroy(w.engine);
}
END_TEST

typedef struct seen {
    size_t steps, events, stages[RDL_EVENT_STAGES];
    char order[64];
    char letter;
    struct seen *first; /* keeps the order of all */
} seen;

static void on_events(void *user, const rdl_event *events, size_t count)
{
    seen *s = user;
    s->events += count;
    for (size_t i = 0; i < count; i++)
        s->stages[events[i].stage]++;
}

static void on_step(void *user, const rdl_watched_step *watched)
{
    seen *s = user;
    s->steps++;
    ck_assert_ptr_nonnull(watched->report);
    ck_assert_uint_gt(watched->memory_bytes, 0);
    size_t length = strlen(s->first->order);
    if (length + 1 < sizeof s->order)
        s->first->order[length] = s->letter;
}

START_TEST(watching_changes_nothing)
{
    static world plain, watched;
    static seen a, b;
    memset(&a, 0, sizeof a);
    memset(&b, 0, sizeof b);
    a.letter = 'a';
    b.letter = 'b';
    a.first = b.first = &a;
    make_world(&plain);
    make_world(&watched);
    const rdl_watch watches[2] = {{sizeof(rdl_watch), &a, on_events, on_step}, {sizeof(rdl_watch), &b, NULL, on_step}};
    ck_assert_int_eq(rdl_engine_watch(watched.engine, &watches[0]), RDL_OK);
    ck_assert_int_eq(rdl_engine_watch(watched.engine, &watches[1]), RDL_OK);
    ck_assert_int_eq(rdl_engine_watch(watched.engine, NULL), RDL_BAD_ARGUMENT);
    for (int k = 0; k < STEPS; k++) {
        if (k == 9)
            rdl_engine_unwatch(watched.engine, &a);
        step_world(&plain, k, NULL);
        step_world(&watched, k, NULL);
        ck_assert_mem_eq(plain.now, watched.now, sizeof plain.now);
    }
    ck_assert_uint_eq(a.steps, 9);
    ck_assert_uint_eq(b.steps, STEPS);
    ck_assert_uint_eq(b.events, 0);
    ck_assert_str_eq(a.order, "abababababababababbbb");
    size_t edges = 0;
    rdl_engine_edges(plain.engine, &edges);
    ck_assert_uint_eq(a.stages[RDL_EVENT_BOX], 9 * (COUNT + edges + FACES));
    ck_assert_uint_ge(a.stages[RDL_EVENT_PIECE], 9);
    ck_assert_uint_gt(a.stages[RDL_EVENT_PAIR], 0);
    ck_assert_uint_gt(a.stages[RDL_EVENT_TOUCH], 0);
    ck_assert_uint_gt(a.stages[RDL_EVENT_ZONE], 0);
    ck_assert_uint_gt(a.stages[RDL_EVENT_MEMBER], 0);
    rdl_engine_destroy(plain.engine);
    rdl_engine_destroy(watched.engine);
}
END_TEST

START_TEST(traces_are_kept_and_replaced)
{
    write_shot(scratch("trace.h5"), 3, RDL_FLOAT64, 1);
    rdl_shot_tracer *tracer = NULL;
    rdl_fault fault = {0, ""};
    static rdl_event rows[5000];
    const rdl_event *back = NULL;
    size_t count = 0;
    rdl_shot *shot = NULL;
    for (size_t i = 0; i < 5000; i++) {
        rows[i] = (rdl_event){.stage = (uint32_t)(i % 6), .detection = 1, .kind = 2, .first = (uint32_t)i};
        rows[i].value[5] = 0.5 * (double)i;
    }
    for (int round = 0; round < 2; round++) {
        ck_assert_int_eq(rdl_shot_trace_begin(scratch("trace.h5"), &tracer, &fault), RDL_OK);
        ck_assert_int_eq(rdl_shot_trace_add(tracer, 1, rows, round == 0 ? 17 : 5000, "a note", &fault), RDL_OK);
        ck_assert_int_eq(rdl_shot_trace_add(tracer, 2, NULL, 0, NULL, &fault), RDL_OK);
        ck_assert_int_eq(rdl_shot_trace_add(tracer, 3, rows, 1, NULL, &fault), RDL_OUT_OF_RANGE);
        ck_assert_int_eq(rdl_shot_trace_finish(tracer, &fault), RDL_OK);
    }
    ck_assert_int_eq(rdl_shot_open(scratch("trace.h5"), &shot, &fault), RDL_OK);
    ck_assert_int_eq(rdl_shot_trace_read(shot, 1, &back, &count, &fault), RDL_OK);
    ck_assert_uint_eq(count, 5000);
    ck_assert_mem_eq(back, rows, sizeof rows);
    ck_assert_int_eq(rdl_shot_trace_read(shot, 0, &back, &count, &fault), RDL_OK);
    ck_assert_uint_eq(count, 0);
    ck_assert_ptr_null(back);
    for (unsigned k = 0; k < 3; k++)
        expect_frame(shot, k, k);
    rdl_shot_close(shot);
    tracer = NULL;
    ck_assert_int_eq(rdl_shot_trace_begin(scratch("trace.h5"), &tracer, &fault), RDL_OK);
    rdl_shot_trace_discard(tracer);
    rdl_shot_trace_discard(NULL);
    ck_assert_int_eq(rdl_shot_trace_begin(scratch("absent.h5"), &tracer, &fault), RDL_NO_FILE);
}
END_TEST

/* A host that is killed at any moment leaves what it had recorded. Its own count of finished steps is kept in a pipe. */
START_TEST(a_killed_host_leaves_its_steps)
{
    enum { KILLS = 50 };
    static world w;
    srand(7);
    for (int round = 0; round < KILLS; round++) {
        int pipe_ends[2];
        char name[32], part[40];
        snprintf(name, sizeof name, "killed%d.h5", round);
        snprintf(part, sizeof part, "%s.part", name);
        ck_assert_int_eq(pipe(pipe_ends), 0);
        const char *path = scratch(name);
        pid_t child = fork();
        if (child == 0) {
            make_world(&w);
            rdl_recorder *recorder = NULL;
            if (rdl_recorder_create(path, w.engine, &w.scene, NULL, &recorder, NULL) != RDL_OK)
                _exit(1);
            for (int k = 0;; k++) {
                step_world(&w, k % STEPS, NULL);
                if (write(pipe_ends[1], "x", 1) != 1)
                    _exit(1);
            }
        }
        close(pipe_ends[1]);
        char done;
        size_t steps = 0;
        for (int wanted = rand() % 20; wanted >= 0 && read(pipe_ends[0], &done, 1) == 1; wanted--)
            steps++;
        const struct timespec little = {0, rand() % 3000000};
        nanosleep(&little, NULL);
        kill(child, SIGKILL);
        waitpid(child, NULL, 0);
        while (read(pipe_ends[0], &done, 1) == 1)
            steps++;
        close(pipe_ends[0]);
        rdl_shot *shot = NULL;
        ck_assert_int_eq(rdl_shot_open(scratch(part), &shot, NULL), RDL_OK);
        size_t frames = rdl_shot_describe(shot)->frame_count;
        ck_assert_uint_ge(frames, steps);
        ck_assert_uint_le(frames, steps + 1);
        static double delivered[COUNT][3];
        for (size_t k = 0; k < frames; k++)
            ck_assert_int_eq(rdl_shot_read_positions(shot, k, RDL_SHOT_DELIVERED, delivered[0], NULL), RDL_OK);
        rdl_shot_close(shot);
        if (round % 10 == 0)
            replay(part, frames, 1, 1);
        unlink(scratch(part));
    }
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("recorder");
    TCase *group = tcase_create("recorder");
    tcase_set_timeout(group, 60);
    tcase_add_loop_test(group, every_step_replays_alone, 0, 2);
    tcase_add_test(group, masses_of_a_step_are_kept);
    tcase_add_test(group, a_trigger_brings_the_steps_before_it);
    tcase_add_loop_test(group, other_triggers_pick_what_they_say, 0, 7);
    tcase_add_test(group, a_host_may_ask_for_the_last_steps);
    tcase_add_test(group, what_goes_wrong_is_noted_and_no_step_fails);
    tcase_add_test(group, watching_changes_nothing);
    tcase_add_test(group, traces_are_kept_and_replaced);
    tcase_add_test(group, a_killed_host_leaves_its_steps);
    suite_add_tcase(suite, group);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_ENV);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
