/* oracle/loops.c: see loops.h. */
#include "loops.h"

#include <math.h>

#include "oracle.h"

static const double PI = 3.14159265358979323846;

static void minus(double r[3], const double a[3], const double b[3])
{
    for (int k = 0; k < 3; k++)
        r[k] = a[k] - b[k];
}

static double dot(const double a[3], const double b[3])
{
    return a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
}

static void cross(double r[3], const double a[3], const double b[3])
{
    r[0] = a[1] * b[2] - a[2] * b[1];
    r[1] = a[2] * b[0] - a[0] * b[2];
    r[2] = a[0] * b[1] - a[1] * b[0];
}

static bool unit_cross(double r[3], const double a[3], const double b[3])
{
    cross(r, a, b);
    double length = sqrt(dot(r, r));
    for (int k = 0; k < 3; k++)
        r[k] /= length;
    return length > 0.0;
}

static double safe_asin(double x)
{
    return asin(fmax(-1.0, fmin(1.0, x)));
}

/* 4 pi times the share of two segments: Klenin & Langowski 2000, eqs. 15, 16a, 16b. Segments in one plane give 0. */
static double segment_pair(const double p1[3], const double p2[3], const double p3[3], const double p4[3])
{
    double r12[3], r13[3], r14[3], r23[3], r24[3], r34[3], n1[3], n2[3], n3[3], n4[3], turn[3];
    minus(r12, p2, p1);
    minus(r13, p3, p1);
    minus(r14, p4, p1);
    minus(r23, p3, p2);
    minus(r24, p4, p2);
    minus(r34, p4, p3);
    if (!unit_cross(n1, r13, r14) || !unit_cross(n2, r14, r24) || !unit_cross(n3, r24, r23) ||
        !unit_cross(n4, r23, r13))
        return 0.0;
    double angle = safe_asin(dot(n1, n2)) + safe_asin(dot(n2, n3)) + safe_asin(dot(n3, n4)) + safe_asin(dot(n4, n1));
    cross(turn, r34, r12);
    double side = dot(turn, r13);
    return side > 0.0 ? angle : side < 0.0 ? -angle : 0.0;
}

static bool whole(double value, long *number, double *off)
{
    double nearest = nearbyint(value);
    *off = fabs(value - nearest);
    if (!(*off <= 1e-3))
        return false;
    *number = (long)nearest;
    return true;
}

bool oracle_linking_number(const double (*a)[3], size_t a_count, const double (*b)[3], size_t b_count, long *number,
                           double *off)
{
    double sum = 0.0;
    for (size_t i = 0; i < a_count; i++)
        for (size_t j = 0; j < b_count; j++)
            sum += segment_pair(a[i], a[(i + 1) % a_count], b[j], b[(j + 1) % b_count]);
    return whole(sum / (4.0 * PI), number, off);
}

static bool touches(const rdl_motion *motion)
{
    oracle_touch touch;
    mpq_t zero;
    mpq_init(zero);
    oracle_touch_init(&touch);
    oracle_find(RDL_EDGE_EDGE, motion, zero, &touch);
    bool answer = touch.touches;
    oracle_touch_clear(&touch);
    mpq_clear(zero);
    return answer;
}

bool oracle_linking_change(const double (*a0)[3], const double (*a1)[3], size_t a_count, const double (*b0)[3],
                           const double (*b1)[3], size_t b_count, long *change)
{
    long sum = 0;
    for (size_t i = 0; i < a_count; i++)
        for (size_t j = 0; j < b_count; j++) {
            size_t corner[4] = {i, (i + 1) % a_count, j, (j + 1) % b_count};
            rdl_motion motion;
            oracle_crossings crossings;
            for (int v = 0; v < 4; v++)
                for (int k = 0; k < 3; k++) {
                    motion.start[v][k] = v < 2 ? a0[corner[v]][k] : b0[corner[v]][k];
                    motion.end[v][k] = v < 2 ? a1[corner[v]][k] : b1[corner[v]][k];
                }
            oracle_count_crossings(RDL_EDGE_EDGE, &motion, &crossings);
            if (crossings.planar && touches(&motion))
                return false;
            if (crossings.on_border > 0 || crossings.grazes > 0 || crossings.unclear > 0)
                return false;
            /* w points from the first edge to the second: as w . (u x v) falls through 0 the pair's share of the Gauss
             * integral, which carries the sign of (first - second) . (u x v), jumps from -1/2 to 1/2. */
            sum -= crossings.signed_sum;
        }
    *change = sum;
    return true;
}

bool oracle_winding_number(const double (*vertices)[3], const unsigned (*triangles)[3], size_t triangle_count,
                           const double point[3], long *number, double *off)
{
    double sum = 0.0;
    for (size_t i = 0; i < triangle_count; i++) {
        double r[3][3], length[3], turn[3];
        for (int v = 0; v < 3; v++) {
            minus(r[v], vertices[triangles[i][v]], point);
            length[v] = sqrt(dot(r[v], r[v]));
        }
        cross(turn, r[1], r[2]);
        double volume = dot(r[0], turn);
        double below = length[0] * length[1] * length[2] + dot(r[0], r[1]) * length[2] + dot(r[0], r[2]) * length[1] +
                       dot(r[1], r[2]) * length[0];
        if (volume == 0.0 && below <= 0.0) {
            *off = 0.5; /* on the triangle: half of the sphere is covered, on either side */
            return false;
        }
        sum += 2.0 * atan2(volume, below);
    }
    return whole(sum / (4.0 * PI), number, off);
}
