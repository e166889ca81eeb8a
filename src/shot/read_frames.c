/* shot/read_frames.c: the frames of an untrusted file. */
#include "shot/quiet.h"
#include "shot/read.h"

enum { WAYPOINTS_MAX = 1 << 20 };

static H5T_class_t item_class(rdli_item item)
{
    switch (item) {
    case RDLI_ITEM_F64: return H5T_FLOAT;
    case RDLI_ITEM_SPAN:
    case RDLI_ITEM_BYTE: return H5T_NO_CLASS; /* any: see read_memory.c */
    default: return H5T_INTEGER;
    }
}

static rdl_status open_set(rdl_shot *shot, size_t which, rdl_fault *fault)
{
    const rdli_set_plan *set = &rdli_set_plans[which];
    uint64_t tail[2] = {set->rank > 1 ? rdli_set_width(set, shot->scene.vertex_count) : 0, set->rank == 3 ? 3 : 0};
    rdli_table table;
    rdl_status status =
        rdli_table_open(shot, "frames", set->name, set->field, item_class(set->item), set->rank, tail, &table, fault);
    if (status != RDL_OK || table.id < 0)
        return status;
    shot->sets[which] = table.id; /* from here on closed with the shot */
    shot->rows[which] = table.rows;
    if (set->rank != 3)
        return RDL_OK;
    /* Without a mesh table of its own a sequence of poses says here how many vertices there are. */
    uint64_t vertices = rdli_extent(table.id, 1);
    if (vertices == 0 || vertices > INT32_MAX)
        return rdli_fault_set(fault, vertices == 0 ? RDL_BAD_FILE : RDL_TOO_LARGE, set->field, vertices);
    shot->scene.vertex_count = (size_t)vertices;
    return RDL_OK;
}

static bool has(const rdl_shot *shot, rdli_set which)
{
    return shot->sets[which] >= 0;
}

static rdl_status check_company(rdl_shot *shot, rdl_fault *fault)
{
    unsigned poses = RDL_SHOT_START | RDL_SHOT_PROPOSED | RDL_SHOT_DELIVERED;
    if ((shot->info.contents & poses) == 0)
        return rdli_fault_set(fault, RDL_BAD_FILE, "frames/delivered", 0);
    if (!has(shot, RDLI_SET_TIME) && (shot->info.contents & (RDL_SHOT_START | RDL_SHOT_PROPOSED)) != 0)
        return rdli_fault_set(fault, RDL_BAD_FILE, "frames/time", 0);
    bool first = has(shot, RDLI_SET_WAYPOINT_FIRST);
    if (first != has(shot, RDLI_SET_WAYPOINT_TIME) || first != has(shot, RDLI_SET_WAYPOINT_POSITION))
        return rdli_fault_set(fault, RDL_BAD_FILE, "frames/waypoint_first", 0);
    if (has(shot, RDLI_SET_MASS_FIRST) != has(shot, RDLI_SET_MASS))
        return rdli_fault_set(fault, RDL_BAD_FILE, "frames/mass_first", 0);
    if (has(shot, RDLI_SET_MUTED_FIRST) != has(shot, RDLI_SET_MUTED_PARTS))
        return rdli_fault_set(fault, RDL_BAD_FILE, "frames/muted_first", 0);
    return rdli_memory_find(shot, fault);
}

static rdl_status read_marks(rdl_shot *shot, rdl_fault *fault)
{
    static const rdli_set order[] = {RDLI_SET_DELIVERED, RDLI_SET_PROPOSED, RDLI_SET_START};
    double bits = RDL_FLOAT64, version = RDLI_MEMORY_VERSION;
    bool found = false;
    rdl_status status = RDL_OK;
    for (size_t k = 0; status == RDL_OK && !found && k < sizeof order / sizeof order[0]; k++)
        if (has(shot, order[k]))
            status = rdli_number_read(shot->sets[order[k]], "host_bits", "host_bits", &bits, &found, fault);
    if (status == RDL_OK && bits != RDL_FLOAT32 && bits != RDL_FLOAT64)
        status = rdli_fault_set(fault, RDL_BAD_FILE, "host_bits", 0);
    shot->info.host_bits = bits == RDL_FLOAT32 ? RDL_FLOAT32 : RDL_FLOAT64;
    if (status == RDL_OK && has(shot, RDLI_SET_MEMORY))
        status = rdli_number_read(shot->sets[RDLI_SET_MEMORY], "version", "frames/memory", &version, &found, fault);
    if (status == RDL_OK && version != RDLI_MEMORY_VERSION)
        status = rdli_fault_set(fault, RDL_BAD_VERSION, "frames/memory", 0);
    return status;
}

rdl_status rdli_frames_open(rdl_shot *shot, rdl_fault *fault)
{
    rdl_status status = RDL_OK;
    for (size_t k = 0; status == RDL_OK && k < RDLI_SET_COUNT; k++) {
        status = open_set(shot, k, fault);
        if (shot->sets[k] >= 0)
            shot->info.contents |= rdli_set_plans[k].content;
    }
    if (status == RDL_OK && !has(shot, RDLI_SET_DELIVERED))
        shot->info.contents &= ~(unsigned)RDL_SHOT_DELIVERED; /* a digest alone delivers nothing */
    if (status == RDL_OK)
        status = check_company(shot, fault);
    return status == RDL_OK ? read_marks(shot, fault) : status;
}

rdl_status rdli_item_read(rdl_shot *shot, rdli_set which, uint64_t first, uint64_t count, void *data,
                          rdl_fault *fault)
{
    hid_t type = rdli_item_memory_type(rdli_set_plans[which].item);
    if (type < 0)
        return RDL_NO_MEMORY;
    rdl_status status = rdli_rows_read(shot->sets[which], type, first, count, data, rdli_set_plans[which].field, fault);
    H5Tclose(type);
    return status;
}

static rdl_status check_finite(const double *positions, size_t vertices, const char *field, rdl_fault *fault)
{
    for (size_t i = 0; i < 3 * vertices; i++)
        if (!isfinite(positions[i]))
            return rdli_fault_set(fault, RDL_NOT_FINITE, field, i / 3);
    return RDL_OK;
}

static rdl_status read_positions(rdl_shot *shot, size_t frame, rdli_set which, double *positions, rdl_fault *fault)
{
    rdl_status status = rdli_item_read(shot, which, frame, 1, positions, fault);
    if (status == RDL_OK)
        status = check_finite(positions, shot->scene.vertex_count, rdli_set_plans[which].field, fault);
    if (status != RDL_OK || which != RDLI_SET_DELIVERED || !has(shot, RDLI_SET_DIGEST))
        return status;
    uint8_t stored[32], computed[32];
    status = rdli_item_read(shot, RDLI_SET_DIGEST, frame, 1, stored, fault);
    if (status != RDL_OK)
        return status;
    rdl_shot_digest(positions, shot->scene.vertex_count, shot->info.host_bits, computed);
    return memcmp(stored, computed, sizeof stored) == 0
               ? RDL_OK
               : rdli_fault_set(fault, RDL_BAD_DIGEST, "frames/delivered", frame);
}

static rdl_status read_waypoints(rdl_shot *shot, size_t frame, rdl_shot_frame *out, rdl_fault *fault)
{
    uint64_t fence[2] = {0, 0};
    rdl_status status = rdli_item_read(shot, RDLI_SET_WAYPOINT_FIRST, frame, 2, fence, fault);
    if (status != RDL_OK)
        return status;
    uint64_t count = fence[1] - fence[0];
    if (fence[1] < fence[0] || count > WAYPOINTS_MAX || fence[1] > shot->rows[RDLI_SET_WAYPOINT_TIME] ||
        fence[1] > shot->rows[RDLI_SET_WAYPOINT_POSITION])
        return rdli_fault_set(fault, RDL_BAD_FILE, "frames/waypoint_first", frame);
    if (count == 0)
        return RDL_OK;
    rdli_room *times = &shot->rooms[RDLI_ROOM_WAYPOINT_TIMES], *places = &shot->rooms[RDLI_ROOM_WAYPOINT_POSITIONS];
    size_t state = 3 * shot->scene.vertex_count * sizeof(double);
    if (!rdli_room_reserve(&shot->memory, times, count, sizeof(double), false) ||
        !rdli_room_reserve(&shot->memory, places, count, state, false))
        return RDL_NO_MEMORY;
    status = rdli_item_read(shot, RDLI_SET_WAYPOINT_TIME, fence[0], count, times->data, fault);
    if (status == RDL_OK)
        status = rdli_item_read(shot, RDLI_SET_WAYPOINT_POSITION, fence[0], count, places->data, fault);
    if (status == RDL_OK)
        status =
            check_finite(places->data, shot->scene.vertex_count * (size_t)count, "frames/waypoint_position", fault);
    const double *time = times->data;
    for (size_t w = 0; status == RDL_OK && w < count; w++)
        if (!(time[w] > (w > 0 ? time[w - 1] : 0) && time[w] < 1))
            status = rdli_fault_set(fault, RDL_OUT_OF_RANGE, "frames/waypoint_time", fence[0] + w);
    if (status == RDL_OK) {
        out->waypoint_count = (size_t)count;
        out->waypoint_times = times->data;
        out->waypoint_positions = places->data;
    }
    return status;
}

static rdl_status read_frame(rdl_shot *shot, size_t frame, rdl_shot_frame *out, rdl_fault *fault)
{
    rdl_status status = RDL_OK;
    rdl_shot_frame read = {.time = (double)frame, .picture = (uint32_t)frame};
    if (has(shot, RDLI_SET_TIME))
        status = rdli_item_read(shot, RDLI_SET_TIME, frame, 1, &read.time, fault);
    if (status == RDL_OK && !isfinite(read.time))
        status = rdli_fault_set(fault, RDL_NOT_FINITE, "frames/time", frame);
    if (status == RDL_OK && has(shot, RDLI_SET_PICTURE))
        status = rdli_item_read(shot, RDLI_SET_PICTURE, frame, 1, &read.picture, fault);
    if (status == RDL_OK && has(shot, RDLI_SET_VERDICT))
        status = rdli_item_read(shot, RDLI_SET_VERDICT, frame, 1, &read.verdict, fault);
    if (status == RDL_OK && read.verdict > 3)
        status = rdli_fault_set(fault, RDL_OUT_OF_RANGE, "frames/verdict", frame);
    if (status == RDL_OK && has(shot, RDLI_SET_WAYPOINT_FIRST))
        status = read_waypoints(shot, frame, &read, fault);
    if (status == RDL_OK && has(shot, RDLI_SET_MEMORY))
        status = rdli_memory_read(shot, frame, &read, fault);
    if (status == RDL_OK)
        status = rdli_rules_read(shot, frame, &read, fault);
    if (status == RDL_OK)
        *out = read;
    return status;
}

/* Whether a frame can be read at all: asked of the last frame of an unfinished recording. */
static rdl_status try_frame(rdl_shot *shot, size_t frame)
{
    static const rdli_set states[] = {RDLI_SET_START, RDLI_SET_PROPOSED, RDLI_SET_DELIVERED};
    rdl_shot_frame ignored;
    rdl_status status = read_frame(shot, frame, &ignored, NULL);
    rdli_room *room = &shot->rooms[RDLI_ROOM_WAYPOINT_POSITIONS];
    if (!rdli_room_reserve(&shot->memory, room, 3 * shot->scene.vertex_count, sizeof(double), false))
        return RDL_NO_MEMORY;
    for (size_t k = 0; status == RDL_OK && k < sizeof states / sizeof states[0]; k++)
        if (has(shot, states[k]))
            status = read_positions(shot, frame, states[k], room->data, NULL);
    return status;
}

rdl_status rdli_frames_count(rdl_shot *shot, rdl_fault *fault)
{
    uint64_t frames = UINT64_MAX, most = 0;
    size_t shortest = RDLI_SET_DELIVERED;
    for (size_t k = 0; k < RDLI_SET_COUNT; k++) {
        rdli_rows kind = rdli_set_plans[k].rows;
        if (!has(shot, (rdli_set)k) || (kind != RDLI_ROWS_FRAMES && kind != RDLI_ROWS_FENCES))
            continue;
        uint64_t rows = shot->rows[k];
        if (kind == RDLI_ROWS_FENCES && rows > 0)
            rows--;
        if (rows < frames)
            shortest = k;
        frames = rows < frames ? rows : frames;
        most = rows > most ? rows : most;
    }
    if (frames > INT32_MAX)
        return rdli_fault_set(fault, RDL_TOO_LARGE, rdli_set_plans[shortest].field, frames);
    if (frames != most && !shot->unfinished)
        return rdli_fault_set(fault, RDL_BAD_FILE, rdli_set_plans[shortest].field, frames);
    shot->info.complete = !shot->unfinished;
    if (shot->unfinished && frames > 0) {
        rdl_status status = try_frame(shot, (size_t)frames - 1);
        if (status == RDL_NO_MEMORY)
            return status;
        frames -= status != RDL_OK;
    }
    shot->info.frame_count = (size_t)frames;
    return RDL_OK;
}

rdl_status rdl_shot_read_positions(rdl_shot *shot, size_t frame, unsigned which, double *positions, rdl_fault *fault)
{
    if (shot == NULL || positions == NULL)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, shot == NULL ? "shot" : "positions", 0);
    rdli_set set = which == RDL_SHOT_START       ? RDLI_SET_START
                   : which == RDL_SHOT_PROPOSED  ? RDLI_SET_PROPOSED
                   : which == RDL_SHOT_DELIVERED ? RDLI_SET_DELIVERED
                                                 : RDLI_SET_COUNT;
    if (set == RDLI_SET_COUNT || !has(shot, set))
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "which", which);
    if (frame >= shot->info.frame_count)
        return rdli_fault_set(fault, RDL_OUT_OF_RANGE, "frame", frame);
    /* Read beside the caller's array, which is untouched on error. */
    size_t numbers = 3 * shot->scene.vertex_count;
    rdli_room *room = &shot->rooms[RDLI_ROOM_SCRATCH];
    if (!rdli_room_reserve(&shot->memory, room, numbers, sizeof(double), false))
        return RDL_NO_MEMORY;
    rdli_quiet quiet;
    rdli_quiet_begin(&quiet);
    rdl_status status = read_positions(shot, frame, set, room->data, fault);
    rdli_quiet_end(&quiet);
    if (status == RDL_OK)
        memcpy(positions, room->data, numbers * sizeof(double));
    return status;
}

rdl_status rdl_shot_read_frame(rdl_shot *shot, size_t frame, rdl_shot_frame *out, rdl_fault *fault)
{
    if (shot == NULL || out == NULL)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, shot == NULL ? "shot" : "out", 0);
    if (frame >= shot->info.frame_count)
        return rdli_fault_set(fault, RDL_OUT_OF_RANGE, "frame", frame);
    rdli_quiet quiet;
    rdli_quiet_begin(&quiet);
    rdl_status status = read_frame(shot, frame, out, fault);
    rdli_quiet_end(&quiet);
    return status;
}
