/* raddle/recorder.h: recording an engine's steps into a shot file (library raddle_shot), so that each can be replayed
 * alone, to the bit: see docs/replay.md.
 *
 * A recorder is attached to an engine and writes what its steps were given and delivered: all of them, or those that a
 * trigger picks, together with the steps just before. The host's loop does not change. The file grows as NAME.part, is
 * readable at every moment up to its last whole step, and becomes NAME when it is finished. Several recorders may watch
 * one engine. A recorder never makes a step fail: it notes the first error, and records nothing after it.
 * Usable from C17 and C++17. */
#ifndef RADDLE_RECORDER_H
#define RADDLE_RECORDER_H

#include "engine.h"
#include "shot.h"

#ifdef __cplusplus
extern "C" {
#endif

typedef struct rdl_recorder rdl_recorder;

/* What picks a step. 0: every step is recorded. */
enum {
    RDL_TRIGGER_RESOLVED = 1, /* the verdict is resolved */
    RDL_TRIGGER_PINCHED = 2,
    RDL_TRIGGER_TANGLED = 4,
    RDL_TRIGGER_HELD = 8,        /* a free vertex was held */
    RDL_TRIGGER_SECONDS = 16,    /* the step took longer than seconds_above */
    RDL_TRIGGER_CORRECTION = 32, /* a vertex was moved further than correction_above from where it was proposed */
    RDL_TRIGGER_PASSES = 64,     /* more passes than passes_above */
    RDL_TRIGGER_ON_DEMAND = 128  /* rdl_recorder_dump alone */
};

typedef struct rdl_recorder_options {
    size_t size;             /* sizeof(rdl_recorder_options) */
    unsigned triggers;       /* RDL_TRIGGER_... bits, or 0 */
    size_t steps_before;     /* with triggers: how many steps before a picked one are recorded too. They are kept in
                                memory: 9 doubles a vertex and step */
    double seconds_above;    /* s, >= 0 */
    double correction_above; /* m, >= 0 */
    uint64_t passes_above;
    int host_bits;           /* 32 or 64: the format in which the host takes delivered positions; default 64 */
    int deflate;             /* 0 = no compression, 1..9; default 1 */
    int overwrite;           /* 1: an existing file is replaced when the recording is finished */
    const char *created_by;  /* UTF-8, or NULL */
} rdl_recorder_options;

RDL_API void rdl_recorder_options_default(rdl_recorder_options *options);
/* Creates PATH.part and attaches to the engine. scene: the one that the engine was created with; it is copied. The
 * engine must outlive the recorder. options NULL = defaults. *recorder is set only on RDL_OK.
 * Errors: those of rdl_shot_create; RDL_BAD_ARGUMENT, RDL_OUT_OF_RANGE for options. */
RDL_API rdl_status rdl_recorder_create(const char *path, rdl_engine *engine, const rdl_scene *scene,
                                       const rdl_recorder_options *options, rdl_recorder **recorder, rdl_fault *fault);
/* Time (s) and picture frame of the steps from the next one on. Without it a step's time is the sum of the durations up
 * to its end, and its picture 0. */
RDL_API void rdl_recorder_mark(rdl_recorder *recorder, double time, uint32_t picture);
/* Writes the steps that are kept in memory now: for a host that has doubts of its own. */
RDL_API rdl_status rdl_recorder_dump(rdl_recorder *recorder, rdl_fault *fault);
/* RDL_OK, or what went wrong first, with the fault; *recorded (or NULL): frames in the file. */
RDL_API rdl_status rdl_recorder_state(const rdl_recorder *recorder, size_t *recorded, rdl_fault *fault);
/* Detaches, completes the file and renames it; the recorder is gone afterwards. With triggers, and no step picked,
 * no file is left. Returns what rdl_recorder_state would have returned, else the status of rdl_shot_finish. After an
 * error PATH.part stays, with the frames before it. */
RDL_API rdl_status rdl_recorder_finish(rdl_recorder *recorder, rdl_fault *fault);
/* Detaches and leaves PATH.part. NULL is fine. */
RDL_API void rdl_recorder_keep(rdl_recorder *recorder);
/* Detaches and deletes PATH.part. NULL is fine. */
RDL_API void rdl_recorder_discard(rdl_recorder *recorder);

#ifdef __cplusplus
}
#endif
#endif
