/* Shot files that were damaged: cut short, and with single bits flipped. Whatever happens must be a status. */
#include <check.h>
#include <hdf5.h>
#include <stdbool.h>
#include <stdio.h>
#include <stdlib.h>

#include "shot_support.h"

enum { FRAMES = 4 };

/* For the leak checker: HDF5 1.10 loses some of its own memory over broken files. */
__attribute__((visibility("default"))) const char *__lsan_default_suppressions(void);
const char *__lsan_default_suppressions(void)
{
    return "leak:libhdf5\n";
}

/* Reads all that a file offers; whatever happens must be a status. Returns whether everything could be read. */
static bool read_everything(const char *path)
{
    rdl_shot *shot = NULL;
    double state[VERTICES][3];
    rdl_shot_frame frame;
    if (rdl_shot_open(path, &shot, NULL) != RDL_OK)
        return false;
    bool all = true;
    size_t frames = rdl_shot_describe(shot)->frame_count;
    for (size_t k = 0; k < frames && k < 16 && rdl_shot_scene(shot)->vertex_count == VERTICES; k++) {
        all = rdl_shot_read_frame(shot, k, &frame, NULL) == RDL_OK && all;
        for (unsigned which = 1; which <= 4; which *= 2)
            all = rdl_shot_read_positions(shot, k, which, state[0], NULL) == RDL_OK && all;
    }
    rdl_shot_close(shot);
    return all;
}

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

static void copy_set(hid_t from, hid_t to, const char *name)
{
    static unsigned char data[1 << 20];
    hid_t set = H5Dopen2(from, name, H5P_DEFAULT), type = H5Dget_type(set), space = H5Dget_space(set);
    hid_t old = H5Dget_create_plist(set), plan = H5Pcreate(H5P_DATASET_CREATE);
    hsize_t chunk[3] = {0};
    if (H5Pget_layout(old) == H5D_CHUNKED) {
        H5Pset_chunk(plan, H5Pget_chunk(old, 3, chunk), chunk);
        H5Pset_deflate(plan, 1);
    }
    ck_assert_uint_le((uint64_t)H5Sget_simple_extent_npoints(space) * H5Tget_size(type), sizeof data);
    ck_assert_int_ge(H5Dread(set, type, H5S_ALL, H5S_ALL, H5P_DEFAULT, data), 0);
    hid_t copy = H5Dcreate2(to, name, type, space, H5P_DEFAULT, plan, H5P_DEFAULT);
    ck_assert_int_ge(copy, 0);
    ck_assert_int_ge(H5Dwrite(copy, type, H5S_ALL, H5S_ALL, H5P_DEFAULT, data), 0);
    const hid_t ids[] = {copy, set};
    for (size_t k = 0; k < 2; k++)
        H5Dclose(ids[k]);
    H5Pclose(plan);
    H5Pclose(old);
    H5Sclose(space);
    H5Tclose(type);
}

/* The same shot as HDF5's oldest layout, without checksums over its structure. */
static void write_old(const char *path)
{
    static const char *const groups[] = {"parts", "mesh", "rules", "frames", "settings"};
    const char *new = scratch("new.h5");
    int version = 1;
    write_shot(new, FRAMES, 64, 1);
    hid_t from = H5Fopen(new, H5F_ACC_RDONLY, H5P_DEFAULT);
    hid_t access = H5Pcreate(H5P_FILE_ACCESS);
    H5Pset_libver_bounds(access, H5F_LIBVER_EARLIEST, H5F_LIBVER_V18);
    hid_t to = H5Fcreate(path, H5F_ACC_TRUNC, H5P_DEFAULT, access);
    for (size_t k = 0; k < 5; k++) {
        hid_t group = H5Gcreate2(to, groups[k], H5P_DEFAULT, H5P_DEFAULT, H5P_DEFAULT);
        hid_t source = H5Gopen2(from, groups[k], H5P_DEFAULT);
        H5G_info_t info;
        H5Gget_info(source, &info);
        for (hsize_t i = 0; i < info.nlinks; i++) {
            char name[64];
            H5Lget_name_by_idx(source, ".", H5_INDEX_NAME, H5_ITER_INC, i, name, sizeof name, H5P_DEFAULT);
            copy_set(source, group, name);
        }
        H5Gclose(source);
        H5Gclose(group);
    }
    set_attribute(to, "raddle_shot", H5T_NATIVE_INT, &version);
    H5Pclose(access);
    H5Fclose(to);
    H5Fclose(from);
}

START_TEST(cut_files_are_refused)
{
    const char *path = scratch("whole.h5"), *cut = scratch("short.h5");
    size_t bytes = 0;
    if (_i == 0)
        write_shot(path, FRAMES, 64, 1);
    else
        write_old(path);
    ck_assert(read_everything(path));
    unsigned char *data = load(path, &bytes);
    for (size_t tenth = 0; tenth < 10; tenth++) {
        store(cut, data, bytes * tenth / 10);
        ck_assert(!read_everything(cut));
    }
    for (size_t k = 0; k < 200; k++) {
        store(cut, data, bytes - 1 - k * (bytes - 1) / 200);
        ck_assert(!read_everything(cut));
    }
    free(data);
}
END_TEST

/* Bits all over the file, one flipped at a time. */
START_TEST(flipped_bits_do_no_harm)
{
    const char *path = scratch("straight.h5"), *bent = scratch("bent.h5");
    size_t bytes = 0, noticed = 0, tried = 0;
    H5Eset_auto2(H5E_DEFAULT, NULL, NULL); /* else HDF5 1.10 complains at exit, after some of these files */
    write_shot(path, 2, 64, 1);
    unsigned char *data = load(path, &bytes);
    for (size_t k = (size_t)_i; k < bytes; k += k < 4096 ? 11 : 37) {
        unsigned char bit = (unsigned char)(1u << (k / 3 % 8));
        data[k] ^= bit;
        store(bent, data, bytes);
        noticed += !read_everything(bent);
        tried++;
        data[k] ^= bit;
    }
    ck_assert_uint_gt(noticed, tried / 4);
    free(data);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("shot, damaged files");
    TCase *group = tcase_create("damaged");
    tcase_set_timeout(group, 120);
    tcase_add_loop_test(group, cut_files_are_refused, 0, 2);
    tcase_add_loop_test(group, flipped_bits_do_no_harm, 0, 3);
    suite_add_tcase(suite, group);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_ENV);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
