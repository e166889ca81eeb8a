/* driver/contacts.c: the contact list of a piece: merging hits, first-order expansions. */
#include "driver/engine.h"

enum { CHUNK = 64 };

static int compare(const rdli_contact *contact, const rdli_hit *hit)
{
    if (contact->kind != hit->kind)
        return contact->kind < hit->kind ? -1 : 1;
    if (contact->first != hit->first)
        return contact->first < hit->first ? -1 : 1;
    if (contact->second != hit->second)
        return contact->second < hit->second ? -1 : 1;
    return 0;
}

static void positions_at(const rdli_piece *piece, const uint32_t vertex[4], double time, double x[4][3])
{
    for (int i = 0; i < 4; i++)
        for (int k = 0; k < 3; k++) {
            double from = piece->start[vertex[i]][k], to = piece->trial[vertex[i]][k];
            x[i][k] = time >= 1.0 ? to : (1.0 - time) * from + time * to;
        }
}

static bool expand_at(const rdli_piece *piece, const rdli_contact *contact, double time, rdli_plane *plane)
{
    double x[4][3];
    rdli_closest closest;
    positions_at(piece, contact->vertex, time, x);
    rdli_closest_points((int)contact->kind, (const double (*)[3])x, &closest);
    if (closest.distance_hi == 0.0)
        return false; /* no direction here: the last one stays */
    memcpy(plane->normal, closest.normal, sizeof plane->normal);
    memcpy(plane->weight, closest.weight, sizeof plane->weight);
    return true;
}

static void start_contact(const rdli_piece *piece, const rdli_hit *hit, rdli_contact *contact)
{
    memset(contact, 0, sizeof *contact);
    contact->kind = hit->kind;
    contact->first = hit->first;
    contact->second = hit->second;
    memcpy(contact->vertex, hit->vertex, sizeof contact->vertex);
    contact->gap = hit->gap;
    memcpy(contact->start_distance, hit->start_distance, sizeof contact->start_distance);
    contact->time = 1.0;
    rdli_plane begin = { { 0.0, 0.0, 0.0 }, { 0.0, 0.0, 0.0, 0.0 }, 0.0 };
    expand_at(piece, contact, 0.0, &begin);
    memcpy(contact->fence, begin.normal, sizeof contact->fence);
    contact->plane = begin;
}

static void strike(const rdli_piece *piece, const rdli_hit *hit, rdli_contact *contact)
{
    contact->violated = 1;
    contact->clean = 0;
    contact->settled = 0;
    contact->floor = hit->floor;
    contact->time = hit->reaches_path ? hit->time : 1.0;
    double load = contact->plane.load;
    expand_at(piece, contact, contact->time, &contact->plane);
    contact->plane.load = load;
    if (hit->reaches_path) {
        if (contact->blocks < UINT8_MAX)
            contact->blocks++;
        contact->path = contact->plane;
        contact->path.load = 0.0;
    }
}

typedef struct job {
    rdl_engine *engine;
    const rdli_piece *piece;
    rdli_contact *contacts;
    const uint32_t *hit_of; /* per contact: its hit, or UINT32_MAX */
    size_t count;
    bool all;
} job;

static void strike_chunk(void *data, size_t chunk, unsigned worker)
{
    (void)worker;
    const job *j = data;
    const rdli_hit *hits = j->engine->hits.data;
    size_t end = (chunk + 1) * CHUNK < j->count ? (chunk + 1) * CHUNK : j->count;
    for (size_t c = chunk * CHUNK; c < end; c++) {
        if (j->hit_of[c] == UINT32_MAX)
            continue;
        rdli_contact *contact = &j->contacts[c];
        const rdli_hit *hit = &hits[j->hit_of[c]];
        if (contact->gap == 0.0) /* fresh: the merge has only set its key */
            start_contact(j->piece, hit, contact);
        strike(j->piece, hit, contact);
    }
}

rdl_status rdli_contacts_merge(rdl_engine *engine, const rdli_piece *piece)
{
    size_t old_count = engine->contact_count, room = old_count + engine->hit_count;
    if (!rdli_room_reserve(&engine->memory, &engine->merged, room, sizeof(rdli_contact), false)
        || !rdli_room_reserve(&engine->memory, &engine->indices, room, sizeof(uint32_t), false))
        return RDL_NO_MEMORY;
    rdli_contact *old = engine->contacts.data, *merged = engine->merged.data;
    const rdli_hit *hits = engine->hits.data;
    uint32_t *hit_of = engine->indices.data;
    size_t i = 0, h = 0, count = 0;
    while (i < old_count || h < engine->hit_count) {
        if (h < engine->hit_count && hits[h].contact_at_start) {
            h++; /* no direction to push along: named, see step.c */
            continue;
        }
        int order = i == old_count ? 1 : h == engine->hit_count ? -1 : compare(&old[i], &hits[h]);
        hit_of[count] = order >= 0 ? (uint32_t)h : UINT32_MAX;
        if (order <= 0) {
            merged[count] = old[i++];
            merged[count].violated = 0;
        } else {
            memset(&merged[count], 0, sizeof merged[count]);
        }
        if (order >= 0)
            h++;
        count++;
    }
    rdli_room swap = engine->contacts;
    engine->contacts = engine->merged;
    engine->merged = swap;
    engine->contact_count = count;
    job j = { engine, piece, engine->contacts.data, hit_of, count, false };
    rdli_parallel_for(engine->workers, (count + CHUNK - 1) / CHUNK, strike_chunk, &j);
    return RDL_OK;
}

static void expand_chunk(void *data, size_t chunk, unsigned worker)
{
    (void)worker;
    const job *j = data;
    const rdli_zone *zones = j->engine->response.zones.data;
    size_t end = (chunk + 1) * CHUNK < j->count ? (chunk + 1) * CHUNK : j->count;
    for (size_t c = chunk * CHUNK; c < end; c++) {
        rdli_contact *contact = &j->contacts[c];
        bool idle = contact->zone == UINT32_MAX || zones[contact->zone].settled;
        if (contact->violated || (idle && !j->all))
            continue;
        contact->time = 1.0;
        double load = contact->plane.load;
        expand_at(j->piece, contact, 1.0, &contact->plane);
        contact->plane.load = load;
    }
}

void rdli_contacts_expand(rdl_engine *engine, const rdli_piece *piece, bool all)
{
    job j = { engine, piece, engine->contacts.data, NULL, engine->contact_count, all };
    rdli_parallel_for(engine->workers, (j.count + CHUNK - 1) / CHUNK, expand_chunk, &j);
}
