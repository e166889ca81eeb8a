/* shot/write_chunk.c: rows that repeat. A step mostly starts where the one before delivered, and delivers what was proposed
 * where nothing happened; compressing the same numbers again would be most of the cost of a recording. */
#include "shot/write.h"

/* The chunk on its way through HDF5's cache has to be in the file before it can be read as it lies there. */
static bool load_chunk(rdl_shot_writer *writer, hid_t set, const hsize_t offset[3], size_t *bytes)
{
    hsize_t stored = 0;
    uint32_t skipped = 0;
    if (H5Dflush(set) < 0 || H5Dget_chunk_storage_size(set, offset, &stored) < 0 || stored == 0)
        return false;
    *bytes = (size_t)stored;
    return rdli_room_reserve(&writer->memory, &writer->chunk, *bytes, 1, false) &&
           H5Dread_chunk(set, H5P_DEFAULT, offset, &skipped, writer->chunk.data) >= 0 && skipped == 0;
}

bool rdli_repeat_row(rdl_shot_writer *writer, rdli_set from, uint64_t row, rdli_set to)
{
    const hsize_t source[3] = {row, 0, 0}, target[3] = {writer->rows[to], 0, 0};
    const hsize_t dims[3] = {writer->rows[to] + 1, writer->vertex_count, 3};
    size_t bytes = 0;
    if (!load_chunk(writer, writer->sets[from], source, &bytes) || H5Dset_extent(writer->sets[to], dims) < 0 ||
        H5Dwrite_chunk(writer->sets[to], H5P_DEFAULT, 0, target, bytes, writer->chunk.data) < 0)
        return false;
    writer->rows[to]++;
    return true;
}
