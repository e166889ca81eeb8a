/* picture_light.c: soft daylight: many parallel lights over the sky, each with a depth map of its own, so that folds,
 * contact and the inside of cloth are as dark as they should be. */
#include "picture.h"

#include <float.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { LIGHTS = 25, MAP_SIDE = 640, OVERSAMPLE = 2 };

typedef struct light {
    double to[3]; /* unit vector towards the light */
    float colour[3];
    picture_buffer map;
} light;

/* Linear light reflected by each palette entry. */
static const float PALETTE[PICTURE_COLOURS][3] = {
    {0.62f, 0.61f, 0.60f}, {0.60f, 0.47f, 0.38f}, {0.035f, 0.16f, 0.22f}, {0.72f, 0.66f, 0.52f}, {0.78f, 0.72f, 0.58f}};
static const float SKY_TOP[3] = {0.66f, 0.70f, 0.74f}, SKY_FOOT[3] = {0.86f, 0.86f, 0.85f};

/* One warm key light high on the left, behind the camera; the rest spread evenly over the upper half of the sky
 * (a spiral of equal areas). */
static void place_lights(light lights[LIGHTS], const picture_camera *camera)
{
    double back[3] = {camera->eye[0] - camera->look[0], camera->eye[1] - camera->look[1], 0};
    double length = sqrt(back[0] * back[0] + back[1] * back[1]);
    double bx = length > 0 ? back[0] / length : 0, by = length > 0 ? back[1] / length : -1;
    for (int i = 0; i < LIGHTS; i++) {
        double z = 0.06 + 0.94 * (i + 0.5) / LIGHTS, flat = sqrt(1 - z * z), angle = 2.399963229728653 * i;
        double to[3] = {flat * cos(angle), flat * sin(angle), z};
        float strength = 1.05f / LIGHTS * (float)(0.55 + 0.45 * z);
        if (i == 0) { /* towards the camera, turned to its left */
            to[0] = 0.48 * bx + 0.52 * by;
            to[1] = 0.48 * by - 0.52 * bx;
            to[2] = 0.70;
            length = sqrt(to[0] * to[0] + to[1] * to[1] + to[2] * to[2]);
            for (int k = 0; k < 3; k++)
                to[k] /= length;
        }
        memcpy(lights[i].to, to, sizeof to);
        const float warm[3] = {1.10f, 1.04f, 0.94f}, cool[3] = {0.95f * strength, 1.0f * strength, 1.06f * strength};
        memcpy(lights[i].colour, i == 0 ? warm : cool, sizeof cool);
    }
}

static void bounds(const picture_model *model, double middle[3], double *radius)
{
    double low[3] = {DBL_MAX, DBL_MAX, DBL_MAX}, high[3] = {-DBL_MAX, -DBL_MAX, -DBL_MAX}, size = 0;
    for (size_t i = 0; i < model->vertex_count; i++)
        for (int k = 0; k < 3; k++) {
            low[k] = fmin(low[k], model->position[i][k]);
            high[k] = fmax(high[k], model->position[i][k]);
        }
    for (int k = 0; k < 3; k++) {
        middle[k] = 0.5 * (low[k] + high[k]);
        size += (high[k] - low[k]) * (high[k] - low[k]);
    }
    *radius = 0.5 * sqrt(size) + 1e-6;
}

static int light_maps(light lights[LIGHTS], const picture_model *model, const double (*normals)[3])
{
    double middle[3], radius;
    bounds(model, middle, &radius);
    for (int i = 0; i < LIGHTS; i++) {
        picture_buffer *map = &lights[i].map;
        double eye[3];
        map->width = map->height = MAP_SIDE;
        map->near = malloc(sizeof *map->near * MAP_SIDE * MAP_SIDE);
        if (!map->near)
            return 0;
        for (size_t s = 0; s < (size_t)MAP_SIDE * MAP_SIDE; s++)
            map->near[s] = -FLT_MAX;
        for (int k = 0; k < 3; k++)
            eye[k] = middle[k] + 2 * radius * lights[i].to[k];
        picture_aim(&map->lens, eye, middle);
        map->lens.parallel = 1;
        map->lens.scale = 0.5 * MAP_SIDE / radius;
        map->lens.middle[0] = map->lens.middle[1] = 0.5 * MAP_SIDE;
        picture_draw(map, model, normals);
    }
    return 1;
}

static int open_at(const picture_buffer *map, int x, int y, double near)
{
    return x < 0 || y < 0 || x >= MAP_SIDE || y >= MAP_SIDE || near >= (double)map->near[y * MAP_SIDE + x];
}

/* Share of a light that reaches a place. The key light's shadows have edges, so four neighbouring entries of its map are
 * weighed; among the many others one entry each will do. */
static double open_share(const light *l, const double place[3], int is_key)
{
    double pixel[2], near, sum = 0;
    picture_project(&l->map.lens, place, pixel, &near);
    if (!is_key)
        return open_at(&l->map, (int)pixel[0], (int)pixel[1], near);
    double x = pixel[0] - 0.5, y = pixel[1] - 0.5, fx = floor(x), fy = floor(y);
    for (int j = 0; j < 2; j++)
        for (int i = 0; i < 2; i++)
            if (open_at(&l->map, (int)fx + i, (int)fy + j, near))
                sum += (i ? x - fx : 1 - x + fx) * (j ? y - fy : 1 - y + fy);
    return sum;
}

static void shade(const light lights[LIGHTS], const picture_buffer *buffer, int x, int y, double floor_radius,
                  float out[3])
{
    const picture_sample *sample = &buffer->samples[(size_t)y * (size_t)buffer->width + (size_t)x];
    float height = (float)y / (float)buffer->height, sky[3], sum[3] = {0, 0, 0};
    for (int k = 0; k < 3; k++)
        out[k] = sky[k] = SKY_TOP[k] + (SKY_FOOT[k] - SKY_TOP[k]) * height;
    if (!sample->filled)
        return;
    double place[3], normal[3], view[3], length = 0, facing = 0;
    picture_unproject(&buffer->lens, x + 0.5, y + 0.5, (double)sample->near, place);
    for (int k = 0; k < 3; k++) {
        normal[k] = (double)sample->normal[k];
        view[k] = buffer->lens.eye[k] - place[k];
        length += normal[k] * normal[k];
        facing += normal[k] * view[k];
    }
    length = (facing < 0 ? -1.0 : 1.0) / sqrt(length > 0 ? length : 1.0);
    for (int k = 0; k < 3; k++) {
        normal[k] *= length;
        place[k] += 0.004 * normal[k]; /* out of the surface's own shadow: more than an entry of a map is wide */
    }
    for (int i = 0; i < LIGHTS; i++) {
        double slope = normal[0] * lights[i].to[0] + normal[1] * lights[i].to[1] + normal[2] * lights[i].to[2];
        if (slope <= 0)
            continue;
        float share = (float)(slope * open_share(&lights[i], place, i == 0));
        for (int k = 0; k < 3; k++)
            sum[k] += share * lights[i].colour[k];
    }
    float bounce = (float)(0.10 - 0.06 * normal[2]); /* from the floor and everything around */
    for (int k = 0; k < 3; k++)
        out[k] = PALETTE[sample->colour][k] * (sum[k] + bounce);
    if (sample->colour == PICTURE_FLOOR) { /* the floor fades into the background */
        double far = sqrt(place[0] * place[0] + place[1] * place[1]) / floor_radius;
        float fade = (float)(far >= 1 ? 1 : far * far * (3 - 2 * far));
        for (int k = 0; k < 3; k++)
            out[k] = out[k] * (1 - fade) + sky[k] * fade;
    }
}

static void vertex_normals(const picture_model *model, double (*normals)[3])
{
    memset(normals, 0, model->vertex_count * sizeof *normals);
    for (size_t t = 0; t < model->triangle_count; t++) {
        const uint32_t *v = model->triangles[t];
        const double *a = model->position[v[0]], *b = model->position[v[1]], *c = model->position[v[2]];
        double e[3] = {b[0] - a[0], b[1] - a[1], b[2] - a[2]}, f[3] = {c[0] - a[0], c[1] - a[1], c[2] - a[2]};
        const double n[3] = {e[1] * f[2] - e[2] * f[1], e[2] * f[0] - e[0] * f[2], e[0] * f[1] - e[1] * f[0]};
        for (int k = 0; k < 3; k++)
            for (int i = 0; i < 3; i++)
                normals[v[i]][k] += n[k];
    }
    for (size_t i = 0; i < model->vertex_count; i++) {
        double length = sqrt(normals[i][0] * normals[i][0] + normals[i][1] * normals[i][1] +
                             normals[i][2] * normals[i][2]);
        for (int k = 0; length > 0 && k < 3; k++)
            normals[i][k] /= length;
    }
}

/* Displayed brightness of linear light: a soft shoulder above 0.8, then the square root. */
static uint32_t display(float linear)
{
    float x = linear > 0 ? linear : 0;
    if (x > 0.8f)
        x = 0.8f + (x - 0.8f) / (1.0f + (x - 0.8f) / 0.2f);
    float shown = 255.0f * sqrtf(x > 1 ? 1 : x);
    return (uint32_t)(shown + 0.5f);
}

static void develop(const light lights[LIGHTS], const picture_buffer *buffer, double floor_radius,
                    cairo_surface_t *surface)
{
    int width = buffer->width / OVERSAMPLE, height = buffer->height / OVERSAMPLE;
    int stride = cairo_image_surface_get_stride(surface);
    unsigned char *data = cairo_image_surface_get_data(surface);
    cairo_surface_flush(surface);
    for (int y = 0; y < height; y++)
        for (int x = 0; x < width; x++) {
            float sum[3] = {0, 0, 0}, one[3];
            for (int j = 0; j < OVERSAMPLE; j++)
                for (int i = 0; i < OVERSAMPLE; i++) {
                    shade(lights, buffer, OVERSAMPLE * x + i, OVERSAMPLE * y + j, floor_radius, one);
                    for (int k = 0; k < 3; k++)
                        sum[k] += one[k] / (OVERSAMPLE * OVERSAMPLE);
                }
            uint32_t pixel = 0xff000000u | display(sum[0]) << 16 | display(sum[1]) << 8 | display(sum[2]);
            memcpy(data + (size_t)y * (size_t)stride + 4 * (size_t)x, &pixel, sizeof pixel);
        }
    cairo_surface_mark_dirty(surface);
}

static void draw_marks(const picture_buffer *buffer, const picture_mark marks[], size_t count, cairo_surface_t *surface)
{
    cairo_t *pen = cairo_create(surface);
    for (size_t m = 0; m < count; m++) {
        double pixel[2], near;
        if (!picture_project(&buffer->lens, marks[m].place, pixel, &near) || pixel[0] < 0 || pixel[1] < 0 ||
            pixel[0] >= buffer->width || pixel[1] >= buffer->height)
            continue;
        const picture_sample *over = &buffer->samples[(size_t)pixel[1] * (size_t)buffer->width + (size_t)pixel[0]];
        if (over->filled && 1.0 / near > 1.0 / (double)over->near + 0.004)
            continue;
        cairo_set_source_rgba(pen, (double)marks[m].colour[0], (double)marks[m].colour[1], (double)marks[m].colour[2],
                              0.9);
        cairo_arc(pen, pixel[0] / OVERSAMPLE, pixel[1] / OVERSAMPLE, (double)marks[m].radius, 0, 6.2831853);
        cairo_fill(pen);
    }
    cairo_destroy(pen);
}

cairo_surface_t *picture_render(const picture_model *model, const picture_camera *camera, int width, int height,
                                const picture_mark marks[], size_t mark_count)
{
    light *lights = calloc(LIGHTS, sizeof *lights);
    double (*normals)[3] = malloc((model->vertex_count + 1) * sizeof *normals);
    picture_buffer buffer = {.width = width * OVERSAMPLE, .height = height * OVERSAMPLE};
    buffer.samples = calloc((size_t)buffer.width * (size_t)buffer.height, sizeof *buffer.samples);
    cairo_surface_t *surface = cairo_image_surface_create(CAIRO_FORMAT_ARGB32, width, height);
    int done = lights && normals && buffer.samples && cairo_surface_status(surface) == CAIRO_STATUS_SUCCESS;
    if (done) {
        double away[3], distance = 0;
        for (int k = 0; k < 3; k++) {
            away[k] = camera->look[k] - camera->eye[k];
            distance += away[k] * away[k];
        }
        picture_aim(&buffer.lens, camera->eye, camera->look);
        buffer.lens.scale = 0.5 * buffer.height * sqrt(distance) / camera->half_height;
        buffer.lens.middle[0] = 0.5 * buffer.width;
        buffer.lens.middle[1] = 0.5 * buffer.height;
        vertex_normals(model, normals);
        place_lights(lights, camera);
        done = light_maps(lights, model, (const double (*)[3])normals);
    }
    if (done) {
        picture_draw(&buffer, model, (const double (*)[3])normals);
        develop(lights, &buffer, model->floor_radius, surface);
        draw_marks(&buffer, marks, mark_count, surface);
    }
    for (int i = 0; lights && i < LIGHTS; i++)
        free(lights[i].map.near);
    free(lights);
    free(normals);
    free(buffer.samples);
    if (done)
        return surface;
    cairo_surface_destroy(surface);
    return NULL;
}
