/* base/internal.h: the one door to libc for the core, and marks shared by all stages.
 * May be included by every folder of the core. */
#ifndef RDLI_INTERNAL_H
#define RDLI_INTERNAL_H

#include <assert.h>
#include <float.h>
#include <limits.h>
#include <math.h>
#include <stdalign.h>
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>
#include <string.h>

#include "raddle/host.h"
#include "raddle/status.h"

/* Writes the offender into *fault if there is one; returns status, so that a check is one line. */
rdl_status rdli_fault_set(rdl_fault *fault, rdl_status status, const char *field, uint64_t index);

#endif
