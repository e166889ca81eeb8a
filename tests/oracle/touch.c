/* oracle/touch.c: first touch and crossings of a moving pair; see oracle.h. */

#include "frame.h"
#include "oracle.h"
#include "system.h"

/* The pair on its integer grid, and the gap's square there as a fraction. */
typedef struct scene {
    frame grid; /* rows 0..3 start, 4..7 end */
    mpz_t gap_above, gap_below;
    bool zero_gap;
    condition_system system;
    oracle_touch *best;
} scene;

static void scene_init(scene *s, const rdl_motion *motion)
{
    const double *rows[8];
    for (int i = 0; i < 4; i++) {
        rows[i] = motion->start[i];
        rows[4 + i] = motion->end[i];
    }
    frame_init(&s->grid, rows, 8);
    mpz_init(s->gap_above);
    mpz_init(s->gap_below);
    system_init(&s->system);
}

static void scene_clear(scene *s)
{
    frame_clear(&s->grid);
    mpz_clear(s->gap_above);
    mpz_clear(s->gap_below);
    system_clear(&s->system);
}

static void difference(scene *s, poly3 *v, int from, int to)
{
    poly3_difference(v, s->grid.x[from], s->grid.x[4 + from], s->grid.x[to], s->grid.x[4 + to]);
}

/* Adds "square <= gap^2 weight", written as gap_above weight - gap_below square >= 0. */
static void add_distance(scene *s, const poly *square, const poly *weight)
{
    poly *p = system_add(&s->system, NOT_NEGATIVE), scaled;
    poly_init(&scaled);
    poly_set(&scaled, square);
    poly_scale(&scaled, s->gap_below);
    poly_set(p, weight);
    poly_scale(p, s->gap_above);
    poly_sub(p, p, &scaled);
    poly_clear(&scaled);
}

static void add(scene *s, relation wanted, const poly *p)
{
    poly_set(system_add(&s->system, wanted), p);
}

/* 0 <= part <= whole */
static void add_share(scene *s, const poly *part, const poly *whole)
{
    add(s, NOT_NEGATIVE, part);
    poly *rest = system_add(&s->system, NOT_NEGATIVE);
    poly_sub(rest, whole, part);
}

/* Solves the list and keeps the earlier time. */
static void settle(scene *s)
{
    if (s->best->touches && s->best->time.exact && mpz_sgn(s->best->time.numerator) == 0) {
        system_restart(&s->system); /* nothing is earlier than 0 */
        return;
    }
    oracle_touch found;
    oracle_touch_init(&found);
    found.touches = system_first(&s->system, &found.time, &found.owner);
    oracle_touch *best = s->best;
    if (found.touches &&
        (!best->touches || roots_compare(&found.time, &found.owner, &best->time, &best->owner) < 0)) {
        best->touches = true;
        root_set(&best->time, &found.time);
        poly_set(&best->owner, &found.owner);
    }
    oracle_touch_clear(&found);
    system_restart(&s->system);
}

static void vertex_vertex(scene *s, int p, int a)
{
    poly3 d;
    poly square, one;
    mpz_t unit;
    mpz_init_set_ui(unit, 1);
    poly3_init(&d);
    poly_init(&square);
    poly_init(&one);
    poly_set_constant(&one, unit);
    difference(s, &d, a, p);
    poly3_dot(&square, &d, &d);
    add_distance(s, &square, &one);
    settle(s);
    mpz_clear(unit);
    poly3_clear(&d);
    poly_clear(&square);
    poly_clear(&one);
}

static void vertex_edge(scene *s, int p, int a, int b)
{
    poly3 w, e, turn;
    poly length2, along, area2;
    poly3_init(&w);
    poly3_init(&e);
    poly3_init(&turn);
    poly_init(&length2);
    poly_init(&along);
    poly_init(&area2);
    difference(s, &w, a, p);
    difference(s, &e, a, b);
    poly3_cross(&turn, &w, &e);
    poly3_dot(&area2, &turn, &turn);
    poly3_dot(&length2, &e, &e);
    poly3_dot(&along, &w, &e);
    add_distance(s, &area2, &length2);
    add(s, POSITIVE, &length2);
    add_share(s, &along, &length2);
    settle(s);
    poly3_clear(&w);
    poly3_clear(&e);
    poly3_clear(&turn);
    poly_clear(&length2);
    poly_clear(&along);
    poly_clear(&area2);
}

/* w, u, v, n = u x v and what follows from them; see oracle_count_crossings for the letters. */
typedef struct plane {
    poly3 w, u, v, n, turn;
    poly height, n2, first, second;
} plane;

static void plane_init(plane *q)
{
    poly3 *vectors[5] = {&q->w, &q->u, &q->v, &q->n, &q->turn};
    poly *scalars[4] = {&q->height, &q->n2, &q->first, &q->second};
    for (int i = 0; i < 5; i++)
        poly3_init(vectors[i]);
    for (int i = 0; i < 4; i++)
        poly_init(scalars[i]);
}

static void plane_clear(plane *q)
{
    poly3 *vectors[5] = {&q->w, &q->u, &q->v, &q->n, &q->turn};
    poly *scalars[4] = {&q->height, &q->n2, &q->first, &q->second};
    for (int i = 0; i < 5; i++)
        poly3_clear(vectors[i]);
    for (int i = 0; i < 4; i++)
        poly_clear(scalars[i]);
}

/* first, second: PT the barycentric weights of b and c times n^2; EE the parameters of the two lines times n^2. */
static void plane_set(plane *q, scene *s, int kind)
{
    if (kind == RDL_POINT_TRIANGLE) {
        difference(s, &q->w, 1, 0);
        difference(s, &q->u, 1, 2);
        difference(s, &q->v, 1, 3);
    } else {
        difference(s, &q->w, 0, 2);
        difference(s, &q->u, 0, 1);
        difference(s, &q->v, 2, 3);
    }
    poly3_cross(&q->n, &q->u, &q->v);
    poly3_dot(&q->height, &q->w, &q->n);
    poly3_dot(&q->n2, &q->n, &q->n);
    poly3_cross(&q->turn, &q->w, &q->v);
    poly3_dot(&q->first, &q->turn, &q->n);
    if (kind == RDL_POINT_TRIANGLE)
        poly3_cross(&q->turn, &q->u, &q->w);
    else
        poly3_cross(&q->turn, &q->w, &q->u);
    poly3_dot(&q->second, &q->turn, &q->n);
}

/* "The foot points lie inside": PT on the triangle, EE on both edges. Four or five conditions. */
static void add_inside(scene *s, const plane *q, int kind)
{
    add(s, POSITIVE, &q->n2);
    if (kind == RDL_POINT_TRIANGLE) {
        add(s, NOT_NEGATIVE, &q->first);
        add(s, NOT_NEGATIVE, &q->second);
        poly *rest = system_add(&s->system, NOT_NEGATIVE);
        poly_sub(rest, &q->n2, &q->first);
        poly_sub(rest, rest, &q->second);
    } else {
        add_share(s, &q->first, &q->n2);
        add_share(s, &q->second, &q->n2);
    }
}

static void interiors(scene *s, const plane *q, int kind)
{
    if (s->zero_gap) {
        add(s, IS_ZERO, &q->height);
    } else {
        poly square;
        poly_init(&square);
        poly_mul(&square, &q->height, &q->height);
        add_distance(s, &square, &q->n2);
        poly_clear(&square);
    }
    add_inside(s, q, kind);
    settle(s);
}

static void borders(scene *s, int kind)
{
    if (kind == RDL_POINT_TRIANGLE) {
        for (int i = 1; i <= 3; i++) {
            vertex_vertex(s, 0, i);
            vertex_edge(s, 0, i, i % 3 + 1);
        }
        return;
    }
    for (int i = 0; i < 2; i++)
        for (int j = 2; j < 4; j++)
            vertex_vertex(s, i, j);
    for (int i = 0; i < 2; i++) {
        vertex_edge(s, i, 2, 3);
        vertex_edge(s, 2 + i, 0, 1);
    }
}

/* No touch at gap 0 without coplanarity. */
static bool never_coplanar(const plane *q)
{
    if (q->height.degree <= 0)
        return q->height.degree == 0;
    poly plain;
    poly_chain chain;
    root found[POLY_DEGREE_MAX];
    poly_init(&plain);
    poly_chain_init(&chain);
    for (int i = 0; i < POLY_DEGREE_MAX; i++)
        root_init(&found[i]);
    poly_squarefree(&plain, &chain, &q->height);
    bool never = roots_isolate(&chain, found) == 0;
    for (int i = 0; i < POLY_DEGREE_MAX; i++)
        root_clear(&found[i]);
    poly_chain_clear(&chain);
    poly_clear(&plain);
    return never;
}

void oracle_find(int kind, const rdl_motion *motion, const mpq_t gap2, oracle_touch *touch)
{
    scene s;
    plane q;
    mpq_t square;
    mpq_init(square);
    scene_init(&s, motion);
    frame_square(&s.grid, square, gap2);
    mpz_set(s.gap_above, mpq_numref(square));
    mpz_set(s.gap_below, mpq_denref(square));
    s.zero_gap = mpz_sgn(s.gap_above) == 0;
    s.best = touch;
    touch->touches = false;
    plane_init(&q);
    plane_set(&q, &s, kind);
    if (!s.zero_gap || !never_coplanar(&q)) {
        interiors(&s, &q, kind);
        borders(&s, kind);
    }
    plane_clear(&q);
    scene_clear(&s);
    mpq_clear(square);
}

void oracle_touch_init(oracle_touch *touch)
{
    touch->touches = false;
    root_init(&touch->time);
    poly_init(&touch->owner);
}

void oracle_touch_clear(oracle_touch *touch)
{
    root_clear(&touch->time);
    poly_clear(&touch->owner);
}

void oracle_square_gap(mpq_t gap2, double gap, unsigned long millionths)
{
    mpq_t share;
    mpq_init(share);
    mpq_set_ui(share, 1000000 + millionths, 1000000);
    mpq_canonicalize(share);
    mpq_set_d(gap2, gap);
    mpq_mul(gap2, gap2, share);
    mpq_mul(gap2, gap2, gap2);
    mpq_clear(share);
}

int oracle_compare_time(const oracle_touch *touch, double t)
{
    return root_compare_double(&touch->time, &touch->owner, t);
}

void oracle_bracket_time(oracle_touch *touch, unsigned long bits, double *lo, double *hi)
{
    root_bracket(&touch->time, &touch->owner, bits, lo, hi);
}

/* What happens at number i of the arrangement, where condition 0 (coplanarity) vanishes and both features meet. */
static void count_meeting(const arrangement *a, const condition_system *s, int i, oracle_crossings *out)
{
    int border = 0;
    for (int k = 2; k < s->count; k++)
        if (arrangement_sign(a, s, k, 2 * i) == 0)
            border = 1;
    out->on_border += border;
    if (i == 0 || i == a->count - 1) {
        out->unclear++;
        return;
    }
    int before = arrangement_sign(a, s, 0, 2 * i - 1), after = arrangement_sign(a, s, 0, 2 * i + 1);
    if (before == after)
        out->grazes++;
    else
        out->passes++;
    out->signed_sum += (after - before) / 2;
}

/* Is number i a simple root of condition 0? */
static bool simple_root(const arrangement *a, const condition_system *s, int i)
{
    condition_system slope;
    arrangement both;
    bool simple = true;
    system_init(&slope);
    arrangement_init(&both);
    poly_set(system_add(&slope, IS_ZERO), &s->p[0]);
    poly_derivative(system_add(&slope, IS_ZERO), &s->p[0]);
    arrangement_build(&both, &slope);
    root here;
    root_init(&here);
    root_set(&here, &a->at[i]);
    here.sign_below = poly_sign_at(&a->squarefree[0], here.numerator, here.bits);
    for (int j = 0; j < both.count; j++)
        if ((both.vanishing[j] & 3u) == 3u &&
            roots_compare(&here, &a->squarefree[0], &both.at[j], &both.squarefree[0]) == 0)
            simple = false;
    root_clear(&here);
    arrangement_clear(&both);
    system_clear(&slope);
    return simple;
}

static bool meets_here(const arrangement *a, const condition_system *s, int i)
{
    if ((a->vanishing[i] & 1u) == 0 || arrangement_sign(a, s, 1, 2 * i) <= 0)
        return false;
    for (int k = 2; k < s->count; k++)
        if (arrangement_sign(a, s, k, 2 * i) < 0)
            return false;
    return true;
}

void oracle_count_crossings(int kind, const rdl_motion *motion, oracle_crossings *crossings)
{
    *crossings = (oracle_crossings){0};
    scene s;
    plane q;
    arrangement a;
    scene_init(&s, motion);
    plane_init(&q);
    arrangement_init(&a);
    plane_set(&q, &s, kind);
    crossings->planar = q.height.degree < 0;
    if (!crossings->planar && !never_coplanar(&q)) {
        bool first = true;
        add(&s, IS_ZERO, &q.height);
        add_inside(&s, &q, kind);
        arrangement_build(&a, &s.system);
        for (int i = 0; i < a.count; i++) {
            if (!meets_here(&a, &s.system, i))
                continue;
            if (first)
                crossings->first_is_simple = simple_root(&a, &s.system, i);
            first = false;
            count_meeting(&a, &s.system, i, crossings);
        }
    }
    arrangement_clear(&a);
    plane_clear(&q);
    scene_clear(&s);
}
