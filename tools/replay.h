/* replay.h: what the files of `raddle replay` share. */
#ifndef RADDLE_TOOLS_REPLAY_H
#define RADDLE_TOOLS_REPLAY_H

#include "cli.h"
#include "events.h"

typedef struct replayer {
    const char *path, *against, *explain;
    unsigned threads;
    bool json, trace, tap, overridden;
    const char *range;
    const cli_line *line;
    rdl_settings settings; /* as used */
    rdl_shot *shot, *other;
    rdl_shot_tracer *tracer; /* with --trace, from the first frame on */
    const rdl_shot_info *about, *other_about;
    stepper st, other_st;
    size_t first, last; /* frames, inclusive */
    size_t frames, equal, limited;
    difference diff;    /* the first */
    size_t differing;
    double seconds;
    char reason[NAME_ROOM]; /* why nothing could be said, for TAP */
} replayer;

extern const cli_spec replay_spec;

/* --explain: prints the life of one pair in one frame. */
int replay_explain(replayer *r);
/* --against: this shot and another one, frame by frame. Exit code. */
int replay_compare(replayer *r);
/* One frame of the shot at hand, stepped: the scenario is the caller's to release. */
rdl_status replay_frame(replayer *r, size_t frame, scenario *s, rdl_fault *fault);

#endif
