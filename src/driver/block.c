/* driver/block.c: the engine's memory as a block of little-endian 32-bit words:
 * "RDLM", version, vertex count, edge count, triangle count, crossing count, then kind, first, second, side per crossing. */
#include "driver/create.h"

enum { VERSION = 1, HEAD_WORDS = 6, ROW_WORDS = 4 };
static const uint32_t mark = 0x4d4c4452u; /* "RDLM" */

static void put(uint8_t *at, uint32_t word)
{
    for (int k = 0; k < 4; k++)
        at[k] = (uint8_t)(word >> (8 * k));
}

static uint32_t get(const uint8_t *at)
{
    return (uint32_t)at[0] | (uint32_t)at[1] << 8 | (uint32_t)at[2] << 16 | (uint32_t)at[3] << 24;
}

size_t rdli_memory_block_bytes(const rdl_engine *engine)
{
    return 4 * (HEAD_WORDS + ROW_WORDS * engine->crossing_count);
}

void rdli_memory_block_write(const rdl_engine *engine, void *block)
{
    uint8_t *at = block;
    const rdli_mesh *mesh = &engine->scene.mesh;
    const uint32_t head[HEAD_WORDS] = { mark, VERSION, mesh->vertex_count, mesh->edge_count, mesh->triangle_count,
        (uint32_t)engine->crossing_count };
    for (int k = 0; k < HEAD_WORDS; k++, at += 4)
        put(at, head[k]);
    const rdli_crossing *rows = engine->crossings.data;
    for (size_t i = 0; i < engine->crossing_count; i++) {
        const uint32_t row[ROW_WORDS] = { rows[i].kind, rows[i].first, rows[i].second, (uint32_t)rows[i].side };
        for (int k = 0; k < ROW_WORDS; k++, at += 4)
            put(at, row[k]);
    }
}

static bool row_fits(const rdli_mesh *mesh, const uint8_t *at)
{
    uint32_t kind = get(at), first = get(at + 4), second = get(at + 8), side = get(at + 12);
    if (kind > RDL_EDGE_EDGE || (side != 0 && side != 1 && side != UINT32_MAX))
        return false;
    if (kind == RDL_POINT_TRIANGLE)
        return first < mesh->vertex_count && second < mesh->triangle_count;
    return first < second && second < mesh->edge_count;
}

rdl_status rdli_memory_block_read(rdl_engine *engine, const void *block, size_t bytes)
{
    const uint8_t *at = block;
    const rdli_mesh *mesh = &engine->scene.mesh;
    if (bytes < 4 * HEAD_WORDS || get(at) != mark || get(at + 4) != VERSION || get(at + 8) != mesh->vertex_count
        || get(at + 12) != mesh->edge_count || get(at + 16) != mesh->triangle_count)
        return RDL_BAD_MEMORY;
    size_t count = get(at + 20);
    if (bytes != 4 * (HEAD_WORDS + ROW_WORDS * count))
        return RDL_BAD_MEMORY;
    const uint8_t *row = at + 4 * HEAD_WORDS;
    for (size_t i = 0; i < count; i++)
        if (!row_fits(mesh, row + 4 * ROW_WORDS * i))
            return RDL_BAD_MEMORY;
    if (!rdli_room_reserve(&engine->memory, &engine->crossings, count, sizeof(rdli_crossing), false))
        return RDL_NO_MEMORY;
    rdli_crossing *rows = engine->crossings.data;
    for (size_t i = 0; i < count; i++, row += 4 * ROW_WORDS) {
        rows[i].kind = get(row);
        rows[i].first = get(row + 4);
        rows[i].second = get(row + 8);
        rows[i].side = (int32_t)get(row + 12);
    }
    engine->crossing_count = count;
    engine->known = false;
    return RDL_OK;
}
