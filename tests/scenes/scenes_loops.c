/* scenes/scenes_loops.c: topology: linked rings pulled apart, a knot pulled tight. */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "parts.h"
#include "scenes.h"

enum { RING = 48 };

static void ring(world *w, const double centre[3], bool upright)
{
    double points[RING][3];
    for (int i = 0; i < RING; i++) {
        double angle = 2.0 * 3.141592653589793 * i / RING;
        points[i][0] = centre[0] + 0.1 * cos(angle);
        points[i][1] = centre[1] + (upright ? 0.0 : 0.1 * sin(angle));
        points[i][2] = centre[2] + (upright ? 0.1 * sin(angle) : 0.0);
    }
    world_strand(w, (const double(*)[3])points, RING, true, 0.0005);
}

/* A chain of three rings, 5 mm thick; the outer sides of the outer rings are pulled apart, 10 mm a step. */
void build_links(world *w)
{
    const double left[3] = {-0.12, 0.0, 0.0}, middle[3] = {0.0, 0.003, 0.0}, right[3] = {0.12, 0.0, 0.0};
    world_part(w, "rings", RDL_STRANDS, 0.0025);
    ring(w, left, false);
    ring(w, middle, true);
    ring(w, right, false);
    for (uint32_t i = 0; i < 3; i++) {
        world_set_driven(w, RING / 2 - 1 + i);
        world_set_driven(w, 2 * RING + (i + RING - 1) % RING);
    }
    w->gravity[2] = -1.0;
    w->drag = 0.05;
    w->by_impulse = true;
}

void drive_links(const world *w, unsigned step, double (*proposed)[3])
{
    unsigned pulled = step < 34 ? step + 1 : 34;
    for (uint32_t v = 0; v < w->vertex_count; v++) {
        double shift[3] = {(v < RING ? -0.005 : 0.005) * pulled, 0.0, 0.0};
        if (world_is_driven(w, v))
            move_vertex(w, v, shift, proposed);
    }
}

void finish_links(judge *j, unsigned steps, const uint64_t verdicts[4])
{
    expect_action(j, steps, verdicts, 20);
    if (labs(j->linking[1]) != 1 || labs(j->linking[WORLD_LOOPS + 2]) != 1 || j->linking[2] != 0)
        judge_fault(j, steps, "the rings are not a chain");
}

/* The long trefoil (t^3 - 3t, t^4 - 4t^2, t^5 - 10t) of Shastri 1992, pressed flat, as a strand of equal pieces. */
enum { KNOT_FINE = 4000, KNOT_PIECES = 140 };

static void knot_point(double t, double x[3])
{
    x[0] = 0.022 * (t * t * t - 3.0 * t);
    x[1] = 0.022 * (t * t * t * t - 4.0 * t * t);
    x[2] = 0.003 * (t * t * t * t * t - 10.0 * t);
}

static void knot_points(double points[KNOT_PIECES + 1][3])
{
    static double fine[KNOT_FINE + 1][3], run[KNOT_FINE + 1];
    for (int i = 0; i <= KNOT_FINE; i++) {
        knot_point(-2.2 + 4.4 * i / KNOT_FINE, fine[i]);
        double square = 0.0;
        for (int k = 0; k < 3 && i > 0; k++)
            square += (fine[i][k] - fine[i - 1][k]) * (fine[i][k] - fine[i - 1][k]);
        run[i] = i > 0 ? run[i - 1] + sqrt(square) : 0.0;
    }
    for (int i = 0, at = 0; i <= KNOT_PIECES; i++) {
        while (at < KNOT_FINE && run[at] < run[KNOT_FINE] * i / KNOT_PIECES)
            at++;
        memcpy(points[i], fine[at], sizeof points[i]);
    }
}

/* A strand of 4 mm with an overhand knot; its ends are driven apart, 12 mm a step, until it is tight. */
void build_knot(world *w)
{
    double points[KNOT_PIECES + 1][3];
    knot_points(points);
    world_part(w, "strand", RDL_STRANDS, 0.002);
    world_strand(w, (const double(*)[3])points, KNOT_PIECES + 1, false, 0.0005);
    for (uint32_t i = 0; i < 2; i++) {
        world_set_driven(w, i);
        world_set_driven(w, KNOT_PIECES - i);
    }
    w->drag = 0.1;
    w->relax_passes = 12;
}

void drive_knot(const world *w, unsigned step, double (*proposed)[3])
{
    double far = 0.006 * (step < 90 ? step + 1 : 90);
    double left[3] = {-far, 0.0, 0.0}, right[3] = {far, 0.0, 0.0};
    for (uint32_t i = 0; i < 2; i++) {
        bool first_is_left = w->home[0][0] < w->home[KNOT_PIECES][0];
        move_vertex(w, i, first_is_left ? left : right, proposed);
        move_vertex(w, KNOT_PIECES - i, first_is_left ? right : left, proposed);
    }
}

/* Where piece `over` crosses piece `under` seen along y: the share along each, or false. */
static bool crosses(const double a[3], const double b[3], const double c[3], const double d[3], double share[2])
{
    double ux = b[0] - a[0], uz = b[2] - a[2], vx = d[0] - c[0], vz = d[2] - c[2], wx = c[0] - a[0], wz = c[2] - a[2];
    double area = ux * vz - uz * vx;
    if (area == 0.0)
        return false;
    share[0] = (wx * vz - wz * vx) / area;
    share[1] = (wx * uz - wz * ux) / area;
    return share[0] >= 0.0 && share[0] < 1.0 && share[1] >= 0.0 && share[1] < 1.0;
}

enum { CROSSINGS = 60 };

typedef struct knot_diagram {
    double at[CROSSINGS][2]; /* places along the strand: over, under */
    int count;
} knot_diagram;

static void draw(const double (*x)[3], int pieces, knot_diagram *diagram)
{
    diagram->count = 0;
    for (int a = 0; a < pieces; a++)
        for (int b = a + 2; b < pieces && diagram->count < CROSSINGS; b++) {
            double share[2];
            if (!crosses(x[a], x[a + 1], x[b], x[b + 1], share))
                continue;
            double ya = x[a][1] + share[0] * (x[a + 1][1] - x[a][1]), yb = x[b][1] + share[1] * (x[b + 1][1] - x[b][1]);
            double *at = diagram->at[diagram->count++];
            at[ya > yb ? 0 : 1] = a + share[0];
            at[ya > yb ? 1 : 0] = b + share[1];
        }
}

/* The arc of the diagram that holds a place: arcs end where the strand passes under. */
static int arc_at(const knot_diagram *diagram, double place)
{
    int arc = 0;
    for (int c = 0; c < diagram->count; c++)
        arc += diagram->at[c][1] < place;
    return arc;
}

/* Determinant of the knot (colouring matrix of the long diagram with the first arc struck out): 1 for no knot, 3 for
 * the trefoil; 0 when it cannot be told. */
static double determinant(const knot_diagram *diagram)
{
    static double m[CROSSINGS][CROSSINGS];
    int n = diagram->count;
    double value = 1.0;
    memset(m, 0, sizeof m);
    for (int c = 0; c < n; c++) {
        int over = arc_at(diagram, diagram->at[c][0]), in = arc_at(diagram, diagram->at[c][1]), out = in + 1;
        if (over > 0)
            m[c][over - 1] += 2.0;
        if (in > 0)
            m[c][in - 1] -= 1.0;
        m[c][out - 1] -= 1.0;
    }
    for (int i = 0; i < n; i++) {
        int pivot = i;
        for (int r = i + 1; r < n; r++)
            pivot = fabs(m[r][i]) > fabs(m[pivot][i]) ? r : pivot;
        for (int k = 0; k < n; k++) {
            double keep = m[i][k];
            m[i][k] = m[pivot][k];
            m[pivot][k] = keep;
        }
        value *= m[i][i];
        for (int r = i + 1; r < n && m[i][i] != 0.0; r++) {
            double share = m[r][i] / m[i][i];
            for (int k = i; k < n; k++)
                m[r][k] -= share * m[i][k];
        }
    }
    return fabs(value);
}

void inspect_knot(judge *j, const judge_step *step)
{
    static knot_diagram diagram;
    draw(step->delivered, KNOT_PIECES, &diagram);
    double value = determinant(&diagram);
    if (diagram.count == CROSSINGS || fabs(value - 3.0) > 0.1)
        judge_fault(j, step->number, "the strand's knot has determinant %g with %d crossings, not 3", value,
                    diagram.count);
}

void finish_knot(judge *j, unsigned steps, const uint64_t verdicts[4])
{
    expect_action(j, steps, verdicts, 30);
}
