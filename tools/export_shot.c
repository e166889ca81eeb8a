/* export_shot.c: `raddle export --scrambled`: a shot that can leave the house: moved by a random rigid motion, parts renamed,
 * without what only the engine understands. */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "export.h"

typedef struct rigid {
    double turn[3][3], middle[3], shift[3];
} rigid;

static double noise(uint64_t *state) /* splitmix64 (Steele, Lea & Flood 2014), to [-1, 1) */
{
    uint64_t z = *state += 0x9e3779b97f4a7c15u;
    z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9u;
    z = (z ^ (z >> 27)) * 0x94d049bb133111ebu;
    z ^= z >> 31;
    return (double)(z >> 11) * 0x1p-52 - 1;
}

/* A rotation from a random quaternion, about the middle of the first state, and a shift by a few sizes of it. */
static rigid make_motion(uint64_t seed, const double *x, size_t vertices)
{
    double q[4], square, lo[3], hi[3], size = 0;
    rigid m;
    do {
        square = 0;
        for (int k = 0; k < 4; k++) {
            q[k] = noise(&seed);
            square += q[k] * q[k];
        }
    } while (square > 1 || square < 1e-3);
    for (int k = 0; k < 4; k++)
        q[k] /= sqrt(square);
    const double turn[3][3] = {
        {1 - 2 * (q[2] * q[2] + q[3] * q[3]), 2 * (q[1] * q[2] - q[0] * q[3]), 2 * (q[1] * q[3] + q[0] * q[2])},
        {2 * (q[1] * q[2] + q[0] * q[3]), 1 - 2 * (q[1] * q[1] + q[3] * q[3]), 2 * (q[2] * q[3] - q[0] * q[1])},
        {2 * (q[1] * q[3] - q[0] * q[2]), 2 * (q[2] * q[3] + q[0] * q[1]), 1 - 2 * (q[1] * q[1] + q[2] * q[2])}};
    memcpy(m.turn, turn, sizeof turn);
    for (int k = 0; k < 3; k++) {
        lo[k] = HUGE_VAL;
        hi[k] = -HUGE_VAL;
    }
    for (size_t i = 0; i < 3 * vertices; i++) {
        lo[i % 3] = fmin(lo[i % 3], x[i]);
        hi[i % 3] = fmax(hi[i % 3], x[i]);
    }
    for (int k = 0; k < 3; k++) {
        m.middle[k] = 0.5 * (lo[k] + hi[k]);
        size = fmax(size, hi[k] - lo[k]);
    }
    for (int k = 0; k < 3; k++)
        m.shift[k] = 2 * size * noise(&seed);
    return m;
}

static void move(const rigid *m, int host_bits, double *x, size_t vertices)
{
    for (size_t v = 0; v < vertices; v++) {
        double d[3], *p = x + 3 * v;
        for (int k = 0; k < 3; k++)
            d[k] = p[k] - m->middle[k];
        for (int k = 0; k < 3; k++) {
            p[k] = m->turn[k][0] * d[0] + m->turn[k][1] * d[1] + m->turn[k][2] * d[2] + m->shift[k];
            if (host_bits == RDL_FLOAT32)
                p[k] = (double)(float)p[k];
        }
    }
}

static rdl_status copy_frames(exporter *e, rdl_shot_writer *writer, unsigned contents, uint64_t seed, rdl_fault *fault)
{
    static const unsigned which[3] = {RDL_SHOT_START, RDL_SHOT_PROPOSED, RDL_SHOT_DELIVERED};
    const rdl_shot_info *about = rdl_shot_describe(e->shot);
    size_t n = e->scene->vertex_count;
    double *states[3] = {NULL, NULL, NULL};
    rdl_status status = RDL_OK;
    rigid motion;
    bool made = false;
    for (int s = 0; s < 3; s++) {
        states[s] = malloc(3 * n * sizeof(double));
        status = states[s] == NULL ? RDL_NO_MEMORY : status;
    }
    for (size_t k = e->first; status == RDL_OK && k <= e->last; k++) {
        rdl_shot_frame frame;
        for (int s = 0; s < 3 && status == RDL_OK; s++) {
            if ((contents & which[s]) == 0)
                continue;
            status = rdl_shot_read_positions(e->shot, k, which[s], states[s], fault);
            if (status == RDL_OK && !made) {
                motion = make_motion(seed, states[s], n);
                made = true;
            }
            if (status == RDL_OK)
                move(&motion, about->host_bits, states[s], n);
        }
        if (status == RDL_OK)
            status = rdl_shot_read_frame(e->shot, k, &frame, fault);
        if (status != RDL_OK)
            break;
        frame.start = states[0];
        frame.proposed = states[1];
        frame.delivered = states[2];
        status = rdl_shot_append(writer, &frame, fault);
    }
    for (int s = 0; s < 3; s++)
        free(states[s]);
    return status;
}

int export_scrambled(exporter *e, uint64_t seed)
{
    const rdl_shot_info *about = rdl_shot_describe(e->shot);
    rdl_scene scene = *e->scene;
    rdl_part *parts = malloc(scene.part_count * sizeof *parts);
    char(*names)[32] = malloc(scene.part_count * sizeof *names);
    rdl_shot_options options;
    rdl_shot_writer *writer = NULL;
    rdl_fault fault = {0, ""};
    unsigned steps = RDL_SHOT_START | RDL_SHOT_PROPOSED;
    unsigned contents = (about->contents & steps) == steps ? steps | (about->contents & RDL_SHOT_RULES) : RDL_SHOT_DELIVERED;
    rdl_status status = parts != NULL && names != NULL ? RDL_OK : RDL_NO_MEMORY;
    for (size_t p = 0; status == RDL_OK && p < scene.part_count; p++) {
        parts[p] = scene.parts[p];
        snprintf(names[p], sizeof names[p], "part %zu", p);
        parts[p].name = names[p];
    }
    scene.parts = parts;
    rdl_shot_options_default(&options);
    options.contents = contents;
    options.host_bits = about->host_bits;
    options.overwrite = e->force;
    options.created_by = "raddle export " RDL_VERSION_TEXT;
    options.settings = about->has_settings ? &about->settings : NULL;
    if (status == RDL_OK)
        status = rdl_shot_create(e->prefix, &scene, &options, &writer, &fault);
    if (status == RDL_OK)
        status = copy_frames(e, writer, contents, seed, &fault);
    if (status == RDL_OK) {
        status = rdl_shot_finish(writer, &fault);
        writer = NULL;
    }
    rdl_shot_discard(writer);
    free(parts);
    free(names);
    return status == RDL_OK ? CLI_DONE : cli_fail("export", e->prefix, -1, status, &fault);
}
