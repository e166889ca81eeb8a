/* shot/writer.c: recording, frame by frame.
 * The file is written in HDF5's single-writer mode (superblock version 3): metadata reach the disk in an order in which
 * the file is readable at every moment, so that a host that is killed loses at most the frame it was writing. That mode
 * takes no new objects after it starts, and no variable-length data: hence all datasets are made first, and memory
 * blocks are spans of one dataset of bytes. */
#include <unistd.h>

#include "shot/disk.h"
#include "shot/publish.h"
#include "shot/quiet.h"
#include "shot/scene.h"
#include "shot/write.h"

/* A kill may stop a write between two pages of the system's cache. So nothing small may lie across two pages: a torn block
 * of structure would cost all rows of its dataset (seen: one kill in 200). */
enum { ALIGNMENT = 512 };

enum { MEMORY_ALIGNMENT = 4096 }; /* a chunk of memory_bytes: no chunk is ever written twice */

void rdl_shot_options_default(rdl_shot_options *options)
{
    *options =
        (rdl_shot_options){.size = sizeof *options, .contents = RDL_SHOT_STEP, .host_bits = RDL_FLOAT64, .deflate = 1};
}

static rdl_status check_options(const rdl_shot_options *options, rdl_fault *fault)
{
    if (options->size < sizeof *options)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "size", 0);
    if (options->contents == 0 || (options->contents & ~(unsigned)RDL_SHOT_STEP) != 0)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "contents", 0);
    if (options->host_bits != RDL_FLOAT32 && options->host_bits != RDL_FLOAT64)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "host_bits", 0);
    if (options->deflate < 0 || options->deflate > 9)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "deflate", 0);
    return options->settings != NULL ? rdl_settings_check(options->settings, fault) : RDL_OK;
}

static void release(rdl_shot_writer *writer)
{
    rdli_memory memory = writer->memory;
    rdli_give(&memory, writer->path, writer->path_bytes, 1);
    rdli_give(&memory, writer->part, writer->part_bytes, 1);
    rdli_room_release(&memory, &writer->last);
    rdli_room_release(&memory, &writer->chunk);
    rdli_give(&memory, writer, 1, sizeof *writer);
}

/* Closes every id of the file; false when HDF5 could not bring all to the disk. */
static bool close_file(rdl_shot_writer *writer)
{
    bool done = true;
    for (size_t k = 0; k < RDLI_SET_COUNT; k++)
        if (writer->sets[k] >= 0)
            done = H5Dclose(writer->sets[k]) >= 0 && done;
    if (writer->file >= 0 && done)
        done = H5Fflush(writer->file, H5F_SCOPE_LOCAL) >= 0;
    if (!done)
        writer->broken = true;
    if (writer->file >= 0 && H5Fclose(writer->file) < 0)
        writer->broken = true;
    if (writer->driver >= 0)
        H5FDunregister(writer->driver);
    return !writer->broken;
}

static rdl_shot_writer *new_writer(const char *path, const rdl_scene *scene, const rdl_shot_options *options)
{
    rdli_memory memory;
    if (rdli_memory_init(&memory, NULL) != RDL_OK)
        return NULL;
    rdl_shot_writer *writer = rdli_take(&memory, 1, sizeof *writer);
    if (writer == NULL)
        return NULL;
    memset(writer, 0, sizeof *writer);
    writer->memory = memory;
    writer->file = H5I_INVALID_HID;
    writer->driver = H5I_INVALID_HID;
    for (size_t k = 0; k < RDLI_SET_COUNT; k++)
        writer->sets[k] = H5I_INVALID_HID;
    writer->path_bytes = strlen(path) + 1;
    writer->part_bytes = writer->path_bytes + strlen(".part");
    writer->path = rdli_take(&writer->memory, writer->path_bytes, 1);
    writer->part = rdli_take(&writer->memory, writer->part_bytes, 1);
    writer->vertex_count = scene->vertex_count;
    writer->part_count = scene->part_count;
    writer->contents = options->contents;
    writer->host_bits = options->host_bits;
    writer->deflate = options->deflate;
    writer->overwrite = options->overwrite != 0;
    if (writer->path == NULL || writer->part == NULL) {
        release(writer);
        return NULL;
    }
    memcpy(writer->path, path, writer->path_bytes);
    memcpy(writer->part, path, writer->path_bytes);
    memcpy(writer->part + writer->path_bytes - 1, ".part", sizeof ".part");
    return writer;
}

static hid_t create_file(rdl_shot_writer *writer)
{
    hid_t access = H5Pcreate(H5P_FILE_ACCESS), creation = H5Pcreate(H5P_FILE_CREATE);
    hid_t file = H5I_INVALID_HID;
    if (access >= 0 && creation >= 0 && rdli_disk_use(access, &writer->broken, &writer->driver) &&
        H5Pset_libver_bounds(access, H5F_LIBVER_V110, H5F_LIBVER_V110) >= 0 &&
        H5Pset_fclose_degree(access, H5F_CLOSE_STRONG) >= 0 && H5Pset_metadata_read_attempts(access, 1) >= 0 &&
        H5Pset_obj_track_times(creation, false) >= 0 && H5Pset_alignment(access, 1, ALIGNMENT) >= 0 &&
        H5Pset_meta_block_size(access, 0) >= 0 && H5Pset_small_data_block_size(access, 0) >= 0)
        file = H5Fcreate(writer->part, H5F_ACC_TRUNC, creation, access);
    if (access >= 0)
        H5Pclose(access);
    if (creation >= 0)
        H5Pclose(creation);
    return file;
}

static bool open_sets(rdl_shot_writer *writer)
{
    hid_t frames = H5Gopen2(writer->file, "frames", H5P_DEFAULT);
    bool done = frames >= 0;
    for (size_t k = 0; done && k < RDLI_SET_COUNT; k++) {
        const rdli_set_plan *set = &rdli_set_plans[k];
        if (set->content != 0 && (set->content & writer->contents) == 0)
            continue;
        writer->sets[k] = H5Dopen2(frames, set->name, H5P_DEFAULT);
        done = writer->sets[k] >= 0;
    }
    if (frames >= 0)
        H5Gclose(frames);
    return done;
}

/* Adds `count` rows to a dataset and fills the last `filled` of them. Datasets that the shot does not hold, and nothing
 * to add, are fine. */
static bool add_rows(rdl_shot_writer *writer, rdli_set which, uint64_t count, uint64_t filled, const void *data)
{
    const rdli_set_plan *set = &rdli_set_plans[which];
    hid_t id = writer->sets[which];
    if (id < 0 || count == 0)
        return true;
    hsize_t tail = rdli_set_width(set, writer->vertex_count);
    hsize_t dims[3] = {writer->rows[which] + count, tail, 3};
    hsize_t start[3] = {dims[0] - filled, 0, 0}, block[3] = {filled, tail, 3};
    bool done = H5Dset_extent(id, dims) >= 0;
    if (done && filled > 0) {
        hid_t space = H5Dget_space(id), room = H5Screate_simple(set->rank, block, NULL);
        hid_t type = rdli_item_memory_type(set->item);
        done = space >= 0 && room >= 0 && type >= 0 &&
               H5Sselect_hyperslab(space, H5S_SELECT_SET, start, NULL, block, NULL) >= 0 &&
               H5Dwrite(id, type, room, space, H5P_DEFAULT, data) >= 0;
        if (type >= 0)
            H5Tclose(type);
        if (room >= 0)
            H5Sclose(room);
        if (space >= 0)
            H5Sclose(space);
    }
    if (done)
        writer->rows[which] += count;
    return done;
}

static bool begin_file(rdl_shot_writer *writer, const rdl_scene *scene, const rdl_shot_options *options)
{
    const uint64_t zero = 0;
    writer->file = create_file(writer);
    return writer->file >= 0 && rdli_write_scene(writer, scene, options) && rdli_write_frame_sets(writer) &&
           H5Fflush(writer->file, H5F_SCOPE_LOCAL) >= 0 && !writer->broken && /* what follows reads the file back */
           H5Fstart_swmr_write(writer->file) >= 0 && open_sets(writer) &&
           add_rows(writer, RDLI_SET_WAYPOINT_FIRST, 1, 1, &zero) &&
           add_rows(writer, RDLI_SET_MASS_FIRST, 1, 1, &zero) && add_rows(writer, RDLI_SET_MUTED_FIRST, 1, 1, &zero) && H5Fflush(writer->file, H5F_SCOPE_LOCAL) >= 0;
}

rdl_status rdl_shot_create(const char *path, const rdl_scene *scene, const rdl_shot_options *options,
                           rdl_shot_writer **writer, rdl_fault *fault)
{
    rdl_shot_options defaults;
    rdl_shot_options_default(&defaults);
    options = options != NULL ? options : &defaults;
    if (path == NULL || path[0] == '\0' || scene == NULL || writer == NULL)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, scene == NULL ? "scene" : writer == NULL ? "writer" : "path", 0);
    rdl_status status = check_options(options, fault);
    if (status == RDL_OK)
        status = scene->size < sizeof *scene ? rdli_fault_set(fault, RDL_BAD_ARGUMENT, "size", 0)
                                             : rdli_shot_scene_check(scene, fault);
    /* A frame is one chunk, and HDF5's chunks end at 4 GiB. */
    if (status == RDL_OK && scene->vertex_count > UINT32_MAX / (3 * sizeof(double)))
        status = rdli_fault_set(fault, RDL_TOO_LARGE, "mesh/part", scene->vertex_count);
    if (status != RDL_OK)
        return status;
    if (!options->overwrite && rdli_publish_exists(path))
        return rdli_fault_set(fault, RDL_FILE_EXISTS, "file", 0);
    rdl_shot_writer *made = new_writer(path, scene, options);
    if (made == NULL)
        return RDL_NO_MEMORY;
    status = rdli_publish_claim(made->part, made->overwrite);
    if (status != RDL_OK) {
        release(made);
        return rdli_fault_set(fault, status, "file.part", 0);
    }
    rdli_quiet quiet;
    rdli_quiet_begin(&quiet);
    bool begun = begin_file(made, scene, options) && !made->broken;
    rdli_quiet_end(&quiet);
    if (!begun) {
        rdl_shot_discard(made);
        return rdli_fault_set(fault, RDL_WRITE_FAILED, "file.part", 0);
    }
    *writer = made;
    return RDL_OK;
}

static rdl_status check_positions(const rdl_shot_writer *writer, rdli_set which, const double *positions, size_t states,
                                  rdl_fault *fault)
{
    const rdli_set_plan *set = &rdli_set_plans[which];
    if ((set->content & writer->contents) == 0 || states == 0)
        return RDL_OK;
    if (positions == NULL)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, set->field, 0);
    for (size_t i = 0; i < 3 * writer->vertex_count * states; i++)
        if (!isfinite(positions[i]))
            return rdli_fault_set(fault, RDL_NOT_FINITE, set->field, i / 3);
    return RDL_OK;
}

/* The digest is over numbers of the host's format: others were never handed to the host. */
static rdl_status check_delivered_format(const rdl_shot_writer *writer, const rdl_shot_frame *frame, rdl_fault *fault)
{
    if (writer->host_bits != RDL_FLOAT32 || (writer->contents & RDL_SHOT_DELIVERED) == 0)
        return RDL_OK;
    for (size_t i = 0; i < 3 * writer->vertex_count; i++)
        if ((double)(float)frame->delivered[i] != frame->delivered[i])
            return rdli_fault_set(fault, RDL_OUT_OF_RANGE, "frames/delivered", i / 3);
    return RDL_OK;
}

static rdl_status check_rules(const rdl_shot_writer *writer, const rdl_shot_frame *frame, rdl_fault *fault)
{
    if ((writer->contents & RDL_SHOT_RULES) == 0)
        return RDL_OK;
    if (!isfinite(frame->duration) || !isfinite(frame->seconds_max))
        return rdli_fault_set(fault, RDL_NOT_FINITE, "frames/duration", writer->rows[RDLI_SET_TIME]);
    if (frame->duration < 0 || frame->seconds_max < 0)
        return rdli_fault_set(fault, RDL_OUT_OF_RANGE, "frames/duration", writer->rows[RDLI_SET_TIME]);
    for (size_t v = 0; frame->mass != NULL && v < writer->vertex_count; v++)
        if (!(frame->mass[v] > 0))
            return rdli_fault_set(fault, RDL_BAD_MASS, "frames/mass", v);
    if (frame->muted_count > 0 && frame->muted_parts == NULL)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "frames/muted_parts", 0);
    for (size_t k = 0; k < frame->muted_count; k++)
        if (frame->muted_parts[k][0] >= writer->part_count || frame->muted_parts[k][1] >= writer->part_count)
            return rdli_fault_set(fault, RDL_OUT_OF_RANGE, "frames/muted_parts", k);
    return RDL_OK;
}

static rdl_status check_frame(const rdl_shot_writer *writer, const rdl_shot_frame *frame, rdl_fault *fault)
{
    unsigned contents = writer->contents;
    if (!isfinite(frame->time))
        return rdli_fault_set(fault, RDL_NOT_FINITE, "frames/time", writer->rows[RDLI_SET_TIME]);
    if ((contents & RDL_SHOT_VERDICT) != 0 && frame->verdict > 3)
        return rdli_fault_set(fault, RDL_OUT_OF_RANGE, "frames/verdict", writer->rows[RDLI_SET_TIME]);
    if ((contents & RDL_SHOT_MEMORY) != 0 && frame->memory == NULL && frame->memory_bytes > 0)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "frames/memory", 0);
    rdl_status status = check_rules(writer, frame, fault);
    if (status == RDL_OK)
        status = check_positions(writer, RDLI_SET_START, frame->start, 1, fault);
    if (status == RDL_OK)
        status = check_positions(writer, RDLI_SET_PROPOSED, frame->proposed, 1, fault);
    if (status == RDL_OK)
        status = check_positions(writer, RDLI_SET_DELIVERED, frame->delivered, 1, fault);
    if (status == RDL_OK)
        status = check_delivered_format(writer, frame, fault);
    if (status == RDL_OK)
        status = check_positions(writer, RDLI_SET_WAYPOINT_POSITION, frame->waypoint_positions, frame->waypoint_count,
                                 fault);
    if (status != RDL_OK || (contents & RDL_SHOT_WAYPOINTS) == 0)
        return status;
    if (frame->waypoint_count > 0 && frame->waypoint_times == NULL)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "frames/waypoint_time", 0);
    for (size_t w = 0; w < frame->waypoint_count; w++) {
        double before = w > 0 ? frame->waypoint_times[w - 1] : 0;
        if (!(frame->waypoint_times[w] > before && frame->waypoint_times[w] < 1))
            return rdli_fault_set(fault, RDL_OUT_OF_RANGE, "frames/waypoint_time", w);
    }
    return RDL_OK;
}

static bool write_rules(rdl_shot_writer *writer, const rdl_shot_frame *frame)
{
    size_t masses = frame->mass != NULL ? 1 : 0;
    uint64_t mass_fence = writer->rows[RDLI_SET_MASS] + masses;
    uint64_t muted_fence = writer->rows[RDLI_SET_MUTED_PARTS] + frame->muted_count;
    return add_rows(writer, RDLI_SET_DURATION, 1, 1, &frame->duration) &&
           add_rows(writer, RDLI_SET_SECONDS_MAX, 1, 1, &frame->seconds_max) &&
           add_rows(writer, RDLI_SET_PASSES_MAX, 1, 1, &frame->passes_max) &&
           add_rows(writer, RDLI_SET_MASS, masses, masses, frame->mass) &&
           add_rows(writer, RDLI_SET_MASS_FIRST, 1, 1, &mass_fence) &&
           add_rows(writer, RDLI_SET_MUTED_PARTS, frame->muted_count, frame->muted_count, frame->muted_parts) &&
           add_rows(writer, RDLI_SET_MUTED_FIRST, 1, 1, &muted_fence);
}

/* Small states are not worth a second look at the file. */
static bool is_repeat(const rdl_shot_writer *writer, const double *a, const double *b)
{
    enum { WORTH_IT = 512 };
    return writer->deflate > 0 && writer->vertex_count >= WORTH_IT &&
           memcmp(a, b, 3 * writer->vertex_count * sizeof *a) == 0;
}

static bool write_states(rdl_shot_writer *writer, const rdl_shot_frame *frame)
{
    bool has_start = (writer->contents & RDL_SHOT_START) != 0, has_proposed = (writer->contents & RDL_SHOT_PROPOSED) != 0;
    bool has_delivered = (writer->contents & RDL_SHOT_DELIVERED) != 0;
    bool goes_on = has_start && writer->has_last && is_repeat(writer, frame->start, writer->last.data);
    bool as_proposed = has_proposed && has_delivered && is_repeat(writer, frame->proposed, frame->delivered);
    uint64_t row = writer->rows[RDLI_SET_TIME];
    bool done = goes_on ? rdli_repeat_row(writer, RDLI_SET_DELIVERED, row - 1, RDLI_SET_START)
                        : add_rows(writer, RDLI_SET_START, 1, 1, frame->start);
    done = done && add_rows(writer, RDLI_SET_PROPOSED, 1, 1, frame->proposed);
    if (done)
        done = as_proposed ? rdli_repeat_row(writer, RDLI_SET_PROPOSED, row, RDLI_SET_DELIVERED)
                           : add_rows(writer, RDLI_SET_DELIVERED, 1, 1, frame->delivered);
    if (done && has_start && has_delivered && !goes_on && writer->last.data == NULL)
        done = rdli_room_reserve(&writer->memory, &writer->last, writer->vertex_count, 3 * sizeof(double), false);
    writer->has_last = done && has_start && has_delivered;
    if (writer->has_last)
        memcpy(writer->last.data, frame->delivered, 3 * writer->vertex_count * sizeof(double));
    return done;
}

static bool write_frame(rdl_shot_writer *writer, const rdl_shot_frame *frame)
{
    uint8_t digest[32];
    if ((writer->contents & RDL_SHOT_DELIVERED) != 0)
        rdl_shot_digest(frame->delivered, writer->vertex_count, writer->host_bits, digest);
    uint64_t end = writer->rows[RDLI_SET_MEMORY_BYTES];
    uint64_t gap = frame->memory_bytes > 0 ? (MEMORY_ALIGNMENT - end % MEMORY_ALIGNMENT) % MEMORY_ALIGNMENT : 0;
    rdli_span span = {end + gap, frame->memory_bytes};
    uint64_t fence = writer->rows[RDLI_SET_WAYPOINT_TIME] + frame->waypoint_count;
    return add_rows(writer, RDLI_SET_MEMORY_BYTES, gap + span.bytes, span.bytes, frame->memory) &&
           add_rows(writer, RDLI_SET_MEMORY, 1, 1, &span) &&
           add_rows(writer, RDLI_SET_WAYPOINT_TIME, frame->waypoint_count, frame->waypoint_count,
                    frame->waypoint_times) &&
           add_rows(writer, RDLI_SET_WAYPOINT_POSITION, frame->waypoint_count, frame->waypoint_count,
                    frame->waypoint_positions) &&
           add_rows(writer, RDLI_SET_WAYPOINT_FIRST, 1, 1, &fence) &&
           add_rows(writer, RDLI_SET_PICTURE, 1, 1, &frame->picture) &&
           write_states(writer, frame) &&
           add_rows(writer, RDLI_SET_DIGEST, 1, 1, digest) &&
           add_rows(writer, RDLI_SET_VERDICT, 1, 1, &frame->verdict) &&
           write_rules(writer, frame) && add_rows(writer, RDLI_SET_TIME, 1, 1, &frame->time) &&
           H5Fflush(writer->file, H5F_SCOPE_LOCAL) >= 0;
}

rdl_status rdl_shot_append(rdl_shot_writer *writer, const rdl_shot_frame *frame, rdl_fault *fault)
{
    if (writer == NULL || frame == NULL)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, writer == NULL ? "writer" : "frame", 0);
    if (writer->broken)
        return rdli_fault_set(fault, RDL_WRITE_FAILED, "file.part", writer->rows[RDLI_SET_TIME]);
    rdl_status status = check_frame(writer, frame, fault);
    if (status != RDL_OK)
        return status;
    rdli_quiet quiet;
    rdli_quiet_begin(&quiet);
    uint64_t index = writer->rows[RDLI_SET_TIME];
    if (!write_frame(writer, frame) || writer->broken) {
        writer->broken = true;
        status = rdli_fault_set(fault, RDL_WRITE_FAILED, "file.part", index);
    }
    rdli_quiet_end(&quiet);
    return status;
}

rdl_status rdl_shot_finish(rdl_shot_writer *writer, rdl_fault *fault)
{
    if (writer == NULL)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "writer", 0);
    rdli_quiet quiet;
    rdli_quiet_begin(&quiet);
    bool closed = close_file(writer);
    rdli_quiet_end(&quiet);
    rdl_status status = closed ? rdli_publish_rename(writer->part, writer->path, writer->overwrite) : RDL_WRITE_FAILED;
    if (status != RDL_OK)
        rdli_fault_set(fault, status, status == RDL_FILE_EXISTS ? "file" : "file.part", 0);
    release(writer);
    return status;
}

void rdl_shot_keep(rdl_shot_writer *writer)
{
    if (writer == NULL)
        return;
    rdli_quiet quiet;
    rdli_quiet_begin(&quiet);
    (void)close_file(writer);
    rdli_quiet_end(&quiet);
    release(writer);
}

void rdl_shot_discard(rdl_shot_writer *writer)
{
    if (writer == NULL)
        return;
    rdli_quiet quiet;
    rdli_quiet_begin(&quiet);
    writer->broken = true; /* the file is about to be deleted: nothing needs to reach it any more */
    (void)close_file(writer);
    rdli_quiet_end(&quiet);
    (void)unlink(writer->part);
    release(writer);
}
