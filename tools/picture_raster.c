/* picture_raster.c: from triangles and strands to a buffer of samples with depth and normal. */
#include "picture.h"

#include <math.h>
#include <string.h>

static double dot(const double a[3], const double b[3])
{
    return a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
}

static void cross(const double a[3], const double b[3], double out[3])
{
    out[0] = a[1] * b[2] - a[2] * b[1];
    out[1] = a[2] * b[0] - a[0] * b[2];
    out[2] = a[0] * b[1] - a[1] * b[0];
}

static void unit(double a[3])
{
    double length = sqrt(dot(a, a));
    for (int k = 0; length > 0 && k < 3; k++)
        a[k] /= length;
}

void picture_aim(picture_lens *lens, const double eye[3], const double look[3])
{
    static const double vertical[3] = {0, 0, 1}, forward[3] = {0, 1, 0};
    memcpy(lens->eye, eye, sizeof lens->eye);
    for (int k = 0; k < 3; k++)
        lens->ahead[k] = look[k] - eye[k];
    unit(lens->ahead);
    cross(lens->ahead, fabs(lens->ahead[2]) > 0.999 ? forward : vertical, lens->right);
    unit(lens->right);
    cross(lens->right, lens->ahead, lens->up);
}

int picture_project(const picture_lens *lens, const double point[3], double pixel[2], double *near)
{
    double d[3] = {point[0] - lens->eye[0], point[1] - lens->eye[1], point[2] - lens->eye[2]};
    double depth = dot(d, lens->ahead), scale = lens->scale;
    if (!lens->parallel) {
        if (depth < 1e-3)
            return 0;
        scale /= depth;
    }
    pixel[0] = lens->middle[0] + scale * dot(d, lens->right);
    pixel[1] = lens->middle[1] - scale * dot(d, lens->up);
    *near = lens->parallel ? -depth : 1.0 / depth;
    return 1;
}

void picture_unproject(const picture_lens *lens, double x, double y, double near, double point[3])
{
    double depth = lens->parallel ? -near : 1.0 / near;
    double scale = lens->parallel ? 1.0 / lens->scale : depth / lens->scale;
    double a = (x - lens->middle[0]) * scale, b = (lens->middle[1] - y) * scale;
    for (int k = 0; k < 3; k++)
        point[k] = lens->eye[k] + depth * lens->ahead[k] + a * lens->right[k] + b * lens->up[k];
}

typedef struct corner {
    double pixel[2], near, normal[3];
} corner;

static void put(picture_buffer *buffer, int x, int y, double near, const double normal[3], uint8_t colour)
{
    size_t at = (size_t)y * (size_t)buffer->width + (size_t)x;
    if (buffer->near) {
        if ((float)near > buffer->near[at])
            buffer->near[at] = (float)near;
        return;
    }
    picture_sample *sample = &buffer->samples[at];
    if (sample->filled && (float)near <= sample->near)
        return;
    sample->near = (float)near;
    for (int k = 0; k < 3; k++)
        sample->normal[k] = (float)normal[k];
    sample->colour = colour;
    sample->filled = 1;
}

static int clamp(double value, int limit)
{
    if (value < 0)
        return 0;
    return value > limit ? limit : (int)value;
}

/* Samples at pixel centres; both sides of a triangle are seen. */
static void fill(picture_buffer *buffer, const corner c[3], uint8_t colour)
{
    double ax = c[1].pixel[0] - c[0].pixel[0], ay = c[1].pixel[1] - c[0].pixel[1];
    double bx = c[2].pixel[0] - c[0].pixel[0], by = c[2].pixel[1] - c[0].pixel[1], area = ax * by - ay * bx;
    if (!(fabs(area) > 0))
        return;
    double low[2], high[2];
    for (int k = 0; k < 2; k++) {
        low[k] = fmin(c[0].pixel[k], fmin(c[1].pixel[k], c[2].pixel[k]));
        high[k] = fmax(c[0].pixel[k], fmax(c[1].pixel[k], c[2].pixel[k]));
    }
    int x0 = clamp(low[0], buffer->width), x1 = clamp(high[0] + 1, buffer->width);
    int y0 = clamp(low[1], buffer->height), y1 = clamp(high[1] + 1, buffer->height);
    for (int y = y0; y < y1; y++)
        for (int x = x0; x < x1; x++) {
            double px = x + 0.5 - c[0].pixel[0], py = y + 0.5 - c[0].pixel[1], normal[3];
            double v = (px * by - py * bx) / area, w = (ax * py - ay * px) / area, u = 1.0 - v - w;
            if (u < 0 || v < 0 || w < 0)
                continue;
            for (int k = 0; k < 3; k++)
                normal[k] = u * c[0].normal[k] + v * c[1].normal[k] + w * c[2].normal[k];
            put(buffer, x, y, u * c[0].near + v * c[1].near + w * c[2].near, normal, colour);
        }
}

static void draw_triangle(picture_buffer *buffer, const double *const point[3], const double *const normal[3],
                          uint8_t colour)
{
    corner c[3];
    for (int k = 0; k < 3; k++) {
        if (!picture_project(&buffer->lens, point[k], c[k].pixel, &c[k].near))
            return;
        memcpy(c[k].normal, normal[k], sizeof c[k].normal);
    }
    fill(buffer, c, colour);
}

/* A strand's segment: a ribbon that faces the eye, shaded like a cylinder by turning the normal across it; never
 * narrower than one sample. */
static void draw_segment(picture_buffer *buffer, const double a[3], const double b[3], double radius, uint8_t colour)
{
    corner c[4];
    double tangent[3], view[3], side[3], facing[3];
    for (int k = 0; k < 3; k++) {
        tangent[k] = b[k] - a[k];
        view[k] = buffer->lens.parallel ? -buffer->lens.ahead[k] : buffer->lens.eye[k] - a[k];
    }
    unit(tangent);
    unit(view);
    cross(tangent, view, side);
    unit(side);
    cross(side, tangent, facing);
    if (!picture_project(&buffer->lens, a, c[0].pixel, &c[0].near) ||
        !picture_project(&buffer->lens, b, c[2].pixel, &c[2].near))
        return;
    double dx = c[2].pixel[0] - c[0].pixel[0], dy = c[2].pixel[1] - c[0].pixel[1], length = sqrt(dx * dx + dy * dy);
    double half = radius * buffer->lens.scale * (buffer->lens.parallel ? 1.0 : c[0].near);
    if (!(length > 0))
        return;
    half = half > 0.5 ? half : 0.5;
    c[1] = c[0];
    c[3] = c[2];
    for (int k = 0; k < 4; k++) {
        double across = k & 1 ? -half : half;
        c[k].pixel[0] -= across * dy / length;
        c[k].pixel[1] += across * dx / length;
        for (int n = 0; n < 3; n++)
            c[k].normal[n] = 0.8 * facing[n] + (k & 1 ? -0.6 : 0.6) * side[n];
    }
    const corner one[3] = {c[0], c[1], c[2]}, two[3] = {c[1], c[3], c[2]};
    fill(buffer, one, colour);
    fill(buffer, two, colour);
}

static void draw_floor(picture_buffer *buffer, double radius)
{
    static const double vertical[3] = {0, 0, 1}, middle[3] = {0, 0, 0};
    enum { SIDES = 72 };
    double last[3] = {radius, 0, 0};
    for (int s = 1; s <= SIDES; s++) {
        double angle = 6.283185307179586 * s / SIDES;
        double next[3] = {radius * cos(angle), radius * sin(angle), 0};
        const double *const points[3] = {middle, last, next}, *const normals[3] = {vertical, vertical, vertical};
        draw_triangle(buffer, points, normals, PICTURE_FLOOR);
        memcpy(last, next, sizeof last);
    }
}

void picture_draw(picture_buffer *buffer, const picture_model *model, const double (*normals)[3])
{
    if (model->floor_radius > 0 && !buffer->near)
        draw_floor(buffer, model->floor_radius);
    for (size_t t = 0; t < model->triangle_count; t++) {
        const uint32_t *v = model->triangles[t];
        const double *const points[3] = {model->position[v[0]], model->position[v[1]], model->position[v[2]]};
        const double *const shades[3] = {normals[v[0]], normals[v[1]], normals[v[2]]};
        draw_triangle(buffer, points, shades, model->triangle_colour[t]);
    }
    for (size_t s = 0; s < model->segment_count; s++)
        draw_segment(buffer, model->position[model->segments[s][0]], model->position[model->segments[s][1]],
                     model->radius, model->segment_colour[s]);
}
