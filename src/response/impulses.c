/* response/impulses.c: velocities for hosts. Positions tell where things may be; velocities follow from central impulses
 * at the contacts (METHODS: I = -v_n / sum a_i^2 / m_i for a single contact), which keeps both momenta. */
#include "base/vector.h"
#include "response/response.h"
#include "response/solve.h"

/* Zones of few rows are solved to rounding, larger ones to a few digits: whatever the impulses are, they are central and keep
 * both momenta. */
enum { FEW_ROWS = 64, ENOUGH_SWEEPS = 128 };

typedef struct job {
    rdli_response *response;
    const rdli_piece *piece;
    const rdli_contact *contacts;
    double restitution, length;
    double (*velocity)[3];
    double *impulse;
} job;

static double approach(const rdli_contact *contact, const rdli_plane *plane, const double (*velocity)[3])
{
    double sum = 0.0;
    for (int k = 0; k < 4; k++)
        sum += plane->weight[k] * rdli_dot(plane->normal, velocity[contact->vertex[k]]);
    return sum;
}

/* The planes of a contact that pushed; one that fell back to fixed directions, or to a
 * rigid zone, counts with its closest points. */
static bool carries_load(const rdli_contact *contact, uint8_t plane)
{
    double fenced = 0.0;
    for (int d = 0; d < 4; d++)
        fenced += contact->fence_load[d];
    return contact->plane[plane].load > 0.0 || ((fenced > 0.0 || contact->rigid) && plane == contact->nearest);
}

/* What the plane pushed with in the piece: where velocities are those of the piece, about its impulse. */
static double pushing(const rdli_contact *contact, uint8_t plane)
{
    double load = contact->plane[plane].load;
    for (int d = 0; plane == contact->nearest && d < 4; d++)
        load += contact->fence_load[d];
    return load;
}

static void set_row(const job *j, const rdli_contact *contact, const rdli_plane *plane, rdli_row *row)
{
    const uint32_t *local = j->response->local.data;
    const double (*velocity)[3] = (const double (*)[3])j->velocity;
    memset(row, 0, sizeof *row);
    rdli_copy(plane->normal, row->normal);
    double before = approach(contact, plane, velocity);
    row->bound = before < 0.0 ? -j->restitution * before : 0.0;
    row->tolerance = 1e-13 * fabs(before);
    for (int k = 0; k < 4; k++) {
        uint32_t v = contact->vertex[k];
        if (j->piece->fixed[v]) {
            row->bound -= plane->weight[k] * rdli_dot(row->normal, velocity[v]);
        } else {
            rdli_row_add(row, local[v], plane->weight[k]);
        }
    }
}

static void solve_zone(void *data, size_t index, unsigned worker)
{
    (void)worker;
    const job *j = data;
    rdli_response *r = j->response;
    const rdli_zone *zone = (const rdli_zone *)r->zones.data + index;
    const uint32_t *order = (const uint32_t *)r->zone_contacts.data + zone->contact_first;
    const uint32_t *vertices = (const uint32_t *)r->zone_vertices.data + zone->vertex_first;
    double (*target)[3] = (double (*)[3])r->targets.data + zone->vertex_first;
    double *inverse = (double *)r->inverse_mass.data + zone->vertex_first;
    double *load = (double *)r->loads.data + zone->row_first;
    rdli_row *rows = (rdli_row *)r->rows.data + zone->row_first;
    uint32_t row = 0;
    for (uint32_t i = 0; i < zone->contact_count; i++)
        for (uint8_t k = 0; k < j->contacts[order[i]].plane_count; k++)
            if (carries_load(&j->contacts[order[i]], k)) {
                load[row] = pushing(&j->contacts[order[i]], k) / j->length;
                set_row(j, &j->contacts[order[i]], &j->contacts[order[i]].plane[k], &rows[row++]);
            }
    if (row == 0)
        return;
    double fastest = 0.0;
    for (uint32_t i = 0; i < zone->vertex_count; i++) {
        inverse[i] = 1.0 / j->piece->mass[vertices[i]];
        rdli_copy((const double *)j->velocity[vertices[i]], target[i]);
        fastest = fmax(fastest, rdli_length(target[i]));
    }
    double fine = row <= FEW_ROWS ? 0x1p-48 : 0x1p-16;
    for (uint32_t k = 0; k < row; k++)
        rows[k].tolerance = fmax(rows[k].tolerance, fastest * fine);
    uint32_t most = row <= FEW_ROWS || j->piece->sweeps_max < ENOUGH_SWEEPS ? j->piece->sweeps_max : ENOUGH_SWEEPS;
    rdli_problem problem = { zone->vertex_count, row, inverse, (const double (*)[3])target, rows, load,
        (double (*)[3])r->solutions.data + zone->vertex_first, (double (*)[3])r->scratch.data + zone->vertex_first,
        (double *)r->row_work.data + RDLI_SOLVE_WORK * (size_t)zone->row_first, NULL, most, false };
    rdli_solve(&problem);
    row = 0;
    for (uint32_t i = 0; i < zone->contact_count; i++)
        for (uint8_t k = 0; k < j->contacts[order[i]].plane_count; k++)
            if (carries_load(&j->contacts[order[i]], k))
                j->impulse[RDLI_PLANES * order[i] + k] = load[row++];
    for (uint32_t i = 0; i < zone->vertex_count; i++)
        rdli_copy(problem.solution[i], j->velocity[vertices[i]]);
}

rdl_status rdli_zones_impulses(rdli_response *r, const rdli_piece *piece, const rdli_contact *contacts, size_t count,
                               double restitution, double length, double (*velocity)[3], double *impulse)
{
    for (size_t i = 0; i < RDLI_PLANES * count; i++)
        impulse[i] = -1.0;
    if (r->zone_count == 0)
        return RDL_OK;
    rdli_zone *zones = r->zones.data;
    const uint32_t *order = r->zone_contacts.data;
    r->row_total = 0;
    for (uint32_t z = 0; z < r->zone_count; z++) {
        zones[z].row_first = (uint32_t)r->row_total;
        for (uint32_t i = 0; i < zones[z].contact_count; i++)
            r->row_total += contacts[order[zones[z].contact_first + i]].plane_count;
    }
    if (rdli_response_reserve(r) != RDL_OK)
        return RDL_NO_MEMORY;
    job j = { r, piece, contacts, restitution, length, velocity, impulse };
    rdli_parallel_for(r->workers, r->zone_count, solve_zone, &j);
    return RDL_OK;
}
