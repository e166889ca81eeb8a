/* driver/detect.c: boxes -> candidate pairs -> touches, in parallel and in a fixed order. */
#include "bounds/bounds.h"
#include "driver/engine.h"
#include "driver/watch.h"

enum { CHUNK = 512 }; /* pairs per task: enough to hide the hand-out, few enough to share evenly */
enum { BLOCK = 64 };  /* pairs that the narrow phase looks at together */

enum { PAIR_QUIET = 0, PAIR_NEAR = 1, PAIR_HIT = 2 };

/* Pairs that end this near to their floor will be pushed by their neighbours' corrections: a zone that knows them at once
 * needs no further pass to find them. */
static const double close_share = 1.01;

void rdli_pair_vertices(const rdli_mesh *mesh, uint32_t kind, uint32_t first, uint32_t second, uint32_t vertex[4])
{
    if (kind == RDL_POINT_TRIANGLE) {
        vertex[0] = first;
        for (int k = 0; k < 3; k++)
            vertex[k + 1] = mesh->triangles[second][k];
    } else {
        for (int k = 0; k < 2; k++) {
            vertex[k] = mesh->edges[first][k];
            vertex[k + 2] = mesh->edges[second][k];
        }
    }
}

double rdli_pair_gap(const rdli_mesh *mesh, uint32_t kind, uint32_t first, uint32_t second)
{
    return kind == RDL_POINT_TRIANGLE ? mesh->vertex_half[first] + mesh->triangle_half[second]
                                      : mesh->edge_half[first] + mesh->edge_half[second];
}

typedef struct sweep {
    rdl_engine *engine;
    const rdli_look *look;
    rdli_pairs pairs;
    size_t total;
    uint8_t *flags;
    rdli_counts *counts; /* per chunk */
    const uint32_t *indices;
    rdli_hit *hits;
    size_t hit_count;
} sweep;

static void pair_at(const sweep *s, size_t index, uint32_t *kind, rdli_pair *pair)
{
    size_t n = s->pairs.point_triangle_count;
    *kind = index < n ? RDL_POINT_TRIANGLE : RDL_EDGE_EDGE;
    *pair = index < n ? s->pairs.point_triangle[index] : s->pairs.edge_edge[index - n];
}

static double squeeze_of(const rdli_look *look, const uint32_t vertex[4])
{
    double factor = 1.0;
    for (int k = 0; look->squeeze != NULL && k < 4; k++)
        if (!look->fixed[vertex[k]])
            factor = fmin(factor, look->squeeze[vertex[k]]);
    return factor;
}

/* Vertices that went through driven surfaces when there was no room are free to come back. */
static bool is_released(const rdl_engine *engine, const uint32_t vertex[4])
{
    const uint8_t *released = engine->released.data, *driven = engine->mesh.driven;
    bool any_released = false, any_driven = false;
    for (int k = 0; k < 4; k++) {
        any_released = any_released || released[vertex[k]];
        any_driven = any_driven || driven[vertex[k]];
    }
    return any_released && any_driven;
}

static void load_motion(const double (*from)[3], const double (*to)[3], const uint32_t vertex[4], rdl_motion *motion)
{
    for (int k = 0; k < 4; k++) {
        memcpy(motion->start[k], from[vertex[k]], sizeof motion->start[k]);
        memcpy(motion->end[k], to[vertex[k]], sizeof motion->end[k]);
    }
}

/* Pairs of one kind, looked at together: the narrow phase takes them four at a time. */
typedef struct block {
    uint32_t kind;
    size_t count;
    size_t index[BLOCK]; /* of the pair in the sweep */
    uint32_t vertex[BLOCK][4];
    rdl_motion motion[BLOCK];
    double gap[BLOCK], squeeze[BLOCK];
    rdli_examined examined[BLOCK];
} block;

/* Adds a pair to the block, unless it is of no interest now. */
static void add_pair(const sweep *s, size_t index, block *b)
{
    const rdl_engine *engine = s->engine;
    rdli_pair pair;
    size_t at = b->count;
    pair_at(s, index, &b->kind, &pair);
    rdli_pair_vertices(&engine->mesh, b->kind, pair.first, pair.second, b->vertex[at]);
    if (engine->crossing_count > 0 && is_released(engine, b->vertex[at]))
        return;
    b->index[at] = index;
    b->squeeze[at] = squeeze_of(s->look, b->vertex[at]);
    b->gap[at] = rdli_pair_gap(&engine->mesh, b->kind, pair.first, pair.second) * b->squeeze[at];
    load_motion(s->look->from, s->look->to, b->vertex[at], &b->motion[at]);
    b->count++;
}

/* Floors are taken from the start of the step, which is not the start of every piece; and where there is no room they
 * are squeezed. Looks again at those pairs of the block that are not quiet. */
static void examine_from_start(const sweep *s, block *b)
{
    const rdl_engine *engine = s->engine;
    double share = engine->settings.path_floor_share;
    for (size_t i = 0; i < b->count; i++) {
        rdli_examined *examined = &b->examined[i];
        if (examined->quiet || (s->look->first_piece && b->squeeze[i] == 1.0))
            continue;
        double begin[4][3];
        for (int k = 0; k < 4; k++)
            memcpy(begin[k], ((const double (*)[3])engine->start.data)[b->vertex[i][k]], sizeof begin[k]);
        rdli_closest closest;
        rdli_closest_points((int)b->kind, (const double (*)[3])begin, &closest);
        double floor_distance[2] = { closest.distance_lo * b->squeeze[i], closest.distance_hi * b->squeeze[i] };
        rdli_examine((int)b->kind, &b->motion[i], b->gap[i], share, floor_distance, examined);
        if (b->squeeze[i] == 1.0 && examined->below_end) {
            /* The enclosure's upper end is a little above the exact floor: what did not move at all must not fail by that. */
            rdl_motion whole;
            memcpy(whole.start, begin, sizeof whole.start);
            memcpy(whole.end, b->motion[i].end, sizeof whole.end);
            examined->below_end = !rdli_end_keeps_floor((int)b->kind, &whole, b->gap[i]);
        }
    }
}

static void examine(const sweep *s, block *b)
{
    rdli_examine_list((int)b->kind, b->count, b->motion, b->gap, s->engine->settings.path_floor_share, NULL, b->examined);
    examine_from_start(s, b);
}

static bool is_close(const sweep *s, const rdli_examined *examined)
{
    return s->look->wants_close && examined->end_lo < close_share * examined->end_floor;
}

static void flag_block(const sweep *s, block *b, rdli_counts *counts)
{
    examine(s, b);
    for (size_t i = 0; i < b->count; i++) {
        const rdli_examined *examined = &b->examined[i];
        counts->pairs++;
        counts->decided[examined->quiet ? RDL_STAGE_DIRECTION : examined->touch.stage]++;
        if (examined->quiet)
            continue;
        counts->orders[examined->touch.order < 15 ? examined->touch.order : 15]++;
        counts->depths[examined->touch.depth < 15 ? examined->touch.depth : 15]++;
        bool hit = examined->reaches_path || examined->below_end;
        counts->touches += hit;
        bool listed = hit || examined->contact_at_start || is_close(s, examined);
        s->flags[b->index[i]] = listed ? PAIR_HIT : PAIR_NEAR;
    }
}

/* The next block: up to BLOCK pairs of one kind out of [*next, end) of the sweep, or of its list of indices. */
static bool next_block(const sweep *s, bool listed, size_t *next, size_t end, block *b)
{
    size_t split = s->pairs.point_triangle_count;
    b->count = 0;
    while (*next < end && b->count < BLOCK) {
        size_t index = listed ? s->indices[*next] : *next;
        if (b->count > 0 && (index < split) != (b->kind == RDL_POINT_TRIANGLE))
            break;
        add_pair(s, index, b);
        ++*next;
    }
    return b->count > 0;
}

static size_t chunk_end(size_t chunk, size_t total)
{
    return (chunk + 1) * CHUNK < total ? (chunk + 1) * CHUNK : total;
}

static void flag_chunk(void *data, size_t chunk, unsigned worker)
{
    (void)worker;
    sweep *s = data;
    rdli_counts *counts = &s->counts[chunk];
    size_t next = chunk * CHUNK, end = chunk_end(chunk, s->total);
    block b;
    memset(counts, 0, sizeof *counts);
    memset(s->flags + next, PAIR_QUIET, end - next);
    while (next_block(s, false, &next, end, &b))
        flag_block(s, &b, counts);
}

static void fill_hit(const sweep *s, const block *b, size_t i, rdli_hit *hit)
{
    const rdli_examined *examined = &b->examined[i];
    rdli_pair pair;
    memset(hit, 0, sizeof *hit);
    pair_at(s, b->index[i], &hit->kind, &pair);
    memcpy(hit->vertex, b->vertex[i], sizeof hit->vertex);
    hit->first = pair.first;
    hit->second = pair.second;
    hit->gap = rdli_pair_gap(&s->engine->mesh, hit->kind, pair.first, pair.second);
    hit->start_distance[0] = examined->start_lo;
    hit->start_distance[1] = examined->start_hi;
    hit->floor = examined->end_floor;
    hit->time = examined->touch.time_lo;
    hit->reaches_path = examined->reaches_path;
    hit->below_end = examined->below_end;
    hit->contact_at_start = examined->contact_at_start;
    hit->close = !examined->reaches_path && !examined->below_end && !examined->contact_at_start;
}

/* Only pairs of interest are listed, so every one of them has a place in a block. */
static void detail_chunk(void *data, size_t chunk, unsigned worker)
{
    (void)worker;
    sweep *s = data;
    size_t next = chunk * CHUNK, end = chunk_end(chunk, s->hit_count), filled = next;
    block b;
    while (next_block(s, true, &next, end, &b)) {
        examine(s, &b);
        for (size_t i = 0; i < b.count; i++)
            fill_hit(s, &b, i, &s->hits[filled++]);
    }
}

static void add_counts(rdli_counts *sum, const rdli_counts *part)
{
    sum->pairs += part->pairs;
    sum->touches += part->touches;
    for (int k = 0; k < RDL_STAGE_COUNT; k++)
        sum->decided[k] += part->decided[k];
    for (int k = 0; k < 16; k++) {
        sum->orders[k] += part->orders[k];
        sum->depths[k] += part->depths[k];
    }
}

/* Of one part of the pair list; its hits are appended. */
static rdl_status find_touches(rdl_engine *engine, sweep *s)
{
    s->total = s->pairs.point_triangle_count + s->pairs.edge_edge_count;
    if (s->total == 0)
        return RDL_OK;
    if (s->total > UINT32_MAX)
        return RDL_TOO_LARGE;
    size_t chunks = (s->total + CHUNK - 1) / CHUNK;
    if (!rdli_room_reserve(&engine->memory, &engine->flags, s->total, 1, false)
        || !rdli_room_reserve(&engine->memory, &engine->chunk_counts, chunks, sizeof(rdli_counts), false))
        return RDL_NO_MEMORY;
    s->flags = engine->flags.data;
    s->counts = engine->chunk_counts.data;
    rdli_parallel_for(engine->workers, chunks, flag_chunk, s);
    for (size_t c = 0; c < chunks; c++)
        add_counts(&engine->counts, &s->counts[c]);
    size_t count = 0;
    const size_t before = engine->hit_count;
    for (size_t i = 0; i < s->total; i++)
        count += s->flags[i] == PAIR_HIT;
    if (!rdli_room_reserve(&engine->memory, &engine->indices, count, sizeof(uint32_t), false)
        || !rdli_room_reserve(&engine->memory, &engine->hits, before + count, sizeof(rdli_hit),
                              before > 0))
        return RDL_NO_MEMORY;
    uint32_t *indices = engine->indices.data;
    size_t next = 0;
    for (size_t i = 0; i < s->total; i++)
        if (s->flags[i] == PAIR_HIT)
            indices[next++] = (uint32_t)i;
    s->indices = indices;
    s->hits = (rdli_hit *)engine->hits.data + before;
    s->hit_count = count;
    rdli_parallel_for(engine->workers, (count + CHUNK - 1) / CHUNK, detail_chunk, s);
    engine->hit_count = before + count;
    for (size_t h = 0; h < count; h++)
        engine->violation_count += !s->hits[h].close;
    return RDL_OK;
}

rdl_status rdli_detect(rdl_engine *engine, const rdli_look *look)
{
    engine->hit_count = engine->violation_count = 0;
    if (rdli_cancelled(engine->workers))
        return RDL_CANCELLED;
    double begun = rdli_now();
    rdli_motion motion = { look->from, look->to, look->awake };
    rdli_mesh mesh = engine->mesh;
    mesh.driven = look->fixed; /* pairs among fixed vertices alone are of no interest now */
    rdli_bounds_fill(&mesh, &motion, engine->workers, &engine->boxes);
    double boxed = rdli_now();
    sweep s = { .engine = engine, .look = look };
    rdl_status status = rdli_broad_near_pairs(engine->broad, &mesh, &motion, &engine->boxes, &s.pairs);
    double paired = rdli_now();
    engine->seconds[RDL_TIME_BOXES] += boxed - begun;
    engine->seconds[RDL_TIME_PAIRS] += paired - boxed;
    if (status == RDL_OK)
        rdli_watch_boxes(engine);
    while (status == RDL_OK) {
        rdli_watch_pairs(engine, &s.pairs);
        status = find_touches(engine, &s);
        double decided = rdli_now();
        engine->seconds[RDL_TIME_TOUCHES] += decided - paired;
        if (status != RDL_OK || !s.pairs.more)
            break;
        status = rdli_broad_more(engine->broad, &mesh, &s.pairs);
        paired = rdli_now();
        engine->seconds[RDL_TIME_PAIRS] += paired - decided;
    }
    if (status == RDL_OK)
        rdli_watch_touches(engine);
    engine->watch_detections++;
    return status;
}
