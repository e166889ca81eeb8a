/* events.c: see events.h. */
#include "events.h"

#include <inttypes.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "cli.h"

static const char *const stages[RDL_EVENT_STAGES] = {"boxes", "pairs", "touches", "zones", "zones", "pieces"};
static const char *const levels[RDL_LEVEL_COUNT] = {"solved as one-sided contacts", "kept apart by fixed planes",
                                                    "moved as one rigid body", "in a shorter piece of the step", "held"};
static const char *const pieces[] = {"accepted", "shortened", "gives way", "held"};

naming naming_of(const scenario *s, const stepper *st)
{
    naming names = {.scene = &s->scene};
    names.edges = rdl_engine_edges(st->engine, &names.edge_count);
    return names;
}

static const char *part_of(const naming *names, uint32_t vertex)
{
    return cli_clean(names->scene->parts[names->scene->vertex_part[vertex]].name);
}

void element_text(const naming *names, uint32_t kind, uint32_t id, char text[NAME_ROOM])
{
    if (kind == 0 && id < names->scene->vertex_count)
        snprintf(text, NAME_ROOM, "vertex %" PRIu32 " of \"%.200s\"", id, part_of(names, id));
    else if (kind == 1 && id < names->edge_count)
        snprintf(text, NAME_ROOM, "edge %" PRIu32 "-%" PRIu32 " of \"%.200s\"", names->edges[id][0], names->edges[id][1],
                 part_of(names, names->edges[id][0]));
    else if (kind == 2 && id < names->scene->triangle_count)
        snprintf(text, NAME_ROOM, "triangle %" PRIu32 " of \"%.200s\"", id,
                 part_of(names, names->scene->triangles[id][0]));
    else
        snprintf(text, NAME_ROOM, "element %" PRIu32 ", which the scene does not have", id);
}

void pair_text(const naming *names, uint32_t kind, uint32_t first, uint32_t second, char text[NAME_ROOM])
{
    char a[NAME_ROOM], b[NAME_ROOM];
    element_text(names, kind == RDL_POINT_TRIANGLE ? 0 : 1, first, a);
    element_text(names, kind == RDL_EDGE_EDGE ? 1 : 2, second, b);
    snprintf(text, NAME_ROOM, "%s:%" PRIu32 ":%" PRIu32 " (%.280s, %.280s)",
             kind == RDL_POINT_TRIANGLE ? "pt" : kind == RDL_EDGE_EDGE ? "ee" : "et", first, second, a, b);
}

void pair_vertices(const naming *names, const pair_name *pair, uint32_t vertex[4])
{
    if (pair->kind == RDL_POINT_TRIANGLE) {
        vertex[0] = pair->first;
        memcpy(vertex + 1, names->scene->triangles[pair->second], 3 * sizeof vertex[0]);
    } else {
        memcpy(vertex, names->edges[pair->first], 2 * sizeof vertex[0]);
        memcpy(vertex + 2, names->edges[pair->second], 2 * sizeof vertex[0]);
    }
}

/* ---- names on the command line ---- */

static bool read_number(const char **text, size_t count, uint32_t *value)
{
    char *end = NULL;
    if (**text < '0' || **text > '9')
        return false;
    unsigned long number = strtoul(*text, &end, 10);
    *text = end;
    *value = (uint32_t)number;
    return number < count;
}

static bool read_edge(const naming *names, const char **text, uint32_t *value)
{
    const char *at = *text;
    uint32_t a, b;
    if (!read_number(&at, UINT32_MAX, &a))
        return false;
    if (*at != '-') {
        *value = a;
        *text = at;
        return a < names->edge_count;
    }
    at++;
    if (!read_number(&at, UINT32_MAX, &b))
        return false;
    *text = at;
    for (uint32_t e = 0; e < names->edge_count; e++)
        if ((names->edges[e][0] == a && names->edges[e][1] == b) || (names->edges[e][0] == b && names->edges[e][1] == a)) {
            *value = e;
            return true;
        }
    return false;
}

const char *pair_read(const naming *names, const char *text, pair_name *pair)
{
    static const char *const wanted = "is not a pair: pt:VERTEX:TRIANGLE or ee:EDGE:EDGE (an edge: its number, or A-B)";
    bool point = strncmp(text, "pt:", 3) == 0;
    if (!point && strncmp(text, "ee:", 3) != 0)
        return wanted;
    const char *at = text + 3;
    pair->kind = point ? RDL_POINT_TRIANGLE : RDL_EDGE_EDGE;
    bool first = point ? read_number(&at, names->scene->vertex_count, &pair->first) : read_edge(names, &at, &pair->first);
    if (!first)
        return point ? "names a vertex that the scene does not have" : "names an edge that the scene does not have";
    if (*at++ != ':')
        return wanted;
    bool second =
        point ? read_number(&at, names->scene->triangle_count, &pair->second) : read_edge(names, &at, &pair->second);
    if (!second)
        return point ? "names a triangle that the scene does not have" : "names an edge that the scene does not have";
    if (*at != '\0' || (!point && pair->first == pair->second))
        return wanted;
    if (!point && pair->first > pair->second) {
        uint32_t lower = pair->second;
        pair->second = pair->first;
        pair->first = lower;
    }
    uint32_t v[4];
    pair_vertices(names, pair, v);
    for (int i = 0; i < 4; i++)
        for (int k = 0; k < i; k++)
            if (v[i] == v[k])
                return "names two elements that share a vertex: such pairs are not looked at";
    return NULL;
}

/* ---- differences ---- */

void event_text(const naming *names, const rdl_event *event, char text[NAME_ROOM])
{
    char name[NAME_ROOM];
    const double *v = event->value;
    switch (event->stage) {
    case RDL_EVENT_BOX:
        snprintf(text, NAME_ROOM, "box %.9g %.9g %.9g to %.9g %.9g %.9g", v[0], v[1], v[2], v[3], v[4], v[5]);
        break;
    case RDL_EVENT_PAIR:
        pair_text(names, event->kind, event->first, event->second, text);
        break;
    case RDL_EVENT_TOUCH: {
        unsigned bits = (unsigned)v[4];
        snprintf(text, NAME_ROOM, "comes %s%s%sat %.9g of the piece; gap %.9g m, floor %.9g m, start distance %.9g m",
                 (bits & RDL_TOUCH_PATH) != 0 ? "below its path floor " : "",
                 (bits & RDL_TOUCH_END) != 0 ? "below its end floor " : "",
                 (bits & RDL_TOUCH_CLOSE) != 0 ? "close " : "", v[0], v[1], v[2], v[3]);
        break;
    }
    case RDL_EVENT_ZONE:
        snprintf(text, NAME_ROOM, "zone %" PRIu32 ": %.0f vertices, %.0f contacts, %s%s%s", event->first, v[0], v[1],
                 event->kind < RDL_LEVEL_COUNT ? levels[event->kind] : "?", v[2] != 0 ? ", near driven vertices" : "",
                 v[3] != 0 ? ", violated" : v[4] != 0 ? ", settled" : "");
        break;
    case RDL_EVENT_MEMBER:
        pair_text(names, event->kind, event->first, event->second, name);
        snprintf(text, NAME_ROOM, "%.500s in zone %.0f%s", name, v[0], v[1] != 0 ? ", violated" : "");
        break;
    default:
        snprintf(text, NAME_ROOM, "piece %s: %.9g of the step certified, length %.9g",
                 event->kind < 4 ? pieces[event->kind] : "?", v[0], v[1]);
    }
}

/* Whether `a` comes before `b` in the order in which a detection lists its events. */
static bool comes_before(const rdl_event *a, const rdl_event *b)
{
    if (a->detection != b->detection)
        return a->detection < b->detection;
    bool zones = a->stage >= RDL_EVENT_ZONE && a->stage <= RDL_EVENT_MEMBER && b->stage >= RDL_EVENT_ZONE &&
                 b->stage <= RDL_EVENT_MEMBER;
    if (a->stage != b->stage) /* each zone is followed by its members: what the other side lacks is a member */
        return zones ? a->stage > b->stage : a->stage < b->stage;
    if (a->kind != b->kind)
        return a->kind < b->kind;
    return a->first != b->first ? a->first < b->first : a->second < b->second;
}

static bool same_place(const rdl_event *a, const rdl_event *b)
{
    return !comes_before(a, b) && !comes_before(b, a);
}

static void name_event(const naming *names, const rdl_event *event, char text[NAME_ROOM])
{
    if (event->stage == RDL_EVENT_BOX)
        element_text(names, event->kind, event->first, text);
    else if (event->stage == RDL_EVENT_ZONE || event->stage == RDL_EVENT_PIECE)
        snprintf(text, NAME_ROOM, event->stage == RDL_EVENT_ZONE ? "zone %" PRIu32 : "piece", event->first);
    else
        pair_text(names, event->kind, event->first, event->second, text);
}

bool events_differ(const naming *names, const rdl_event *here, size_t here_count, const rdl_event *there,
                   size_t there_count, difference *out)
{
    size_t least = here_count < there_count ? here_count : there_count, i = 0;
    while (i < least && memcmp(&here[i], &there[i], sizeof here[i]) == 0)
        i++;
    if (i == here_count && i == there_count)
        return false;
    const rdl_event *a = i < here_count ? &here[i] : NULL, *b = i < there_count ? &there[i] : NULL;
    /* Lists are sorted: the smaller row is the one that the other side does not have. */
    bool both = a != NULL && b != NULL && same_place(a, b);
    const rdl_event *first = b == NULL || (a != NULL && (both || comes_before(a, b))) ? a : b;
    out->found = true;
    out->stage = first->stage < RDL_EVENT_STAGES ? stages[first->stage] : "?";
    out->detection = first->detection;
    name_event(names, first, out->element);
    strcpy(out->here, "absent");
    strcpy(out->there, "absent");
    if (both || first == a)
        event_text(names, a, out->here);
    if (both || first == b)
        event_text(names, b, out->there);
    if (!both && first->stage == RDL_EVENT_PAIR)
        strcpy(first == a ? out->here : out->there, "a candidate");
    return true;
}

bool states_differ(const naming *names, const char *stage, const double *here, const double *there, difference *out)
{
    for (size_t v = 0; v < names->scene->vertex_count; v++) {
        const double *a = here + 3 * v, *b = there + 3 * v;
        if (memcmp(a, b, 3 * sizeof *a) == 0)
            continue;
        out->found = true;
        out->stage = stage;
        element_text(names, 0, (uint32_t)v, out->element);
        snprintf(out->here, NAME_ROOM, "%.17g %.17g %.17g", a[0], a[1], a[2]);
        snprintf(out->there, NAME_ROOM, "%.17g %.17g %.17g", b[0], b[1], b[2]);
        return true;
    }
    return false;
}
