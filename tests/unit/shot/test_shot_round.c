/* Shot files: what is written is read back, and files come into being whole or not at all. */
#include <check.h>
#include <hdf5.h>
#include <math.h>
#include <signal.h>
#include <stdlib.h>
#include <string.h>
#include <sys/resource.h>
#include <sys/wait.h>
#include <time.h>
#include <unistd.h>

#include "shot/sha256.h"
#include "shot_support.h"

static void hash_text(const char *text, size_t repeats, char hex[65])
{
    rdli_sha256 hash;
    uint8_t digest[32];
    rdli_sha256_begin(&hash);
    for (size_t i = 0; i < repeats; i++)
        rdli_sha256_add(&hash, text, strlen(text));
    rdli_sha256_end(&hash, digest);
    for (size_t i = 0; i < 32; i++)
        sprintf(hex + 2 * i, "%02x", digest[i]);
}

/* The examples of NIST's "Examples with intermediate values" for FIPS 180, and the empty text. */
START_TEST(sha256_gives_the_published_digests)
{
    char hex[65];
    hash_text("abc", 1, hex);
    ck_assert_str_eq(hex, "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
    hash_text("", 1, hex);
    ck_assert_str_eq(hex, "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855");
    hash_text("abcdbcdecdefdefgefghfghighijhijkijkljklmklmnlmnomnopnopq", 1, hex);
    ck_assert_str_eq(hex, "248d6a61d20638b8e5c026930c3e6039a33ce45964ff2167f6ecedd419db06c1");
    hash_text("a", 1000000, hex);
    ck_assert_str_eq(hex, "cdc76e5c9914fb9281a1c7e284d73e67f1809a48a497200e046d39ccc7112cd0");
}
END_TEST

START_TEST(sha256_takes_pieces_of_any_length)
{
    uint8_t data[300], whole[32], pieces[32];
    rdli_sha256 hash;
    for (size_t i = 0; i < sizeof data; i++)
        data[i] = (uint8_t)(i * 7);
    rdli_sha256_begin(&hash);
    rdli_sha256_add(&hash, data, sizeof data);
    rdli_sha256_end(&hash, whole);
    for (size_t step = 1; step < 130; step++) {
        rdli_sha256_begin(&hash);
        for (size_t i = 0; i < sizeof data; i += step)
            rdli_sha256_add(&hash, data + i, sizeof data - i < step ? sizeof data - i : step);
        rdli_sha256_end(&hash, pieces);
        ck_assert_mem_eq(pieces, whole, 32);
    }
}
END_TEST

/* 1.0 and -2.0, 0.5 as little-endian float32 and float64, hashed as bytes. */
START_TEST(digest_is_over_the_hosts_format)
{
    const double positions[3] = {1, -2, 0.5};
    const uint8_t narrow[12] = {0, 0, 0x80, 0x3f, 0, 0, 0, 0xc0, 0, 0, 0, 0x3f};
    const uint8_t wide[24] = {0, 0, 0, 0, 0, 0, 0xf0, 0x3f, 0, 0, 0, 0, 0, 0, 0, 0xc0, 0, 0, 0, 0, 0, 0, 0xe0, 0x3f};
    uint8_t digest[32], wanted[32];
    rdli_sha256 hash;
    rdl_shot_digest(positions, 1, 32, digest);
    rdli_sha256_begin(&hash);
    rdli_sha256_add(&hash, narrow, sizeof narrow);
    rdli_sha256_end(&hash, wanted);
    ck_assert_mem_eq(digest, wanted, 32);
    rdl_shot_digest(positions, 1, 64, digest);
    rdli_sha256_begin(&hash);
    rdli_sha256_add(&hash, wide, sizeof wide);
    rdli_sha256_end(&hash, wanted);
    ck_assert_mem_eq(digest, wanted, 32);
}
END_TEST

static rdl_shot *open_good(const char *path)
{
    rdl_shot *shot = NULL;
    rdl_fault fault = {0, ""};
    rdl_status status = rdl_shot_open(path, &shot, &fault);
    ck_assert_msg(status == RDL_OK, "%s %llu: %s", fault.field, (unsigned long long)fault.index,
                  rdl_status_text(status));
    return shot;
}

static void expect_scene(const rdl_scene *scene)
{
    const rdl_scene *wanted = small_scene();
    ck_assert_uint_eq(scene->part_count, 3);
    for (size_t p = 0; p < 3; p++) {
        ck_assert_str_eq(scene->parts[p].name, wanted->parts[p].name);
        ck_assert_int_eq(scene->parts[p].kind, wanted->parts[p].kind);
        ck_assert_double_eq(scene->parts[p].half_thickness, wanted->parts[p].half_thickness);
        ck_assert_double_eq(scene->parts[p].friction, wanted->parts[p].friction);
    }
    ck_assert_uint_eq(scene->vertex_count, VERTICES);
    ck_assert_mem_eq(scene->vertex_part, wanted->vertex_part, VERTICES * sizeof(uint32_t));
    ck_assert_mem_eq(scene->mass, wanted->mass, VERTICES * sizeof(double));
    ck_assert_mem_eq(scene->half_thickness, wanted->half_thickness, VERTICES * sizeof(double));
    ck_assert_uint_eq(scene->segment_count, 2);
    ck_assert_mem_eq(scene->segments, wanted->segments, sizeof(uint32_t[2][2]));
    ck_assert_uint_eq(scene->triangle_count, 2);
    ck_assert_mem_eq(scene->triangles, wanted->triangles, sizeof(uint32_t[2][3]));
    ck_assert_uint_eq(scene->muted_count, 2);
    ck_assert_mem_eq(scene->muted_parts, wanted->muted_parts, sizeof(uint32_t[2][2]));
    ck_assert_uint_eq(scene->attachment_count, 1);
    ck_assert_mem_eq(scene->attachments, wanted->attachments, sizeof(uint32_t[1][2]));
    ck_assert_uint_eq(scene->pair_friction_count, 1);
    ck_assert_uint_eq(scene->pair_friction[0].part[0], 0);
    ck_assert_uint_eq(scene->pair_friction[0].part[1], 1);
    ck_assert_double_eq(scene->pair_friction[0].friction, 0.125);
}

START_TEST(every_field_comes_back)
{
    int bits = _i % 2 == 0 ? 32 : 64, deflate = _i / 2 * 3;
    const char *path = scratch("round.h5");
    write_shot(path, 9, bits, deflate);
    rdl_shot *shot = open_good(path);
    const rdl_shot_info *info = rdl_shot_describe(shot);
    ck_assert_uint_eq(info->frame_count, 9);
    ck_assert_uint_eq(info->vertex_count, VERTICES);
    ck_assert_uint_eq(info->contents, RDL_SHOT_STEP);
    ck_assert_int_eq(info->host_bits, bits);
    ck_assert_int_eq(info->complete, 1);
    ck_assert_int_eq(info->has_mass, 1);
    ck_assert_str_eq(info->created_by, "a test");
    ck_assert_int_eq(info->has_settings, 1);
    ck_assert_str_eq(info->engine_version, rdl_version());
    ck_assert_ptr_null(info->unknown_setting);
    ck_assert_double_eq(info->settings.restitution, 0.25);
    expect_scene(rdl_shot_scene(shot));
    for (unsigned k = 0; k < 9; k++)
        expect_frame(shot, k, k);
    expect_frame(shot, 2, 2);
    rdl_shot_close(shot);
    ck_assert(!file_exists(scratch("round.h5.part")));
}
END_TEST

START_TEST(a_shot_without_frames_is_a_shot)
{
    const char *path = scratch("empty.h5");
    write_shot(path, 0, 64, 1);
    rdl_shot *shot = open_good(path);
    rdl_shot_frame frame;
    double state[VERTICES][3];
    rdl_fault fault = {7, ""};
    ck_assert_uint_eq(rdl_shot_describe(shot)->frame_count, 0);
    ck_assert_int_eq(rdl_shot_read_frame(shot, 0, &frame, &fault), RDL_OUT_OF_RANGE);
    ck_assert_str_eq(fault.field, "frame");
    ck_assert_int_eq(rdl_shot_read_positions(shot, 0, RDL_SHOT_START, state[0], &fault), RDL_OUT_OF_RANGE);
    rdl_shot_close(shot);
}
END_TEST

START_TEST(only_what_was_asked_for_is_there)
{
    static made_frame made;
    const char *path = scratch("some.h5");
    rdl_shot_options options;
    rdl_shot_writer *writer = NULL;
    rdl_shot_options_default(&options);
    options.contents = RDL_SHOT_START | RDL_SHOT_PROPOSED;
    make_frame(&made, 3);
    made.frame.delivered = NULL;
    ck_assert_int_eq(rdl_shot_create(path, small_scene(), &options, &writer, NULL), RDL_OK);
    ck_assert_int_eq(rdl_shot_append(writer, &made.frame, NULL), RDL_OK);
    ck_assert_int_eq(rdl_shot_finish(writer, NULL), RDL_OK);
    rdl_shot *shot = open_good(path);
    double state[VERTICES][3];
    rdl_shot_frame frame;
    ck_assert_uint_eq(rdl_shot_describe(shot)->contents, RDL_SHOT_START | RDL_SHOT_PROPOSED);
    ck_assert_int_eq(rdl_shot_describe(shot)->has_settings, 0);
    ck_assert_int_eq(rdl_shot_read_positions(shot, 0, RDL_SHOT_DELIVERED, state[0], NULL), RDL_BAD_ARGUMENT);
    ck_assert_int_eq(rdl_shot_read_positions(shot, 0, RDL_SHOT_PROPOSED, state[0], NULL), RDL_OK);
    ck_assert_mem_eq(state, made.proposed, sizeof state);
    ck_assert_int_eq(rdl_shot_read_frame(shot, 0, &frame, NULL), RDL_OK);
    ck_assert_uint_eq(frame.memory_bytes + frame.waypoint_count, 0);
    rdl_shot_close(shot);
}
END_TEST

/* Two files with the same content are the same bytes: no times, no leftovers of memory. */
START_TEST(files_are_repeatable)
{
    size_t first_bytes = 0, second_bytes = 0;
    write_shot(scratch("one.h5"), 5, 32, 1);
    write_shot(scratch("two.h5"), 5, 32, 1);
    unsigned char *first = load(scratch("one.h5"), &first_bytes), *second = load(scratch("two.h5"), &second_bytes);
    ck_assert_uint_eq(first_bytes, second_bytes);
    ck_assert_mem_eq(first, second, first_bytes);
    free(first);
    free(second);
}
END_TEST

START_TEST(refused_frames_leave_the_shot_as_it_was)
{
    static made_frame made, other;
    rdl_shot_options options;
    rdl_shot_writer *writer = NULL;
    rdl_fault fault = {0, ""};
    rdl_shot_options_default(&options);
    options.host_bits = 32;
    const char *path = scratch("refused.h5");
    ck_assert_int_eq(rdl_shot_create(path, small_scene(), &options, &writer, NULL), RDL_OK);
    make_frame(&made, 1);
    rdl_status first = rdl_shot_append(writer, &made.frame, &fault);
    ck_assert_msg(first == RDL_OK, "%s %llu", fault.field, (unsigned long long)fault.index);
    const struct {
        double *place, value;
        rdl_status status;
        const char *field;
        uint64_t index;
    } cases[] = {
        {&other.frame.time, NAN, RDL_NOT_FINITE, "frames/time", 1},
        {&other.start[4][2], INFINITY, RDL_NOT_FINITE, "frames/start", 4},
        {&other.proposed[0][0], NAN, RDL_NOT_FINITE, "frames/proposed", 0},
        {&other.delivered[8][2], -INFINITY, RDL_NOT_FINITE, "frames/delivered", 8},
        {&other.delivered[5][1], 0.1, RDL_OUT_OF_RANGE, "frames/delivered", 5},
        {&other.waypoints[1][2][0], NAN, RDL_NOT_FINITE, "frames/waypoint_position", VERTICES + 2},
        {&other.waypoint_times[1], 0.25, RDL_OUT_OF_RANGE, "frames/waypoint_time", 1},
        {&other.waypoint_times[0], 0, RDL_OUT_OF_RANGE, "frames/waypoint_time", 0},
        {&other.waypoint_times[2], 1, RDL_OUT_OF_RANGE, "frames/waypoint_time", 2},
    };
    for (size_t k = 0; k < sizeof cases / sizeof cases[0]; k++) {
        make_frame(&other, 3);
        *cases[k].place = cases[k].value;
        ck_assert_int_eq(rdl_shot_append(writer, &other.frame, &fault), cases[k].status);
        ck_assert_str_eq(fault.field, cases[k].field);
        ck_assert_uint_eq(fault.index, cases[k].index);
    }
    make_frame(&other, 3);
    other.frame.verdict = 4;
    ck_assert_int_eq(rdl_shot_append(writer, &other.frame, &fault), RDL_OUT_OF_RANGE);
    ck_assert_str_eq(fault.field, "frames/verdict");
    make_frame(&other, 2);
    ck_assert_int_eq(rdl_shot_append(writer, &other.frame, NULL), RDL_OK);
    ck_assert_int_eq(rdl_shot_finish(writer, NULL), RDL_OK);
    rdl_shot *shot = open_good(path);
    ck_assert_uint_eq(rdl_shot_describe(shot)->frame_count, 2);
    expect_frame(shot, 0, 1);
    expect_frame(shot, 1, 2);
    rdl_shot_close(shot);
}
END_TEST

START_TEST(bad_options_and_scenes_are_named)
{
    rdl_shot_options options;
    rdl_shot_writer *writer = NULL;
    rdl_fault fault = {0, ""};
    const char *path = scratch("never.h5");
    const struct {
        size_t offset;
        int value;
        const char *field;
    } cases[] = {{offsetof(rdl_shot_options, contents), 0, "contents"},
                 {offsetof(rdl_shot_options, contents), 256, "contents"},
                 {offsetof(rdl_shot_options, host_bits), 16, "host_bits"},
                 {offsetof(rdl_shot_options, deflate), 10, "deflate"},
                 {offsetof(rdl_shot_options, deflate), -1, "deflate"}};
    for (size_t k = 0; k < sizeof cases / sizeof cases[0]; k++) {
        rdl_shot_options_default(&options);
        memcpy((char *)&options + cases[k].offset, &cases[k].value, sizeof(int));
        ck_assert_int_eq(rdl_shot_create(path, small_scene(), &options, &writer, &fault), RDL_BAD_ARGUMENT);
        ck_assert_str_eq(fault.field, cases[k].field);
    }
    double mass[VERTICES];
    rdl_scene scene = *small_scene();
    memcpy(mass, scene.mass, sizeof mass);
    mass[5] = 0;
    scene.mass = mass;
    ck_assert_int_eq(rdl_shot_create(path, &scene, NULL, &writer, &fault), RDL_BAD_MASS);
    ck_assert_str_eq(fault.field, "mesh/mass");
    ck_assert_uint_eq(fault.index, 5);
    ck_assert_int_eq(rdl_shot_create(NULL, small_scene(), NULL, &writer, &fault), RDL_BAD_ARGUMENT);
    ck_assert_int_eq(rdl_shot_create(path, NULL, NULL, &writer, &fault), RDL_BAD_ARGUMENT);
    ck_assert_int_eq(rdl_shot_append(NULL, NULL, &fault), RDL_BAD_ARGUMENT);
    ck_assert_int_eq(rdl_shot_finish(NULL, &fault), RDL_BAD_ARGUMENT);
    rdl_shot_discard(NULL);
    rdl_shot_close(NULL);
    ck_assert_ptr_null(writer);
    ck_assert(!file_exists(path) && !file_exists(scratch("never.h5.part")));
}
END_TEST

START_TEST(nothing_is_overwritten_without_leave)
{
    rdl_shot_options options;
    rdl_shot_writer *writer = NULL;
    rdl_fault fault = {0, ""};
    rdl_shot_options_default(&options);
    const char *path = scratch("kept.h5"), *part = scratch("kept.h5.part");
    store(path, "mine", 4);
    ck_assert_int_eq(rdl_shot_create(path, small_scene(), &options, &writer, &fault), RDL_FILE_EXISTS);
    ck_assert_str_eq(fault.field, "file");
    unlink(path);
    store(part, "mine", 4);
    ck_assert_int_eq(rdl_shot_create(path, small_scene(), &options, &writer, &fault), RDL_FILE_EXISTS);
    ck_assert_str_eq(fault.field, "file.part");
    unlink(part);
    /* The name is taken while the recording runs: the recording stays under its own. */
    ck_assert_int_eq(rdl_shot_create(path, small_scene(), &options, &writer, &fault), RDL_OK);
    store(path, "mine", 4);
    ck_assert_int_eq(rdl_shot_finish(writer, &fault), RDL_FILE_EXISTS);
    size_t bytes = 0;
    unsigned char *data = load(path, &bytes);
    ck_assert_uint_eq(bytes, 4);
    free(data);
    rdl_shot_close(open_good(part));
    options.overwrite = 1;
    ck_assert_int_eq(rdl_shot_create(path, small_scene(), &options, &writer, &fault), RDL_OK);
    data = load(path, &bytes);
    ck_assert_uint_eq(bytes, 4); /* the old file is there until the new one is whole */
    free(data);
    ck_assert_int_eq(rdl_shot_finish(writer, &fault), RDL_OK);
    rdl_shot_close(open_good(path));
    ck_assert(!file_exists(part));
}
END_TEST

START_TEST(discard_leaves_nothing)
{
    static made_frame made;
    rdl_shot_writer *writer = NULL;
    const char *path = scratch("gone.h5");
    ck_assert_int_eq(rdl_shot_create(path, small_scene(), NULL, &writer, NULL), RDL_OK);
    make_frame(&made, 1);
    ck_assert_int_eq(rdl_shot_append(writer, &made.frame, NULL), RDL_OK);
    ck_assert(file_exists(scratch("gone.h5.part")));
    rdl_shot_discard(writer);
    ck_assert(!file_exists(scratch("gone.h5.part")) && !file_exists(path));
}
END_TEST

START_TEST(places_that_cannot_be_written_are_named)
{
    rdl_shot_writer *writer = NULL;
    rdl_fault fault = {0, ""};
    ck_assert_int_eq(rdl_shot_create(scratch("no/such/folder.h5"), small_scene(), NULL, &writer, &fault), RDL_NO_FILE);
    rdl_shot *shot = NULL;
    ck_assert_int_eq(rdl_shot_open(scratch("absent.h5"), &shot, &fault), RDL_NO_FILE);
    ck_assert_int_eq(rdl_shot_open("/dev/null", &shot, &fault), RDL_BAD_FILE);
    ck_assert_int_eq(rdl_shot_open(scratch(""), &shot, &fault), RDL_BAD_FILE);
    ck_assert_ptr_null(shot);
}
END_TEST

/* A host that is killed: its recording is readable under its .part name while it runs and afterwards. */
START_TEST(a_killed_recording_is_readable)
{
    const char *path = scratch("killed.h5"), *part = scratch("killed.h5.part");
    int ready[2];
    ck_assert_int_eq(pipe(ready), 0);
    pid_t child = fork();
    if (child == 0) {
        static made_frame made;
        rdl_shot_writer *writer = NULL;
        rdl_shot_create(path, small_scene(), NULL, &writer, NULL);
        for (unsigned k = 0; k < 5; k++) {
            make_frame(&made, k);
            rdl_shot_append(writer, &made.frame, NULL);
        }
        if (write(ready[1], "x", 1) == 1)
            pause();
        _exit(1);
    }
    char byte;
    ck_assert_int_eq(read(ready[0], &byte, 1), 1);
    for (int after = 0; after < 2; after++) {
        rdl_shot *shot = open_good(part);
        ck_assert_uint_eq(rdl_shot_describe(shot)->frame_count, 5);
        ck_assert_int_eq(rdl_shot_describe(shot)->complete, 0);
        for (unsigned k = 0; k < 5; k++)
            expect_frame(shot, k, k);
        rdl_shot_close(shot);
        kill(child, SIGKILL);
        waitpid(child, NULL, 0);
    }
    ck_assert(!file_exists(path));
}
END_TEST

/* Killed at any moment, in the middle of a frame too: every frame that was flushed is there. Moments by a fixed rule.
 */
START_TEST(killed_at_any_moment)
{
    const char *path = scratch("moment.h5"), *part = scratch("moment.h5.part");
    for (unsigned run = 0; run < 40; run++) {
        int flushed[2];
        unlink(part);
        ck_assert_int_eq(pipe(flushed), 0);
        pid_t child = fork();
        if (child == 0) {
            static made_frame made;
            rdl_shot_writer *writer = NULL;
            rdl_status status = rdl_shot_create(path, small_scene(), NULL, &writer, NULL);
            for (unsigned k = 0; status == RDL_OK; k++) {
                make_frame(&made, k);
                status = rdl_shot_append(writer, &made.frame, NULL);
                if (write(flushed[1], "x", 1) != 1)
                    break;
            }
            _exit(1);
        }
        char bytes[256];
        close(flushed[1]);
        size_t written = 0;
        for (; written < 1 + run / 8; written++)
            ck_assert_int_eq(read(flushed[0], bytes, 1), 1);
        struct timespec pause = {0, (long)(run * 7919 % 3000) * 1000};
        nanosleep(&pause, NULL);
        kill(child, SIGKILL);
        waitpid(child, NULL, 0);
        for (ssize_t more; (more = read(flushed[0], bytes, sizeof bytes)) > 0;)
            written += (size_t)more;
        close(flushed[0]);
        rdl_shot *shot = open_good(part);
        size_t frames = rdl_shot_describe(shot)->frame_count;
        ck_assert_uint_ge(frames, written);
        ck_assert_uint_le(frames, written + 1);
        for (unsigned k = 0; k < frames; k++)
            expect_frame(shot, k, k);
        rdl_shot_close(shot);
    }
}
END_TEST

/* A disk that is full: a limit on the file's size makes the system refuse writes, also for root. */
START_TEST(a_full_disk_is_an_error_and_leaves_nothing)
{
    static made_frame made;
    const char *path = scratch("full.h5"), *part = scratch("full.h5.part");
    size_t whole = 0;
    write_shot(path, 6, 64, 0);
    free(load(path, &whole));
    unlink(path);
    signal(SIGXFSZ, SIG_IGN);
    size_t refused = 0;
    for (size_t limit = 0; limit < whole; limit += whole / 50) {
        struct rlimit cap = {limit, RLIM_INFINITY};
        ck_assert_int_eq(setrlimit(RLIMIT_FSIZE, &cap), 0);
        rdl_shot_options options;
        rdl_shot_writer *writer = NULL;
        rdl_fault fault = {0, ""};
        rdl_shot_options_default(&options);
        options.deflate = 0;
        rdl_status status = rdl_shot_create(path, small_scene(), &options, &writer, &fault);
        for (unsigned k = 0; status == RDL_OK && k < 6; k++) {
            make_frame(&made, k);
            status = rdl_shot_append(writer, &made.frame, &fault);
        }
        if (writer != NULL && status != RDL_OK) {
            ck_assert_int_eq(rdl_shot_append(writer, &made.frame, &fault), RDL_WRITE_FAILED);
            rdl_shot_discard(writer);
        } else if (writer != NULL) {
            status = rdl_shot_finish(writer, &fault);
            unlink(status == RDL_OK ? path : part);
        }
        ck_assert(status == RDL_OK || status == RDL_WRITE_FAILED);
        refused += status == RDL_WRITE_FAILED;
        ck_assert(!file_exists(path) && !file_exists(part));
        cap.rlim_cur = RLIM_INFINITY;
        ck_assert_int_eq(setrlimit(RLIMIT_FSIZE, &cap), 0);
        ck_assert_msg(H5Fget_obj_count((hid_t)H5F_OBJ_ALL, H5F_OBJ_ALL) == 0, "limit %zu of %zu", limit, whole);
    }
    ck_assert_uint_ge(refused, 40);
    write_shot(path, 2, 64, 1);
    rdl_shot_close(open_good(path));
}
END_TEST

static herr_t count_print(hid_t stack, void *data)
{
    (void)stack;
    ++*(int *)data;
    return 0;
}

/* The host's own error printer and error stack of HDF5 are as they were after a call that failed inside. */
START_TEST(the_hosts_hdf5_is_left_alone)
{
    int printed = 0;
    H5E_auto2_t print = NULL;
    void *data = NULL;
    rdl_shot *shot = NULL;
    H5Eset_auto2(H5E_DEFAULT, count_print, &printed);
    H5Gopen2(-1, "nothing", H5P_DEFAULT);
    ck_assert_int_eq(printed, 1);
    ssize_t depth = H5Eget_num(H5E_DEFAULT);
    ck_assert_int_gt(depth, 0);
    store(scratch("foreign.h5"), "not a shot at all, but long enough", 34);
    ck_assert_int_eq(rdl_shot_open(scratch("foreign.h5"), &shot, NULL), RDL_BAD_FILE);
    ck_assert_int_eq(printed, 1);
    ck_assert_int_eq(H5Eget_num(H5E_DEFAULT), depth);
    H5Eget_auto2(H5E_DEFAULT, &print, &data);
    ck_assert(print == count_print && data == &printed);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("shot");
    TCase *group = tcase_create("round");
    tcase_set_timeout(group, 60);
    tcase_add_test(group, sha256_gives_the_published_digests);
    tcase_add_test(group, sha256_takes_pieces_of_any_length);
    tcase_add_test(group, digest_is_over_the_hosts_format);
    tcase_add_loop_test(group, every_field_comes_back, 0, 4);
    tcase_add_test(group, a_shot_without_frames_is_a_shot);
    tcase_add_test(group, only_what_was_asked_for_is_there);
    tcase_add_test(group, files_are_repeatable);
    tcase_add_test(group, refused_frames_leave_the_shot_as_it_was);
    tcase_add_test(group, bad_options_and_scenes_are_named);
    tcase_add_test(group, nothing_is_overwritten_without_leave);
    tcase_add_test(group, discard_leaves_nothing);
    tcase_add_test(group, places_that_cannot_be_written_are_named);
    tcase_add_test(group, a_killed_recording_is_readable);
    tcase_add_test(group, killed_at_any_moment);
    tcase_add_test(group, a_full_disk_is_an_error_and_leaves_nothing);
    tcase_add_test(group, the_hosts_hdf5_is_left_alone);
    suite_add_tcase(suite, group);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_ENV);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
