/* scenes/scenes_sheets.c: sheets that spin, sheets tangled from the start, free flight, sliding in and along planes. */
#include <math.h>

#include "parts.h"
#include "scenes.h"

/* A sheet in the plane z = 0 under another one; it turns by 90 degrees about the x axis in one step. */
static uint32_t spin(world *w)
{
    const double corner[3] = {-0.1, -0.1, 0.0}, u[3] = {0.2, 0.0, 0.0}, v[3] = {0.0, 0.2, 0.0};
    const double above[3] = {-0.085, -0.08, 0.03}, across[3] = {0.17, 0.003, 0.001}, along[3] = {0.003, 0.16, -0.001};
    world_part(w, "spinning sheet", RDL_CLOTH, 0.002);
    uint32_t first = world_sheet(w, corner, u, v, 10, 10, 0.001);
    world_part(w, "other sheet", RDL_CLOTH, 0.002);
    world_sheet(w, above, across, along, 8, 8, 0.001);
    w->drag = 0.3;
    return first;
}

void build_spin_border(world *w)
{
    uint32_t first = spin(w);
    for (uint32_t i = 0; i <= 10; i++) {
        world_set_driven(w, first + i);
        world_set_driven(w, first + 110 + i);
        world_set_driven(w, first + 11 * i);
        world_set_driven(w, first + 11 * i + 10);
    }
}

/* Quarter turns in steps 3 and 12. */
static unsigned quarters(unsigned step)
{
    return step >= 12 ? 2 : step >= 3 ? 1 : 0;
}

static void turn_quarter(const double from[3], double to[3])
{
    double y = from[1], z = from[2];
    to[0] = from[0];
    to[1] = -z;
    to[2] = y;
}

void drive_spin_border(const world *w, unsigned step, double (*proposed)[3])
{
    for (uint32_t v = 0; v < w->vertex_count; v++) {
        double x[3] = {w->home[v][0], w->home[v][1], w->home[v][2]};
        for (unsigned q = 0; q < quarters(step); q++)
            turn_quarter(x, x);
        for (int k = 0; k < 3 && world_is_driven(w, v); k++)
            proposed[v][k] = x[k] * w->scale;
    }
}

void build_spin_whole(world *w)
{
    (void)spin(w);
    w->by_impulse = true;
}

void dictate_spin_whole(const world *w, unsigned step, double (*proposed)[3])
{
    for (uint32_t v = 0; v < w->part_first[1] && (step == 3 || step == 12); v++)
        turn_quarter(w->x[v], proposed[v]);
}

/* The turn happens: the spinning sheet gets at least half of the way that it was to go. */
void inspect_spin(judge *j, const judge_step *step)
{
    double meant = 0.0, done = 0.0;
    for (uint32_t v = 0; v < j->w->part_first[1]; v++)
        for (int k = 0; k < 3; k++) {
            meant += fabs(step->proposed[v][k] - step->start[v][k]);
            done += fabs(step->delivered[v][k] - step->start[v][k]);
        }
    if ((step->number == 3 || step->number == 12) && done < 0.5 * meant)
        judge_fault(j, step->number, "the sheet turned by %.3g of its way only", done / meant);
}

void finish_spin(judge *j, unsigned steps, const uint64_t verdicts[4])
{
    expect_action(j, steps, verdicts, 1);
}

/* Two sheets that cut each other, a strand through one of them, and a third sheet that flies onto the first. */
void build_tangled(world *w)
{
    const double corner[3] = {-0.1, -0.1, 0.0}, u[3] = {0.2, 0.0, 0.003}, v[3] = {0.001, 0.2, 0.0};
    const double upright[3] = {-0.07, 0.013, -0.06}, across[3] = {0.14, 0.011, 0.0}, up[3] = {0.002, 0.0, 0.12};
    const double top[3] = {-0.09, -0.085, 0.025}, wide[3] = {0.17, 0.004, 0.0}, deep[3] = {0.0, 0.06, 0.0};
    const double a[3] = {0.013, -0.051, -0.04}, b[3] = {0.017, -0.047, 0.015};
    world_part(w, "sheet", RDL_CLOTH, 0.002);
    world_sheet(w, corner, u, v, 8, 8, 0.001);
    world_part(w, "through it", RDL_CLOTH, 0.002);
    uint32_t first = world_sheet(w, upright, across, up, 6, 6, 0.001);
    for (uint32_t i = first; i < w->vertex_count; i++)
        w->v[i][1] = 0.3;
    world_part(w, "strand", RDL_STRANDS, 0.001);
    world_line(w, a, b, 8, 0.0005);
    world_part(w, "falling", RDL_CLOTH, 0.002);
    first = world_sheet(w, top, wide, deep, 6, 3, 0.001);
    for (uint32_t i = first; i < w->vertex_count; i++)
        w->v[i][2] = -0.6;
    w->drag = 0.05;
}

void finish_tangled(judge *j, unsigned steps, const uint64_t verdicts[4])
{
    (void)verdicts;
    if (j->pierce_count < 5)
        judge_fault(j, steps, "only %zu tangles are left: the scene was to keep them", j->pierce_count);
}

/* A tent whose middle vertex stands exactly on a face of another sheet, at distance 0, and flies on into it; in the
 * tenth step it is pulled back. Coordinates are multiples of 2^-8: the contact is exact. */
void build_touching(world *w)
{
    const double corner[3] = {-0.140625, -0.1328125, 0.0}, u[3] = {0.25, 0.0, 0.0}, v[3] = {0.0, 0.25, 0.0};
    const double tent[3] = {-0.125, -0.125, 0.0};
    world_part(w, "ground", RDL_CLOTH, 0.002);
    world_sheet(w, corner, u, v, 4, 4, 0.001);
    world_part(w, "tent", RDL_CLOTH, 0.002);
    uint32_t first = (uint32_t)w->vertex_count;
    world_sheet(w, tent, u, v, 4, 4, 0.001);
    for (uint32_t i = 0; i < 25; i++) {
        uint32_t a = i / 5, b = i % 5;
        w->home[first + i][2] = ((a < 2 ? 2 - a : a - 2) + (b < 2 ? 2 - b : b - 2)) * 0x1p-6;
        w->v[first + i][2] = -0.5;
    }
    w->relax_passes = 0;
}

void dictate_touching(const world *w, unsigned step, double (*proposed)[3])
{
    for (uint32_t v = w->part_first[1]; v < w->vertex_count && step == 9; v++)
        proposed[v][2] = w->x[v][2] + 0.03 * w->scale;
}

/* The pair is named in the first step, and it is no tangle; in the end the sheets are apart and nothing was cut. */
void inspect_touching(judge *j, const judge_step *step)
{
    size_t named = 0;
    for (size_t i = 0; i < step->report->named_count; i++)
        named += step->report->named[i].why == RDL_WHY_CONTACT_AT_START;
    if (step->number == 0 && named == 0)
        judge_fault(j, 0, "the contact at the start is not named");
}

void finish_touching(judge *j, unsigned steps, const uint64_t verdicts[4])
{
    expect_action(j, steps, verdicts, 1);
}

/* Sheets and strands that never come near each other: falling, turning, bending. */
void build_free(world *w)
{
    for (int i = 0; i < 3; i++) {
        double corner[3] = {-0.1, -0.1, 0.1 * i}, u[3] = {0.2, 0.0, 0.01 * i}, v[3] = {0.0, 0.2, 0.003 * i};
        world_part(w, "sheet", RDL_CLOTH, 0.001);
        uint32_t first = world_sheet(w, corner, u, v, 7, 7, 0.001);
        for (uint32_t k = first; k < w->vertex_count; k++) {
            w->v[k][0] = 3.0 * w->home[k][1];
            w->v[k][1] = -3.0 * w->home[k][0];
        }
    }
    world_part(w, "strands", RDL_STRANDS, 0.001);
    for (int i = 0; i < 5; i++) {
        double a[3] = {0.4, 0.05 * i, 0.0}, b[3] = {0.45, 0.05 * i, 0.2};
        world_line(w, a, b, 20, 0.001);
    }
    w->gravity[2] = -9.81;
}

/* Three sheets in and along the plane x = z. All coordinates are multiples of 2^-10, so that the planes are exact: A
 * and B lie in one plane and A flies at B within it; C flies over both in a parallel plane. */
void build_tilted(world *w)
{
    const double u[3] = {0.25, 0.0, 0.25}, v[3] = {0.0, 0.25, 0.0}, step = 0x1p-6;
    const double a[3] = {0.0, 0.0, 0.0}, b[3] = {0.3125, 0x1p-6, 0.3125}, c[3] = {-0x1p-6, -0.125, 0x1p-6};
    const double *corners[3] = {a, b, c};
    const double speed[3][3] = {{1.0, 0.0, 1.0}, {0.0, 0.0, 0.0}, {0.0, 1.0, 0.0}};
    static const char *const names[3] = {"A", "B", "C"};
    w->duration = step;
    for (int s = 0; s < 3; s++) {
        world_part(w, names[s], RDL_CLOTH, 0.002);
        uint32_t first = world_sheet(w, corners[s], u, v, 8, 8, 0.001);
        for (uint32_t i = first; i < w->vertex_count; i++)
            for (int k = 0; k < 3; k++)
                w->v[i][k] = speed[s][k];
    }
}

/* A reaches B in the fourth step. */
unsigned verdicts_tilted(const world *w, unsigned step)
{
    (void)w;
    return step < 3 ? CLEAR : step == 3 ? RESOLVED : CLEAR | RESOLVED;
}

void finish_tilted(judge *j, unsigned steps, const uint64_t verdicts[4])
{
    expect_action(j, steps, verdicts, 2);
}

/* A sheet slides over a plate, 25 mm a step at a gap of 5 mm, pressed down by gravity. */
static const double slide_speed = 1.25;

void build_slide(world *w)
{
    const double corner[3] = {-0.2, -0.2, 0.0}, u[3] = {1.2, 0.0, 0.0}, v[3] = {0.0, 0.4, 0.0};
    const double above[3] = {-0.1, -0.1, 0.00501}, across[3] = {0.2, 0.01, 0.0}, along[3] = {-0.01, 0.2, 0.0};
    world_part(w, "plate", RDL_BODY, 0.003);
    world_sheet(w, corner, u, v, 7, 3, INFINITY);
    world_part(w, "sheet", RDL_CLOTH, 0.002);
    uint32_t first = world_sheet(w, above, across, along, 8, 8, 0.001);
    for (uint32_t i = first; i < w->vertex_count; i++)
        w->v[i][0] = slide_speed;
    w->gravity[2] = -9.81;
}

static double mean_x(const world *w, const double (*x)[3])
{
    double sum = 0.0;
    for (uint32_t v = w->part_first[1]; v < w->part_first[2]; v++)
        sum += x[v][0] / w->scale;
    return sum / (w->part_first[2] - w->part_first[1]);
}

void inspect_slide(judge *j, const judge_step *step)
{
    double from = mean_x(j->w, step->start), to = mean_x(j->w, step->delivered), meant = mean_x(j->w, step->proposed);
    if (to - from < 0.99 * (meant - from))
        judge_fault(j, step->number, "the sheet slid %.6g of %.6g m", to - from, meant - from);
}

void finish_slide(judge *j, unsigned steps, const uint64_t verdicts[4])
{
    const world *w = j->w;
    double far = mean_x(w, w->x) - mean_x(w, (const double(*)[3])w->home);
    double meant = slide_speed * w->duration * steps;
    expect_action(j, steps, verdicts, 10);
    if (far < 0.99 * meant)
        judge_fault(j, steps, "the sheet slid %.6g of %.6g m in all", far, meant);
}
