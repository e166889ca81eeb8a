/* api/watch.c: rdl_engine_watch, rdl_engine_unwatch. */
#include "driver/watch.h"

static void note_events(rdl_engine *engine)
{
    const rdl_watch *watches = engine->watches.data;
    engine->watch_events = false;
    for (size_t w = 0; w < engine->watch_count; w++)
        engine->watch_events = engine->watch_events || watches[w].events != NULL;
}

rdl_status rdl_engine_watch(rdl_engine *engine, const rdl_watch *watch)
{
    if (engine == NULL || watch == NULL || watch->size < sizeof *watch)
        return RDL_BAD_ARGUMENT;
    size_t count = engine->watch_count;
    if (!rdli_room_reserve(&engine->memory, &engine->watches, count + 1, sizeof *watch, true))
        return RDL_NO_MEMORY;
    memcpy((rdl_watch *)engine->watches.data + count, watch, sizeof *watch);
    engine->watch_count = count + 1;
    note_events(engine);
    return RDL_OK;
}

void rdl_engine_unwatch(rdl_engine *engine, const void *user)
{
    if (engine == NULL)
        return;
    rdl_watch *watches = engine->watches.data;
    size_t kept = 0;
    for (size_t w = 0; w < engine->watch_count; w++)
        if (watches[w].user != user)
            watches[kept++] = watches[w];
    engine->watch_count = kept;
    note_events(engine);
}
