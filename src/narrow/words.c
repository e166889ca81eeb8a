/* narrow/words.c: exact decisions at gap 0 in words of 128 bits, for coordinates that are integers of at most 59 bits in
 * some unit: what is planar, or touches at the start or the end, by construction (lattices, flat layers, states at rest).
 *
 * Differences have 60 bits, components of cross products 121, sums of three of those 123: they are exact. The cubic's
 * coefficients may have 184, but doubles know them to 2^-46 of that; where doubles show that one is below 2^126 its
 * residue modulo 2^128 is its value. */
#include "base/vector.h"
#include "narrow/exact_pair.h"

__extension__ typedef __int128 wide;
__extension__ typedef unsigned __int128 residue;

typedef struct words {
    int kind;
    int64_t w[2][3], u[2][3], v[2][3];
} words;

static bool difference(const double a[3], const double b[3], double scale, int64_t d[3])
{
    for (int k = 0; k < 3; k++) {
        double x = a[k] * scale, y = b[k] * scale;
        if (!(fabs(x) < 0x1p59 && fabs(y) < 0x1p59))
            return false;
        d[k] = (int64_t)x - (int64_t)y;
    }
    return true;
}

static bool words_of(int kind, const rdl_motion *motion, int unit, words *p)
{
    bool edges = kind == RDL_EDGE_EDGE, fits = unit > -1000 && unit < 1000;
    double scale = fits ? ldexp(1, -unit) : 1;
    p->kind = kind;
    for (int end = 0; end < 2 && fits; end++) {
        const double (*x)[3] = end ? motion->end : motion->start;
        fits = difference(x[edges ? 2 : 0], x[edges ? 0 : 1], scale, p->w[end]) &&
               difference(x[edges ? 1 : 2], x[edges ? 0 : 1], scale, p->u[end]) &&
               difference(x[3], x[edges ? 2 : 1], scale, p->v[end]);
    }
    return fits;
}

/* Component k of a x b. */
static wide cross(const int64_t a[3], const int64_t b[3], int k)
{
    int i = (k + 1) % 3, j = (k + 2) % 3;
    return (wide)a[i] * b[j] - (wide)a[j] * b[i];
}

/* Coefficients of w . (u x v) times 1, 3, 3, 1, modulo 2^128. */
static void cubic_of(const words *p, wide f[4])
{
    residue sum[4] = {0, 0, 0, 0};
    for (int k = 0; k < 3; k++) {
        residue n0 = (residue)cross(p->u[0], p->v[0], k), n2 = (residue)cross(p->u[1], p->v[1], k);
        residue n1 = (residue)cross(p->u[0], p->v[1], k) + (residue)cross(p->u[1], p->v[0], k);
        residue w0 = (residue)(wide)p->w[0][k], w1 = (residue)(wide)p->w[1][k];
        sum[0] += w0 * n0;
        sum[1] += w0 * n1 + w1 * n0;
        sum[2] += w0 * n2 + w1 * n1;
        sum[3] += w1 * n2;
    }
    for (int i = 0; i < 4; i++)
        f[i] = (wide)sum[i];
}

static int sign_of(wide x)
{
    return (x > 0) - (x < 0);
}

/* Signs of the cubic's coefficients; false where they are not known. */
static bool cubic_signs(const words *p, const rdli_cubic *s, int scale, int sign[4])
{
    wide f[4];
    cubic_of(p, f);
    for (int i = 0; i < 4; i++) {
        sign[i] = s->f[i] > s->bound ? 1 : s->f[i] < -s->bound ? -1 : 0;
        if (sign[i])
            continue;
        if (!(ldexp(3 * (fabs(s->f[i]) + s->bound), scale) < 0x1p126))
            return false;
        sign[i] = sign_of(f[i]);
    }
    return true;
}

/* A couple of rdli_point_segments at one end: from the segment's first vertex to the point, and along the segment. */
static void couple_at(const words *p, int couple, int end, int64_t from[3], int64_t along[3])
{
    bool triangle = p->kind == RDL_POINT_TRIANGLE;
    for (int k = 0; k < 3; k++) {
        int64_t w = p->w[end][k], u = p->u[end][k], v = p->v[end][k];
        const int64_t points[2][4] = {{w, -w, w + v, u - w}, {w, w, w - u, 0}};
        const int64_t segments[2][4] = {{u, v, u, v}, {u, v, v - u, 0}};
        from[k] = points[triangle][couple];
        along[k] = segments[triangle][couple];
    }
}

static int couples_of(int kind)
{
    return kind == RDL_POINT_TRIANGLE ? 3 : 4;
}

static wide dot(const int64_t a[3], const int64_t b[3])
{
    return (wide)a[0] * b[0] + (wide)a[1] * b[1] + (wide)a[2] * b[2];
}

/* The point lies on the closed segment. */
static bool on_segment(const words *p, int couple, int end)
{
    int64_t w[3], u[3];
    couple_at(p, couple, end, w, u);
    for (int k = 0; k < 3; k++)
        if (cross(w, u, k) != 0)
            return false;
    wide along = dot(w, u), square = dot(u, u);
    return square == 0 ? dot(w, w) == 0 : along >= 0 && along <= square;
}

/* The pair is coplanar at the end `end` of the step: whether it meets there. Without a normal it can only do so at a border. */
static bool meets_at(const words *p, int end)
{
    for (int k = 0; k < 3; k++) {
        wide n = cross(p->u[end], p->v[end], k), first = cross(p->w[end], p->v[end], k);
        wide second = cross(p->w[end], p->u[end], k);
        if (n == 0)
            continue;
        if (n < 0) {
            n = -n;
            first = -first;
            second = -second;
        }
        return p->kind == RDL_POINT_TRIANGLE ? first >= 0 && second <= 0 && first - second <= n
                                             : first >= 0 && second >= 0 && first <= n && second <= n;
    }
    for (int couple = 0; couple < couples_of(p->kind); couple++)
        if (on_segment(p, couple, end))
            return true;
    return false;
}

/* Whether a vector that moves from a to b vanishes at one time, certainly in [lo, hi]. Its components then have the same
 * ratios of a to a - b. */
static bool vanishes(const int64_t a[3], const int64_t b[3], double lo, double hi)
{
    int k = 0;
    for (int i = 1; i < 3; i++)
        k = a[k] == b[k] ? i : k;
    if (a[k] == b[k])
        return false;
    for (int i = 0; i < 3; i++)
        if ((wide)a[i] * (a[k] - b[k]) != (wide)a[k] * (a[i] - b[i]))
            return false;
    double time = (double)a[k] / (double)(a[k] - b[k]), rounding = 0x1p-48;
    return time > lo + rounding && time < hi - rounding;
}

/* Whether the point of a couple comes exactly upon an end of its segment in [lo, hi]. */
static bool meets_an_end(const words *p, int couple, double lo, double hi)
{
    int64_t near[2][3], far[2][3], along[3];
    for (int end = 0; end < 2; end++) {
        couple_at(p, couple, end, near[end], along);
        for (int k = 0; k < 3; k++)
            far[end][k] = near[end][k] - along[k];
    }
    return vanishes(near[0], near[1], lo, hi) || vanishes(far[0], far[1], lo, hi);
}

/* The first event of a planar motion that is free at the start; false where neither doubles nor words can tell. */
static bool planar_touch(const rdli_cubic *s, const words *p, rdl_touch *touch)
{
    rdl_touch first = {.time_lo = 1, .time_hi = 1, .stage = RDL_STAGE_EXACT, .order = 3};
    for (int couple = 0; couple < couples_of(s->kind); couple++) {
        double lo, hi;
        enum rdli_inside meets = rdli_planar_event(s, couple, &lo, &hi);
        if (meets == RDLI_INSIDE_MAYBE && !(hi >= 0 && meets_an_end(p, couple, lo, hi)))
            return false;
        if (meets == RDLI_INSIDE_NO)
            continue;
        first.touches = 1;
        first.time_lo = lo < first.time_lo ? lo : first.time_lo;
        first.time_hi = hi < first.time_hi ? hi : first.time_hi;
    }
    *touch = first;
    return true;
}

static bool is_planar(const int sign[4])
{
    return !(sign[0] || sign[1] || sign[2] || sign[3]);
}

/* No root inside the step: all signs agree, apart from zeros. */
static bool has_no_root(const int sign[4])
{
    bool plus = false, minus = false;
    for (int i = 0; i < 4; i++) {
        plus = plus || sign[i] > 0;
        minus = minus || sign[i] < 0;
    }
    return plus != minus;
}

bool rdli_words_touch(const rdli_cubic *s, const rdl_motion *motion, int shift, rdl_touch *touch)
{
    words p;
    int sign[4], unit = rdli_common_unit(motion, 0);
    if (!words_of(s->kind, motion, unit, &p) || !cubic_signs(&p, s, -3 * (unit + shift), sign))
        return false;
    if (sign[0] == 0 && meets_at(&p, 0)) {
        *touch = (rdl_touch){.touches = 1, .stage = RDL_STAGE_ENDS, .order = 3};
        return true;
    }
    if (is_planar(sign)) {
        if (!planar_touch(s, &p, touch))
            return false;
    } else if (has_no_root(sign)) {
        *touch = (rdl_touch){.time_lo = 1, .time_hi = 1, .stage = RDL_STAGE_EXACT, .order = 3};
    } else {
        return false;
    }
    touch->touches = touch->touches || (sign[3] == 0 && meets_at(&p, 1));
    return true;
}
