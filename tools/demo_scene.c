/* demo_scene.c: cutting the poncho, knotting the fringe, and directing body and hands. Only + - * / and sqrt are used,
 * so that every machine plays the same bits. */
#include "demo_scene.h"

#include "picture.h"

#include <stdlib.h>
#include <string.h>

typedef struct cut { /* how finely the poncho is made */
    uint32_t squares, opening;  /* threads' squares along a side of the cloth and of the neck's opening */
    double spacing;             /* m */
    size_t segments;            /* of a strand */
    double segment;             /* m */
    uint32_t strand_every;      /* border vertices with k % strand_every != 0 carry a strand */
} cut;

static const cut FINE = {104, 18, 0.006, 24, 0.005, 4};
static const cut COARSE = {26, 4, 0.024, 6, 0.02, 2};

static const host_fabric FABRIC = {.mass_per_area = 0.25, .stretch = 400, .shear = 40, .bending = 3.3e-6,
                                   .half_thickness = 0.75e-3, .friction = 0.3};
static const host_yarn YARN = {.mass_per_length = 4.5e-4, .stretch = 1.0, .bending = 2e-9, .radius = 0.6e-3,
                               .friction = 0.3};
#define KNOT_LENGTH 2.0e-3     /* m, from the cloth's border to a strand's first point */
#define KNOT_STIFFNESS 200.0   /* N/m */
#define HAND_STIFFNESS 60.0    /* N/m, per held vertex */
#define HAND_FORCE 0.08        /* N, per held vertex */
#define HANDS 4u
#define HELD_EACH 6u           /* vertices in one hand: the six nearest a corner */
#define START_HEIGHT 1.05      /* m */

/* ---- the cloth ---- */

typedef struct sheet {
    size_t count, triangle_count;
    double (*pattern)[2];
    double (*position)[3];
    uint32_t (*triangles)[3];
    uint32_t *index; /* vertex of grid point (i, j), or UINT32_MAX inside the opening */
} sheet;

/* Cloth coordinates to space: the square stands on its corner, corners left, right, front and back; slightly bent, so
 * that nothing starts in one plane. */
static void place(double u, double v, double out[3])
{
    const double half_root = 0.70710678118654752;
    double x = half_root * (u - v), y = half_root * (u + v);
    out[0] = x;
    out[1] = y;
    out[2] = START_HEIGHT + 0.12 * x * x - 0.09 * y * y + 0.05 * x * y + 0.004 * x;
}

static int in_opening(const cut *c, uint32_t i, uint32_t j)
{
    uint32_t low = (c->squares - c->opening) / 2, high = low + c->opening;
    return i > low && i < high && j > low && j < high;
}

static int sheet_make(const cut *c, sheet *s)
{
    uint32_t side = c->squares + 1;
    memset(s, 0, sizeof *s);
    s->pattern = malloc((size_t)side * side * sizeof *s->pattern);
    s->position = malloc((size_t)side * side * sizeof *s->position);
    s->triangles = malloc((size_t)2 * c->squares * c->squares * sizeof *s->triangles);
    s->index = malloc((size_t)side * side * sizeof *s->index);
    if (!s->pattern || !s->position || !s->triangles || !s->index)
        return 0;
    for (uint32_t j = 0; j < side; j++)
        for (uint32_t i = 0; i < side; i++) {
            s->index[j * side + i] = UINT32_MAX;
            if (in_opening(c, i, j))
                continue;
            s->index[j * side + i] = (uint32_t)s->count;
            s->pattern[s->count][0] = ((double)i - 0.5 * c->squares) * c->spacing;
            s->pattern[s->count][1] = ((double)j - 0.5 * c->squares) * c->spacing;
            place(s->pattern[s->count][0], s->pattern[s->count][1], s->position[s->count]);
            s->count++;
        }
    for (uint32_t j = 0; j < c->squares; j++)
        for (uint32_t i = 0; i < c->squares; i++) {
            uint32_t low = (c->squares - c->opening) / 2, high = low + c->opening;
            if (i >= low && i < high && j >= low && j < high)
                continue;
            uint32_t q[4] = {s->index[j * side + i], s->index[j * side + i + 1], s->index[(j + 1) * side + i + 1],
                             s->index[(j + 1) * side + i]};
            uint32_t turn = (i + j) & 1; /* alternate diagonals: no direction is preferred */
            uint32_t *t = s->triangles[s->triangle_count++];
            t[0] = q[turn], t[1] = q[turn + 1], t[2] = q[turn + 2];
            t = s->triangles[s->triangle_count++];
            t[0] = q[turn], t[1] = q[turn + 2], t[2] = q[(turn + 3) % 4];
        }
    return 1;
}

static void sheet_free(sheet *s)
{
    free(s->pattern);
    free(s->position);
    free(s->triangles);
    free(s->index);
}

/* ---- the fringe ---- */

/* Grid point number k of the walk round the border, and the outward direction there. */
static void border_point(const cut *c, uint32_t k, uint32_t at[2], double out[2])
{
    uint32_t n = c->squares, along = k % n;
    const uint32_t point[4][2] = {{along, 0}, {n, along}, {n - along, n}, {0, n - along}};
    static const double outward[4][2] = {{0, -1}, {1, 0}, {0, 1}, {-1, 0}};
    memcpy(at, point[k / n], 2 * sizeof *at);
    memcpy(out, outward[k / n], 2 * sizeof *out);
}

static int add_fringe(demo_scene *scene, const cut *c, const sheet *s)
{
    uint32_t border = 4 * c->squares, at[2];
    size_t points = c->segments + 1, count = 0;
    double (*position)[3] = malloc(border * points * sizeof *position), out[2];
    uint32_t *root_of = malloc(border * sizeof *root_of);
    int done = position && root_of;
    for (uint32_t k = 0; done && k < border; k++) {
        if (k % c->strand_every == 0) /* corners among them: hands hold those */
            continue;
        border_point(c, k, at, out);
        root_of[count] = s->index[at[1] * (c->squares + 1) + at[0]];
        const double *root = s->pattern[root_of[count]];
        for (size_t p = 0; p < points; p++) {
            double away = KNOT_LENGTH + c->segment * (double)p;
            place(root[0] + away * out[0], root[1] + away * out[1], position[count * points + p]);
        }
        count++;
    }
    scene->strand_count = count;
    scene->points_each = points;
    done = done && host_add_strands(scene->h, "fringe", &YARN, count, points, (const double (*)[3])position,
                                    &scene->strand_first);
    for (size_t k = 0; done && k < count; k++)
        done = host_join(scene->h, (uint32_t)(scene->cloth_first + root_of[k]),
                         (uint32_t)(scene->strand_first + k * points), KNOT_STIFFNESS);
    free(position);
    free(root_of);
    return done;
}

/* ---- the hands ---- */

static int add_hands(demo_scene *scene, const cut *c, const sheet *s)
{
    uint32_t n = c->squares;
    /* left (-x), right (+x), front (-y), back (+y) */
    const uint32_t corner[HANDS][2] = {{0, n}, {n, 0}, {0, 0}, {n, n}};
    scene->hand_rest = malloc(HANDS * HELD_EACH * sizeof *scene->hand_rest);
    if (!scene->hand_rest)
        return 0;
    for (uint32_t hand = 0; hand < HANDS; hand++)
        for (uint32_t a = 0; a < 3; a++)
            for (uint32_t b = 0; a + b < 3; b++) {
                uint32_t i = corner[hand][0] ? n - a : a, j = corner[hand][1] ? n - b : b;
                size_t vertex = scene->cloth_first + s->index[j * (n + 1) + i];
                memcpy(scene->hand_rest[scene->hand_count++], scene->h->position[vertex], 3 * sizeof(double));
                if (!host_add_pull(scene->h, (uint32_t)vertex, HAND_STIFFNESS, HAND_FORCE))
                    return 0;
            }
    return 1;
}

/* ---- colours ---- */

/* Two light bands run along the border. Both triangles of a square have one colour. */
static uint8_t band_colour(const cut *c, const uint32_t triangle[3], const sheet *s)
{
    double half = 0.5 * c->squares * c->spacing, nearest = half;
    for (int side = 0; side < 2; side++) {
        double low = half, high = -half;
        for (int k = 0; k < 3; k++) {
            double place = s->pattern[triangle[k]][side];
            low = place < low ? place : low;
            high = place > high ? place : high;
        }
        double middle = 0.5 * (low + high), inside = half - (middle < 0 ? -middle : middle);
        nearest = inside < nearest ? inside : nearest;
    }
    return (nearest > 0.03 && nearest < 0.048) || (nearest > 0.06 && nearest < 0.066) ? PICTURE_BAND : PICTURE_CLOTH;
}

static int paint(demo_scene *scene, const cut *c, const sheet *s)
{
    const host *h = scene->h;
    scene->triangle_colour = malloc(h->triangle_count + 1);
    scene->segment_colour = malloc(h->segment_count + 1);
    if (!scene->triangle_colour || !scene->segment_colour)
        return 0;
    for (size_t t = 0; t < h->triangle_count; t++)
        scene->triangle_colour[t] = t < s->triangle_count ? band_colour(c, s->triangles[t], s) : PICTURE_BODY;
    memset(scene->segment_colour, PICTURE_YARN, h->segment_count);
    return 1;
}

static int build(demo_scene *scene, const mesh *body, const cut *c)
{
    sheet s;
    int done = sheet_make(c, &s) &&
               host_add_cloth(scene->h, "poncho", &FABRIC, s.count, (const double (*)[2])s.pattern,
                              (const double (*)[3])s.position, s.triangle_count,
                              (const uint32_t (*)[3])s.triangles, &scene->cloth_first) &&
               add_fringe(scene, c, &s) && add_hands(scene, c, &s) &&
               host_add_body(scene->h, "figure", 0.0, 0.3, body->point_count, (const double (*)[3])body->points,
                             body->face_count, (const uint32_t (*)[3])body->faces, &scene->body_first) &&
               paint(scene, c, &s);
    scene->cloth_triangle_count = s.triangle_count;
    sheet_free(&s);
    if (!done)
        return 0;
    scene->body_count = body->point_count;
    scene->body_rest = malloc(body->point_count * sizeof *scene->body_rest);
    if (!scene->body_rest)
        return 0;
    memcpy(scene->body_rest, body->points, body->point_count * sizeof *scene->body_rest);
    return host_finish(scene->h);
}

demo_scene *demo_scene_create(const mesh *body, int small)
{
    demo_scene *scene = calloc(1, sizeof *scene);
    if (!scene)
        return NULL;
    scene->steps_per_picture = 2;
    scene->step = 1.0 / (DEMO_PICTURE_RATE * (double)scene->steps_per_picture);
    scene->h = host_create();
    if (scene->h)
        scene->h->solver_tolerance = 5e-3; /* leaves about 2e-3 m/s: far less than contact corrects */
    if (!scene->h || !build(scene, body, small ? &COARSE : &FINE)) {
        demo_scene_destroy(scene);
        return NULL;
    }
    return scene;
}

void demo_scene_destroy(demo_scene *scene)
{
    if (!scene)
        return;
    host_destroy(scene->h);
    free(scene->body_rest);
    free(scene->hand_rest);
    free(scene->triangle_colour);
    free(scene->segment_colour);
    free(scene);
}

/* ---- direction ---- */

/* 0 before `from`, 1 after `to`, smooth in between. */
static double ease(double time, double from, double to)
{
    double s = (time - from) / (to - from);
    if (s <= 0)
        return 0;
    return s >= 1 ? 1 : s * s * (3 - 2 * s);
}

/* Turns about the vertical axis by the angle whose half has the tangent q. */
static void turn(double q, const double in[3], double out[3])
{
    double square = q * q, cosine = (1 - square) / (1 + square), sine = 2 * q / (1 + square);
    out[0] = cosine * in[0] - sine * in[1];
    out[1] = sine * in[0] + cosine * in[1];
    out[2] = in[2];
}

void demo_scene_direct(demo_scene *scene, double time)
{
    host *h = scene->h;
    double q = 0.70 * ease(time, 1.75, 2.9) - 1.10 * ease(time, 3.2, 4.6);
    for (size_t i = 0; i < scene->body_count; i++)
        turn(q, scene->body_rest[i], h->target[scene->body_first + i]);
    double lower = ease(time, 0.4, 1.5), drag = ease(time, 2.6, 3.2) - 2 * ease(time, 3.4, 4.2);
    for (size_t k = 0; k < scene->hand_count; k++) {
        host_pull *pull = &h->pulls[k];
        size_t hand = k / HELD_EACH;
        int aside = hand < 2;
        const double *rest = scene->hand_rest[k];
        pull->target[0] = rest[0] * (1 - 0.30 * lower) + (aside ? 0.11 * drag : 0);
        pull->target[1] = rest[1] * (1 - 0.30 * lower);
        pull->target[2] = rest[2] - 0.43 * lower + (aside ? 0.05 * drag * (hand ? 1 : -1) : 0);
        pull->stiffness = time < (aside ? 4.4 : 1.6) ? HAND_STIFFNESS : 0;
    }
}
