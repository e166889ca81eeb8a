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

/* e = sign (w - s u - sign r v). Taken where it is shorter, in the lanes of `where`. */
LANE_INLINE void offer(int kind, const frames *f, bits where, vec s, vec r, nearest *n)
{
    double sign = kind == RDL_POINT_TRIANGLE ? 1 : -1;
    vec3 e;
    for (int k = 0; k < 3; k++) {
        vec inner = f->w.c[k] - s * f->u.c[k], outer = r * f->v.c[k];
        e.c[k] = sign > 0 ? inner - outer : -(inner + outer);
    }
    vec square = dot(&e, &e);
    bits better = where & (square < n->least);
    n->least = pick(better, square, n->least);
    n->s = pick(better, s, n->s);
    n->r = pick(better, r, n->r);
    n->e = choose(better, &e, &n->e);
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
            offer(kind, f, parallel | left, all(0), clamped(p.wv / p.vv), &n);
            offer(kind, f, parallel | low, clamped(p.wu / p.uu), all(0), &n);
            vec t = clamped((p.wv - p.wu - p.uv + p.uu) / (p.uu - 2 * p.uv + p.vv));
            offer(kind, f, parallel | far, 1 - t, t, &n);
        } else {
            offer(kind, f, parallel | left, all(0), clamped(-p.wv / p.vv), &n);
            offer(kind, f, parallel | far, all(1), clamped((p.uv - p.wv) / p.vv), &n);
            offer(kind, f, parallel | low, clamped(p.wu / p.uu), all(0), &n);
            offer(kind, f, parallel | high, clamped((p.wu + p.uv) / p.uu), all(1), &n);
        }
    }
    if (mask_of(parallel))
        offer_parallel(kind, f, parallel, &n);
    if (mask_of(inside))
        offer_inside(kind, f, &p, inside, s, r, 1 / determinant, &n);
    return n;
}
