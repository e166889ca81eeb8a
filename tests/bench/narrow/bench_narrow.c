/* bench/narrow/bench_narrow.c: the narrow phase against the textbook method, family by family, in one run on one core.
 * Writes Markdown tables. Arguments: queries per family and kind (default 400), and a part of
 * a family's name, for some families only. Truth is the exact oracle of tests/oracle.
 * Figures: ns per query, ratio textbook / ours, wrong answers of both, share decided by each stage, 99.99th percentile. */
#define _POSIX_C_SOURCE 200809L
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include "families.h"
#include "narrow/narrow.h"
#include "oracle.h"
#include "textbook.h"

enum { REPEATS = 15 };

typedef struct batch {
    int kind, count;
    rdl_motion *motions;
    double *gaps;
    rdl_touch *touches;
    rdli_examined *examined;
    double *singles; /* ns of each query by itself, the least of three */
} batch;

typedef struct faults {
    int missed, invented, late;
} faults;

/* Over a whole table. */
typedef struct mix {
    double sum, *singles; /* ns */
    size_t count, room;
} mix;

static double now(void)
{
    struct timespec t;
    clock_gettime(CLOCK_THREAD_CPUTIME_ID, &t);
    return 1e9 * (double)t.tv_sec + (double)t.tv_nsec;
}

static int by_value(const void *a, const void *b)
{
    double x = *(const double *)a, y = *(const double *)b;
    return (x > y) - (x < y);
}

static bool ask_textbook(const batch *b, int i, double *time)
{
    return b->gaps[i] > 0 ? textbook_touches(b->kind, &b->motions[i], b->gaps[i], time)
                          : textbook_meets(b->kind, &b->motions[i], time);
}

static void ask_ours(batch *b)
{
    rdl_find_touches(b->kind, (size_t)b->count, b->motions, b->gaps, b->touches, NULL);
}

static void ask_opponent(batch *b)
{
    static volatile int sink;
    int touches = 0;
    double time;
    for (int i = 0; i < b->count; i++)
        touches += ask_textbook(b, i, &time);
    sink = touches;
    (void)sink;
}

/* What the engine asks: floors at the gap and at half of it. */
static void ask_engine(batch *b)
{
    rdli_examine_list(b->kind, (size_t)b->count, b->motions, b->gaps, 0.5, NULL, b->examined);
}

typedef struct times {
    double ours, textbook, engine; /* ns per query */
} times;

static void take_less(double *least, void (*ask)(batch *b), batch *b)
{
    double from = now();
    ask(b);
    double took = (now() - from) / b->count;
    *least = took < *least ? took : *least;
}

/* In turns, because the machine's speed changes. */
static times measure(batch *b, bool engine)
{
    times t = {INFINITY, INFINITY, INFINITY};
    for (int i = 0; i < REPEATS; i++) {
        take_less(&t.ours, ask_ours, b);
        take_less(&t.textbook, ask_opponent, b);
        if (engine)
            take_less(&t.engine, ask_engine, b);
    }
    return t;
}

static double high_percentile(batch *b)
{
    for (int i = 0; i < b->count; i++) {
        b->singles[i] = INFINITY;
        for (int j = 0; j < 3; j++) {
            rdl_touch touch;
            double from = now();
            rdl_find_touches(b->kind, 1, &b->motions[i], &b->gaps[i], &touch, NULL);
            double took = now() - from;
            b->singles[i] = took < b->singles[i] ? took : b->singles[i];
        }
    }
    qsort(b->singles, (size_t)b->count, sizeof *b->singles, by_value);
    return b->singles[(int)ceil(0.9999 * b->count) - 1];
}

/* Compares both with the oracle. A gap > 0 allows alarms below gap (1 + 1e-6). Returns the number of true touches. */
static int judge(const batch *b, faults *ours, faults *theirs)
{
    int touching = 0;
    mpq_t square;
    oracle_touch exact;
    mpq_init(square);
    oracle_touch_init(&exact);
    for (int i = 0; i < b->count; i++) {
        double time = 1;
        bool textbook = ask_textbook(b, i, &time);
        oracle_square_gap(square, b->gaps[i], 0);
        oracle_find(b->kind, &b->motions[i], square, &exact);
        touching += exact.touches;
        if (exact.touches) {
            ours->missed += !b->touches[i].touches;
            theirs->missed += !textbook;
            ours->late += b->touches[i].touches && oracle_compare_time(&exact, b->touches[i].time_lo) < 0;
            /* ours promises a time that is never late; theirs is a rounded time, and only real lateness counts */
            theirs->late += textbook && oracle_compare_time(&exact, time - 1e-6) < 0;
            continue;
        }
        if (b->gaps[i] > 0 && (b->touches[i].touches || textbook)) {
            oracle_square_gap(square, b->gaps[i], 1);
            oracle_find(b->kind, &b->motions[i], square, &exact);
        }
        ours->invented += b->touches[i].touches && !exact.touches;
        theirs->invented += textbook && !exact.touches;
    }
    oracle_touch_clear(&exact);
    mpq_clear(square);
    return touching;
}

static void add_to_mix(mix *all, const batch *b, double ns)
{
    all->sum += ns * b->count;
    for (int i = 0; i < b->count && all->count < all->room; i++)
        all->singles[all->count++] = b->singles[i];
}

static void tell_mix(mix *all, const char *name)
{
    if (all->count == 0)
        return;
    qsort(all->singles, all->count, sizeof *all->singles, by_value);
    printf("\n%s, all families: mean %.0f ns, 99.99th percentile %.0f us, worst %.0f us.\n", name, all->sum / (double)all->count,
           all->singles[(size_t)ceil(0.9999 * (double)all->count) - 1] / 1000, all->singles[all->count - 1] / 1000);
    all->count = 0;
    all->sum = 0;
}

static void report(batch *b, const char *name, bool engine, mix *all, faults *sum)
{
    faults ours = {0, 0, 0}, theirs = {0, 0, 0};
    int stages[RDL_STAGE_COUNT] = {0}, deepest = 0;
    times t = measure(b, engine);
    double high = high_percentile(b);
    int touching = judge(b, &ours, &theirs);
    for (int i = 0; i < b->count; i++) {
        stages[b->touches[i].stage]++;
        deepest = b->touches[i].depth > deepest ? b->touches[i].depth : deepest;
    }
    double percent = 100.0 / b->count;
    printf("| %s | %s | %.0f | %.0f | %.0f | %.2f | %.1f | %d/%d/%d | %.1f/%.1f/%.1f |", name,
           b->kind == RDL_POINT_TRIANGLE ? "PT" : "EE", touching * percent, t.ours, t.textbook, t.textbook / t.ours, high / 1000,
           ours.missed, ours.invented, ours.late, theirs.missed * percent, theirs.invented * percent, theirs.late * percent);
    for (int i = 0; i < RDL_STAGE_COUNT; i++)
        printf("%s%.0f", i ? "/" : " ", stages[i] * percent);
    printf(" | %d |", deepest);
    if (engine)
        printf(" engine %.0f ns, ratio %.2f |", t.engine, t.textbook / t.engine);
    printf("\n");
    fflush(stdout);
    add_to_mix(all, b, t.ours);
    sum->missed += ours.missed;
    sum->invented += ours.invented;
    sum->late += ours.late;
}

static void fill(batch *b, const motion_family *family, int count)
{
    random_source source = random_from(20000 + (uint64_t)b->kind);
    b->count = count;
    for (int i = 0; i < count; i++) {
        family->make(&source, b->kind, &b->motions[i]);
        b->gaps[i] = 0;
    }
}

static void heading(const char *title)
{
    printf("\n%s\n\n", title);
    printf("| family | kind | touch %% | ours ns | textbook ns | ratio | 99.99th us | ours missed/invented/late | "
           "textbook missed/invented/late %% | stages %% dir/cubic/ends/roots/series/exact | most looks or splits | |\n");
    printf("|---|---|---|---|---|---|---|---|---|---|---|---|\n");
}

/* Typical gaps: 0.3 mm between cloth layers 0.5 mm apart, 0.02 mm between strands 0.1 mm apart, else 1 % of the size. */
static double typical_gap(const char *name, const rdl_motion *motion)
{
    if (strcmp(name, "tight cloth") == 0)
        return 3e-4;
    if (strcmp(name, "tight strands") == 0)
        return 2e-5;
    double gap = 0.01 * motion_size(motion);
    return gap > 0 ? gap : 1;
}

static void sliding(batch *b, double relative, const char *title, int count, mix *all, faults *sum)
{
    const motion_family *family = &motion_families[motion_family_find("layers that slide and turn")];
    fill(b, family, count);
    for (int i = 0; i < count; i++)
        b->gaps[i] = motion_least_distance(b->kind, &b->motions[i]) / (1 + relative);
    report(b, title, false, all, sum);
}

int main(int argc, char **argv)
{
    int usual = argc > 1 ? atoi(argv[1]) : 400;
    const char *only = argc > 2 ? argv[2] : "";
    if (usual < 1) {
        fprintf(stderr, "usage: bench_narrow [queries per family [part of a family's name]]\n");
        return EXIT_FAILURE;
    }
    size_t room = (size_t)usual * 2 + 1;
    batch b = {0, 0, calloc(room, sizeof(rdl_motion)), calloc(room, sizeof(double)), calloc(room, sizeof(rdl_touch)),
        calloc(room, sizeof(rdli_examined)), calloc(room, sizeof(double))};
    faults sum = {0, 0, 0};
    mix all = {0, NULL, 0, room * 2 * (size_t)motion_family_count};
    all.singles = calloc(all.room, sizeof *all.singles);
    if (!b.motions || !b.gaps || !b.touches || !b.examined || !b.singles || !all.singles)
        return EXIT_FAILURE;
    for (int gapped = 0; gapped < 2; gapped++) {
        heading(gapped ? "Gap > 0 (textbook: cubic, and distance at both ends and at the roots)" : "Gap 0");
        for (int f = 0; f < motion_family_count; f++) {
            const motion_family *family = &motion_families[f];
            int count = usual * (family->percent < 100 ? family->percent : 100) / 100;
            if (!strstr(family->name, only))
                continue;
            for (b.kind = 0; b.kind < 2; b.kind++) {
                fill(&b, family, count > 0 ? count : 1);
                for (int i = 0; i < b.count && gapped; i++)
                    b.gaps[i] = typical_gap(family->name, &b.motions[i]);
                report(&b, family->name, gapped != 0, &all, &sum);
            }
        }
        tell_mix(&all, gapped ? "Gap > 0" : "Gap 0");
    }
    heading("Layers that slide and turn by 0.01 to 10 degrees, just above and just below their least distance");
    for (b.kind = 0; b.kind < 2; b.kind++) {
        sliding(&b, 2e-6, "least distance = gap (1 + 2e-6)", usual, &all, &sum);
        sliding(&b, -1e-9, "least distance = gap (1 - 1e-9)", usual, &all, &sum);
    }
    printf("\nAll families: missed %d, invented %d, late %d.\n", sum.missed, sum.invented, sum.late);
    free(b.motions);
    free(b.gaps);
    free(b.touches);
    free(b.examined);
    free(b.singles);
    free(all.singles);
    return sum.missed || sum.invented || sum.late ? EXIT_FAILURE : EXIT_SUCCESS;
}
