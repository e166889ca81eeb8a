/* Shot files that lie: everything that a reader must refuse, name, and survive. */
#include <check.h>
#include <hdf5.h>
#include <math.h>
#include <stdbool.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "shot_support.h"

enum { FRAMES = 4 };

/* Opens a copy of a good shot for changes. */
static hid_t begin_change(const char *path)
{
    write_shot(path, FRAMES, 64, 1);
    hid_t file = H5Fopen(path, H5F_ACC_RDWR, H5P_DEFAULT);
    ck_assert_int_ge(file, 0);
    return file;
}

static void put(hid_t file, const char *name, hid_t file_type, hid_t memory_type, int rank, const hsize_t dims[3],
                const void *data)
{
    hid_t space = H5Screate_simple(rank, dims, NULL);
    if (H5Lexists(file, name, H5P_DEFAULT) > 0)
        ck_assert_int_ge(H5Ldelete(file, name, H5P_DEFAULT), 0);
    hid_t set = H5Dcreate2(file, name, file_type, space, H5P_DEFAULT, H5P_DEFAULT, H5P_DEFAULT);
    ck_assert_int_ge(set, 0);
    if (data != NULL)
        ck_assert_int_ge(H5Dwrite(set, memory_type, H5S_ALL, H5S_ALL, H5P_DEFAULT, data), 0);
    H5Dclose(set);
    H5Sclose(space);
}

static void put_reals(hid_t file, const char *name, int rank, const hsize_t dims[3], const double *data)
{
    put(file, name, H5T_IEEE_F64LE, H5T_NATIVE_DOUBLE, rank, dims, data);
}

static void put_whole(hid_t file, const char *name, int rank, const hsize_t dims[3], const int64_t *data)
{
    put(file, name, H5T_STD_I64LE, H5T_NATIVE_INT64, rank, dims, data);
}

#define CHANGED(path, change, status, field, index)                                                                    \
    do {                                                                                                               \
        hid_t file = begin_change(path);                                                                               \
        change;                                                                                                        \
        H5Fclose(file);                                                                                                \
        expect_open(path, status, field, index);                                                                       \
    } while (0)

static void set_attribute(hid_t object, const char *name, hid_t type, const void *value)
{
    hid_t space = H5Screate(H5S_SCALAR);
    if (H5Aexists(object, name) > 0)
        H5Adelete(object, name);
    hid_t attribute = H5Acreate2(object, name, type, space, H5P_DEFAULT, H5P_DEFAULT);
    ck_assert_int_ge(H5Awrite(attribute, type, value), 0);
    H5Aclose(attribute);
    H5Sclose(space);
}

static void set_text(hid_t object, const char *name, const char *text)
{
    hid_t type = H5Tcopy(H5T_C_S1);
    H5Tset_size(type, H5T_VARIABLE);
    set_attribute(object, name, type, &text);
    H5Tclose(type);
}

START_TEST(marks_of_the_root_are_checked)
{
    const char *path = scratch("root.h5");
    int version = 2;
    CHANGED(path, set_attribute(file, "raddle_shot", H5T_NATIVE_INT, &version), RDL_BAD_VERSION, "raddle_shot", 2);
    CHANGED(path, H5Adelete(file, "raddle_shot"), RDL_BAD_FILE, "raddle_shot", 0);
    CHANGED(path, set_text(file, "raddle_shot", "1"), RDL_BAD_FILE, "raddle_shot", 0);
    CHANGED(path, set_text(file, "length_unit", "cm"), RDL_BAD_FILE, "length_unit", 0);
    CHANGED(path, set_text(file, "time_unit", "h"), RDL_BAD_FILE, "time_unit", 0);
    CHANGED(path, set_text(file, "created_by", "\xff\xfe"), RDL_BAD_FILE, "created_by", 0);
}
END_TEST

START_TEST(indices_and_shapes_of_the_mesh_are_checked)
{
    const char *path = scratch("mesh.h5");
    const hsize_t two_three[3] = {2, 3, 0}, two_two[3] = {2, 2, 0}, n[3] = {VERTICES, 0, 0}, fewer[3] = {8, 0, 0};
    const int64_t beyond[6] = {3, 4, 5, 6, 7, 9}, below[6] = {3, 4, -1, 6, 7, 8}, twice[6] = {3, 4, 5, 6, 7, 7};
    const int64_t mixed[6] = {3, 4, 5, 5, 6, 7}, huge[6] = {3, 4, INT64_C(1) << 40, 6, 7, 8},
                  kind[6] = {0, 1, 2, 6, 7, 8};
    const int64_t far[4] = {0, 1, 1, 9};
    const int64_t part[VERTICES] = {0, 0, 0, 1, 1, 1, 2, 2, 3};
    const double mass[VERTICES] = {1, 1, 1, 1, 1, 1, NAN, 1, 1}, zero[VERTICES] = {1, 1, 0, 1, 1, 1, 1, 1, 1};
    const double thin[VERTICES] = {0, 0, 0, 0, 0, -1e-9, 0, 0, 0};
    CHANGED(path, put_whole(file, "mesh/triangles", 2, two_three, beyond), RDL_OUT_OF_RANGE, "mesh/triangles", 1);
    CHANGED(path, put_whole(file, "mesh/triangles", 2, two_three, below), RDL_OUT_OF_RANGE, "mesh/triangles", 0);
    CHANGED(path, put_whole(file, "mesh/triangles", 2, two_three, huge), RDL_OUT_OF_RANGE, "mesh/triangles", 0);
    CHANGED(path, put_whole(file, "mesh/triangles", 2, two_three, twice), RDL_REPEATED_VERTEX, "mesh/triangles", 1);
    CHANGED(path, put_whole(file, "mesh/triangles", 2, two_three, mixed), RDL_MIXED_PARTS, "mesh/triangles", 1);
    CHANGED(path, put_whole(file, "mesh/triangles", 2, two_three, kind), RDL_OUT_OF_RANGE, "mesh/triangles", 0);
    CHANGED(path, put_whole(file, "mesh/triangles", 2, two_two, beyond), RDL_BAD_FILE, "mesh/triangles", 2);
    CHANGED(path, put_whole(file, "mesh/triangles", 1, two_three, beyond), RDL_BAD_FILE, "mesh/triangles", 0);
    CHANGED(path, put_whole(file, "mesh/segments", 2, two_two, far), RDL_OUT_OF_RANGE, "mesh/segments", 1);
    CHANGED(path, put_reals(file, "mesh/segments", 2, two_two, mass), RDL_BAD_FILE, "mesh/segments", 0);
    CHANGED(path, put_whole(file, "mesh/part", 1, n, part), RDL_OUT_OF_RANGE, "mesh/part", 8);
    CHANGED(path, put_whole(file, "mesh/part", 1, fewer, part), RDL_BAD_FILE, "mesh/mass", 9);
    CHANGED(path, put_reals(file, "mesh/mass", 1, n, mass), RDL_BAD_MASS, "mesh/mass", 6);
    CHANGED(path, put_reals(file, "mesh/mass", 1, n, zero), RDL_BAD_MASS, "mesh/mass", 2);
    CHANGED(path, put_reals(file, "mesh/half_thickness", 1, n, thin), RDL_BAD_THICKNESS, "mesh/half_thickness", 5);
    CHANGED(path, H5Ldelete(file, "mesh/mass", H5P_DEFAULT), RDL_BAD_FILE, "mesh/mass", 0);
    CHANGED(path, H5Ldelete(file, "mesh/part", H5P_DEFAULT), RDL_BAD_FILE, "mesh/part", 0);
}
END_TEST

START_TEST(parts_and_rules_are_checked)
{
    const char *path = scratch("parts.h5");
    const hsize_t three[3] = {3, 0, 0}, two[3] = {2, 0, 0}, pair[3] = {1, 2, 0}, triple[3] = {1, 3, 0};
    const int64_t kind[3] = {0, 1, 3}, far[2] = {0, 9}, part[2] = {1, 3}, same[2] = {4, 4};
    const double thick[3] = {1, INFINITY, 1}, rough[3] = {1, 1, -1}, nan[3] = {NAN, 1, 1};
    const double half_part[3] = {0.5, 1, 1}, far_part[3] = {0, 3, 1}, bad_mu[3] = {0, 1, NAN};
    CHANGED(path, put_whole(file, "parts/kind", 1, three, kind), RDL_OUT_OF_RANGE, "parts/kind", 2);
    CHANGED(path, put_whole(file, "parts/kind", 1, two, kind), RDL_BAD_FILE, "parts/kind", 2);
    CHANGED(path, put_reals(file, "parts/half_thickness", 1, three, thick), RDL_BAD_THICKNESS, "parts/half_thickness",
            1);
    CHANGED(path, put_reals(file, "parts/friction", 1, three, rough), RDL_OUT_OF_RANGE, "parts/friction", 2);
    CHANGED(path, put_reals(file, "parts/friction", 1, three, nan), RDL_NOT_FINITE, "parts/friction", 0);
    CHANGED(path, H5Ldelete(file, "parts/half_thickness", H5P_DEFAULT), RDL_BAD_FILE, "parts/half_thickness", 0);
    CHANGED(path, H5Ldelete(file, "parts/name", H5P_DEFAULT), RDL_BAD_FILE, "parts/name", 0);
    CHANGED(path, put_reals(file, "parts/name", 1, three, rough), RDL_BAD_FILE, "parts/name", 0);
    CHANGED(path, put_whole(file, "rules/muted_parts", 2, pair, part), RDL_OUT_OF_RANGE, "rules/muted_parts", 0);
    CHANGED(path, put_whole(file, "rules/attachments", 2, pair, far), RDL_OUT_OF_RANGE, "rules/attachments", 0);
    CHANGED(path, put_whole(file, "rules/attachments", 2, pair, same), RDL_REPEATED_VERTEX, "rules/attachments", 0);
    CHANGED(path, put_reals(file, "rules/pair_friction", 2, triple, half_part), RDL_OUT_OF_RANGE, "rules/pair_friction",
            0);
    CHANGED(path, put_reals(file, "rules/pair_friction", 2, triple, far_part), RDL_OUT_OF_RANGE, "rules/pair_friction",
            0);
    CHANGED(path, put_reals(file, "rules/pair_friction", 2, triple, bad_mu), RDL_NOT_FINITE, "rules/pair_friction", 0);
}
END_TEST

START_TEST(frames_are_checked)
{
    const char *path = scratch("frames.h5");
    const hsize_t short_n[3] = {FRAMES, 8, 3}, flat[3] = {FRAMES, VERTICES, 2}, fewer[3] = {3, VERTICES, 3};
    const hsize_t one[3] = {FRAMES, 0, 0}, plane[3] = {FRAMES, 27, 0};
    const double nothing[FRAMES * VERTICES * 3] = {0};
    const int64_t whole[FRAMES] = {0};
    CHANGED(path, put_reals(file, "frames/start", 3, short_n, nothing), RDL_BAD_FILE, "frames/start", 8);
    CHANGED(path, put_reals(file, "frames/start", 3, flat, nothing), RDL_BAD_FILE, "frames/start", 2);
    CHANGED(path, put_reals(file, "frames/start", 2, plane, nothing), RDL_BAD_FILE, "frames/start", 0);
    CHANGED(path, put_reals(file, "frames/proposed", 3, fewer, nothing), RDL_BAD_FILE, "frames/proposed", 3);
    CHANGED(path, put_whole(file, "frames/time", 1, one, whole), RDL_BAD_FILE, "frames/time", 0);
    CHANGED(path, H5Ldelete(file, "frames/time", H5P_DEFAULT), RDL_BAD_FILE, "frames/time", 0);
    CHANGED(path, H5Ldelete(file, "frames/waypoint_time", H5P_DEFAULT), RDL_BAD_FILE, "frames/waypoint_first", 0);
    CHANGED(path, H5Ldelete(file, "frames/memory_bytes", H5P_DEFAULT), RDL_BAD_FILE, "frames/memory", 0);
    CHANGED(path, put_whole(file, "frames/memory", 1, one, whole), RDL_BAD_FILE, "frames/memory", 0);
    CHANGED(path, H5Ldelete(file, "frames", H5P_DEFAULT), RDL_BAD_FILE, "frames/delivered", 0);
}
END_TEST

/* Changes one number of a frames dataset in place. */
static void poke(hid_t file, const char *name, hid_t type, const hsize_t at[3], const void *value)
{
    hid_t set = H5Dopen2(file, name, H5P_DEFAULT), space = H5Dget_space(set), room = H5Screate(H5S_SCALAR);
    ck_assert_int_ge(H5Sselect_elements(space, H5S_SELECT_SET, 1, at), 0);
    ck_assert_int_ge(H5Dwrite(set, type, room, space, H5P_DEFAULT, value), 0);
    H5Sclose(room);
    H5Sclose(space);
    H5Dclose(set);
}

static void expect_read(const char *path, size_t frame, unsigned which, rdl_status status, const char *field,
                        uint64_t index)
{
    double state[VERTICES][3] = {{7}}, before[VERTICES][3] = {{7}};
    rdl_shot *shot = NULL;
    rdl_shot_frame read;
    rdl_fault fault = {0, ""};
    ck_assert_int_eq(rdl_shot_open(path, &shot, NULL), RDL_OK);
    rdl_status got = which == 0 ? rdl_shot_read_frame(shot, frame, &read, &fault)
                                : rdl_shot_read_positions(shot, frame, which, state[0], &fault);
    ck_assert_msg(got == status && strcmp(fault.field, field) == 0 && fault.index == index, "got %d at %s %llu", got,
                  fault.field, (unsigned long long)fault.index);
    ck_assert_mem_eq(state, before, sizeof state);
    rdl_shot_close(shot);
}

#define POKED(name, type, at0, at1, at2, c_type, value, frame, which, status, field, index)                            \
    do {                                                                                                               \
        hid_t file = begin_change(path);                                                                               \
        c_type poked = value;                                                                                          \
        poke(file, name, type, (hsize_t[3]){at0, at1, at2}, &poked);                                                   \
        H5Fclose(file);                                                                                                \
        expect_read(path, frame, which, status, field, index);                                                         \
    } while (0)

START_TEST(numbers_of_frames_are_checked_when_read)
{
    const char *path = scratch("numbers.h5");
    POKED("frames/start", H5T_NATIVE_DOUBLE, 2, 5, 1, double, NAN, 2, RDL_SHOT_START, RDL_NOT_FINITE, "frames/start",
          5);
    POKED("frames/proposed", H5T_NATIVE_DOUBLE, 0, 8, 2, double, INFINITY, 0, RDL_SHOT_PROPOSED, RDL_NOT_FINITE,
          "frames/proposed", 8);
    POKED("frames/delivered", H5T_NATIVE_DOUBLE, 1, 0, 0, double, 0.5, 1, RDL_SHOT_DELIVERED, RDL_BAD_DIGEST,
          "frames/delivered", 1);
    POKED("frames/time", H5T_NATIVE_DOUBLE, 3, 0, 0, double, NAN, 3, 0, RDL_NOT_FINITE, "frames/time", 3);
    POKED("frames/verdict", H5T_NATIVE_INT, 1, 0, 0, int, 4, 1, 0, RDL_OUT_OF_RANGE, "frames/verdict", 1);
    POKED("frames/waypoint_first", H5T_NATIVE_UINT64, 2, 0, 0, uint64_t, 100, 1, 0, RDL_BAD_FILE,
          "frames/waypoint_first", 1);
    POKED("frames/waypoint_first", H5T_NATIVE_UINT64, 2, 0, 0, uint64_t, 4, 2, 0, RDL_BAD_FILE, "frames/waypoint_first",
          2);
    POKED("frames/waypoint_time", H5T_NATIVE_DOUBLE, 1, 0, 0, double, 1.5, 2, 0, RDL_OUT_OF_RANGE,
          "frames/waypoint_time", 1);
    POKED("frames/waypoint_position", H5T_NATIVE_DOUBLE, 1, 4, 0, double, NAN, 2, 0, RDL_NOT_FINITE,
          "frames/waypoint_position", 4);
}
END_TEST

START_TEST(spans_of_memory_stay_inside)
{
    const char *path = scratch("span.h5");
    const uint64_t spans[3][2] = {{0, 1 << 20}, {UINT64_MAX, 8}, {8, UINT64_MAX}};
    for (size_t k = 0; k < 3; k++) {
        hid_t file = begin_change(path), set = H5Dopen2(file, "frames/memory", H5P_DEFAULT), type = H5Dget_type(set);
        H5Dclose(set);
        poke(file, "frames/memory", type, (hsize_t[3]){1, 0, 0}, spans[k]);
        H5Tclose(type);
        H5Fclose(file);
        expect_read(path, 1, 0, RDL_BAD_FILE, "frames/memory", 1);
    }
}
END_TEST

START_TEST(settings_are_checked)
{
    const char *path = scratch("settings.h5");
    double value = 7;
    rdl_shot *shot = NULL;
    size_t count = 0, row = 0;
    const rdl_setting_info *table = rdl_settings_table(&count);
    while (strcmp(table[row].name, "restitution") != 0)
        row++;
    hid_t file = begin_change(path), group = H5Gopen2(file, "settings", H5P_DEFAULT);
    set_attribute(group, "restitution", H5T_NATIVE_DOUBLE, &value);
    H5Gclose(group);
    H5Fclose(file);
    expect_open(path, RDL_BAD_SETTING, "restitution", row);
    file = begin_change(path);
    group = H5Gopen2(file, "settings", H5P_DEFAULT);
    set_attribute(group, "from_the_future", H5T_NATIVE_DOUBLE, &value);
    H5Gclose(group);
    H5Fclose(file);
    ck_assert_int_eq(rdl_shot_open(path, &shot, NULL), RDL_OK);
    ck_assert_str_eq(rdl_shot_describe(shot)->unknown_setting, "from_the_future");
    rdl_shot_close(shot);
    file = begin_change(path);
    group = H5Gopen2(file, "settings", H5P_DEFAULT);
    set_text(group, "restitution", "none");
    H5Gclose(group);
    H5Fclose(file);
    expect_open(path, RDL_BAD_FILE, "settings", 0);
}
END_TEST

/* Nothing in a shot may lead out of it. */
START_TEST(links_and_foreign_storage_are_refused)
{
    const char *path = scratch("links.h5"), *other = scratch("other.h5");
    const hsize_t n[3] = {VERTICES, 0, 0};
    write_shot(other, 1, 64, 1);
    CHANGED(path,
            (H5Lmove(file, "mesh/mass", file, "mesh/real", H5P_DEFAULT, H5P_DEFAULT),
             H5Lcreate_soft("/mesh/real", file, "mesh/mass", H5P_DEFAULT, H5P_DEFAULT)),
            RDL_BAD_FILE, "mesh/mass", 0);
    CHANGED(path,
            (H5Ldelete(file, "mesh/mass", H5P_DEFAULT),
             H5Lcreate_external(other, "/mesh/mass", file, "mesh/mass", H5P_DEFAULT, H5P_DEFAULT)),
            RDL_BAD_FILE, "mesh/mass", 0);
    CHANGED(path,
            (H5Ldelete(file, "rules", H5P_DEFAULT),
             H5Lcreate_external(other, "/rules", file, "rules", H5P_DEFAULT, H5P_DEFAULT)),
            RDL_BAD_FILE, "rules", 0);
    hid_t file = begin_change(path), plan = H5Pcreate(H5P_DATASET_CREATE), space = H5Screate_simple(1, n, NULL);
    H5Pset_external(plan, "/etc/passwd", 0, VERTICES * sizeof(double));
    H5Ldelete(file, "mesh/mass", H5P_DEFAULT);
    H5Dclose(H5Dcreate2(file, "mesh/mass", H5T_IEEE_F64LE, space, H5P_DEFAULT, plan, H5P_DEFAULT));
    H5Pclose(plan);
    H5Fclose(file);
    expect_open(path, RDL_BAD_FILE, "mesh/mass", VERTICES);
    file = begin_change(path);
    plan = H5Pcreate(H5P_DATASET_CREATE);
    H5Pset_virtual(plan, space, other, "/mesh/mass", space);
    H5Ldelete(file, "mesh/mass", H5P_DEFAULT);
    H5Dclose(H5Dcreate2(file, "mesh/mass", H5T_IEEE_F64LE, space, H5P_DEFAULT, plan, H5P_DEFAULT));
    H5Pclose(plan);
    H5Sclose(space);
    H5Fclose(file);
    expect_open(path, RDL_BAD_FILE, "mesh/mass", VERTICES);
}
END_TEST

/* A table that claims more rows than the file could ever hold is refused before any memory is taken. */
START_TEST(claims_beyond_the_file_are_refused)
{
    const char *path = scratch("claims.h5");
    const hsize_t many[3] = {INT32_MAX, 3, 0}, limit[3] = {H5S_UNLIMITED, 3, 0}, chunk[3] = {1024, 3, 0};
    hid_t file = begin_change(path), plan = H5Pcreate(H5P_DATASET_CREATE), space = H5Screate_simple(2, many, limit);
    H5Pset_chunk(plan, 2, chunk);
    H5Ldelete(file, "mesh/triangles", H5P_DEFAULT);
    H5Dclose(H5Dcreate2(file, "mesh/triangles", H5T_STD_U32LE, space, H5P_DEFAULT, plan, H5P_DEFAULT));
    H5Pclose(plan);
    H5Sclose(space);
    H5Fclose(file);
    expect_open(path, RDL_BAD_FILE, "mesh/triangles", INT32_MAX);
}
END_TEST

/* Big-endian numbers, other widths, other standard filters, texts of variable length. */
START_TEST(other_writers_are_read)
{
    const char *path = scratch("foreign.h5");
    const char *names[3] = {"fringe", "sheet", ""};
    const hsize_t n[3] = {VERTICES, 0, 0}, three[3] = {3, 0, 0}, two_three[3] = {2, 3, 0};
    const int64_t part[VERTICES] = {0, 0, 0, 1, 1, 1, 2, 2, 2}, triangles[6] = {3, 4, 5, 6, 7, 8};
    const double mass[VERTICES] = {0.5, 0.5, 0.5, 1, 1, 1, INFINITY, INFINITY, INFINITY};
    hid_t file = begin_change(path), text = H5Tcopy(H5T_C_S1);
    H5Tset_size(text, H5T_VARIABLE);
    put(file, "parts/name", text, text, 1, three, names);
    put(file, "mesh/part", H5T_STD_U16BE, H5T_NATIVE_INT64, 1, n, part);
    put(file, "mesh/triangles", H5T_STD_I64BE, H5T_NATIVE_INT64, 2, two_three, triangles);
    put(file, "mesh/mass", H5T_IEEE_F32BE, H5T_NATIVE_DOUBLE, 1, n, mass);
    H5Tclose(text);
    const hsize_t dims[3] = {FRAMES, VERTICES, 3}, chunk[3] = {2, 4, 3};
    static double start[FRAMES][VERTICES][3];
    static made_frame made;
    for (unsigned k = 0; k < FRAMES; k++) {
        make_frame(&made, k);
        memcpy(start[k], made.start, sizeof made.start);
    }
    hid_t plan = H5Pcreate(H5P_DATASET_CREATE), space = H5Screate_simple(3, dims, NULL);
    H5Pset_chunk(plan, 3, chunk);
    H5Pset_nbit(plan);
    H5Pset_deflate(plan, 9);
    H5Ldelete(file, "frames/start", H5P_DEFAULT);
    hid_t set = H5Dcreate2(file, "frames/start", H5T_IEEE_F32BE, space, H5P_DEFAULT, plan, H5P_DEFAULT);
    ck_assert_int_ge(H5Dwrite(set, H5T_NATIVE_DOUBLE, H5S_ALL, H5S_ALL, H5P_DEFAULT, start), 0);
    H5Dclose(set);
    H5Sclose(space);
    H5Pclose(plan);
    H5Fclose(file);
    rdl_shot *shot = NULL;
    ck_assert_int_eq(rdl_shot_open(path, &shot, NULL), RDL_OK);
    const rdl_scene *scene = rdl_shot_scene(shot);
    ck_assert_str_eq(scene->parts[1].name, "sheet");
    ck_assert_double_eq(scene->mass[2], 0.5);
    ck_assert(isinf(scene->mass[8]));
    ck_assert_uint_eq(scene->vertex_part[8], 2);
    ck_assert_mem_eq(scene->triangles, small_scene()->triangles, sizeof(uint32_t[2][3]));
    for (unsigned k = 0; k < FRAMES; k++)
        expect_frame(shot, k, k);
    rdl_shot_close(shot);
}
END_TEST

/* The engine's memory as one opaque item, or one sequence of bytes, per frame. */
START_TEST(other_forms_of_memory_are_read)
{
    const char *path = scratch("memory.h5");
    static unsigned char blocks[FRAMES][40];
    hvl_t sequences[FRAMES];
    const hsize_t one[3] = {FRAMES, 0, 0};
    for (unsigned k = 0; k < FRAMES; k++) {
        for (unsigned i = 0; i < 40; i++)
            blocks[k][i] = (unsigned char)(7 * k + i);
        sequences[k] = (hvl_t){10 * k, blocks[k]};
    }
    hid_t type = _i == 0 ? H5Tcreate(H5T_OPAQUE, 40) : H5Tvlen_create(H5T_NATIVE_UINT8);
    hid_t file = begin_change(path);
    H5Ldelete(file, "frames/memory_bytes", H5P_DEFAULT);
    put(file, "frames/memory", type, type, 1, one, _i == 0 ? (const void *)blocks : (const void *)sequences);
    H5Tclose(type);
    H5Fclose(file);
    rdl_shot *shot = NULL;
    ck_assert_int_eq(rdl_shot_open(path, &shot, NULL), RDL_OK);
    for (unsigned k = 0; k < FRAMES; k++) {
        rdl_shot_frame frame;
        ck_assert_int_eq(rdl_shot_read_frame(shot, k, &frame, NULL), RDL_OK);
        ck_assert_uint_eq(frame.memory_bytes, _i == 0 ? 40 : 10 * k);
        if (frame.memory_bytes > 0)
            ck_assert_mem_eq(frame.memory, blocks[k], frame.memory_bytes);
    }
    rdl_shot_close(shot);
}
END_TEST

/* Poses alone: positions and triangles, nothing else. */
START_TEST(bare_poses_are_read)
{
    const char *path = scratch("poses.h5");
    static double poses[2][VERTICES][3];
    const hsize_t dims[3] = {2, VERTICES, 3}, two_three[3] = {2, 3, 0};
    const int64_t triangles[6] = {3, 4, 5, 6, 7, 8};
    int version = 1;
    hid_t file = H5Fcreate(path, H5F_ACC_TRUNC, H5P_DEFAULT, H5P_DEFAULT);
    H5Gclose(H5Gcreate2(file, "mesh", H5P_DEFAULT, H5P_DEFAULT, H5P_DEFAULT));
    H5Gclose(H5Gcreate2(file, "frames", H5P_DEFAULT, H5P_DEFAULT, H5P_DEFAULT));
    set_attribute(file, "raddle_shot", H5T_NATIVE_INT, &version);
    put_reals(file, "frames/delivered", 3, dims, poses[0][0]);
    put_whole(file, "mesh/triangles", 2, two_three, triangles);
    H5Fclose(file);
    rdl_shot *shot = NULL;
    rdl_fault fault = {0, ""};
    ck_assert_msg(rdl_shot_open(path, &shot, &fault) == RDL_OK, "%s", fault.field);
    ck_assert_uint_eq(rdl_shot_describe(shot)->frame_count, 2);
    ck_assert_uint_eq(rdl_shot_describe(shot)->contents, RDL_SHOT_DELIVERED);
    ck_assert_int_eq(rdl_shot_describe(shot)->has_mass, 0);
    ck_assert_uint_eq(rdl_shot_scene(shot)->vertex_count, VERTICES);
    ck_assert_int_eq(rdl_shot_scene(shot)->parts[0].kind, RDL_CLOTH);
    ck_assert_double_eq(rdl_shot_scene(shot)->mass[8], 1);
    rdl_shot_close(shot);
}
END_TEST

/* A recording is as long as its shortest table, less a last frame that does not hold. */
START_TEST(an_unfinished_recording_is_cut)
{
    const char *path = scratch("cut.h5"), *part = scratch("cut.h5.part");
    const double wrong = 9;
    rdl_shot *shot = NULL;
    for (int kind = 0; kind < 3; kind++) {
        hid_t file = begin_change(path);
        hid_t set = H5Dopen2(file, "frames/verdict", H5P_DEFAULT);
        if (kind != 1)
            H5Dset_extent(set, (hsize_t[1]){FRAMES - 1});
        H5Dclose(set);
        if (kind != 0)
            poke(file, "frames/delivered", H5T_NATIVE_DOUBLE, (hsize_t[3]){kind == 1 ? FRAMES - 1 : FRAMES - 2, 1, 1},
                 &wrong);
        H5Fclose(file);
        ck_assert_int_eq(rename(path, part), 0);
        ck_assert_int_eq(rdl_shot_open(part, &shot, NULL), RDL_OK);
        const rdl_shot_info *info = rdl_shot_describe(shot);
        ck_assert_uint_eq(info->frame_count, kind == 2 ? FRAMES - 2 : FRAMES - 1);
        ck_assert_int_eq(info->complete, 0);
        for (unsigned k = 0; k < info->frame_count; k++)
            expect_frame(shot, k, k);
        rdl_shot_close(shot);
    }
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("shot, bad files");
    TCase *group = tcase_create("bad");
    tcase_set_timeout(group, 120);
    tcase_add_test(group, marks_of_the_root_are_checked);
    tcase_add_test(group, indices_and_shapes_of_the_mesh_are_checked);
    tcase_add_test(group, parts_and_rules_are_checked);
    tcase_add_test(group, frames_are_checked);
    tcase_add_test(group, numbers_of_frames_are_checked_when_read);
    tcase_add_test(group, spans_of_memory_stay_inside);
    tcase_add_test(group, settings_are_checked);
    tcase_add_test(group, links_and_foreign_storage_are_refused);
    tcase_add_test(group, claims_beyond_the_file_are_refused);
    tcase_add_test(group, other_writers_are_read);
    tcase_add_loop_test(group, other_forms_of_memory_are_read, 0, 2);
    tcase_add_test(group, bare_poses_are_read);
    tcase_add_test(group, an_unfinished_recording_is_cut);
    suite_add_tcase(suite, group);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_ENV);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
