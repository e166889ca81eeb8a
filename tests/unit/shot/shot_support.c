#include "shot_support.h"

#include <check.h>
#include <dirent.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

const rdl_scene *small_scene(void)
{
    static const rdl_part parts[3] = {
        {"fringe \xc3\xa9", RDL_STRANDS, 4e-5, 0.3}, {"sheet", RDL_CLOTH, 3e-4, 0.5}, {"", RDL_BODY, 0, 0.25}};
    static const uint32_t part[VERTICES] = {0, 0, 0, 1, 1, 1, 2, 2, 2};
    static const double mass[VERTICES] = {1e-6, 2e-6, 1e-6, 1e-3, 1e-3, 2e-3, INFINITY, INFINITY, INFINITY};
    static const double half[VERTICES] = {4e-5, 4e-5, 3e-5, 3e-4, 3e-4, 3e-4, 1e-5, 0, 0};
    static const uint32_t segments[2][2] = {{0, 1}, {1, 2}};
    static const uint32_t triangles[2][3] = {{3, 4, 5}, {6, 7, 8}};
    static const uint32_t muted[2][2] = {{2, 2}, {0, 2}};
    static const uint32_t attachments[1][2] = {{0, 3}};
    static const rdl_pair_friction friction[1] = {{{0, 1}, 0.125}};
    static const rdl_scene scene = {.size = sizeof(rdl_scene),
                                    .part_count = 3,
                                    .parts = parts,
                                    .vertex_count = VERTICES,
                                    .vertex_part = part,
                                    .mass = mass,
                                    .half_thickness = half,
                                    .segment_count = 2,
                                    .segments = segments,
                                    .triangle_count = 2,
                                    .triangles = triangles,
                                    .muted_count = 2,
                                    .muted_parts = muted,
                                    .attachment_count = 1,
                                    .attachments = attachments,
                                    .pair_friction_count = 1,
                                    .pair_friction = friction};
    return &scene;
}

static void fill(double state[VERTICES][3], unsigned k, unsigned salt)
{
    for (unsigned v = 0; v < VERTICES; v++)
        for (unsigned c = 0; c < 3; c++)
            state[v][c] = (double)(float)(0.1 * v + 0.01 * c + 0.001 * k + 1e-4 * salt - 0.3);
}

void make_frame(made_frame *made, unsigned k)
{
    memset(made, 0, sizeof *made);
    fill(made->start, k, 0);
    fill(made->proposed, k, 1);
    fill(made->delivered, k, 2);
    for (unsigned w = 0; w < k % 4; w++) {
        made->waypoint_times[w] = (w + 1) / 4.0;
        fill(made->waypoints[w], k, 3 + w);
    }
    size_t bytes = (size_t)k * 2500 % MEMORY_MAX;
    for (size_t i = 0; i < bytes; i++)
        made->memory[i] = (unsigned char)(i * 31 + k);
    made->frame = (rdl_shot_frame){.time = k / 96.0,
                                   .picture = 100 + k / 4,
                                   .verdict = (uint8_t)(k % 4),
                                   .start = made->start[0],
                                   .proposed = made->proposed[0],
                                   .delivered = made->delivered[0],
                                   .waypoint_count = k % 4,
                                   .waypoint_times = made->waypoint_times,
                                   .waypoint_positions = made->waypoints[0][0],
                                   .memory = made->memory,
                                   .memory_bytes = bytes};
}

static void expect_state(rdl_shot *shot, size_t index, unsigned which, const double *wanted)
{
    double state[VERTICES][3];
    rdl_fault fault = {0, ""};
    rdl_status status = rdl_shot_read_positions(shot, index, which, state[0], &fault);
    ck_assert_msg(status == RDL_OK, "%s: %s", fault.field, rdl_status_text(status));
    ck_assert_mem_eq(state, wanted, sizeof state);
}

void expect_frame(rdl_shot *shot, size_t index, unsigned k)
{
    static made_frame made;
    rdl_shot_frame read;
    make_frame(&made, k);
    ck_assert_int_eq(rdl_shot_read_frame(shot, index, &read, NULL), RDL_OK);
    ck_assert_double_eq(read.time, made.frame.time);
    ck_assert_uint_eq(read.picture, made.frame.picture);
    ck_assert_uint_eq(read.verdict, made.frame.verdict);
    ck_assert_uint_eq(read.waypoint_count, made.frame.waypoint_count);
    ck_assert_uint_eq(read.memory_bytes, made.frame.memory_bytes);
    if (read.waypoint_count > 0) {
        ck_assert_mem_eq(read.waypoint_times, made.waypoint_times, read.waypoint_count * sizeof(double));
        ck_assert_mem_eq(read.waypoint_positions, made.waypoints, read.waypoint_count * sizeof made.waypoints[0]);
    }
    if (read.memory_bytes > 0)
        ck_assert_mem_eq(read.memory, made.memory, read.memory_bytes);
    expect_state(shot, index, RDL_SHOT_START, made.start[0]);
    expect_state(shot, index, RDL_SHOT_PROPOSED, made.proposed[0]);
    expect_state(shot, index, RDL_SHOT_DELIVERED, made.delivered[0]);
}

static char folder[4096];

static void empty_folder(void)
{
    DIR *list = opendir(folder);
    for (struct dirent *entry; list != NULL && (entry = readdir(list)) != NULL;) {
        char path[8192];
        snprintf(path, sizeof path, "%s/%s", folder, entry->d_name);
        unlink(path);
    }
    if (list != NULL)
        closedir(list);
    rmdir(folder);
}

const char *scratch(const char *name)
{
    static char paths[4][8192];
    static unsigned next;
    if (folder[0] == '\0') {
        /* Thousands of small files, each brought to the disk: memory is the place for them, where there is one. */
        const char *base = getenv("TMPDIR") != NULL        ? getenv("TMPDIR")
                           : access("/dev/shm", W_OK) == 0 ? "/dev/shm"
                                                           : "/tmp";
        snprintf(folder, sizeof folder, "%s/raddle-shot-XXXXXX", base);
        ck_assert_ptr_nonnull(mkdtemp(folder));
        atexit(empty_folder);
    }
    next = (next + 1) % 4;
    snprintf(paths[next], sizeof paths[next], "%s/%s", folder, name);
    return paths[next];
}

void write_shot(const char *path, unsigned count, int host_bits, int deflate)
{
    static made_frame made;
    rdl_shot_writer *writer = NULL;
    rdl_shot_options options;
    rdl_settings settings;
    rdl_fault fault = {0, ""};
    rdl_settings_default(&settings);
    settings.restitution = 0.25;
    rdl_shot_options_default(&options);
    options.host_bits = host_bits;
    options.deflate = deflate;
    options.overwrite = 1;
    options.created_by = "a test";
    options.settings = &settings;
    rdl_status status = rdl_shot_create(path, small_scene(), &options, &writer, &fault);
    ck_assert_msg(status == RDL_OK, "%s: %s", fault.field, rdl_status_text(status));
    for (unsigned k = 0; k < count; k++) {
        make_frame(&made, k);
        ck_assert_int_eq(rdl_shot_append(writer, &made.frame, &fault), RDL_OK);
    }
    ck_assert_int_eq(rdl_shot_finish(writer, &fault), RDL_OK);
}

unsigned char *load(const char *path, size_t *bytes)
{
    FILE *file = fopen(path, "rb");
    ck_assert_ptr_nonnull(file);
    fseek(file, 0, SEEK_END);
    *bytes = (size_t)ftell(file);
    rewind(file);
    unsigned char *data = malloc(*bytes + 1);
    ck_assert_ptr_nonnull(data);
    ck_assert_uint_eq(fread(data, 1, *bytes, file), *bytes);
    fclose(file);
    return data;
}

void store(const char *path, const void *data, size_t bytes)
{
    FILE *file = fopen(path, "wb");
    ck_assert_ptr_nonnull(file);
    ck_assert_uint_eq(fwrite(data, 1, bytes, file), bytes);
    ck_assert_int_eq(fclose(file), 0);
}

void copy_file(const char *from, const char *to)
{
    size_t bytes = 0;
    unsigned char *data = load(from, &bytes);
    store(to, data, bytes);
    free(data);
}

int file_exists(const char *path)
{
    struct stat info;
    return lstat(path, &info) == 0;
}

void expect_open(const char *path, rdl_status status, const char *field, uint64_t index)
{
    rdl_shot *shot = NULL;
    rdl_fault fault = {0, ""};
    rdl_status got = rdl_shot_open(path, &shot, &fault);
    ck_assert_msg(got == status && strcmp(fault.field, field) == 0 && fault.index == index,
                  "got %d at %s %llu, wanted %d at %s %llu", got, fault.field, (unsigned long long)fault.index, status,
                  field, (unsigned long long)index);
    rdl_shot_close(shot);
}
