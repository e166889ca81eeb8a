/* response/gather.c: union-find over movable vertices; zones as rows. */
#include "response/response.h"

void rdli_response_init(rdli_response *response, rdli_memory *memory, rdli_workers *workers)
{
    memset(response, 0, sizeof *response);
    response->memory = memory;
    response->workers = workers;
}

void rdli_response_release(rdli_response *response)
{
    rdli_room *rooms[] = { &response->parent, &response->stamp, &response->local, &response->zones,
        &response->zone_contacts, &response->zone_vertices, &response->rows, &response->loads, &response->all_loads, &response->row_work,
        &response->inverse_mass, &response->targets, &response->solutions, &response->scratch, &response->sums, &response->dense };
    for (size_t k = 0; k < sizeof rooms / sizeof rooms[0]; k++)
        rdli_room_release(response->memory, rooms[k]);
}

static uint32_t find_root(uint32_t *parent, uint32_t v)
{
    while (parent[v] != v) {
        parent[v] = parent[parent[v]]; /* path halving */
        v = parent[v];
    }
    return v;
}

/* The lower number becomes the root, so that the outcome does not depend on the order of joins. */
static void join(uint32_t *parent, uint32_t a, uint32_t b)
{
    a = find_root(parent, a);
    b = find_root(parent, b);
    if (a < b)
        parent[b] = a;
    else
        parent[a] = b;
}

static bool reserve_marks(rdli_response *response, uint32_t vertex_count)
{
    bool fresh = response->stamp.bytes < vertex_count * sizeof(uint32_t);
    bool fits = rdli_room_reserve(response->memory, &response->parent, vertex_count, sizeof(uint32_t), false)
        && rdli_room_reserve(response->memory, &response->stamp, vertex_count, sizeof(uint32_t), false)
        && rdli_room_reserve(response->memory, &response->local, vertex_count, sizeof(uint32_t), false);
    if (fits && (fresh || response->pass_stamp == UINT32_MAX)) {
        memset(response->stamp.data, 0, response->stamp.bytes);
        response->pass_stamp = 0;
    }
    return fits;
}

static void join_contacts(rdli_response *response, const rdli_piece *piece, const rdli_contact *contacts, size_t count)
{
    uint32_t *parent = response->parent.data, *stamp = response->stamp.data, now = ++response->pass_stamp;
    for (size_t c = 0; c < count; c++) {
        uint32_t seen = UINT32_MAX;
        for (int k = 0; k < 4; k++) {
            uint32_t v = contacts[c].vertex[k];
            if (piece->fixed[v])
                continue;
            if (stamp[v] != now) {
                stamp[v] = now;
                parent[v] = v;
            }
            if (seen != UINT32_MAX)
                join(parent, seen, v);
            seen = v;
        }
    }
}

/* A contact between fixed vertices alone belongs to no zone. */
static uint32_t contact_root(rdli_response *response, const rdli_piece *piece, const rdli_contact *contact)
{
    for (int k = 0; k < 4; k++)
        if (!piece->fixed[contact->vertex[k]])
            return find_root(response->parent.data, contact->vertex[k]);
    return UINT32_MAX;
}

static void add_to_zone(rdli_zone *zone, const rdli_piece *piece, const rdli_contact *contact)
{
    zone->contact_count++;
    zone->violated |= contact->violated;
    zone->settled = zone->settled && contact->settled && !contact->violated;
    for (int k = 0; k < 4; k++)
        zone->driven |= piece->fixed[contact->vertex[k]] != 0;
    uint8_t level = contact->rigid ? 2 : contact->fenced ? 1 : 0;
    if (level > zone->level)
        zone->level = level;
}

bool rdli_carries_load(const rdli_contact *contact)
{
    double load = 0.0;
    for (uint8_t i = 0; i < contact->plane_count; i++)
        load += contact->plane[i].load;
    for (int d = 0; d < 4; d++)
        load += contact->fence_load[d];
    return load > 0.0;
}

static bool moves(const rdli_piece *piece, uint32_t v)
{
    return memcmp(piece->start[v], piece->trial[v], sizeof piece->start[v]) != 0;
}

/* Joins the vertices of loaded contacts; marks groups that touch fixed vertices. */
static void join_loaded(rdli_response *response, const rdli_piece *piece, const rdli_contact *contacts,
                        const rdli_zone *zone, rdli_group_sums *sums)
{
    const uint32_t *order = (const uint32_t *)response->zone_contacts.data + zone->contact_first;
    const uint32_t *vertices = (const uint32_t *)response->zone_vertices.data + zone->vertex_first;
    uint32_t *parent = response->parent.data;
    const uint32_t *local = response->local.data;
    for (uint32_t i = 0; i < zone->vertex_count; i++)
        parent[vertices[i]] = vertices[i];
    for (int round = 0; round < 2; round++)
        for (uint32_t i = 0; i < zone->contact_count; i++) {
            const rdli_contact *contact = &contacts[order[i]];
            uint32_t seen = UINT32_MAX;
            bool fed = false, leaning = false;
            for (int k = 0; rdli_carries_load(contact) && k < 4; k++) {
                uint32_t v = contact->vertex[k];
                fed = fed || (piece->fixed[v] && moves(piece, v));
                leaning = leaning || piece->fixed[v];
                if (!piece->fixed[v] && round == 0 && seen != UINT32_MAX)
                    join(parent, seen, v);
                seen = piece->fixed[v] ? seen : v;
            }
            if (round == 1 && leaning) {
                rdli_group_sums *sum = &sums[local[find_root(parent, seen)]];
                sum->fed = sum->fed || fed;
                sum->leaning = true;
            }
        }
}

/* Sums over the groups, at the local number of each group's root. */
static rdli_group_sums *sum_groups(rdli_response *response, const rdli_piece *piece, const rdli_contact *contacts,
                                   const rdli_zone *zone)
{
    const uint32_t *vertices = (const uint32_t *)response->zone_vertices.data + zone->vertex_first;
    const uint32_t *local = response->local.data;
    rdli_group_sums *sums = (rdli_group_sums *)response->sums.data + zone->vertex_first;
    memset(sums, 0, zone->vertex_count * sizeof *sums);
    join_loaded(response, piece, contacts, zone, sums);
    for (uint32_t i = 0; i < zone->vertex_count; i++) {
        uint32_t v = vertices[i];
        double mass = piece->mass[v];
        rdli_group_sums *sum = &sums[local[find_root(response->parent.data, v)]];
        sum->mass += mass;
        for (int k = 0; k < 3; k++) {
            double moved = piece->trial[v][k] - piece->start[v][k], meant = piece->target[v][k] - piece->start[v][k];
            sum->moved[k] += mass * moved;
            sum->meant[k] += mass * meant;
            sum->after += mass * (moved * moved);
            sum->before += mass * (meant * meant);
            sum->against += mass * (moved * (moved - 2.0 * meant));
        }
    }
    return sums;
}

/* The start x0 is a possible answer: one that is further from the target x1 than the start is, sum m |x* - x1|^2 - |x0 - x1|^2 =
 * sum m (x* - x0).(x* - x0 - 2 (x1 - x0)) > 0, went to the far side of other pairs. Margins above the floors put the start
 * itself outside of the set by a little: this share of the wanted motion. */
static const double far_share = 0x1p-6;

static bool goes_far(const rdli_group_sums *sum)
{
    return sum->mass > 0.0 && !sum->fed && sum->against > far_share * sum->before;
}

static bool gains_energy(const rdli_group_sums *sum)
{
    if (sum->mass == 0.0 || sum->leaning)
        return false;
    double after = sum->after, before = sum->before;
    for (int k = 0; k < 3; k++) {
        after -= sum->moved[k] * sum->moved[k] / sum->mass;
        before -= sum->meant[k] * sum->meant[k] / sum->mass;
    }
    /* The subtraction of the common motion cancels: its rounding is a share of the whole. */
    return after - before > 1e-12 * before + 16.0 * 0x1p-53 * (sum->after + sum->before);
}

/* A fence mends both; only what still gains energy behind one, of which rounding may be the cause, becomes rigid. */
static bool may_raise(const rdli_zone *zone, const rdli_contact *contact, const rdli_group_sums *sum)
{
    if (!contact->fenced)
        return sum->gains || sum->far;
    return sum->gains && !zone->driven && !contact->rigid;
}

bool rdli_zone_raise_gaining(rdli_response *response, const rdli_piece *piece, rdli_contact *contacts,
                             const rdli_zone *zone)
{
    const uint32_t *order = (const uint32_t *)response->zone_contacts.data + zone->contact_first;
    uint32_t *parent = response->parent.data;
    const uint32_t *local = response->local.data;
    rdli_group_sums *sums = sum_groups(response, piece, contacts, zone);
    bool any = false;
    for (uint32_t i = 0; i < zone->vertex_count; i++) {
        sums[i].gains = gains_energy(&sums[i]);
        sums[i].far = goes_far(&sums[i]);
        any = any || sums[i].gains || sums[i].far;
    }
    if (!any)
        return false;
    bool raised = false;
    for (uint32_t i = 0; i < zone->contact_count; i++) {
        rdli_contact *contact = &contacts[order[i]];
        uint32_t root = UINT32_MAX;
        bool inside = true;
        for (int k = 0; k < 4; k++) {
            uint32_t v = contact->vertex[k];
            if (piece->fixed[v])
                continue;
            uint32_t mine = find_root(parent, v);
            inside = inside && (root == UINT32_MAX || root == mine);
            root = mine;
        }
        if (!inside || root == UINT32_MAX || !may_raise(zone, contact, &sums[local[root]]))
            continue;
        contact->rigid = contact->fenced;
        contact->fenced = 1;
        contact->settled = 0;
        contact->due = 1;
        raised = true;
    }
    return raised;
}

static void number_vertices(rdli_response *response, const rdli_piece *piece, const rdli_contact *contacts)
{
    rdli_zone *zones = response->zones.data;
    const uint32_t *order = response->zone_contacts.data;
    uint32_t *vertices = response->zone_vertices.data, *local = response->local.data, *stamp = response->stamp.data;
    uint32_t now = ++response->pass_stamp, total = 0;
    for (uint32_t z = 0; z < response->zone_count; z++) {
        rdli_zone *zone = &zones[z];
        zone->vertex_first = total;
        for (uint32_t i = 0; i < zone->contact_count; i++) {
            const rdli_contact *contact = &contacts[order[zone->contact_first + i]];
            for (int k = 0; k < 4; k++) {
                uint32_t v = contact->vertex[k];
                if (piece->fixed[v] || stamp[v] == now)
                    continue;
                stamp[v] = now;
                local[v] = total - zone->vertex_first;
                vertices[total++] = v;
            }
        }
        zone->vertex_count = total - zone->vertex_first;
    }
    response->vertex_total = total;
}

rdl_status rdli_zones_gather(rdli_response *response, const rdli_piece *piece, rdli_contact *contacts, size_t count)
{
    response->zone_count = 0;
    response->vertex_total = 0;
    if (!reserve_marks(response, piece->vertex_count)
        || !rdli_room_reserve(response->memory, &response->zones, count, sizeof(rdli_zone), false)
        || !rdli_room_reserve(response->memory, &response->zone_contacts, count, sizeof(uint32_t), false)
        || !rdli_room_reserve(response->memory, &response->zone_vertices, 4 * count, sizeof(uint32_t), false)
        || !rdli_room_reserve(response->memory, &response->sums, 4 * count, sizeof(rdli_group_sums), false))
        return RDL_NO_MEMORY;
    join_contacts(response, piece, contacts, count);
    rdli_zone *zones = response->zones.data;
    uint32_t *local = response->local.data, *order = response->zone_contacts.data;
    /* local serves as zone-of-root first; a root's entry counts only when stamped in this round. */
    uint32_t *stamp = response->stamp.data, now = ++response->pass_stamp;
    for (size_t c = 0; c < count; c++) {
        uint32_t root = contact_root(response, piece, &contacts[c]);
        contacts[c].zone = UINT32_MAX;
        if (root == UINT32_MAX)
            continue;
        if (stamp[root] != now) {
            stamp[root] = now;
            local[root] = response->zone_count;
            memset(&zones[response->zone_count], 0, sizeof *zones);
            zones[response->zone_count++].settled = 1;
        }
        contacts[c].zone = local[root];
        add_to_zone(&zones[local[root]], piece, &contacts[c]);
    }
    uint32_t first = 0;
    for (uint32_t z = 0; z < response->zone_count; z++) {
        zones[z].contact_first = first;
        first += zones[z].contact_count;
        zones[z].contact_count = 0;
    }
    for (size_t c = 0; c < count; c++)
        if (contacts[c].zone != UINT32_MAX) {
            rdli_zone *zone = &zones[contacts[c].zone];
            order[zone->contact_first + zone->contact_count++] = (uint32_t)c;
        }
    number_vertices(response, piece, contacts);
    return RDL_OK;
}
