/* tests/bench/bench_broad.c: rdl_tree against general-purpose libraries, and the engine's pair lists. Prints two Markdown
 * tables. Arguments: numbers of elements (default 10000 and 100000). Fails when two engines disagree on the number of pairs, or
 * brute force (up to 20 thousand elements) on the pairs themselves.
 *
 * Times are the least of several steps. With one thread they are processor time, so that other processes disturb them
 * little; with two threads they are wall time. All engines only count what they find; rdl_tree sorts it as well. */
#include <math.h>
#include <stdbool.h>
#include <stdio.h>
#include <stdlib.h>
#include <time.h>

#include "bench_broad_anchors.h"
#include "bench_broad_lists.h"
#include "bench_broad_scenes.h"

enum { STEPS = 6, BRUTE_FORCE = 20000 };

typedef struct result {
    double build, update, pairs; /* s */
    size_t count;
} result;

typedef struct counted {
    size_t count;
    uint64_t sum; /* of a hash of each pair, in any order */
} counted;

static double seconds_of(clockid_t clock)
{
    struct timespec t;
    clock_gettime(clock, &t);
    return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

static void count_block(void *user, unsigned worker, const uint32_t (*pairs)[2], size_t count)
{
    (void)worker;
    (void)pairs;
    __atomic_fetch_add((size_t *)user, count, __ATOMIC_RELAXED);
}

static uint64_t pair_hash(uint32_t a, uint32_t b)
{
    uint64_t z = ((uint64_t)a << 32 | b) * 0x9E3779B97F4A7C15u;
    z = (z ^ z >> 29) * 0xBF58476D1CE4E5B9u;
    return z ^ z >> 32;
}

static void sum_block(void *user, unsigned worker, const uint32_t (*pairs)[2], size_t count)
{
    (void)worker;
    counted *c = user;
    for (size_t i = 0; i < count; i++)
        c->sum += pair_hash(pairs[i][0], pairs[i][1]);
    c->count += count;
}

static bool brute_force_agrees(const bench_scene *scene, const rdl_tree *tree)
{
    counted want = {0}, got = {0};
    const rdl_box *boxes = scene->boxes;
    for (uint32_t i = 0; i < scene->element_count; i++)
        for (uint32_t j = i + 1; j < scene->element_count; j++)
            if (boxes[i].lo[0] <= boxes[j].hi[0] && boxes[j].lo[0] <= boxes[i].hi[0] && boxes[i].lo[1] <= boxes[j].hi[1] &&
                boxes[j].lo[1] <= boxes[i].hi[1] && boxes[i].lo[2] <= boxes[j].hi[2] && boxes[j].lo[2] <= boxes[i].hi[2]) {
                want.count++;
                want.sum += pair_hash(i, j);
            }
    return rdl_tree_self_pairs(tree, NULL, sum_block, &got) == RDL_OK && got.count == want.count && got.sum == want.sum;
}

static void keep_best(result *best, double update, double pairs)
{
    if (update + pairs < best->update + best->pairs) {
        best->update = update;
        best->pairs = pairs;
    }
}

static bool run_raddle(bench_scene *scene, unsigned threads, clockid_t clock, result *r)
{
    const rdl_host host = {.size = sizeof host, .threads = threads};
    rdl_tree *tree;
    bool fine = true;
    *r = (result){.update = 1e9, .pairs = 1e9};
    bench_scene_move(scene, 0);
    double before = seconds_of(clock);
    if (rdl_tree_create(scene->boxes, scene->element_count, &host, &tree, NULL) != RDL_OK)
        return false;
    r->build = seconds_of(clock) - before;
    for (int step = 0; step < STEPS && fine; step++) {
        bench_scene_move(scene, step);
        before = seconds_of(clock);
        fine = rdl_tree_update(tree, scene->boxes, NULL) == RDL_OK;
        double middle = seconds_of(clock);
        r->count = 0;
        fine = fine && rdl_tree_self_pairs(tree, NULL, count_block, &r->count) == RDL_OK;
        if (step > 0)
            keep_best(r, middle - before, seconds_of(clock) - middle);
    }
    if (fine && threads == 1 && scene->element_count <= BRUTE_FORCE)
        fine = brute_force_agrees(scene, tree);
    rdl_tree_destroy(tree);
    return fine;
}

#ifdef BENCH_EMBREE
static result run_embree(bench_scene *scene, int mode)
{
    result r = {.update = 1e9, .pairs = 1e9};
    bench_scene_move(scene, 0);
    double before = seconds_of(CLOCK_PROCESS_CPUTIME_ID);
    void *embree = embree_open(scene->boxes, scene->element_count, 1, mode);
    r.build = seconds_of(CLOCK_PROCESS_CPUTIME_ID) - before;
    for (int step = 0; step < STEPS; step++) {
        bench_scene_move(scene, step);
        before = seconds_of(CLOCK_PROCESS_CPUTIME_ID);
        embree_update(embree, scene->boxes);
        double middle = seconds_of(CLOCK_PROCESS_CPUTIME_ID);
        r.count = embree_pairs(embree);
        if (step > 0)
            keep_best(&r, middle - before, seconds_of(CLOCK_PROCESS_CPUTIME_ID) - middle);
    }
    embree_close(embree);
    return r;
}
#endif

#ifdef BENCH_CGAL
static result run_cgal(bench_scene *scene, size_t cutoff)
{
    result r = {.update = 1e9, .pairs = 1e9};
    for (int step = STEPS - 3; step < STEPS; step++) {
        bench_scene_move(scene, step);
        double before = seconds_of(CLOCK_PROCESS_CPUTIME_ID);
        r.count = cgal_pairs(scene->boxes, scene->element_count, cutoff);
        keep_best(&r, 0, seconds_of(CLOCK_PROCESS_CPUTIME_ID) - before);
    }
    return r;
}
#endif

static bool print_row(const char *name, const result *r)
{
    printf("| | %s | %.1f | %.2f | %.1f | %.1f | %.1f | |\n", name, 1e3 * r->build, 1e3 * r->update, 1e3 * r->pairs,
           1e3 * (r->update + r->pairs), 1e9 * (r->update + r->pairs) / (double)r->count);
    return true;
}

/* The best total of all anchors; 0 when none is built in. false: a count differs. */
static bool run_anchors(bench_scene *scene, size_t count, double *best, double *refit)
{
    bool same = true;
    *best = *refit = 0;
    (void)scene;
    (void)count;
#ifdef BENCH_EMBREE
    static const char *const modes[4] = {"Embree, low quality", "Embree, medium quality", "Embree, high quality",
                                         "Embree, refitted"};
    for (int mode = 0; mode < 4; mode++) {
        result r = run_embree(scene, mode);
        same = print_row(modes[mode], &r) && same && r.count == count;
        if (*best == 0 || r.update + r.pairs < *best)
            *best = r.update + r.pairs;
        if (mode == 3)
            *refit = r.update;
    }
#endif
#ifdef BENCH_CGAL
    result cgal = run_cgal(scene, 1000), other = run_cgal(scene, 100);
    if (other.pairs < cgal.pairs)
        cgal = other;
    same = print_row("CGAL", &cgal) && same && cgal.count == count && other.count == count;
    if (*best == 0 || cgal.pairs < *best)
        *best = cgal.pairs;
#endif
    return same;
}

/* Seconds to read all vertices and write all boxes once, without looking at them; and to make the boxes. */
static void measure_floor(bench_scene *scene, double *stream, double *make)
{
    *stream = *make = 1e9;
    for (int run = 0; run < STEPS; run++) {
        double before = seconds_of(CLOCK_PROCESS_CPUTIME_ID);
        float sum = 0;
        for (size_t v = 0; v < scene->vertex_count; v++)
            sum += scene->start[v][0] + scene->end[v][0];
        for (size_t e = 0; e < scene->element_count; e++)
            scene->boxes[e] = (rdl_box){{sum, sum, sum}, {sum, sum, sum}};
        double middle = seconds_of(CLOCK_PROCESS_CPUTIME_ID);
        bench_scene_boxes(scene);
        *stream = fmin(*stream, middle - before);
        *make = fmin(*make, seconds_of(CLOCK_PROCESS_CPUTIME_ID) - middle);
    }
}

static bool bench_tree(bench_scene *scene)
{
    result one, two, wall;
    double best, refit, stream, make;
    bool fine = run_raddle(scene, 1, CLOCK_PROCESS_CPUTIME_ID, &one);
    fine = fine && run_raddle(scene, 1, CLOCK_MONOTONIC, &wall) && run_raddle(scene, 2, CLOCK_MONOTONIC, &two);
    if (!fine)
        return false;
    measure_floor(scene, &stream, &make);
    printf("| **%s** %zu elements, %zu pairs | streaming %.2f ms, making the boxes %.2f ms | | | | | | |\n",
           bench_scene_name(scene->kind), scene->element_count, one.count, 1e3 * stream, 1e3 * make);
    fine = run_anchors(scene, one.count, &best, &refit) && two.count == one.count && wall.count == one.count;
    printf("| | **rdl_tree** | %.1f | %.2f | %.1f | **%.1f** | %.1f | ", 1e3 * one.build, 1e3 * one.update, 1e3 * one.pairs,
           1e3 * (one.update + one.pairs), 1e9 * (one.update + one.pairs) / (double)one.count);
    if (best > 0)
        printf("**%.2f** of the best", (one.update + one.pairs) / best);
    if (refit > 0)
        printf(", update %.2f of a refit", one.update / refit);
    printf(" |\n| | rdl_tree, 2 threads | %.1f | %.2f | %.1f | %.1f | %.1f | %.2f times 1 thread (wall time) |\n",
           1e3 * two.build, 1e3 * two.update, 1e3 * two.pairs, 1e3 * (two.update + two.pairs),
           1e9 * (two.update + two.pairs) / (double)two.count, (wall.update + wall.pairs) / (two.update + two.pairs));
    return fine;
}

static bool bench_lists_row(const bench_scene *scene, double push, const char *note)
{
    bench_lists l;
    if (!bench_lists_measure(scene, push, &l) || l.assigned_pairs != l.box_pairs)
        return false;
    printf("| %s%s | %zu / %zu / %zu | %.1f | %zu | %.1f | %.1f | %zu | %.1f | ", bench_scene_name(scene->kind), note,
           l.vertex_count, l.edge_count, l.triangle_count, 1e3 * l.boxes, l.box_pairs, 1e3 * l.box_seconds,
           1e3 * l.assigned_seconds, l.near_pairs, 1e3 * l.near_seconds);
    if (l.touches > 0)
        printf("%.1f to %.2f", (double)l.box_pairs / l.touches, (double)l.near_pairs / l.touches);
    else
        printf("no touch in the sample");
    printf(" | %.0f |\n", l.bytes * 0x1p-20);
    return true;
}

static bool run(size_t elements, bool (*bench)(bench_scene *scene))
{
    bool fine = true;
    for (int kind = 0; kind < SCENE_COUNT; kind++) {
        bench_scene *scene = bench_scene_new(kind, elements);
        if (scene == NULL || !bench(scene)) {
            printf("\n**%s, %zu elements: the engines disagree, or there is no memory.**\n\n", bench_scene_name(kind), elements);
            fine = false;
        }
        bench_scene_free(scene);
        fflush(stdout);
    }
    return fine;
}

static bool bench_scene_lists(bench_scene *scene)
{
    bench_scene_move(scene, 1);
    bool fine = scene->kind == SCENE_FLYING || bench_lists_row(scene, 0, "");
    if (scene->kind == SCENE_STRANDS)
        fine = fine && bench_lists_row(scene, 0.002, ", pushed 2 mm as a whole");
    return fine;
}

int main(int argc, char **argv)
{
    const char *const standard[] = {"", "10000", "100000"};
    const char *const *sizes = argc > 1 ? (const char *const *)argv : standard;
    const int count = argc > 1 ? argc : 3;
    bool fine = true;
    printf("| scene | engine | build, ms | update, ms | pairs, ms | update + pairs, ms | ns per pair | ratio |\n"
           "|---|---|---|---|---|---|---|---|\n");
    for (int i = 1; i < count; i++)
        fine = run(strtoul(sizes[i], NULL, 10), bench_tree) && fine;
    printf("\n| scene | vertices / edges / triangles | boxes, ms | pairs by boxes | separate trees, ms | one tree, "
           "representatives, ms | near pairs | with certificate, ms | pairs per touch | MiB |\n"
           "|---|---|---|---|---|---|---|---|---|---|\n");
    for (int i = 1; i < count; i++)
        fine = run(strtoul(sizes[i], NULL, 10), bench_scene_lists) && fine;
    return fine ? 0 : 1;
}
