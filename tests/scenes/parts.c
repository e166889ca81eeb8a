/* scenes/parts.c: see parts.h. */
#include "parts.h"

#include <math.h>

unsigned accept_clear(const world *w, unsigned step)
{
    (void)w;
    (void)step;
    return CLEAR;
}

unsigned accept_free(const world *w, unsigned step)
{
    (void)w;
    (void)step;
    return CLEAR | RESOLVED;
}

unsigned accept_tangled(const world *w, unsigned step)
{
    (void)w;
    (void)step;
    return TANGLED;
}

void move_vertex(const world *w, uint32_t v, const double shift[3], double (*proposed)[3])
{
    for (int k = 0; k < 3; k++)
        proposed[v][k] = (w->home[v][k] + shift[k]) * w->scale;
}

void move_part(const world *w, uint32_t part, const double shift[3], double (*proposed)[3])
{
    for (uint32_t v = w->part_first[part]; v < w->part_first[part + 1]; v++)
        move_vertex(w, v, shift, proposed);
}

void expect_action(judge *j, unsigned steps, const uint64_t verdicts[4], unsigned least)
{
    uint64_t acted = verdicts[RDL_RESOLVED] + verdicts[RDL_PINCHED] + verdicts[RDL_TANGLED];
    if (acted < least)
        judge_fault(j, steps, "only %llu steps needed a correction, %u expected", (unsigned long long)acted, least);
}

double stretch_between(const world *w, uint32_t a, uint32_t b)
{
    double square = 0.0;
    for (int k = 0; k < 3; k++)
        square += (w->x[a][k] - w->x[b][k]) * (w->x[a][k] - w->x[b][k]);
    return sqrt(square) / w->scale;
}
