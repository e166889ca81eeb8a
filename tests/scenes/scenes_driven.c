/* scenes/scenes_driven.c: bodies that the host drives with no regard for what is in their way: a fast body against a
 * curtain, plates that close on a sheet, a comb in strands. */
#include <math.h>

#include "filter.h"
#include "parts.h"
#include "scenes.h"

/* A curtain 2 mm thick hangs from its upper border; an octahedron flies into it. before: how far it is away, m. */
static void curtain(world *w, double before)
{
    const double corner[3] = {-0.15, 0.0, 0.0}, u[3] = {0.3, 0.0, 0.0}, v[3] = {0.0, 0.0, -0.3};
    const double centre[3] = {0.008, -0.03 - before, -0.16};
    world_part(w, "body", RDL_BODY, 0.0005);
    world_octahedron(w, centre, 0.03);
    world_part(w, "curtain", RDL_CLOTH, 0.001);
    uint32_t first = world_sheet(w, corner, u, v, 14, 14, 0.0005);
    for (uint32_t i = 0; i < 15; i++)
        world_set_driven(w, first + 15 * i);
    w->gravity[2] = -9.81;
    w->drag = 0.1;
}

static void fly(const world *w, unsigned step, double far, unsigned flight, double (*proposed)[3])
{
    double shift[3] = {0.0, far * (step < flight ? step + 1 : flight), 0.0};
    move_part(w, 0, shift, proposed);
}

void build_curtain_0_1(world *w)
{
    curtain(w, 0.0022);
}

void build_curtain_1(world *w)
{
    curtain(w, 0.005);
}

void build_curtain_10(world *w)
{
    curtain(w, 0.05);
}

void build_curtain_100(world *w)
{
    curtain(w, 0.3);
}

void build_curtain_1000(world *w)
{
    curtain(w, 1.0);
}

void drive_curtain_0_1(const world *w, unsigned step, double (*proposed)[3])
{
    fly(w, step, 0.0002, 30, proposed);
}

void drive_curtain_1(const world *w, unsigned step, double (*proposed)[3])
{
    fly(w, step, 0.002, 30, proposed);
}

void drive_curtain_10(const world *w, unsigned step, double (*proposed)[3])
{
    fly(w, step, 0.02, 12, proposed);
}

void drive_curtain_100(const world *w, unsigned step, double (*proposed)[3])
{
    fly(w, step, 0.2, 4, proposed);
}

void drive_curtain_1000(const world *w, unsigned step, double (*proposed)[3])
{
    fly(w, step, 2.0, 1, proposed);
}

void finish_curtain(judge *j, unsigned steps, const uint64_t verdicts[4])
{
    expect_action(j, steps, verdicts, 1);
}

/* Plates without thickness over the middle of a sheet 4 mm thick. Distances of the plates, in thicknesses. */
static double plate_distance(unsigned step)
{
    static const double distance[30] = {8.0, 6.0, 4.0, 3.0, 3.0, 3.0, 2.0, 2.0, 2.0, 1.01, 1.01, 1.01, 0.5, 0.5, 0.5,
                                        3.0, 3.0, 3.0, 10.0, 10.0, 10.0, 10.0, 2.0, 2.0, 0.5, 0.5, 10.0,
                                         10.0, 10.0, 10.0};
    return distance[step < 30 ? step : 29];
}

static const double sheet_thickness = 0.004, plate_reach = 0.05, mesh_size = 0.02;

void build_plates(world *w)
{
    const double corner[3] = {-0.1, -0.1, 0.0}, u[3] = {0.2, 0.0, 0.001}, v[3] = {0.0, 0.2, -0.001};
    const double across[3] = {2.0 * plate_reach, 0.0, 0.0}, along[3] = {0.0, 2.0 * plate_reach, 0.0};
    for (int side = 0; side < 2; side++) {
        double low[3] = {-plate_reach + 0.003, -plate_reach - 0.002, (side == 0 ? -5.0 : 5.0) * sheet_thickness};
        world_part(w, side == 0 ? "lower plate" : "upper plate", RDL_BODY, 0.0);
        world_sheet(w, low, across, along, 2, 2, INFINITY);
    }
    world_part(w, "sheet", RDL_CLOTH, 0.5 * sheet_thickness);
    world_sheet(w, corner, u, v, 10, 10, 0.001);
    w->drag = 0.2;
}

void drive_plates(const world *w, unsigned step, double (*proposed)[3])
{
    double off = 0.5 * (10.0 - plate_distance(step)) * sheet_thickness;
    double up[3] = {0.0, 0.0, off}, down[3] = {0.0, 0.0, -off};
    move_part(w, 0, up, proposed);
    move_part(w, 1, down, proposed);
}

/* Pinched where the plates close beyond the sheet's thickness; where they stand still, what was kept can be kept. */
unsigned verdicts_plates(const world *w, unsigned step)
{
    (void)w;
    double before = step > 0 ? plate_distance(step - 1) : 10.0, now = plate_distance(step);
    return now < 1.0 && now < before ? PINCHED : CLEAR | RESOLVED;
}

/* Pairs are named only under the plates, and each with a plate. */
void inspect_plates(judge *j, const judge_step *step)
{
    const world *w = j->w;
    double reach = (plate_reach + 2.0 * mesh_size) * w->scale;
    for (size_t i = 0; i < step->report->named_count; i++) {
        const rdl_named_pair *row = &step->report->named[i];
        uint32_t vertex[4];
        bool plate = false, inside = true;
        judge_vertices(j, row->kind, row->first, row->second, vertex);
        for (int k = 0; k < 4; k++) {
            const double *x = step->start[vertex[k]];
            plate = plate || world_is_driven(w, vertex[k]);
            inside = inside && fabs(x[0]) <= reach && fabs(x[1]) <= reach;
        }
        if (!plate || !inside)
            judge_fault(j, step->number, "named outside the plates: kind %u, %u %u, why %u", row->kind, row->first,
                        row->second, row->why);
    }
}

/* Two rows of strands hang from driven roots; a comb of eight teeth goes in between them and down, 10 mm a step. */
enum { COMB_IN = 12, COMB_DOWN = 26 };

void build_comb(world *w)
{
    world_part(w, "comb", RDL_BODY, 0.0005);
    for (int tooth = 0; tooth < 8; tooth++) {
        double x = -0.077 + 0.022 * tooth;
        double lo[3] = {x - 0.0015, -0.16, -0.065}, hi[3] = {x + 0.0015, -0.08, -0.055};
        world_box(w, lo, hi);
    }
    world_part(w, "strands", RDL_STRANDS, 0.001);
    for (int i = 0; i < 24; i++) {
        double x = -0.066 + 0.012 * (i / 2) + 0.004 * (i % 2), y = i % 2 == 0 ? -0.01 : 0.01;
        double a[3] = {x, y, 0.0}, b[3] = {x + 0.002, y, -0.22};
        world_set_driven(w, world_line(w, a, b, 16, 0.0003));
    }
    w->gravity[2] = -9.81;
    w->drag = 0.1;
}

void drive_comb(const world *w, unsigned step, double (*proposed)[3])
{
    unsigned in = step < COMB_IN ? step + 1 : COMB_IN;
    unsigned down = step < COMB_IN ? 0 : step < COMB_IN + COMB_DOWN ? step + 1 - COMB_IN : COMB_DOWN;
    double shift[3] = {0.0, 0.01 * in, -0.01 * down};
    move_part(w, 0, shift, proposed);
}

void finish_comb(judge *j, unsigned steps, const uint64_t verdicts[4])
{
    expect_action(j, steps, verdicts, 15);
}
