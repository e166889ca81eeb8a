/* raddle/scene.h: what the host describes once (scene) and per step (views).
 * Lengths in metres, masses in kilograms, times in seconds. Indices are 32 bit, counts below 2^31.
 * Usable from C17 and C++17. */
#ifndef RADDLE_SCENE_H
#define RADDLE_SCENE_H

#include <stddef.h>
#include <stdint.h>

#include "status.h"

#ifdef __cplusplus
extern "C" {
#endif

enum { RDL_STRANDS = 0, RDL_CLOTH = 1, RDL_BODY = 2 };  /* kind of part */
enum { RDL_FLOAT32 = 32, RDL_FLOAT64 = 64 };            /* number format of a view */

/* N x 3 numbers: vertex i's x, y, z are contiguous at data + i * stride bytes.
 * stride 0 = tightly packed. data must be aligned for its format. Borrowed for the call only. */
typedef struct rdl_view {
    const void *data;
    size_t stride;
    int format;
} rdl_view;

typedef struct rdl_output_view {
    void *data;
    size_t stride;
    int format;
} rdl_output_view;

/* A named set of elements of one kind. half_thickness: a strand's radius, half a cloth's thickness, m, >= 0.
 * friction: Coulomb coefficient, >= 0. name: UTF-8, may be NULL. */
typedef struct rdl_part {
    const char *name;
    int kind;
    double half_thickness;
    double friction;
} rdl_part;

typedef struct rdl_pair_friction {
    uint32_t part[2];
    double friction;
} rdl_pair_friction;

/* Everything is copied by rdl_engine_create; the host may free it afterwards. */
typedef struct rdl_scene {
    size_t size; /* sizeof(rdl_scene) */
    size_t part_count;
    const rdl_part *parts;
    size_t vertex_count;
    const uint32_t *vertex_part;     /* N: part of each vertex */
    const double *mass;              /* N, kg, > 0; infinity = driven */
    const double *half_thickness;    /* N, m, or NULL = the part's; an element uses its largest */
    size_t segment_count;
    const uint32_t (*segments)[2];   /* strand segments */
    size_t triangle_count;
    const uint32_t (*triangles)[3];  /* cloth and body triangles */
    size_t muted_count;
    const uint32_t (*muted_parts)[2];/* part pairs that ignore each other; (p, p) mutes self-contact */
    size_t attachment_count;
    const uint32_t (*attachments)[2];/* vertex pairs whose elements ignore each other */
    size_t pair_friction_count;
    const rdl_pair_friction *pair_friction; /* else the smaller of the two parts' coefficients */
} rdl_scene;

/* One step. start and proposed may differ in format and stride; delivered takes the format in which the result is
 * certified, and may be the same memory as proposed. start must not overlap delivered. */
typedef struct rdl_step {
    size_t size; /* sizeof(rdl_step) */
    rdl_view start, proposed;
    rdl_output_view delivered;
    double duration;       /* s, > 0: length of the step, for impulses and rates */
    const double *mass;    /* N or NULL = the scene's; may change from step to step */
    size_t muted_count;    /* further part pairs muted in this step only */
    const uint32_t (*muted_parts)[2];
    double seconds_max;    /* 0 = no limit: after this time the remaining zones go straight to the safe levels.
                              A limit in time gives up repeatable bits. */
    uint64_t passes_max;   /* 0 = the setting's: repeatable limit on passes of the whole step */
} rdl_step;

#ifdef __cplusplus
}
#endif
#endif
