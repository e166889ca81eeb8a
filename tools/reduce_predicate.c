/* reduce_predicate.c: what a reduced scene must still show. */
#include <inttypes.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>
#include <sys/wait.h>
#include <unistd.h>

#include "judge.h"
#include "reduce.h"

static const char *const verdicts[] = {"clear", "resolved", "pinched", "tangled"};
static const char *const measures[] = {"passes", "pairs", "touches", "zones", "substeps", "held", "correction"};

enum { MEASURES = sizeof measures / sizeof measures[0], MEASURE_CORRECTION = MEASURES - 1 };

static bool read_bound(const char *text, predicate *p)
{
    size_t length = strcspn(text, ">");
    for (int m = 0; m < MEASURES; m++) {
        if (strlen(measures[m]) != length || strncmp(text, measures[m], length) != 0)
            continue;
        char *end = NULL;
        p->kind = KEEP_ABOVE;
        p->measure = m;
        p->bound = strtod(text + length + 1, &end);
        return end != text + length + 1 && *end == '\0' && isfinite(p->bound);
    }
    return false;
}

static bool read_verdict(const char *text, predicate *p)
{
    p->kind = KEEP_VERDICT;
    for (int v = 0; v < 4; v++)
        if (strcmp(text, verdicts[v]) == 0) {
            p->verdict = v;
            return true;
        }
    return false;
}

bool predicate_read(const char *text, predicate *p)
{
    static const struct {
        const char *name;
        keep_kind kind;
    } plain[] = {{"crossing", KEEP_CROSSING}, {"intersect", KEEP_INTERSECT}, {"missed", KEEP_MISSED},
                 {"differs", KEEP_DIFFERS}};
    p->text = text;
    for (size_t k = 0; k < sizeof plain / sizeof plain[0]; k++)
        if (strcmp(text, plain[k].name) == 0) {
            p->kind = plain[k].kind;
            return true;
        }
    bool known = false;
    if (strncmp(text, "verdict:", 8) == 0) {
        known = read_verdict(text + 8, p);
    } else if (strncmp(text, "command:", 8) == 0) {
        p->kind = KEEP_COMMAND;
        p->command = text + 8;
        known = text[8] != '\0';
    } else if (strchr(text, '>') != NULL) {
        known = read_bound(text, p);
    }
    if (!known)
        cli_error("reduce", "--keep: %s is not known: verdict:NAME, crossing, intersect, missed, differs, NUMBER>BOUND "
                            "(passes, pairs, touches, zones, substeps, held, correction), command:TEXT",
                  cli_clean(text));
    return known;
}

/* ---- judging a path ---- */

static void set_place(finding *found, const double *state, uint32_t vertex)
{
    found->vertex = vertex;
    memcpy(found->place, state + 3 * (size_t)vertex, sizeof found->place);
    found->has_place = true;
}

/* Crossings on one straight piece; tangles where it ends. */
static void judge_one(judge *j, const double *from, const double *to, bool path, bool end, finding *found)
{
    judge_counts counts;
    const judge_finding *rows = NULL;
    size_t count = 0;
    rdl_fault fault;
    if (found->holds || judge_piece(j, from, to, path, end, 1, &counts, &rows, &count, &fault) != RDL_OK)
        return;
    if (counts.crossings + counts.tangles == 0 || count == 0)
        return;
    size_t edge_count = 0;
    const uint32_t(*edges)[2] = judge_edges(j, &edge_count);
    bool point = rows[0].kind == JUDGE_CROSSING_PT, tangle = rows[0].kind == JUDGE_TANGLE;
    set_place(found, to, point ? rows[0].first : edges[rows[0].first][0]);
    found->holds = true;
    if (tangle)
        snprintf(found->what, sizeof found->what, "edge %" PRIu32 "-%" PRIu32 " pierces triangle %" PRIu32,
                 edges[rows[0].first][0], edges[rows[0].first][1], rows[0].second);
    else if (point)
        snprintf(found->what, sizeof found->what, "vertex %" PRIu32 " crosses triangle %" PRIu32 " at %.6f of the way",
                 rows[0].first, rows[0].second, rows[0].time_hi);
    else
        snprintf(found->what, sizeof found->what,
                 "edge %" PRIu32 "-%" PRIu32 " crosses edge %" PRIu32 "-%" PRIu32 " at %.6f of the way",
                 edges[rows[0].first][0], edges[rows[0].first][1], edges[rows[0].second][0], edges[rows[0].second][1],
                 rows[0].time_hi);
}

/* The way that was taken: proposed as given, or delivered by way of the way-points. */
static void judge_way(const predicate *p, const reduced *r, const stepper *st, finding *found)
{
    judge *j = NULL;
    if (judge_create(&r->s.scene, 1, false, &j) != RDL_OK)
        return;
    const double *from = r->s.start, *end = p->as_given ? r->s.proposed : st->result.delivered;
    size_t state = 3 * r->s.scene.vertex_count;
    if (p->kind == KEEP_INTERSECT) {
        judge_one(j, from, from, false, true, found);
        judge_one(j, from, end, false, true, found);
    } else {
        size_t count = p->as_given ? 0 : st->result.report.waypoint_count;
        for (size_t w = 0; w < count; w++) {
            const double *to = st->result.report.waypoint_positions + w * state;
            judge_one(j, from, to, true, false, found);
            from = to;
        }
        judge_one(j, from, end, true, false, found);
    }
    judge_destroy(j);
}

/* ---- numbers and bits ---- */

static double measure_of(const rdl_report *report, int measure)
{
    switch (measure) {
    case 0: return (double)report->passes;
    case 1: return (double)report->pairs;
    case 2: return (double)report->touches;
    case 3: return (double)report->zone_count;
    case 4: return (double)report->substeps;
    case 5: return (double)report->held_count;
    default: return report->worst_correction;
    }
}

/* The named pair, else the vertex that was corrected most. */
static void find_place(const reduced *r, const stepper *st, finding *found)
{
    const rdl_report *report = &st->result.report;
    size_t n = r->s.scene.vertex_count, edge_count = 0, worst = n;
    double most = 0;
    if (report->named_count > 0) {
        const rdl_named_pair *pair = &report->named[0];
        const uint32_t(*edges)[2] = rdl_engine_edges(st->engine, &edge_count);
        set_place(found, r->s.start, pair->kind == RDL_POINT_TRIANGLE ? pair->first : edges[pair->first][0]);
        return;
    }
    for (size_t v = 0; v < n; v++) {
        double square = 0;
        for (size_t k = 3 * v; k < 3 * v + 3; k++)
            square += (st->result.delivered[k] - r->s.proposed[k]) * (st->result.delivered[k] - r->s.proposed[k]);
        if (square > most) {
            most = square;
            worst = v;
        }
    }
    if (worst < n)
        set_place(found, r->s.start, (uint32_t)worst);
}

static void test_differs(const predicate *p, const reduced *r, const stepper *st, finding *found)
{
    rdl_settings others[2] = {p->has_other ? p->other : p->settings, p->settings};
    unsigned threads[2] = {p->has_other ? 1 : 4, 2};
    others[1].vector = others[1].vector != 0 ? 0 : 1;
    size_t n = r->s.scene.vertex_count;
    for (int k = 0; k < (p->has_other ? 1 : 2) && !found->holds; k++) {
        stepper other;
        if (stepper_create(&other, &r->s, &others[k], threads[k], false, NULL) != RDL_OK)
            return;
        if (stepper_run(&other, &r->s, false, NULL) == RDL_OK)
            for (size_t v = 0; v < n && !found->holds; v++)
                if (memcmp(other.result.delivered + 3 * v, st->result.delivered + 3 * v, 3 * sizeof(double)) != 0) {
                    found->holds = true;
                    set_place(found, r->s.start, (uint32_t)v);
                    snprintf(found->what, sizeof found->what, "vertex %zu is delivered with other bits", v);
                }
        stepper_release(&other);
    }
}

static void test_command(const predicate *p, const reduced *r, size_t number, finding *found)
{
    char path[4200], *argument;
    snprintf(path, sizeof path, "%.4000s.test-%zu.h5", p->scratch, number);
    argument = path;
    unlink(path);
    if (reduce_write_shot(r, p, path) != CLI_DONE) /* as given: what the engine makes of it is the command's business */
        return;
    pid_t child = fork();
    if (child == 0) {
        execl("/bin/sh", "sh", "-c", p->command, "sh", argument, (char *)NULL);
        _exit(127);
    }
    int state = 0;
    while (child > 0 && waitpid(child, &state, 0) < 0 && !cli_interrupted())
        continue;
    unlink(path);
    int code = child > 0 && WIFEXITED(state) ? WEXITSTATUS(state) : -1;
    found->holds = code == p->exit_code;
    snprintf(found->what, sizeof found->what, "the command ends with code %d", code);
}

static void test_step(const predicate *p, const reduced *r, finding *found)
{
    stepper st;
    if (stepper_create(&st, &r->s, &p->settings, 1, false, NULL) != RDL_OK)
        return;
    if (stepper_run(&st, &r->s, false, NULL) == RDL_OK) {
        const rdl_report *report = &st.result.report;
        bool quiet = report->verdict == RDL_CLEAR || report->verdict == RDL_RESOLVED;
        if (p->kind == KEEP_VERDICT) {
            found->holds = (int)report->verdict == p->verdict;
            snprintf(found->what, sizeof found->what, "the verdict is %s", verdicts[report->verdict]);
        } else if (p->kind == KEEP_ABOVE) {
            double number = measure_of(report, p->measure);
            found->holds = number > p->bound;
            snprintf(found->what, sizeof found->what, "%s %.9g", measures[p->measure], number);
        } else if (p->kind == KEEP_DIFFERS) {
            test_differs(p, r, &st, found);
        } else if (p->kind != KEEP_MISSED || quiet) {
            judge_way(p, r, &st, found);
        }
        if (found->holds && !found->has_place)
            find_place(r, &st, found);
    }
    stepper_release(&st);
}

void predicate_test(const predicate *p, const reduced *r, size_t number, finding *found)
{
    memset(found, 0, sizeof *found);
    if (r->s.scene.vertex_count == 0)
        return;
    if (p->kind == KEEP_COMMAND)
        test_command(p, r, number, found);
    else if (p->as_given)
        judge_way(p, r, NULL, found);
    else
        test_step(p, r, found);
}
