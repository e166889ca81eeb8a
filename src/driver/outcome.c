/* driver/outcome.c: what a step's report says. */
#include "outcome/verdict.h"

#include "base/vector.h"
#include "driver/stages.h"

void rdli_outcome_begin(rdl_engine *engine)
{
    size_t n = engine->mesh.vertex_count;
    const double (*start)[3] = engine->start.data, (*proposed)[3] = engine->proposed.data;
    double (*velocity)[3] = engine->velocity.data;
    for (size_t v = 0; v < n; v++)
        rdli_subtract(proposed[v], start[v], velocity[v]);
    engine->waypoint_count = engine->out_contact_count = engine->out_zone_count = 0;
    engine->named_count = engine->held_count = 0;
    engine->passes = engine->attempts = 0;
    memset(engine->level_zones, 0, sizeof engine->level_zones);
    memset(engine->seconds, 0, sizeof engine->seconds);
    memset(&engine->counts, 0, sizeof engine->counts);
    memset(&engine->ledger, 0, sizeof engine->ledger);
    memset(engine->angular_drift, 0, sizeof engine->angular_drift);
}

static void book_contact(rdl_engine *engine, const rdli_contact *contact, const rdli_plane *plane, double impulse,
                         double begun, double length)
{
    rdl_contact *row = (rdl_contact *)engine->out_contacts.data + engine->out_contact_count++;
    memset(row, 0, sizeof *row);
    row->kind = contact->kind;
    row->first = contact->first;
    row->second = contact->second;
    row->zone = (uint32_t)engine->out_zone_count; /* zones are booked one after the other: see book_zones */
    memcpy(row->vertices, contact->vertex, sizeof row->vertices);
    memcpy(row->weights, plane->weight, sizeof row->weights);
    memcpy(row->normal, plane->normal, sizeof row->normal);
    row->time = begun + length * contact->time;
    row->impulse = impulse;
}

static double worst_correction(const rdl_engine *engine, const rdli_piece *piece, const rdli_zone *zone)
{
    const uint32_t *vertices = (const uint32_t *)engine->response.zone_vertices.data + zone->vertex_first;
    double worst = 0.0;
    for (uint32_t i = 0; i < zone->vertex_count; i++) {
        double moved[3];
        rdli_subtract(piece->trial[vertices[i]], piece->target[vertices[i]], moved);
        worst = fmax(worst, rdli_length(moved));
    }
    return worst;
}

static void book_zone(rdl_engine *engine, const rdli_piece *piece, rdli_zone *zone, uint32_t loaded, double length)
{
    rdli_zone_energies(&engine->response, piece, zone);
    rdl_zone *row = (rdl_zone *)engine->out_zones.data + engine->out_zone_count++;
    memset(row, 0, sizeof *row);
    row->vertex_count = zone->vertex_count;
    row->contact_count = loaded;
    row->level = length < 1.0 && zone->level < RDL_LEVEL_RIGID ? RDL_LEVEL_SUBSTEP : zone->level;
    row->passes = (uint32_t)engine->passes;
    row->touches_driven = zone->driven;
    row->worst_correction = worst_correction(engine, piece, zone);
    row->residual = zone->residual;
    row->momentum_error = zone->momentum_error;
    row->energy_change = zone->energy_after - zone->energy_before;
    engine->level_zones[row->level]++;
    if (zone->driven)
        engine->ledger.driven += row->energy_change;
    else
        engine->ledger.zones += row->energy_change;
}

static void book_zones(rdl_engine *engine, const rdli_piece *piece, double begun, double length)
{
    rdli_zone *zones = engine->response.zones.data;
    const uint32_t *order = engine->response.zone_contacts.data;
    const rdli_contact *contacts = engine->contacts.data;
    const double *impulse = engine->impulse.data;
    for (uint32_t z = 0; z < engine->response.zone_count; z++) {
        uint32_t loaded = 0;
        for (uint32_t i = 0; i < zones[z].contact_count; i++) {
            uint32_t c = order[zones[z].contact_first + i];
            for (uint8_t k = 0; k < contacts[c].plane_count; k++)
                if (impulse[RDLI_PLANES * c + k] >= 0.0) {
                    book_contact(engine, &contacts[c], &contacts[c].plane[k], impulse[RDLI_PLANES * c + k], begun, length);
                    loaded++;
                }
        }
        if (loaded > 0)
            book_zone(engine, piece, &zones[z], loaded, length);
    }
}

rdl_status rdli_outcome_piece(rdl_engine *engine, const rdli_piece *piece, double length)
{
    size_t count = engine->contact_count, zones = engine->response.zone_count;
    if (count == 0)
        return RDL_OK;
    if (!rdli_room_reserve(&engine->memory, &engine->impulse, RDLI_PLANES * count, sizeof(double), false)
        || !rdli_room_reserve(&engine->memory, &engine->out_contacts, engine->out_contact_count + RDLI_PLANES * count,
                              sizeof(rdl_contact), true)
        || !rdli_room_reserve(&engine->memory, &engine->out_zones, engine->out_zone_count + zones, sizeof(rdl_zone), true))
        return RDL_NO_MEMORY;
    /* Central impulses need the contact points of the delivered positions. */
    rdli_contacts_expand(engine, piece, true);
    rdl_status status = rdli_zones_impulses(&engine->response, piece, engine->contacts.data, count,
                                            engine->settings.restitution, length, engine->velocity.data,
                                            engine->impulse.data);
    double begun = engine->waypoint_count > 0
        ? ((const double *)engine->waypoint_times.data)[engine->waypoint_count - 1] : 0.0;
    if (status == RDL_OK)
        book_zones(engine, piece, begun, length);
    return status;
}

static rdl_status list_held(rdl_engine *engine)
{
    size_t n = engine->mesh.vertex_count;
    const uint8_t *fixed = engine->fixed.data, *driven = engine->driven.data;
    size_t count = 0;
    for (size_t v = 0; v < n; v++)
        count += fixed[v] && !driven[v];
    if (!rdli_room_reserve(&engine->memory, &engine->held, count, sizeof(uint32_t), false))
        return RDL_NO_MEMORY;
    uint32_t *held = engine->held.data;
    for (size_t v = 0; v < n; v++)
        if (fixed[v] && !driven[v])
            held[engine->held_count++] = (uint32_t)v;
    engine->level_zones[RDL_LEVEL_HOLD] = count > 0;
    return RDL_OK;
}

/* Impulses in kg m/s; what a held vertex loses is its whole proposed velocity. */
static void finish_impulses(rdl_engine *engine, double duration)
{
    size_t n = engine->mesh.vertex_count;
    const double (*start)[3] = engine->start.data, (*proposed)[3] = engine->proposed.data;
    const double (*trial)[3] = engine->trial.data, (*velocity)[3] = engine->velocity.data;
    const double *mass = engine->mass.data;
    const uint8_t *fixed = engine->fixed.data, *driven = engine->driven.data;
    double (*impulses)[3] = engine->impulses.data;
    for (size_t v = 0; v < n; v++)
        for (int k = 0; k < 3; k++) {
            double wanted = fixed[v] ? trial[v][k] - start[v][k] : velocity[v][k];
            impulses[v][k] = driven[v] ? 0.0 : mass[v] * (wanted - (proposed[v][k] - start[v][k])) / duration;
        }
    for (size_t v = 0; v < n; v++) {
        double shift[3], by_place[3], by_impulse[3];
        if (driven[v])
            continue;
        rdli_subtract(trial[v], proposed[v], shift);
        rdli_cross(trial[v], shift, by_place);
        rdli_cross(trial[v], impulses[v], by_impulse);
        for (int k = 0; k < 3; k++)
            engine->angular_drift[k] += mass[v] * by_place[k] / duration - by_impulse[k];
    }
    rdl_contact *contacts = engine->out_contacts.data;
    for (size_t c = 0; c < engine->out_contact_count; c++)
        contacts[c].impulse /= duration;
}

/* The columns add up to the change of kinetic energy that the delivered displacements show against the proposed ones:
 * what no zone booked is the work of rounding and of what driven vertices dragged along. */
static void finish_ledger(rdl_engine *engine, double duration)
{
    size_t n = engine->mesh.vertex_count;
    const double (*start)[3] = engine->start.data, (*proposed)[3] = engine->proposed.data;
    const double (*trial)[3] = engine->trial.data;
    const double *mass = engine->mass.data;
    const uint8_t *driven = engine->driven.data;
    double change = 0.0;
    for (size_t v = 0; v < n; v++) {
        double meant[3], moved[3];
        if (driven[v])
            continue;
        rdli_subtract(proposed[v], start[v], meant);
        rdli_subtract(trial[v], start[v], moved);
        change += 0.5 * mass[v] * (rdli_dot(moved, moved) - rdli_dot(meant, meant));
    }
    bool whole = engine->waypoint_count == 0 && engine->held_count == 0;
    double *rest = whole ? &engine->ledger.rounding : &engine->ledger.driven;
    *rest += change - engine->ledger.zones - engine->ledger.driven;
    double scale = 1.0 / (duration * duration);
    engine->ledger.zones *= scale;
    engine->ledger.driven *= scale;
    engine->ledger.rounding *= scale;
    rdl_zone *zones = engine->out_zones.data;
    for (size_t z = 0; z < engine->out_zone_count; z++)
        zones[z].energy_change *= scale;
}

rdl_status rdli_outcome_end(rdl_engine *engine, double duration, rdl_verdict *verdict)
{
    size_t n = engine->mesh.vertex_count;
    rdl_status status = list_held(engine);
    if (status != RDL_OK)
        return status;
    rdli_sort_named(engine->named.data, &engine->named_count);
    bool moved_any = rdli_mark_moved(engine->proposed.data, engine->trial.data, n, engine->moved.data);
    finish_impulses(engine, duration);
    finish_ledger(engine, duration);
    *verdict = rdli_verdict_of(engine->named.data, engine->named_count, moved_any);
    return RDL_OK;
}
