/* demo.h: the demo's parts: options, the run, the stills, the table. */
#ifndef RADDLE_TOOLS_DEMO_H
#define RADDLE_TOOLS_DEMO_H

#include <raddle/engine.h>
#include <raddle/shot.h>

#include "demo_scene.h"

typedef struct demo_options {
    int respond;         /* 0: the host alone */
    int small, json, force, stills;
    size_t pictures;
    unsigned threads;    /* 0 = all processors */
    const char *shot;    /* file to write */
    const char *folder;  /* of the stills */
    const char *body;    /* mesh file */
} demo_options;

enum { DEMO_STILLS = 3, DEMO_PATH = 4096 };

typedef struct demo_result {
    size_t steps, pictures;
    size_t verdicts[4];       /* by rdl_verdict */
    uint64_t touches, zones, passes, held, moved;
    double worst_correction;  /* m */
    double sum_correction;    /* m, mean per movable vertex, summed over the steps */
    double seconds[RDL_TIME_COUNT];
    double host_seconds, shot_seconds, stills_seconds, total_seconds;
    size_t solver_iterations;
    unsigned threads;
    char stills[DEMO_STILLS][DEMO_PATH];
    size_t still_count;
    int interrupted;
} demo_result;

/* Plays the scene, writes the shot and the stills. Returns an exit code; what went wrong was said. */
int demo_play(demo_scene *scene, const demo_options *options, demo_result *result);

/* ---- stills, see demo_stills.c ---- */
typedef struct demo_stills demo_stills;

/* Path of still k (from 0), cut off if too long for the buffer; returns its full length. */
size_t demo_still_path(const demo_options *options, int k, char path[], size_t path_size);
/* NULL: no memory. scene and described (what host_describe gave) must outlive it. */
demo_stills *demo_stills_begin(demo_scene *scene, const rdl_scene *described, const demo_options *options);
/* To be called before each picture, the first being 0: lets the host run alone for a while where a still is to come,
 * and puts it back. 0: no memory. */
int demo_stills_before(demo_stills *stills, size_t picture);
/* After each step, before host_accept: which vertices were corrected, and how far. */
void demo_stills_watch(demo_stills *stills, const double (*delivered)[3]);
/* After each picture: draws the still where one is due, its path into result. */
rdl_status demo_stills_after(demo_stills *stills, size_t picture, demo_result *result);
void demo_stills_end(demo_stills *stills);

#endif
