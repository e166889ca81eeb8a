/* shot/write.h: the writer's object and the pieces of it. Included by src/shot only. */
#ifndef RDLI_SHOT_WRITE_H
#define RDLI_SHOT_WRITE_H

#include <hdf5.h>

#include "base/memory.h"
#include "shot/layout.h"

struct rdl_shot_writer {
    rdli_memory memory;
    hid_t file, driver;
    hid_t sets[RDLI_SET_COUNT]; /* open datasets of /frames, or negative */
    uint64_t rows[RDLI_SET_COUNT];
    char *path, *part; /* NAME and NAME.part */
    size_t path_bytes, part_bytes;
    size_t vertex_count, part_count;
    unsigned contents;
    int host_bits, deflate;
    bool overwrite;
    rdli_room last, chunk;   /* delivered of the frame before; a chunk as it lies in the file */
    bool has_last;
    bool broken; /* a write failed, as noted here by the driver too: the file on disk ends with the
                    frame before it, and nothing reaches it any more */
};

/* Everything but the frames' rows: root attributes, parts, mesh, rules, settings. False: HDF5 refused. */
bool rdli_write_scene(rdl_shot_writer *writer, const rdl_scene *scene, const rdl_shot_options *options);
/* The empty datasets of /frames. */
bool rdli_write_frame_sets(rdl_shot_writer *writer);
/* Adds a row to `to` that has the same bits as a row of `from`: the chunk is taken as it lies in the file, compressed and
 * with its checksum. */
bool rdli_repeat_row(rdl_shot_writer *writer, rdli_set from, uint64_t row, rdli_set to);
bool rdli_write_text(hid_t object, const char *name, const char *text);
bool rdli_write_attribute(hid_t object, const char *name, hid_t file_type, hid_t memory_type, const void *value);

#endif
