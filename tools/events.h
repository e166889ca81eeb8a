/* events.h: pairs by name, and where two runs of one step part. */
#ifndef RADDLE_TOOLS_EVENTS_H
#define RADDLE_TOOLS_EVENTS_H

#include "scenario.h"

typedef struct pair_name {
    uint32_t kind, first, second; /* RDL_POINT_TRIANGLE, RDL_EDGE_EDGE */
} pair_name;

/* The scene's elements, for names. */
typedef struct naming {
    const rdl_scene *scene;
    const uint32_t (*edges)[2];
    size_t edge_count;
} naming;

enum { NAME_ROOM = 640 };

naming naming_of(const scenario *s, const stepper *st);
/* pt:VERTEX:TRIANGLE or ee:EDGE:EDGE; an edge is its number, or A-B, its vertices. NULL, or what is wrong with the text. */
const char *pair_read(const naming *names, const char *text, pair_name *pair);
/* "pt:3:17 (vertex 3 of "thread", triangle 17 of "sheet")". */
void pair_text(const naming *names, uint32_t kind, uint32_t first, uint32_t second, char text[NAME_ROOM]);
/* kind 0, 1, 2: vertex, edge, triangle. */
void element_text(const naming *names, uint32_t kind, uint32_t id, char text[NAME_ROOM]);
void pair_vertices(const naming *names, const pair_name *pair, uint32_t vertex[4]);

/* Where two runs part. */
typedef struct difference {
    bool found;
    size_t frame;
    const char *stage;  /* input, boxes, pairs, touches, zones, pieces, delivered, verdict */
    uint32_t detection;
    char element[NAME_ROOM], here[NAME_ROOM], there[NAME_ROOM];
} difference;

/* The first event that differs; false: none. */
bool events_differ(const naming *names, const rdl_event *here, size_t here_count, const rdl_event *there,
                   size_t there_count, difference *out);
/* The first vertex whose bits differ in two states. */
bool states_differ(const naming *names, const char *stage, const double *here, const double *there, difference *out);
/* One event as text, without its stage. */
void event_text(const naming *names, const rdl_event *event, char text[NAME_ROOM]);

#endif
