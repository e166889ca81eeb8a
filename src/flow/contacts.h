/* flow/contacts.h: touches that the response acts on, and the zones they form. */
#ifndef RDLI_FLOW_CONTACTS_H
#define RDLI_FLOW_CONTACTS_H

#include <stdint.h>

/* A half space that a pair is to end in: normal . sum_i weight[i] x_i >= aim. For fixed weights the distance of the two
 * points is convex in x, so its first-order expansion never promises too much; what it misses are other points of the
 * same pair. A contact therefore collects planes at several places (exchange method for the minimum over the weights). */
typedef struct rdli_plane {
    double normal[3], weight[4];
    double load;   /* multiplier, kg m: warm start of the next solve */
    uint8_t kept;  /* the normal is that of a blocked path and is not taken anew */
} rdli_plane;

enum { RDLI_PLANES = 4 }; /* two parallel edges touch along a line (2), two parallel faces' features at up to 3 places */

typedef struct rdli_contact {
    uint32_t kind, first, second, zone;
    uint32_t vertex[4];
    double gap;               /* sum of the half-thicknesses, m */
    double start_distance[2]; /* enclosure of the distance at the start of the step, m */
    double floor;             /* end floor to be kept now: squeezed where there was no room, m */
    double ahead;             /* aimed above the floor for now, by what curvature took in earlier passes, m */
    double slop;              /* aimed above the floor by the whole zone, by what a quick solve may miss, m */
    double depth;             /* below the floor when it was first seen, m */
    double time;              /* share of the piece at which the plane was taken */
    rdli_plane plane[RDLI_PLANES];
    double fence[3];          /* separating direction at the start of the piece, unit */
    double fence_load[4];
    rdli_plane saved[RDLI_PLANES]; /* the planes and loads of the last certified answer */
    uint8_t plane_count, saved_count;
    uint8_t nearest;          /* which plane is at the closest points */
    uint8_t violated;         /* in the last detection */
    uint8_t blocks;           /* how often the path was found blocked, saturating; see kept */
    uint8_t fenced;           /* the zone fell back to the separating directions */
    uint8_t due;              /* the zone was sent to another level and has not been solved there yet */
    uint8_t rigid;            /* the zone fell back to moving as one rigid body */
    uint8_t settled;          /* the zone's last solve changed nothing that matters */
    uint8_t relapsed;         /* violated after a clean detection, or new */
    uint8_t restores;         /* how often refining the zone broke it, and it went back to the certified answer */
    uint8_t restored;         /* in the last pass */
    uint8_t clean;            /* detections in a row without a violation in the zone, saturating */
} rdli_contact;

/* Zones as rows over the contact list and the vertices: CSR. */
typedef struct rdli_zone {
    uint32_t contact_first, contact_count;
    uint32_t vertex_first, vertex_count;
    uint32_t row_first, row_count;
    uint32_t sweeps;       /* of the last solve */
    uint8_t violated;      /* a contact of it was violated in the last detection */
    uint8_t settled;       /* the last solve changed nothing that matters */
    uint8_t driven;        /* has a contact with a driven or held vertex */
    uint8_t infeasible;    /* the half spaces have no common point, as far as the solve can tell */
    uint8_t exhausted;     /* the solve ran out of sweeps far from its goal */
    uint8_t level;         /* RDL_LEVEL_... */
    double residual;       /* worst violation of a half space after the solve over the worst before */
    double momentum_error; /* |sum m (x* - x1)| over sum m |x* - x1| */
    double energy_before;  /* kinetic energy of the wanted displacements, centre-of-mass frame, kg m^2 */
    double energy_after;   /* of the answer's */
} rdli_zone;

#endif
