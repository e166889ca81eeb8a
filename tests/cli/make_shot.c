/* make_shot KIND FILE: writes one of the small shots that the command-line tests run on.
 * All have one strand segment (part "thread", vertices 0 and 1), a cloth triangle ("sheet", 2 to 4), and two driven
 * body triangles ("lower", 5 to 7, and "upper", 8 to 10). Lengths in centimetres below, stored in metres. */
#include <hdf5.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <raddle/report.h>
#include <raddle/shot.h>

enum { VERTICES = 11, FRAMES = 3 };

typedef double state[VERTICES][3];

typedef struct plan {
    unsigned contents;
    int host_bits;
    size_t frames, waypoints;
    state start[FRAMES], proposed[FRAMES], delivered[FRAMES], waypoint;
    const char *thread_name;
    size_t muted_count, attachment_count;
    uint32_t muted[1][2], attachments[1][2];
    double sheet_half;
} plan;

/* Everything well apart: the thread upright above a corner of the sheet, the bodies below and above all. */
static void rest_state(state s)
{
    static const state rest = {{10, 10, 12}, {10, 10, 16}, {0, 0, 10},     {40, 0, 10},   {0, 40, 10},  {-50, -50, 0},
                               {90, -50, 0}, {-50, 90, 0}, {-50, -50, 30}, {90, -50, 30}, {-50, 90, 30}};
    memcpy(s, rest, sizeof rest);
}

static void shift(state s, unsigned first, unsigned last, double dx, double dz)
{
    for (unsigned v = first; v <= last; v++) {
        s[v][0] += dx;
        s[v][2] += dz;
    }
}

static void begin_plan(plan *p)
{
    memset(p, 0, sizeof *p);
    p->contents = RDL_SHOT_START | RDL_SHOT_PROPOSED | RDL_SHOT_DELIVERED;
    p->host_bits = 64;
    p->frames = FRAMES;
    p->thread_name = "thread";
    p->sheet_half = 0.001;
    for (size_t k = 0; k < FRAMES; k++) {
        rest_state(p->start[k]);
        rest_state(p->proposed[k]);
        rest_state(p->delivered[k]);
    }
}

/* The thread falls through the sheet in step 1, and is left hanging in it. */
static void cross(plan *p)
{
    shift(p->delivered[1], 0, 1, 0, -4);
    shift(p->start[2], 0, 1, 0, -4);
    shift(p->delivered[2], 0, 1, 0, -4);
}

/* The same motion made by the host between steps 1 and 2. */
static void moved(plan *p)
{
    shift(p->start[2], 0, 1, 0, -8);
    shift(p->delivered[2], 0, 1, 0, -8);
}

/* Down beside the sheet, by way of a way-point out of its reach. */
static void round_about(plan *p)
{
    p->contents = RDL_SHOT_STEP;
    p->waypoints = 1;
    rest_state(p->waypoint);
    shift(p->waypoint, 0, 1, 60, -4);
    shift(p->delivered[1], 0, 1, 0, -8);
    shift(p->start[2], 0, 1, 0, -8);
    shift(p->delivered[2], 0, 1, 0, -8);
}

/* The lower body rises through the sheet's place; to be resolved from start and proposed alone. */
static void to_resolve(plan *p)
{
    p->contents = RDL_SHOT_START | RDL_SHOT_PROPOSED;
    shift(p->proposed[0], 0, 4, 0, -11);
    shift(p->proposed[2], 0, 4, 5, 0);
}

/* The upper body dips a corner through the lower one from step 1 on; thread and sheet are far away. */
static void bodies(plan *p)
{
    for (size_t k = 0; k < FRAMES; k++) {
        shift(p->start[k], 0, 4, 500, 0);
        shift(p->delivered[k], 0, 4, 500, 0);
        p->delivered[k][8][2] = k > 0 ? -10 : 30;
        p->start[k][8][2] = k > 1 ? -10 : 30;
    }
}

static int build(const char *kind, plan *p)
{
    begin_plan(p);
    if (strcmp(kind, "clean") == 0)
        return 1;
    if (strcmp(kind, "cross") == 0)
        cross(p);
    else if (strcmp(kind, "moved") == 0)
        moved(p);
    else if (strcmp(kind, "round") == 0)
        round_about(p);
    else if (strcmp(kind, "resolve") == 0 || strcmp(kind, "resolve32") == 0)
        to_resolve(p);
    else if (strcmp(kind, "bodies") == 0)
        bodies(p);
    else if (strcmp(kind, "long") == 0) {
        to_resolve(p);
        p->frames = 2000;
    } else if (strcmp(kind, "wrong") == 0) { /* what no engine would deliver for frames 0 and 2 */
        to_resolve(p);
        p->contents = RDL_SHOT_STEP;
    } else if (strcmp(kind, "poses") == 0) {
        cross(p);
        p->contents = RDL_SHOT_DELIVERED;
    } else if (strcmp(kind, "muted") == 0) {
        cross(p);
        p->muted_count = 1;
        p->muted[0][1] = 1;
    } else if (strcmp(kind, "attached") == 0) {
        cross(p);
        p->attachment_count = 1;
        p->attachments[0][0] = 0;
        p->attachments[0][1] = 2;
    } else if (strcmp(kind, "tangled") == 0) {
        to_resolve(p);
        shift(p->start[1], 0, 1, 0, -4);
        shift(p->proposed[1], 0, 1, 0, -4);
    } else if (strcmp(kind, "names") == 0) {
        cross(p);
        p->thread_name = "two\nlines \x1b[31m\"red\"";
    } else if (strcmp(kind, "thin") == 0) {
        to_resolve(p);
        p->sheet_half = 0;
    } else
        return 0;
    p->host_bits = strcmp(kind, "resolve32") == 0 ? 32 : 64;
    return 1;
}

static void to_metres(double *numbers, size_t count)
{
    for (size_t i = 0; i < count; i++)
        numbers[i] *= 0.01;
}

static rdl_status write_plan(const char *path, plan *p, rdl_fault *fault)
{
    const rdl_part parts[4] = {{p->thread_name, RDL_STRANDS, 0.001, 0.3},
                               {"sheet", RDL_CLOTH, p->sheet_half, 0.3},
                               {"lower", RDL_BODY, 0, 0.3},
                               {"upper", RDL_BODY, 0, 0.3}};
    static const uint32_t part[VERTICES] = {0, 0, 1, 1, 1, 2, 2, 2, 3, 3, 3};
    static const uint32_t segments[1][2] = {{0, 1}}, triangles[3][3] = {{2, 3, 4}, {5, 6, 7}, {8, 9, 10}};
    double mass[VERTICES];
    for (size_t v = 0; v < VERTICES; v++)
        mass[v] = v < 5 ? 1e-3 : (double)INFINITY;
    const rdl_scene scene = {.size = sizeof scene,
                             .part_count = 4,
                             .parts = parts,
                             .vertex_count = VERTICES,
                             .vertex_part = part,
                             .mass = mass,
                             .segment_count = 1,
                             .segments = segments,
                             .triangle_count = 3,
                             .triangles = triangles,
                             .muted_count = p->muted_count,
                             .muted_parts = (const uint32_t(*)[2])p->muted,
                             .attachment_count = p->attachment_count,
                             .attachments = (const uint32_t(*)[2])p->attachments};
    rdl_shot_options options;
    rdl_shot_writer *writer = NULL;
    rdl_shot_options_default(&options);
    options.contents = p->contents;
    options.host_bits = p->host_bits;
    options.deflate = 1;
    options.created_by = "make_shot";
    rdl_status status = rdl_shot_create(path, &scene, &options, &writer, fault);
    for (size_t k = 0; status == RDL_OK && k < p->frames; k++) {
        const double middle = 0.5;
        size_t at = k % FRAMES;
        rdl_shot_frame frame = {.time = 0.25 * (double)k,
                                .picture = (uint32_t)k,
                                .verdict = RDL_CLEAR,
                                .start = p->start[at][0],
                                .proposed = p->proposed[at][0],
                                .delivered = p->delivered[at][0]};
        if (p->waypoints > 0 && k == 1) {
            frame.verdict = RDL_RESOLVED;
            frame.waypoint_count = 1;
            frame.waypoint_times = &middle;
            frame.waypoint_positions = p->waypoint[0];
        }
        status = rdl_shot_append(writer, &frame, fault);
    }
    if (status == RDL_OK)
        return rdl_shot_finish(writer, fault);
    rdl_shot_discard(writer);
    return status;
}

/* Puts NaN where vertex 3 of frame 1 proposes to go. */
static int spoil(const char *path)
{
    const double nan_value = NAN;
    const hsize_t at[3] = {1, 3, 2};
    hid_t file = H5Fopen(path, H5F_ACC_RDWR, H5P_DEFAULT), set = H5Dopen2(file, "frames/proposed", H5P_DEFAULT);
    hid_t space = H5Dget_space(set), room = H5Screate(H5S_SCALAR);
    H5Sselect_elements(space, H5S_SELECT_SET, 1, at);
    int done = H5Dwrite(set, H5T_NATIVE_DOUBLE, room, space, H5P_DEFAULT, &nan_value) >= 0;
    H5Sclose(room);
    H5Sclose(space);
    H5Dclose(set);
    return H5Fclose(file) >= 0 && done;
}

/* Changes the digest of frame 0 of an existing shot. */
static int flip_digest(const char *path)
{
    const hsize_t start[2] = {0, 0}, count[2] = {1, 32};
    uint8_t digest[32];
    hid_t file = H5Fopen(path, H5F_ACC_RDWR, H5P_DEFAULT), set = H5Dopen2(file, "frames/digest", H5P_DEFAULT);
    hid_t space = H5Dget_space(set), room = H5Screate_simple(2, count, NULL);
    H5Sselect_hyperslab(space, H5S_SELECT_SET, start, NULL, count, NULL);
    int done = H5Dread(set, H5T_NATIVE_UINT8, room, space, H5P_DEFAULT, digest) >= 0;
    digest[7] ^= 1;
    done = H5Dwrite(set, H5T_NATIVE_UINT8, room, space, H5P_DEFAULT, digest) >= 0 && done;
    H5Sclose(room);
    H5Sclose(space);
    H5Dclose(set);
    return H5Fclose(file) >= 0 && done;
}

/* Adds a setting from the future to an existing shot. */
static int add_setting(const char *path)
{
    const double value = 1;
    hid_t file = H5Fopen(path, H5F_ACC_RDWR, H5P_DEFAULT), group = H5Gopen2(file, "settings", H5P_DEFAULT);
    hid_t space = H5Screate(H5S_SCALAR);
    hid_t attribute = H5Acreate2(group, "stickiness", H5T_IEEE_F64LE, space, H5P_DEFAULT, H5P_DEFAULT);
    int done = H5Awrite(attribute, H5T_NATIVE_DOUBLE, &value) >= 0;
    H5Aclose(attribute);
    H5Sclose(space);
    H5Gclose(group);
    return H5Fclose(file) >= 0 && done;
}

/* Prints the datasets of a VTKHDF file with their shapes and first numbers, and whether Points follow the offsets. */
static herr_t look_at_set(hid_t group, const char *name, const H5L_info_t *link, void *data)
{
    double numbers[8192];
    hsize_t dims[2] = {0, 0};
    (void)link;
    (void)data;
    hid_t set = H5Oopen(group, name, H5P_DEFAULT);
    if (H5Iget_type(set) == H5I_GROUP) {
        printf("%s:\n", name);
        H5Oclose(set);
        return 0;
    }
    hid_t space = H5Dget_space(set);
    int rank = H5Sget_simple_extent_dims(space, dims, NULL);
    size_t count = (size_t)dims[0] * (rank > 1 ? (size_t)dims[1] : 1);
    if (count > sizeof numbers / sizeof numbers[0] ||
        H5Dread(set, H5T_NATIVE_DOUBLE, H5S_ALL, H5S_ALL, H5P_DEFAULT, numbers) < 0)
        return -1;
    printf("%s (%d):", name, rank);
    for (size_t i = 0; i < count; i++)
        printf(" %g", numbers[i]);
    printf("\n");
    H5Sclose(space);
    H5Oclose(set);
    return 0;
}

static int look_vtk(const char *path)
{
    long long version[2] = {0, 0};
    hid_t file = H5Fopen(path, H5F_ACC_RDONLY, H5P_DEFAULT), group = H5Gopen2(file, "VTKHDF", H5P_DEFAULT);
    hid_t attribute = H5Aopen(group, "Version", H5P_DEFAULT);
    int done = H5Aread(attribute, H5T_NATIVE_LLONG, version) >= 0;
    printf("version %lld.%lld\n", version[0], version[1]);
    H5Aclose(attribute);
    done = H5Lvisit(group, H5_INDEX_NAME, H5_ITER_INC, look_at_set, NULL) >= 0 && done;
    H5Gclose(group);
    return H5Fclose(file) >= 0 && done;
}

int main(int argc, char **argv)
{
    static plan p;
    rdl_fault fault = {0, ""};
    if (argc != 3)
        return 2;
    if (strcmp(argv[1], "flip-digest") == 0)
        return flip_digest(argv[2]) ? EXIT_SUCCESS : 3;
    if (strcmp(argv[1], "look-vtk") == 0)
        return look_vtk(argv[2]) ? EXIT_SUCCESS : 3;
    if (strcmp(argv[1], "odd-setting") == 0)
        return add_setting(argv[2]) ? EXIT_SUCCESS : 3;
    int nan_wanted = strcmp(argv[1], "nan") == 0;
    if (!build(nan_wanted ? "resolve" : argv[1], &p)) {
        fprintf(stderr, "make_shot: no such kind: %s\n", argv[1]);
        return 2;
    }
    to_metres(p.start[0][0], sizeof p.start / sizeof(double));
    to_metres(p.proposed[0][0], sizeof p.proposed / sizeof(double));
    to_metres(p.delivered[0][0], sizeof p.delivered / sizeof(double));
    to_metres(p.waypoint[0], sizeof p.waypoint / sizeof(double));
    rdl_status status = write_plan(argv[2], &p, &fault);
    if (status != RDL_OK) {
        fprintf(stderr, "make_shot: %s: %s\n", fault.field, rdl_status_text(status));
        return 3;
    }
    return !nan_wanted || spoil(argv[2]) ? EXIT_SUCCESS : 3;
}
