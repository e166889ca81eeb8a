/* shot/read_rules.c: what the host told each step of an untrusted file. Every dataset of it may be missing. */
#include "shot/read.h"

enum { MUTED_MAX = 1 << 24 };

static bool has(const rdl_shot *shot, rdli_set which)
{
    return shot->sets[which] >= 0;
}

static rdl_status read_fence(rdl_shot *shot, rdli_set fences, rdli_set items, size_t frame, uint64_t most,
                             uint64_t fence[2], rdl_fault *fault)
{
    rdl_status status = rdli_item_read(shot, fences, frame, 2, fence, fault);
    if (status != RDL_OK)
        return status;
    if (fence[1] < fence[0] || fence[1] - fence[0] > most || fence[1] > shot->rows[items])
        return rdli_fault_set(fault, RDL_BAD_FILE, rdli_set_plans[fences].field, frame);
    return RDL_OK;
}

static rdl_status read_mass(rdl_shot *shot, size_t frame, rdl_shot_frame *out, rdl_fault *fault)
{
    uint64_t fence[2];
    size_t n = shot->scene.vertex_count;
    rdl_status status = read_fence(shot, RDLI_SET_MASS_FIRST, RDLI_SET_MASS, frame, 1, fence, fault);
    if (status != RDL_OK || fence[0] == fence[1])
        return status;
    rdli_room *room = &shot->rooms[RDLI_ROOM_STEP_MASS];
    if (!rdli_room_reserve(&shot->memory, room, n, sizeof(double), false))
        return RDL_NO_MEMORY;
    double *mass = room->data;
    status = rdli_item_read(shot, RDLI_SET_MASS, fence[0], 1, mass, fault);
    for (size_t v = 0; status == RDL_OK && v < n; v++)
        if (!(mass[v] > 0)) /* NaN fails too; infinity is a driven vertex */
            status = rdli_fault_set(fault, RDL_BAD_MASS, "frames/mass", v);
    out->mass = mass;
    return status;
}

static rdl_status read_muted(rdl_shot *shot, size_t frame, rdl_shot_frame *out, rdl_fault *fault)
{
    uint64_t fence[2];
    rdl_status status = read_fence(shot, RDLI_SET_MUTED_FIRST, RDLI_SET_MUTED_PARTS, frame, MUTED_MAX, fence, fault);
    if (status != RDL_OK || fence[0] == fence[1])
        return status;
    size_t count = (size_t)(fence[1] - fence[0]);
    rdli_room *room = &shot->rooms[RDLI_ROOM_STEP_MUTED];
    if (!rdli_room_reserve(&shot->memory, room, count, 2 * sizeof(uint32_t), false))
        return RDL_NO_MEMORY;
    const uint32_t(*rows)[2] = room->data;
    status = rdli_item_read(shot, RDLI_SET_MUTED_PARTS, fence[0], count, room->data, fault);
    for (size_t k = 0; status == RDL_OK && k < count; k++)
        if (rows[k][0] >= shot->scene.part_count || rows[k][1] >= shot->scene.part_count)
            status = rdli_fault_set(fault, RDL_OUT_OF_RANGE, "frames/muted_parts", fence[0] + k);
    out->muted_count = count;
    out->muted_parts = rows;
    return status;
}

rdl_status rdli_rules_read(rdl_shot *shot, size_t frame, rdl_shot_frame *out, rdl_fault *fault)
{
    rdl_status status = RDL_OK;
    if (has(shot, RDLI_SET_DURATION))
        status = rdli_item_read(shot, RDLI_SET_DURATION, frame, 1, &out->duration, fault);
    if (status == RDL_OK && has(shot, RDLI_SET_SECONDS_MAX))
        status = rdli_item_read(shot, RDLI_SET_SECONDS_MAX, frame, 1, &out->seconds_max, fault);
    if (status == RDL_OK && !(out->duration >= 0 && out->duration < HUGE_VAL))
        status = rdli_fault_set(fault, RDL_OUT_OF_RANGE, "frames/duration", frame);
    if (status == RDL_OK && !(out->seconds_max >= 0 && out->seconds_max < HUGE_VAL))
        status = rdli_fault_set(fault, RDL_OUT_OF_RANGE, "frames/seconds_max", frame);
    if (status == RDL_OK && has(shot, RDLI_SET_PASSES_MAX))
        status = rdli_item_read(shot, RDLI_SET_PASSES_MAX, frame, 1, &out->passes_max, fault);
    if (status == RDL_OK && has(shot, RDLI_SET_MASS_FIRST))
        status = read_mass(shot, frame, out, fault);
    if (status == RDL_OK && has(shot, RDLI_SET_MUTED_FIRST))
        status = read_muted(shot, frame, out, fault);
    return status;
}
