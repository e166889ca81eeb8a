/* scenario.h: one step of a shot in memory: what the engine was given, and what it delivered then. Stepping it again, and
 * the list of what the stages did. */
#ifndef RADDLE_TOOLS_SCENARIO_H
#define RADDLE_TOOLS_SCENARIO_H

#include <stdbool.h>

#include <raddle/raddle.h>
#include <raddle/shot.h>
#include <raddle/watch.h>

typedef struct scenario {
    rdl_scene scene; /* borrowed: of the shot, or of whoever made the scenario */
    rdl_settings settings;
    int host_bits;
    size_t frame;
    rdl_shot_frame recorded; /* positions and memory point into the rooms below; times of way-points are not kept */
    bool has_delivered, has_verdict, has_memory;
    double *start, *proposed, *delivered; /* N x 3 */
    void *memory;
    double *mass;
    uint32_t (*muted)[2];
} scenario;

/* Reads frame `frame` of a shot that has start and proposed positions. From poses alone: the motion from pose frame - 1
 * to pose frame (frame >= 1). A duration that the shot does not say is taken from its times. The shot must outlive the
 * scenario's scene. On error nothing is to be released. */
rdl_status scenario_read(scenario *s, rdl_shot *shot, size_t frame, rdl_fault *fault);
void scenario_release(scenario *s);

/* Events of one step, in order. */
typedef struct event_list {
    rdl_event *rows;
    size_t count, room;
    bool full; /* no memory: rows are missing */
} event_list;

typedef struct outcome {
    double *delivered; /* N x 3 */
    rdl_report report; /* owned by the engine, until it is used again */
} outcome;

/* An engine for scenarios of one scene. */
typedef struct stepper {
    rdl_engine *engine;
    event_list events; /* of the last step, where wanted */
    bool wants_events;
    float *narrow;
    size_t vertex_count;
    outcome result;
} stepper;

rdl_status stepper_create(stepper *made, const scenario *first, const rdl_settings *settings, unsigned threads,
                          bool wants_events, rdl_fault *fault);
/* Steps the scenario with its recorded memory (none: keep says whether the engine's own is kept, or forgotten). */
rdl_status stepper_run(stepper *st, const scenario *s, bool keep, rdl_fault *fault);
void stepper_release(stepper *st);

#endif
