/* narrow/list.c: lists of pairs, in blocks: the screen for all, the vector stages for those that stay open, four at a time,
 * and the scalar stages for the rest. */
#include "narrow/stages.h"

enum { BLOCK = 64, MOST_LOOKS = 10 };

/* Pairs on their way through the stages, brought to ordinary size where they need it. */
typedef struct work {
    const rdli_path *path;
    int kind;
    size_t count, open_count;
    const rdl_motion *motion[BLOCK];
    double gap[BLOCK];   /* in the unit of motion */
    int16_t shift[BLOCK];
    uint8_t verdict[BLOCK];
    uint8_t open[BLOCK]; /* places of the pairs that the screen leaves open */
    rdl_motion own[BLOCK];
} work;

/* Four places of the list; behind its end the last one is repeated. */
static void fill_quad(const work *w, const uint8_t *places, size_t count, size_t first, rdli_quad *quad)
{
    for (size_t lane = 0; lane < RDLI_LANES; lane++) {
        size_t at = first + lane < count ? first + lane : count - 1;
        size_t place = places ? places[at] : at;
        quad->motion[lane] = w->motion[place];
        quad->gap[lane] = w->gap[place];
    }
}

static void resize(work *w, const uint8_t verdict[RDLI_LANES], size_t first)
{
    for (size_t at = first; at < first + RDLI_LANES && at < w->count; at++) {
        if (verdict[at - first] != RDLI_SCREEN_RESIZE)
            continue;
        int shift = rdli_scale_points((const double *)w->motion[at], 24, (double *)&w->own[at]);
        w->shift[at] = (int16_t)shift;
        w->gap[at] = ldexp(w->gap[at], shift);
        w->motion[at] = &w->own[at];
    }
}

static void screen_block(work *w, size_t count, const rdl_motion motions[], const double gaps[])
{
    w->count = count;
    w->open_count = 0;
    for (size_t i = 0; i < count; i++) {
        w->motion[i] = &motions[i];
        w->gap[i] = gaps ? gaps[i] : 0;
        w->shift[i] = 0;
    }
    for (size_t first = 0; first < count; first += RDLI_LANES) {
        rdli_quad quad;
        uint8_t verdict[RDLI_LANES];
        fill_quad(w, NULL, count, first, &quad);
        w->path->screen(w->kind, &quad, verdict);
        bool odd = false;
        for (size_t lane = 0; lane < RDLI_LANES; lane++)
            odd = odd || verdict[lane] == RDLI_SCREEN_RESIZE;
        if (odd) {
            resize(w, verdict, first);
            fill_quad(w, NULL, count, first, &quad);
            w->path->screen(w->kind, &quad, verdict);
        }
        for (size_t at = first; at < first + RDLI_LANES && at < count; at++) {
            w->verdict[at] = verdict[at - first];
            if (w->verdict[at] == RDLI_SCREEN_OPEN)
                w->open[w->open_count++] = (uint8_t)at;
        }
    }
}

static const rdl_touch apart_by_direction = {.time_lo = 1, .time_hi = 1, .order = 1, .stage = RDL_STAGE_DIRECTION};
static const rdl_touch apart_by_cubic = {.time_lo = 1, .time_hi = 1, .order = 3, .stage = RDL_STAGE_CUBIC};

/* The pairs of a block on their way to an answer at a gap > 0. */
typedef struct course {
    double state[BLOCK][RDLI_STATE], gap[BLOCK];
    uint8_t start[BLOCK], unsure[BLOCK], done[BLOCK], looks[BLOCK];
} course;

/* The rows of the lanes of fill_quad. */
static void point_rows(const uint8_t *places, size_t count, size_t first, course *c, rdli_progress *p)
{
    for (size_t lane = 0; lane < RDLI_LANES; lane++)
        p->state[lane] = c->state[places[first + lane < count ? first + lane : count - 1]];
}

static void keep(const rdli_progress *p, size_t lane, size_t at, course *c)
{
    c->done[at] = p->done[lane];
    c->start[at] = p->start[lane];
    c->unsure[at] = p->unsure[lane];
}

/* Looks at the given places until they are done, or looked at MOST_LOOKS times; full quads as long as there are any. */
static void look_on(const work *w, uint8_t places[BLOCK], size_t count, course *c)
{
    for (int round = 0; round < MOST_LOOKS && count > 0; round++) {
        for (size_t first = 0; first < count; first += RDLI_LANES) {
            rdli_quad quad;
            rdli_progress p;
            for (size_t lane = 0; lane < RDLI_LANES; lane++) {
                size_t at = places[first + lane < count ? first + lane : count - 1];
                quad.motion[lane] = w->motion[at];
                quad.gap[lane] = c->gap[at];
            }
            point_rows(places, count, first, c, &p);
            w->path->look_again(w->kind, &quad, &p);
            for (size_t lane = 0; lane < RDLI_LANES && first + lane < count; lane++) {
                c->done[places[first + lane]] = p.done[lane];
                c->looks[places[first + lane]]++;
            }
        }
        size_t left = 0;
        for (size_t i = 0; i < count; i++) {
            places[left] = places[i];
            left += !c->done[places[i]];
        }
        count = left;
    }
}

/* Where the lanes have come to, as a touch; false where the pair is open. */
static bool arrived(const course *c, size_t at, rdl_touch *touch)
{
    if (c->unsure[at])
        return false;
    const double *state = c->state[at];
    bool touches = state[RDLI_STATE_HI] <= 1;
    if (c->start[at])
        *touch = (rdl_touch){.touches = 1, .stage = RDL_STAGE_ENDS, .order = 1};
    else if (c->done[at])
        *touch = (rdl_touch){.time_lo = touches ? state[RDLI_STATE_LO] : 1, .time_hi = touches ? state[RDLI_STATE_HI] : 1, .touches = touches,
            .order = 1, .depth = c->looks[at], .stage = RDL_STAGE_SERIES};
    return c->start[at] || c->done[at];
}

static void open_touch(const work *w, size_t place, const rdl_motion *motion, double gap, rdl_touch *touch)
{
    rdli_sized sized = {*w->motion[place], w->shift[place]};
    rdli_find_open_touch(w->kind, motion, &sized, gap, touch);
}

static void meet_open(const work *w, const uint8_t *places, size_t count, const rdl_motion motions[], rdl_touch touches[])
{
    for (size_t first = 0; first < count; first += RDLI_LANES) {
        rdli_quad quad;
        rdli_answers answers;
        fill_quad(w, places, count, first, &quad);
        w->path->meet(w->kind, &quad, &answers);
        for (size_t lane = 0; lane < RDLI_LANES && first + lane < count; lane++) {
            size_t at = places[first + lane];
            bool touch = answers.answer[lane] == RDLI_LANE_TOUCH;
            if (answers.answer[lane] == RDLI_LANE_OPEN)
                open_touch(w, at, &motions[at], 0, &touches[at]);
            else
                touches[at] = (rdl_touch){.time_lo = touch ? answers.lo[lane] : 1, .time_hi = touch ? answers.hi[lane] : 1,
                    .touches = touch, .order = 3, .stage = RDL_STAGE_ROOTS};
        }
    }
}

static void approach_open(const work *w, const uint8_t *places, size_t count, const rdl_motion motions[],
                          const double gaps[], rdl_touch touches[])
{
    course c;
    uint8_t going[BLOCK];
    size_t going_count = 0;
    for (size_t first = 0; first < count; first += RDLI_LANES) {
        rdli_quad quad;
        rdli_progress p;
        fill_quad(w, places, count, first, &quad);
        point_rows(places, count, first, &c, &p);
        w->path->approach(w->kind, &quad, &p);
        for (size_t lane = 0; lane < RDLI_LANES && first + lane < count; lane++) {
            size_t at = places[first + lane];
            keep(&p, lane, at, &c);
            c.gap[at] = w->gap[at];
            c.looks[at] = 0;
            going[going_count] = (uint8_t)at;
            going_count += !c.start[at] && !c.unsure[at] && !c.done[at] && isnormal(w->gap[at]);
        }
    }
    look_on(w, going, going_count, &c);
    for (size_t i = 0; i < count; i++) {
        size_t at = places[i];
        if (!isnormal(w->gap[at]) || !arrived(&c, at, &touches[at]))
            open_touch(w, at, &motions[at], gaps[at], &touches[at]);
    }
}

void rdli_find_touch_list(int kind, size_t count, const rdl_motion motions[], const double gaps[], rdl_touch touches[])
{
    work w;
    w.path = rdli_path_choose();
    w.kind = kind;
    for (size_t first = 0; first < count; first += BLOCK) {
        size_t here = count - first < BLOCK ? count - first : BLOCK;
        const double *own_gaps = gaps ? gaps + first : NULL;
        screen_block(&w, here, motions + first, own_gaps);
        for (size_t i = 0; i < here; i++)
            if (w.verdict[i] != RDLI_SCREEN_OPEN)
                touches[first + i] = w.verdict[i] == RDLI_SCREEN_CUBIC ? apart_by_cubic : apart_by_direction;
        uint8_t with[BLOCK], without[BLOCK];
        size_t with_count = 0, without_count = 0;
        for (size_t i = 0; i < w.open_count; i++) {
            bool gapped = gaps && own_gaps[w.open[i]] > 0;
            (gapped ? with : without)[gapped ? with_count++ : without_count++] = w.open[i];
        }
        meet_open(&w, without, without_count, motions + first, touches + first);
        if (with_count > 0)
            approach_open(&w, with, with_count, motions + first, own_gaps, touches + first);
    }
}

void rdli_find_touch(int kind, const rdl_motion *motion, double gap, rdl_touch *touch)
{
    rdli_find_touch_list(kind, 1, motion, &gap, touch);
}

void rdli_screen_list(int kind, size_t count, const rdl_motion motions[], const double gaps[], uint8_t quiet[])
{
    work w;
    w.path = rdli_path_choose();
    w.kind = kind;
    for (size_t first = 0; first < count; first += BLOCK) {
        size_t here = count - first < BLOCK ? count - first : BLOCK;
        screen_block(&w, here, motions + first, gaps + first);
        for (size_t i = 0; i < here; i++)
            quiet[first + i] = w.verdict[i] != RDLI_SCREEN_OPEN;
    }
}

static void enclosure_of(const work *w, const rdli_outlook *o, size_t lane, size_t at, const rdl_motion *motion, int end,
                         rdli_enclosure *enclosure)
{
    if (o->tight[end][lane]) {
        enclosure->lo = rdli_unscaled(o->lo[end][lane], w->shift[at], 0);
        enclosure->hi = rdli_unscaled(o->hi[end][lane], w->shift[at], (double)INFINITY);
    } else {
        rdli_exact_enclosure(w->kind, end ? motion->end : motion->start, enclosure);
    }
}

/* What the lanes know of one pair, completed where they do not know enough. */
static void finish(const work *w, const rdli_outlook *o, size_t lane, size_t at, const course *c, const rdl_motion *motion,
                   double gap, double share, const double *floor_distance, rdli_examined *examined)
{
    *examined = (rdli_examined){.quiet = o->quiet[lane]};
    if (examined->quiet)
        return;
    rdli_enclosure ends[2];
    for (int end = 0; end < 2; end++)
        enclosure_of(w, o, lane, at, motion, end, &ends[end]);
    examined->start_lo = ends[0].lo;
    examined->start_hi = ends[0].hi;
    examined->end_lo = ends[1].lo;
    examined->contact_at_start = ends[0].hi == 0;
    double from = floor_distance ? floor_distance[1] : ends[0].hi;
    examined->end_floor = from < gap ? from : gap;
    /* never below the exact product */
    examined->path_floor = examined->end_floor > 0 ? nextafter(share * examined->end_floor, (double)INFINITY) : 0;
    examined->below_end = floor_distance ? !rdli_end_reaches(w->kind, motion, &ends[1], examined->end_floor)
                                         : !rdli_end_keeps(w->kind, motion, gap, ends);
    bool known = o->known[lane] && isnormal(examined->path_floor);
    if (!known || !arrived(c, at, &examined->touch))
        open_touch(w, at, motion, examined->path_floor, &examined->touch);
    examined->reaches_path = examined->touch.touches;
}

static void examine_open(const work *w, const rdl_motion motions[], const double gaps[], double share,
                         const double (*floors)[2], rdli_examined examined[])
{
    rdli_outlook outlooks[BLOCK / RDLI_LANES];
    course c;
    uint8_t going[BLOCK];
    size_t going_count = 0;
    for (size_t first = 0; first < w->open_count; first += RDLI_LANES) {
        rdli_quad quad;
        rdli_outlook *o = &outlooks[first / RDLI_LANES];
        alignas(32) double from[RDLI_LANES] = {-1, -1, -1, -1};
        fill_quad(w, w->open, w->open_count, first, &quad);
        for (size_t lane = 0; floors && lane < RDLI_LANES; lane++) {
            size_t at = w->open[first + lane < w->open_count ? first + lane : w->open_count - 1];
            from[lane] = ldexp(floors[at][1], w->shift[at]);
        }
        point_rows(w->open, w->open_count, first, &c, &o->progress);
        w->path->outlook(w->kind, &quad, share, from, o);
        for (size_t lane = 0; lane < RDLI_LANES && first + lane < w->open_count; lane++) {
            size_t at = w->open[first + lane];
            if (o->quiet[lane] || !o->known[lane])
                continue;
            keep(&o->progress, lane, at, &c);
            c.gap[at] = o->path[lane];
            c.looks[at] = 0;
            going[going_count] = (uint8_t)at;
            going_count += !c.start[at] && !c.unsure[at] && !c.done[at];
        }
    }
    look_on(w, going, going_count, &c);
    for (size_t i = 0; i < w->open_count; i++) {
        size_t at = w->open[i];
        finish(w, &outlooks[i / RDLI_LANES], i % RDLI_LANES, at, &c, &motions[at], gaps[at], share,
               floors ? floors[at] : NULL, &examined[at]);
    }
}

void rdli_examine_list(int kind, size_t count, const rdl_motion motions[], const double gaps[], double share,
                       const double (*floor_distances)[2], rdli_examined examined[])
{
    work w;
    w.path = rdli_path_choose();
    w.kind = kind;
    for (size_t first = 0; first < count; first += BLOCK) {
        size_t here = count - first < BLOCK ? count - first : BLOCK;
        screen_block(&w, here, motions + first, gaps + first);
        for (size_t i = 0; i < here; i++)
            if (w.verdict[i] != RDLI_SCREEN_OPEN)
                examined[first + i] = (rdli_examined){.quiet = 1};
        examine_open(&w, motions + first, gaps + first, share, floor_distances ? floor_distances + first : NULL,
                     examined + first);
    }
}

void rdli_examine(int kind, const rdl_motion *motion, double gap, double share, const double floor_distance[2],
                  rdli_examined *examined)
{
    rdli_examine_list(kind, 1, motion, &gap, share, floor_distance ? (const double (*)[2])floor_distance : NULL, examined);
}
