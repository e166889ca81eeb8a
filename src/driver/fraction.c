/* driver/fraction.c: how far the straight motion is certified. */
#include "driver/create.h"

rdl_status rdli_safe_fraction(rdl_engine *engine, double *fraction)
{
    memset(&engine->counts, 0, sizeof engine->counts);
    memset(engine->released.data, 0, engine->mesh.vertex_count);
    rdli_look look = { .from = engine->start.data, .to = engine->proposed.data, .fixed = engine->mesh.driven,
        .first_piece = true };
    rdl_status status = rdli_detect(engine, &look);
    if (status != RDL_OK)
        return status;
    double share = 1.0;
    const rdli_hit *hits = engine->hits.data;
    /* Ends below the end floor are no obstacle here: the path floor is what a shorter motion keeps. */
    for (size_t h = 0; h < engine->hit_count; h++)
        if (hits[h].reaches_path && hits[h].time < share)
            share = hits[h].time;
    *fraction = share;
    return RDL_OK;
}
