/* couple.c: plugging raddle in behind an integrator. */
#include "couple.h"

#include <math.h>
#include <string.h>

void host_describe(const host *h, rdl_part parts[], rdl_scene *scene)
{
    for (size_t p = 0; p < h->part_count; p++) {
        parts[p].name = h->parts[p].name;
        parts[p].kind = h->parts[p].kind;
        parts[p].half_thickness = h->parts[p].half_thickness;
        parts[p].friction = h->parts[p].friction;
    }
    memset(scene, 0, sizeof *scene);
    scene->size = sizeof *scene;
    scene->part_count = h->part_count;
    scene->parts = parts;
    scene->vertex_count = h->vertex_count;
    scene->vertex_part = h->vertex_part;
    scene->mass = h->mass;
    scene->segment_count = h->segment_count;
    scene->segments = (const uint32_t (*)[2])h->segments;
    scene->triangle_count = h->triangle_count;
    scene->triangles = (const uint32_t (*)[3])h->triangles;
    scene->attachment_count = h->join_count;
    scene->attachments = (const uint32_t (*)[2])h->joins;
}

rdl_status host_resolve(const host *h, rdl_engine *engine, double h_step, double (*delivered)[3], rdl_report *report,
                        rdl_fault *fault)
{
    rdl_step step = {.size = sizeof step, .duration = h_step, .mass = h->mass};
    step.start = (rdl_view){h->position, 0, RDL_FLOAT64};
    step.proposed = (rdl_view){h->proposed, 0, RDL_FLOAT64};
    step.delivered = (rdl_output_view){delivered, 0, RDL_FLOAT64};
    report->size = sizeof *report;
    return rdl_engine_step(engine, &step, report, fault);
}

/* Velocity of the driven side of a contact at the place of contact; 0 when neither side is driven as a whole. */
static int driven_side(const host *h, const rdl_contact *contact, double velocity[3])
{
    double share = 0, sum[3] = {0, 0, 0};
    for (int i = 0; i < 4; i++) {
        uint32_t v = contact->vertices[i];
        if (!h->driven[v])
            continue;
        share += contact->weights[i];
        for (int k = 0; k < 3; k++)
            sum[k] += contact->weights[i] * h->velocity[v][k];
    }
    if (share * share < 0.99) /* the weights of one side add up to 1 or -1 */
        return 0;
    for (int k = 0; k < 3; k++)
        velocity[k] = sum[k] / share;
    return 1;
}

/* Several contacts of one vertex: their normals are added up, weighed by impulse, and their speeds too. */
static void add_support(host *h, const rdl_contact *contact, const double velocity[3])
{
    double speed = 0;
    for (int k = 0; k < 3; k++)
        speed += velocity[k] * contact->normal[k];
    for (int i = 0; i < 4; i++) {
        double weight = contact->weights[i];
        host_support *support = &h->support[contact->vertices[i]];
        if (h->driven[contact->vertices[i]] || weight * weight < 0.09 || support->pulls)
            continue; /* corners far from the place of contact are left free */
        if (!support->active) {
            support->active = 1;
            support->normal[0] = support->normal[1] = support->normal[2] = support->speed = 0;
        }
        for (int k = 0; k < 3; k++)
            support->normal[k] += contact->impulse * weight * contact->normal[k];
        support->speed += contact->impulse * weight * speed;
    }
}

/* Neither side is driven, not even in part. */
static int is_soft(const host *h, const rdl_contact *contact)
{
    for (int i = 0; i < 4; i++)
        if (h->driven[contact->vertices[i]])
            return 0;
    return 1;
}

static void normalize_supports(host *h, double approach)
{
    for (size_t i = 0; i < h->soft_count; i++) {
        host_support *support = &h->support[i];
        const double *n = support->normal;
        double length = sqrt(n[0] * n[0] + n[1] * n[1] + n[2] * n[2]);
        if (!support->active)
            continue;
        if (!(length > 0)) { /* pushed equally from both sides */
            support->active = 0;
            continue;
        }
        for (int k = 0; k < 3; k++)
            support->normal[k] /= length;
        support->speed = support->speed / length - approach;
    }
}

int host_learn(host *h, const rdl_report *report, double approach)
{
    host_clear_contacts(h);
    for (size_t c = 0; c < report->contact_count; c++) {
        const rdl_contact *contact = &report->contacts[c];
        double velocity[3];
        if (!(contact->impulse > 0))
            continue;
        if (is_soft(h, contact)) {
            host_coupling coupling = {.strength = 0};
            memcpy(coupling.vertex, contact->vertices, sizeof coupling.vertex);
            memcpy(coupling.weight, contact->weights, sizeof coupling.weight);
            memcpy(coupling.normal, contact->normal, sizeof coupling.normal);
            if (!host_add_coupling(h, &coupling))
                return 0;
        } else if (driven_side(h, contact, velocity)) {
            add_support(h, contact, velocity);
        }
    }
    normalize_supports(h, approach);
    return 1;
}
