/* support/scenes.c: members of families that look like simulations; see motions.h. */
#include <math.h>
#include <stdbool.h>
#include <string.h>

#include "motions.h"

static void rotate_about(double x[3], double m[3][3], const double centre[3])
{
    double y[3];
    for (int k = 0; k < 3; k++)
        y[k] = x[k] - centre[k];
    for (int k = 0; k < 3; k++)
        x[k] = centre[k] + m[k][0] * y[0] + m[k][1] * y[1] + m[k][2] * y[2];
}

/* Rotation by an angle about an axis (Rodrigues). */
static void axis_rotation(double m[3][3], const double axis[3], double angle)
{
    double c = cos(angle), s = sin(angle);
    for (int i = 0; i < 3; i++)
        for (int j = 0; j < 3; j++)
            m[i][j] = axis[i] * axis[j] * (1.0 - c) + (i == j ? c : 0.0);
    for (int i = 0; i < 3; i++) {
        m[(i + 1) % 3][i] += s * axis[(i + 2) % 3];
        m[i][(i + 1) % 3] -= s * axis[(i + 2) % 3];
    }
}

static int first_of_second(int kind)
{
    return kind == RDL_POINT_TRIANGLE ? 1 : 2;
}

void make_rotation(random_source *source, int kind, rdl_motion *motion)
{
    make_random(source, kind, motion);
    memcpy(motion->end, motion->start, sizeof motion->end);
    double m[3][3], axis[3], shift[3];
    random_direction(source, axis);
    random_direction(source, shift);
    axis_rotation(m, axis, random_between(source, 1.0471975511965976, 3.141592653589793));
    double far = random_between(source, 0.0, 0.5);
    for (int i = 0; i < 4; i++) {
        if (i >= first_of_second(kind))
            rotate_about(motion->end[i], m, motion->start[3]);
        for (int k = 0; k < 3; k++)
            motion->end[i][k] += i < first_of_second(kind) ? far * shift[k] : 0.0;
    }
}

/* One extent of each feature is 1e-8 of the other. */
void make_sliver(random_source *source, int kind, rdl_motion *motion)
{
    make_random(source, kind, motion);
    double thin = 1e-8;
    if (kind == RDL_POINT_TRIANGLE) {
        for (int k = 0; k < 3; k++) {
            motion->start[3][k] = 0.5 * (motion->start[1][k] + motion->start[2][k]) + thin * random_between(source, -1, 1);
            motion->end[3][k] = 0.5 * (motion->end[1][k] + motion->end[2][k]) + thin * random_between(source, -1, 1);
        }
        for (int k = 0; k < 3; k++) {
            double off = 0.1 * random_between(source, -1, 1), s = 0.4;
            motion->start[0][k] = motion->start[1][k] * (1.0 - s) + motion->start[2][k] * s + off;
            motion->end[0][k] = motion->end[1][k] * (1.0 - s) + motion->end[2][k] * s - off +
                                0.3 * thin * random_between(source, -1, 1);
        }
    } else {
        for (int k = 0; k < 3; k++) {
            motion->start[1][k] = motion->start[0][k] + thin * random_between(source, -1, 1);
            motion->end[1][k] = motion->end[0][k] + thin * random_between(source, -1, 1);
        }
        for (int k = 0; k < 3; k++)
            motion->end[0][k] = motion->start[2][k] + motion->end[3][k] - motion->start[0][k];
    }
}

void make_zero_edge(random_source *source, int kind, rdl_motion *motion)
{
    unsigned which = random_below(source, 3);
    if (which == 0)
        make_small_grid(source, kind, motion);
    else if (which == 1)
        make_border(source, kind, motion);
    else
        make_flat_plane(source, kind, motion);
    int a = first_of_second(kind) + (int)random_below(source, 2), b = a == 3 ? 2 : a + 1;
    unsigned when = random_below(source, 3);
    if (when != 1)
        memcpy(motion->start[b], motion->start[a], sizeof motion->start[b]);
    if (when != 0)
        memcpy(motion->end[b], motion->end[a], sizeof motion->end[b]);
    if (kind == RDL_EDGE_EDGE && random_below(source, 2) == 0) {
        memcpy(motion->start[1], motion->start[0], sizeof motion->start[1]);
        memcpy(motion->end[1], motion->end[0], sizeof motion->end[1]);
    }
}

/* Features of 1 mm that fly 1 to 100 m in the step, past or through each other. */
void make_fast_thin(random_source *source, int kind, rdl_motion *motion)
{
    make_random(source, kind, motion);
    double course[3], far = pow(10.0, random_between(source, 0.0, 2.0));
    random_direction(source, course);
    for (int i = 0; i < 4; i++)
        for (int k = 0; k < 3; k++) {
            motion->start[i][k] *= 1e-3;
            motion->end[i][k] = motion->start[i][k] + 1e-4 * random_between(source, -1.0, 1.0);
            if (i < first_of_second(kind)) {
                motion->start[i][k] -= 0.5 * far * course[k];
                motion->end[i][k] += 0.5 * far * course[k];
            }
        }
}

/* Two wavy layers of 5 mm mesh, 0.5 mm apart, seen at neighbouring places; each layer moves up to 1.2 mm along every axis,
 * and each vertex a tenth of that by itself. About a quarter of the pairs touch. */
void make_cloth(random_source *source, int kind, rdl_motion *motion)
{
    double m[3][3], origin[3] = {0.0, 0.0, 0.0}, drift[2][3], mesh = 0.005, apart = 0.0005;
    random_rotation(source, m);
    for (int k = 0; k < 3; k++) {
        drift[0][k] = 0.0012 * random_between(source, -1.0, 1.0);
        drift[1][k] = 0.0012 * random_between(source, -1.0, 1.0);
    }
    for (int i = 0; i < 4; i++) {
        int layer = i >= first_of_second(kind);
        double u = i % 2 == 1 ? mesh : 0.0, v = i >= 2 && kind == RDL_POINT_TRIANGLE ? mesh * (i - 2) : 0.0;
        double p[3] = {u + random_between(source, -0.4, 0.4) * mesh, v + random_between(source, -0.4, 0.4) * mesh,
                       layer ? apart : 0.0};
        if (kind == RDL_POINT_TRIANGLE && !layer) {
            p[0] = (0.6 + random_between(source, -0.25, 0.25)) * mesh;
            p[1] = (0.3 + random_between(source, -0.25, 0.25)) * mesh;
        }
        if (kind == RDL_EDGE_EDGE && layer)
            p[1] = i == 2 ? -0.6 * mesh : 0.6 * mesh;
        p[2] += 0.2 * apart * random_between(source, -1.0, 1.0);
        for (int k = 0; k < 3; k++) {
            motion->start[i][k] = p[k];
            motion->end[i][k] = p[k] + drift[layer][k] + 0.0001 * random_between(source, -1.0, 1.0);
        }
        rotate_about(motion->start[i], m, origin);
        rotate_about(motion->end[i], m, origin);
    }
}

/* Nearly parallel segments of 2 mm, 0.1 mm apart, that slide along and roll about each other; or a segment's end beside a
 * triangle of the same size. Some are pressed together by more than they are apart. About a fifth touches. */
void make_strands(random_source *source, int kind, rdl_motion *motion)
{
    double axis[3], side[3], up[3], length = 0.002, apart = 0.0001;
    random_direction(source, axis);
    random_direction(source, side);
    double press = random_below(source, 5) < 2 ? random_between(source, 1.5, 4.0) * apart : 0.0;
    for (int k = 0; k < 3; k++)
        up[k] = axis[(k + 1) % 3] * side[(k + 2) % 3] - axis[(k + 2) % 3] * side[(k + 1) % 3];
    for (int i = 0; i < 4; i++) {
        double along = (i % 2 ? length : 0.0) + 0.5 * length * random_between(source, -1.0, 1.0);
        double off = i >= first_of_second(kind) ? apart : 0.0, rise = 0.0;
        if (kind == RDL_POINT_TRIANGLE && i == 3)
            off += length;
        if (kind == RDL_POINT_TRIANGLE && i == 0) {
            along += 0.5 * length;
            off = 0.3 * length * random_between(source, 0.0, 1.0);
            rise = apart;
        }
        double slide = 0.2 * length * random_between(source, -1.0, 1.0);
        for (int k = 0; k < 3; k++) {
            motion->start[i][k] = along * axis[k] + off * side[k] + rise * up[k] +
                                  0.15 * apart * random_between(source, -1.0, 1.0);
            motion->end[i][k] = motion->start[i][k] + slide * axis[k] + 0.7 * apart * random_between(source, -1.0, 1.0);
            if (i < first_of_second(kind))
                motion->end[i][k] += press * (kind == RDL_POINT_TRIANGLE ? -up[k] : side[k]);
        }
    }
}

/* Two flat layers at a fixed distance, one sliding and turning by 0.01 to 10 degrees: exactly parallel to rounding when
 * the common rotation is left out, which is every second time. */
void make_layers(random_source *source, int kind, rdl_motion *motion)
{
    static const double normal[3] = {0.0, 0.0, 1.0};
    double turn[3][3], tilt[3][3], origin[3] = {0.0, 0.0, 0.0};
    double height = pow(2.0, -(double)random_below(source, 12)), angle = pow(10.0, random_between(source, -2.0, 1.0));
    double slide[2] = {random_between(source, -0.3, 0.3), random_between(source, -0.3, 0.3)};
    bool tilted = random_below(source, 2) == 0;
    axis_rotation(turn, normal, angle * 3.141592653589793 / 180.0);
    random_rotation(source, tilt);
    for (int i = 0; i < 4; i++) {
        int layer = i >= first_of_second(kind);
        double p[3] = {random_between(source, -1.0, 1.0), random_between(source, -1.0, 1.0), layer ? height : 0.0};
        memcpy(motion->start[i], p, sizeof p);
        if (layer) {
            rotate_about(p, turn, origin);
            p[0] += slide[0];
            p[1] += slide[1];
            p[2] = height;
        }
        memcpy(motion->end[i], p, sizeof p);
        if (tilted) {
            rotate_about(motion->start[i], tilt, origin);
            rotate_about(motion->end[i], tilt, origin);
        }
    }
}
