/* shot/reader.c: opening, describing and closing a shot. */
#include <fcntl.h>
#include <sys/stat.h>
#include <unistd.h>

#include "shot/quiet.h"
#include "shot/read.h"

/* A regular file only: a pipe or device named by mistake would block or never end. */
static rdl_status look(const char *path, rdl_shot *shot, rdl_fault *fault)
{
    struct stat info;
    if (stat(path, &info) != 0 || access(path, R_OK) != 0)
        return rdli_fault_set(fault, RDL_NO_FILE, "file", 0);
    if (!S_ISREG(info.st_mode))
        return rdli_fault_set(fault, RDL_BAD_FILE, "file", 0);
    size_t length = strlen(path);
    shot->file_bytes = (uint64_t)info.st_size;
    shot->unfinished = length > 5 && strcmp(path + length - 5, ".part") == 0;
    return RDL_OK;
}

static hid_t open_with(const char *path, unsigned flags)
{
    hid_t access = H5Pcreate(H5P_FILE_ACCESS);
    hid_t file = H5I_INVALID_HID;
    /* Locks would keep readers away from a recording in progress and from read-only disks; all is checked anyway.
     * Few attempts: a broken checksum is normal news here, not a race with a writer. */
    if (access >= 0 && H5Pset_fapl_sec2(access) >= 0 && H5Pset_fclose_degree(access, H5F_CLOSE_STRONG) >= 0 &&
        H5Pset_file_locking(access, false, true) >= 0 && H5Pset_metadata_read_attempts(access, 3) >= 0)
        file = H5Fopen(path, flags, access);
    if (access >= 0)
        H5Pclose(access);
    return file;
}

/* A recording whose host was killed, or still runs, carries HDF5's mark of an open writer. */
static rdl_status open_file(const char *path, rdl_shot *shot, rdl_fault *fault)
{
    shot->file = open_with(path, H5F_ACC_RDONLY);
    if (shot->file < 0) {
        shot->file = open_with(path, H5F_ACC_RDONLY | H5F_ACC_SWMR_READ);
        shot->unfinished = shot->unfinished || shot->file >= 0;
    }
    return shot->file >= 0 ? RDL_OK : rdli_fault_set(fault, RDL_BAD_FILE, "file", 0);
}

static rdl_status check_unit(rdl_shot *shot, const char *name, const char *unit, rdl_fault *fault)
{
    const char *text = NULL;
    rdl_status status = rdli_text_read(shot, shot->file, name, RDLI_ROOM_CREATED_BY, &text, fault);
    if (status == RDL_OK && text != NULL && strcmp(text, unit) != 0)
        status = rdli_fault_set(fault, RDL_BAD_FILE, name, 0);
    return status;
}

static rdl_status read_root(rdl_shot *shot, rdl_fault *fault)
{
    double version = 0;
    bool found = false;
    rdl_status status = rdli_number_read(shot->file, "raddle_shot", "raddle_shot", &version, &found, fault);
    if (status == RDL_OK && !found)
        status = rdli_fault_set(fault, RDL_BAD_FILE, "raddle_shot", 0);
    if (status == RDL_OK && version != RDLI_SHOT_VERSION)
        status = rdli_fault_set(fault, RDL_BAD_VERSION, "raddle_shot",
                                version >= 0 && version < 1e9 ? (uint64_t)version : 0);
    if (status == RDL_OK)
        status = check_unit(shot, "length_unit", "m", fault);
    if (status == RDL_OK)
        status = check_unit(shot, "time_unit", "s", fault);
    if (status == RDL_OK)
        status = rdli_text_read(shot, shot->file, "created_by", RDLI_ROOM_CREATED_BY, &shot->info.created_by, fault);
    if (shot->info.created_by == NULL)
        shot->info.created_by = "";
    return status;
}

static rdl_status read_all(rdl_shot *shot, const char *path, rdl_fault *fault)
{
    rdl_status status = open_file(path, shot, fault);
    if (status == RDL_OK)
        status = read_root(shot, fault);
    if (status == RDL_OK)
        status = rdli_settings_read(shot, fault);
    if (status == RDL_OK)
        status = rdli_scene_read(shot, fault);
    if (status == RDL_OK)
        status = rdli_frames_count(shot, fault);
    shot->info.vertex_count = shot->scene.vertex_count;
    return status;
}

static void close_shot(rdl_shot *shot)
{
    rdli_memory memory = shot->memory;
    for (size_t k = 0; k < RDLI_SET_COUNT; k++)
        if (shot->sets[k] >= 0)
            H5Dclose(shot->sets[k]);
    if (shot->file >= 0)
        H5Fclose(shot->file);
    for (size_t k = 0; k < RDLI_ROOM_COUNT; k++)
        rdli_room_release(&memory, &shot->rooms[k]);
    rdli_give(&memory, shot, 1, sizeof *shot);
}

rdl_status rdl_shot_open(const char *path, rdl_shot **shot, rdl_fault *fault)
{
    if (path == NULL || shot == NULL)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, path == NULL ? "path" : "shot", 0);
    rdli_memory memory;
    rdl_status status = rdli_memory_init(&memory, NULL);
    rdl_shot *opened = status == RDL_OK ? rdli_take(&memory, 1, sizeof *opened) : NULL;
    if (opened == NULL)
        return RDL_NO_MEMORY;
    memset(opened, 0, sizeof *opened);
    opened->memory = memory;
    opened->file = H5I_INVALID_HID;
    for (size_t k = 0; k < RDLI_SET_COUNT; k++)
        opened->sets[k] = H5I_INVALID_HID;
    rdli_quiet quiet;
    rdli_quiet_begin(&quiet);
    status = look(path, opened, fault);
    if (status == RDL_OK)
        status = read_all(opened, path, fault);
    if (status == RDL_OK)
        *shot = opened;
    else
        close_shot(opened);
    rdli_quiet_end(&quiet);
    return status;
}

void rdl_shot_close(rdl_shot *shot)
{
    if (shot == NULL)
        return;
    rdli_quiet quiet;
    rdli_quiet_begin(&quiet);
    close_shot(shot);
    rdli_quiet_end(&quiet);
}

const rdl_scene *rdl_shot_scene(const rdl_shot *shot)
{
    return &shot->scene;
}

const rdl_shot_info *rdl_shot_describe(const rdl_shot *shot)
{
    return &shot->info;
}
