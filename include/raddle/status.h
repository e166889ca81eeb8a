/* raddle/status.h: call status (could the call run?) and the first offender.
 * The verdict on a step is a different thing: see report.h.
 * Usable from C17 and C++17. */
#ifndef RADDLE_STATUS_H
#define RADDLE_STATUS_H

#include <stdint.h>

#include "version.h"

#ifdef __cplusplus
extern "C" {
#endif

/* 0 is success, negative values are errors: on error outputs are untouched. */
typedef enum rdl_status {
    RDL_OK = 0,
    RDL_BAD_ARGUMENT = -1,    /* a NULL pointer or an impossible combination of arguments */
    RDL_NOT_FINITE = -2,      /* NaN or infinity where a finite number is needed */
    RDL_OUT_OF_RANGE = -3,    /* an index or number outside its allowed range */
    RDL_REPEATED_VERTEX = -4, /* an element names the same vertex twice */
    RDL_MIXED_PARTS = -5,     /* the vertices of one element belong to different parts */
    RDL_BAD_MASS = -6,        /* mass <= 0 or NaN (infinity is fine: driven) */
    RDL_BAD_THICKNESS = -7,   /* half-thickness negative, NaN or infinite */
    RDL_ZERO_GAP = -8,        /* two parts that may meet would have a gap of 0 */
    RDL_BAD_BOX = -9,         /* a box with lo > hi */
    RDL_BAD_SETTING = -10,    /* a setting outside its range */
    RDL_TOO_LARGE = -11,      /* sizes that overflow the index width or memory arithmetic */
    RDL_NO_MEMORY = -12,      /* the allocator returned NULL */
    RDL_CANCELLED = -13,      /* the host's cancel callback asked to stop */
    RDL_LOOSE_VERTEX = -14,   /* a vertex that no element uses */
    RDL_BAD_MEMORY = -15,     /* an engine memory block that is not ours or does not fit the scene */
    RDL_NO_FILE = -20,        /* a file that is missing or cannot be opened */
    RDL_BAD_FILE = -21,       /* a file that is truncated, foreign, or contradicts itself */
    RDL_BAD_VERSION = -22,    /* a file of a format version that this library does not know */
    RDL_WRITE_FAILED = -23,   /* the disk refused a write */
    RDL_BAD_DIGEST = -24,     /* stored digest and data differ */
    RDL_FILE_EXISTS = -25     /* would overwrite an existing file */
} rdl_status;

/* The first offender of a failed call. field: a short text that names what was looked at,
 * e.g. "proposed", "mass", "triangles"; index: which vertex, element, pair or row (0 when it does not apply).
 * Untouched on success. */
typedef struct rdl_fault {
    uint64_t index;
    char field[56];
} rdl_fault;

/* One English phrase per status, without a full stop. Static storage; safe from any thread; never NULL. */
RDL_API const char *rdl_status_text(rdl_status status);

#ifdef __cplusplus
}
#endif
#endif
