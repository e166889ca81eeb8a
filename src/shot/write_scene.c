/* shot/write_scene.c: what a shot says once: root attributes, /parts, /mesh, /rules, /settings, and the empty datasets
 * of /frames. */
#include "raddle/version.h"
#include "shot/write.h"

enum { CHUNK_ROWS_MAX = 1 << 20 }; /* keeps a chunk of a scene table far below HDF5's 4 GiB */

bool rdli_write_attribute(hid_t object, const char *name, hid_t file_type, hid_t memory_type, const void *value)
{
    hid_t space = H5Screate(H5S_SCALAR);
    hid_t attribute = H5Acreate2(object, name, file_type, space, H5P_DEFAULT, H5P_DEFAULT);
    bool done = attribute >= 0 && H5Awrite(attribute, memory_type, value) >= 0;
    done = (attribute < 0 || H5Aclose(attribute) >= 0) && done;
    return H5Sclose(space) >= 0 && done;
}

/* A fixed-length UTF-8 type; longest counts bytes without the closing 0, which is not stored. */
static hid_t text_type(size_t longest)
{
    hid_t type = H5Tcopy(H5T_C_S1);
    if (type >= 0 && (H5Tset_size(type, longest > 0 ? longest : 1) < 0 || H5Tset_cset(type, H5T_CSET_UTF8) < 0 ||
                      H5Tset_strpad(type, H5T_STR_NULLPAD) < 0)) {
        H5Tclose(type);
        type = H5I_INVALID_HID;
    }
    return type;
}

bool rdli_write_text(hid_t object, const char *name, const char *text)
{
    hid_t type = text_type(strlen(text));
    bool done = type >= 0 && rdli_write_attribute(object, name, type, type, text);
    if (type >= 0)
        H5Tclose(type);
    return done;
}

static bool add_filters(hid_t plan, int deflate)
{
    if (deflate > 0 && (H5Pset_shuffle(plan) < 0 || H5Pset_deflate(plan, (unsigned)deflate) < 0))
        return false;
    return H5Pset_fletcher32(plan) >= 0;
}

static hid_t new_plan(void)
{
    hid_t plan = H5Pcreate(H5P_DATASET_CREATE);
    if (plan >= 0 && H5Pset_obj_track_times(plan, false) < 0) {
        H5Pclose(plan);
        plan = H5I_INVALID_HID;
    }
    return plan;
}

/* One table of the scene. Tables without rows have nothing to chunk, so they are stored contiguous. */
static bool write_table(const rdl_shot_writer *writer, hid_t group, const char *name, hid_t file_type,
                        hid_t memory_type, int rank, const hsize_t dims[2], const void *data)
{
    hid_t plan = new_plan();
    hid_t space = H5Screate_simple(rank, dims, NULL);
    bool done = plan >= 0 && space >= 0;
    if (done && dims[0] > 0) {
        hsize_t chunk[2] = {dims[0] < CHUNK_ROWS_MAX ? dims[0] : CHUNK_ROWS_MAX, dims[1]};
        done = H5Pset_chunk(plan, rank, chunk) >= 0 && add_filters(plan, writer->deflate);
    }
    hid_t set = done ? H5Dcreate2(group, name, file_type, space, H5P_DEFAULT, plan, H5P_DEFAULT) : H5I_INVALID_HID;
    done = set >= 0 && (dims[0] == 0 || H5Dwrite(set, memory_type, H5S_ALL, H5S_ALL, H5P_DEFAULT, data) >= 0);
    done = (set < 0 || H5Dclose(set) >= 0) && done;
    if (space >= 0)
        H5Sclose(space);
    if (plan >= 0)
        H5Pclose(plan);
    return done;
}

static hid_t make_group(hid_t file, const char *name)
{
    hid_t plan = H5Pcreate(H5P_GROUP_CREATE);
    hid_t group = H5I_INVALID_HID;
    if (plan >= 0 && H5Pset_obj_track_times(plan, false) >= 0)
        group = H5Gcreate2(file, name, H5P_DEFAULT, plan, H5P_DEFAULT);
    if (plan >= 0)
        H5Pclose(plan);
    return group;
}

static bool write_names(rdl_shot_writer *writer, hid_t group, const rdl_scene *scene)
{
    size_t longest = 1;
    for (size_t p = 0; p < scene->part_count; p++)
        if (scene->parts[p].name != NULL && strlen(scene->parts[p].name) > longest)
            longest = strlen(scene->parts[p].name);
    char *names = rdli_take(&writer->memory, scene->part_count, longest);
    hid_t type = text_type(longest);
    bool done = names != NULL && type >= 0;
    for (size_t p = 0; done && p < scene->part_count; p++) {
        const char *name = scene->parts[p].name != NULL ? scene->parts[p].name : "";
        memset(names + p * longest, 0, longest);
        memcpy(names + p * longest, name, strlen(name));
    }
    done = done && write_table(writer, group, "name", type, type, 1, (hsize_t[2]){scene->part_count, 1}, names);
    if (type >= 0)
        H5Tclose(type);
    rdli_give(&writer->memory, names, scene->part_count, longest);
    return done;
}

static bool write_parts(rdl_shot_writer *writer, const rdl_scene *scene)
{
    size_t count = scene->part_count;
    hid_t group = make_group(writer->file, "parts");
    double *numbers = rdli_take(&writer->memory, 2 * count, sizeof *numbers);
    uint8_t *kinds = rdli_take(&writer->memory, count, 1);
    bool done = group >= 0 && numbers != NULL && kinds != NULL;
    for (size_t p = 0; done && p < count; p++) {
        kinds[p] = (uint8_t)scene->parts[p].kind;
        numbers[p] = scene->parts[p].half_thickness;
        numbers[count + p] = scene->parts[p].friction;
    }
    const hsize_t dims[2] = {count, 1};
    done = done && write_names(writer, group, scene) &&
           write_table(writer, group, "kind", H5T_STD_U8LE, H5T_NATIVE_UINT8, 1, dims, kinds) &&
           write_table(writer, group, "half_thickness", H5T_IEEE_F64LE, H5T_NATIVE_DOUBLE, 1, dims, numbers) &&
           write_table(writer, group, "friction", H5T_IEEE_F64LE, H5T_NATIVE_DOUBLE, 1, dims, numbers + count);
    rdli_give(&writer->memory, numbers, 2 * count, sizeof *numbers);
    rdli_give(&writer->memory, kinds, count, 1);
    return (group < 0 || H5Gclose(group) >= 0) && done;
}

static bool write_mesh(rdl_shot_writer *writer, const rdl_scene *scene)
{
    hid_t group = make_group(writer->file, "mesh");
    const hsize_t vertices[2] = {scene->vertex_count, 1};
    bool done = group >= 0 &&
                write_table(writer, group, "part", H5T_STD_U32LE, H5T_NATIVE_UINT32, 1, vertices, scene->vertex_part) &&
                write_table(writer, group, "mass", H5T_IEEE_F64LE, H5T_NATIVE_DOUBLE, 1, vertices, scene->mass) &&
                write_table(writer, group, "segments", H5T_STD_U32LE, H5T_NATIVE_UINT32, 2,
                            (hsize_t[2]){scene->segment_count, 2}, scene->segments) &&
                write_table(writer, group, "triangles", H5T_STD_U32LE, H5T_NATIVE_UINT32, 2,
                            (hsize_t[2]){scene->triangle_count, 3}, scene->triangles);
    if (done && scene->half_thickness != NULL)
        done = write_table(writer, group, "half_thickness", H5T_IEEE_F64LE, H5T_NATIVE_DOUBLE, 1, vertices,
                           scene->half_thickness);
    return (group < 0 || H5Gclose(group) >= 0) && done;
}

static bool write_rules(rdl_shot_writer *writer, const rdl_scene *scene)
{
    size_t count = scene->pair_friction_count;
    hid_t group = make_group(writer->file, "rules");
    double *rows = rdli_take(&writer->memory, 3 * count, sizeof *rows);
    bool done = group >= 0 && (rows != NULL || count == 0);
    for (size_t k = 0; done && k < count; k++) {
        rows[3 * k] = scene->pair_friction[k].part[0];
        rows[3 * k + 1] = scene->pair_friction[k].part[1];
        rows[3 * k + 2] = scene->pair_friction[k].friction;
    }
    done =
        done &&
        write_table(writer, group, "muted_parts", H5T_STD_U32LE, H5T_NATIVE_UINT32, 2,
                    (hsize_t[2]){scene->muted_count, 2}, scene->muted_parts) &&
        write_table(writer, group, "attachments", H5T_STD_U32LE, H5T_NATIVE_UINT32, 2,
                    (hsize_t[2]){scene->attachment_count, 2}, scene->attachments) &&
        write_table(writer, group, "pair_friction", H5T_IEEE_F64LE, H5T_NATIVE_DOUBLE, 2, (hsize_t[2]){count, 3}, rows);
    rdli_give(&writer->memory, rows, 3 * count, sizeof *rows);
    return (group < 0 || H5Gclose(group) >= 0) && done;
}

static bool write_settings(rdl_shot_writer *writer, const rdl_settings *settings)
{
    size_t count = 0;
    const rdl_setting_info *table = rdl_settings_table(&count);
    hid_t group = make_group(writer->file, "settings");
    bool done = group >= 0 && rdli_write_text(group, "engine_version", rdl_version());
    for (size_t row = 0; done && row < count; row++) {
        double value = table[row].initial;
        if (table[row].offset + sizeof value <= settings->size)
            memcpy(&value, (const char *)settings + table[row].offset, sizeof value);
        done = rdli_write_attribute(group, table[row].name, H5T_IEEE_F64LE, H5T_NATIVE_DOUBLE, &value);
    }
    return (group < 0 || H5Gclose(group) >= 0) && done;
}

bool rdli_write_scene(rdl_shot_writer *writer, const rdl_scene *scene, const rdl_shot_options *options)
{
    int32_t version = RDLI_SHOT_VERSION;
    return rdli_write_attribute(writer->file, "raddle_shot", H5T_STD_I32LE, H5T_NATIVE_INT32, &version) &&
           rdli_write_text(writer->file, "length_unit", "m") && rdli_write_text(writer->file, "time_unit", "s") &&
           rdli_write_text(writer->file, "created_by", options->created_by != NULL ? options->created_by : "raddle") &&
           write_parts(writer, scene) && write_mesh(writer, scene) && write_rules(writer, scene) &&
           (options->settings == NULL || write_settings(writer, options->settings));
}

/* A row that was announced but not written before a host was killed reads as this: never as a valid frame. */
static bool set_fill(hid_t plan, rdli_item item)
{
    const double number = NAN;
    const uint8_t small = UINT8_MAX;
    const uint64_t large = UINT64_MAX;
    switch (item) {
    case RDLI_ITEM_F64: return H5Pset_fill_value(plan, H5T_NATIVE_DOUBLE, &number) >= 0;
    case RDLI_ITEM_U8: return H5Pset_fill_value(plan, H5T_NATIVE_UINT8, &small) >= 0;
    case RDLI_ITEM_U64: return H5Pset_fill_value(plan, H5T_NATIVE_UINT64, &large) >= 0;
    default: return true;
    }
}

static bool make_set(rdl_shot_writer *writer, hid_t group, const rdli_set_plan *set)
{
    enum { BYTES_PER_CHUNK = 4096 };
    hsize_t tail = rdli_set_width(set, writer->vertex_count);
    hsize_t dims[3] = {0, tail, 3}, limit[3] = {H5S_UNLIMITED, tail, 3}, chunk[3] = {1, tail, 3};
    if (set->rows == RDLI_ROWS_BYTES)
        chunk[0] = BYTES_PER_CHUNK;
    hid_t type = rdli_item_file_type(set->item);
    hid_t space = H5Screate_simple(set->rank, dims, limit);
    hid_t plan = new_plan();
    bool done = type >= 0 && space >= 0 && plan >= 0 && H5Pset_chunk(plan, set->rank, chunk) >= 0 &&
                add_filters(plan, writer->deflate) && set_fill(plan, set->item);
    hid_t id = done ? H5Dcreate2(group, set->name, type, space, H5P_DEFAULT, plan, H5P_DEFAULT) : H5I_INVALID_HID;
    done = id >= 0;
    int32_t bits = writer->host_bits, memory_version = RDLI_MEMORY_VERSION;
    if (done && set->rank == 3)
        done = rdli_write_attribute(id, "host_bits", H5T_STD_I32LE, H5T_NATIVE_INT32, &bits);
    if (done && set->item == RDLI_ITEM_SPAN)
        done = rdli_write_attribute(id, "version", H5T_STD_I32LE, H5T_NATIVE_INT32, &memory_version);
    done = (id < 0 || H5Dclose(id) >= 0) && done;
    if (plan >= 0)
        H5Pclose(plan);
    if (space >= 0)
        H5Sclose(space);
    if (type >= 0)
        H5Tclose(type);
    return done;
}

bool rdli_write_frame_sets(rdl_shot_writer *writer)
{
    hid_t group = make_group(writer->file, "frames");
    bool done = group >= 0;
    for (size_t k = 0; done && k < RDLI_SET_COUNT; k++) {
        const rdli_set_plan *set = &rdli_set_plans[k];
        if (set->content == 0 || (set->content & writer->contents) != 0)
            done = make_set(writer, group, set);
    }
    return (group < 0 || H5Gclose(group) >= 0) && done;
}
