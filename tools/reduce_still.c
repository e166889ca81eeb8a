/* reduce_still.c: the result of a reduction as a still: start and proposed side by side, a mark where it happens. */
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "reduce.h"

#ifdef RADDLE_DEMO

#include <math.h>

#include "picture.h"

enum { WIDTH = 620, HEIGHT = 620 };

static const float MARK_COLOUR[3] = {0.92f, 0.08f, 0.08f};

/* The renderer's distances are those of a room, so the scene is shown a metre wide. */
typedef struct stage {
    double middle[3], scale, (*x)[3];
    uint8_t *triangle_colour, *segment_colour;
} stage;

static void fit(stage *s, const reduced *r)
{
    double lo[3] = {HUGE_VAL, HUGE_VAL, HUGE_VAL}, hi[3] = {-HUGE_VAL, -HUGE_VAL, -HUGE_VAL}, widest = 0;
    for (size_t i = 0; i < 3 * r->s.scene.vertex_count; i++) {
        lo[i % 3] = fmin(lo[i % 3], fmin(r->s.start[i], r->s.proposed[i]));
        hi[i % 3] = fmax(hi[i % 3], fmax(r->s.start[i], r->s.proposed[i]));
    }
    for (int k = 0; k < 3; k++) {
        s->middle[k] = 0.5 * (lo[k] + hi[k]);
        widest = fmax(widest, hi[k] - lo[k]);
    }
    s->scale = widest > 0 ? 1 / widest : 1;
}

static cairo_surface_t *draw(stage *s, const reduced *r, const double *state, const finding *found)
{
    static const picture_camera camera = {{1.5, -2.6, 1.6}, {0, 0, 0}, 0.85};
    const rdl_scene *scene = &r->s.scene;
    picture_mark mark = {.radius = 7};
    memcpy(mark.colour, MARK_COLOUR, sizeof mark.colour);
    for (size_t v = 0; v < scene->vertex_count; v++)
        for (size_t k = 0; k < 3; k++)
            s->x[v][k] = (state[3 * v + k] - s->middle[k]) * s->scale;
    for (size_t k = 0; found->has_place && k < 3; k++)
        mark.place[k] = s->x[found->vertex][k];
    const picture_model model = {.vertex_count = scene->vertex_count,
                                 .triangle_count = scene->triangle_count,
                                 .segment_count = scene->segment_count,
                                 .position = (const double(*)[3])s->x,
                                 .triangles = scene->triangles,
                                 .triangle_colour = s->triangle_colour,
                                 .segments = scene->segments,
                                 .segment_colour = s->segment_colour,
                                 .radius = 0.006};
    return picture_render(&model, &camera, WIDTH, HEIGHT, &mark, found->has_place ? 1 : 0);
}

static bool render(const reduced *r, const finding *found, const char *path)
{
    const rdl_scene *scene = &r->s.scene;
    stage s;
    bool done = false;
    fit(&s, r);
    s.x = malloc((scene->vertex_count + 1) * sizeof *s.x);
    s.triangle_colour = malloc(scene->triangle_count + 1);
    s.segment_colour = malloc(scene->segment_count + 1);
    if (s.x != NULL && s.triangle_colour != NULL && s.segment_colour != NULL) {
        for (size_t t = 0; t < scene->triangle_count; t++)
            s.triangle_colour[t] = scene->parts[scene->vertex_part[scene->triangles[t][0]]].kind == RDL_BODY
                                       ? PICTURE_BODY
                                       : PICTURE_CLOTH;
        memset(s.segment_colour, PICTURE_YARN, scene->segment_count + 1);
        picture_panel panels[2] = {{draw(&s, r, r->s.start, found), "Start", NULL},
                                   {draw(&s, r, r->s.proposed, found), "Proposed", NULL}};
        picture_key key = {.text = "where it happens"};
        memcpy(key.colour, MARK_COLOUR, sizeof key.colour);
        done = panels[0].image != NULL && panels[1].image != NULL &&
               picture_page(path, "Reduced scene", found->what, panels, 2, &key, 1) != 0;
        for (int k = 0; k < 2; k++)
            if (panels[k].image != NULL)
                cairo_surface_destroy(panels[k].image);
    }
    free(s.x);
    free(s.triangle_colour);
    free(s.segment_colour);
    return done;
}

int reduce_write_still(const reduced *r, const finding *found, const char *path)
{
    char beside[4300];
    snprintf(beside, sizeof beside, "%s.new-%ld", path, (long)getpid());
    cli_pending(beside);
    bool done = render(r, found, beside) && rename(beside, path) == 0;
    if (!done)
        unlink(beside);
    cli_pending(NULL);
    if (done)
        return CLI_DONE;
    cli_error("reduce", "%s: cannot be written", cli_clean(path));
    return CLI_NOT_FINISHED;
}

#else

int reduce_write_still(const reduced *r, const finding *found, const char *path)
{
    (void)r;
    (void)found;
    (void)path;
    return CLI_DONE; /* a program built without a renderer has no stills */
}

#endif
