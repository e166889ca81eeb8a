/* One step of the engine: a small cloth falls on a plate, and the integrator's proposal goes right through it.
 * Build: cc -std=c17 first_step.c $(pkg-config --cflags --libs raddle) */
#include <math.h>
#include <stdio.h>

#include <raddle/raddle.h>

enum { SIDE = 5, CLOTH = SIDE * SIDE, VERTICES = CLOTH + 4, TRIANGLES = 2 * (SIDE - 1) * (SIDE - 1) + 2 };

static double start[VERTICES][3], proposed[VERTICES][3], delivered[VERTICES][3];
static double mass[VERTICES];
static uint32_t part[VERTICES], triangles[TRIANGLES][3];

static void put(uint32_t vertex, double x, double y, double z, double fall)
{
    start[vertex][0] = proposed[vertex][0] = x;
    start[vertex][1] = proposed[vertex][1] = y;
    start[vertex][2] = z;
    proposed[vertex][2] = z - fall;
}

static void corner(uint32_t triangle, uint32_t a, uint32_t b, uint32_t c)
{
    triangles[triangle][0] = a;
    triangles[triangle][1] = b;
    triangles[triangle][2] = c;
}

/* Part 0: a cloth of 8 cm, 1 mm thick, 1 cm above the plate. Part 1: the plate, driven by the host (infinite mass). */
static void build(void)
{
    uint32_t next = 0;
    for (uint32_t row = 0; row < SIDE; row++)
        for (uint32_t column = 0; column < SIDE; column++) {
            uint32_t v = row * SIDE + column;
            put(v, 0.02 * column, 0.02 * row, 0.01, 0.015);
            mass[v] = 1e-4;
            if (row + 1 < SIDE && column + 1 < SIDE) {
                corner(next++, v, v + 1, v + SIDE);
                corner(next++, v + 1, v + SIDE + 1, v + SIDE);
            }
        }
    const double reach[4][2] = {{-1, -1}, {1, -1}, {1, 1}, {-1, 1}};
    for (uint32_t i = 0; i < 4; i++) {
        put(CLOTH + i, reach[i][0], reach[i][1], 0, 0);
        mass[CLOTH + i] = INFINITY;
        part[CLOTH + i] = 1;
    }
    corner(next++, CLOTH, CLOTH + 1, CLOTH + 2);
    corner(next, CLOTH, CLOTH + 2, CLOTH + 3);
}

int main(void)
{
    static const char *const verdicts[] = {"clear", "resolved", "pinched", "tangled"};
    const rdl_part parts[] = {{"cloth", RDL_CLOTH, 0.0005, 0}, {"plate", RDL_BODY, 0, 0}};
    rdl_fault fault = {0, ""};
    rdl_engine *engine = NULL;
    build();

    const rdl_scene scene = {.size = sizeof scene, .part_count = 2, .parts = parts, .vertex_count = VERTICES,
                             .vertex_part = part, .mass = mass, .triangle_count = TRIANGLES,
                             .triangles = (const uint32_t (*)[3])triangles};
    rdl_status status = rdl_engine_create(&scene, NULL, NULL, &engine, &fault);
    if (status != RDL_OK) {
        fprintf(stderr, "scene: %s (%s %llu)\n", rdl_status_text(status), fault.field, (unsigned long long)fault.index);
        return 1;
    }

    const rdl_step step = {.size = sizeof step, .duration = 1.0 / 24, .start = {start, 0, RDL_FLOAT64},
                           .proposed = {proposed, 0, RDL_FLOAT64}, .delivered = {delivered, 0, RDL_FLOAT64}};
    rdl_report report = {.size = sizeof report};
    status = rdl_engine_step(engine, &step, &report, &fault);
    if (status != RDL_OK) {
        fprintf(stderr, "step: %s (%s %llu)\n", rdl_status_text(status), fault.field, (unsigned long long)fault.index);
        rdl_engine_destroy(engine);
        return 1;
    }

    double lowest = delivered[0][2];
    for (int v = 1; v < CLOTH; v++)
        lowest = delivered[v][2] < lowest ? delivered[v][2] : lowest;
    printf("verdict: %s\n", verdicts[report.verdict]);
    printf("proposed height %.3f mm, delivered %.3f mm, gap 0.500 mm\n", 1e3 * proposed[0][2], 1e3 * lowest);
    rdl_engine_destroy(engine);
    return 0;
}
