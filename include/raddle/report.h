/* raddle/report.h: what a step found and did. All pointers are owned by the engine and stay valid until the next call
 * that takes the same engine.
 * Usable from C17 and C++17. */
#ifndef RADDLE_REPORT_H
#define RADDLE_REPORT_H

#include <stddef.h>
#include <stdint.h>

#include "query.h"

#ifdef __cplusplus
extern "C" {
#endif

/* The highest that applies. */
typedef enum rdl_verdict {
    RDL_CLEAR = 0,    /* the proposed bits were apart and are delivered unchanged */
    RDL_RESOLVED = 1, /* something was moved; every active pair is apart */
    RDL_PINCHED = 2,  /* some pairs could not be kept apart from driven vertices: named */
    RDL_TANGLED = 3   /* the start state has intersecting pairs or remembered crossings: named */
} rdl_verdict;

enum { /* why a pair is named */
    RDL_WHY_INTERSECTS_AT_START = 0,
    RDL_WHY_CONTACT_AT_START = 1,
    RDL_WHY_REMEMBERED_CROSSING = 2,
    RDL_WHY_NO_ROOM = 3,
    RDL_WHY_BUDGET = 4
};

/* PT: first = vertex, second = triangle. EE: first = lower edge id, second = higher edge id (edge ids: see
 * rdl_engine_edges). RDL_EDGE_TRIANGLE: first = edge id, second = triangle; only with RDL_WHY_INTERSECTS_AT_START. */
enum { RDL_EDGE_TRIANGLE = 2 };
typedef struct rdl_named_pair {
    uint32_t kind, first, second, why;
} rdl_named_pair;

enum { /* how far a zone had to go; a rigid zone in a shorter piece counts as rigid */
    RDL_LEVEL_INEQUALITY = 0, /* one-sided zone solve */
    RDL_LEVEL_FENCE = 1,      /* one-sided zone solve against separating planes fixed at the start */
    RDL_LEVEL_RIGID = 2,      /* the zone moved as one rigid body */
    RDL_LEVEL_SUBSTEP = 3,    /* the step was cut into sub-steps */
    RDL_LEVEL_HOLD = 4,       /* free vertices held at the last certified place */
    RDL_LEVEL_COUNT = 5
};

/* One contact that carried load. The difference vector of the two contact points at `time` is
 * sum_i weights[i] x_i; it lies along normal (unit, from the second feature to the first).
 * impulse: kg m/s along normal (METHODS: I = -v_n / sum a_i^2 / m_i). */
typedef struct rdl_contact {
    uint32_t kind, first, second, zone;
    uint32_t vertices[4];
    double time, impulse, friction_impulse;
    double weights[4], normal[3];
    uint32_t sliding; /* 1: friction at its limit */
    uint32_t reserved;
} rdl_contact;

typedef struct rdl_zone {
    uint32_t vertex_count, contact_count, level, passes;
    uint32_t touches_driven, reserved;
    double worst_correction; /* m */
    double residual;         /* KKT residual over the correction */
    double momentum_error;   /* |sum m (x* - x1)| / sum m |x* - x1| before rounding */
    double energy_change;    /* J, kinetic, centre-of-mass frame, delivered against proposed */
} rdl_zone;

typedef struct rdl_ledger { /* J */
    double zones;     /* energy change of zones without driven vertices: <= 0 */
    double driven;    /* from driven vertices */
    double recovery;  /* from thickness recovery */
    double rounding;  /* from rounding to the host's format */
} rdl_ledger;

enum { RDL_TIME_BOXES = 0, RDL_TIME_PAIRS, RDL_TIME_TOUCHES, RDL_TIME_RESPONSE, RDL_TIME_VERIFY, RDL_TIME_TOTAL, RDL_TIME_COUNT };

typedef struct rdl_report {
    size_t size; /* sizeof(rdl_report), set by the caller */
    rdl_verdict verdict;
    unsigned threads;
    uint64_t pairs, touches, contact_count, zone_count, passes, substeps;
    uint64_t level_zones[RDL_LEVEL_COUNT];
    double seconds[RDL_TIME_COUNT];
    double worst_correction, mean_correction; /* m, |delivered - proposed| over movable vertices */
    const rdl_contact *contacts;
    const rdl_zone *zones;
    const rdl_named_pair *named;
    size_t named_count;
    const uint32_t *held; /* free vertices held */
    size_t held_count;
    const uint8_t *moved; /* N: 1 where delivered differs from proposed */
    size_t waypoint_count;
    const double *waypoint_times;     /* W, in (0, 1), share of the step */
    const double *waypoint_positions; /* W x N x 3, representable in the delivered format */
    const double *impulses;           /* N x 3, kg m/s: corrected velocity = proposed velocity + impulses / mass */
    uint64_t decided[RDL_STAGE_COUNT];/* pairs decided by each narrow-phase stage */
    uint64_t orders[16], depths[16];  /* histograms; last bin = that or more */
    rdl_ledger ledger;
    double angular_drift[3];          /* kg m^2/s, positions read as velocities against impulses */
    size_t bytes_in_use;
} rdl_report;

#ifdef __cplusplus
}
#endif
#endif
