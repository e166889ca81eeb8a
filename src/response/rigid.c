/* response/rigid.c: a zone as one rigid body. */
#include "base/rounding.h"
#include "base/vector.h"
#include "response/response.h"

typedef struct moments {
    double mass, centre[3], shift[3], momentum[3], inertia[3][3];
} moments;

static void centre_of(const rdli_piece *piece, const uint32_t *vertices, size_t count, moments *m)
{
    for (size_t i = 0; i < count; i++) {
        uint32_t v = vertices[i];
        m->mass += piece->mass[v];
        for (int k = 0; k < 3; k++) {
            m->centre[k] += piece->mass[v] * piece->start[v][k];
            m->shift[k] += piece->mass[v] * (piece->target[v][k] - piece->start[v][k]);
        }
    }
    for (int k = 0; k < 3; k++) {
        m->centre[k] /= m->mass;
        m->shift[k] /= m->mass;
    }
}

/* Angular momentum of the displacement and inertia about the centre of mass at the start. */
static void turn_of(const rdli_piece *piece, const uint32_t *vertices, size_t count, moments *m)
{
    for (size_t i = 0; i < count; i++) {
        uint32_t v = vertices[i];
        double r[3], u[3], spin[3], square, mass = piece->mass[v];
        rdli_subtract(piece->start[v], m->centre, r);
        rdli_subtract(piece->target[v], piece->start[v], u);
        rdli_cross(r, u, spin);
        rdli_add_scaled(m->momentum, mass, spin);
        square = rdli_dot(r, r);
        for (int a = 0; a < 3; a++)
            for (int b = 0; b < 3; b++)
                m->inertia[a][b] += mass * ((a == b ? square : 0.0) - r[a] * r[b]);
    }
}

/* Conjugate gradients end after three steps and, started from zero, give the smallest solution when the inertia is
 * singular (points on a line): a line has no turn about itself. */
static void solve_inertia(const double inertia[3][3], const double momentum[3], double omega[3])
{
    double r[3], p[3], square;
    memset(omega, 0, 3 * sizeof(double));
    rdli_copy(momentum, r);
    rdli_copy(momentum, p);
    square = rdli_dot(r, r);
    double first = square;
    for (int step = 0; step < 6 && square > first * 0x1p-100; step++) {
        double image[3];
        for (int a = 0; a < 3; a++)
            image[a] = rdli_dot(inertia[a], p);
        double curvature = rdli_dot(p, image);
        if (!(curvature > 0.0))
            return;
        double length = square / curvature;
        rdli_add_scaled(omega, length, p);
        rdli_add_scaled(r, -length, image);
        double next = rdli_dot(r, r);
        for (int a = 0; a < 3; a++)
            p[a] = r[a] + next / square * p[a];
        square = next;
    }
}

static double growth(const rdli_piece *piece, const uint32_t *vertices, size_t count, double smallest_floor)
{
    double largest = 0.0;
    for (size_t i = 0; i < count; i++)
        for (int k = 0; k < 3; k++)
            largest = fmax(largest, fmax(fabs(piece->start[vertices[i]][k]), fabs(piece->target[vertices[i]][k])));
    double share = 16.0 * largest * rdli_half_unit(piece->format);
    /* More than a tenth would no longer be a rigid motion: then the check of the delivered bits has the last word. */
    return smallest_floor > 0.0 ? fmin(share / smallest_floor, 0.1) : 0.0;
}

void rdli_rigid_motion(const rdli_piece *piece, const uint32_t *vertices, size_t count, double smallest_floor,
                       double (*solution)[3])
{
    moments m;
    memset(&m, 0, sizeof m);
    centre_of(piece, vertices, count, &m);
    turn_of(piece, vertices, count, &m);
    double omega[3];
    solve_inertia((const double (*)[3])m.inertia, m.momentum, omega);
    double half[3] = { 0.5 * omega[0], 0.5 * omega[1], 0.5 * omega[2] };
    /* Cayley: the angle is 2 atan |half|; |half| <= 1.7 keeps it below 120 degrees (tan 60 degrees = 1.732). */
    double length = rdli_length(half);
    if (length > 1.7)
        for (int k = 0; k < 3; k++)
            half[k] *= 1.7 / length;
    double square = rdli_dot(half, half), factor = 2.0 / (1.0 + square);
    double grown = growth(piece, vertices, count, smallest_floor);
    for (size_t i = 0; i < count; i++) {
        double r[3], once[3], twice[3];
        rdli_subtract(piece->start[vertices[i]], m.centre, r);
        rdli_cross(half, r, once);
        rdli_cross(half, once, twice);
        for (int k = 0; k < 3; k++)
            solution[i][k] = piece->start[vertices[i]][k]
                + (m.shift[k] + factor * (once[k] + twice[k]) + grown * (r[k] + factor * (once[k] + twice[k])));
    }
}
