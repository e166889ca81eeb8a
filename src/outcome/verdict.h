/* outcome/verdict.h: plain data of a step -> report entries. Included by driver and api. */
#ifndef RDLI_VERDICT_H
#define RDLI_VERDICT_H

#include "base/internal.h"
#include "raddle/report.h"

/* Sorts by (kind, first, second, why) and drops repetitions: several pieces of a step may name one pair. */
void rdli_sort_named(rdl_named_pair *named, size_t *count);
/* moved[v] = 1 where the bits differ; returns whether any does. */
bool rdli_mark_moved(const double (*proposed)[3], const double (*delivered)[3], size_t vertex_count, uint8_t *moved);
/* The highest that applies. */
rdl_verdict rdli_verdict_of(const rdl_named_pair *named, size_t count, bool moved_any);
/* |delivered - proposed| over movable vertices, m. */
void rdli_corrections(const double (*proposed)[3], const double (*delivered)[3], const uint8_t *driven,
                      size_t vertex_count, double *worst, double *mean);

#endif
