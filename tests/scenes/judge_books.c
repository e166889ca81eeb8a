/* scenes/judge_books.c: momentum and energy of what no driven vertex touches, and how much was frozen; see judge.h. */
#include <math.h>
#include <string.h>

#include "judge.h"

/* Sums over one group of vertices that contacts join. */
typedef struct books {
    double mass, momentum[3], correction, size; /* kg, kg m, kg m, kg m */
    double proposed[3], delivered[3];           /* sums of m dx */
    double before, after, work;                 /* sums of m dx^2; of m |x| |dx| */
    bool fed;                                   /* by a driven or held vertex */
    bool touched;                               /* a contact of the report has a vertex of it */
} books;

static uint32_t root_of(uint32_t *group, uint32_t v)
{
    while (group[v] != v)
        v = group[v] = group[group[v]];
    return v;
}

/* Which vertices a rigid zone carries along is not in the report: all that moved without a contact go with the rigid
 * zones, as one group. Sums over several zones obey the same rules. */
static void join_rigid(judge *j, const judge_step *step, const books *all)
{
    const rdl_report *r = step->report;
    uint32_t first = UINT32_MAX;
    for (size_t c = 0; c < r->contact_count; c++)
        for (int k = 0; k < 4 && r->zones[r->contacts[c].zone].level == RDL_LEVEL_RIGID; k++) {
            uint32_t v = r->contacts[c].vertices[k];
            if (world_is_driven(j->w, v))
                continue;
            first = first == UINT32_MAX ? v : first;
            j->group[root_of(j->group, v)] = root_of(j->group, first);
        }
    for (uint32_t v = 0; v < j->w->vertex_count && first != UINT32_MAX; v++) {
        bool moved = memcmp(step->delivered[v], step->proposed[v], sizeof step->delivered[v]) != 0;
        if (moved && !world_is_driven(j->w, v) && !all[v].touched)
            j->group[root_of(j->group, v)] = root_of(j->group, first);
    }
}

/* Joins the movable vertices of each zone: its loaded contacts need not hang together, and the promise is for the
 * zone. */
static void join_contacts(judge *j, const rdl_report *r, books *all)
{
    static uint32_t first_of_zone[WORLD_ELEMENTS * 64];
    size_t zones = r->zone_count < WORLD_ELEMENTS * 64 ? r->zone_count : WORLD_ELEMENTS * 64;
    for (uint32_t v = 0; v < j->w->vertex_count; v++)
        j->group[v] = v;
    for (size_t z = 0; z < zones; z++)
        first_of_zone[z] = UINT32_MAX;
    for (size_t c = 0; c < r->contact_count && r->contacts[c].zone < zones; c++) {
        const uint32_t *vertex = r->contacts[c].vertices;
        uint32_t *first = &first_of_zone[r->contacts[c].zone];
        for (int k = 0; k < 4; k++) {
            if (world_is_driven(j->w, vertex[k]))
                continue;
            if (*first == UINT32_MAX)
                *first = vertex[k];
            all[vertex[k]].touched = true;
            j->group[root_of(j->group, vertex[k])] = root_of(j->group, *first);
        }
    }
}

/* A zone may say that it touches something driven, with a contact that bears no load, only where one is near. */
static void mark_fed(judge *j, const rdl_report *r, books *all)
{
    for (size_t c = 0; c < r->contact_count; c++) {
        const uint32_t *vertex = r->contacts[c].vertices;
        bool said = r->contacts[c].zone < r->zone_count && r->zones[r->contacts[c].zone].touches_driven;
        bool driven = false;
        for (int k = 0; k < 4; k++)
            driven = driven || world_is_driven(j->w, vertex[k]) || (said && (j->near[vertex[k]] & 2) != 0);
        for (int k = 0; k < 4; k++) {
            books *b = &all[root_of(j->group, vertex[k])];
            b->touched = true; /* the root too */
            b->fed = b->fed || (driven && !world_is_driven(j->w, vertex[k]));
        }
    }
    for (size_t h = 0; h < r->held_count; h++)
        all[root_of(j->group, r->held[h])].fed = true;
}

static double length(const double a[3])
{
    return sqrt(a[0] * a[0] + a[1] * a[1] + a[2] * a[2]);
}

static void enter(books *b, double m, const double start[3], const double proposed[3], const double delivered[3])
{
    double meant[3], moved[3], shift[3];
    b->mass += m;
    for (int k = 0; k < 3; k++) {
        meant[k] = proposed[k] - start[k];
        moved[k] = delivered[k] - start[k];
        shift[k] = delivered[k] - proposed[k];
        b->momentum[k] += m * shift[k];
        b->proposed[k] += m * meant[k];
        b->delivered[k] += m * moved[k];
        b->before += m * meant[k] * meant[k];
        b->after += m * moved[k] * moved[k];
    }
    b->correction += m * length(shift);
    b->size += m * length(delivered);
    b->work += m * length(delivered) * (length(meant) + length(moved));
}

/* CONTRACT: |sum m (x* - x1)| <= 1e-12 sum m |x* - x1| + 8 eps sum m |x| before rounding to the format, which adds
 * half an ulp a vertex; kinetic energy in the centre-of-mass frame grows by no more than 1e-12 of it and rounding. */
static void close_books(judge *j, const judge_step *step, const books *b)
{
    double ulp = j->w->format == RDL_FLOAT32 ? 0x1p-24 : 0x1p-53;
    double allowed = 1e-12 * b->correction + (8.0 * 0x1p-53 + 1.8 * ulp) * b->size;
    double drift = length(b->momentum) / allowed;
    j->drift = fmax(j->drift, drift);
    if (drift > 1.0)
        judge_fault(j, step->number, "momentum of a free group drifts: %.3g kg m of %.3g kg m moved",
                    length(b->momentum), b->correction);
    double whole_before = length(b->proposed) * length(b->proposed) / b->mass;
    double whole_after = length(b->delivered) * length(b->delivered) / b->mass;
    double before = b->before - whole_before, after = b->after - whole_after;
    double room = 1e-12 * before + 8.0 * (ulp + 0x1p-53) * (b->work + b->before);
    j->gain = fmax(j->gain, (after - before) / room);
    if (after - before > room)
        judge_fault(j, step->number, "a free group gains energy: %.17g -> %.17g kg m^2", before, after);
}

/* Nothing moves without a contact that the report names, rigid zones and held vertices excepted. */
static void judge_untouched(judge *j, const judge_step *step, const books *all)
{
    size_t count = 0;
    double most = 0.0;
    for (uint32_t v = 0; v < j->w->vertex_count; v++)
        if (j->group[v] == v && !all[v].touched && !all[v].fed && all[v].correction > 0.0) {
            count++;
            most = fmax(most, all[v].correction / all[v].mass);
        }
    if (count > 0 && step->report->level_zones[RDL_LEVEL_RIGID] == 0)
        judge_fault(j, step->number, "%zu vertices were moved without a contact in the report, up to %.3g m", count,
                    most);
}

void judge_books(judge *j, const judge_step *step)
{
    static books all[WORLD_VERTICES];
    const rdl_report *r = step->report;
    memset(all, 0, sizeof all);
    join_contacts(j, r, all);
    if (r->level_zones[RDL_LEVEL_RIGID] > 0)
        join_rigid(j, step, all);
    mark_fed(j, r, all);
    size_t movable = 0;
    for (uint32_t v = 0; v < j->w->vertex_count; v++)
        if (!world_is_driven(j->w, v)) {
            movable++;
            enter(&all[root_of(j->group, v)], j->w->mass[v], step->start[v], step->proposed[v], step->delivered[v]);
        }
    for (uint32_t v = 0; v < j->w->vertex_count; v++)
        if (j->group[v] == v && all[v].touched && !all[v].fed && all[v].correction > 0.0)
            close_books(j, step, &all[v]);
    judge_untouched(j, step, all);
    j->vertex_steps += movable;
    j->held += r->held_count;
    for (size_t z = 0; z < r->zone_count && r->zones != NULL; z++)
        if (r->zones[z].level == RDL_LEVEL_RIGID)
            j->rigid += r->zones[z].vertex_count;
}
