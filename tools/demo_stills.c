/* demo_stills.c: before and after. Before: where the integrator ends when it runs alone for an eighth of a second from
 * a clean state. After: the delivered state at the same moment. */
#include "demo.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <raddle/rest.h>

#include "picture.h"

enum { ALONE = 3 /* at most */, WIDTH = 780, HEIGHT = 900 }; /* pictures that the host runs alone; size of a panel */

typedef struct moment {
    double share; /* of all pictures */
    picture_camera camera;
} moment;

static const moment MOMENTS[DEMO_STILLS] = {{0.37, {{-1.0, -2.2, 1.25}, {0, 0, 0.47}, 0.51}},
                                            {0.53, {{-1.0, -2.2, 1.25}, {0, 0, 0.47}, 0.51}},
                                            {0.78, {{-0.5, -1.35, 1.15}, {0, 0, 0.64}, 0.30}}};

/* What happens at a time (s) of the story that demo_scene_direct tells. */
static const char *title_at(double time)
{
    static const struct {
        double until;
        const char *title;
    } story[] = {{1.3, "Hands lower the poncho over the head"},
                 {2.0, "The poncho settles on the shoulders"},
                 {2.75, "The figure turns under the cloth"},
                 {4.45, "Two hands drag the cloth over the turning shoulders"}};
    for (size_t k = 0; k < sizeof story / sizeof story[0]; k++)
        if (time < story[k].until)
            return story[k].title;
    return "The hands have let go";
}

static const float CUT_COLOUR[3] = {0.92f, 0.08f, 0.08f}, CORRECTED_COLOUR[3] = {1.0f, 0.66f, 0.05f};

struct demo_stills {
    demo_scene *scene;
    const rdl_scene *described;
    const demo_options *options;
    double (*alone)[3];   /* where the host alone ended */
    float *square;        /* m^2, of the largest correction in this picture, per vertex */
};

size_t demo_still_path(const demo_options *options, int k, char path[], size_t path_size)
{
    const char *slash = strrchr(options->shot, '/'), *name = slash ? slash + 1 : options->shot;
    const char *dot = strrchr(name, '.');
    int length = dot && dot != name && dot - name < 200 ? (int)(dot - name) : 200; /* the shot's name without its ending */
    return (size_t)snprintf(path, path_size, "%s/%.*s-still-%d.png", options->folder, length, name, k + 1);
}

demo_stills *demo_stills_begin(demo_scene *scene, const rdl_scene *described, const demo_options *options)
{
    demo_stills *s = calloc(1, sizeof *s);
    if (!s)
        return NULL;
    size_t n = scene->h->vertex_count;
    s->scene = scene;
    s->described = described;
    s->options = options;
    s->alone = malloc(n * sizeof *s->alone);
    s->square = calloc(n, sizeof *s->square);
    if (!s->alone || !s->square) {
        demo_stills_end(s);
        return NULL;
    }
    return s;
}

void demo_stills_end(demo_stills *s)
{
    if (!s)
        return;
    free(s->alone);
    free(s->square);
    free(s);
}

/* The moment whose still shows the end of this picture, or NULL. */
static const moment *moment_of(const demo_stills *s, size_t picture)
{
    for (int m = 0; m < DEMO_STILLS; m++)
        if ((size_t)(MOMENTS[m].share * (double)s->options->pictures) == picture)
            return &MOMENTS[m];
    return NULL;
}

typedef struct saved {
    double (*position)[3], (*velocity)[3];
    host_support *support;
    size_t coupling_count;
} saved;

/* Runs the host without raddle from its present state, then puts everything back. */
static int run_alone(demo_stills *s, size_t picture, size_t pictures)
{
    host *h = s->scene->h;
    size_t n = h->vertex_count, each = s->scene->steps_per_picture;
    saved old = {malloc(n * sizeof *old.position), malloc(n * sizeof *old.velocity), malloc(n * sizeof *old.support),
                 h->coupling_count};
    int done = old.position && old.velocity && old.support;
    if (done) {
        memcpy(old.position, h->position, n * sizeof *old.position);
        memcpy(old.velocity, h->velocity, n * sizeof *old.velocity);
        memcpy(old.support, h->support, n * sizeof *old.support);
        host_clear_contacts(h);
        for (size_t k = 1; k <= pictures * each; k++) {
            demo_scene_direct(s->scene, s->scene->step * (double)(picture * each + k));
            host_propose(h, s->scene->step);
            host_accept(h, s->scene->step, (const double (*)[3])h->proposed, NULL, NULL);
        }
        memcpy(s->alone, h->position, n * sizeof *s->alone);
        memcpy(h->position, old.position, n * sizeof *old.position);
        memcpy(h->velocity, old.velocity, n * sizeof *old.velocity);
        memcpy(h->support, old.support, n * sizeof *old.support);
        h->coupling_count = old.coupling_count; /* the host alone has added none */
    }
    free(old.position);
    free(old.velocity);
    free(old.support);
    return done;
}

int demo_stills_before(demo_stills *s, size_t picture)
{
    memset(s->square, 0, s->scene->h->vertex_count * sizeof *s->square);
    if (!s->options->respond)
        return 1;
    for (size_t last = picture; last < picture + ALONE; last++)
        if (moment_of(s, last) && (picture == 0 || last == picture + ALONE - 1))
            return run_alone(s, picture, last + 1 - picture);
    return 1;
}

void demo_stills_watch(demo_stills *s, const double (*delivered)[3])
{
    const host *h = s->scene->h;
    for (size_t i = 0; i < h->soft_count; i++) {
        float square = 0;
        for (int k = 0; k < 3; k++) {
            float d = (float)(delivered[i][k] - h->proposed[i][k]);
            square += d * d;
        }
        if (square > s->square[i])
            s->square[i] = square;
    }
}

/* Where an edge goes through a triangle's plane. */
static void meeting_place(const double (*at)[3], const rdl_tangle *tangle, const uint32_t triangle[3], double out[3])
{
    const double *a = at[tangle->edge[0]], *b = at[tangle->edge[1]], *p = at[triangle[0]];
    double e[3], f[3], above = 0, below = 0;
    for (int k = 0; k < 3; k++) {
        e[k] = at[triangle[1]][k] - p[k];
        f[k] = at[triangle[2]][k] - p[k];
    }
    const double n[3] = {e[1] * f[2] - e[2] * f[1], e[2] * f[0] - e[0] * f[2], e[0] * f[1] - e[1] * f[0]};
    for (int k = 0; k < 3; k++) {
        above += n[k] * (a[k] - p[k]);
        below += n[k] * (b[k] - p[k]);
    }
    double share = above - below > 0 || above - below < 0 ? above / (above - below) : 0.5;
    for (int k = 0; k < 3; k++)
        out[k] = a[k] + share * (b[k] - a[k]);
}

/* Marks every piercing; *marks is the caller's to free. */
static int mark_cuts(const demo_stills *s, const double (*at)[3], picture_mark **marks, size_t *count)
{
    rdl_view view = {at, 0, RDL_FLOAT64};
    rdl_tangles tangles = {0, NULL};
    *count = 0;
    if (rdl_find_tangles(s->described, &view, 0, NULL, &tangles, NULL) != RDL_OK)
        return 0;
    *marks = malloc((tangles.count + 1) * sizeof **marks);
    for (size_t t = 0; *marks && t < tangles.count; t++) {
        if (tangles.items[t].relation != RDL_REST_PIERCE)
            continue;
        picture_mark *mark = &(*marks)[(*count)++];
        meeting_place(at, &tangles.items[t], s->described->triangles[tangles.items[t].triangle], mark->place);
        memcpy(mark->colour, CUT_COLOUR, sizeof mark->colour);
        mark->radius = 2.0f;
    }
    rdl_tangles_release(&tangles, NULL);
    return *marks != NULL;
}

static int mark_corrected(const demo_stills *s, picture_mark **marks, size_t *count, double *worst)
{
    const host *h = s->scene->h;
    *count = 0;
    *worst = 0;
    *marks = malloc((h->soft_count + 1) * sizeof **marks);
    for (size_t i = 0; *marks && i < h->soft_count; i++) {
        if (!(s->square[i] > 0))
            continue;
        picture_mark *mark = &(*marks)[(*count)++];
        memcpy(mark->place, h->position[i], sizeof mark->place);
        memcpy(mark->colour, CORRECTED_COLOUR, sizeof mark->colour);
        mark->radius = 1.7f;
        *worst = (double)s->square[i] > *worst ? (double)s->square[i] : *worst;
    }
    *worst = sqrt(*worst);
    return *marks != NULL;
}

static cairo_surface_t *draw(const demo_stills *s, const moment *m, const double (*at)[3], const picture_mark marks[],
                             size_t count)
{
    const host *h = s->scene->h;
    picture_model model = {.vertex_count = h->vertex_count, .triangle_count = h->triangle_count,
                           .segment_count = h->segment_count, .position = at,
                           .triangles = (const uint32_t (*)[3])h->triangles,
                           .triangle_colour = s->scene->triangle_colour,
                           .segments = (const uint32_t (*)[2])h->segments,
                           .segment_colour = s->scene->segment_colour, .radius = 0.6e-3, .floor_radius = 0.85};
    return picture_render(&model, &m->camera, WIDTH, HEIGHT, marks, count);
}

/* A page is written beside its final name and moved there when it is whole. */
static rdl_status write_page(const demo_stills *s, const moment *m, size_t picture, const picture_panel panels[],
                             size_t count, demo_result *result)
{
    static const picture_key keys[2] = {{{0.92f, 0.08f, 0.08f}, "an edge pierces a triangle"},
                                        {{1.0f, 0.66f, 0.05f}, "a vertex that raddle corrected in this picture"}};
    double time = s->scene->step * (double)(s->scene->steps_per_picture * (picture + 1));
    char subtitle[160], part[DEMO_PATH + 8], *path = result->stills[result->still_count];
    snprintf(subtitle, sizeof subtitle, "Picture %zu of %zu, t = %.2f s. %zu cloth triangles, %zu strands.", picture + 1,
             s->options->pictures, time, s->scene->cloth_triangle_count, s->scene->strand_count);
    demo_still_path(s->options, (int)(m - MOMENTS), path, DEMO_PATH);
    snprintf(part, sizeof part, "%s.part", path);
    if (!picture_page(part, title_at(time), subtitle, panels, count, keys, s->options->respond ? 2 : 1) ||
        rename(part, path) != 0) {
        remove(part);
        return RDL_WRITE_FAILED;
    }
    result->still_count++;
    return RDL_OK;
}

static int draw_before(demo_stills *s, const moment *m, size_t picture, const double (*at)[3], char caption[],
                       size_t caption_size, picture_panel *panel)
{
    picture_mark *marks = NULL;
    size_t cuts = 0;
    if (mark_cuts(s, at, &marks, &cuts))
        panel->image = draw(s, m, at, marks, cuts);
    free(marks);
    if (s->options->respond)
        snprintf(caption, caption_size, "%zu edges pierce a triangle, %.2f s after a clean state.", cuts,
                 (double)(picture + 1 < ALONE ? picture + 1 : ALONE) / DEMO_PICTURE_RATE);
    else
        snprintf(caption, caption_size, "%zu edges pierce a triangle.", cuts);
    panel->heading = "Before: the integrator alone";
    panel->caption = caption;
    return panel->image != NULL;
}

static int draw_after(demo_stills *s, const moment *m, char caption[], size_t caption_size, picture_panel *panel)
{
    const double (*at)[3] = (const double (*)[3])s->scene->h->position;
    picture_mark *marks = NULL, *none = NULL;
    size_t corrected = 0, cuts = 0;
    double worst = 0;
    if (mark_corrected(s, &marks, &corrected, &worst) && mark_cuts(s, at, &none, &cuts))
        panel->image = draw(s, m, at, marks, corrected);
    free(marks);
    free(none);
    snprintf(caption, caption_size, "%zu edges pierce a triangle. %zu vertices corrected, by %.2f mm at most.", cuts,
             corrected, 1e3 * worst);
    panel->heading = "After: delivered by raddle";
    panel->caption = caption;
    return panel->image != NULL;
}

rdl_status demo_stills_after(demo_stills *s, size_t picture, demo_result *result)
{
    const moment *m = moment_of(s, picture);
    picture_panel panels[2] = {{NULL, NULL, NULL}, {NULL, NULL, NULL}};
    char captions[2][160];
    size_t count = s->options->respond ? 2 : 1;
    if (!m)
        return RDL_OK;
    const double (*before)[3] = (const double (*)[3])(s->options->respond ? s->alone : s->scene->h->position);
    int drawn = draw_before(s, m, picture, before, captions[0], sizeof captions[0], &panels[0]) &&
                (count == 1 || draw_after(s, m, captions[1], sizeof captions[1], &panels[1]));
    rdl_status status = drawn ? write_page(s, m, picture, panels, count, result) : RDL_NO_MEMORY;
    for (size_t p = 0; p < count; p++)
        if (panels[p].image)
            cairo_surface_destroy(panels[p].image);
    return status;
}
