/* driver/engine.c: making an engine, loading a step, filling the report. */
#include "driver/engine.h"

#include "base/rounding.h"
#include "driver/create.h"
#include "outcome/verdict.h"

static rdl_status reserve_all(rdl_engine *engine)
{
    const rdli_mesh *mesh = &engine->scene.mesh;
    size_t n = mesh->vertex_count, words = ((size_t)mesh->part_count * mesh->part_count + 63) / 64;
    const struct { rdli_room *room; size_t count, item; } wanted[] = {
        { &engine->box_room[0], n, sizeof(rdl_box) },
        { &engine->box_room[1], mesh->edge_count, sizeof(rdl_box) },
        { &engine->box_room[2], mesh->triangle_count, sizeof(rdl_box) },
        { &engine->muted, words, sizeof(uint64_t) },
        { &engine->mass, n, sizeof(double) },
        { &engine->driven, n, 1 },
        { &engine->fixed, n, 1 },
        { &engine->awake, n, 1 },
        { &engine->touched, n, 1 },
        { &engine->released, n, 1 },
        { &engine->moved, n, 1 },
        { &engine->squeeze, n, sizeof(double) },
        { &engine->start, n, 3 * sizeof(double) },
        { &engine->proposed, n, 3 * sizeof(double) },
        { &engine->piece_start, n, 3 * sizeof(double) },
        { &engine->target, n, 3 * sizeof(double) },
        { &engine->trial, n, 3 * sizeof(double) },
        { &engine->certified, n, 3 * sizeof(double) },
        { &engine->velocity, n, 3 * sizeof(double) },
        { &engine->impulses, n, 3 * sizeof(double) },
        { &engine->last, n, 3 * sizeof(double) },
    };
    for (size_t k = 0; k < sizeof wanted / sizeof wanted[0]; k++)
        if (!rdli_room_reserve(&engine->memory, wanted[k].room, wanted[k].count, wanted[k].item, false))
            return RDL_NO_MEMORY;
    engine->boxes.vertices = engine->box_room[0].data;
    engine->boxes.edges = engine->box_room[1].data;
    engine->boxes.triangles = engine->box_room[2].data;
    memset(engine->moved.data, 0, n);
    memset(engine->released.data, 0, n);
    return RDL_OK;
}

rdl_status rdli_engine_create(const rdl_scene *scene, const rdl_settings *settings, const rdl_host *host,
                              rdl_engine **out, rdl_fault *fault)
{
    rdli_memory memory;
    if (rdli_memory_init(&memory, host) != RDL_OK)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "host", 0);
    rdl_status status = rdli_scene_check(scene, &memory, fault);
    if (status != RDL_OK)
        return status;
    rdl_engine *engine = rdli_take(&memory, 1, sizeof *engine);
    if (engine == NULL)
        return RDL_NO_MEMORY;
    memset(engine, 0, sizeof *engine);
    engine->memory = memory;
    if (host != NULL)
        memcpy(&engine->host, host, sizeof engine->host);
    engine->settings = *settings;
    status = rdli_workers_create(&engine->memory, host != NULL ? &engine->host : NULL, &engine->workers);
    if (status == RDL_OK)
        status = rdli_scene_build(&engine->scene, scene, &engine->memory);
    if (status == RDL_OK)
        status = rdli_broad_create(&engine->memory, engine->workers, &engine->broad);
    if (status == RDL_OK)
        rdli_broad_use_vector(engine->broad, engine->settings.vector != 0.0);
    if (status == RDL_OK)
        status = reserve_all(engine);
    rdli_response_init(&engine->response, &engine->memory, engine->workers);
    if (status != RDL_OK) {
        rdli_engine_destroy(engine);
        return status;
    }
    *out = engine;
    return RDL_OK;
}

void rdli_engine_destroy(rdl_engine *engine)
{
    rdli_memory *memory = &engine->memory;
    rdli_room *rooms[] = { &engine->box_room[0], &engine->box_room[1], &engine->box_room[2], &engine->muted, &engine->mass,
        &engine->driven, &engine->fixed, &engine->awake, &engine->touched, &engine->released, &engine->moved, &engine->squeeze,
        &engine->start, &engine->proposed, &engine->piece_start, &engine->target, &engine->trial, &engine->certified, &engine->velocity,
        &engine->impulses, &engine->last, &engine->flags, &engine->indices, &engine->hits, &engine->chunk_counts,
        &engine->contacts, &engine->merged, &engine->waypoint_times, &engine->waypoint_positions, &engine->out_contacts,
        &engine->out_zones, &engine->named, &engine->held, &engine->impulse, &engine->crossings,
        &engine->watches, &engine->watch_memory };
    if (engine->response.memory != NULL)
        rdli_response_release(&engine->response);
    if (engine->broad != NULL)
        rdli_broad_destroy(engine->broad);
    for (size_t k = 0; k < sizeof rooms / sizeof rooms[0]; k++)
        rdli_room_release(memory, rooms[k]);
    rdli_scene_release(&engine->scene, memory);
    rdli_workers_destroy(memory, engine->workers);
    rdli_memory last = *memory;
    rdli_give(&last, engine, 1, sizeof *engine);
}

static rdl_status check_rules(const rdl_engine *engine, const rdl_step *step, rdl_fault *fault)
{
    if (!(step->duration > 0.0) || !isfinite(step->duration))
        return rdli_fault_set(fault, isfinite(step->duration) ? RDL_OUT_OF_RANGE : RDL_NOT_FINITE, "duration", 0);
    if (!(step->seconds_max >= 0.0))
        return rdli_fault_set(fault, RDL_OUT_OF_RANGE, "seconds_max", 0);
    if (step->muted_count > 0 && step->muted_parts == NULL)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "muted_parts", 0);
    for (size_t k = 0; k < step->muted_count; k++)
        if (step->muted_parts[k][0] >= engine->scene.mesh.part_count
            || step->muted_parts[k][1] >= engine->scene.mesh.part_count)
            return rdli_fault_set(fault, RDL_OUT_OF_RANGE, "muted_parts", k);
    return RDL_OK;
}

/* In float a proposed double may have no neighbour. */
static rdl_status check_range(const rdl_engine *engine, rdl_fault *fault)
{
    const double (*proposed)[3] = engine->proposed.data;
    for (size_t v = 0; engine->format == RDL_FLOAT32 && v < engine->scene.mesh.vertex_count; v++)
        for (int k = 0; k < 3; k++)
            if (fabs(proposed[v][k]) > (double)FLT_MAX)
                return rdli_fault_set(fault, RDL_OUT_OF_RANGE, "proposed", v);
    return RDL_OK;
}

rdl_status rdli_step_load(rdl_engine *engine, const rdl_step *step, bool wants_output, rdl_fault *fault)
{
    const rdli_mesh *mesh = &engine->scene.mesh;
    size_t n = mesh->vertex_count, words = ((size_t)mesh->part_count * mesh->part_count + 63) / 64;
    rdl_status status = check_rules(engine, step, fault);
    if (status == RDL_OK)
        status = rdli_view_check(&step->start, n, "start", fault);
    if (status == RDL_OK)
        status = rdli_view_check(&step->proposed, n, "proposed", fault);
    if (status == RDL_OK && wants_output)
        status = rdli_output_check(&step->delivered, "delivered", fault);
    if (status == RDL_OK && step->mass != NULL)
        status = rdli_mass_check(step->mass, n, fault);
    if (status != RDL_OK)
        return status;
    engine->format = wants_output ? step->delivered.format : RDL_FLOAT64;
    rdli_view_read(&step->start, n, engine->start.data);
    rdli_view_read(&step->proposed, n, engine->proposed.data);
    status = check_range(engine, fault);
    if (status != RDL_OK)
        return status;
    double (*proposed)[3] = engine->proposed.data;
    for (size_t v = 0; v < n; v++)
        for (int k = 0; k < 3; k++)
            proposed[v][k] = rdli_round_to(engine->format, proposed[v][k]);
    memcpy(engine->mass.data, step->mass != NULL ? step->mass : engine->scene.mass.data, n * sizeof(double));
    uint8_t *driven = engine->driven.data;
    for (size_t v = 0; v < n; v++)
        driven[v] = isinf(((const double *)engine->mass.data)[v]) ? 1 : 0;
    memcpy(engine->muted.data, mesh->muted, words * sizeof(uint64_t));
    for (size_t k = 0; k < step->muted_count; k++)
        rdli_mute(engine->muted.data, mesh->part_count, step->muted_parts[k][0], step->muted_parts[k][1]);
    engine->mesh = *mesh;
    engine->mesh.driven = driven;
    engine->mesh.muted = engine->muted.data;
    return RDL_OK;
}

void rdli_report_fill(const rdl_engine *engine, rdl_verdict verdict, rdl_report *report)
{
    rdl_report r = { .size = report->size, .verdict = verdict };
    r.threads = rdli_workers_count(engine->workers);
    r.pairs = engine->counts.pairs;
    r.touches = engine->counts.touches;
    r.contact_count = engine->out_contact_count;
    r.zone_count = engine->out_zone_count;
    r.passes = engine->passes;
    r.substeps = engine->waypoint_count + 1;
    memcpy(r.level_zones, engine->level_zones, sizeof r.level_zones);
    memcpy(r.seconds, engine->seconds, sizeof r.seconds);
    rdli_corrections(engine->proposed.data, engine->trial.data, engine->driven.data, engine->mesh.vertex_count,
                     &r.worst_correction, &r.mean_correction);
    r.contacts = engine->out_contacts.data;
    r.zones = engine->out_zones.data;
    r.named = engine->named.data;
    r.named_count = engine->named_count;
    r.held = engine->held.data;
    r.held_count = engine->held_count;
    r.moved = engine->moved.data;
    r.waypoint_count = engine->waypoint_count;
    r.waypoint_times = engine->waypoint_times.data;
    r.waypoint_positions = engine->waypoint_positions.data;
    r.impulses = engine->impulses.data;
    memcpy(r.decided, engine->counts.decided, sizeof r.decided);
    memcpy(r.orders, engine->counts.orders, sizeof r.orders);
    memcpy(r.depths, engine->counts.depths, sizeof r.depths);
    r.ledger = engine->ledger;
    memcpy(r.angular_drift, engine->angular_drift, sizeof r.angular_drift);
    r.bytes_in_use = engine->memory.bytes_in_use;
    /* A caller built against a shorter struct gets what it knows. */
    memcpy(report, &r, report->size < sizeof r ? report->size : sizeof r);
}
