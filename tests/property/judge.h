/* property/judge.h: the library's answer to one query against the exact oracle. */
#ifndef PROPERTY_JUDGE_H
#define PROPERTY_JUDGE_H

#include <stdbool.h>
#include <stddef.h>

#include "oracle.h"

typedef struct judge {
    int kind;
    size_t asked, touching;  /* by the oracle */
    size_t faults;           /* wrong answers of any sort */
    const char *what;        /* the first wrong answer, in words */
    rdl_motion motion;       /* its input */
    double gap;
    rdl_touch touch;         /* and what the library said */
    oracle_touch exact;
    mpq_t gap2;
} judge;

void judge_init(judge *j, int kind);
void judge_clear(judge *j);
void judge_answer(judge *j, const rdl_motion *motion, double gap, const rdl_touch *touch);
/* One line with everything needed to repeat the first wrong answer; static storage. */
const char *judge_story(const judge *j, const char *family);

/* Share of the usual number of members: 1 unless the environment's RADDLE_ROUNDS asks for longer runs. */
size_t judge_rounds(void);

#endif
