/* scenes/scenes_fall.c: things that fall: a stack of sheets, a sheet that comes to rest, strands through a funnel, and
 * material whose rest spacing is below its thickness. */
#include <math.h>

#include "filter.h"
#include "parts.h"
#include "scenes.h"

static void big_plate(world *w, double z, double half)
{
    const double corner[3] = {-0.3, -0.3, z}, u[3] = {0.6, 0.0, 0.0}, v[3] = {0.0, 0.6, 0.0};
    world_part(w, "plate", RDL_BODY, half);
    world_sheet(w, corner, u, v, 2, 2, INFINITY);
}

/* Four sheets, 30 mm apart and a little askew, fall 20 mm on a plate: 10 to 30 mm a step at a gap of 4 mm. */
void build_stack(world *w)
{
    big_plate(w, 0.0, 0.002);
    for (int s = 0; s < 4; s++) {
        double turn = 0.3 * s, c = 0.2 * cos(turn), d = 0.2 * sin(turn), z = 0.02 + 0.03 * s;
        double u[3] = {c, d, 0.0}, v[3] = {-d, c, 0.002 * s};
        double corner[3] = {-0.5 * (c - d), -0.5 * (d + c), z};
        world_part(w, "sheet", RDL_CLOTH, 0.002);
        world_sheet(w, corner, u, v, 6, 6, 0.001);
    }
    w->gravity[2] = -9.81;
    w->drag = 0.02;
}

void finish_stack(judge *j, unsigned steps, const uint64_t verdicts[4])
{
    const world *w = j->w;
    expect_action(j, steps, verdicts, 20);
    for (uint32_t v = w->part_first[1]; v < w->vertex_count; v++)
        if (w->x[v][2] < 0.0039 * w->scale || w->x[v][2] > 0.05 * w->scale) {
            judge_fault(j, steps, "vertex %u ends at height %g", v, w->x[v][2] / w->scale);
            return;
        }
}

/* One sheet falls flat; after 60 steps it lies at the gap of 5 mm within 2 %. */
void build_rest(world *w)
{
    const double corner[3] = {-0.1, -0.1, 0.06}, u[3] = {0.2, 0.0, 0.004}, v[3] = {0.0, 0.2, 0.002};
    big_plate(w, 0.0, 0.003);
    world_part(w, "sheet", RDL_CLOTH, 0.002);
    world_sheet(w, corner, u, v, 10, 10, 0.001);
    w->gravity[2] = -9.81;
    w->drag = 0.05;
}

void finish_rest(judge *j, unsigned steps, const uint64_t verdicts[4])
{
    const world *w = j->w;
    double lowest = INFINITY, highest = -INFINITY;
    expect_action(j, steps, verdicts, 30);
    for (uint32_t v = w->part_first[1]; v < w->vertex_count; v++) {
        lowest = fmin(lowest, w->x[v][2] / w->scale);
        highest = fmax(highest, w->x[v][2] / w->scale);
    }
    if (lowest < 0.005 || highest > 0.005 * 1.02)
        judge_fault(j, steps, "the sheet rests between %.6g and %.6g m, its gap is 0.005 m", lowest, highest);
}

/* Nine strands of 12 pieces fall through a funnel that shakes. */
void build_funnel(world *w)
{
    static const double profile[5][2] = {{0.16, 0.20}, {0.12, 0.12}, {0.08, 0.06}, {0.045, 0.02}, {0.04, -0.06}};
    world_part(w, "funnel", RDL_BODY, 0.002);
    world_turned(w, profile, 5, 14);
    world_part(w, "strands", RDL_STRANDS, 0.002);
    for (int i = 0; i < 9; i++) {
        double angle = 0.7 * i, r = 0.02 + 0.008 * i, c = cos(angle), s = sin(angle), z = 0.17 + 0.012 * i;
        double a[3] = {r * c - 0.05 * s, r * s + 0.05 * c, z}, b[3] = {r * c + 0.05 * s, r * s - 0.05 * c, z + 0.01};
        world_line(w, a, b, 12, 0.0005);
    }
    w->gravity[2] = -9.81;
    w->drag = 0.02;
}

void drive_funnel(const world *w, unsigned step, double (*proposed)[3])
{
    double shake[3] = {step % 2 == 0 ? 0.0 : 0.006, step % 4 < 2 ? 0.0 : 0.006, 0.0};
    move_part(w, 0, shake, proposed);
}

void finish_funnel(judge *j, unsigned steps, const uint64_t verdicts[4])
{
    const world *w = j->w;
    size_t through = 0;
    expect_action(j, steps, verdicts, 20);
    for (uint32_t v = w->part_first[1]; v < w->vertex_count; v++)
        through += w->x[v][2] < 0.02 * w->scale;
    if (through < 13)
        judge_fault(j, steps, "only %zu vertices fell into the spout", through);
}

/* A cloth of 5 mm mesh and a strand of 5 mm pieces, both 6 mm half thick, fall on a plate: every pair of either starts
 * below its gap and may only move apart. */
void build_dense(world *w)
{
    const double corner[3] = {0.0, 0.0, 0.0}, u[3] = {0.04, 0.0, 0.002}, v[3] = {0.0, 0.04, -0.004};
    const double a[3] = {0.1, 0.0, 0.0}, b[3] = {0.16, 0.0, -0.01};
    big_plate(w, -0.03, 0.002);
    world_part(w, "thick cloth", RDL_CLOTH, 0.006);
    world_sheet(w, corner, u, v, 8, 8, 0.001);
    world_part(w, "thick strand", RDL_STRANDS, 0.006);
    world_line(w, a, b, 17, 0.001);
    w->by_impulse = true;
    w->gravity[2] = -9.81;
    w->drag = 0.05;
}

void finish_dense(judge *j, unsigned steps, const uint64_t verdicts[4])
{
    const world *w = j->w;
    uint32_t top = w->part_first[1], end = w->part_first[2];
    double width = stretch_between(w, top, top + 72), height = stretch_between(w, top, top + 8);
    double length = stretch_between(w, end, end + 17);
    (void)verdicts;
    if (width > 0.04 * 1.15 || height > 0.04 * 1.15)
        judge_fault(j, steps, "the cloth grew to %g x %g m", width, height);
    if (length > 0.0848528 * 1.15)
        judge_fault(j, steps, "the strand grew to %g m", length);
    for (size_t i = 0; i < w->link_count; i++)
        if (stretch_between(w, w->links[i].a, w->links[i].b) > 1.5 * w->links[i].rest / w->scale) {
            judge_fault(j, steps, "link %zu is at %g of its length", i,
                        stretch_between(w, w->links[i].a, w->links[i].b) * w->scale / w->links[i].rest);
            return;
        }
}
