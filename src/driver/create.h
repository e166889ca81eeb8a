/* driver/create.h: what api/engine.c calls. */
#ifndef RDLI_CREATE_H
#define RDLI_CREATE_H

#include "driver/engine.h"

/* settings are checked and complete. */
rdl_status rdli_engine_create(const rdl_scene *scene, const rdl_settings *settings, const rdl_host *host,
                              rdl_engine **engine, rdl_fault *fault);
void rdli_engine_destroy(rdl_engine *engine);
/* Checks the step and copies it into the engine. wants_output: delivered is part of the call. */
rdl_status rdli_step_load(rdl_engine *engine, const rdl_step *step, bool wants_output, rdl_fault *fault);
void rdli_report_fill(const rdl_engine *engine, rdl_verdict verdict, rdl_report *report);
/* The largest certified share of the straight motion start -> proposed. */
rdl_status rdli_safe_fraction(rdl_engine *engine, double *fraction);
/* The memory block; see rdl_engine_memory_read. */
size_t rdli_memory_block_bytes(const rdl_engine *engine);
void rdli_memory_block_write(const rdl_engine *engine, void *block);
rdl_status rdli_memory_block_read(rdl_engine *engine, const void *block, size_t bytes);

#endif
