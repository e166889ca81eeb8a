/* tests/bench/bench_broad_scenes.c: see bench_broad_scenes.h. Lengths in metres. */
#include "bench_broad_scenes.h"

#include <math.h>
#include <stdbool.h>
#include <stdlib.h>
#include <string.h>

enum { CURL = 64 };             /* segments of a curl */
static const double CELL = 0.005; /* side of a cloth cell */

const char *bench_scene_name(int kind)
{
    static const char *const names[SCENE_COUNT] = {"stacked cloth", "curly strands", "cloth round rope",
                                                   "mixed", "tiny in huge", "flying sheets",
                                                   "sheets flying aslant", "one quiet sheet"};
    return names[kind];
}

/* A number in [0, 1) that depends on i and salt only (SplitMix64's finaliser). */
static double scatter(uint64_t i, uint64_t salt)
{
    uint64_t z = (i + 1) * 0x9E3779B97F4A7C15u + salt * 0xD1B54A32D192ED03u;
    z = (z ^ z >> 30) * 0xBF58476D1CE4E5B9u;
    z = (z ^ z >> 27) * 0x94D049BB133111EBu;
    return (double)((z ^ z >> 31) >> 11) * 0x1p-53;
}

/* Vertices along the side of each of `sheets` square sheets with `elements` triangles in all. */
static size_t sheet_side(size_t elements, size_t sheets)
{
    double side = sqrt((double)elements / (2.0 * (double)sheets));
    return (size_t)side + 2;
}

static size_t sheet_count(const bench_scene *scene, size_t elements)
{
    return scene->kind == SCENE_QUIET ? 1 : elements < 5000 ? 5 : 20;
}

static void add_sheet(bench_scene *scene, size_t first_vertex, size_t side)
{
    for (size_t y = 0; y + 1 < side; y++)
        for (size_t x = 0; x + 1 < side; x++) {
            uint32_t a = (uint32_t)(first_vertex + y * side + x), b = a + 1, c = a + (uint32_t)side, d = c + 1;
            uint32_t rows[2][3] = {{a, b, d}, {a, d, c}};
            memcpy(scene->elements[scene->element_count], rows, sizeof rows);
            scene->element_count += 2;
        }
}

static void add_curl(bench_scene *scene, size_t first_vertex)
{
    for (size_t i = 0; i < CURL; i++) {
        uint32_t a = (uint32_t)(first_vertex + i), row[3] = {a, a + 1, a + 1};
        memcpy(scene->elements[scene->element_count++], row, sizeof row);
    }
}

static bench_layout layout_of(const bench_scene *scene, size_t elements)
{
    bench_layout l = {0};
    size_t in_sheets = scene->kind == SCENE_STRANDS ? 0 : scene->kind == SCENE_MIXED ? elements / 2 : elements;
    if (in_sheets > 0) {
        l.sheets = sheet_count(scene, in_sheets);
        l.side = sheet_side(in_sheets, l.sheets);
    }
    l.sheet_vertices = l.sheets * l.side * l.side;
    l.curls = (elements - in_sheets) / CURL;
    return l;
}

static void sheet_place(const bench_scene *scene, const bench_layout *l, size_t v, double t, double x[3])
{
    size_t sheet = v / (l->side * l->side), at = v % (l->side * l->side);
    double u = (double)(at % l->side) * CELL, w = (double)(at / l->side) * CELL, s = (double)sheet;
    if (scene->kind == SCENE_ROPE) {
        double radius = 0.02 + 0.0012 * s + 0.0001 * u, turn = u / radius;
        x[0] = radius * cos(turn + 0.02 * t);
        x[1] = radius * sin(turn + 0.02 * t);
        x[2] = w + 0.0005 * sin(40 * u) + 0.001 * t;
    } else if (scene->kind == SCENE_FLYING || scene->kind == SCENE_ASLANT) {
        const bool aslant = scene->kind == SCENE_ASLANT;
        double way = (sheet % 2 == 0 ? 1 : -1) * (fabs(fmod(t, 4) - 2) - 1), aside = aslant ? 0.01 * way : 0;
        x[0] = u + 0.002 * sin(30 * w + s) + aside;
        x[1] = w + 0.002 * sin(35 * u + s) + aside;
        x[2] = (aslant ? 0.002 : 0.008) * s + 0.1 * way + 0.01 * sin(20 * u + s) * cos(25 * w);
    } else if (scene->kind == SCENE_QUIET) {
        x[0] = u;
        x[1] = w + 0.002 * t;
        x[2] = 0.02 * sin(9 * u + 0.2 * t) * cos(7 * w) + 0.001 * sin(60 * u + 0.3 * t);
    } else {
        double wave = 0.008 * sin(70 * u + 0.03 * t) * cos(55 * w) + 0.004 * sin(190 * w + 110 * u);
        x[0] = u + 0.0005 * t * (sheet % 2 == 0 ? 1 : -1) + 0.0008 * (scatter(v, 1) - 0.5);
        x[1] = w + 0.0008 * (scatter(v, 2) - 0.5);
        x[2] = wave + 0.003 * s + 0.0004 * (scatter(v, 3) - 0.5) + 0.0003 * sin(7 * u + t);
    }
}

static void curl_place(const bench_scene *scene, const bench_layout *l, size_t v, double t, double x[3])
{
    size_t curl = v / (CURL + 1), at = v % (CURL + 1), clump = curl / 40;
    size_t clumps = (l->curls + 39) / 40, row = (size_t)sqrt((double)clumps) + 1;
    double phase = 6.28 * scatter(clump, 4) + 0.5 * scatter(curl, 5), s = 0.0015 * (double)at;
    double radius = 0.006 * (0.8 + 0.4 * scatter(clump, 6)), turn = phase + 500 * s / (1 + 0.05 * scatter(curl, 7));
    double away = 0.0050 * sqrt(scatter(curl, 8)), round = 6.28 * scatter(curl, 9), sway = 0.002 * t * s / 0.1;
    x[0] = 0.02 * (double)(clump % row) + radius * cos(turn) + away * cos(round) + sway;
    x[1] = 0.02 * (double)(clump / row) + radius * sin(turn) + away * sin(round) + 0.3 * sway * sin(t);
    x[2] = s + 0.0005 * sin(t + (double)clump) + (scene->kind == SCENE_MIXED ? 0.03 : 0);
}

static void place(const bench_scene *scene, const bench_layout *l, size_t v, double t, double x[3])
{
    if (v < l->sheet_vertices)
        sheet_place(scene, l, v, t, x);
    else
        curl_place(scene, l, v - l->sheet_vertices, t, x);
    if (scene->kind != SCENE_TINY)
        return;
    /* The first two sheets shrink to a knot; each of the others lies somewhere within a kilometre. */
    size_t sheet = v / (l->side * l->side);
    for (unsigned k = 0; k < 3; k++)
        x[k] = sheet < 2 ? 0.1 * x[k] : x[k] + 1000 * (scatter(sheet, 20 + k) - 0.5);
}

bench_scene *bench_scene_new(int kind, size_t elements)
{
    bench_scene *scene = calloc(1, sizeof *scene);
    if (scene == NULL)
        return NULL;
    scene->kind = kind;
    scene->half = (const double[SCENE_COUNT]){0.0003, 0.00005, 0.0003, 0.0001, 0.00003, 0.0003, 0.0003, 0.0003}[kind];
    bench_layout l = layout_of(scene, elements);
    scene->layout = l;
    size_t triangles = l.sheets > 0 ? l.sheets * 2 * (l.side - 1) * (l.side - 1) : 0;
    scene->vertex_count = l.sheet_vertices + l.curls * (CURL + 1);
    scene->elements = malloc((triangles + l.curls * CURL) * sizeof *scene->elements);
    scene->start = malloc(scene->vertex_count * sizeof *scene->start);
    scene->end = malloc(scene->vertex_count * sizeof *scene->end);
    scene->boxes = malloc((triangles + l.curls * CURL) * sizeof *scene->boxes);
    if (scene->elements == NULL || scene->start == NULL || scene->end == NULL || scene->boxes == NULL) {
        bench_scene_free(scene);
        return NULL;
    }
    for (size_t s = 0; s < l.sheets; s++)
        add_sheet(scene, s * l.side * l.side, l.side);
    for (size_t c = 0; c < l.curls; c++)
        add_curl(scene, l.sheet_vertices + c * (CURL + 1));
    bench_scene_move(scene, 0);
    return scene;
}

void bench_scene_boxes(bench_scene *scene)
{
    float half = (float)scene->half;
    for (size_t e = 0; e < scene->element_count; e++) {
        const uint32_t *vertices = scene->elements[e];
        rdl_box *box = &scene->boxes[e];
        for (int k = 0; k < 3; k++) {
            float lo = scene->start[vertices[0]][k], hi = lo;
            for (int i = 0; i < 3; i++) {
                float s = scene->start[vertices[i]][k], t = scene->end[vertices[i]][k];
                lo = lo < s ? lo : s;
                lo = lo < t ? lo : t;
                hi = hi > s ? hi : s;
                hi = hi > t ? hi : t;
            }
            box->lo[k] = lo - half;
            box->hi[k] = hi + half;
        }
    }
}

void bench_scene_move(bench_scene *scene, int step)
{
    const bench_layout *l = &scene->layout;
    for (size_t v = 0; v < scene->vertex_count; v++) {
        double x[2][3];
        place(scene, l, v, step, x[0]);
        place(scene, l, v, step + 1, x[1]);
        for (int k = 0; k < 3; k++) {
            scene->start[v][k] = (float)x[0][k];
            scene->end[v][k] = (float)x[1][k];
        }
    }
    bench_scene_boxes(scene);
}

void bench_scene_free(bench_scene *scene)
{
    if (scene == NULL)
        return;
    free(scene->elements);
    free(scene->start);
    free(scene->end);
    free(scene->boxes);
    free(scene);
}
