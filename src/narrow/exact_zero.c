/* narrow/exact_zero.c: the touch at gap 0, exactly, for any finite doubles.
 *
 * The pair meets at t only if f(t) = w . (u x v) = 0. Where f is not identically zero its distinct roots in (0, 1) are
 * isolated by Sturm's theorem; at a root the pair meets or not by the signs of quadratics at that algebraic number. Where
 * f is identically zero the motion is planar and the first contact after a free start is that of a point with a segment,
 * whose times are roots of a component of w x u, or, on a common line, of a component of a difference vector. Signs at a
 * root are exact Tarski queries (Basu, Pollack, Roy 2006, ch. 2): the sign of q at the only root of f in (a, b) is
 * the difference of sign variations at a and b of the signed remainder sequence of f and f' q. */
#include "narrow/exact_pair.h"
#include "narrow/exact_roots.h"
#include "narrow/roots.h"

static bool vector_vanishes(rdli_arena *arena, rdli_instant *at, const rdli_int v[2][3])
{
    for (int k = 0; k < 3; k++) {
        rdli_poly line = {.degree = 1, .c = {v[0][k], v[1][k]}};
        if (rdli_instant_sign(arena, at, &line))
            return false;
    }
    return true;
}

static bool on_segment(rdli_arena *arena, rdli_instant *at, const rdli_point_segment *couple)
{
    size_t mark = arena->used;
    for (int k = 0; k < 3; k++) {
        rdli_poly cross = rdli_cross_component(arena, couple->w, couple->u, k);
        int sign = rdli_instant_sign(arena, at, &cross);
        arena->used = mark;
        if (sign)
            return false;
    }
    if (vector_vanishes(arena, at, couple->u))
        return vector_vanishes(arena, at, couple->w);
    rdli_poly along = rdli_dot_poly(arena, couple->w, couple->u), square = rdli_dot_poly(arena, couple->u, couple->u);
    rdli_poly rest = rdli_poly_sub(arena, &square, &along);
    bool on = rdli_instant_sign(arena, at, &along) >= 0 && rdli_instant_sign(arena, at, &rest) >= 0;
    arena->used = mark;
    return on;
}

/* n_k does not vanish; all vectors lie in one plane. */
static bool inside_in_plane(rdli_arena *arena, rdli_instant *at, const rdli_exact_pair *pair, int k, const rdli_poly *n,
                            int facing)
{
    rdli_poly first = rdli_cross_component(arena, pair->w, pair->v, k);
    rdli_poly second = rdli_cross_component(arena, pair->w, pair->u, k);
    if (rdli_instant_sign(arena, at, &first) * facing < 0)
        return false;
    rdli_poly rest = rdli_poly_sub(arena, n, &first);
    if (pair->kind == RDL_POINT_TRIANGLE) {
        if (rdli_instant_sign(arena, at, &second) * facing > 0)
            return false;
        rest = rdli_poly_add(arena, &rest, &second);
        return rdli_instant_sign(arena, at, &rest) * facing >= 0;
    }
    if (rdli_instant_sign(arena, at, &second) * facing < 0 || rdli_instant_sign(arena, at, &rest) * facing < 0)
        return false;
    rest = rdli_poly_sub(arena, n, &second);
    return rdli_instant_sign(arena, at, &rest) * facing >= 0;
}

/* Whether the pair, coplanar at the instant, meets then. */
static bool meets_when_coplanar(rdli_arena *arena, rdli_instant *at, const rdli_exact_pair *pair)
{
    size_t mark = arena->used;
    for (int k = 0; k < 3; k++) {
        rdli_poly n = rdli_cross_component(arena, pair->u, pair->v, k);
        int facing = rdli_instant_sign(arena, at, &n);
        if (facing) {
            bool inside = inside_in_plane(arena, at, pair, k, &n, facing);
            arena->used = mark;
            return inside;
        }
    }
    rdli_point_segment couples[RDLI_POINT_SEGMENTS];
    int count = rdli_point_segments(arena, pair, couples);
    bool meets = false;
    for (int i = 0; i < count && !meets; i++)
        meets = on_segment(arena, at, &couples[i]);
    arena->used = mark;
    return meets;
}

static rdli_poly coplanarity(rdli_arena *arena, const rdli_exact_pair *pair)
{
    rdli_poly f = {.degree = 3};
    for (int k = 0; k < 3; k++) {
        rdli_poly n = rdli_cross_component(arena, pair->u, pair->v, k);
        rdli_poly w = {.degree = 1, .c = {pair->w[0][k], pair->w[1][k]}};
        rdli_poly product = rdli_poly_mul(arena, &w, &n);
        f = k ? rdli_poly_add(arena, &f, &product) : product;
    }
    return f;
}

bool rdli_exact_meets(rdli_arena *arena, const rdli_exact_pair *pair, int end)
{
    size_t mark = arena->used;
    rdli_poly f = coplanarity(arena, pair);
    rdli_instant at = {.dyadic = true, .k = end ? rdli_int_of_word(arena, 1) : (rdli_int){NULL, 0}, .m = 0, .f = &f};
    bool meets = f.c[end ? 3 : 0].size == 0 && meets_when_coplanar(arena, &at, pair);
    arena->used = mark;
    return meets;
}

/* What the roots of an event polynomial are asked. */
typedef struct event {
    const rdli_exact_pair *pair;       /* the pair, where f is its coplanarity */
    const rdli_cubic *doubles;         /* and what doubles know of it */
    const rdli_point_segment *couple;  /* else the point and the segment */
} event;

static bool happens(rdli_arena *arena, const event *what, rdli_instant *root, double lo, double hi)
{
    if (!what->pair)
        return on_segment(arena, root, what->couple);
    enum rdli_inside inside = rdli_cubic_inside(what->doubles, lo, hi);
    return inside == RDLI_INSIDE_YES || (inside == RDLI_INSIDE_MAYBE && meets_when_coplanar(arena, root, what->pair));
}

/* First root of f in (0, 1) at which the event happens. */
static bool first_event(rdli_arena *arena, const rdli_poly *f, const event *what, double *lo, double *hi, uint8_t *depth)
{
    size_t mark = arena->used;
    bool found = false;
    rdli_roots roots;
    rdli_roots_open(arena, f, &roots);
    for (int rank = 1; rank <= roots.count && !found && !arena->overflow; rank++) {
        rdli_instant root;
        rdli_roots_isolate(arena, &roots, rank, &root);
        rdli_instant_bracket(&root, lo, hi);
        found = happens(arena, what, &root, *lo, *hi);
        if (found) {
            rdli_instant_bracket(&root, lo, hi);
            *depth = (uint8_t)(root.m < 255 ? root.m : 255);
        }
    }
    arena->used = mark;
    return found;
}

/* Polynomial whose roots hold all times at which the point may come onto the segment; which = 0, 1: the second is
 * needed only for a motion along one line. Returns false when there is none. */
static bool segment_event(rdli_arena *arena, const rdli_point_segment *couple, int which, rdli_poly *f)
{
    for (int k = 0; k < 3 && which == 0; k++) {
        *f = rdli_cross_component(arena, couple->w, couple->u, k);
        if (!rdli_poly_is_zero(f))
            return true;
    }
    for (int k = 0; k < 3; k++) {
        *f = (rdli_poly){.degree = 1, .c = {couple->w[0][k], couple->w[1][k]}};
        for (int end = 0; end < 2 && which; end++)
            f->c[end] = rdli_int_sub(arena, f->c[end], couple->u[end][k]);
        if (!rdli_poly_is_zero(f))
            return true;
    }
    return false;
}

/* On one line there are two polynomials, one for each end of the segment, and the earlier event counts. */
static bool first_couple_event(rdli_arena *arena, const rdli_point_segment *couple, double *lo, double *hi, uint8_t *depth)
{
    bool any = false;
    *lo = *hi = 1;
    for (int which = 0; which < 2; which++) {
        size_t mark = arena->used;
        event what = {NULL, NULL, couple};
        rdli_poly f;
        double from, to;
        bool found = segment_event(arena, couple, which, &f) && first_event(arena, &f, &what, &from, &to, depth);
        arena->used = mark;
        if (found) {
            any = true;
            *lo = from < *lo ? from : *lo;
            *hi = to < *hi ? to : *hi;
        }
        if (f.degree == 2) /* not on one line: there is no second polynomial */
            break;
    }
    return any;
}

static bool first_planar_event(rdli_arena *arena, const rdli_exact_pair *pair, const rdli_cubic *doubles, rdl_touch *touch)
{
    rdli_point_segment couples[RDLI_POINT_SEGMENTS];
    int count = rdli_point_segments(arena, pair, couples);
    bool found = false;
    touch->time_lo = touch->time_hi = 1;
    for (int i = 0; i < count; i++) {
        double lo, hi;
        enum rdli_inside meets = rdli_planar_event(doubles, i, &lo, &hi);
        if (meets == RDLI_INSIDE_NO ||
            (meets == RDLI_INSIDE_MAYBE && !first_couple_event(arena, &couples[i], &lo, &hi, &touch->depth)))
            continue;
        found = true;
        touch->time_lo = lo < touch->time_lo ? lo : touch->time_lo;
        touch->time_hi = hi < touch->time_hi ? hi : touch->time_hi;
    }
    return found;
}

/* f(end) = 0 is known exactly. */
static bool meets_at_end(rdli_arena *arena, const rdli_exact_pair *pair, const rdli_cubic *doubles, int end)
{
    size_t mark = arena->used;
    enum rdli_inside inside = rdli_cubic_inside(doubles, end, end);
    rdli_instant at = {.dyadic = true, .k = end ? rdli_int_of_word(arena, 1) : (rdli_int){NULL, 0}};
    bool meets = inside == RDLI_INSIDE_YES || (inside == RDLI_INSIDE_MAYBE && meets_when_coplanar(arena, &at, pair));
    arena->used = mark;
    return meets;
}

void rdli_exact_zero(rdli_arena *arena, int kind, const rdl_motion *motion, const rdli_cubic *doubles, rdl_touch *touch)
{
    rdli_exact_pair pair;
    rdli_exact_pair_of(arena, kind, motion, rdli_common_unit(motion, 0), &pair);
    *touch = (rdl_touch){.stage = RDL_STAGE_EXACT, .order = 3};
    rdli_poly f = coplanarity(arena, &pair);
    if (f.c[0].size == 0 && meets_at_end(arena, &pair, doubles, 0)) {
        touch->touches = 1;
        touch->stage = RDL_STAGE_ENDS;
        return;
    }
    event what = {&pair, doubles, NULL};
    touch->touches = rdli_poly_is_zero(&f)
        ? first_planar_event(arena, &pair, doubles, touch)
        : first_event(arena, &f, &what, &touch->time_lo, &touch->time_hi, &touch->depth);
    if (!touch->touches) {
        touch->time_lo = touch->time_hi = 1;
        touch->touches = f.c[3].size == 0 && meets_at_end(arena, &pair, doubles, 1);
    }
}
