/* couple.h: the host and raddle: describing the scene once, resolving each step, and taking the outcome back.
 * This is all that a host has to write; docs/integrate.md walks through it. */
#ifndef RADDLE_TOOLS_HOST_COUPLE_H
#define RADDLE_TOOLS_HOST_COUPLE_H

#include <raddle/engine.h>

#include "host.h"

/* Fills *scene with views of the host's arrays and parts[] (part_count of them). Valid until the host is changed. */
void host_describe(const host *h, rdl_part parts[], rdl_scene *scene);

/* Hands start and proposed to the engine; delivered (vertex_count x 3) receives the outcome. The host itself is not
 * changed, so that both can be looked at before host_accept. */
rdl_status host_resolve(const host *h, rdl_engine *engine, double h_step, double (*delivered)[3], rdl_report *report,
                        rdl_fault *fault);

/* After host_accept: enters what the report's contacts teach for the next step: supports where a side is driven, couplings
 * where both are soft. approach: speed towards the body that supports keep, m/s > 0, so that a contact that lasts is
 * found again. Returns 0 when memory ran out. */
int host_learn(host *h, const rdl_report *report, double approach);

#endif
