/* scenes/play.c: see play.h. */
#include "play.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include "host.h"

typedef struct player {
    const scene *s;
    const play_options *options;
    world *w;
    judge j;
    rdl_engine *engine;
    double (*start)[3], (*proposed)[3], (*delivered)[3];
    float (*start32)[3], (*proposed32)[3], (*delivered32)[3];
    play_result *result;
} player;

static double now(void)
{
    struct timespec t;
    clock_gettime(CLOCK_MONOTONIC, &t);
    return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

play_options play_defaults(void)
{
    return (play_options){.resolve = resolve_by_engine, .threads = 1, .vector = 1.0, .scale = 1.0,
                          .format = RDL_FLOAT64, .judged = true};
}

rdl_status resolve_by_engine(rdl_engine *engine, size_t vertex_count, const rdl_step *step, rdl_report *report,
                             rdl_fault *fault)
{
    (void)vertex_count;
    return rdl_engine_step(engine, step, report, fault);
}

int scene_find(const char *name)
{
    for (int i = 0; i < scene_count; i++)
        if (strcmp(scenes[i].name, name) == 0)
            return i;
    return -1;
}

static void *room_for(size_t count, size_t bytes)
{
    void *memory = calloc(count, bytes);
    if (memory == NULL)
        exit(EXIT_FAILURE);
    return memory;
}

static void narrow(double (*from)[3], float (*to)[3], size_t count)
{
    for (size_t i = 0; i < count; i++)
        for (int k = 0; k < 3; k++)
            to[i][k] = (float)from[i][k];
}

static rdl_status resolve(player *p, rdl_report *report, rdl_fault *fault)
{
    size_t n = p->w->vertex_count;
    bool narrow_bits = p->w->format == RDL_FLOAT32;
    rdl_step step = {.size = sizeof step, .start = {p->start, 0, RDL_FLOAT64},
                     .proposed = {p->proposed, 0, RDL_FLOAT64},
                     .delivered = {p->delivered, 0, RDL_FLOAT64}, .duration = p->w->duration, .mass = p->w->mass};
    if (narrow_bits) {
        narrow(p->start, p->start32, n);
        narrow(p->proposed, p->proposed32, n);
        step.start = (rdl_view){p->start32, 0, RDL_FLOAT32};
        step.proposed = (rdl_view){p->proposed32, 0, RDL_FLOAT32};
        step.delivered = (rdl_output_view){p->delivered32, 0, RDL_FLOAT32};
    }
    rdl_status status = p->options->resolve(p->engine, n, &step, report, fault);
    for (size_t i = 0; i < n && narrow_bits; i++)
        for (int k = 0; k < 3; k++)
            p->delivered[i][k] = (double)p->delivered32[i][k];
    return status;
}

static void propose(player *p, unsigned number)
{
    world *w = p->w;
    memcpy(p->start, w->x, w->vertex_count * sizeof *p->start);
    memcpy(p->proposed, w->x, w->vertex_count * sizeof *p->proposed);
    if (p->s->drive != NULL)
        p->s->drive(w, number, p->proposed);
    host_propose(w, p->proposed);
    if (p->s->dictate != NULL)
        p->s->dictate(w, number, p->proposed);
    host_round(w, p->proposed);
}

static double mean_correction(const player *p)
{
    double sum = 0.0;
    size_t movable = 0;
    for (uint32_t v = 0; v < p->w->vertex_count; v++) {
        double square = 0.0;
        for (int k = 0; k < 3; k++)
            square += (p->delivered[v][k] - p->proposed[v][k]) * (p->delivered[v][k] - p->proposed[v][k]);
        sum += world_is_driven(p->w, v) ? 0.0 : sqrt(square);
        movable += !world_is_driven(p->w, v);
    }
    return movable > 0 ? sum / (double)movable : 0.0;
}

static void print_step(const player *p, unsigned number, const rdl_report *r, double seconds)
{
    static const char *const names[4] = {"clear", "resolved", "pinched", "tangled"};
    printf("  %3u %-8s contacts %5llu zones %4llu (levels %llu %llu %llu %llu %llu) passes %4llu "
           "way-points %3zu held %4zu named %4zu pairs %7llu mean %.3g worst %.3g m, %.4f s "
           "(boxes %.3f pairs %.3f touches %.3f response %.3f verify %.3f)\n",
           number, names[r->verdict & 3], (unsigned long long)r->contact_count, (unsigned long long)r->zone_count,
           (unsigned long long)r->level_zones[0], (unsigned long long)r->level_zones[1],
           (unsigned long long)r->level_zones[2], (unsigned long long)r->level_zones[3],
           (unsigned long long)r->level_zones[4], (unsigned long long)r->passes, r->waypoint_count, r->held_count,
           r->named_count, (unsigned long long)r->pairs, mean_correction(p), r->worst_correction, seconds,
           r->seconds[RDL_TIME_BOXES], r->seconds[RDL_TIME_PAIRS], r->seconds[RDL_TIME_TOUCHES],
           r->seconds[RDL_TIME_RESPONSE], r->seconds[RDL_TIME_VERIFY]);
    for (size_t z = 0; z < r->zone_count; z++)
        printf("      zone %zu: %u vertices, %u contacts, level %u%s, energy %+.3g J, momentum error %.3g, "
               "residual %.3g, worst %.3g m\n",
               z, r->zones[z].vertex_count, r->zones[z].contact_count, r->zones[z].level,
               r->zones[z].touches_driven ? ", touches driven" : "", r->zones[z].energy_change,
               r->zones[z].momentum_error, r->zones[z].residual, r->zones[z].worst_correction);
    fflush(stdout);
}

static void book_step(player *p, unsigned number, const rdl_report *r, double seconds)
{
    play_result *result = p->result;
    size_t n = p->w->vertex_count;
    memcpy(result->track + number * n * 3, p->delivered, n * sizeof *p->delivered);
    result->verdict_track[number] = (uint8_t)r->verdict;
    result->verdicts[r->verdict & 3]++;
    result->passes += r->passes;
    result->worst_passes = r->passes > result->worst_passes ? r->passes : result->worst_passes;
    result->waypoints += r->waypoint_count;
    result->zones += r->zone_count;
    result->mean_correction += mean_correction(p);
    result->engine_seconds += seconds;
    result->worst_seconds = fmax(result->worst_seconds, seconds);
    result->steps = number + 1;
}

static bool play_step(player *p, unsigned number)
{
    rdl_report report = {.size = sizeof report};
    rdl_fault fault = {0};
    propose(p, number);
    double begun = now();
    rdl_status status = resolve(p, &report, &fault);
    double seconds = now() - begun;
    if (status != RDL_OK) {
        judge_fault(&p->j, number, "status %d (%s), %s %llu", (int)status, rdl_status_text(status), fault.field,
                    (unsigned long long)fault.index);
        return false;
    }
    book_step(p, number, &report, seconds);
    if (p->options->verbose)
        print_step(p, number, &report, seconds);
    if (p->options->judged) {
        judge_step step = {number, (rows)p->start, (rows)p->proposed, (rows)p->delivered, &report,
                           p->s->verdicts(p->w, number)};
        judge_the_step(&p->j, &step);
        if (p->s->inspect != NULL)
            p->s->inspect(&p->j, &step);
    }
    host_accept(p->w, (rows)p->proposed, (rows)p->delivered, &report);
    return !(p->options->until_fault && p->j.faults > 0);
}

static void open_player(player *p)
{
    p->w = world_create();
    p->s->build(p->w);
    world_finish(p->w, p->options->scale, p->options->format);
    size_t n = p->w->vertex_count;
    p->start = room_for(n, sizeof *p->start);
    p->proposed = room_for(n, sizeof *p->proposed);
    p->delivered = room_for(n, sizeof *p->delivered);
    p->start32 = room_for(n, sizeof *p->start32);
    p->proposed32 = room_for(n, sizeof *p->proposed32);
    p->delivered32 = room_for(n, sizeof *p->delivered32);
    p->result->track = room_for(p->s->steps * n, 3 * sizeof(double));
    p->result->verdict_track = room_for(p->s->steps, 1);
    p->result->vertex_count = n;
    p->result->elements = world_elements(p->w);
    judge_begin(&p->j, p->w, p->options->verbose);
}

static void close_player(player *p)
{
    play_result *r = p->result;
    r->faults = p->j.faults;
    memcpy(r->first_fault, p->j.first_fault, sizeof r->first_fault);
    r->held = p->j.held;
    r->rigid = p->j.rigid;
    r->vertex_steps = p->j.vertex_steps;
    r->pairs = p->j.pairs;
    r->exact = p->j.exact;
    r->drift = p->j.drift;
    r->gain = p->j.gain;
    r->mean_correction /= r->steps > 0 ? r->steps : 1;
    judge_end(&p->j);
    rdl_engine_destroy(p->engine);
    world_destroy(p->w);
    free(p->start);
    free(p->proposed);
    free(p->delivered);
    free(p->start32);
    free(p->proposed32);
    free(p->delivered32);
}

void play(const scene *s, const play_options *options, play_result *result)
{
    player p = {.s = s, .options = options, .result = result};
    rdl_scene description;
    rdl_settings settings;
    rdl_host host = {.size = sizeof host, .threads = options->threads};
    rdl_fault fault = {0};
    double begun = now();
    memset(result, 0, sizeof *result);
    open_player(&p);
    world_describe(p.w, &description);
    rdl_settings_default(&settings);
    settings.vector = options->vector;
    rdl_status status = rdl_engine_create(&description, &settings, &host, &p.engine, &fault);
    if (status != RDL_OK)
        judge_fault(&p.j, 0, "no engine: %s, %s %llu", rdl_status_text(status), fault.field,
                    (unsigned long long)fault.index);
    size_t edge_count = 0;
    const uint32_t (*edges)[2] = status == RDL_OK ? rdl_engine_edges(p.engine, &edge_count) : NULL;
    if (edge_count != p.j.edge_count || memcmp(edges, p.j.edges, edge_count * sizeof *edges) != 0)
        judge_fault(&p.j, 0, "the engine's edges are not the scene's");
    unsigned number = 0;
    while (status == RDL_OK && number < s->steps && play_step(&p, number))
        number++;
    if (options->judged && s->finish != NULL && number == s->steps)
        s->finish(&p.j, number, result->verdicts);
    close_player(&p);
    result->all_seconds = now() - begun;
}

void play_release(play_result *result)
{
    free(result->track);
    free(result->verdict_track);
    result->track = NULL;
    result->verdict_track = NULL;
}

void play_print(const char *name, const play_result *r)
{
    unsigned steps = r->steps > 0 ? r->steps : 1;
    printf("%-14s steps %3u elements %4zu verdicts %llu/%llu/%llu/%llu passes %.1f worst %llu way-points %llu "
           "zones %llu held %llu rigid %llu of %llu, mean correction %.3g m, engine %.3f s (worst step %.3f), "
           "with judge %.2f s, exact %llu of %llu%s%s\n",
           name, r->steps, r->elements, (unsigned long long)r->verdicts[0], (unsigned long long)r->verdicts[1],
           (unsigned long long)r->verdicts[2], (unsigned long long)r->verdicts[3], (double)r->passes / steps,
           (unsigned long long)r->worst_passes, (unsigned long long)r->waypoints, (unsigned long long)r->zones,
           (unsigned long long)r->held, (unsigned long long)r->rigid, (unsigned long long)r->vertex_steps,
           r->mean_correction, r->engine_seconds, r->worst_seconds, r->all_seconds, (unsigned long long)r->exact,
           (unsigned long long)r->pairs, r->faults > 0 ? "; FAULTS, first: " : "", r->first_fault);
    fflush(stdout);
}
