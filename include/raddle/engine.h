/* raddle/engine.h: the engine object and its step.
 * One engine serves one call at a time; several engines may run in several threads.
 * Usable from C17 and C++17. */
#ifndef RADDLE_ENGINE_H
#define RADDLE_ENGINE_H

#include "host.h"
#include "report.h"
#include "scene.h"
#include "settings.h"
#include "status.h"

#ifdef __cplusplus
extern "C" {
#endif

typedef struct rdl_engine rdl_engine;

/* Checks and copies the scene. settings NULL = defaults; host NULL = defaults, else copied (what its callbacks point to
 * must outlive the engine). *engine is set only on RDL_OK.
 * Errors: every RDL_BAD_..., RDL_NOT_FINITE, RDL_OUT_OF_RANGE, RDL_REPEATED_VERTEX, RDL_MIXED_PARTS, RDL_ZERO_GAP,
 * RDL_LOOSE_VERTEX, RDL_TOO_LARGE, RDL_NO_MEMORY, with field and index of the first offender. */
RDL_API rdl_status rdl_engine_create(const rdl_scene *scene, const rdl_settings *settings, const rdl_host *host,
                                     rdl_engine **engine, rdl_fault *fault);
/* Resolves one step; see scene.h for the views and report.h for the outcome. report may be NULL, else its size member
 * must be set. On error nothing is written. */
RDL_API rdl_status rdl_engine_step(rdl_engine *engine, const rdl_step *step, rdl_report *report, rdl_fault *fault);
/* The largest certified share of the straight motion start -> proposed, in [0, 1]: every active pair keeps its path
 * floor up to it. step->delivered is ignored. */
RDL_API rdl_status rdl_engine_safe_fraction(rdl_engine *engine, const rdl_step *step, double *fraction, rdl_fault *fault);
/* Forgets the memory: for cuts and scrubbing. */
RDL_API rdl_status rdl_engine_reset(rdl_engine *engine);
RDL_API void rdl_engine_destroy(rdl_engine *engine);

/* The engine's edges: *count rows of two vertex ids (lower first), sorted; a row's number is the edge id used in
 * reports. Owned by the engine. */
RDL_API const uint32_t (*rdl_engine_edges(const rdl_engine *engine, size_t *count))[2];
RDL_API void rdl_engine_settings(const rdl_engine *engine, rdl_settings *settings);
RDL_API size_t rdl_engine_bytes(const rdl_engine *engine);

/* The memory of the engine (remembered crossings, friction anchors) as an opaque, versioned block. read: *bytes in = room, out = needed; block NULL asks for the
 * size. write: RDL_BAD_MEMORY leaves the engine as it was. */
RDL_API rdl_status rdl_engine_memory_read(const rdl_engine *engine, void *block, size_t *bytes);
RDL_API rdl_status rdl_engine_memory_write(rdl_engine *engine, const void *block, size_t bytes);

#ifdef __cplusplus
}
#endif
#endif
