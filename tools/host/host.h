/* host.h: a small implicit integrator for cloth and strands, the host that docs/integrate.md plugs raddle into.
 *
 * It knows nothing of contact: it proposes where the vertices would like to go, and accepts where they were delivered
 * (see couple.h). SI units throughout. One vertex array holds everything: cloths and strands first (the soft vertices,
 * which have equations of motion), bodies after them (driven vertices, which go where they are told).
 *
 * Integrator: linearly implicit Euler with conjugate gradients (Baraff & Witkin 1998, sections 3 and 5), solved for
 * the new velocities: (M + S) v1 = M v0 + h f, with S = (h^2 + h damping) K + h D. K: stiffness with each element's
 * part made positive semi-definite; D: air drag. Only + - * / and sqrt, in one fixed order: same bits on every run. */
#ifndef RADDLE_TOOLS_HOST_H
#define RADDLE_TOOLS_HOST_H

#include <stddef.h>
#include <stdint.h>

#include "matrix.h"

/* A woven fabric of the suiting kind: 0.25 kg/m^2, stretch 400 N/m, shear 40 N/m (real ones are stiffer by a multiple),
 * bending 3.3e-6 N m. The hinges of a regular mesh of right triangles triple the bending, so this stands for 1e-5. */
typedef struct host_fabric {
    double mass_per_area;  /* kg/m^2 */
    double stretch;        /* N/m: tension per width at unit strain, along both thread directions */
    double shear;          /* N/m */
    double bending;        /* N m, of a hinge */
    double half_thickness; /* m */
    double friction;       /* Coulomb coefficient, for raddle */
} host_fabric;

/* A soft yarn: 4.5e-4 kg/m (450 tex), stretch 1 N, bending 2e-9 N m^2, radius 0.6 mm. */
typedef struct host_yarn {
    double mass_per_length; /* kg/m */
    double stretch;         /* N: tension at unit strain */
    double bending;         /* N m^2 */
    double radius;          /* m */
    double friction;
} host_yarn;

typedef struct host_air {
    double density;        /* kg/m^3 */
    double velocity[3];    /* wind, m/s */
    double cloth_drag;     /* drag coefficient of a plate across the flow, 1 */
    double strand_drag;    /* drag coefficient of a cylinder across the flow, 1 */
} host_air;

typedef struct host_part {
    char name[32];
    int kind; /* RDL_STRANDS, RDL_CLOTH, RDL_BODY of raddle/scene.h */
    double half_thickness, friction;
    size_t first_vertex, vertex_count;
} host_part;

/* Membrane triangle. The deformation is w_u = sum grad_u[i] x_i and w_v alike (Baraff & Witkin 1998, eq. 9). */
typedef struct host_membrane {
    uint32_t vertex[3];
    size_t slot[3];           /* blocks of the vertex pairs 0-1, 1-2, 2-0 in the matrix */
    double grad_u[3], grad_v[3], area;
    double stretch, shear;
} host_membrane;

/* Spring between two vertices: a strand's segment, or a join. */
typedef struct host_spring {
    uint32_t vertex[2];
    size_t slot;
    double length, stiffness; /* m, N/m */
    double diameter;          /* m, for air drag; 0 for a join */
} host_spring;

/* A pull towards a moving point, of limited force: a hand that holds a thread. stiffness 0 = let go. */
typedef struct host_pull {
    uint32_t vertex;
    double target[3], stiffness, force_max;
} host_pull;

/* A vertex that a body pushed in the last step. The next step asks it to keep to the body's speed along the normal:
 * without that, an implicit step lets the whole cloth press on the few vertices that touch, and proposes to sink them
 * deep into the body (see docs/integrate.md). It is let go in the step after it was found to pull instead of push. */
typedef struct host_support {
    double normal[3]; /* unit, away from the body */
    double speed;     /* m/s along normal */
    uint8_t active, pulls;
} host_support;

typedef struct host {
    size_t part_count, vertex_count, soft_count;
    host_part *parts;
    uint32_t *vertex_part;
    double *own_mass;   /* kg, what a vertex weighs; infinity for body vertices */
    double *mass;       /* kg, infinity while driven */
    uint8_t *driven;    /* 1 while driven */
    double (*position)[3], (*velocity)[3]; /* at the start of the step */
    double (*proposed)[3];                 /* where the step wants to go */
    double (*proposed_velocity)[3];
    double (*target)[3];                   /* where driven vertices are told to go */
    host_support *support;                 /* per vertex: what the last step taught about the bodies */

    size_t membrane_count, spring_count, pull_count, triangle_count, segment_count, join_count, bend_count;
    host_membrane *membranes;
    host_spring *springs;
    host_pull *pulls;
    host_bend *bends;
    uint32_t (*triangles)[3];
    uint32_t (*segments)[2];
    uint32_t (*joins)[2];  /* vertex pairs joined by host_join: raddle's attachments */

    double gravity[3];       /* m/s^2 */
    host_air air;
    double damping;          /* s: internal friction, force = -damping K v */
    double solver_tolerance; /* relative */
    size_t solver_limit;     /* iterations */
    size_t solver_used;      /* iterations of the last step */

    host_coupling *couplings;  /* soft contacts of the last step */
    size_t coupling_count, coupling_room;

    host_matrix matrix;      /* M + S, assembled anew in each step */
    host_scalars bending;    /* constant stiffness of all bending */
    double (*force)[3];
    host_solver solver;
} host;

/* Building. Every call returns 1, or 0 when memory ran out or an argument made no sense; the host must then be
 * destroyed. *first (or NULL) = the part's first vertex. Soft parts must come before bodies. */
host *host_create(void);
void host_destroy(host *h);
/* pattern: count x 2, the cut of the flat fabric along its thread directions, m; position: count x 3, m. */
int host_add_cloth(host *h, const char *name, const host_fabric *fabric, size_t count, const double (*pattern)[2],
                   const double (*position)[3], size_t triangle_count, const uint32_t (*triangles)[3], size_t *first);
/* strand_count strands of points_each points, one after the other; they are at rest when straight. */
int host_add_strands(host *h, const char *name, const host_yarn *yarn, size_t strand_count, size_t points_each,
                     const double (*position)[3], size_t *first);
int host_add_body(host *h, const char *name, double half_thickness, double friction, size_t count,
                  const double (*position)[3], size_t triangle_count, const uint32_t (*triangles)[3], size_t *first);
/* Joins two soft vertices by a stiff spring that keeps their present distance. */
int host_join(host *h, uint32_t a, uint32_t b, double stiffness);
/* Adds a hand; its members may be changed at any time. */
int host_add_pull(host *h, uint32_t vertex, double stiffness, double force_max);
/* After the last part, join and pull: sets up the matrices. */
int host_finish(host *h);

/* From now on the vertex goes to target[vertex] in each step; host_release gives it back its weight. */
void host_drive(host *h, uint32_t vertex);
void host_release(host *h, uint32_t vertex);

/* Fills proposed and proposed_velocity for a step of h_step seconds. */
void host_propose(host *h, double h_step);

/* Ends the step: positions = delivered; velocities = proposed velocities + impulses / mass. Where a vertex was moved
 * but no impulse accounts for it (held vertices, thickness recovery), the velocity is what the positions say,
 * (delivered - start) / h_step: a held vertex would else gather speed from gravity, step by step.
 * impulses and moved may be NULL: a host without raddle passes delivered = proposed and nothing else. */
void host_accept(host *h, double h_step, const double (*delivered)[3], const double *impulses, const uint8_t *moved);

/* Forgets all supports and couplings: before those of a new step are entered, and after a cut. */
void host_clear_contacts(host *h);
/* Two soft sides that pushed each other in the last step (strength is set by the host). 0: no memory. */
int host_add_coupling(host *h, const host_coupling *coupling);

/* Kinetic energy of soft vertices that are not driven, and energy stored in springs, membranes and bending, J. */
double host_kinetic_energy(const host *h);
double host_elastic_energy(const host *h);

/* ---- used among the files of this folder ---- */
/* Fills force (N) and matrix = M + S for the present positions and velocities; bending stays apart. */
void host_assemble(host *h, double h_step);

#endif
