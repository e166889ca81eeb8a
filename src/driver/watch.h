/* driver/watch.h: telling watches what a step does. Included by driver and api. */
#ifndef RDLI_WATCH_H
#define RDLI_WATCH_H

#include "driver/engine.h"
#include "flow/pairs.h"

/* Events; nothing happens where no watch wants any. */
void rdli_watch_boxes(const rdl_engine *engine); /* in a step's first detection */
void rdli_watch_pairs(const rdl_engine *engine, const rdli_pairs *pairs); /* one part of the list */
void rdli_watch_touches(const rdl_engine *engine);
void rdli_watch_zones(const rdl_engine *engine);
void rdli_watch_piece(const rdl_engine *engine, uint32_t what, double reached, double length);

/* Keeps the memory as it is before the step, for watches of steps. */
rdl_status rdli_watch_begin(rdl_engine *engine);
void rdli_watch_stepped(rdl_engine *engine, const rdl_step *step, const rdl_report *report);

#endif
