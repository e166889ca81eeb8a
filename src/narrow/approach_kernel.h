/* narrow/approach_kernel.h: gap > 0 in lanes: closest points, and directions that certify a part of the step. Included
 * after screen_kernel.h and nearest_kernel.h.
 *
 * Along a fixed direction every control point of the difference moves linearly, so the times at which the direction
 * separates by more than the gap are an interval, known from three or four linear crossings. The directions of the closest
 * points at both ends usually cover the whole step. Where they do not, Newton's method on the distance finds the crossing;
 * the direction of the closest points just behind it certifies the time before. */

/* Width of a bracket: below 1e-6, and far above what rounding can move a crossing of ordinary speed. */
#define BEHIND 0x1p-21

typedef struct reach {
    vec at[2][4]; /* projections of the control points on the direction at the ends of the step */
    vec need;     /* what they must stay above; the certificate asks for less by more than its rounding */
    vec proof;
} reach;

/* What a projection on a direction of that length must exceed to prove a distance above the gap: the screen's pad, once
 * more for the interpolation. */
LANE_INLINE vec proof_of(const block *b, vec gap, vec length)
{
    return (gap + 2 * b->pad) * length * (1 + 0x1p-48) + RDLI_UNDERFLOW;
}

LANE_INLINE void reach_along(int kind, const block *b, const vec3 *d, reach *r)
{
    for (int end = 0; end < 2; end++) {
        vec w = dot(&b->at[end].w, d), u = dot(&b->at[end].u, d), v = dot(&b->at[end].v, d);
        if (kind == RDL_POINT_TRIANGLE) {
            r->at[end][0] = r->at[end][3] = w;
            r->at[end][1] = w - u;
            r->at[end][2] = w - v;
        } else {
            r->at[end][0] = -w;
            r->at[end][1] = u - w;
            r->at[end][2] = -w - v;
            r->at[end][3] = (u - w) - v;
        }
    }
}

LANE_INLINE void reach_gap(const block *b, vec gap, vec length, reach *r)
{
    r->proof = proof_of(b, gap, length);
    r->need = (gap + 3 * b->pad) * length * (1 + 0x1p-47) + RDLI_UNDERFLOW; /* more, for the rounding of the times */
}

LANE_INLINE vec lowest_at(int kind, const reach *r, vec t)
{
    vec s = 1 - t, low = s * r->at[0][0] + t * r->at[1][0];
    for (int i = 1; i < (kind == RDL_POINT_TRIANGLE ? 3 : 4); i++)
        low = smaller(low, s * r->at[0][i] + t * r->at[1][i]);
    return low;
}

/* The interval round t in which the direction separates; empty (from > to) where it does not at t. */
LANE_INLINE void separated_times(int kind, const reach *r, vec t, vec *from, vec *to)
{
    vec first = all(0), last = all(1);
    for (int i = 0; i < (kind == RDL_POINT_TRIANGLE ? 3 : 4); i++) {
        vec a = r->at[0][i] - r->need, b = r->at[1][i] - r->need, meets = a / (a - b);
        last = pick(b < 0, smaller(meets, last), last);
        first = pick(a < 0, larger(meets, first), first);
    }
    bits proved = (first <= t) & (t <= last);
    proved &= (lowest_at(kind, r, first) > r->proof) & (lowest_at(kind, r, last) > r->proof);
    *from = pick(proved, first, all(2));
    *to = pick(proved, last, all(-1));
}

/* [0, free] is certified free, and [back, 1] while no touch is known (hi > 1); else [back, lo], where [lo, hi] is a
 * bracket, or nothing (back > 1) as long as the touch at hi is not known to be near a crossing. left and right: times with the unit directions of their closest
 * points, at which the distance is above the gap; left <= free, and right in [back, lo], or none where it is > 1. time:
 * where to look next. last, length, slope: where was looked last, the distance there, and its slope. */
typedef struct state {
    vec free, back, lo, hi, time, left, right;
    vec3 left_d, right_d;
    vec last, length, slope;
} state;
static_assert(sizeof(state) == RDLI_STATE * sizeof(vec) && RDLI_STATE % 2 == 0, "as many as a row holds");

/* Zero where the length is. */
LANE_INLINE vec3 unit_of(const vec3 *e, vec length)
{
    vec3 d;
    for (int k = 0; k < 3; k++)
        d.c[k] = pick(length > 0, e->c[k] / length, all(0));
    return d;
}

/* A length that the distance stays above while the direction turns from da at fa's time to db at fb's, units both. d(t) and
 * the control points are linear, so their products are quadratics in Bernstein form, and |d(t)| is at most 1. */
LANE_INLINE vec turning(int kind, const frames *fa, const frames *fb, const vec3 *da, const vec3 *db, vec pad)
{
    vec first = least(kind, dot(&fa->w, da), dot(&fa->u, da), dot(&fa->v, da));
    vec last = least(kind, dot(&fb->w, db), dot(&fb->u, db), dot(&fb->v, db));
    vec middle = least(kind, dot(&fb->w, da) + dot(&fa->w, db), dot(&fb->u, da) + dot(&fa->u, db),
                       dot(&fb->v, da) + dot(&fa->v, db));
    return smaller(smaller(first, last), 0.5 * middle) * (1 - 0x1p-48) - 3 * pad;
}

/* Velocity of the difference of the points that are closest now. */
LANE_INLINE vec3 velocity_of(int kind, const block *b, const nearest *n)
{
    vec3 velocity;
    for (int k = 0; k < 3; k++) {
        vec w = b->at[1].w.c[k] - b->at[0].w.c[k], u = b->at[1].u.c[k] - b->at[0].u.c[k];
        vec v = b->at[1].v.c[k] - b->at[0].v.c[k], inner = w - n->s * u, outer = n->r * v;
        velocity.c[k] = kind == RDL_POINT_TRIANGLE ? inner - outer : -(inner + outer);
    }
    return velocity;
}

/* Sets the time to look at next. It is just before the distances and slopes here and at the last time suggest that the gap
 * is reached: Newton's method, or Hermite's cubic of the time as a function of the distance, where both slopes point there.
 * Behind a touch that is near a crossing it is the bracket's begin; else the middle of what is not yet certified. */
LANE_INLINE void aim(vec slope, vec length, vec gap, vec t, bits first, state *s)
{
    vec reached = t + (gap - length) / slope, step = length - s->length;
    vec x = (gap - s->length) / step, y = 1 - x;
    vec cubic = s->last * (1 + 2 * x) * (y * y) + t * (x * x) * (3 - 2 * x) + step * x * y * (y / s->slope - x / slope);
    bits both = ~first & (slope < 0) & (s->slope < 0) & (absolute(cubic - reached) < absolute(t - s->last));
    reached = pick(both, cubic, reached);
    s->last = t;
    s->length = length;
    s->slope = slope;
    bits loose = (s->hi <= 1) & (s->back > 1), close = loose & (absolute(reached - s->hi) < BEHIND);
    vec end = smaller(smaller(s->back, s->hi), all(1));
    /* what is certified may end already within half a bracket of the crossing: then just behind it */
    vec next = pick(reached - 0.5 * BEHIND > s->free, reached - 0.5 * BEHIND, reached + 0.5 * BEHIND);
    next = pick(close, s->hi - BEHIND, next);
    s->time = pick((next > s->free) & (next < end), next, 0.5 * (s->free + end));
}

/* The closest points at both ends of the step, and what their directions show. */
typedef struct ends {
    nearest n[2];
    vec length[2], least[2], turning; /* least: the least projection on each direction; turning: as above */
    vec3 d[2];
    reach reach[2];
} ends;

LANE_INLINE ends ends_of(int kind, const block *b)
{
    ends e;
    for (int end = 0; end < 2; end++) {
        e.n[end] = nearest_of(kind, &b->at[end]);
        e.length[end] = root(e.n[end].least);
        e.d[end] = unit_of(&e.n[end].e, e.length[end]);
        reach_along(kind, b, &e.n[end].e, &e.reach[end]);
        e.least[end] = smaller(lowest_at(kind, &e.reach[end], all(0)), lowest_at(kind, &e.reach[end], all(1)));
    }
    e.turning = turning(kind, &b->at[0], &b->at[1], &e.d[0], &e.d[1], b->pad);
    return e;
}

/* Certified: the distance is above the gap during the whole step. */
LANE_INLINE bits ends_keep(const block *b, const ends *e, vec gap)
{
    return (e->least[0] > proof_of(b, gap, e->length[0])) | (e->least[1] > proof_of(b, gap, e->length[1])) |
           (e->turning > gap);
}

/* Features that end on the other side of each other: Hermite's cubic through both ends, with the distance at the end
 * negative, is a better first guess than Newton's step from the start. */
LANE_INLINE void aim_through(int kind, const block *b, vec gap, const ends *e, state *s)
{
    vec3 velocity = velocity_of(kind, b, &e->n[1]);
    vec first = s->slope, last = -dot(&velocity, &e->d[1]), step = -(e->length[1] + e->length[0]);
    vec x = (gap - e->length[0]) / step, y = 1 - x;
    vec time = x * x * (3 - 2 * x) + step * x * y * (y / first - x / last) - 0.5 * BEHIND;
    bits through = (dot(&e->d[0], &e->d[1]) < 0) & (first < 0) & (last < 0) & (time > s->free) & (time < s->back);
    s->time = pick(through, time, s->time);
}

/* Returns the lanes that are at or below the gap at the start; *unsure: those that may be, or are so by very little. */
LANE_INLINE bits begin(int kind, const block *b, vec gap, ends *e, state *s, bits *unsure)
{
    /* no distance between frames is wrong by more than 3 pad, as in series.c */
    vec from, to, none = all(2);
    bits start = (e->length[0] + 3 * b->pad) * (1 + 8 * UNIT) <= gap;
    *unsure = ~(start | (e->length[0] > (gap + 12 * b->pad) * (1 + 8 * UNIT)));
    reach_gap(b, gap, e->length[0], &e->reach[0]);
    separated_times(kind, &e->reach[0], all(0), &from, &to);
    to = pick(ends_keep(b, e, gap), all(1), to);
    *s = (state){larger(to, all(0)), none, none, none, all(0), all(0), none, e->d[0], e->d[1],
        all(0), all(0), all(0)};
    bits ask = ~start & (s->free < 1); /* the others must not depend on whether a neighbour asks */
    if (mask_of(ask)) {
        reach_gap(b, gap, e->length[1], &e->reach[1]);
        separated_times(kind, &e->reach[1], all(1), &from, &to);
        s->back = pick(ask, from, s->back);
        s->right = pick(s->back <= 1, all(1), s->right);
        vec3 velocity = velocity_of(kind, b, &e->n[0]);
        aim(dot(&velocity, &e->d[0]), e->length[0], gap, all(0), ask | ~ask, s);
        aim_through(kind, b, gap, e, s);
    }
    return start;
}

/* Everything is certified. */
LANE_INLINE bits is_done(const state *s)
{
    return (s->free >= s->back) | ((s->free >= 1) & (s->hi > 1));
}

/* A touch at s->time: the new hi; the bracket's begin is certified where the direction separates there. */
LANE_INLINE void touch_here(state *s, bits near, vec at, vec from, const vec3 *d)
{
    bits sharp = near & (from <= at);
    s->back = pick(near, pick(at <= s->free, at, from), s->back);
    s->lo = pick(near, at, s->lo);
    s->hi = pick(near, s->time, s->hi);
    s->right = pick(near, pick(sharp, at, all(2)), s->right);
    s->right_d = choose(sharp, d, &s->right_d);
}

/* [from, to] is certified in the lanes of apart, and holds s->time. soon: a touch is certain at `touch`. */
LANE_INLINE void free_here(state *s, bits apart, vec from, vec to, const vec3 *d, bits soon, vec touch)
{
    /* just before a touch: this is the bracket's begin */
    bits begins = apart & (s->back > 1) & (s->hi <= 1) & (s->hi - s->time <= 1.25 * BEHIND);
    begins |= apart & soon;
    s->hi = pick(apart & soon, touch, s->hi);
    s->lo = pick(begins, s->time, s->lo);
    bits forward = apart & (from <= s->free), backward = begins | (apart & (to >= s->back));
    s->free = pick(forward, larger(pick(begins, s->time, to), s->free), s->free);
    s->back = pick(backward, pick(begins, from, smaller(from, s->back)), s->back);
    s->right = pick(backward, s->time, s->right);
    s->right_d = choose(backward, d, &s->right_d);
    s->left = pick(forward & ~backward, s->time, s->left);
    s->left_d = choose(forward & ~backward, d, &s->left_d);
}

/* Looks at s->time. */
LANE_INLINE void look(int kind, const block *b, vec gap, state *s)
{
    vec from, to;
    frames here = frames_at(b->at, s->time);
    nearest n = nearest_of(kind, &here);
    vec length = root(n.least);
    bits near = (length + 3 * b->pad) * (1 + 8 * UNIT) <= gap;
    vec at = pick(near, larger(s->time - BEHIND, s->free), s->time);
    reach r;
    reach_along(kind, b, &n.e, &r);
    reach_gap(b, gap, length, &r);
    separated_times(kind, &r, at, &from, &to);
    vec3 d = unit_of(&n.e, length);
    bits proved = from <= to, apart = proved & ~near;
    /* the points that are closest now are near enough at the end of a bracket that begins here */
    vec touch = smaller(s->time + BEHIND, all(1));
    vec3 velocity = velocity_of(kind, b, &n), then = mixed(&n.e, &velocity, all(1), touch - s->time);
    bits soon = (root(dot(&then, &then)) + 4 * b->pad) * (1 + 8 * UNIT) <= gap;
    bits before = apart & (from > s->free), after = apart & (to < s->back) & (s->right <= 1);
    if (mask_of(before)) {
        frames left = frames_at(b->at, s->left);
        before &= turning(kind, &left, &here, &s->left_d, &d, b->pad) > gap;
        from = pick(before, s->free, from);
    }
    if (mask_of(after)) {
        frames right = frames_at(b->at, s->right);
        after &= turning(kind, &here, &right, &d, &s->right_d, b->pad) > gap;
        to = pick(after, s->back, to);
    }
    touch_here(s, near, at, pick(proved, from, all(2)), &d);
    free_here(s, apart, from, to, &d, soon, touch);
    aim(dot(&velocity, &d), length, gap, s->time, near & ~near, s);
}

LANE_INLINE void tell(bits which, int half, uint8_t told[RDLI_LANES])
{
    unsigned mask = mask_of(which);
    for (int i = 0; i < LANE_WIDTH; i++)
        told[half + i] = mask >> i & 1;
}

LANE_INLINE void save(const state *s, int half, rdli_progress *p)
{
    const vec *value = &s->free;
    for (int place = 0; place < RDLI_STATE; place += 2)
        store_two(value[place], value[place + 1], p->state + half, place);
    tell(is_done(s), half, p->done);
}

LANE_INLINE void begin_half(int kind, const rdli_quad *quad, int half, rdli_progress *progress)
{
    points p;
    state s;
    load_points(quad, half, &p);
    block b = block_of(kind, &p, load(quad->gap + half));
    ends e = ends_of(kind, &b);
    bits unsure, start = begin(kind, &b, b.gap, &e, &s, &unsure);
    tell(start, half, progress->start);
    tell(unsure, half, progress->unsure);
    save(&s, half, progress);
}

LANE_INLINE void look_half(int kind, const rdli_quad *quad, int half, rdli_progress *progress)
{
    points p;
    load_points(quad, half, &p);
    block b = block_of(kind, &p, load(quad->gap + half));
    state s;
    vec *value = &s.free;
    for (int place = 0; place < RDLI_STATE; place += 2)
        load_two((const double *const *)progress->state + half, place, &value[place], &value[place + 1]);
    look(kind, &b, b.gap, &s);
    save(&s, half, progress);
}

static void approach(int kind, const rdli_quad *quad, rdli_progress *progress)
{
    for (int half = 0; half < RDLI_LANES; half += LANE_WIDTH) {
        if (kind == RDL_POINT_TRIANGLE)
            begin_half(RDL_POINT_TRIANGLE, quad, half, progress);
        else
            begin_half(RDL_EDGE_EDGE, quad, half, progress);
    }
}

static void look_again(int kind, const rdli_quad *quad, rdli_progress *progress)
{
    for (int half = 0; half < RDLI_LANES; half += LANE_WIDTH) {
        if (kind == RDL_POINT_TRIANGLE)
            look_half(RDL_POINT_TRIANGLE, quad, half, progress);
        else
            look_half(RDL_EDGE_EDGE, quad, half, progress);
    }
}

LANE_INLINE vec size_sum(const vec3 *a)
{
    return absolute(a->c[0]) + absolute(a->c[1]) + absolute(a->c[2]);
}

/* As rdli_least_along. */
LANE_INLINE vec least_along(int kind, const vec3 x[4], const vec3 *d)
{
    vec low = all((double)INFINITY);
    int firsts = kind == RDL_EDGE_EDGE ? 2 : 1;
    for (int i = 0; i < firsts; i++)
        for (int j = firsts; j < 4; j++) {
            vec3 e = minus(&x[i], &x[j]);
            vec terms = absolute(d->c[0] * e.c[0]) + absolute(d->c[1] * e.c[1]) + absolute(d->c[2] * e.c[2]);
            vec value = dot(d, &e) - (8 * UNIT * terms + RDLI_UNDERFLOW);
            low = pick(value < low, value, low);
        }
    return low;
}

/* The least projection of one end's control points. */
LANE_INLINE vec lowest_end(int kind, const reach *r, int end)
{
    vec low = smaller(smaller(r->at[end][0], r->at[end][1]), r->at[end][2]);
    return kind == RDL_POINT_TRIANGLE ? low : smaller(low, r->at[end][3]);
}

/* The distance at one end, in the lanes of `ask`; returns where it is tight. hi is that of rdli_closest_points. lo comes from
 * the projections that are known anyway, and from the vertices as there where that is too little. */
LANE_INLINE bits enclose(int kind, const block *b, const vec3 x[4], const ends *e, int end, bits ask, vec *lo, vec *hi)
{
    const frames *f = &b->at[end];
    vec size = size_sum(&f->w) + size_sum(&f->u) + size_sum(&f->v), length = e->length[end];
    *hi = length * (1 + 8 * UNIT) + 8 * UNIT * size + RDLI_UNDERFLOW;
    *lo = lowest_end(kind, &e->reach[end], end) / length * (1 - 8 * UNIT) - 2 * b->pad;
    bits tight = (*lo > 0) & (*hi - *lo <= RDLI_TIGHT * *hi), loose = ask & ~tight;
    if (mask_of(loose)) { /* where the difference of the closest points cancels: the normal of the features */
        vec3 n, back;
        for (int k = 0; k < 3; k++)
            n.c[k] = cross(&f->u, &f->v, k);
        n = unit_of(&n, root(dot(&n, &n)));
        back = negative(&n);
        n = choose(dot(&n, &e->d[end]) < 0, &back, &n);
        vec one = least_along(kind, x, &e->d[end]), other = least_along(kind, x, &n);
        *lo = pick(loose, larger(one, other) * (1 - 8 * UNIT), *lo);
        tight = (*lo > 0) & (*hi - *lo <= RDLI_TIGHT * *hi);
    }
    return tight;
}

LANE_INLINE void outlook_half(int kind, const rdli_quad *quad, int half, double share, const double from[RDLI_LANES],
                              rdli_outlook *o)
{
    points p;
    state found;
    load_points(quad, half, &p);
    block b = block_of(kind, &p, load(quad->gap + half));
    ends e = ends_of(kind, &b);
    vec lo[2], hi[2], given;
    bits quiet = ends_keep(&b, &e, b.gap), tight[2];
    tell(quiet, half, o->quiet);
    if (!mask_of(~quiet))
        return;
    for (int end = 0; end < 2; end++) {
        tight[end] = enclose(kind, &b, p.x[end], &e, end, ~quiet, &lo[end], &hi[end]);
        store(lo[end], o->lo[end] + half);
        store(hi[end], o->hi[end] + half);
        tell(tight[end], half, o->tight[end]);
    }
    given = load(from + half);
    bits known = tight[0] | (given >= 0);
    vec floor = smaller(pick(given >= 0, given, hi[0]), b.gap), path = share * floor;
    path = (vec)((bits)path + 1); /* the next number up: never below the exact product */
    known &= path > 0x1p-900;
    store(path, o->path + half);
    tell(known, half, o->known);
    bits unsure, start = begin(kind, &b, path, &e, &found, &unsure);
    tell(start, half, o->progress.start);
    tell(unsure, half, o->progress.unsure);
    save(&found, half, &o->progress);
}

static void outlook(int kind, const rdli_quad *quad, double share, const double from[RDLI_LANES], rdli_outlook *o)
{
    for (int half = 0; half < RDLI_LANES; half += LANE_WIDTH) {
        if (kind == RDL_POINT_TRIANGLE)
            outlook_half(RDL_POINT_TRIANGLE, quad, half, share, from, o);
        else
            outlook_half(RDL_EDGE_EDGE, quad, half, share, from, o);
    }
}
