/* shot/read.h: the reader's object, and careful access to the tables of a file that nobody vouches for.
 * Included by src/shot only. */
#ifndef RDLI_SHOT_READ_H
#define RDLI_SHOT_READ_H

#include <hdf5.h>

#include "base/memory.h"
#include "shot/layout.h"

enum { /* what a shot keeps in memory */
       RDLI_ROOM_PARTS,
       RDLI_ROOM_NAMES,
       RDLI_ROOM_VERTEX_PART,
       RDLI_ROOM_MASS,
       RDLI_ROOM_HALF_THICKNESS,
       RDLI_ROOM_SEGMENTS,
       RDLI_ROOM_TRIANGLES,
       RDLI_ROOM_MUTED,
       RDLI_ROOM_ATTACHMENTS,
       RDLI_ROOM_PAIR_FRICTION,
       RDLI_ROOM_SCRATCH,
       RDLI_ROOM_WAYPOINT_TIMES,
       RDLI_ROOM_WAYPOINT_POSITIONS,
       RDLI_ROOM_MEMORY,
       RDLI_ROOM_STEP_MASS,
       RDLI_ROOM_STEP_MUTED,
       RDLI_ROOM_TRACE,
       RDLI_ROOM_CREATED_BY,
       RDLI_ROOM_ENGINE_VERSION,
       RDLI_ROOM_UNKNOWN_SETTING,
       RDLI_ROOM_COUNT
};

typedef enum rdli_memory_form {
    RDLI_MEMORY_SPANS,  /* what our writer makes: rows of (first, bytes) into memory_bytes */
    RDLI_MEMORY_FIXED,  /* one opaque item of the same size per frame */
    RDLI_MEMORY_VARYING /* one sequence of bytes per frame */
} rdli_memory_form;

struct rdl_shot {
    rdli_memory memory;
    hid_t file;
    uint64_t file_bytes;
    bool unfinished; /* NAME.part, or a recording whose host did not close it */
    hid_t sets[RDLI_SET_COUNT];
    uint64_t rows[RDLI_SET_COUNT];
    rdli_room rooms[RDLI_ROOM_COUNT];
    rdl_scene scene;
    rdl_shot_info info;
    rdli_memory_form memory_form;
};

typedef struct rdli_table {
    hid_t id; /* negative: the file does not have it */
    uint64_t rows;
} rdli_table;

/* Opens GROUP/NAME and checks all that can be checked without reading it: hard links only, type class (H5T_NO_CLASS:
 * any), rank, the second and third extents (tail[i] = 0: any), storage inside the file, standard filters, a size that
 * the file's own size makes plausible. A missing table is RDL_OK with a negative id. field names it in faults. */
rdl_status rdli_table_open(rdl_shot *shot, const char *group, const char *name, const char *field, H5T_class_t class,
                           int rank, const uint64_t tail[2], rdli_table *table, rdl_fault *fault);
void rdli_table_close(rdli_table *table);
/* Reads rows [first, first + count) of a dataset into memory of the given type. */
rdl_status rdli_rows_read(hid_t set, hid_t type, uint64_t first, uint64_t count, void *data, const char *field,
                          rdl_fault *fault);
/* Extent `axis` of an open dataset; 0 where it has no such axis. */
uint64_t rdli_extent(hid_t set, int axis);

/* Attributes. Numbers: *value is untouched and *found false when there is none. Text goes into a room of the shot, at
 * most 4095 bytes of it. A wrong class or shape is RDL_BAD_FILE. */
rdl_status rdli_number_read(hid_t object, const char *name, const char *field, double *value, bool *found,
                            rdl_fault *fault);
rdl_status rdli_text_read(rdl_shot *shot, hid_t object, const char *name, int room, const char **text,
                          rdl_fault *fault);
/* The object of that name if it is there, by a hard link, and of that kind; else negative. *present tells the two
 * apart. */
hid_t rdli_object_open(hid_t parent, const char *name, H5I_type_t kind, bool *present);

/* Whether all bytes form well-formed UTF-8 (Unicode 15, table 3-7). */
bool rdli_is_utf8(const char *text, size_t bytes);

/* /parts, /mesh, /rules into shot->scene. */
rdl_status rdli_scene_read(rdl_shot *shot, rdl_fault *fault);
/* /settings into shot->info. */
rdl_status rdli_settings_read(rdl_shot *shot, rdl_fault *fault);
/* The datasets of /frames: opens them, counts the valid frames. Needs scene.vertex_count, or finds it when it is 0. */
rdl_status rdli_frames_open(rdl_shot *shot, rdl_fault *fault);
rdl_status rdli_frames_count(rdl_shot *shot, rdl_fault *fault);
/* The engine's memory: which form the file has, and one frame's block. */
rdl_status rdli_memory_find(rdl_shot *shot, rdl_fault *fault);
rdl_status rdli_memory_read(rdl_shot *shot, size_t frame, rdl_shot_frame *out, rdl_fault *fault);
/* What the host told one step. */
rdl_status rdli_rules_read(rdl_shot *shot, size_t frame, rdl_shot_frame *out, rdl_fault *fault);
/* Rows of a dataset of /frames that is there. */
rdl_status rdli_item_read(rdl_shot *shot, rdli_set which, uint64_t first, uint64_t count, void *data,
                          rdl_fault *fault);

#endif
