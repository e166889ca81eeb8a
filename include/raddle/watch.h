/* raddle/watch.h: looking over an engine's shoulder: what each step was given and delivered, and, where asked for, what
 * its stages did on the way. Recorders and tools use this; a host that only steps does not need it.
 * Usable from C17 and C++17. */
#ifndef RADDLE_WATCH_H
#define RADDLE_WATCH_H

#include "engine.h"

#ifdef __cplusplus
extern "C" {
#endif

/* One step that was completed. Everything is owned by the engine and valid during the call. */
typedef struct rdl_watched_step {
    const rdl_step *step;     /* the host's */
    const rdl_report *report; /* complete, also where the host asked for none */
    const double *start, *proposed, *delivered; /* N x 3, metres; proposed and delivered are rounded to the format of
                                                   delivered, and are right even where the host wrote one over the other */
    const void *memory;       /* the engine's memory before the step: see rdl_engine_memory_read */
    size_t memory_bytes;
} rdl_watched_step;

/* What the stages of a step did, in order. detection: how many detections the step had made before this event. */
enum {
    RDL_EVENT_BOX = 0,   /* first detection only. kind 0, 1, 2: vertex, edge, triangle `first`; value: lo x y z, hi x y z */
    RDL_EVENT_PAIR = 1,  /* candidate pair (kind, first, second) */
    RDL_EVENT_TOUCH = 2, /* a pair that was looked at closely: value: time (share of the piece), gap, floor, least start
                            distance, RDL_TOUCH_... bits, 0 */
    RDL_EVENT_ZONE = 3,  /* kind RDL_LEVEL_...: zone `first`; value: vertices, contacts, 1 if a driven vertex is near,
                            1 if violated, 1 if settled, 0 */
    RDL_EVENT_MEMBER = 4,/* contact (kind, first, second) belongs to zone value[0]; value[1]: 1 if it is violated */
    RDL_EVENT_PIECE = 5, /* kind RDL_PIECE_...; value: share of the step certified so far, length of the piece, 0 ... */
    RDL_EVENT_STAGES = 6
};
enum { RDL_TOUCH_PATH = 1, RDL_TOUCH_END = 2, RDL_TOUCH_AT_START = 4, RDL_TOUCH_CLOSE = 8 };
enum {
    RDL_PIECE_ACCEPTED = 0,  /* certified up to value[0] */
    RDL_PIECE_SHORTENED = 1, /* a zone could not be settled: half the length is tried */
    RDL_PIECE_GIVES_WAY = 2, /* no shorter piece: unsettled zones are held, or get smaller floors where there is no room */
    RDL_PIECE_HELD = 3       /* everything is held at the last certified place */
};

typedef struct rdl_event { /* written to shot files, so that its layout is fixed */
    uint32_t stage, detection, kind, first, second, reserved;
    double value[6];
} rdl_event;

/* size: sizeof(rdl_watch). user is handed to the callbacks. events and stepped may be NULL. Callbacks run in the thread
 * of rdl_engine_step, and must not call the engine. events costs time, and gets blocks of events. stepped is called at the
 * end of each step that returns RDL_OK. Watching never changes a result. */
typedef struct rdl_watch {
    size_t size;
    void *user;
    void (*events)(void *user, const rdl_event *events, size_t count);
    void (*stepped)(void *user, const rdl_watched_step *watched);
} rdl_watch;

/* Adds a watch, which is copied; any number may be there, and they are called in the order in which they came.
 * Errors: RDL_BAD_ARGUMENT, RDL_NO_MEMORY. */
RDL_API rdl_status rdl_engine_watch(rdl_engine *engine, const rdl_watch *watch);
/* Removes every watch of that user. */
RDL_API void rdl_engine_unwatch(rdl_engine *engine, const void *user);

#ifdef __cplusplus
}
#endif
#endif
