/* judge.h: tangles at rest and crossings along straight paths, found with the public queries alone: candidate pairs
 * from rdl_tree, touches at gap 0 from rdl_find_touches, piercing edges from rdl_edge_against_triangle. No engine takes
 * part. */
#ifndef RADDLE_TOOLS_JUDGE_H
#define RADDLE_TOOLS_JUDGE_H

#include <stdbool.h>

#include <raddle/raddle.h>

typedef struct judge judge;

typedef enum judge_kind {
    JUDGE_TANGLE,      /* an edge pierces a triangle at rest: first = edge, second = triangle */
    JUDGE_CROSSING_PT, /* vertex, triangle */
    JUDGE_CROSSING_EE, /* lower edge, higher edge */
    JUDGE_KINDS
} judge_kind;

typedef struct judge_finding {
    double time_lo, time_hi; /* crossings: share of the piece */
    uint32_t kind, first, second;
    uint32_t driven; /* 1: all vertices are driven: bodies that cut themselves or each other */
} judge_finding;

typedef struct judge_counts {
    uint64_t tangles, crossings;               /* with at least one movable vertex */
    uint64_t driven_tangles, driven_crossings; /* all vertices driven */
    uint64_t contacts;                         /* pairs at distance 0 where the piece starts */
    uint64_t pairs;                            /* candidate pairs looked at */
} judge_counts;

/* scene must outlive the judge. threads 0: all processors. list_driven: whether findings among driven vertices alone
 * are listed; they are counted either way. */
rdl_status judge_create(const rdl_scene *scene, unsigned threads, bool list_driven, judge **made);
void judge_destroy(judge *j);

/* Looks at the straight motion from -> to (N x 3 each). path: crossings on the way; end: tangles at rest in `to`.
 * Counts are full; *findings holds the first `most` in order of (driven, kind, first, second), owned by the judge until
 * its next call. The result does not depend on the threads. */
rdl_status judge_piece(judge *j, const double *from, const double *to, bool path, bool end, size_t most,
                       judge_counts *counts, const judge_finding **findings, size_t *finding_count, rdl_fault *fault);

/* Edges: sorted rows of two vertices, lower first. */
const uint32_t (*judge_edges(const judge *j, size_t *count))[2];

#endif
