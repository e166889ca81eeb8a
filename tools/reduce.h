/* reduce.h: what the files of `raddle reduce` share. */
#ifndef RADDLE_TOOLS_REDUCE_H
#define RADDLE_TOOLS_REDUCE_H

#include <stdbool.h>

#include "cli.h"
#include "scenario.h"

/* A sub-scene with its motion, on its own: numbered from 0, owning everything. */
typedef struct reduced {
    scenario s;          /* s.scene points into the arrays below */
    rdl_part *parts;
    uint32_t *vertex_part, (*segments)[2], (*triangles)[3], (*muted)[2], (*attachments)[2];
    double *mass, *half;
    rdl_pair_friction *pair_friction;
    uint32_t *origin;    /* vertex in the scene it was cut from */
    uint32_t *element_origin; /* segments, then triangles, in the scene it was cut from */
} reduced;

/* Cuts the elements with keep[] = 1 (segments, then triangles) out of a scenario. start, proposed: N x 3 of the whole scene,
 * in place of the scenario's. The engine's memory goes along only where nothing is left out. False: no memory. */
bool reduced_cut(const scenario *whole, const uint8_t *keep, const double *start, const double *proposed, reduced *out);
void reduced_release(reduced *r);

typedef enum keep_kind {
    KEEP_VERDICT,   /* number: the verdict */
    KEEP_CROSSING,  /* some pair crosses on the way */
    KEEP_INTERSECT, /* some edge pierces a triangle at the start or the end */
    KEEP_MISSED,    /* crossing, and the verdict is clear or resolved */
    KEEP_ABOVE,     /* a number of the report is above a bound */
    KEEP_DIFFERS,   /* other bits with other threads, without vector code, or under an overridden setting */
    KEEP_COMMAND    /* a command ends with the code it ended with for the whole scene */
} keep_kind;

typedef struct predicate {
    keep_kind kind;
    int verdict, measure, exit_code;
    double bound;
    const char *command, *text;
    bool as_given;          /* judge start -> proposed, without an engine */
    rdl_settings settings, other;
    bool has_other;
    const char *scratch;    /* with command: prefix of files that it is given */
} predicate;

/* What one test found. */
typedef struct finding {
    bool holds, has_place;
    double place[3];        /* where, m: of the pair, or of the largest correction */
    uint32_t vertex;        /* whose place that is, in the scene that was tested */
    char what[256];
} finding;

/* False: the text is no predicate, an error was printed. */
bool predicate_read(const char *text, predicate *p);
/* number: of this test, for the names of files. Scenes that the engine refuses do not hold. */
void predicate_test(const predicate *p, const reduced *r, size_t number, finding *found);

typedef struct reducer {
    const scenario *whole;
    predicate keep;
    size_t element_count, jobs, tests;
    double begun, seconds_max;
    bool out_of_time;
    /* the best so far */
    uint8_t *mask;
    double *start, *proposed;
    finding best;
    size_t kept;
    /* called when the best has become smaller; may write it down */
    void (*improved)(struct reducer *r, void *user);
    void *user;
} reducer;

/* Delta debugging over parts, pieces, elements and motion. The mask, start and proposed must hold to begin with.
 * RDL_CANCELLED: interrupted, the best stays. */
rdl_status reduce_search(reducer *r);
/* Tests one mask with the present motion. */
bool reduce_try(reducer *r, const uint8_t *mask, const double *start, const double *proposed, finding *found);

/* The result: OUT (a shot), OUT with other endings (.obj, .png, .c). */
int reduce_write_shot(const reduced *r, const predicate *p, const char *path);
int reduce_write_mesh(const reduced *r, const char *path);
int reduce_write_test(const reduced *r, const predicate *p, const finding *found, const char *path);
int reduce_write_still(const reduced *r, const finding *found, const char *path);

#endif
