/* oracle/rest.c: exact answers about a pair at rest; see oracle.h. */
#include "oracle.h"

typedef mpq_t vector[3];

static void vector_init(vector v)
{
    for (int k = 0; k < 3; k++)
        mpq_init(v[k]);
}

static void vector_clear(vector v)
{
    for (int k = 0; k < 3; k++)
        mpq_clear(v[k]);
}

static void vector_from(vector v, const double from[3], const double to[3])
{
    mpq_t start;
    mpq_init(start);
    for (int k = 0; k < 3; k++) {
        mpq_set_d(v[k], to[k]);
        mpq_set_d(start, from[k]);
        mpq_sub(v[k], v[k], start);
    }
    mpq_clear(start);
}

static void dot(mpq_t result, vector a, vector b)
{
    mpq_t sum, product;
    mpq_init(sum);
    mpq_init(product);
    for (int k = 0; k < 3; k++) {
        mpq_mul(product, a[k], b[k]);
        mpq_add(sum, sum, product);
    }
    mpq_set(result, sum);
    mpq_clear(sum);
    mpq_clear(product);
}

static void cross(vector result, vector a, vector b)
{
    mpq_t right;
    mpq_init(right);
    for (int k = 0; k < 3; k++) {
        int i = (k + 1) % 3, j = (k + 2) % 3;
        mpq_mul(result[k], a[i], b[j]);
        mpq_mul(right, a[j], b[i]);
        mpq_sub(result[k], result[k], right);
    }
    mpq_clear(right);
}

static void keep_least(mpq_t best, const mpq_t value)
{
    if (mpq_sgn(best) < 0 || mpq_cmp(value, best) < 0)
        mpq_set(best, value);
}

/* Point against the closed segment: by the clamped parameter, so that zero length needs no case of its own. */
static void point_segment(mpq_t best, const double p[3], const double a[3], const double b[3])
{
    vector w, e;
    mpq_t along, length2, value;
    vector_init(w);
    vector_init(e);
    mpq_init(along);
    mpq_init(length2);
    mpq_init(value);
    vector_from(w, a, p);
    vector_from(e, a, b);
    dot(along, w, e);
    dot(length2, e, e);
    if (mpq_sgn(along) > 0) {
        if (mpq_cmp(along, length2) >= 0)
            mpq_set_ui(value, 1, 1);
        else
            mpq_div(value, along, length2);
        for (int k = 0; k < 3; k++) {
            mpq_mul(along, value, e[k]);
            mpq_sub(w[k], w[k], along);
        }
    }
    dot(value, w, w);
    keep_least(best, value);
    vector_clear(w);
    vector_clear(e);
    mpq_clear(along);
    mpq_clear(length2);
    mpq_clear(value);
}

static bool between(const mpq_t part, const mpq_t whole)
{
    return mpq_sgn(part) >= 0 && mpq_cmp(part, whole) <= 0;
}

/* Point-plane or line-line where the foot points lie inside both features. */
static void inner(mpq_t best, int kind, const double x[4][3])
{
    vector w, u, v, n, turn;
    mpq_t n2, first, second;
    vector *all[5] = {&w, &u, &v, &n, &turn};
    for (int i = 0; i < 5; i++)
        vector_init(*all[i]);
    mpq_init(n2);
    mpq_init(first);
    mpq_init(second);
    bool face = kind == RDL_POINT_TRIANGLE;
    vector_from(w, face ? x[1] : x[0], face ? x[0] : x[2]);
    vector_from(u, face ? x[1] : x[0], face ? x[2] : x[1]);
    vector_from(v, face ? x[1] : x[2], x[3]);
    cross(n, u, v);
    dot(n2, n, n);
    cross(turn, w, v);
    dot(first, turn, n);
    cross(turn, face ? u : w, face ? w : u);
    dot(second, turn, n);
    if (mpq_sgn(n2) > 0 && between(first, n2) && between(second, n2)) {
        mpq_add(second, second, first);
        if (!face || mpq_cmp(second, n2) <= 0) {
            dot(first, w, n);
            mpq_mul(first, first, first);
            mpq_div(first, first, n2);
            keep_least(best, first);
        }
    }
    for (int i = 0; i < 5; i++)
        vector_clear(*all[i]);
    mpq_clear(n2);
    mpq_clear(first);
    mpq_clear(second);
}

void oracle_rest_distance2(int kind, const double x[4][3], mpq_t distance2)
{
    mpq_set_si(distance2, -1, 1);
    inner(distance2, kind, x);
    if (kind == RDL_POINT_TRIANGLE) {
        for (int i = 1; i <= 3; i++)
            point_segment(distance2, x[0], x[i], x[i % 3 + 1]);
    } else {
        for (int i = 0; i < 2; i++) {
            point_segment(distance2, x[i], x[2], x[3]);
            point_segment(distance2, x[2 + i], x[0], x[1]);
        }
    }
}

/* Sign of the determinant of b - a, c - a, d - a. */
static int orientation(const double a[3], const double b[3], const double c[3], const double d[3])
{
    vector p, q, r, n;
    mpq_t volume;
    vector_init(p);
    vector_init(q);
    vector_init(r);
    vector_init(n);
    mpq_init(volume);
    vector_from(p, a, b);
    vector_from(q, a, c);
    vector_from(r, a, d);
    cross(n, p, q);
    dot(volume, n, r);
    int sign = mpq_sgn(volume);
    vector_clear(p);
    vector_clear(q);
    vector_clear(r);
    vector_clear(n);
    mpq_clear(volume);
    return sign;
}

static bool meet(int kind, const double a[3], const double b[3], const double c[3], const double d[3])
{
    double x[4][3];
    const double *rows[4] = {a, b, c, d};
    mpq_t distance2;
    mpq_init(distance2);
    for (int i = 0; i < 4; i++)
        for (int k = 0; k < 3; k++)
            x[i][k] = rows[i][k];
    oracle_rest_distance2(kind, (const double(*)[3])x, distance2);
    bool zero = mpq_sgn(distance2) == 0;
    mpq_clear(distance2);
    return zero;
}

int oracle_edge_against_triangle(const double edge[2][3], const double triangle[3][3])
{
    const double *p = edge[0], *q = edge[1], *a = triangle[0], *b = triangle[1], *c = triangle[2];
    if (orientation(a, b, c, p) * orientation(a, b, c, q) < 0) {
        /* The line through p and q passes the three sides of the triangle in one sense of turning. */
        int s[3] = {orientation(p, q, a, b), orientation(p, q, b, c), orientation(p, q, c, a)};
        bool left = s[0] >= 0 && s[1] >= 0 && s[2] >= 0, right = s[0] <= 0 && s[1] <= 0 && s[2] <= 0;
        return left || right ? ORACLE_PIERCE : ORACLE_APART;
    }
    if (meet(RDL_POINT_TRIANGLE, p, a, b, c) || meet(RDL_POINT_TRIANGLE, q, a, b, c))
        return ORACLE_CONTACT;
    for (int i = 0; i < 3; i++)
        if (meet(RDL_EDGE_EDGE, p, q, triangle[i], triangle[(i + 1) % 3]))
            return ORACLE_CONTACT;
    return ORACLE_APART;
}
