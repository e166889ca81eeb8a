/* driver/advance.c: the one loop: detect, join, solve, detect again what moved. */
#include "driver/engine.h"
#include "driver/watch.h"

/* Shares of the pass limit after which a zone that is still violated falls back to separating directions, and one
 * without driven vertices to a rigid body. The first level settles ordinary zones in a few passes; the fence needs passes
 * only to find the pairs that come near. Directions from the start are of little use against vertices that are driven far:
 * such zones end the piece after half of the passes, and a shorter piece is tried, as long as there is one. */
static const double fence_share = 0.45, whole_share = 0.6, rigid_share = 0.75, shorten_share = 0.55;
/* Until then a zone that breaks in refinement is mended; afterwards what was certified stands. */
static const double restore_share = 0.3;
/* And only so long: what takes more passes is not put at risk for a closer answer. */
static const double refine_share = 0.3;
/* Beyond so many floors a pair that pushes does so by a stale plane. */
static const double afar = 1.05;
/* Certified zones are refined towards the nearest point this often at most. */
enum { REFINEMENTS = 6 };
/* And goes back to what was certified this often, before that stands. */
enum { RESTORES = 1 };
enum { DIVERGES_AFTER = 3 };
/* A zone of so many contacts that goes deeper than so many floors is worth a shorter piece before any solve. */
enum { DEEP_CONTACTS = 256 };
static const double deep_floors = 4.0;

static bool all_settled(const rdl_engine *engine)
{
    const rdli_contact *contacts = engine->contacts.data;
    for (size_t c = 0; c < engine->contact_count; c++)
        if (contacts[c].violated || !contacts[c].settled)
            return false;
    return true;
}

static void mark_zone(rdl_engine *engine, const rdli_zone *zone, uint8_t level, bool violated_only)
{
    const uint32_t *order = (const uint32_t *)engine->response.zone_contacts.data + zone->contact_first;
    rdli_contact *contacts = engine->contacts.data;
    for (uint32_t i = 0; i < zone->contact_count; i++) {
        rdli_contact *contact = &contacts[order[i]];
        if (violated_only && !contact->violated)
            continue;
        contact->fenced |= level >= RDL_LEVEL_FENCE;
        contact->rigid |= level >= RDL_LEVEL_RIGID && (contact->violated || rdli_carries_load(contact));
        contact->settled = 0;
        contact->due = 1;
    }
}

static void settle_zone(rdl_engine *engine, rdli_zone *zone)
{
    const uint32_t *order = (const uint32_t *)engine->response.zone_contacts.data + zone->contact_first;
    rdli_contact *contacts = engine->contacts.data;
    zone->settled = 1;
    for (uint32_t i = 0; i < zone->contact_count; i++)
        contacts[order[i]].settled = 1;
}

/* What a clean pass leaves of the lead over the floor (contacts.c). Planes taken at a certified answer err by the square of
 * the next move over the floor, so that the lead may shrink as fast. */
static double shorter_lead(double lead, double floor)
{
    return fmin(0.25 * lead, 8.0 * lead * (lead / floor));
}

/* A contact pushes although its pair ends well beyond its floor: its plane is stale, and vertices that nothing comes near were
 * moved. Fences and blocked paths may push from afar. */
static bool pushes_from_afar(const rdl_engine *engine, const rdli_piece *piece, const rdli_zone *zone)
{
    const uint32_t *order = (const uint32_t *)engine->response.zone_contacts.data + zone->contact_first;
    const rdli_contact *contacts = engine->contacts.data;
    for (uint32_t i = 0; i < zone->contact_count; i++) {
        const rdli_contact *contact = &contacts[order[i]];
        double x[4][3];
        rdli_closest closest;
        if (contact->fenced || contact->blocks > 1 || !rdli_carries_load(contact))
            continue;
        for (int k = 0; k < 4; k++)
            memcpy(x[k], piece->trial[contact->vertex[k]], sizeof x[k]);
        rdli_closest_points((int)contact->kind, (const double (*)[3])x, &closest);
        if (closest.distance_lo > afar * (contact->floor + contact->ahead + contact->slop))
            return true;
    }
    return false;
}

/* The zone is certified as it stands: keep it, and look whether a closer answer is worth another pass. */
static bool wants_refinement(rdl_engine *engine, const rdli_piece *piece, rdli_zone *zone, double share)
{
    const uint32_t *order = (const uint32_t *)engine->response.zone_contacts.data + zone->contact_first;
    const uint32_t *vertices = (const uint32_t *)engine->response.zone_vertices.data + zone->vertex_first;
    rdli_contact *contacts = engine->contacts.data;
    double (*certified)[3] = engine->certified.data;
    uint8_t least = UINT8_MAX;
    bool frozen = false, due = false;
    for (uint32_t i = 0; i < zone->vertex_count; i++)
        memcpy(certified[vertices[i]], piece->trial[vertices[i]], sizeof certified[0]);
    for (uint32_t i = 0; i < zone->contact_count; i++) {
        rdli_contact *contact = &contacts[order[i]];
        memcpy(contact->saved, contact->plane, sizeof contact->saved);
        contact->saved_count = contact->plane_count;
        contact->clean = (uint8_t)(contact->clean + (contact->clean < UINT8_MAX));
        /* A lead that has just been found too short is kept for one more try. */
        if (!contact->restored)
            contact->ahead = shorter_lead(contact->ahead, contact->floor);
        contact->restored = 0;
        least = contact->clean < least ? contact->clean : least;
        frozen = frozen || contact->restores >= RESTORES;
        due = due || contact->due;
        contact->due = 0;
    }
    if (due)
        return true;
    if (zone->level < RDL_LEVEL_RIGID && rdli_zone_raise_gaining(&engine->response, piece, contacts, zone)) {
        for (uint32_t i = 0; i < zone->contact_count; i++) {
            uint8_t level = contacts[order[i]].rigid ? RDL_LEVEL_RIGID : contacts[order[i]].fenced ? RDL_LEVEL_FENCE : 0;
            zone->level = level > zone->level ? level : zone->level;
            contacts[order[i]].due = 0; /* solved in this very pass */
        }
        return true;
    }
    /* A zone that took long to certify is not put at risk again for a closer answer, unless it is plainly not a near one. */
    if (!frozen && least <= REFINEMENTS && share < refine_share)
        return true;
    return share < fence_share && pushes_from_afar(engine, piece, zone);
}

/* A zone that was certified and broke in refinement goes back to what was certified. The contacts that broke aim higher in
 * the next try. */
static bool restore_zone(rdl_engine *engine, const rdli_piece *piece, const rdli_zone *zone)
{
    const uint32_t *order = (const uint32_t *)engine->response.zone_contacts.data + zone->contact_first;
    const uint32_t *vertices = (const uint32_t *)engine->response.zone_vertices.data + zone->vertex_first;
    rdli_contact *contacts = engine->contacts.data;
    const double (*certified)[3] = engine->certified.data;
    bool was_clean = false;
    for (uint32_t i = 0; i < zone->contact_count; i++) {
        const rdli_contact *contact = &contacts[order[i]];
        if (contact->restores >= RESTORES || (contact->violated ? !contact->relapsed : contact->clean == 0))
            return false;
        was_clean = was_clean || contact->clean > 0 || contact->ahead > 0.0;
    }
    if (!was_clean)
        return false;
    for (uint32_t i = 0; i < zone->contact_count; i++) {
        rdli_contact *contact = &contacts[order[i]];
        contact->restores++;
        contact->restored = 1;
        memcpy(contact->plane, contact->saved, sizeof contact->plane);
        contact->plane_count = contact->saved_count; /* none where the contact is new: it carried nothing */
    }
    uint8_t *awake = engine->awake.data;
    for (uint32_t i = 0; i < zone->vertex_count; i++) {
        memcpy(piece->trial[vertices[i]], certified[vertices[i]], sizeof certified[0]);
        awake[vertices[i]] = 1;
    }
    return true;
}

/* What has been violated for long goes to the next level: first the contacts themselves, then all of their zone. */
static void raise_zone(rdl_engine *engine, const rdli_piece *piece, rdli_zone *zone, double share)
{
    if (zone->level == RDL_LEVEL_RIGID && !zone->driven)
        mark_zone(engine, zone, RDL_LEVEL_RIGID, true); /* what runs into the rigid body becomes part of it */
    if ((zone->driven && !piece->shortest) || share < fence_share)
        return;
    uint8_t level = share >= rigid_share && !zone->driven ? RDL_LEVEL_RIGID : RDL_LEVEL_FENCE;
    mark_zone(engine, zone, level, share < whole_share);
    zone->level = level > zone->level ? level : zone->level;
}

/* Many contacts, and a motion of many floors into each other: planes taken along such paths contradict each other, and
 * layers meet layers that are not their neighbours. */
static bool goes_deep(const rdl_engine *engine)
{
    const rdli_zone *zones = engine->response.zones.data;
    const uint32_t *order = engine->response.zone_contacts.data;
    const rdli_contact *contacts = engine->contacts.data;
    for (uint32_t z = 0; z < engine->response.zone_count; z++)
        for (uint32_t i = 0; zones[z].contact_count >= DEEP_CONTACTS && i < zones[z].contact_count; i++) {
            const rdli_contact *contact = &contacts[order[zones[z].contact_first + i]];
            if (contact->depth > deep_floors * contact->floor)
                return true;
        }
    return false;
}

/* False when a zone asks for a shorter piece. */
static bool choose_levels(rdl_engine *engine, const rdli_piece *piece, double share, bool diverges)
{
    rdli_zone *zones = engine->response.zones.data;
    bool hopeful = true;
    for (uint32_t z = 0; z < engine->response.zone_count; z++) {
        rdli_zone *zone = &zones[z];
        if (zone->settled)
            continue;
        if (!zone->violated) {
            if (!wants_refinement(engine, piece, zone, share))
                settle_zone(engine, zone);
            continue;
        }
        if (share >= restore_share && restore_zone(engine, piece, zone)) {
            zone->settled = 1; /* nothing to solve; the next detection judges */
            continue;
        }
        /* The shortest piece is given twice as long to show that there is room. */
        bool lost = piece->shortest ? diverges && share >= fence_share : share >= shorten_share || diverges;
        hopeful = hopeful && !(zone->driven && lost);
        raise_zone(engine, piece, zone, share);
    }
    return hopeful;
}

/* After the solve: half spaces without a common point send a zone to the next level at once. */
static bool react(rdl_engine *engine, const rdli_piece *piece)
{
    rdli_zone *zones = engine->response.zones.data;
    bool hopeless = false;
    for (uint32_t z = 0; z < engine->response.zone_count; z++) {
        rdli_zone *zone = &zones[z];
        /* The last solve may have parted groups that were one when the zone was judged. */
        if (zone->settled && zone->level < RDL_LEVEL_RIGID)
            rdli_zone_raise_gaining(&engine->response, piece, engine->contacts.data, zone);
        if (!zone->infeasible && !zone->exhausted)
            continue;
        if (zone->driven && !piece->shortest)
            hopeless = hopeless || zone->infeasible || zone->exhausted;
        else if (zone->level == RDL_LEVEL_INEQUALITY)
            mark_zone(engine, zone, RDL_LEVEL_FENCE, false);
        else if (!zone->driven && zone->level == RDL_LEVEL_FENCE)
            mark_zone(engine, zone, RDL_LEVEL_RIGID, false);
        else if (zone->infeasible && zone->driven)
            hopeless = true;
    }
    return !hopeless;
}

rdl_status rdli_advance(rdl_engine *engine, const rdli_piece *piece, bool first_piece, uint64_t passes_max, bool *apart)
{
    rdli_look look = { .from = piece->start, .to = (const double (*)[3])piece->trial, .awake = NULL,
        .fixed = piece->fixed, .squeeze = engine->squeeze.data, .first_piece = first_piece,
        .wants_close = true };
    uint8_t *awake = engine->awake.data;
    memcpy(engine->certified.data, piece->target, piece->vertex_count * sizeof piece->target[0]);
    engine->contact_count = 0;
    engine->response.zone_count = 0; /* those of an earlier piece */
    *apart = false;
    bool hopeful = true;
    size_t first_hits = 0;
    for (uint64_t pass = 0;; pass++) {
        rdl_status status = rdli_detect(engine, &look);
        if (status != RDL_OK)
            return status;
        engine->passes++;
        first_hits = pass == 0 ? engine->violation_count : first_hits;
        /* A motion that is too large for one piece shows early: planes contradict each other, and pushing makes as many
         * new violations as it mends. */
        bool diverges = pass >= DIVERGES_AFTER && engine->violation_count > first_hits / 2 + 16;
        double begun = rdli_now();
        status = rdli_contacts_merge(engine, piece);
        if (status == RDL_OK && all_settled(engine)) {
            *apart = true;
            return RDL_OK;
        }
        if (status == RDL_OK)
            status = rdli_zones_gather(&engine->response, piece, engine->contacts.data, engine->contact_count);
        if (status == RDL_OK)
            rdli_watch_zones(engine);
        if (status != RDL_OK || pass == passes_max || !hopeful)
            return status;
        if (pass == 0 && piece->long_piece && goes_deep(engine))
            return RDL_OK;
        memset(awake, 0, piece->vertex_count);
        if (!choose_levels(engine, piece, (double)pass / (double)passes_max, diverges))
            return RDL_OK;
        rdli_contacts_expand(engine, piece, false);
        status = rdli_zones_solve(&engine->response, piece, engine->contacts.data, awake);
        if (status != RDL_OK)
            return status;
        hopeful = react(engine, piece);
        look.awake = awake;
        engine->seconds[RDL_TIME_RESPONSE] += rdli_now() - begun;
    }
}
