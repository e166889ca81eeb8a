/* driver/contacts.c: the contact list of a piece: merging hits, first-order expansions. */
#include "base/vector.h"
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

/* A vertex that holds less than 2^-12 of a contact point could only be moved absurdly far by the contact: its share goes to
 * the heaviest vertex of the same feature. Any other point of a feature is as good a place for a plane. */
static void drop_small_shares(uint32_t kind, double weight[4])
{
    int split = kind == RDL_POINT_TRIANGLE ? 1 : 2;
    for (int k = 0; k < 4; k++) {
        int first = k < split ? 0 : split, end = k < split ? split : 4, heaviest = first;
        for (int i = first; i < end; i++)
            heaviest = fabs(weight[i]) > fabs(weight[heaviest]) ? i : heaviest;
        if (weight[k] != 0.0 && fabs(weight[k]) < 0x1p-12 && heaviest != k) {
            weight[heaviest] += weight[k];
            weight[k] = 0.0;
        }
    }
}

static void direction_of(const rdli_plane *plane, const double x[4][3], double d[3])
{
    memset(d, 0, 3 * sizeof(double));
    for (int k = 0; k < 4; k++)
        rdli_add_scaled(d, plane->weight[k], x[k]);
}

static bool closest_at(const rdli_piece *piece, const rdli_contact *contact, double time, rdli_plane *plane)
{
    double x[4][3];
    rdli_closest closest;
    positions_at(piece, contact->vertex, time, x);
    rdli_closest_points((int)contact->kind, (const double (*)[3])x, &closest);
    if (closest.distance_hi == 0.0)
        return false; /* no direction here */
    memset(plane, 0, sizeof *plane);
    memcpy(plane->normal, closest.normal, sizeof plane->normal);
    memcpy(plane->weight, closest.weight, sizeof plane->weight);
    drop_small_shares(contact->kind, plane->weight);
    if (memcmp(plane->weight, closest.weight, sizeof plane->weight) != 0) {
        double d[3];
        direction_of(plane, (const double (*)[3])x, d);
        double length = rdli_length(d);
        for (int k = 0; length > 0.0 && k < 3; k++)
            plane->normal[k] = d[k] / length;
    }
    return true;
}

static double weight_distance(const rdli_plane *a, const rdli_plane *b)
{
    double most = 0.0;
    for (int k = 0; k < 4; k++)
        most = fmax(most, fabs(a->weight[k] - b->weight[k]));
    return most;
}

/* Adds the plane at the closest points, in the place of a plane at nearly the same points, or, when all places are
 * taken, of the one that carries least. A plane at a distance of less than a sixteenth of the features sees the same
 * curvature. */
static void add_plane(rdli_contact *contact, const rdli_plane *plane)
{
    uint8_t place = contact->plane_count;
    double load = 0.0, near = 0x1p-4;
    for (uint8_t i = 0; i < contact->plane_count; i++) {
        double apart = weight_distance(&contact->plane[i], plane);
        if (apart < near && !contact->plane[i].kept) {
            near = apart;
            place = i;
            load = contact->plane[i].load;
        }
    }
    if (place == RDLI_PLANES) {
        place = 0;
        for (uint8_t i = 1; i < RDLI_PLANES; i++)
            if (contact->plane[i].load < contact->plane[place].load)
                place = i;
    } else if (place == contact->plane_count) {
        contact->plane_count++;
    }
    contact->plane[place] = *plane;
    contact->plane[place].load = load;
    contact->nearest = place;
}

/* The planes at other points of the pair, about the present end. */
static void turn_planes(const rdli_piece *piece, rdli_contact *contact)
{
    for (uint8_t i = 0; i < contact->plane_count; i++) {
        rdli_plane *plane = &contact->plane[i];
        double d[3] = { 0.0, 0.0, 0.0 };
        if (plane->kept)
            continue;
        for (int k = 0; k < 4; k++)
            rdli_add_scaled(d, plane->weight[k], piece->trial[contact->vertex[k]]);
        double length = rdli_length(d);
        for (int k = 0; length > 0.0 && k < 3; k++)
            plane->normal[k] = d[k] / length;
    }
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
    rdli_plane begin;
    if (closest_at(piece, contact, 0.0, &begin))
        memcpy(contact->fence, begin.normal, sizeof contact->fence);
}

/* A contact that was solved and is violated again lost to curvature. Aiming ahead by some multiple of the loss, and of the
 * last lead where that was not enough, certifies the zone in the next pass or two; clean passes then take the lead back
 * (advance.c). A lead far below the depth at which the contact began would be lost among the curvature of the neighbours. */
static const double lead_least = 0x1p-8, lead_most = 0.5;

static void aim_ahead(const rdli_piece *piece, const rdli_plane *plane, bool fresh, rdli_contact *contact)
{
    double value = 0.0;
    for (int i = 0; i < 4; i++)
        value += plane->weight[i] * rdli_dot(plane->normal, piece->trial[contact->vertex[i]]);
    double lost = contact->floor - value;
    if (fresh) {
        contact->depth = lost;
        return;
    }
    double lead = 4.0 * fmax(lost, contact->ahead);
    lead = fmax(lead, lead_least * contact->depth);
    contact->ahead = fmax(contact->ahead, fmin(lead, lead_most * contact->floor));
}

static void strike(const rdli_piece *piece, const rdli_hit *hit, bool fresh, rdli_contact *contact)
{
    contact->violated = 1;
    contact->relapsed = fresh || contact->clean > 0;
    contact->clean = 0;
    contact->settled = 0;
    contact->floor = hit->floor;
    contact->time = hit->reaches_path ? hit->time : 1.0;
    if (!hit->reaches_path)
        turn_planes(piece, contact);
    rdli_plane plane;
    if (!closest_at(piece, contact, contact->time, &plane))
        return;
    aim_ahead(piece, &plane, fresh, contact);
    if (hit->reaches_path) {
        contact->blocks = (uint8_t)(contact->blocks + (contact->blocks < UINT8_MAX));
        plane.kept = contact->blocks > 1;
    }
    add_plane(contact, &plane);
}

/* A pair that is not violated, but will be when its neighbours are pushed. It asks for nothing by itself. */
static void watch(const rdli_piece *piece, const rdli_hit *hit, rdli_contact *contact)
{
    rdli_plane plane;
    contact->floor = hit->floor;
    contact->settled = 1;
    contact->clean = 1;
    if (closest_at(piece, contact, 1.0, &plane))
        add_plane(contact, &plane);
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
        bool fresh = contact->gap == 0.0; /* the merge has left it empty */
        if (fresh)
            start_contact(j->piece, hit, contact);
        if (!hit->close)
            strike(j->piece, hit, fresh, contact);
        else if (fresh)
            watch(j->piece, hit, contact);
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

/* The room that a turned fence leaves at the start beyond what the end is to keep: margins and rounding fit in. */
static const double fence_room = 1e-4;

static bool is_far(const rdli_piece *piece, const rdli_contact *contact, const rdli_plane *plane)
{
    double distance = 0.0;
    for (int k = 0; k < 4; k++)
        distance += plane->weight[k] * rdli_dot(plane->normal, piece->trial[contact->vertex[k]]);
    return distance > 2.0 * contact->floor;
}

/* How far all of one feature lies beyond all of the other at the start of the piece, along a unit direction. */
static double start_support(const rdli_piece *piece, const rdli_contact *contact, const double direction[3])
{
    int split = contact->kind == RDL_POINT_TRIANGLE ? 1 : 2;
    double least = DBL_MAX, most = -DBL_MAX;
    for (int k = 0; k < 4; k++) {
        double value = rdli_dot(direction, piece->start[contact->vertex[k]]);
        if (k < split)
            least = fmin(least, value);
        else
            most = fmax(most, value);
    }
    return least - most;
}

/* Turns a fence from the separating direction of the start towards that of the present end, as far as the start of the piece
 * stays beyond it: so it takes no more than the pair's distance demands, and the set of ends still holds the start, which
 * is what makes it lawful. Never with less room at the start than the end asks for. */
static void turn_fence(const rdli_piece *piece, rdli_contact *contact)
{
    rdli_plane begin, now;
    if (!closest_at(piece, contact, 0.0, &begin) || !closest_at(piece, contact, 1.0, &now))
        return;
    rdli_copy(begin.normal, contact->fence);
    if (!(rdli_dot(begin.normal, now.normal) > 0.0))
        return;
    double wanted = (1.0 + fence_room) * (contact->floor + contact->slop);
    for (double share = 1.0; share > 0.0; share -= 0.125) {
        double direction[3];
        for (int k = 0; k < 3; k++)
            direction[k] = (1.0 - share) * begin.normal[k] + share * now.normal[k];
        double length = rdli_length(direction);
        for (int k = 0; k < 3; k++)
            direction[k] /= length;
        if (start_support(piece, contact, direction) >= wanted) {
            rdli_copy(direction, contact->fence);
            return;
        }
    }
}

static void expand_chunk(void *data, size_t chunk, unsigned worker)
{
    (void)worker;
    const job *j = data;
    const rdli_zone *zones = j->engine->response.zones.data;
    size_t end = (chunk + 1) * CHUNK < j->count ? (chunk + 1) * CHUNK : j->count;
    for (size_t c = chunk * CHUNK; c < end; c++) {
        rdli_contact *contact = &j->contacts[c];
        /* For the books there may be no zones: pairs that were merely close are settled before any is made. */
        bool idle = !j->all && (contact->zone == UINT32_MAX || zones[contact->zone].settled);
        if (contact->fenced && !idle && !j->all)
            turn_fence(j->piece, contact);
        if ((contact->violated || idle) && !j->all)
            continue;
        if (j->all) { /* for the books: what carried load, as it lies in the delivered positions */
            turn_planes(j->piece, contact);
            continue;
        }
        rdli_plane plane;
        if (!closest_at(j->piece, contact, 1.0, &plane))
            continue;
        /* A pair that is far and pushes nothing keeps its old planes: they guard the path by which it came, and looking
         * at it from where it is now would open that path again. */
        if (!rdli_carries_load(contact) && is_far(j->piece, contact, &plane))
            continue;
        contact->time = 1.0;
        turn_planes(j->piece, contact);
        add_plane(contact, &plane);
    }
}

void rdli_contacts_expand(rdl_engine *engine, const rdli_piece *piece, bool all)
{
    job j = { engine, piece, engine->contacts.data, NULL, engine->contact_count, all };
    rdli_parallel_for(engine->workers, (j.count + CHUNK - 1) / CHUNK, expand_chunk, &j);
}
