/* driver/engine.h: the engine object. Included by driver and api. */
#ifndef RDLI_ENGINE_H
#define RDLI_ENGINE_H

#include "base/workers.h"
#include "broad/broad.h"
#include "flow/boxes.h"
#include "flow/contacts.h"
#include "flow/motion.h"
#include "intake/intake.h"
#include "narrow/narrow.h"
#include "raddle/engine.h"
#include "raddle/watch.h"
#include "response/response.h"

/* A pair that the narrow phase could not call apart. */
typedef struct rdli_hit {
    uint32_t kind, first, second;
    uint32_t vertex[4];
    double gap, start_distance[2], floor, time;
    uint8_t reaches_path, below_end, contact_at_start;
    uint8_t close;             /* none of these, but almost at its end floor */
} rdli_hit;

/* Counts of the narrow phase, summed over detections. */
typedef struct rdli_counts {
    uint64_t pairs, touches;
    uint64_t decided[RDL_STAGE_COUNT], orders[16], depths[16];
} rdli_counts;

/* A pair that crossed and has not come back: part of the memory. side: sign of the pair's volume before it crossed. */
typedef struct rdli_crossing {
    uint32_t kind, first, second;
    int32_t side;
} rdli_crossing;

struct rdl_engine {
    rdl_host host;
    rdli_memory memory;
    rdli_workers *workers;
    rdl_settings settings;
    rdli_scene scene;
    rdli_mesh mesh;            /* the scene's, with this step's driven flags and muting */
    rdli_broad *broad;
    rdli_response response;
    rdli_boxes boxes;
    rdli_room box_room[3];
    rdli_room muted;           /* this step's muting */
    rdli_room mass, driven, fixed, awake, squeeze, released;
    rdli_room touched;         /* N: moved off its proposed path in an earlier piece of this step */
    rdli_room start, proposed, piece_start, target, trial, certified, velocity; /* N x 3 doubles */
    rdli_room flags, indices, hits, chunk_counts;
    size_t hit_count, violation_count; /* of the hits, how many are not merely close */
    rdli_room contacts, merged;
    size_t contact_count;
    rdli_counts counts;
    /* outcome of the present step */
    rdli_room waypoint_times, waypoint_positions, out_contacts, out_zones, named, held, moved, impulse, impulses;
    size_t waypoint_count, out_contact_count, out_zone_count, named_count, held_count;
    uint64_t passes, attempts, level_zones[RDL_LEVEL_COUNT];
    double seconds[RDL_TIME_COUNT];
    rdl_ledger ledger;
    double angular_drift[3];
    int format;
    /* memory: what the next step may depend on */
    rdli_room crossings;
    size_t crossing_count;
    rdli_room last;            /* delivered bits of the last step, known to be free of intersections where known is true */
    bool known;
    /* watches: see driver/watch.h */
    rdli_room watches, watch_memory;
    size_t watch_count, watch_memory_bytes;
    uint64_t watch_detections; /* in this step so far */
    bool watch_events;         /* some watch wants events */
};

/* The four vertices of a pair, in the order of query.h. */
void rdli_pair_vertices(const rdli_mesh *mesh, uint32_t kind, uint32_t first, uint32_t second, uint32_t vertex[4]);
double rdli_pair_gap(const rdli_mesh *mesh, uint32_t kind, uint32_t first, uint32_t second);

/* What a detection looks at. */
typedef struct rdli_look {
    const double (*from)[3], (*to)[3];
    const uint8_t *awake;      /* or NULL */
    const uint8_t *fixed;      /* vertices whose pairs among themselves are of no interest */
    const double *squeeze;     /* factor of the floors per vertex, or NULL = 1 */
    bool first_piece;          /* `from` is the start of the step */
    bool wants_close;          /* list pairs, too, that end within a hundredth of their floor */
} rdli_look;

/* boxes -> pairs -> touches: fills engine->hits, sorted by (kind, first, second). Polls cancel. */
rdl_status rdli_detect(rdl_engine *engine, const rdli_look *look);

/* Merges the hits into the contact list of the piece and takes their planes. */
rdl_status rdli_contacts_merge(rdl_engine *engine, const rdli_piece *piece);
/* New first-order expansions, about the present trial, for all contacts of unsettled zones that were not violated. all: of
 * every contact, at the points where its planes are. */
void rdli_contacts_expand(rdl_engine *engine, const rdli_piece *piece, bool all);

/* The pass loop over one piece of the step. *apart: every pair keeps its (squeezed) floors over the piece; otherwise the
 * zones of engine->response that are still violated could not be settled. */
rdl_status rdli_advance(rdl_engine *engine, const rdli_piece *piece, bool first_piece, uint64_t passes_max, bool *apart);

/* The whole step: pieces, escalation, way-points; engine->trial holds the answer. */
rdl_status rdli_step_run(rdl_engine *engine, const rdl_step *step, rdl_verdict *verdict);

/* Names a pair in the report. */
rdl_status rdli_name_pair(rdl_engine *engine, uint32_t kind, uint32_t first, uint32_t second, uint32_t why);

double rdli_now(void); /* s, monotonic: for the report only, never for decisions without a time limit */

#endif
