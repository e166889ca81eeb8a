/* narrow/nearest_kernel.h: closest points in lanes: the arithmetic of nearest.c, so that both give the same bits. Included
 * after lane_kernel.h. */

/* Below this squared sine between u and v the free minimum is too uncertain to rule out sides (as in nearest.c). */
#define LANE_WELL_CONDITIONED 0x1p-7

typedef struct nearest {
    vec least, s, r;
    vec3 e;
} nearest;

typedef struct lane_products {
    vec uu, vv, uv, wu, wv;
} lane_products;

LANE_INLINE vec clamped(vec x)
{
    return pick(x > 0, pick(x < 1, x, all(1)), all(0));
}

/* Takes the difference e where it is shorter, in the lanes of `where`. */
LANE_INLINE void take(bits where, vec s, vec r, const vec3 *e, nearest *n)
{
    vec square = dot(e, e);
    bits better = where & (square < n->least);
    n->least = pick(better, square, n->least);
    n->s = pick(better, s, n->s);
    n->r = pick(better, r, n->r);
    n->e = choose(better, e, &n->e);
}

/* e = sign (w - s u - sign r v); where s or r is 0 or 1 for all lanes the products are left out. */
enum side { SIDE_NONE, SIDE_S0, SIDE_S1, SIDE_R0, SIDE_R1 };
LANE_INLINE void offer_side(int kind, const frames *f, bits where, enum side side, vec s, vec r, nearest *n)
{
    vec3 e;
    for (int k = 0; k < 3; k++) {
        vec w = f->w.c[k], u = f->u.c[k], v = f->v.c[k];
        vec inner = side == SIDE_S0 ? w : side == SIDE_S1 ? w - u : w - s * u, outer = side == SIDE_R1 ? v : r * v;
        if (kind == RDL_POINT_TRIANGLE)
            e.c[k] = side == SIDE_R0 ? inner : inner - outer;
        else
            e.c[k] = side == SIDE_R0 ? -inner : -(inner + outer);
    }
    take(where, s, r, &e, n);
}

LANE_INLINE void offer(int kind, const frames *f, bits where, vec s, vec r, nearest *n)
{
    offer_side(kind, f, where, SIDE_NONE, s, r, n);
}

/* u and v nearly parallel: the free minimum from cross products. */
LANE_INLINE void offer_parallel(int kind, const frames *f, bits where, nearest *best)
{
    vec3 n, first, second;
    for (int k = 0; k < 3; k++) {
        n.c[k] = cross(&f->u, &f->v, k);
        first.c[k] = cross(&f->w, &f->v, k);
        second.c[k] = cross(&f->w, &f->u, k);
    }
    vec square = dot(&n, &n), t = dot(&first, &n) / square, o = dot(&second, &n) / square;
    if (kind == RDL_POINT_TRIANGLE)
        o = -o;
    bits feasible = (t >= 0) & (o >= 0);
    feasible &= kind == RDL_POINT_TRIANGLE ? t + o <= 1 : (t <= 1) & (o <= 1);
    offer(kind, f, where & feasible, t, o, best);
}

LANE_INLINE void offer_inside(int kind, const frames *f, const lane_products *p, bits where, vec s, vec r, vec inverse,
                              nearest *n)
{
    double sign = kind == RDL_POINT_TRIANGLE ? 1 : -1;
    offer(kind, f, where, s * inverse, r * inverse, n);
    vec a = sign * dot(&n->e, &f->u), b = sign * dot(&n->e, &f->v);
    vec next_s = clamped(n->s + (a * p->vv - p->uv * b) * inverse);
    vec next_r = clamped(n->r + sign * (p->uu * b - p->uv * a) * inverse);
    if (kind == RDL_POINT_TRIANGLE)
        next_r = pick(next_s + next_r > 1, 1 - next_s, next_r);
    n->least = pick(where, all((double)INFINITY), n->least);
    offer(kind, f, where, next_s, next_r, n);
}

LANE_INLINE nearest nearest_of(int kind, const frames *f)
{
    bool triangle = kind == RDL_POINT_TRIANGLE;
    nearest n = {all((double)INFINITY), all(0), all(0), triangle ? f->w : negative(&f->w)};
    lane_products p = {dot(&f->u, &f->u), dot(&f->v, &f->v), dot(&f->u, &f->v), dot(&f->w, &f->u), dot(&f->w, &f->v)};
    vec determinant = p.uu * p.vv - p.uv * p.uv;
    vec s = p.wu * p.vv - p.uv * p.wv, r = triangle ? p.uu * p.wv - p.uv * p.wu : -(p.uu * p.wv - p.uv * p.wu);
    bits parallel = ~(determinant > LANE_WELL_CONDITIONED * (p.uu * p.vv));
    bits left = s < 0, low = r < 0, far = triangle ? s + r > determinant : s > determinant;
    bits high = triangle ? left & 0 : r > determinant;
    bits inside = ~(parallel | left | low | far | high);
    if (mask_of(~inside)) {
        if (triangle) {
            offer_side(kind, f, parallel | left, SIDE_S0, all(0), clamped(p.wv / p.vv), &n);
            offer_side(kind, f, parallel | low, SIDE_R0, clamped(p.wu / p.uu), all(0), &n);
            vec t = clamped((p.wv - p.wu - p.uv + p.uu) / (p.uu - 2 * p.uv + p.vv));
            offer(kind, f, parallel | far, 1 - t, t, &n);
        } else {
            offer_side(kind, f, parallel | left, SIDE_S0, all(0), clamped(-p.wv / p.vv), &n);
            offer_side(kind, f, parallel | far, SIDE_S1, all(1), clamped((p.uv - p.wv) / p.vv), &n);
            offer_side(kind, f, parallel | low, SIDE_R0, clamped(p.wu / p.uu), all(0), &n);
            offer_side(kind, f, parallel | high, SIDE_R1, clamped((p.wu + p.uv) / p.uu), all(1), &n);
        }
    }
    if (mask_of(parallel))
        offer_parallel(kind, f, parallel, &n);
    if (mask_of(inside))
        offer_inside(kind, f, &p, inside, s, r, 1 / determinant, &n);
    return n;
}
