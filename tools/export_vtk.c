/* export_vtk.c: `raddle export --vtkhdf`: one HDF5 file in the VTKHDF layout (VTK documentation, "VTKHDF file format"):
 * an UnstructuredGrid of lines and triangles, version 1.0 for one frame, 2.0 with the group Steps for several; the mesh
 * is stored once, the points frame by frame. */
#include <errno.h>
#include <hdf5.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "export.h"

enum { CELL_LINE = 3, CELL_TRIANGLE = 5 };

static bool write_set(hid_t group, const char *name, hid_t file_type, hid_t type, int rank, const hsize_t dims[2],
                      const void *data)
{
    hid_t space = H5Screate_simple(rank, dims, NULL);
    hid_t set = H5Dcreate2(group, name, file_type, space, H5P_DEFAULT, H5P_DEFAULT, H5P_DEFAULT);
    bool done = set >= 0 && (dims[0] == 0 || H5Dwrite(set, type, H5S_ALL, H5S_ALL, H5P_DEFAULT, data) >= 0);
    if (set >= 0)
        H5Dclose(set);
    if (space >= 0)
        H5Sclose(space);
    return done;
}

static bool write_longs(hid_t group, const char *name, const int64_t *values, size_t count)
{
    const hsize_t dims[2] = {count, 1};
    return write_set(group, name, H5T_STD_I64LE, H5T_NATIVE_INT64, 1, dims, values);
}

static bool write_attribute(hid_t group, const char *name, hid_t type, hsize_t count, const void *value)
{
    hid_t space = count > 0 ? H5Screate_simple(1, &count, NULL) : H5Screate(H5S_SCALAR);
    hid_t attribute = H5Acreate2(group, name, type, space, H5P_DEFAULT, H5P_DEFAULT);
    bool done = attribute >= 0 && H5Awrite(attribute, type, value) >= 0;
    if (attribute >= 0)
        H5Aclose(attribute);
    if (space >= 0)
        H5Sclose(space);
    return done;
}

static bool write_head(hid_t group, bool temporal)
{
    static const char kind[] = "UnstructuredGrid";
    const int64_t version[2] = {temporal ? 2 : 1, 0};
    hid_t text = H5Tcopy(H5T_C_S1);
    bool done = text >= 0 && H5Tset_size(text, strlen(kind)) >= 0 && H5Tset_strpad(text, H5T_STR_NULLPAD) >= 0 &&
                write_attribute(group, "Version", H5T_NATIVE_INT64, 2, version) &&
                write_attribute(group, "Type", text, 0, kind);
    if (text >= 0)
        H5Tclose(text);
    return done;
}

/* Cells: segments, then triangles. With several frames each has its row in the counts, and all rows say the same. */
static bool write_cells(const exporter *e, hid_t group, size_t frames)
{
    const rdl_scene *scene = e->scene;
    size_t cells = scene->segment_count + scene->triangle_count;
    size_t ids = 2 * scene->segment_count + 3 * scene->triangle_count, next = 0;
    int64_t *connectivity = malloc((ids + 1) * sizeof *connectivity), *offsets = malloc((cells + 1) * sizeof *offsets);
    int64_t *counts = malloc(3 * (frames + 1) * sizeof *counts);
    uint8_t *types = malloc(cells + 1);
    bool done = connectivity != NULL && offsets != NULL && counts != NULL && types != NULL;
    for (size_t c = 0; done && c < cells; c++) {
        bool line = c < scene->segment_count;
        const uint32_t *corner = line ? scene->segments[c] : scene->triangles[c - scene->segment_count];
        types[c] = line ? CELL_LINE : CELL_TRIANGLE;
        offsets[c] = (int64_t)next;
        for (int k = 0; k < (line ? 2 : 3); k++)
            connectivity[next++] = corner[k];
    }
    for (size_t f = 0; done && f < frames; f++) {
        counts[f] = (int64_t)scene->vertex_count;
        counts[frames + f] = (int64_t)cells;
        counts[2 * frames + f] = (int64_t)ids;
    }
    if (done) {
        const hsize_t dims[2] = {cells, 1};
        offsets[cells] = (int64_t)next;
        done = write_longs(group, "Connectivity", connectivity, ids) && write_longs(group, "Offsets", offsets, cells + 1) &&
               write_set(group, "Types", H5T_STD_U8LE, H5T_NATIVE_UINT8, 1, dims, types) &&
               write_longs(group, "NumberOfPoints", counts, frames) &&
               write_longs(group, "NumberOfCells", counts + frames, frames) &&
               write_longs(group, "NumberOfConnectivityIds", counts + 2 * frames, frames);
    }
    free(connectivity);
    free(offsets);
    free(counts);
    free(types);
    return done;
}

/* Where the rows of each step begin: points move on, cells stay. */
static bool write_steps(const exporter *e, hid_t group, const double *times, size_t frames)
{
    hid_t steps = H5Gcreate2(group, "Steps", H5P_DEFAULT, H5P_DEFAULT, H5P_DEFAULT);
    const int64_t count = (int64_t)frames;
    const hsize_t row[2] = {frames, 1};
    int64_t *numbers = calloc(4 * frames, sizeof *numbers);
    bool done = steps >= 0 && numbers != NULL && write_attribute(steps, "NSteps", H5T_NATIVE_INT64, 0, &count) &&
                write_set(steps, "Values", H5T_IEEE_F64LE, H5T_NATIVE_DOUBLE, 1, row, times);
    for (size_t f = 0; done && f < frames; f++) {
        numbers[f] = (int64_t)f;
        numbers[frames + f] = (int64_t)(f * e->scene->vertex_count);
        numbers[2 * frames + f] = 1;
    }
    done = done && write_longs(steps, "PartOffsets", numbers, frames) &&
           write_longs(steps, "PointOffsets", numbers + frames, frames) &&
           write_longs(steps, "NumberOfParts", numbers + 2 * frames, frames) &&
           write_set(steps, "CellOffsets", H5T_STD_I64LE, H5T_NATIVE_INT64, 2, row, numbers + 3 * frames) &&
           write_set(steps, "ConnectivityIdOffsets", H5T_STD_I64LE, H5T_NATIVE_INT64, 2, row, numbers + 3 * frames);
    free(numbers);
    if (steps >= 0)
        H5Gclose(steps);
    return done;
}

/* Points and times, frame by frame. status: of the shot; false with RDL_OK: HDF5 refused. */
static bool write_points(exporter *e, hid_t group, double *times, rdl_status *status, rdl_fault *fault)
{
    size_t n = e->scene->vertex_count, frames = e->last + 1 - e->first;
    const hsize_t dims[2] = {frames * n, 3}, block[2] = {n, 3};
    hid_t space = H5Screate_simple(2, dims, NULL), room = H5Screate_simple(2, block, NULL);
    hid_t set = H5Dcreate2(group, "Points", H5T_IEEE_F64LE, space, H5P_DEFAULT, H5P_DEFAULT, H5P_DEFAULT);
    bool done = space >= 0 && room >= 0 && set >= 0;
    for (size_t f = 0; done && f < frames; f++) {
        const hsize_t start[2] = {f * n, 0};
        rdl_shot_frame frame = {0};
        *status = rdl_shot_read_positions(e->shot, e->first + f, e->which, e->positions, fault);
        if (*status == RDL_OK)
            *status = rdl_shot_read_frame(e->shot, e->first + f, &frame, fault);
        times[f] = frame.time;
        done = *status == RDL_OK && H5Sselect_hyperslab(space, H5S_SELECT_SET, start, NULL, block, NULL) >= 0 &&
               H5Dwrite(set, H5T_NATIVE_DOUBLE, room, space, H5P_DEFAULT, e->positions) >= 0;
    }
    if (set >= 0)
        H5Dclose(set);
    if (room >= 0)
        H5Sclose(room);
    if (space >= 0)
        H5Sclose(space);
    return done;
}

static bool write_file(exporter *e, const char *path, rdl_status *status, rdl_fault *fault)
{
    size_t frames = e->last + 1 - e->first;
    double *times = malloc(frames * sizeof *times);
    hid_t file = times != NULL ? H5Fcreate(path, H5F_ACC_EXCL, H5P_DEFAULT, H5P_DEFAULT) : H5I_INVALID_HID;
    hid_t group = file >= 0 ? H5Gcreate2(file, "VTKHDF", H5P_DEFAULT, H5P_DEFAULT, H5P_DEFAULT) : H5I_INVALID_HID;
    bool done = group >= 0 && write_head(group, frames > 1) && write_cells(e, group, frames) &&
                write_points(e, group, times, status, fault) && (frames == 1 || write_steps(e, group, times, frames));
    if (group >= 0)
        H5Gclose(group);
    if (file >= 0)
        done = H5Fclose(file) >= 0 && done;
    free(times);
    return done;
}

int export_vtk(exporter *e)
{
    char beside[4300];
    rdl_status status = RDL_OK;
    rdl_fault fault = {0, ""};
    if (!e->force && access(e->prefix, F_OK) == 0)
        return cli_fail("export", e->prefix, -1, RDL_FILE_EXISTS, NULL);
    snprintf(beside, sizeof beside, "%s.new-%ld", e->prefix, (long)getpid());
    H5Eset_auto2(H5E_DEFAULT, NULL, NULL);
    cli_pending(beside);
    bool done = write_file(e, beside, &status, &fault);
    done = done && (e->force ? rename(beside, e->prefix) : link(beside, e->prefix)) == 0;
    unlink(beside);
    cli_pending(NULL);
    if (status != RDL_OK)
        return cli_fail("export", e->path, -1, status, &fault);
    if (done)
        return CLI_DONE;
    cli_error("export", "%s: cannot be written", cli_clean(e->prefix));
    return CLI_NOT_FINISHED;
}
