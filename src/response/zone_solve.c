/* response/zone_solve.c: contacts of a zone -> half spaces -> solve -> rounded positions. */
#include "base/rounding.h"
#include "base/vector.h"
#include "raddle/query.h"
#include "raddle/report.h"
#include "response/dense.h"
#include "response/response.h"

typedef struct job {
    rdli_response *response;
    const rdli_piece *piece;
    rdli_contact *contacts;
    uint8_t *awake;
} job;

/* Vertex pairs (first feature, second feature) whose differences span the pair: PT 3, EE 4. */
static const uint8_t differences[2][4][2] = { { { 0, 1 }, { 0, 2 }, { 0, 3 }, { 0, 3 } },
                                              { { 0, 2 }, { 0, 3 }, { 1, 2 }, { 1, 3 } } };

static uint32_t difference_count(uint32_t kind)
{
    return kind == RDL_POINT_TRIANGLE ? 3 : 4;
}

static uint32_t rows_of(const rdli_contact *contact)
{
    if (contact->fenced)
        return difference_count(contact->kind);
    return contact->plane_count;
}

/* How much of a contact can give way: the larger of its features' movable shares. Where both features are almost at
 * driven vertices, aiming above the floor would ask for absurd moves of what little can move. */
static double movable_share(const rdli_piece *piece, const rdli_contact *contact, const double weight[4])
{
    int split = contact->kind == RDL_POINT_TRIANGLE ? 1 : 2;
    double share[2] = { 0.0, 0.0 };
    for (int k = 0; k < 4; k++)
        if (!piece->fixed[contact->vertex[k]])
            share[k >= split] += fabs(weight[k]);
    return fmin(fmax(share[0], share[1]), 1.0);
}

/* What rounding to the host's format may take from normal . sum weight x: every coordinate that moves does so by at most
 * half a unit in the last place, and the weights of each feature sum to one. Positions of the answer are not known yet: a
 * quarter more than the largest coordinate of start and target. */
static double rounding_allowance(const rdli_piece *piece, const rdli_contact *contact, const double normal[3])
{
    double largest = 0.0;
    for (int i = 0; i < 4; i++)
        for (int k = 0; k < 3; k++) {
            uint32_t v = contact->vertex[i];
            largest = fmax(largest, fmax(fabs(piece->start[v][k]), fabs(piece->target[v][k])));
        }
    double spread = (fabs(normal[0]) + fabs(normal[1])) + fabs(normal[2]);
    /* The rounding of our own sums is a few units of the double format; it matters where the host's is double too. */
    double own = piece->format == RDL_FLOAT64 ? 4.0 : 1.0;
    return own * 2.0 * spread * (1.25 * largest) * rdli_half_unit(piece->format);
}

static void set_row(rdli_row *row, const job *j, const rdli_contact *contact, const double normal[3],
                    const double weight[4], bool fenced)
{
    const rdli_piece *piece = j->piece;
    const uint32_t *local = j->response->local.data;
    memset(row, 0, sizeof *row);
    rdli_copy(normal, row->normal);
    /* Fixed directions certify the whole piece: no curvature to be ahead of. */
    double ahead = fenced ? 0.0 : contact->ahead;
    row->share = movable_share(piece, contact, weight);
    row->bound = contact->floor + row->share * (ahead + rounding_allowance(piece, contact, normal));
    for (int k = 0; k < 4; k++) {
        uint32_t v = contact->vertex[k];
        if (weight[k] == 0.0)
            continue;
        if (piece->fixed[v]) {
            row->bound -= weight[k] * rdli_dot(normal, piece->trial[v]);
        } else {
            rdli_row_add(row, local[v], weight[k]);
        }
    }
    row->tolerance = piece->aim_margin * contact->floor; /* the margin, for now: see set_tolerances */
}

static void fill_rows(const job *j, const rdli_contact *contact, rdli_row *rows, double *loads)
{
    if (!contact->fenced) {
        for (uint8_t i = 0; i < contact->plane_count; i++) {
            set_row(&rows[i], j, contact, contact->plane[i].normal, contact->plane[i].weight, false);
            loads[i] = contact->plane[i].load;
        }
        return;
    }
    for (uint32_t d = 0; d < difference_count(contact->kind); d++) {
        double weight[4] = { 0.0, 0.0, 0.0, 0.0 };
        weight[differences[contact->kind][d][0]] = 1.0;
        weight[differences[contact->kind][d][1]] = -1.0;
        set_row(&rows[d], j, contact, contact->fence, weight, true);
        loads[d] = contact->fence_load[d];
    }
}

static void keep_loads(rdli_contact *contact, const double *loads)
{
    if (!contact->fenced) {
        for (uint8_t i = 0; i < contact->plane_count; i++)
            contact->plane[i].load = loads[i];
        return;
    }
    for (uint32_t d = 0; d < difference_count(contact->kind); d++)
        contact->fence_load[d] = loads[d];
}

static double slack_of(const rdli_row *row, const double (*x)[3])
{
    double value = -row->bound;
    for (uint32_t k = 0; k < row->used; k++)
        value += row->weight[k] * rdli_dot(row->normal, x[row->vertex[k]]);
    return value;
}

/* Among the rows in which something can move. */
static double worst_violation(const rdli_problem *problem, const double (*x)[3])
{
    double worst = 0.0;
    for (size_t r = 0; r < problem->row_count; r++) {
        if (problem->rows[r].used > 0)
            worst = fmax(worst, -slack_of(&problem->rows[r], x));
    }
    return worst;
}

/* Zones of few rows are solved exactly at once. */
enum { FEW_ROWS = 64 };
/* Zones of many rows are not tried exactly while they are violated. */
enum { MANY_ROWS = 1024 };
enum { REFINING_SWEEPS = 128 };
/* A large violated zone that a short exact solve does not settle is solved to half a percent of its violation and aims as much
 * above, so that every row ends above its floor although the solve is quick; each clean pass takes four fifths of that
 * back. */
static const double slop_share = 0.005, slop_growth = 1.5, slop_kept = 0.2, slop_most = 0.5;
/* After clean passes have taken most of it, a violation brings so much of the correction back. */
static const double slop_again = 0x1p-10;

static void keep_slop(const job *j, const rdli_zone *zone, double slop)
{
    const uint32_t *order = (const uint32_t *)j->response->zone_contacts.data + zone->contact_first;
    for (uint32_t i = 0; i < zone->contact_count; i++)
        j->contacts[order[i]].slop = slop;
}

/* correction: the zone's worst violation, m. */
static double zone_slop(const job *j, const rdli_zone *zone, size_t rows, double correction)
{
    const uint32_t *order = (const uint32_t *)j->response->zone_contacts.data + zone->contact_first;
    double slop = 0.0, floor = DBL_MAX;
    bool again = false;
    for (uint32_t i = 0; i < zone->contact_count; i++) {
        const rdli_contact *contact = &j->contacts[order[i]];
        slop = fmax(slop, contact->slop);
        floor = fmin(floor, contact->floor);
        again = again || (contact->violated && contact->slop > 0.0);
    }
    if (rows <= FEW_ROWS)
        slop = 0.0;
    else if (zone->violated)
        slop = fmin(again ? fmax(slop_growth * slop, slop_again * correction) : slop, slop_most * floor);
    else
        slop *= slop_kept;
    keep_slop(j, zone, slop);
    return slop;
}

/* How far above its least end a row aims, and how exactly it must be met. The margin has to absorb what the solve leaves:
 * the setting's share of the floor, but no more than half of the zone's worst violation, so that violations by a rounding
 * do not blow up a whole sheet; and the slop of large zones while they are not refined. A small or refined zone is solved
 * to a fraction of a millionth of its correction, so that the answer is the nearest one to the promised 1e-6. Never below
 * what the positions can resolve. */
static void set_tolerances(const job *j, const rdli_zone *zone, rdli_problem *problem)
{
    const uint32_t *vertices = (const uint32_t *)j->response->zone_vertices.data + zone->vertex_first;
    double largest = 0.0, correction = worst_violation(problem, problem->target);
    for (size_t i = 0; i < problem->vertex_count; i++) {
        rdli_copy(j->piece->trial[vertices[i]], problem->solution[i]);
        for (int k = 0; k < 3; k++)
            largest = fmax(largest, fabs(problem->target[i][k]));
    }
    double fine = problem->row_count <= FEW_ROWS ? 1e-12 : 2e-8;
    double resolved = largest * 0x1p-50, slop = zone_slop(j, zone, problem->row_count, correction);
    for (size_t r = 0; r < problem->row_count; r++) {
        double margin = fmin(problem->rows[r].tolerance, 0.5 * correction) + 2.0 * resolved;
        rdli_row *row = &problem->rows[r];
        row->bound += row->share * (margin + slop);
        row->tolerance = fmax(row->share * fmax(fmin(0.5 * margin, fine * correction), 0.5 * slop), resolved);
    }
}

/* A solve moves vertices about as far as the worst violation that it starts from. Rows that are several times as far from
 * their bound and carry nothing are left out; should one be violated after all, the next detection says so. */
static void leave_out_idle_rows(rdli_problem *problem, double *all_loads)
{
    double reach = 4.0 * worst_violation(problem, (const double (*)[3])problem->solution);
    size_t kept = 0;
    for (size_t r = 0; r < problem->row_count; r++) {
        rdli_row *row = &problem->rows[r];
        row->origin = (uint32_t)r;
        all_loads[r] = 0.0;
        bool idle = problem->load[r] == 0.0 && slack_of(row, (const double (*)[3])problem->solution) > reach;
        if (idle || row->used == 0)
            continue;
        problem->rows[kept] = *row;
        problem->load[kept] = problem->load[r];
        kept++;
    }
    problem->row_count = kept;
}

/* A quick solve, see slop_share: all rows are met, and how far above does not matter yet. */
static rdli_solved solve_quickly(rdli_problem *problem)
{
    problem->feasible_only = true;
    return rdli_solve(problem);
}

static rdli_solved solve_rows(const job *j, const rdli_zone *zone, rdli_problem *problem)
{
    const uint32_t *order = (const uint32_t *)j->response->zone_contacts.data + zone->contact_first;
    if (!zone->violated || problem->row_count <= FEW_ROWS)
        return rdli_solve(problem);
    if (j->contacts[order[0]].slop > 0.0)
        return solve_quickly(problem);
    uint32_t sweeps = problem->sweeps_max;
    if (problem->row_count <= MANY_ROWS) {
        double *dense = problem->dense_work;
        problem->sweeps_max = sweeps < REFINING_SWEEPS ? sweeps : REFINING_SWEEPS;
        problem->dense_work = NULL;
        rdli_solved solved = rdli_solve(problem);
        problem->sweeps_max = sweeps;
        problem->dense_work = dense;
        if (solved.converged || solved.sweeps >= sweeps)
            return solved;
    }
    double floor = DBL_MAX;
    for (uint32_t i = 0; i < zone->contact_count; i++)
        floor = fmin(floor, j->contacts[order[i]].floor);
    double slop = fmin(slop_share * worst_violation(problem, problem->target), slop_most * floor);
    keep_slop(j, zone, slop);
    for (size_t r = 0; r < problem->row_count; r++) {
        rdli_row *row = &problem->rows[r];
        row->bound += row->share * slop;
        row->tolerance = fmax(row->tolerance, 0.5 * row->share * slop);
    }
    return solve_quickly(problem);
}

static void account(const job *j, rdli_zone *zone, const double (*solution)[3])
{
    const rdli_piece *piece = j->piece;
    const uint32_t *vertices = (const uint32_t *)j->response->zone_vertices.data + zone->vertex_first;
    double sum[3] = { 0.0, 0.0, 0.0 }, total = 0.0;
    for (uint32_t i = 0; i < zone->vertex_count; i++) {
        uint32_t v = vertices[i];
        double pushed[3], mass = piece->mass[v];
        rdli_subtract(solution[i], piece->target[v], pushed);
        rdli_add_scaled(sum, mass, pushed);
        total += mass * rdli_length(pushed);
    }
    zone->momentum_error = total > 0.0 ? rdli_length(sum) / total : 0.0;
}

void rdli_zone_energies(const rdli_response *response, const rdli_piece *piece, rdli_zone *zone)
{
    const uint32_t *vertices = (const uint32_t *)response->zone_vertices.data + zone->vertex_first;
    double all = 0.0, moved_sum[3] = { 0.0, 0.0, 0.0 }, meant_sum[3] = { 0.0, 0.0, 0.0 }, after = 0.0, before = 0.0;
    for (uint32_t i = 0; i < zone->vertex_count; i++) {
        uint32_t v = vertices[i];
        double moved[3], meant[3], mass = piece->mass[v];
        rdli_subtract(piece->trial[v], piece->start[v], moved);
        rdli_subtract(piece->target[v], piece->start[v], meant);
        rdli_add_scaled(moved_sum, mass, moved);
        rdli_add_scaled(meant_sum, mass, meant);
        all += mass;
        after += mass * rdli_dot(moved, moved);
        before += mass * rdli_dot(meant, meant);
    }
    /* A zone with driven vertices is no closed system: the frame of its centre of mass means nothing there. */
    double frame_before = zone->driven ? 0.0 : rdli_dot(meant_sum, meant_sum) / all;
    double frame_after = zone->driven ? 0.0 : rdli_dot(moved_sum, moved_sum) / all;
    zone->energy_before = 0.5 * (before - frame_before);
    zone->energy_after = 0.5 * (after - frame_after);
}

/* Writes the rounded answer. Without a violation before the solve, an answer that differs by a negligible part of the
 * correction is not written: the certified bits stay, and the zone is settled. */
static void write_back(const job *j, rdli_zone *zone, const double (*solution)[3])
{
    const rdli_piece *piece = j->piece;
    const uint32_t *vertices = (const uint32_t *)j->response->zone_vertices.data + zone->vertex_first;
    double change = 0.0, correction = 0.0;
    for (uint32_t i = 0; i < zone->vertex_count; i++)
        for (int k = 0; k < 3; k++) {
            uint32_t v = vertices[i];
            change = fmax(change, fabs(rdli_round_to(piece->format, solution[i][k]) - piece->trial[v][k]));
            correction = fmax(correction, fabs(solution[i][k] - piece->target[v][k]));
        }
    double enough = zone->row_count <= FEW_ROWS ? 1e-11 : 3e-7;
    if (!zone->violated && change <= enough * correction) {
        zone->settled = 1;
        return;
    }
    for (uint32_t i = 0; i < zone->vertex_count; i++) {
        uint32_t v = vertices[i];
        for (int k = 0; k < 3; k++) {
            double x = rdli_round_to(piece->format, solution[i][k]);
            if (x != piece->trial[v][k]) {
                piece->trial[v][k] = x;
                j->awake[v] = 1;
            }
        }
    }
    /* A violation that the solve did not touch is still there: it must be seen again. */
    const uint32_t *order = (const uint32_t *)j->response->zone_contacts.data + zone->contact_first;
    for (uint32_t i = 0; i < zone->contact_count; i++)
        for (int k = 0; j->contacts[order[i]].violated && k < 4; k++)
            if (!piece->fixed[j->contacts[order[i]].vertex[k]])
                j->awake[j->contacts[order[i]].vertex[k]] = 1;
}

static rdli_problem problem_of(const job *j, const rdli_zone *zone, unsigned worker)
{
    rdli_response *r = j->response;
    rdli_problem problem;
    problem.vertex_count = zone->vertex_count;
    problem.row_count = zone->row_count;
    problem.inverse_mass = (double *)r->inverse_mass.data + zone->vertex_first;
    problem.target = (const double (*)[3])((double (*)[3])r->targets.data + zone->vertex_first);
    problem.rows = (rdli_row *)r->rows.data + zone->row_first;
    problem.load = (double *)r->loads.data + zone->row_first;
    problem.solution = (double (*)[3])r->solutions.data + zone->vertex_first;
    problem.scratch = (double (*)[3])r->scratch.data + zone->vertex_first;
    problem.work = (double *)r->row_work.data + RDLI_SOLVE_WORK * (size_t)zone->row_first;
    /* A clean zone is only refined: not at any price. */
    bool dense = zone->violated && zone->vertex_count <= RDLI_DENSE_VERTICES;
    problem.feasible_only = false;
    problem.dense_work = dense ? (double *)r->dense.data + worker * r->dense_each : NULL;
    uint32_t sweeps = j->piece->sweeps_max;
    problem.sweeps_max = zone->violated || sweeps < REFINING_SWEEPS ? sweeps : REFINING_SWEEPS;
    return problem;
}

static void load_vertices(const job *j, const rdli_zone *zone, const double (*targets)[3])
{
    rdli_response *r = j->response;
    const uint32_t *vertices = (const uint32_t *)r->zone_vertices.data + zone->vertex_first;
    double *inverse = (double *)r->inverse_mass.data + zone->vertex_first;
    double (*target)[3] = (double (*)[3])r->targets.data + zone->vertex_first;
    for (uint32_t i = 0; i < zone->vertex_count; i++) {
        inverse[i] = 1.0 / j->piece->mass[vertices[i]];
        rdli_copy(targets[vertices[i]], target[i]);
    }
}

static double smallest_floor(const job *j, const rdli_zone *zone)
{
    const uint32_t *order = (const uint32_t *)j->response->zone_contacts.data + zone->contact_first;
    double floor = DBL_MAX;
    for (uint32_t i = 0; i < zone->contact_count; i++)
        floor = fmin(floor, j->contacts[order[i]].floor);
    return floor;
}

/* What the rigid contacts hold moves as one body; everything else in the zone goes where it wants to. */
static void move_rigidly(const job *j, const rdli_zone *zone, rdli_problem *problem)
{
    rdli_response *r = j->response;
    const uint32_t *order = (const uint32_t *)r->zone_contacts.data + zone->contact_first;
    const uint32_t *vertices = (const uint32_t *)r->zone_vertices.data + zone->vertex_first, *local = r->local.data;
    uint32_t *members = (uint32_t *)problem->work, count = 0;
    static_assert(RDLI_SOLVE_WORK * sizeof(double) >= 4 * sizeof(uint32_t), "room for the vertices of every contact");
    for (uint32_t i = 0; i < zone->vertex_count; i++) {
        rdli_copy(problem->target[i], problem->solution[i]);
        problem->scratch[i][0] = 0.0;
    }
    for (uint32_t i = 0; i < zone->contact_count; i++)
        for (int k = 0; j->contacts[order[i]].rigid && k < 4; k++)
            problem->scratch[local[j->contacts[order[i]].vertex[k]]][0] = 1.0;
    for (uint32_t i = 0; i < zone->vertex_count; i++)
        if (problem->scratch[i][0] != 0.0)
            members[count++] = vertices[i];
    rdli_rigid_motion(j->piece, members, count, smallest_floor(j, zone), problem->scratch);
    for (uint32_t i = 0; i < count; i++)
        rdli_copy(problem->scratch[i], problem->solution[local[members[i]]]);
}

static void solve_zone(void *data, size_t index, unsigned worker)
{
    const job *j = data;
    rdli_response *r = j->response;
    rdli_zone *zone = (rdli_zone *)r->zones.data + index;
    if (zone->settled)
        return;
    const uint32_t *order = (const uint32_t *)r->zone_contacts.data + zone->contact_first;
    rdli_problem problem = problem_of(j, zone, worker);
    load_vertices(j, zone, j->piece->target);
    if (zone->level == RDL_LEVEL_RIGID && !zone->driven) {
        move_rigidly(j, zone, &problem);
    } else {
        uint32_t row = 0;
        for (uint32_t i = 0; i < zone->contact_count; i++) {
            fill_rows(j, &j->contacts[order[i]], &problem.rows[row], &problem.load[row]);
            row += rows_of(&j->contacts[order[i]]);
        }
        set_tolerances(j, zone, &problem);
        double *all_loads = (double *)r->all_loads.data + zone->row_first;
        leave_out_idle_rows(&problem, all_loads);
        rdli_solved solved = solve_rows(j, zone, &problem);
        zone->sweeps = solved.sweeps;
        zone->infeasible = solved.infeasible;
        zone->exhausted = !solved.converged && solved.worst_after > 0.25 * solved.worst_before;
        zone->residual = solved.worst_before > 0.0 ? fmax(solved.worst_after, 0.0) / solved.worst_before : 0.0;
        for (size_t k = 0; k < problem.row_count; k++)
            all_loads[problem.rows[k].origin] = problem.load[k];
        row = 0;
        for (uint32_t i = 0; i < zone->contact_count; i++) {
            keep_loads(&j->contacts[order[i]], &all_loads[row]);
            row += rows_of(&j->contacts[order[i]]);
        }
    }
    account(j, zone, (const double (*)[3])problem.solution);
    write_back(j, zone, (const double (*)[3])problem.solution);
    for (uint32_t i = 0; i < zone->contact_count; i++)
        j->contacts[order[i]].settled = zone->settled;
}

rdl_status rdli_response_reserve(rdli_response *r)
{
    size_t rows = r->row_total, vertices = r->vertex_total;
    bool fits = rdli_room_reserve(r->memory, &r->rows, rows, sizeof(rdli_row), false)
        && rdli_room_reserve(r->memory, &r->loads, rows, sizeof(double), false)
        && rdli_room_reserve(r->memory, &r->all_loads, rows, sizeof(double), false)
        && rdli_room_reserve(r->memory, &r->row_work, RDLI_SOLVE_WORK * rows, sizeof(double), false)
        && rdli_room_reserve(r->memory, &r->inverse_mass, vertices, sizeof(double), false)
        && rdli_room_reserve(r->memory, &r->targets, vertices, 3 * sizeof(double), false)
        && rdli_room_reserve(r->memory, &r->solutions, vertices, 3 * sizeof(double), false)
        && rdli_room_reserve(r->memory, &r->scratch, vertices, 3 * sizeof(double), false);
    return fits ? RDL_OK : RDL_NO_MEMORY;
}

rdl_status rdli_zones_solve(rdli_response *r, const rdli_piece *piece, rdli_contact *contacts, uint8_t *awake)
{
    rdli_zone *zones = r->zones.data;
    const uint32_t *order = r->zone_contacts.data;
    r->row_total = 0;
    for (uint32_t z = 0; z < r->zone_count; z++) {
        zones[z].row_first = (uint32_t)r->row_total;
        zones[z].row_count = 0;
        for (uint32_t i = 0; i < zones[z].contact_count; i++)
            zones[z].row_count += rows_of(&contacts[order[zones[z].contact_first + i]]);
        r->row_total += zones[z].row_count;
    }
    r->dense_each = 0;
    for (uint32_t z = 0; z < r->zone_count; z++) {
        size_t work = rdli_dense_work(zones[z].vertex_count, zones[z].row_count);
        bool used = !zones[z].settled && zones[z].vertex_count <= RDLI_DENSE_VERTICES;
        r->dense_each = used && work > r->dense_each ? work : r->dense_each;
    }
    if (rdli_response_reserve(r) != RDL_OK
        || !rdli_room_reserve(r->memory, &r->dense, rdli_workers_count(r->workers) * r->dense_each, sizeof(double), false))
        return RDL_NO_MEMORY;
    job j = { r, piece, contacts, awake };
    rdli_parallel_for(r->workers, r->zone_count, solve_zone, &j);
    return RDL_OK;
}
