/* raddle/settings.h: the engine's settings, their table and introspection.
 * Usable from C17 and C++17. */
#ifndef RADDLE_SETTINGS_H
#define RADDLE_SETTINGS_H

#include <stddef.h>

#include "status.h"

#ifdef __cplusplus
extern "C" {
#endif

/* Every setting is one double, so that one table serves validation, command line, files and docs.
 * size first, members are only appended; a caller with a shorter struct gets defaults for the rest.
 * Zero is a value, never "default": start from rdl_settings_default(). */
typedef struct rdl_settings {
    size_t size;
    double path_floor_share; /* sigma of the path floor, 1 */
    double aim_margin;       /* relative margin that solvers aim above a floor, 1 */
    double passes_max;       /* detection and solve passes per sub-step before escalation, count */
    double substeps_max;     /* sub-steps in one step, count */
    double solver_sweeps;    /* iterations of one zone solve, count */
    double restitution;      /* coefficient of restitution, 1 */
    double recovery_speed;   /* rate at which pairs below their gap drift apart, m/s */
    double untangle;         /* 0 off, 1 best-effort recovery from tangled starts */
    double vector;           /* 1 use vector instructions where the machine has them, 0 portable code */
} rdl_settings;

typedef struct rdl_setting_info {
    const char *name;     /* member name, also option and attribute name */
    const char *unit;     /* "1", "count", "m/s", "switch" */
    const char *purpose;  /* one sentence */
    double initial, lowest, highest;
    int whole;            /* 1: only whole numbers are valid */
    size_t offset;        /* of the double in rdl_settings */
} rdl_setting_info;

/* Fills *settings with the defaults; sets size. Safe from any thread. */
RDL_API void rdl_settings_default(rdl_settings *settings);
/* The table: *count entries, static storage. Safe from any thread. */
RDL_API const rdl_setting_info *rdl_settings_table(size_t *count);
/* RDL_OK, or RDL_BAD_SETTING with fault->field = name and fault->index = its row in the table. Only members that lie
 * wholly within settings->size are read. RDL_BAD_ARGUMENT (field "size") when size is larger than this library's struct,
 * since it may hold a setting that the library does not know, or smaller than its own member. */
RDL_API rdl_status rdl_settings_check(const rdl_settings *settings, rdl_fault *fault);

#ifdef __cplusplus
}
#endif
#endif
