/* broad/selfpairs.c: see selfpairs.h. */
#include "broad/selfpairs.h"

#include "broad/kernels.h"

enum { CORNERS = 4 };

struct rdli_selfpairs {
    rdli_memory *memory;
    rdli_workers *workers;
    const rdli_kernels *kernels;
    rdli_tree tree;
    rdli_query query;
    rdli_room corner_room;
};

rdl_status rdli_selfpairs_create(rdli_memory *memory, rdli_workers *workers, const rdl_box *boxes, uint32_t count,
                                 rdli_selfpairs **pairs)
{
    rdli_selfpairs *made = rdli_take(memory, 1, sizeof *made);
    if (made == NULL)
        return RDL_NO_MEMORY;
    memset(made, 0, sizeof *made);
    made->memory = memory;
    made->workers = workers;
    made->kernels = rdli_kernels_choose(true);
    rdl_status status = rdli_tree_build(memory, workers, made->kernels, &made->tree, boxes, count);
    if (status != RDL_OK) {
        rdli_selfpairs_destroy(made);
        return status;
    }
    *pairs = made;
    return RDL_OK;
}

void rdli_selfpairs_use_vector(rdli_selfpairs *pairs, bool vector)
{
    pairs->kernels = rdli_kernels_choose(vector);
}

void rdli_selfpairs_update(rdli_selfpairs *pairs, const rdl_box *boxes)
{
    rdli_tree_update(pairs->workers, pairs->kernels, &pairs->tree, boxes);
}

/* Corners in use: a last column that repeats the first everywhere need not be compared. */
static unsigned corners_in_use(const uint32_t *corners, uint32_t count)
{
    for (unsigned c = CORNERS - 1; c > 0; c--)
        for (uint32_t e = 0; e < count; e++)
            if (corners[(size_t)e * CORNERS + c] != corners[(size_t)e * CORNERS])
                return c + 1;
    return 1;
}

static rdl_status set_corners(rdli_selfpairs *pairs, const uint32_t *corners)
{
    rdli_side *side = &pairs->query.a;
    const rdli_tree *tree = &pairs->tree;
    side->tree = tree;
    side->corner_count = corners == NULL ? 0 : corners_in_use(corners, tree->count);
    side->corners = NULL;
    if (corners != NULL && tree->count > 0) {
        size_t packs = tree->pack_count[0];
        unsigned used = side->corner_count;
        if (!rdli_room_reserve(pairs->memory, &pairs->corner_room, packs * RDLI_WIDE * used, sizeof(uint32_t), false))
            return RDL_NO_MEMORY;
        uint32_t *to = pairs->corner_room.data;
        for (size_t p = 0; p < packs; p++)
            for (unsigned c = 0; c < used; c++)
                for (unsigned i = 0; i < RDLI_WIDE; i++)
                    *to++ = corners[(size_t)tree->order[p * RDLI_WIDE + i] * CORNERS + c];
        side->corners = pairs->corner_room.data;
    }
    pairs->query.b = *side;
    return RDL_OK;
}

rdl_status rdli_selfpairs_find(rdli_selfpairs *pairs, const uint32_t *corners, const rdli_pair **list, size_t *count)
{
    rdl_status status = set_corners(pairs, corners);
    if (status != RDL_OK)
        return status;
    pairs->query.self = true;
    pairs->query.range_lo = 0;
    pairs->query.range_hi = INT32_MAX;
    status = rdli_query_run(pairs->memory, pairs->workers, pairs->kernels, &pairs->query, count);
    if (status != RDL_OK)
        return status;
    return rdli_rows_list(pairs->memory, pairs->workers, &pairs->query.rows, list);
}

void rdli_selfpairs_destroy(rdli_selfpairs *pairs)
{
    if (pairs == NULL)
        return;
    rdli_tree_release(pairs->memory, &pairs->tree);
    rdli_query_release(pairs->memory, &pairs->query);
    rdli_room_release(pairs->memory, &pairs->corner_room);
    rdli_give(pairs->memory, pairs, 1, sizeof *pairs);
}
