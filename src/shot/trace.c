/* shot/trace.c: events of steps, in the group /trace: dataset frame_K, one row per event, columns of 32-bit whole numbers
 * (stage, detection, kind, first, second) and six of doubles (value). The shot is never changed in place: a copy is, which
 * then takes its name. */
#include <errno.h>
#include <fcntl.h>
#include <stdio.h>
#include <unistd.h>

#include "raddle/watch.h"
#include "shot/publish.h"
#include "shot/quiet.h"
#include "shot/read.h"
#include "shot/write.h"

enum { CHUNK_ROWS = 4096, EVENTS_MAX = 1 << 28 };

static hid_t event_type(hid_t whole, hid_t number)
{
    static const struct {
        const char *name;
        size_t offset;
    } columns[] = {{"stage", offsetof(rdl_event, stage)},
                   {"detection", offsetof(rdl_event, detection)},
                   {"kind", offsetof(rdl_event, kind)},
                   {"first", offsetof(rdl_event, first)},
                   {"second", offsetof(rdl_event, second)}};
    const hsize_t six = 6;
    hid_t type = H5Tcreate(H5T_COMPOUND, sizeof(rdl_event)), values = H5Tarray_create2(number, 1, &six);
    bool done = type >= 0 && values >= 0;
    for (size_t k = 0; done && k < sizeof columns / sizeof columns[0]; k++)
        done = H5Tinsert(type, columns[k].name, columns[k].offset, whole) >= 0;
    done = done && H5Tinsert(type, "value", offsetof(rdl_event, value), values) >= 0;
    if (values >= 0)
        H5Tclose(values);
    if (!done && type >= 0) {
        H5Tclose(type);
        type = H5I_INVALID_HID;
    }
    return type;
}

/* ---- writing ---- */

static bool copy_file(const char *from, const char *to)
{
    char block[1 << 16];
    int in = open(from, O_RDONLY | O_CLOEXEC), out = open(to, O_WRONLY | O_CREAT | O_EXCL | O_CLOEXEC, 0666);
    bool done = in >= 0 && out >= 0;
    for (ssize_t got = 1; done && got > 0;) {
        got = read(in, block, sizeof block);
        if (got < 0 && errno == EINTR) {
            got = 1;
            continue;
        }
        done = got >= 0;
        for (ssize_t put = 0, now; done && put < got; put += now) {
            now = write(out, block + put, (size_t)(got - put));
            done = now > 0;
        }
    }
    if (in >= 0)
        close(in);
    if (out >= 0)
        done = close(out) == 0 && done;
    return done;
}

static bool write_events(hid_t group, const char *name, const rdl_event *events, size_t count, const char *note)
{
    hsize_t rows = count, chunk = count < CHUNK_ROWS ? count : CHUNK_ROWS;
    hid_t file_type = event_type(H5T_STD_U32LE, H5T_IEEE_F64LE), type = event_type(H5T_NATIVE_UINT32, H5T_NATIVE_DOUBLE);
    hid_t space = H5Screate_simple(1, &rows, NULL), plan = H5Pcreate(H5P_DATASET_CREATE);
    bool done = file_type >= 0 && type >= 0 && space >= 0 && plan >= 0 && H5Tpack(file_type) >= 0 &&
                H5Pset_obj_track_times(plan, false) >= 0;
    if (done && count > 0)
        done = H5Pset_chunk(plan, 1, &chunk) >= 0 && H5Pset_shuffle(plan) >= 0 && H5Pset_deflate(plan, 1) >= 0 &&
               H5Pset_fletcher32(plan) >= 0;
    hid_t set = done ? H5Dcreate2(group, name, file_type, space, H5P_DEFAULT, plan, H5P_DEFAULT) : H5I_INVALID_HID;
    done = set >= 0 && (count == 0 || H5Dwrite(set, type, H5S_ALL, H5S_ALL, H5P_DEFAULT, events) >= 0);
    done = done && (note == NULL || rdli_write_text(set, "note", note));
    if (set >= 0)
        H5Dclose(set);
    if (plan >= 0)
        H5Pclose(plan);
    if (space >= 0)
        H5Sclose(space);
    if (type >= 0)
        H5Tclose(type);
    if (file_type >= 0)
        H5Tclose(file_type);
    return done;
}

struct rdl_shot_tracer {
    rdli_memory memory;
    hid_t file, group;
    char *path, *copy; /* the shot, and the file that is to take its name */
    size_t path_bytes, copy_bytes, frame_count;
};

static void release(rdl_shot_tracer *tracer)
{
    rdli_memory memory = tracer->memory;
    rdli_give(&memory, tracer->path, tracer->path_bytes, 1);
    rdli_give(&memory, tracer->copy, tracer->copy_bytes, 1);
    rdli_give(&memory, tracer, 1, sizeof *tracer);
}

static rdl_shot_tracer *new_tracer(const char *path)
{
    enum { ENDING = 32 };
    rdli_memory memory;
    if (rdli_memory_init(&memory, NULL) != RDL_OK)
        return NULL;
    rdl_shot_tracer *tracer = rdli_take(&memory, 1, sizeof *tracer);
    if (tracer == NULL)
        return NULL;
    memset(tracer, 0, sizeof *tracer);
    tracer->memory = memory;
    tracer->file = tracer->group = H5I_INVALID_HID;
    tracer->path_bytes = strlen(path) + 1;
    tracer->copy_bytes = tracer->path_bytes + ENDING;
    tracer->path = rdli_take(&tracer->memory, tracer->path_bytes, 1);
    tracer->copy = rdli_take(&tracer->memory, tracer->copy_bytes, 1);
    if (tracer->path == NULL || tracer->copy == NULL) {
        release(tracer);
        return NULL;
    }
    memcpy(tracer->path, path, tracer->path_bytes);
    snprintf(tracer->copy, tracer->copy_bytes, "%s.trace-%ld", path, (long)getpid());
    return tracer;
}

static bool open_copy(rdl_shot_tracer *tracer)
{
    hid_t access = H5Pcreate(H5P_FILE_ACCESS);
    bool present = false;
    if (access >= 0 && H5Pset_libver_bounds(access, H5F_LIBVER_V110, H5F_LIBVER_V110) >= 0 &&
        H5Pset_fclose_degree(access, H5F_CLOSE_STRONG) >= 0 && H5Pset_file_locking(access, false, true) >= 0)
        tracer->file = H5Fopen(tracer->copy, H5F_ACC_RDWR, access);
    if (access >= 0)
        H5Pclose(access);
    if (tracer->file < 0)
        return false;
    tracer->group = rdli_object_open(tracer->file, "trace", H5I_GROUP, &present);
    if (!present)
        tracer->group = H5Gcreate2(tracer->file, "trace", H5P_DEFAULT, H5P_DEFAULT, H5P_DEFAULT);
    return tracer->group >= 0;
}

static bool close_copy(rdl_shot_tracer *tracer)
{
    bool done = tracer->group < 0 || H5Gclose(tracer->group) >= 0;
    return (tracer->file < 0 || H5Fclose(tracer->file) >= 0) && done;
}

rdl_status rdl_shot_trace_begin(const char *path, rdl_shot_tracer **tracer, rdl_fault *fault)
{
    rdl_shot *shot = NULL;
    if (path == NULL || tracer == NULL)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, path == NULL ? "path" : "tracer", 0);
    rdl_status status = rdl_shot_open(path, &shot, fault);
    if (status != RDL_OK)
        return status;
    bool complete = shot->info.complete != 0;
    size_t frames = shot->info.frame_count;
    rdl_shot_close(shot);
    if (!complete)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "file", 0);
    rdl_shot_tracer *made = new_tracer(path);
    if (made == NULL)
        return RDL_NO_MEMORY;
    made->frame_count = frames;
    rdli_quiet quiet;
    rdli_quiet_begin(&quiet);
    bool begun = copy_file(path, made->copy) && open_copy(made);
    rdli_quiet_end(&quiet);
    if (!begun) {
        rdl_shot_trace_discard(made);
        return rdli_fault_set(fault, RDL_WRITE_FAILED, "file", 0);
    }
    *tracer = made;
    return RDL_OK;
}

rdl_status rdl_shot_trace_add(rdl_shot_tracer *tracer, size_t frame, const rdl_event *events, size_t count,
                              const char *note, rdl_fault *fault)
{
    char name[32];
    if (tracer == NULL || (events == NULL && count > 0))
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, tracer == NULL ? "tracer" : "events", 0);
    if (frame >= tracer->frame_count)
        return rdli_fault_set(fault, RDL_OUT_OF_RANGE, "frame", frame);
    snprintf(name, sizeof name, "frame_%zu", frame);
    rdli_quiet quiet;
    rdli_quiet_begin(&quiet);
    bool done = H5Lexists(tracer->group, name, H5P_DEFAULT) <= 0 || H5Ldelete(tracer->group, name, H5P_DEFAULT) >= 0;
    done = done && write_events(tracer->group, name, events, count, note);
    rdli_quiet_end(&quiet);
    return done ? RDL_OK : rdli_fault_set(fault, RDL_WRITE_FAILED, "file", frame);
}

rdl_status rdl_shot_trace_finish(rdl_shot_tracer *tracer, rdl_fault *fault)
{
    if (tracer == NULL)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "tracer", 0);
    rdli_quiet quiet;
    rdli_quiet_begin(&quiet);
    bool closed = close_copy(tracer);
    rdli_quiet_end(&quiet);
    rdl_status status = closed ? rdli_publish_rename(tracer->copy, tracer->path, true) : RDL_WRITE_FAILED;
    if (status != RDL_OK) {
        (void)unlink(tracer->copy);
        rdli_fault_set(fault, status, "file", 0);
    }
    release(tracer);
    return status;
}

void rdl_shot_trace_discard(rdl_shot_tracer *tracer)
{
    if (tracer == NULL)
        return;
    rdli_quiet quiet;
    rdli_quiet_begin(&quiet);
    (void)close_copy(tracer);
    rdli_quiet_end(&quiet);
    (void)unlink(tracer->copy);
    release(tracer);
}

/* ---- reading ---- */

/* Columns that are missing, or of other types, are refused rather than left at whatever they were. */
static bool columns_fit(hid_t set)
{
    static const char *const wholes[] = {"stage", "detection", "kind", "first", "second"};
    hid_t type = H5Dget_type(set);
    bool sound = type >= 0 && H5Tget_class(type) == H5T_COMPOUND && H5Tget_nmembers(type) == 6;
    for (size_t k = 0; sound && k < sizeof wholes / sizeof wholes[0]; k++) {
        int member = H5Tget_member_index(type, wholes[k]);
        sound = member >= 0 && H5Tget_member_class(type, (unsigned)member) == H5T_INTEGER;
    }
    int member = sound ? H5Tget_member_index(type, "value") : -1;
    hid_t values = member >= 0 ? H5Tget_member_type(type, (unsigned)member) : H5I_INVALID_HID;
    hsize_t extent = 0;
    sound = values >= 0 && H5Tget_class(values) == H5T_ARRAY && H5Tget_array_ndims(values) == 1 &&
            H5Tget_array_dims2(values, &extent) >= 0 && extent == 6;
    if (values >= 0)
        H5Tclose(values);
    if (type >= 0)
        H5Tclose(type);
    return sound;
}

static rdl_status read_trace(rdl_shot *shot, const char *name, const rdl_event **events, size_t *count,
                             rdl_fault *fault)
{
    const uint64_t tail[2] = {0, 0};
    rdli_table table;
    rdl_status status = rdli_table_open(shot, "trace", name, "trace", H5T_COMPOUND, 1, tail, &table, fault);
    if (status != RDL_OK || table.id < 0)
        return status;
    rdli_room *room = &shot->rooms[RDLI_ROOM_TRACE];
    hid_t type = event_type(H5T_NATIVE_UINT32, H5T_NATIVE_DOUBLE);
    if (table.rows > EVENTS_MAX || !columns_fit(table.id))
        status = rdli_fault_set(fault, RDL_BAD_FILE, "trace", table.rows);
    else if (type < 0 || !rdli_room_reserve(&shot->memory, room, (size_t)table.rows + 1, sizeof(rdl_event), false))
        status = RDL_NO_MEMORY;
    if (status == RDL_OK && table.rows > 0) {
        memset(room->data, 0, (size_t)table.rows * sizeof(rdl_event));
        status = rdli_rows_read(table.id, type, 0, table.rows, room->data, "trace", fault);
    }
    if (status == RDL_OK) {
        *events = room->data;
        *count = (size_t)table.rows;
    }
    if (type >= 0)
        H5Tclose(type);
    rdli_table_close(&table);
    return status;
}

rdl_status rdl_shot_trace_read(rdl_shot *shot, size_t frame, const rdl_event **events, size_t *count, rdl_fault *fault)
{
    char name[32];
    if (shot == NULL || events == NULL || count == NULL)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, shot == NULL ? "shot" : "events", 0);
    *events = NULL;
    *count = 0;
    snprintf(name, sizeof name, "frame_%zu", frame);
    rdli_quiet quiet;
    rdli_quiet_begin(&quiet);
    rdl_status status = read_trace(shot, name, events, count, fault);
    rdli_quiet_end(&quiet);
    return status;
}
