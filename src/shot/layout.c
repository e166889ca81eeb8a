/* shot/layout.c: see layout.h. */
#include "shot/layout.h"

#include "base/internal.h"

const rdli_set_plan rdli_set_plans[RDLI_SET_COUNT] = {
    [RDLI_SET_TIME] = {"time", "frames/time", 0, RDLI_ROWS_FRAMES, RDLI_ITEM_F64, 1, 0},
    [RDLI_SET_PICTURE] = {"picture", "frames/picture", RDL_SHOT_PICTURE, RDLI_ROWS_FRAMES, RDLI_ITEM_U32, 1, 0},
    [RDLI_SET_START] = {"start", "frames/start", RDL_SHOT_START, RDLI_ROWS_FRAMES, RDLI_ITEM_F64, 3, 0},
    [RDLI_SET_PROPOSED] = {"proposed", "frames/proposed", RDL_SHOT_PROPOSED, RDLI_ROWS_FRAMES, RDLI_ITEM_F64, 3, 0},
    [RDLI_SET_DELIVERED] = {"delivered", "frames/delivered", RDL_SHOT_DELIVERED, RDLI_ROWS_FRAMES, RDLI_ITEM_F64, 3, 0},
    [RDLI_SET_DIGEST] = {"digest", "frames/digest", RDL_SHOT_DELIVERED, RDLI_ROWS_FRAMES, RDLI_ITEM_U8, 2, 32},
    [RDLI_SET_VERDICT] = {"verdict", "frames/verdict", RDL_SHOT_VERDICT, RDLI_ROWS_FRAMES, RDLI_ITEM_U8, 1, 0},
    [RDLI_SET_WAYPOINT_FIRST] = {"waypoint_first", "frames/waypoint_first", RDL_SHOT_WAYPOINTS, RDLI_ROWS_FENCES,
                                 RDLI_ITEM_U64, 1, 0},
    [RDLI_SET_WAYPOINT_TIME] = {"waypoint_time", "frames/waypoint_time", RDL_SHOT_WAYPOINTS, RDLI_ROWS_ITEMS,
                                RDLI_ITEM_F64, 1, 0},
    [RDLI_SET_WAYPOINT_POSITION] = {"waypoint_position", "frames/waypoint_position", RDL_SHOT_WAYPOINTS,
                                    RDLI_ROWS_ITEMS, RDLI_ITEM_F64, 3, 0},
    [RDLI_SET_MEMORY] = {"memory", "frames/memory", RDL_SHOT_MEMORY, RDLI_ROWS_FRAMES, RDLI_ITEM_SPAN, 1, 0},
    [RDLI_SET_MEMORY_BYTES] = {"memory_bytes", "frames/memory_bytes", RDL_SHOT_MEMORY, RDLI_ROWS_BYTES, RDLI_ITEM_BYTE,
                               1},
    [RDLI_SET_DURATION] = {"duration", "frames/duration", RDL_SHOT_RULES, RDLI_ROWS_FRAMES, RDLI_ITEM_F64, 1, 0},
    [RDLI_SET_SECONDS_MAX] = {"seconds_max", "frames/seconds_max", RDL_SHOT_RULES, RDLI_ROWS_FRAMES, RDLI_ITEM_F64, 1, 0},
    [RDLI_SET_PASSES_MAX] = {"passes_max", "frames/passes_max", RDL_SHOT_RULES, RDLI_ROWS_FRAMES, RDLI_ITEM_U64, 1, 0},
    [RDLI_SET_MASS_FIRST] = {"mass_first", "frames/mass_first", RDL_SHOT_RULES, RDLI_ROWS_FENCES, RDLI_ITEM_U64, 1, 0},
    [RDLI_SET_MASS] = {"mass", "frames/mass", RDL_SHOT_RULES, RDLI_ROWS_ITEMS, RDLI_ITEM_F64, 2, 0},
    [RDLI_SET_MUTED_FIRST] = {"muted_first", "frames/muted_first", RDL_SHOT_RULES, RDLI_ROWS_FENCES, RDLI_ITEM_U64, 1, 0},
    [RDLI_SET_MUTED_PARTS] = {"muted_parts", "frames/muted_parts", RDL_SHOT_RULES, RDLI_ROWS_ITEMS, RDLI_ITEM_U32, 2,
                              2},
};

uint64_t rdli_set_width(const rdli_set_plan *set, size_t vertex_count)
{
    return set->rank == 2 && set->width > 0 ? (uint64_t)set->width : (uint64_t)vertex_count;
}

static hid_t span_type(hid_t number)
{
    hid_t type = H5Tcreate(H5T_COMPOUND, sizeof(rdli_span));
    if (type >= 0 && (H5Tinsert(type, "first", offsetof(rdli_span, first), number) < 0 ||
                      H5Tinsert(type, "bytes", offsetof(rdli_span, bytes), number) < 0)) {
        H5Tclose(type);
        type = H5I_INVALID_HID;
    }
    return type;
}

static hid_t byte_type(void)
{
    hid_t type = H5Tcreate(H5T_OPAQUE, 1);
    if (type >= 0 && H5Tset_tag(type, "raddle engine memory") < 0) {
        H5Tclose(type);
        type = H5I_INVALID_HID;
    }
    return type;
}

hid_t rdli_item_memory_type(rdli_item item)
{
    switch (item) {
    case RDLI_ITEM_F64: return H5Tcopy(H5T_NATIVE_DOUBLE);
    case RDLI_ITEM_U8: return H5Tcopy(H5T_NATIVE_UINT8);
    case RDLI_ITEM_U32: return H5Tcopy(H5T_NATIVE_UINT32);
    case RDLI_ITEM_U64: return H5Tcopy(H5T_NATIVE_UINT64);
    case RDLI_ITEM_SPAN: return span_type(H5T_NATIVE_UINT64);
    default: return byte_type();
    }
}

hid_t rdli_item_file_type(rdli_item item)
{
    switch (item) {
    case RDLI_ITEM_F64: return H5Tcopy(H5T_IEEE_F64LE);
    case RDLI_ITEM_U8: return H5Tcopy(H5T_STD_U8LE);
    case RDLI_ITEM_U32: return H5Tcopy(H5T_STD_U32LE);
    case RDLI_ITEM_U64: return H5Tcopy(H5T_STD_U64LE);
    case RDLI_ITEM_SPAN: return span_type(H5T_STD_U64LE);
    default: return byte_type();
    }
}
