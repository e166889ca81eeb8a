/* scenes/play.h: plays a scene step by step through a resolver, with or without the judge. */
#ifndef SCENES_PLAY_H
#define SCENES_PLAY_H

#include "judge.h"

enum { /* bits of verdicts that a scene accepts */
    CLEAR = 1u << RDL_CLEAR,
    RESOLVED = 1u << RDL_RESOLVED,
    PINCHED = 1u << RDL_PINCHED,
    TANGLED = 1u << RDL_TANGLED
};

enum { /* further variants of a scene */
    ALSO_FLOAT32 = 1,
    ALSO_SMALL = 2,   /* lengths x 2^-27: DNA */
    ALSO_LARGE = 4,   /* lengths x 2^10: cables */
    PLATES = 8,       /* may hold vertices: left out of the sum of held ones */
    QUICK = 16        /* also in the short run, for builds with sanitizers */
};

typedef struct scene {
    const char *name;
    unsigned steps, flags;
    void (*build)(world *w);
    /* Driven vertices of `proposed` at the end of a step; NULL: they stay. */
    void (*drive)(const world *w, unsigned step, double (*proposed)[3]);
    /* Overrides the host's proposal; may be NULL. */
    void (*dictate)(const world *w, unsigned step, double (*proposed)[3]);
    /* Verdicts that are right in this step, as bits. */
    unsigned (*verdicts)(const world *w, unsigned step);
    /* What else must hold after a step, and after the last one (w is then at the delivered positions); may be NULL. */
    void (*inspect)(judge *j, const judge_step *step);
    void (*finish)(judge *j, unsigned steps, const uint64_t verdicts[4]);
} scene;

extern const scene scenes[];
extern const int scene_count;
int scene_find(const char *name);

/* What answers a step; step->mass is given. */
typedef rdl_status resolver(rdl_engine *engine, size_t vertex_count, const rdl_step *step, rdl_report *report,
                            rdl_fault *fault);
resolver resolve_by_engine;

typedef struct play_options {
    resolver *resolve;
    unsigned threads;
    double vector, scale;
    int format;
    bool judged, verbose, until_fault;
} play_options;

typedef struct play_result {
    unsigned steps;
    size_t vertex_count, elements, faults;
    char first_fault[200];
    double *track;           /* delivered, steps x N x 3 */
    uint8_t *verdict_track;  /* steps */
    uint64_t verdicts[4], passes, worst_passes, waypoints, zones, held, rigid, vertex_steps, pairs, exact;
    double mean_correction, engine_seconds, worst_seconds, all_seconds, drift, gain;
} play_result;

play_options play_defaults(void);
void play(const scene *s, const play_options *options, play_result *result);
void play_release(play_result *result);
/* One line of results. */
void play_print(const char *name, const play_result *result);

#endif
