/* shot/read_memory.c: the engine's memory of each frame. The writer stores spans of one dataset of bytes (see
 * writer.c); other programs may find one opaque item, or one sequence of bytes, per frame more convenient. */
#include "shot/read.h"

enum { MEMORY_MAX = 1 << 30 };

static rdl_status bad(rdl_fault *fault, uint64_t index)
{
    return rdli_fault_set(fault, RDL_BAD_FILE, "frames/memory", index);
}

/* The columns by name, so that HDF5 converts whatever whole numbers they are. */
static bool is_span(hid_t type)
{
    static const char *const names[2] = {"first", "bytes"};
    bool sound = H5Tget_class(type) == H5T_COMPOUND && H5Tget_nmembers(type) == 2;
    for (size_t k = 0; sound && k < 2; k++) {
        int member = H5Tget_member_index(type, names[k]);
        sound = member >= 0 && H5Tget_member_class(type, (unsigned)member) == H5T_INTEGER;
    }
    return sound;
}

static bool is_byte(hid_t type)
{
    H5T_class_t class = H5Tget_class(type);
    return (class == H5T_OPAQUE || class == H5T_INTEGER) && H5Tget_size(type) == 1;
}

static bool is_varying(hid_t type)
{
    hid_t base = H5Tget_class(type) == H5T_VLEN ? H5Tget_super(type) : H5I_INVALID_HID;
    bool sound = base >= 0 && is_byte(base);
    if (base >= 0)
        H5Tclose(base);
    return sound;
}

rdl_status rdli_memory_find(rdl_shot *shot, rdl_fault *fault)
{
    hid_t set = shot->sets[RDLI_SET_MEMORY], bytes = shot->sets[RDLI_SET_MEMORY_BYTES];
    if (set < 0)
        return bytes < 0 ? RDL_OK : bad(fault, 0);
    hid_t type = H5Dget_type(set), pool = bytes >= 0 ? H5Dget_type(bytes) : H5I_INVALID_HID;
    bool known = type >= 0;
    if (known && pool >= 0) {
        known = is_span(type) && is_byte(pool);
        shot->memory_form = RDLI_MEMORY_SPANS;
    } else if (known && is_varying(type)) {
        shot->memory_form = RDLI_MEMORY_VARYING;
    } else if (known) {
        known = H5Tget_class(type) == H5T_OPAQUE && H5Tget_size(type) <= MEMORY_MAX;
        shot->memory_form = RDLI_MEMORY_FIXED;
    }
    if (pool >= 0)
        H5Tclose(pool);
    if (type >= 0)
        H5Tclose(type);
    return known ? RDL_OK : bad(fault, 0);
}

static void *room_for(rdl_shot *shot, uint64_t bytes)
{
    rdli_room *room = &shot->rooms[RDLI_ROOM_MEMORY];
    return rdli_room_reserve(&shot->memory, room, (size_t)bytes, 1, false) ? room->data : NULL;
}

static rdl_status read_span(rdl_shot *shot, size_t frame, rdl_shot_frame *out, rdl_fault *fault)
{
    rdli_span span = {0, 0};
    hid_t row = rdli_item_memory_type(RDLI_ITEM_SPAN);
    rdl_status status = row >= 0
                            ? rdli_rows_read(shot->sets[RDLI_SET_MEMORY], row, frame, 1, &span, "frames/memory", fault)
                            : RDL_NO_MEMORY;
    if (row >= 0)
        H5Tclose(row);
    if (status != RDL_OK || span.bytes == 0)
        return status;
    uint64_t rows = shot->rows[RDLI_SET_MEMORY_BYTES];
    if (span.bytes > MEMORY_MAX || span.first > rows || span.bytes > rows - span.first)
        return bad(fault, frame);
    void *data = room_for(shot, span.bytes);
    if (data == NULL)
        return RDL_NO_MEMORY;
    /* Read by the file's own type: opaque types of another tag do not convert. */
    hid_t set = shot->sets[RDLI_SET_MEMORY_BYTES], type = H5Dget_type(set);
    status = rdli_rows_read(set, type, span.first, span.bytes, data, "frames/memory_bytes", fault);
    H5Tclose(type);
    out->memory = data;
    out->memory_bytes = (size_t)span.bytes;
    return status;
}

static rdl_status read_fixed(rdl_shot *shot, size_t frame, rdl_shot_frame *out, rdl_fault *fault)
{
    hid_t set = shot->sets[RDLI_SET_MEMORY], type = H5Dget_type(set);
    size_t bytes = H5Tget_size(type);
    void *data = room_for(shot, bytes);
    rdl_status status =
        data != NULL ? rdli_rows_read(set, type, frame, 1, data, "frames/memory", fault) : RDL_NO_MEMORY;
    H5Tclose(type);
    out->memory = data;
    out->memory_bytes = bytes;
    return status;
}

static rdl_status read_varying(rdl_shot *shot, size_t frame, rdl_shot_frame *out, rdl_fault *fault)
{
    hid_t set = shot->sets[RDLI_SET_MEMORY], type = H5Dget_type(set);
    hvl_t given = {0, NULL};
    rdl_status status = rdli_rows_read(set, type, frame, 1, &given, "frames/memory", fault);
    H5Tclose(type);
    void *data = NULL;
    if (status == RDL_OK && given.len > 0 && given.p != NULL) {
        data = given.len <= MEMORY_MAX ? room_for(shot, given.len) : NULL;
        status = data != NULL ? RDL_OK : RDL_NO_MEMORY;
    }
    if (data != NULL) {
        memcpy(data, given.p, given.len);
        out->memory = data;
        out->memory_bytes = given.len;
    }
    H5free_memory(given.p);
    return status;
}

rdl_status rdli_memory_read(rdl_shot *shot, size_t frame, rdl_shot_frame *out, rdl_fault *fault)
{
    switch (shot->memory_form) {
    case RDLI_MEMORY_SPANS: return read_span(shot, frame, out, fault);
    case RDLI_MEMORY_FIXED: return read_fixed(shot, frame, out, fault);
    default: return read_varying(shot, frame, out, fault);
    }
}
