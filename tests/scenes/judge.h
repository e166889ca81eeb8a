/* scenes/judge.h: what must hold after each step, found without the library: brute-force candidates, a sound filter,
 * and the exact oracle where the filter cannot tell. */
#ifndef SCENES_JUDGE_H
#define SCENES_JUDGE_H

#include "raddle/engine.h"
#include "world.h"

typedef const double (*rows)[3];

/* One step as the judge sees it. */
typedef struct judge_step {
    unsigned number;
    rows start, proposed, delivered;
    const rdl_report *report;
    unsigned verdicts; /* bits 1 << RDL_... that the scene accepts */
} judge_step;

typedef struct judge_pair {
    uint32_t first, second;
} judge_pair;

typedef struct judge {
    const world *w;
    bool verbose;
    size_t edge_count;
    uint32_t (*edges)[2];       /* unique, lower vertex first, sorted */
    judge_pair *pierces;        /* at the last delivered positions: edge, triangle; sorted */
    size_t pierce_count, pierce_room;
    judge_pair *found;          /* candidates of the step */
    size_t found_count, found_room;
    uint8_t *near;              /* per vertex: something else comes near enough to matter: 1, something driven: 2 */
    uint32_t *group;            /* per vertex: union-find over the report's contacts */
    long linking[WORLD_LOOPS * WORLD_LOOPS];
    size_t faults;
    char first_fault[200];
    /* counts for the summary */
    uint64_t pairs, exact, vertex_steps, held, rigid;
    double drift, gain;         /* worst momentum and energy ratio to what is allowed */
} judge;

void judge_begin(judge *j, const world *w, bool verbose);
void judge_end(judge *j);
/* Counts and keeps the first. */
void judge_fault(judge *j, unsigned step, const char *format, ...) __attribute__((format(printf, 3, 4)));
void judge_the_step(judge *j, const judge_step *step);

/* judge_pairs.c */
bool judge_names(const rdl_report *report, uint32_t kind, uint32_t first, uint32_t second);
void judge_vertices(const judge *j, uint32_t kind, uint32_t first, uint32_t second, uint32_t vertex[4]);
double judge_gap(const judge *j, const uint32_t vertex[4], int kind);
bool judge_is_active(const judge *j, const uint32_t *a, int a_count, const uint32_t *b, int b_count);
/* All pairs apart along the delivered path; fills near. */
void judge_paths(judge *j, const judge_step *step);
/* Was there a reason to move anything: some pair of the proposed motion not apart? */
bool judge_proposal_fails(judge *j, const judge_step *step);
/* Edge-triangle pierces at rest, exact; sorted by (edge, triangle). */
void judge_find_pierces(judge *j, rows x, judge_pair **pierces, size_t *count, size_t *room);

/* judge_books.c */
void judge_books(judge *j, const judge_step *step);

#endif
