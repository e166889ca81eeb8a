/* raddle/shot.h: shot files (HDF5), library raddle_shot. The layout is specified in docs/shot-file.md.
 * Conventions are those of raddle.h; positions are N x 3 doubles in metres, vertex by vertex. One shot object serves
 * one call at a time. HDF5 itself is not thread-safe in most builds: use shots, and HDF5, from one thread at a time.
 * Each call leaves HDF5's error printing and error stack as they were. In faults, field "file" is the path that was
 * given, "file.part" the unfinished file beside it; else it names a dataset
 * ("frames/proposed") or an option, and index the row, vertex or frame.
 * Usable from C17 and C++17. */
#ifndef RADDLE_SHOT_H
#define RADDLE_SHOT_H

#include <stddef.h>
#include <stdint.h>

#include "scene.h"
#include "settings.h"
#include "status.h"

#ifdef __cplusplus
extern "C" {
#endif

/* ---- writing: NAME.part grows frame by frame and becomes NAME when complete ---- */

typedef struct rdl_shot_writer rdl_shot_writer;

enum { /* which per-frame datasets the shot holds */
       RDL_SHOT_START = 1,
       RDL_SHOT_PROPOSED = 2,
       RDL_SHOT_DELIVERED = 4,
       RDL_SHOT_VERDICT = 8,
       RDL_SHOT_WAYPOINTS = 16,
       RDL_SHOT_MEMORY = 32,
       RDL_SHOT_PICTURE = 64,
       RDL_SHOT_RULES = 128, /* what else the host told each step: duration, limits, masses, muting */
       RDL_SHOT_STEP = 255 /* all of the above: what a recording of engine steps holds */
};

typedef struct rdl_shot_options {
    size_t size;                  /* sizeof(rdl_shot_options) */
    unsigned contents;            /* RDL_SHOT_... bits; DELIVERED implies digest */
    int host_bits;                /* 32 or 64: the host's number format, for the digest */
    int deflate;                  /* 0 = no compression, 1..9 (default 1) */
    int overwrite;                /* 1: NAME may exist and is replaced on finish */
    const char *created_by;       /* UTF-8 */
    const rdl_settings *settings; /* or NULL: no /settings */
} rdl_shot_options;

/* One frame. Positions N x 3 doubles, metres; members that the shot does not hold are ignored.
 * waypoint_times are shares of the step in (0, 1). memory: opaque block of the engine, before the step. */
typedef struct rdl_shot_frame {
    double time; /* s */
    uint32_t picture;
    uint8_t verdict;
    const double *start, *proposed, *delivered;
    size_t waypoint_count;
    const double *waypoint_times, *waypoint_positions;
    const void *memory;
    size_t memory_bytes;
    /* As in rdl_step. duration 0: not said, the times tell; mass NULL: the scene's. */
    double duration, seconds_max;
    uint64_t passes_max;
    const double *mass;
    size_t muted_count;
    const uint32_t (*muted_parts)[2];
} rdl_shot_frame;

RDL_API void rdl_shot_options_default(rdl_shot_options *options);
/* Creates PATH.part with the scene, which is copied; options NULL = defaults. *writer is set only on RDL_OK, and on
 * error no file is left behind. Errors: RDL_FILE_EXISTS (overwrite is 0, and PATH or an older PATH.part exists),
 * RDL_WRITE_FAILED, RDL_NO_FILE (no such folder), RDL_BAD_ARGUMENT, RDL_BAD_SETTING, RDL_TOO_LARGE, RDL_NO_MEMORY, and
 * those of rdl_engine_create for the scene, except RDL_LOOSE_VERTEX and RDL_ZERO_GAP, which only matter to an engine.
 */
RDL_API rdl_status rdl_shot_create(const char *path, const rdl_scene *scene, const rdl_shot_options *options,
                                   rdl_shot_writer **writer, rdl_fault *fault);
/* Appends and flushes one frame: a process that is killed afterwards does not lose it. On error the file holds the
 * frames before it. Errors: RDL_NOT_FINITE, RDL_OUT_OF_RANGE (a verdict, a way-point's time, or delivered positions
 * that a host of 32 bits could not have been given) and RDL_BAD_ARGUMENT leave the writer usable; after
 * RDL_WRITE_FAILED nothing more reaches the file. */
RDL_API rdl_status rdl_shot_append(rdl_shot_writer *writer, const rdl_shot_frame *frame, rdl_fault *fault);
/* Closes PATH.part, brings it to the disk and renames it to PATH. The writer is gone afterwards, also on error;
 * PATH.part then stays. RDL_FILE_EXISTS: overwrite is 0 and PATH has appeared meanwhile; it is left alone. */
RDL_API rdl_status rdl_shot_finish(rdl_shot_writer *writer, rdl_fault *fault);
/* Closes and leaves PATH.part, readable up to its last frame: for a recording that was interrupted. NULL is fine. */
RDL_API void rdl_shot_keep(rdl_shot_writer *writer);
/* Closes and deletes PATH.part. NULL is fine. */
RDL_API void rdl_shot_discard(rdl_shot_writer *writer);

/* ---- reading: untrusted input, everything is checked ---- */

typedef struct rdl_shot rdl_shot;

typedef struct rdl_shot_info {
    size_t frame_count, vertex_count;
    unsigned contents; /* RDL_SHOT_... bits found */
    int host_bits;
    int complete;           /* 0: a .part, or a last frame was left out */
    const char *created_by; /* owned by the shot */
    int has_settings;
    rdl_settings settings;      /* as recorded, over the defaults */
    const char *engine_version; /* of the recording engine, or NULL; owned by the shot */
    const char
        *unknown_setting; /* first recorded setting that this version does not have, or NULL; owned by the shot */
    int has_mass;         /* 0: the masses of the scene stand in for ones that the file does not have */
} rdl_shot_info;

/* Opens PATH and checks structure, sizes, indices and parts; a recording in progress, or one that was cut off, is
 * opened up to its last whole frame. *shot is set only on RDL_OK. Errors: RDL_NO_FILE, RDL_BAD_FILE, RDL_BAD_VERSION,
 * RDL_BAD_SETTING, RDL_TOO_LARGE, RDL_NO_MEMORY and the scene errors of rdl_engine_create except RDL_LOOSE_VERTEX and
 * RDL_ZERO_GAP; fault->field is the dataset, index the row, or the extent that does not fit. */
RDL_API rdl_status rdl_shot_open(const char *path, rdl_shot **shot, rdl_fault *fault);
RDL_API void rdl_shot_close(rdl_shot *shot);
/* Owned by the shot. Where the file has no mass, 1 kg (infinity for body vertices) stands in. */
RDL_API const rdl_scene *rdl_shot_scene(const rdl_shot *shot);
RDL_API const rdl_shot_info *rdl_shot_describe(const rdl_shot *shot);
/* Reads one of RDL_SHOT_START, _PROPOSED, _DELIVERED of a frame into positions (N x 3). Checks that all are finite; for
 * delivered also the digest (RDL_BAD_DIGEST). Other errors: RDL_BAD_ARGUMENT (the shot has no such positions),
 * RDL_OUT_OF_RANGE (no such frame), RDL_BAD_FILE, RDL_NO_MEMORY. */
RDL_API rdl_status rdl_shot_read_positions(rdl_shot *shot, size_t frame, unsigned which, double *positions,
                                           rdl_fault *fault);
/* The rest of a frame: time, picture, verdict, way-points, memory, rules. Pointers are owned by the shot until its next call;
 * start, proposed, delivered are NULL. */
RDL_API rdl_status rdl_shot_read_frame(rdl_shot *shot, size_t frame, rdl_shot_frame *out, rdl_fault *fault);

/* ---- traces: what the stages of a frame's step did, in the shot's own group /trace ---- */

struct rdl_event; /* raddle/watch.h */
typedef struct rdl_shot_tracer rdl_shot_tracer;
/* Puts events into the shot PATH, in place of older ones of the same frame: begin copies the file, finish replaces it by
 * the copy. The shot may stay open for reading meanwhile. Errors: those of rdl_shot_open, RDL_BAD_ARGUMENT (an
 * unfinished recording), RDL_OUT_OF_RANGE (no such frame), RDL_WRITE_FAILED. */
RDL_API rdl_status rdl_shot_trace_begin(const char *path, rdl_shot_tracer **tracer, rdl_fault *fault);
/* note: UTF-8, kept with the events, or NULL. */
RDL_API rdl_status rdl_shot_trace_add(rdl_shot_tracer *tracer, size_t frame, const struct rdl_event *events,
                                      size_t count, const char *note, rdl_fault *fault);
/* The tracer is gone afterwards, also on error: the shot is then as it was. */
RDL_API rdl_status rdl_shot_trace_finish(rdl_shot_tracer *tracer, rdl_fault *fault);
/* Leaves the shot as it was. NULL is fine. */
RDL_API void rdl_shot_trace_discard(rdl_shot_tracer *tracer);
/* *events: owned by the shot until its next call of this kind; *count 0 where the frame has no trace. */
RDL_API rdl_status rdl_shot_trace_read(rdl_shot *shot, size_t frame, const struct rdl_event **events, size_t *count,
                                       rdl_fault *fault);

/* SHA-256 (FIPS 180-4) over N x 3 positions as little-endian values of the host's format, row-major. */
RDL_API void rdl_shot_digest(const double *positions, size_t vertex_count, int host_bits, uint8_t digest[32]);

#ifdef __cplusplus
}
#endif
#endif
