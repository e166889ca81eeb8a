/* The host's integrator against closed forms. */
#include <check.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "host/host.h"

#include <raddle/scene.h>

#define GRAVITY 9.81

static const host_fabric FABRIC = {.mass_per_area = 0.25, .stretch = 400, .shear = 40, .bending = 1e-5,
                                   .half_thickness = 7.5e-4, .friction = 0.3};
static const host_yarn YARN = {.mass_per_length = 4.5e-4, .stretch = 1.0, .bending = 2e-9, .radius = 6e-4,
                               .friction = 0.3};

enum { SIDE = 9 };

/* A square of SIDE x SIDE points, 1 cm apart, lying flat at height z. */
static void add_square(host *h, double z, size_t *first)
{
    double pattern[SIDE * SIDE][2], position[SIDE * SIDE][3];
    uint32_t triangles[2 * (SIDE - 1) * (SIDE - 1)][3];
    size_t count = 0;
    for (uint32_t j = 0; j < SIDE; j++)
        for (uint32_t i = 0; i < SIDE; i++) {
            uint32_t v = j * SIDE + i;
            pattern[v][0] = position[v][0] = 0.01 * i;
            pattern[v][1] = position[v][1] = 0.01 * j;
            position[v][2] = z;
            if (i + 1 < SIDE && j + 1 < SIDE) {
                const uint32_t two[2][3] = {{v, v + 1, v + SIDE + 1}, {v, v + SIDE + 1, v + SIDE}};
                memcpy(triangles[count], two, sizeof two);
                count += 2;
            }
        }
    ck_assert_int_eq(host_add_cloth(h, "square", &FABRIC, SIDE * SIDE, (const double (*)[2])pattern,
                                    (const double (*)[3])position, count, (const uint32_t (*)[3])triangles, first), 1);
}

/* One strand of `points` points hanging down from height 1 m, 1 cm apart. */
static void add_strand(host *h, size_t points, size_t *first)
{
    double position[64][3] = {{0}};
    ck_assert_uint_le(points, 64);
    for (size_t p = 0; p < points; p++) {
        position[p][0] = 0.3;
        position[p][2] = 1.0 - 0.01 * (double)p;
    }
    ck_assert_int_eq(host_add_strands(h, "strand", &YARN, 1, points, (const double (*)[3])position, first), 1);
}

static host *make_host(int with_air)
{
    host *h = host_create();
    ck_assert_ptr_nonnull(h);
    if (!with_air)
        h->air.density = 0;
    h->solver_tolerance = 1e-12;
    h->solver_limit = 5000;
    return h;
}

static void step_alone(host *h, double h_step)
{
    host_propose(h, h_step);
    host_accept(h, h_step, (const double (*)[3])h->proposed, NULL, NULL);
}

/* Euler's rule adds h g to the velocity first: after n steps z has fallen by g h^2 n (n + 1) / 2, exactly. */
START_TEST(free_fall_follows_its_closed_form)
{
    const double h_step = 1.0 / 96;
    const int steps = 50;
    host *h = make_host(0);
    add_square(h, 2.0, NULL);
    add_strand(h, 20, NULL);
    ck_assert_int_eq(host_finish(h), 1);
    double (*start)[3] = malloc(h->vertex_count * sizeof *start);
    ck_assert_ptr_nonnull(start);
    memcpy(start, h->position, h->vertex_count * sizeof *start);
    for (int k = 0; k < steps; k++)
        step_alone(h, h_step);
    double fall = GRAVITY * h_step * h_step * steps * (steps + 1) / 2;
    for (size_t i = 0; i < h->vertex_count; i++) {
        ck_assert_double_eq_tol(h->position[i][0], start[i][0], 1e-10);
        ck_assert_double_eq_tol(h->position[i][1], start[i][1], 1e-10);
        ck_assert_double_eq_tol(start[i][2] - h->position[i][2], fall, 1e-10);
        ck_assert_double_eq_tol(h->velocity[i][2], -GRAVITY * h_step * steps, 1e-9);
    }
    free(start);
    host_destroy(h);
}
END_TEST

/* Segment s of a hanging strand carries all the weight below it: extension = weight / stiffness. */
START_TEST(hanging_strand_stretches_by_the_weight_below)
{
    const size_t points = 12;
    size_t first;
    host *h = make_host(1);
    add_strand(h, points, &first);
    ck_assert_int_eq(host_finish(h), 1);
    host_drive(h, (uint32_t)first);
    for (int k = 0; k < 1500; k++)
        step_alone(h, 1.0 / 96);
    double weight = 0;
    for (size_t s = points - 1; s > 0; s--) {
        const double *a = h->position[first + s - 1], *b = h->position[first + s];
        weight += h->own_mass[first + s] * GRAVITY;
        double extension = a[2] - b[2] - 0.01;
        ck_assert_double_eq_tol(extension, weight / (YARN.stretch / 0.01), 1e-4 * extension + 1e-12);
    }
    host_destroy(h);
}
END_TEST

/* A square of fabric held along one border, with no shear or bending to speak of: strain = weight below per width /
 * stretch, summed over the rows of squares. */
START_TEST(hanging_cloth_stretches_by_the_weight_below)
{
    size_t first;
    host *h = make_host(1);
    add_square(h, 1.0, &first);
    ck_assert_int_eq(host_finish(h), 1);
    for (size_t i = 0; i < h->vertex_count; i++) { /* stand it up: y becomes -z */
        h->position[first + i][2] = 1.0 - h->position[first + i][1];
        h->position[first + i][1] = 0;
    }
    for (uint32_t i = 0; i < SIDE; i++)
        host_drive(h, (uint32_t)first + i);
    for (int k = 0; k < 2000; k++)
        step_alone(h, 1.0 / 96);
    double expected = 0, width = 0.01 * (SIDE - 1);
    for (int row = 0; row + 1 < SIDE; row++) { /* weight below the middle of this row of squares, lumped at its foot */
        double below = 0.25 * GRAVITY * 0.01 * (SIDE - 1 - row - 0.5);
        expected += 0.01 * below / FABRIC.stretch;
    }
    double mean = 0;
    for (size_t i = 0; i < SIDE; i++)
        mean += (1.0 - h->position[first + SIDE * (SIDE - 1) + i][2] - width) / SIDE;
    ck_assert_double_eq_tol(mean, expected, 0.01 * expected);
    ck_assert_double_lt(sqrt(2 * host_kinetic_energy(h)), 1e-6);
    host_destroy(h);
}
END_TEST

/* Random velocities, up to `speed` along each axis. */
static void shake(host *h, unsigned seed, double speed)
{
    for (size_t i = 0; i < h->soft_count; i++)
        for (int k = 0; k < 3; k++) {
            seed = seed * 1664525u + 1013904223u;
            h->velocity[i][k] = speed * (2e-9 * (double)(seed % 1000000000u) - 1.0);
        }
}

START_TEST(momentum_stays_without_outer_forces)
{
    host *h = make_host(0);
    double before[3] = {0, 0, 0}, after[3] = {0, 0, 0}, scale = 0;
    h->gravity[2] = 0;
    add_square(h, 1.0, NULL);
    add_strand(h, 20, NULL);
    ck_assert_int_eq(host_join(h, 4, SIDE * SIDE, 50.0), 1);
    ck_assert_int_eq(host_finish(h), 1);
    shake(h, 7, 0.3);
    for (size_t i = 0; i < h->soft_count; i++)
        for (int k = 0; k < 3; k++) {
            before[k] += h->mass[i] * h->velocity[i][k];
            scale += h->mass[i] * fabs(h->velocity[i][k]);
        }
    for (int s = 0; s < 30; s++)
        step_alone(h, 1.0 / 96);
    ck_assert_double_gt(host_elastic_energy(h), 0);
    for (size_t i = 0; i < h->soft_count; i++)
        for (int k = 0; k < 3; k++)
            after[k] += h->mass[i] * h->velocity[i][k];
    for (int k = 0; k < 3; k++)
        ck_assert_double_eq_tol(after[k], before[k], 1e-8 * scale);
    host_destroy(h);
}
END_TEST

START_TEST(energy_decays_without_outer_forces)
{
    host *h = make_host(1);
    h->gravity[2] = 0;
    add_square(h, 1.0, NULL);
    add_strand(h, 20, NULL);
    ck_assert_int_eq(host_finish(h), 1);
    shake(h, 11, 0.02);
    double start = host_kinetic_energy(h), last = start;
    for (int s = 0; s < 60; s++) {
        step_alone(h, 1.0 / 96);
        double now = host_kinetic_energy(h) + host_elastic_energy(h);
        ck_assert_double_lt(now, last);
        last = now;
    }
    ck_assert_double_lt(last, 0.5 * start);
    host_destroy(h);
}
END_TEST

/* In a wind without gravity everything ends up drifting with the wind. */
START_TEST(wind_carries_along)
{
    host *h = make_host(1);
    h->gravity[2] = 0;
    h->air.velocity[2] = 2.0;
    add_square(h, 1.0, NULL);
    ck_assert_int_eq(host_finish(h), 1);
    for (int s = 0; s < 960; s++)
        step_alone(h, 1.0 / 96);
    for (size_t i = 0; i < h->soft_count; i++) {
        ck_assert_double_lt(h->velocity[i][2], 2.0);
        ck_assert_double_gt(h->velocity[i][2], 1.9);
    }
    host_destroy(h);
}
END_TEST

START_TEST(driven_vertices_go_exactly_where_told)
{
    static const double ball[4][3] = {{0.1, 0.2, 0.3}, {0.4, 0.2, 0.3}, {0.1, 0.5, 0.3}, {0.1, 0.2, 0.7}};
    static const uint32_t faces[4][3] = {{0, 2, 1}, {0, 1, 3}, {1, 2, 3}, {2, 0, 3}};
    size_t body;
    host *h = make_host(1);
    add_square(h, 1.0, NULL);
    ck_assert_int_eq(host_add_body(h, "body", 0, 0, 4, ball, 4, faces, &body), 1);
    ck_assert_int_eq(host_add_cloth(h, "late", &FABRIC, 3, NULL, NULL, 0, NULL, NULL), 0);
    ck_assert_int_eq(host_finish(h), 1);
    host_drive(h, 3);
    ck_assert(isinf(h->mass[3]) && isinf(h->mass[body]));
    for (int s = 0; s < 20; s++) {
        h->target[3][0] += 0.013;
        h->target[3][2] -= 0.0071;
        for (int k = 0; k < 4; k++)
            h->target[body + (size_t)k][1] += 0.0037;
        step_alone(h, 1.0 / 96);
        ck_assert_mem_eq(h->position[3], h->target[3], sizeof h->target[3]);
        ck_assert_mem_eq(h->position[body], h->target[body], 4 * sizeof h->target[0]);
        ck_assert_double_eq_tol(h->velocity[3][0], 0.013 * 96, 1e-12);
    }
    host_release(h, 3);
    host_release(h, (uint32_t)body);
    ck_assert(h->mass[3] > 0 && isfinite(h->mass[3]) && !h->driven[3]);
    ck_assert(isinf(h->mass[body]) && h->driven[body]);
    step_alone(h, 1.0 / 96);
    ck_assert_double_gt(fabs(h->position[3][2] - h->target[3][2]), 1e-6);
    host_destroy(h);
}
END_TEST

/* A hand pulls no harder than it says: a single point of cloth weight hangs still only below force_max. */
START_TEST(hands_have_limited_force)
{
    size_t first;
    host *h = make_host(1);
    add_strand(h, 2, &first);
    double weight = (h->own_mass[first] + h->own_mass[first + 1]) * GRAVITY;
    ck_assert_int_eq(host_add_pull(h, (uint32_t)first, 100.0, 0.5 * weight), 1);
    ck_assert_int_eq(host_finish(h), 1);
    h->air.density = 0;
    const double h_step = 1.0 / 96;
    for (int s = 0; s < 200; s++)
        step_alone(h, h_step);
    /* about half the weight is missing; a hand that gives way is somewhat stronger (implicit step) */
    ck_assert_double_lt(h->velocity[first + 1][2], -0.4 * GRAVITY * 200 * h_step);
    h->pulls[0].force_max = 10 * weight;
    for (int s = 0; s < 4000; s++)
        step_alone(h, h_step);
    ck_assert_double_eq_tol(h->pulls[0].target[2] - h->position[first][2], weight / 100.0, 1e-3 * weight / 100.0);
    host_destroy(h);
}
END_TEST

/* After a contact, velocity = proposed + impulse / mass; moved without an impulse: what the positions say. */
START_TEST(accept_takes_impulses_and_positions)
{
    const double h_step = 1.0 / 96;
    host *h = make_host(0);
    add_square(h, 1.0, NULL);
    ck_assert_int_eq(host_finish(h), 1);
    step_alone(h, h_step);
    host_propose(h, h_step);
    size_t n = h->vertex_count;
    double (*delivered)[3] = malloc(n * sizeof *delivered), *impulses = calloc(3 * n, sizeof *impulses);
    uint8_t *moved = calloc(n, 1);
    ck_assert(delivered && impulses && moved);
    memcpy(delivered, h->proposed, n * sizeof *delivered);
    moved[5] = moved[6] = 1;
    delivered[5][2] += 1e-3;
    impulses[3 * 5 + 2] = 2e-6;
    memcpy(delivered[6], h->position[6], sizeof delivered[6]); /* held */
    double pushed = h->proposed_velocity[5][2] + 2e-6 / h->mass[5], free_one = h->proposed_velocity[7][2];
    host_accept(h, h_step, (const double (*)[3])delivered, impulses, moved);
    ck_assert_double_eq(h->velocity[5][2], pushed);
    ck_assert_double_eq(h->velocity[6][2], 0.0);
    ck_assert_double_eq(h->velocity[7][2], free_one);
    ck_assert_mem_eq(h->position, delivered, n * sizeof *delivered);
    free(delivered);
    free(impulses);
    free(moved);
    host_destroy(h);
}
END_TEST

/* A square on a frictionless incline of supports slides down it by g sin(angle), keeps exactly to the given speed across
 * it, is borne, and where it is pulled off it says so. */
START_TEST(supports_bear_and_let_go)
{
    size_t first;
    const double h_step = 1.0 / 96, slope[3] = {0.6, 0.0, 0.8};
    host *h = make_host(0);
    add_square(h, 1.0, &first);
    ck_assert_int_eq(host_finish(h), 1);
    for (size_t i = 0; i < h->vertex_count; i++) {
        h->support[i] = (host_support){{0, 0, 0}, -0.02, 1, 0};
        memcpy(h->support[i].normal, slope, sizeof slope);
    }
    host_propose(h, h_step);
    for (size_t i = 0; i < h->vertex_count; i++) {
        const double *v = h->proposed_velocity[i], *n = h->support[i].normal;
        ck_assert_double_eq_tol(v[0] * n[0] + v[1] * n[1] + v[2] * n[2], -0.02, 1e-12);
        ck_assert_double_eq_tol(0.8 * v[0] - 0.6 * v[2], 0.6 * 9.81 * h_step, 1e-10);
        ck_assert(!h->support[i].pulls);
    }
    h->gravity[2] = 9.81;
    host_propose(h, h_step);
    for (size_t i = 0; i < h->vertex_count; i++)
        ck_assert(h->support[i].pulls);
    host_clear_contacts(h);
    h->gravity[2] = -9.81;
    host_propose(h, h_step);
    for (size_t i = 0; i < h->vertex_count; i++)
        ck_assert_double_eq_tol(h->proposed_velocity[i][2], -9.81 * h_step, 1e-10);
    host_destroy(h);
}
END_TEST

/* Two free strands of two points, one falling on the other, coupled middle to middle with four times their effective mass:
 * the approach shrinks to a fifth, and the momentum stays. */
START_TEST(couplings_pass_the_push_on)
{
    const double h_step = 1.0 / 96, place[4][3] = {{-0.01, 0, 0}, {0.01, 0, 0}, {0, -0.01, 0.002}, {0, 0.01, 0.002}};
    const host_coupling coupling = {{0, 1, 2, 3}, {0.5, 0.5, -0.5, -0.5}, {0, 0, 1}, 0};
    host *h = make_host(0);
    h->gravity[2] = 0;
    ck_assert_int_eq(host_add_strands(h, "pair", &YARN, 2, 2, place, NULL), 1);
    ck_assert_int_eq(host_finish(h), 1);
    ck_assert_int_eq(host_add_coupling(h, &coupling), 1);
    h->velocity[2][2] = h->velocity[3][2] = -1.0;
    host_propose(h, h_step);
    for (int i = 0; i < 2; i++) {
        ck_assert_double_eq_tol(h->proposed_velocity[i][2], -0.4, 1e-10);
        ck_assert_double_eq_tol(h->proposed_velocity[2 + i][2], -0.6, 1e-10);
    }
    host_clear_contacts(h);
    host_propose(h, h_step);
    ck_assert_double_eq_tol(h->proposed_velocity[0][2], 0, 1e-10);
    host_destroy(h);
}
END_TEST

START_TEST(two_runs_give_the_same_bits)
{
    double last[SIDE * SIDE + 20][3];
    for (int run = 0; run < 2; run++) {
        host *h = host_create();
        ck_assert_ptr_nonnull(h);
        add_square(h, 1.0, NULL);
        add_strand(h, 20, NULL);
        ck_assert_int_eq(host_join(h, 4, SIDE * SIDE, 50.0), 1);
        ck_assert_int_eq(host_finish(h), 1);
        shake(h, 3, 0.3);
        for (int s = 0; s < 40; s++)
            step_alone(h, 1.0 / 96);
        if (run)
            ck_assert_mem_eq(h->position, last, sizeof last);
        memcpy(last, h->position, sizeof last);
        host_destroy(h);
    }
}
END_TEST

/* Bent over a cylinder whose axis is y, only the hinges along y turn, each by a / R: the hinge model then holds three
 * times the plate's 1/2 B a^2 / R^2 per square of side a (the factor is a property of this regular mesh). */
START_TEST(bending_energy_is_that_of_a_cylinder)
{
    size_t first;
    const double radius = 0.5;
    host *h = make_host(0);
    add_square(h, 0.0, &first);
    ck_assert_int_eq(host_finish(h), 1);
    for (size_t i = 0; i < SIDE * SIDE; i++) {
        double along = h->position[first + i][0];
        h->position[first + i][0] = radius * sin(along / radius);
        h->position[first + i][2] = radius * cos(along / radius);
    }
    double all = host_elastic_energy(h);
    for (size_t b = 0; b < h->bend_count; b++)
        h->bends[b].stiffness = 0;
    double stretched = host_elastic_energy(h);
    double squares = (SIDE - 2) * (SIDE - 1), expected = squares * 1.5 * FABRIC.bending * 1e-4 / (radius * radius);
    ck_assert_double_eq_tol(all - stretched, expected, 1e-3 * expected);
    host_destroy(h);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("host");
    TCase *group = tcase_create("integrator");
    tcase_set_timeout(group, 60);
    tcase_add_test(group, free_fall_follows_its_closed_form);
    tcase_add_test(group, hanging_strand_stretches_by_the_weight_below);
    tcase_add_test(group, hanging_cloth_stretches_by_the_weight_below);
    tcase_add_test(group, momentum_stays_without_outer_forces);
    tcase_add_test(group, energy_decays_without_outer_forces);
    tcase_add_test(group, wind_carries_along);
    tcase_add_test(group, driven_vertices_go_exactly_where_told);
    tcase_add_test(group, hands_have_limited_force);
    tcase_add_test(group, accept_takes_impulses_and_positions);
    tcase_add_test(group, supports_bear_and_let_go);
    tcase_add_test(group, couplings_pass_the_push_on);
    tcase_add_test(group, two_runs_give_the_same_bits);
    tcase_add_test(group, bending_energy_is_that_of_a_cylinder);
    suite_add_tcase(suite, group);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_ENV);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed ? EXIT_FAILURE : EXIT_SUCCESS;
}
