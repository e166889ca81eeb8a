/* support/published.h: check values of pair motions that were worked out by hand. */
#ifndef SUPPORT_PUBLISHED_H
#define SUPPORT_PUBLISHED_H

#include "raddle/query.h"

typedef struct published_case {
    const char *name;
    int kind;
    double gap;
    int touches;
    double time; /* exact first time when it touches */
    rdl_motion motion;
} published_case;

extern const published_case published_cases[];
extern const int published_count;

#endif
