/* tests/bench/bench_broad.c: rdl_tree against general-purpose libraries, and the engine's pair lists. Prints Markdown
 * tables. Arguments: "tree" or "lists" for one of the two alone, then numbers of elements (default 10000 and 100000).
 * Fails when two engines disagree on the number of pairs, or brute force (up to 20 thousand elements) on the pairs themselves.
 *
 * Times are the least of several steps. What is compared with one thread is processor time, so that other processes disturb it
 * little; two threads are compared with one by wall time. All engines only count what they find; rdl_tree with one thread
 * sorts it as well. Our tree and Embree's refitted one, the best anchor nearly everywhere, take their steps in turn. */
#include <math.h>
#include <stdbool.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include "bench_broad_anchors.h"
#include "bench_broad_lists.h"
#include "bench_broad_scenes.h"

enum { STEPS = 9, FEW_STEPS = 4, BRUTE_FORCE = 20000, MANY_PAIRS = 200000000, SIZES = 8 };

typedef struct result {
    double build, update, pairs; /* s: of the step with the least sum of the last two */
    double all, updates;         /* s: sums over all steps; updates with their rebuilds */
    size_t count, best_count;    /* pairs in the last step, and in the step of the least sum */
} result;

/* How the time grows from one size to the next. */
static struct growth {
    size_t elements, pairs;
    double seconds;
} measured[SCENE_COUNT][SIZES];

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
    counted *c = (counted *)user + worker;
    for (size_t i = 0; i < count; i++)
        c->sum += pair_hash(pairs[i][0], pairs[i][1]);
    c->count += count;
}

static bool brute_force_agrees(const bench_scene *scene, const rdl_tree *tree)
{
    counted want = {0}, got[2] = {{0}, {0}}; /* got: per worker */
    const rdl_box *boxes = scene->boxes;
    for (uint32_t i = 0; i < scene->element_count; i++)
        for (uint32_t j = i + 1; j < scene->element_count; j++)
            if (boxes[i].lo[0] <= boxes[j].hi[0] && boxes[j].lo[0] <= boxes[i].hi[0] && boxes[i].lo[1] <= boxes[j].hi[1] &&
                boxes[j].lo[1] <= boxes[i].hi[1] && boxes[i].lo[2] <= boxes[j].hi[2] && boxes[j].lo[2] <= boxes[i].hi[2]) {
                want.count++;
                want.sum += pair_hash(i, j);
            }
    return rdl_tree_self_pairs(tree, NULL, sum_block, got) == RDL_OK && got[0].count + got[1].count == want.count &&
           got[0].sum + got[1].sum == want.sum;
}

/* The least sum of both. */
static void keep_best(result *best, double update, double pairs)
{
    best->all += update + pairs;
    best->updates += update;
    if (update + pairs < best->update + best->pairs) {
        best->update = update;
        best->pairs = pairs;
        best->best_count = best->count;
    }
}

static double total(const result *r)
{
    return r->update + r->pairs;
}

static const result NOT_YET = {.update = 1e9, .pairs = 1e9};

/* One step of one tree, by processor time and by wall time. */
static bool step_tree(rdl_tree *tree, const bench_scene *scene, bool warm, result *cpu, result *wall)
{
    double c[3], w[3];
    c[0] = seconds_of(CLOCK_PROCESS_CPUTIME_ID);
    w[0] = seconds_of(CLOCK_MONOTONIC);
    bool fine = rdl_tree_update(tree, scene->boxes, NULL) == RDL_OK;
    c[1] = seconds_of(CLOCK_PROCESS_CPUTIME_ID);
    w[1] = seconds_of(CLOCK_MONOTONIC);
    cpu->count = 0;
    fine = fine && rdl_tree_self_pairs(tree, NULL, count_block, &cpu->count) == RDL_OK;
    wall->count = cpu->count;
    c[2] = seconds_of(CLOCK_PROCESS_CPUTIME_ID);
    w[2] = seconds_of(CLOCK_MONOTONIC);
    if (warm) {
        keep_best(cpu, c[1] - c[0], c[2] - c[1]);
        keep_best(wall, w[1] - w[0], w[2] - w[1]);
    }
    return fine;
}

static bool create_tree(const bench_scene *scene, unsigned threads, rdl_host *host, rdl_tree **tree, result *r)
{
    *host = (rdl_host){.size = sizeof *host, .threads = threads};
    double before = seconds_of(CLOCK_PROCESS_CPUTIME_ID);
    bool fine = rdl_tree_create(scene->boxes, scene->element_count, host, tree, NULL) == RDL_OK;
    *r = NOT_YET;
    r->build = seconds_of(CLOCK_PROCESS_CPUTIME_ID) - before;
    return fine;
}

#ifdef BENCH_EMBREE
static void step_embree(void *embree, const bench_scene *scene, bool warm, result *r)
{
    double before = seconds_of(CLOCK_PROCESS_CPUTIME_ID);
    embree_update(embree, scene->boxes);
    double middle = seconds_of(CLOCK_PROCESS_CPUTIME_ID);
    r->count = embree_pairs(embree);
    if (warm)
        keep_best(r, middle - before, seconds_of(CLOCK_PROCESS_CPUTIME_ID) - middle);
}

static void *open_embree(const bench_scene *scene, int mode, result *r)
{
    double before = seconds_of(CLOCK_PROCESS_CPUTIME_ID);
    void *embree = embree_open(scene->boxes, scene->element_count, 1, mode);
    *r = NOT_YET;
    r->build = seconds_of(CLOCK_PROCESS_CPUTIME_ID) - before;
    return embree;
}
#endif

/* All that take steps in turn. */
typedef struct turns {
    int steps;
    result one, two, refitted, wall_one, wall_two;
} turns;

static bool run_turns(bench_scene *scene, turns *t)
{
    rdl_host hosts[2];
    rdl_tree *one = NULL, *two = NULL;
    t->wall_one = t->wall_two = NOT_YET;
    bench_scene_move(scene, 0);
    bool fine = create_tree(scene, 1, &hosts[0], &one, &t->one) && create_tree(scene, 2, &hosts[1], &two, &t->two);
#ifdef BENCH_EMBREE
    void *embree = open_embree(scene, 3, &t->refitted);
    fine = fine && embree != NULL;
#endif
    t->steps = STEPS;
    for (int step = 0; step < t->steps && fine; step++) {
        bench_scene_move(scene, step);
        fine = step_tree(one, scene, step > 0, &t->one, &t->wall_one) && step_tree(two, scene, step > 0, &t->two, &t->wall_two) &&
               t->one.count == t->two.count;
        if (t->one.count > MANY_PAIRS)
            t->steps = FEW_STEPS;
#ifdef BENCH_EMBREE
        step_embree(embree, scene, step > 0, &t->refitted);
        fine = fine && t->refitted.count == t->one.count;
#endif
    }
    if (fine && scene->element_count <= BRUTE_FORCE)
        fine = brute_force_agrees(scene, one) && brute_force_agrees(scene, two);
#ifdef BENCH_EMBREE
    embree_close(embree);
#endif
    rdl_tree_destroy(one);
    rdl_tree_destroy(two);
    return fine;
}

static void print_row(const char *name, const result *r, double build)
{
    if (build > 0)
        printf("| | %s | %.1f | %.2f | %.1f | %.1f | %.1f | |\n", name, 1e3 * build, 1e3 * r->update, 1e3 * r->pairs,
               1e3 * total(r), 1e9 * total(r) / (double)r->best_count);
    else
        printf("| | %s | | | %.1f | %.1f | %.1f | |\n", name, 1e3 * r->pairs, 1e3 * total(r), 1e9 * total(r) / (double)r->best_count);
}

/* The anchors that start afresh in every step: the least time of the last two steps. Lowers *best to the best of them. */
static bool run_fresh(bench_scene *scene, const turns *t, double *best)
{
    bool same = true;
    const int last = t->steps - 1;
    (void)scene;
#ifdef BENCH_EMBREE
    static const char *const modes[3] = {"Embree, low quality", "Embree, medium quality", "Embree, high quality"};
    for (int mode = 0; mode < 3 && t->steps == STEPS; mode++) {
        result r;
        bench_scene_move(scene, last - 1);
        void *embree = open_embree(scene, mode, &r);
        step_embree(embree, scene, true, &r);
        bench_scene_move(scene, last);
        step_embree(embree, scene, true, &r);
        embree_close(embree);
        print_row(modes[mode], &r, r.build);
        same = same && r.count == t->one.count;
        *best = fmin(*best, total(&r));
    }
#endif
#ifdef BENCH_CGAL
    result cgal = NOT_YET;
    for (int run = 0; run < 4; run++) {
        bench_scene_move(scene, last - 1 + run % 2);
        double before = seconds_of(CLOCK_PROCESS_CPUTIME_ID);
        cgal.count = cgal_pairs(scene->boxes, scene->element_count, run < 2 ? 1000 : 100);
        keep_best(&cgal, 0, seconds_of(CLOCK_PROCESS_CPUTIME_ID) - before);
    }
    print_row("CGAL", &cgal, 0);
    same = same && cgal.count == t->one.count;
    *best = fmin(*best, total(&cgal));
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

static bool bench_tree(bench_scene *scene, int size)
{
    turns t;
    double best = INFINITY, stream, make;
    if (!run_turns(scene, &t))
        return false;
    measured[scene->kind][size] = (struct growth){scene->element_count, t.one.best_count, total(&t.one)};
    measure_floor(scene, &stream, &make);
    printf("| **%s** %zu elements, %zu pairs | streaming %.2f ms, making the boxes %.2f ms | | | | | | |\n",
           bench_scene_name(scene->kind), scene->element_count, t.one.count, 1e3 * stream, 1e3 * make);
    bool same = run_fresh(scene, &t, &best);
#ifdef BENCH_EMBREE
    print_row("Embree, refitted", &t.refitted, t.refitted.build);
    best = fmin(best, total(&t.refitted));
#endif
    printf("| | **rdl_tree** | %.1f | %.2f | %.1f | **%.1f** | %.1f | ", 1e3 * t.one.build, 1e3 * t.one.update,
           1e3 * t.one.pairs, 1e3 * total(&t.one), 1e9 * total(&t.one) / (double)t.one.best_count);
    if (best < INFINITY)
        printf("**%.2f** of the best", total(&t.one) / best);
#ifdef BENCH_EMBREE
    printf(", update %.2f of a refit; all steps together %.2f of refitted (updates and rebuilds %.1f ms a step)",
           t.one.update / t.refitted.update, t.one.all / t.refitted.all, 1e3 * t.one.updates / (t.steps - 1));
#endif
    printf(" |\n| | rdl_tree, 2 threads, wall time | | %.2f | %.1f | %.1f | %.1f | %.2f times 1 thread |\n", 1e3 * t.wall_two.update,
           1e3 * t.wall_two.pairs, 1e3 * total(&t.wall_two), 1e9 * total(&t.wall_two) / (double)t.wall_two.best_count,
           total(&t.wall_one) / total(&t.wall_two));
    return same;
}

static void print_growth(int sizes)
{
    printf("\n| scene | elements | pairs per element | exponent over elements | exponent over pairs |\n|---|---|---|---|---|\n");
    for (int kind = 0; kind < SCENE_COUNT; kind++)
        for (int i = 1; i < sizes; i++) {
            const struct growth *from = &measured[kind][i - 1], *to = &measured[kind][i];
            if (from->elements == 0 || to->elements == 0)
                continue;
            const double longer = log(to->seconds / from->seconds);
            printf("| %s | %zu to %zu | %.1f to %.1f | %.2f | %.2f |\n", bench_scene_name(kind), from->elements, to->elements,
                   (double)from->pairs / (double)from->elements, (double)to->pairs / (double)to->elements,
                   longer / log((double)to->elements / (double)from->elements), longer / log((double)to->pairs / (double)from->pairs));
        }
}

static bool bench_lists_row(const bench_scene *scene, double push, const char *note)
{
    bench_lists l;
    if (!bench_lists_measure(scene, push, &l) || l.assigned_pairs != l.box_pairs)
        return false;
    printf("| %s%s | %zu / %zu / %zu | %.1f | %zu | %.1f | %.1f | %zu | %.1f | %.2f | ", bench_scene_name(scene->kind), note,
           l.vertex_count, l.edge_count, l.triangle_count, 1e3 * l.boxes, l.box_pairs, 1e3 * l.box_seconds,
           1e3 * l.assigned_seconds, l.near_pairs, 1e3 * l.near_seconds, l.near_wall[0] / l.near_wall[1]);
    if (l.touches > 0)
        printf("%.1f to %.2f", (double)l.box_pairs / l.touches, (double)l.near_pairs / l.touches);
    else
        printf("no touch in the sample");
    printf(" | %.0f, %.0f bytes each | ", l.bytes * 0x1p-20,
           l.bytes / (double)(l.vertex_count + l.edge_count + l.triangle_count));
    if (l.culled_seconds < 1e9)
        printf("%zu pairs, %.1f, %.1f", l.culled_pairs, 1e3 * l.culled_seconds, 1e3 * l.culled_near_seconds);
    printf(" |\n");
    return true;
}

static bool run(size_t elements, int size, bool (*bench)(bench_scene *scene, int size))
{
    bool fine = true;
    for (int kind = 0; kind < SCENE_COUNT; kind++) {
        bench_scene *scene = bench_scene_new(kind, elements);
        if (scene == NULL || !bench(scene, size)) {
            printf("\n**%s, %zu elements: the engines disagree, or there is no memory.**\n\n", bench_scene_name(kind), elements);
            fine = false;
        }
        bench_scene_free(scene);
        fflush(stdout);
    }
    return fine;
}

static bool bench_scene_lists(bench_scene *scene, int size)
{
    (void)size;
    bench_scene_move(scene, 1);
    if (scene->kind == SCENE_FLYING || scene->kind == SCENE_ASLANT)
        return true;
    bool fine = bench_lists_row(scene, 0, "");
    if (scene->kind == SCENE_STRANDS)
        fine = fine && bench_lists_row(scene, 0.002, ", pushed 2 mm as a whole");
    return fine;
}

static bool bench_trees(int count, const size_t *sizes)
{
    bool fine = true;
    printf("| scene | engine | build, ms | update, ms | pairs, ms | update + pairs, ms | ns per pair | ratio |\n"
           "|---|---|---|---|---|---|---|---|\n");
    for (int i = 0; i < count; i++)
        fine = run(sizes[i], i, bench_tree) && fine;
    if (count > 1)
        print_growth(count);
    return fine;
}

static bool bench_all_lists(int count, const size_t *sizes)
{
    bool fine = true;
    printf("\n| scene | vertices / edges / triangles | boxes, ms | pairs by boxes | separate trees, ms | one tree, "
           "representatives, ms | near pairs | with certificate, ms | 2 threads: times 1 | pairs per touch | MiB "
           "| sheets ignore themselves: pairs by boxes, ms, ms with certificate |\n"
           "|---|---|---|---|---|---|---|---|---|---|---|---|\n");
    for (int i = 0; i < count; i++)
        fine = run(sizes[i], i, bench_scene_lists) && fine;
    return fine;
}

int main(int argc, char **argv)
{
    const bool trees_only = argc > 1 && strcmp(argv[1], "tree") == 0, lists_only = argc > 1 && strcmp(argv[1], "lists") == 0;
    size_t sizes[SIZES] = {10000, 100000};
    int count = 0;
    for (int i = trees_only || lists_only ? 2 : 1; i < argc && count < SIZES; i++)
        sizes[count++] = strtoul(argv[i], NULL, 10);
    count = count == 0 ? 2 : count;
    bool fine = true;
    if (!lists_only)
        fine = bench_trees(count, sizes);
    if (!trees_only)
        fine = bench_all_lists(count, sizes) && fine;
    return fine ? 0 : 1;
}
