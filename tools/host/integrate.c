/* integrate.c: forces, their stiffness, and one step of linearly implicit Euler.
 * Sources: Baraff & Witkin 1998, Large steps in cloth simulation (membrane, implicit step, driven vertices);
 * Bergou et al. 2006, A quadratic bending model for inextensible surfaces (bending, see model.c). */
#include "host.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#define COUPLING 4.0 /* times the effective mass: contacts may give way a little, and the solver stays fast */

static double dot(const double a[3], const double b[3])
{
    return a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
}

/* m += scale (a b^T) */
static void add_outer(double m[9], double scale, const double a[3], const double b[3])
{
    for (int r = 0; r < 3; r++)
        for (int c = 0; c < 3; c++)
            m[3 * r + c] += scale * a[r] * b[c];
}

/* Second derivative of 1/2 (|w| - rest)^2 with respect to w, its negative part under compression left out so that the
 * whole matrix stays positive definite: n n^T + max(0, 1 - rest / |w|) (I - n n^T). */
static void length_stiffness(const double n[3], double length, double rest, double out[9])
{
    double across = length > rest ? 1.0 - rest / length : 0.0;
    memset(out, 0, 9 * sizeof *out);
    out[0] = out[4] = out[8] = across;
    add_outer(out, 1.0 - across, n, n);
}

/* Unit vector and length of w; a vanishing w gets the direction x, any would do. */
static double split(const double w[3], double n[3])
{
    double length = sqrt(dot(w, w));
    if (!(length > 0)) {
        n[0] = 1;
        n[1] = n[2] = 0;
        return 0;
    }
    for (int k = 0; k < 3; k++)
        n[k] = w[k] / length;
    return length;
}

/* Adds a 3x3 block for the ordered vertex couple (i, j); only the upper half is stored. */
static void add_couple(host_matrix *a, size_t slot, uint32_t i, uint32_t j, const double block[9])
{
    double *out = a->block[slot];
    for (int r = 0; r < 3; r++)
        for (int c = 0; c < 3; c++)
            out[3 * r + c] += i < j ? block[3 * r + c] : block[3 * c + r];
}

/* Stretch along both thread directions, energy 1/2 stretch area (|w| - 1)^2 each, and shear, energy
 * 1/2 shear area (w_u . w_v)^2 (Baraff & Witkin 1998, section 4). The shear's stiffness is its first-derivative part. */
static void add_membrane(host *h, const host_membrane *m, double scale)
{
    double wu[3] = {0, 0, 0}, wv[3] = {0, 0, 0}, nu[3], nv[3], hu[9], hv[9], slope[3][3];
    for (int i = 0; i < 3; i++)
        for (int k = 0; k < 3; k++) {
            wu[k] += m->grad_u[i] * h->position[m->vertex[i]][k];
            wv[k] += m->grad_v[i] * h->position[m->vertex[i]][k];
        }
    double lu = split(wu, nu), lv = split(wv, nv), angle = dot(wu, wv);
    length_stiffness(nu, lu, 1.0, hu);
    length_stiffness(nv, lv, 1.0, hv);
    for (int i = 0; i < 3; i++)
        for (int k = 0; k < 3; k++) {
            slope[i][k] = m->grad_u[i] * wv[k] + m->grad_v[i] * wu[k];
            h->force[m->vertex[i]][k] -=
                m->area * (m->stretch * (m->grad_u[i] * (lu - 1.0) * nu[k] + m->grad_v[i] * (lv - 1.0) * nv[k]) +
                           m->shear * angle * slope[i][k]);
        }
    for (int i = 0; i < 3; i++)
        for (int j = i; j < 3; j++) {
            double block[9];
            double su = scale * m->area * m->stretch * m->grad_u[i] * m->grad_u[j];
            double sv = scale * m->area * m->stretch * m->grad_v[i] * m->grad_v[j];
            for (int k = 0; k < 9; k++)
                block[k] = su * hu[k] + sv * hv[k];
            add_outer(block, scale * m->area * m->shear, slope[i], slope[j]);
            if (i == j)
                for (int k = 0; k < 9; k++)
                    h->matrix.diagonal[m->vertex[i]][k] += block[k];
            else
                add_couple(&h->matrix, m->slot[j - i == 1 ? i : 2], m->vertex[i], m->vertex[j], block);
        }
}

static void add_spring(host *h, const host_spring *s, double scale)
{
    const double *a = h->position[s->vertex[0]], *b = h->position[s->vertex[1]];
    double w[3] = {b[0] - a[0], b[1] - a[1], b[2] - a[2]}, n[3], block[9];
    double length = split(w, n), pull = s->stiffness * (length - s->length);
    length_stiffness(n, length, s->length, block);
    for (int k = 0; k < 3; k++) {
        h->force[s->vertex[0]][k] += pull * n[k];
        h->force[s->vertex[1]][k] -= pull * n[k];
    }
    for (int k = 0; k < 9; k++) {
        block[k] *= scale * s->stiffness;
        h->matrix.diagonal[s->vertex[0]][k] += block[k];
        h->matrix.diagonal[s->vertex[1]][k] += block[k];
        block[k] = -block[k];
    }
    add_couple(&h->matrix, s->slot, s->vertex[0], s->vertex[1], block);
}

/* Quadratic drag of a triangle, along its normal: 1/2 rho c A |v_n| v_n with v_n taken per corner and |v_n| of the
 * triangle's mean frozen for the step, so that the drag is linear in the velocities and solved implicitly. */
static void add_cloth_drag(host *h, const host_membrane *m, double h_step)
{
    const double *p[3];
    double mean[3] = {0, 0, 0}, e[3], f[3], n[3];
    for (int i = 0; i < 3; i++) {
        p[i] = h->position[m->vertex[i]];
        for (int k = 0; k < 3; k++)
            mean[k] += (h->air.velocity[k] - h->velocity[m->vertex[i]][k]) / 3.0;
    }
    for (int k = 0; k < 3; k++) {
        e[k] = p[1][k] - p[0][k];
        f[k] = p[2][k] - p[0][k];
    }
    const double normal[3] = {e[1] * f[2] - e[2] * f[1], e[2] * f[0] - e[0] * f[2], e[0] * f[1] - e[1] * f[0]};
    double area = 0.5 * split(normal, n);
    double rate = 0.5 * h->air.density * h->air.cloth_drag * area * fabs(dot(mean, n)) / 3.0;
    double wind = rate * dot(h->air.velocity, n);
    for (int i = 0; i < 3; i++) {
        for (int k = 0; k < 3; k++)
            h->force[m->vertex[i]][k] += wind * n[k];
        add_outer(h->matrix.diagonal[m->vertex[i]], h_step * rate, n, n);
    }
}

/* Drag of a segment as a cylinder across the flow, frozen and solved in the same way. */
static void add_strand_drag(host *h, const host_spring *s, double h_step)
{
    const double *a = h->position[s->vertex[0]], *b = h->position[s->vertex[1]];
    double w[3] = {b[0] - a[0], b[1] - a[1], b[2] - a[2]}, n[3], flow[3], across[9] = {1, 0, 0, 0, 1, 0, 0, 0, 1};
    double length = split(w, n);
    for (int k = 0; k < 3; k++)
        flow[k] = h->air.velocity[k] - 0.5 * (h->velocity[s->vertex[0]][k] + h->velocity[s->vertex[1]][k]);
    double along = dot(flow, n), square = dot(flow, flow) - along * along;
    double rate = 0.25 * h->air.density * h->air.strand_drag * s->diameter * length * sqrt(square > 0 ? square : 0);
    double drift = dot(h->air.velocity, n);
    add_outer(across, -1.0, n, n);
    for (int i = 0; i < 2; i++)
        for (int k = 0; k < 3; k++) {
            h->force[s->vertex[i]][k] += rate * (h->air.velocity[k] - drift * n[k]);
            for (int c = 0; c < 3; c++)
                h->matrix.diagonal[s->vertex[i]][3 * k + c] += h_step * rate * across[3 * k + c];
        }
}

/* Beyond the distance at which the hand would pull with more than force_max, it softens so that it pulls with
 * force_max. It stays a spring within the step: a constant force on so light a vertex would overshoot. */
static void add_pull(host *h, const host_pull *pull, double scale)
{
    double w[3], n[3], stiffness = pull->stiffness;
    for (int k = 0; k < 3; k++)
        w[k] = pull->target[k] - h->position[pull->vertex][k];
    double length = split(w, n);
    if (stiffness * length > pull->force_max)
        stiffness = pull->force_max / length;
    for (int k = 0; k < 3; k++) {
        h->force[pull->vertex][k] += stiffness * w[k];
        h->matrix.diagonal[pull->vertex][4 * k] += scale * stiffness;
    }
}

void host_assemble(host *h, double h_step)
{
    double scale = h_step * h_step + h_step * h->damping; /* S holds (h^2 + h damping) K */
    host_multiply_scalars(&h->bending, (const double (*)[3])h->position, h->force);
    memset(h->matrix.block, 0, h->matrix.pattern.first[h->soft_count] * sizeof *h->matrix.block);
    memset(h->matrix.diagonal, 0, h->soft_count * sizeof *h->matrix.diagonal);
    for (size_t i = 0; i < h->soft_count; i++)
        for (int k = 0; k < 3; k++) {
            h->force[i][k] = h->own_mass[i] * h->gravity[k] - h->force[i][k];
            h->matrix.diagonal[i][4 * k] = h->own_mass[i];
        }
    for (size_t m = 0; m < h->membrane_count; m++) {
        add_membrane(h, &h->membranes[m], scale);
        add_cloth_drag(h, &h->membranes[m], h_step);
    }
    for (size_t s = 0; s < h->spring_count; s++) {
        add_spring(h, &h->springs[s], scale);
        add_strand_drag(h, &h->springs[s], h_step);
    }
    for (size_t p = 0; p < h->pull_count; p++)
        add_pull(h, &h->pulls[p], scale);
}

/* First guess of the new velocities, and which of their components are given: all of a driven vertex, one of a
 * supported vertex. The guess of free fall makes a step without deformation exact before the first iteration. */
static void guess(host *h, double h_step)
{
    for (size_t i = 0; i < h->soft_count; i++) {
        host_support *support = &h->support[i];
        host_filter *filter = &h->solver.filter[i];
        filter->count = h->driven[i] ? 3 : support->active;
        for (int k = 0; k < 3; k++) {
            h->proposed_velocity[i][k] = h->velocity[i][k] + h_step * h->gravity[k];
            filter->along[k] = support->normal[k];
        }
        if (filter->count == 1) {
            double lacking = support->speed - dot(h->proposed_velocity[i], support->normal);
            for (int k = 0; k < 3; k++)
                h->proposed_velocity[i][k] += lacking * support->normal[k];
        }
    }
    for (size_t i = 0; i < h->vertex_count; i++)
        for (int k = 0; h->driven[i] && k < 3; k++)
            h->proposed_velocity[i][k] = (h->target[i][k] - h->position[i][k]) / h_step;
}

/* A coupling is as strong as the vertices it joins are hard to move in an implicit step: the effective mass of the contact,
 * 1 / sum(w^2 / m), with each mass replaced by the diagonal of M + S along the normal. */
static void set_strengths(host *h, double scale)
{
    for (size_t c = 0; c < h->coupling_count; c++) {
        host_coupling *k = &h->couplings[c];
        double sum = 0;
        for (int i = 0; i < 4; i++) {
            const double *d = h->matrix.diagonal[k->vertex[i]], *n = k->normal;
            double own = scale * h->bending.diagonal[k->vertex[i]];
            for (int r = 0; r < 3; r++)
                own += n[r] * (d[3 * r] * n[0] + d[3 * r + 1] * n[1] + d[3 * r + 2] * n[2]);
            sum += k->weight[i] * k->weight[i] / own;
        }
        k->strength = COUPLING / sum;
    }
}

void host_propose(host *h, double h_step)
{
    host_assemble(h, h_step);
    for (size_t i = 0; i < h->soft_count; i++)
        for (int k = 0; k < 3; k++)
            h->force[i][k] = h->own_mass[i] * h->velocity[i][k] + h_step * h->force[i][k];
    guess(h, h_step);
    host_system system = {&h->matrix, &h->bending, h_step * h_step + h_step * h->damping, h->couplings,
                          h->coupling_count};
    set_strengths(h, system.scale);
    h->solver_used = host_solve(&h->solver, &system, (const double (*)[3])h->force, h->solver_tolerance,
                                h->solver_limit, h->proposed_velocity);
    for (size_t i = 0; i < h->soft_count; i++) /* what is left along the normal is what the body must bear */
        h->support[i].pulls = h->support[i].active && dot(h->solver.residual[i], h->support[i].normal) > 0;
    for (size_t i = 0; i < h->vertex_count; i++)
        for (int k = 0; k < 3; k++)
            h->proposed[i][k] =
                h->driven[i] ? h->target[i][k] : h->position[i][k] + h_step * h->proposed_velocity[i][k];
}

int host_add_coupling(host *h, const host_coupling *coupling)
{
    if (h->coupling_count == h->coupling_room) {
        size_t room = 2 * h->coupling_room + 256;
        host_coupling *moved = realloc(h->couplings, room * sizeof *moved);
        if (!moved)
            return 0;
        h->couplings = moved;
        h->coupling_room = room;
    }
    h->couplings[h->coupling_count++] = *coupling;
    return 1;
}

void host_clear_contacts(host *h)
{
    h->coupling_count = 0;
    for (size_t i = 0; i < h->vertex_count; i++)
        h->support[i].active = 0;
}

void host_accept(host *h, double h_step, const double (*delivered)[3], const double *impulses, const uint8_t *moved)
{
    for (size_t i = 0; i < h->vertex_count; i++) {
        const double *impulse = impulses ? impulses + 3 * i : NULL;
        int pushed = impulse && (impulse[0] != 0 || impulse[1] != 0 || impulse[2] != 0);
        for (int k = 0; k < 3; k++) {
            if (!h->driven[i] && pushed)
                h->velocity[i][k] = h->proposed_velocity[i][k] + impulse[k] / h->mass[i];
            else if (!h->driven[i] && moved && moved[i])
                h->velocity[i][k] = (delivered[i][k] - h->position[i][k]) / h_step;
            else
                h->velocity[i][k] = h->proposed_velocity[i][k];
            h->position[i][k] = delivered[i][k];
        }
    }
}

double host_kinetic_energy(const host *h)
{
    double sum = 0;
    for (size_t i = 0; i < h->soft_count; i++)
        if (!h->driven[i])
            sum += 0.5 * h->mass[i] * dot(h->velocity[i], h->velocity[i]);
    return sum;
}

double host_elastic_energy(const host *h)
{
    double sum = 0;
    for (size_t t = 0; t < h->membrane_count; t++) {
        const host_membrane *m = &h->membranes[t];
        double wu[3] = {0, 0, 0}, wv[3] = {0, 0, 0};
        for (int i = 0; i < 3; i++)
            for (int k = 0; k < 3; k++) {
                wu[k] += m->grad_u[i] * h->position[m->vertex[i]][k];
                wv[k] += m->grad_v[i] * h->position[m->vertex[i]][k];
            }
        double u = sqrt(dot(wu, wu)) - 1.0, v = sqrt(dot(wv, wv)) - 1.0, angle = dot(wu, wv);
        sum += 0.5 * m->area * (m->stretch * (u * u + v * v) + m->shear * angle * angle);
    }
    for (size_t i = 0; i < h->spring_count; i++) {
        const host_spring *s = &h->springs[i];
        double w[3];
        for (int k = 0; k < 3; k++)
            w[k] = h->position[s->vertex[1]][k] - h->position[s->vertex[0]][k];
        double change = sqrt(dot(w, w)) - s->length;
        sum += 0.5 * s->stiffness * change * change;
    }
    for (size_t i = 0; i < h->bend_count; i++) {
        double curl[3] = {0, 0, 0};
        for (uint32_t j = 0; j < h->bends[i].count; j++)
            for (int k = 0; k < 3; k++)
                curl[k] += h->bends[i].weight[j] * h->position[h->bends[i].vertex[j]][k];
        sum += 0.5 * h->bends[i].stiffness * dot(curl, curl);
    }
    return sum;
}
