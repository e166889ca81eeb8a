/* narrow/nearest.c: closest points of a frame in doubles. The result is always feasible; how near to the true closest
 * points it is only decides how soon a certificate succeeds.
 *
 * The squared distance is a convex quadratic in two parameters over a triangle or a square. Where its free minimum is
 * outside, the minimum over the feature is on a side that the free minimum violates: from any other point of the
 * border a small step towards the free minimum would stay inside and come nearer. */
#include "narrow/filter.h"

/* Below this squared sine between u and v the free minimum is too uncertain to rule out sides. */
#define WELL_CONDITIONED 0x1p-7

typedef struct search {
    const rdli_frame *frame;
    double sign; /* e = sign (w - s u - sign r v): PT w - s u - r v, EE -(w - s u + r v) */
    double least, s, r, e[3];
} search;

static double clamp(double x)
{
    return x > 0 ? (x < 1 ? x : 1) : 0; /* also takes NaN to 0 */
}

static void offer(search *q, double s, double r)
{
    double e[3];
    for (int k = 0; k < 3; k++)
        e[k] = q->sign * ((q->frame->w[k] - s * q->frame->u[k]) - q->sign * (r * q->frame->v[k]));
    double square = rdli_dot(e, e);
    if (!(square < q->least))
        return;
    q->least = square;
    q->s = s;
    q->r = r;
    rdli_copy(e, q->e);
}

typedef struct products {
    double uu, vv, uv, wu, wv;
} products;

/* Sides: s = 0, r = 0, and s + r = 1. */
static void offer_sides_of_triangle(search *q, const products *p, bool left, bool low, bool far)
{
    if (left)
        offer(q, 0, clamp(p->wv / p->vv));
    if (low)
        offer(q, clamp(p->wu / p->uu), 0);
    if (far) { /* from u to v: (w - u) . (v - u) / |v - u|^2 */
        double t = clamp((p->wv - p->wu - p->uv + p->uu) / (p->uu - 2 * p->uv + p->vv));
        offer(q, 1 - t, t);
    }
}

/* Sides: s = 0, s = 1, r = 0, r = 1; for EE the minimum of |w - s u + r v| along each. */
static void offer_sides_of_square(search *q, const products *p, bool left, bool right, bool low, bool high)
{
    if (left)
        offer(q, 0, clamp(-p->wv / p->vv));
    if (right)
        offer(q, 1, clamp((p->uv - p->wv) / p->vv));
    if (low)
        offer(q, clamp(p->wu / p->uu), 0);
    if (high)
        offer(q, clamp((p->wu + p->uv) / p->uu), 1);
}

/* A step of the free minimum's equations from the point found, which takes its rounding away. */
static void correct(search *q, const products *p, double inverse)
{
    double a = q->sign * rdli_dot(q->e, q->frame->u), b = q->sign * rdli_dot(q->e, q->frame->v);
    double s = q->s + (a * p->vv - p->uv * b) * inverse, r = q->r + q->sign * (p->uu * b - p->uv * a) * inverse;
    s = clamp(s);
    r = clamp(r);
    if (q->sign > 0 && s + r > 1)
        r = 1 - s;
    q->least = INFINITY;
    offer(q, s, r);
}

static void minimise(search *q)
{
    const rdli_frame *f = q->frame;
    bool triangle = q->sign > 0;
    products p = {rdli_dot(f->u, f->u), rdli_dot(f->v, f->v), rdli_dot(f->u, f->v), rdli_dot(f->w, f->u),
        rdli_dot(f->w, f->v)};
    double determinant = p.uu * p.vv - p.uv * p.uv;
    double s = p.wu * p.vv - p.uv * p.wv, r = q->sign * (p.uu * p.wv - p.uv * p.wu);
    if (!(determinant > WELL_CONDITIONED * (p.uu * p.vv))) {
        double n[3], first[3], second[3];
        rdli_cross(f->u, f->v, n);
        rdli_cross(f->w, f->v, first);
        rdli_cross(f->w, f->u, second);
        double square = rdli_dot(n, n), t = rdli_dot(first, n) / square, o = -q->sign * rdli_dot(second, n) / square;
        if (triangle)
            offer_sides_of_triangle(q, &p, true, true, true);
        else
            offer_sides_of_square(q, &p, true, true, true, true);
        if (t >= 0 && o >= 0 && (triangle ? t + o <= 1 : t <= 1 && o <= 1))
            offer(q, t, o);
        return;
    }
    bool left = s < 0, low = r < 0, far = triangle ? s + r > determinant : s > determinant;
    bool high = !triangle && r > determinant;
    if (left || low || far || high) {
        if (triangle)
            offer_sides_of_triangle(q, &p, left, low, far);
        else
            offer_sides_of_square(q, &p, left, far, low, high);
        return;
    }
    double inverse = 1 / determinant;
    offer(q, s * inverse, r * inverse);
    correct(q, &p, inverse);
}

void rdli_nearest_points(int kind, const rdli_frame *frame, rdli_nearest *nearest)
{
    bool triangle = kind == RDL_POINT_TRIANGLE;
    search q = {.frame = frame, .sign = triangle ? 1 : -1, .least = INFINITY};
    minimise(&q);
    if (!(q.least < INFINITY)) { /* only where the input is of no ordinary size */
        q.s = q.r = 0;
        for (int k = 0; k < 3; k++)
            q.e[k] = q.sign * frame->w[k];
    }
    double s = q.s, r = q.r;
    rdli_copy(q.e, nearest->d);
    nearest->weight[0] = triangle ? 1 : 1 - s;
    nearest->weight[1] = triangle ? -(1 - s - r) : s;
    nearest->weight[2] = triangle ? -s : -(1 - r);
    nearest->weight[3] = -r;
}
