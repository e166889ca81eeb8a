/* picture.h: stills: triangles and strands in soft daylight, drawn by a small z-buffer renderer into Cairo surfaces. */
#ifndef RADDLE_TOOLS_PICTURE_H
#define RADDLE_TOOLS_PICTURE_H

#include <stddef.h>
#include <stdint.h>

#include <cairo.h>

typedef struct picture_model {
    size_t vertex_count, triangle_count, segment_count;
    const double (*position)[3];     /* m, z up */
    const uint32_t (*triangles)[3];
    const uint8_t *triangle_colour;  /* per triangle, index into the palette */
    const uint32_t (*segments)[2];
    const uint8_t *segment_colour;   /* per segment */
    double radius;                   /* of a strand, m */
    double floor_radius;             /* m, of the round floor at z = 0; 0 = none */
} picture_model;

typedef struct picture_camera {
    double eye[3], look[3]; /* m */
    double half_height;     /* m, seen from the middle of the picture to its upper rim, at the distance of `look` */
} picture_camera;

typedef struct picture_mark {
    double place[3];     /* m */
    float colour[3];     /* 0 .. 1 */
    float radius;        /* pixels */
} picture_mark;

enum { PICTURE_FLOOR = 0, PICTURE_BODY = 1, PICTURE_CLOTH = 2, PICTURE_BAND = 3, PICTURE_YARN = 4, PICTURE_COLOURS = 5 };

/* Renders into a new ARGB surface of width x height pixels; marks are drawn as dots where nothing hides them by more
 * than 4 mm. NULL when memory ran out. */
cairo_surface_t *picture_render(const picture_model *model, const picture_camera *camera, int width, int height,
                                const picture_mark marks[], size_t mark_count);

/* ---- a page: title, panels side by side with captions, a legend, a footer ---- */
typedef struct picture_panel {
    cairo_surface_t *image;
    const char *heading;  /* above the image */
    const char *caption;  /* below it, or NULL */
} picture_panel;

typedef struct picture_key { /* an entry of the legend */
    float colour[3];
    const char *text;
} picture_key;

/* Writes a PNG. Returns 1, or 0 when the file could not be written. */
int picture_page(const char *path, const char *title, const char *subtitle, const picture_panel panels[],
                 size_t panel_count, const picture_key keys[], size_t key_count);

/* ---- used among the files of the renderer ---- */
typedef struct picture_lens {
    double eye[3], right[3], up[3], ahead[3];
    double scale;        /* pixels per unit at depth 1 (perspective) or anywhere (parallel) */
    double middle[2];    /* pixel of the axis */
    int parallel;
} picture_lens;

/* near: larger is nearer: 1 / depth for a perspective lens, -depth for a parallel one. */
typedef struct picture_sample {
    float near;
    float normal[3];
    uint8_t colour, filled, reserved[2];
} picture_sample;

typedef struct picture_buffer {
    int width, height;
    picture_lens lens;
    picture_sample *samples; /* full information, or NULL */
    float *near;             /* depth alone, or NULL */
} picture_buffer;

void picture_aim(picture_lens *lens, const double eye[3], const double look[3]);
/* Pixel and near value of a point; 0 when it lies behind the eye. */
int picture_project(const picture_lens *lens, const double point[3], double pixel[2], double *near);
void picture_unproject(const picture_lens *lens, double x, double y, double near, double point[3]);
/* Draws triangles (with the given vertex normals) and strands into the buffer. */
void picture_draw(picture_buffer *buffer, const picture_model *model, const double (*normals)[3]);

#endif
