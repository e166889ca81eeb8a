/* driver/watch.c: see watch.h. Events leave in blocks, so that nothing is allocated. */
#include "driver/watch.h"

#include "driver/create.h"

enum { BLOCK = 128 };

typedef struct teller {
    const rdl_engine *engine;
    size_t count;
    rdl_event events[BLOCK];
} teller;

static void flush(teller *t)
{
    const rdl_watch *watches = t->engine->watches.data;
    for (size_t w = 0; t->count > 0 && w < t->engine->watch_count; w++)
        if (watches[w].events != NULL)
            watches[w].events(watches[w].user, t->events, t->count);
    t->count = 0;
}

static rdl_event *tell(teller *t, uint32_t stage, uint32_t kind, uint32_t first, uint32_t second)
{
    if (t->count == BLOCK)
        flush(t);
    rdl_event *event = &t->events[t->count++];
    memset(event, 0, sizeof *event);
    event->stage = stage;
    /* Zones and pieces follow a detection that is over. */
    event->detection = (uint32_t)t->engine->watch_detections - (stage >= RDL_EVENT_ZONE ? 1 : 0);
    event->kind = kind;
    event->first = first;
    event->second = second;
    return event;
}

/* The boxes are those of a moving frame; what is told encloses them all the way. */
static void tell_boxes(teller *t, uint32_t kind, const rdl_box *boxes, uint32_t count)
{
    const double *shift = t->engine->boxes.shift;
    for (uint32_t i = 0; i < count; i++) {
        rdl_event *event = tell(t, RDL_EVENT_BOX, kind, i, 0);
        for (int k = 0; k < 3; k++) {
            event->value[k] = (double)boxes[i].lo[k] + fmin(shift[k], 0.0);
            event->value[k + 3] = (double)boxes[i].hi[k] + fmax(shift[k], 0.0);
        }
    }
}

static void tell_pairs(teller *t, uint32_t kind, const rdli_pair *pairs, size_t count)
{
    for (size_t i = 0; i < count; i++)
        tell(t, RDL_EVENT_PAIR, kind, pairs[i].first, pairs[i].second);
}

void rdli_watch_boxes(const rdl_engine *engine)
{
    if (!engine->watch_events || engine->watch_detections != 0)
        return;
    teller t;
    t.engine = engine;
    t.count = 0;
    tell_boxes(&t, 0, engine->boxes.vertices, engine->mesh.vertex_count);
    tell_boxes(&t, 1, engine->boxes.edges, engine->mesh.edge_count);
    tell_boxes(&t, 2, engine->boxes.triangles, engine->mesh.triangle_count);
    flush(&t);
}

void rdli_watch_pairs(const rdl_engine *engine, const rdli_pairs *pairs)
{
    if (!engine->watch_events)
        return;
    teller t;
    t.engine = engine;
    t.count = 0;
    tell_pairs(&t, RDL_POINT_TRIANGLE, pairs->point_triangle, pairs->point_triangle_count);
    tell_pairs(&t, RDL_EDGE_EDGE, pairs->edge_edge, pairs->edge_edge_count);
    flush(&t);
}

void rdli_watch_touches(const rdl_engine *engine)
{
    if (!engine->watch_events)
        return;
    teller t;
    t.engine = engine;
    t.count = 0;
    const rdli_hit *hits = engine->hits.data;
    for (size_t h = 0; h < engine->hit_count; h++) {
        rdl_event *event = tell(&t, RDL_EVENT_TOUCH, hits[h].kind, hits[h].first, hits[h].second);
        event->value[0] = hits[h].time;
        event->value[1] = hits[h].gap;
        event->value[2] = hits[h].floor;
        event->value[3] = hits[h].start_distance[0];
        event->value[4] = (hits[h].reaches_path ? RDL_TOUCH_PATH : 0) + (hits[h].below_end ? RDL_TOUCH_END : 0) +
                          (hits[h].contact_at_start ? RDL_TOUCH_AT_START : 0) + (hits[h].close ? RDL_TOUCH_CLOSE : 0);
    }
    flush(&t);
}

void rdli_watch_zones(const rdl_engine *engine)
{
    if (!engine->watch_events)
        return;
    teller t;
    t.engine = engine;
    t.count = 0;
    const rdli_zone *zones = engine->response.zones.data;
    const uint32_t *order = engine->response.zone_contacts.data;
    const rdli_contact *contacts = engine->contacts.data;
    for (uint32_t z = 0; z < engine->response.zone_count; z++) {
        rdl_event *event = tell(&t, RDL_EVENT_ZONE, zones[z].level, z, 0);
        event->value[0] = zones[z].vertex_count;
        event->value[1] = zones[z].contact_count;
        event->value[2] = zones[z].driven;
        event->value[3] = zones[z].violated;
        event->value[4] = zones[z].settled;
        for (uint32_t i = 0; i < zones[z].contact_count; i++) {
            const rdli_contact *contact = &contacts[order[zones[z].contact_first + i]];
            event = tell(&t, RDL_EVENT_MEMBER, contact->kind, contact->first, contact->second);
            event->value[0] = z;
            event->value[1] = contact->violated;
        }
    }
    flush(&t);
}

void rdli_watch_piece(const rdl_engine *engine, uint32_t what, double reached, double length)
{
    if (!engine->watch_events)
        return;
    teller t;
    t.engine = engine;
    t.count = 0;
    rdl_event *event = tell(&t, RDL_EVENT_PIECE, what, 0, 0);
    event->value[0] = reached;
    event->value[1] = length;
    flush(&t);
}

rdl_status rdli_watch_begin(rdl_engine *engine)
{
    engine->watch_detections = 0;
    if (engine->watch_count == 0)
        return RDL_OK;
    size_t bytes = rdli_memory_block_bytes(engine);
    if (!rdli_room_reserve(&engine->memory, &engine->watch_memory, bytes, 1, false))
        return RDL_NO_MEMORY;
    rdli_memory_block_write(engine, engine->watch_memory.data);
    engine->watch_memory_bytes = bytes;
    return RDL_OK;
}

void rdli_watch_stepped(rdl_engine *engine, const rdl_step *step, const rdl_report *report)
{
    const rdl_watch *watches = engine->watches.data;
    const rdl_watched_step watched = {.step = step,
                                      .report = report,
                                      .start = engine->start.data,
                                      .proposed = engine->proposed.data,
                                      .delivered = engine->trial.data,
                                      .memory = engine->watch_memory.data,
                                      .memory_bytes = engine->watch_memory_bytes};
    for (size_t w = 0; w < engine->watch_count; w++)
        if (watches[w].stepped != NULL)
            watches[w].stepped(watches[w].user, &watched);
}
