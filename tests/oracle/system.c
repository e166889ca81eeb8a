/* oracle/system.c: see system.h. */
#include "system.h"

void system_init(condition_system *s)
{
    s->count = 0;
    for (int k = 0; k < SYSTEM_MAX; k++)
        poly_init(&s->p[k]);
}

void system_clear(condition_system *s)
{
    for (int k = 0; k < SYSTEM_MAX; k++)
        poly_clear(&s->p[k]);
}

void system_restart(condition_system *s)
{
    s->count = 0;
}

poly *system_add(condition_system *s, relation wanted)
{
    s->wanted[s->count] = wanted;
    return &s->p[s->count++];
}

void arrangement_init(arrangement *a)
{
    a->count = 0;
    for (int i = 0; i < SYSTEM_ROOTS_MAX; i++)
        root_init(&a->at[i]);
    for (int k = 0; k < SYSTEM_MAX; k++)
        poly_init(&a->squarefree[k]);
}

void arrangement_clear(arrangement *a)
{
    for (int i = 0; i < SYSTEM_ROOTS_MAX; i++)
        root_clear(&a->at[i]);
    for (int k = 0; k < SYSTEM_MAX; k++)
        poly_clear(&a->squarefree[k]);
}

static const poly *owner_of(const arrangement *a, int i)
{
    return a->owner[i] < 0 ? NULL : &a->squarefree[a->owner[i]];
}

/* Puts a root of polynomial k in its place, or joins it with an equal one. */
static void insert(arrangement *a, root *r, int k)
{
    int place = a->count;
    while (place > 0) {
        int before = place - 1;
        int order = roots_compare(&a->at[before], owner_of(a, before), r, &a->squarefree[k]);
        if (order == 0) {
            a->vanishing[before] |= 1u << k;
            return;
        }
        if (order < 0)
            break;
        place = before;
    }
    /* The root structures are moved as a whole; the spare one goes to the free place. */
    root spare = a->at[a->count];
    for (int i = a->count; i > place; i--) {
        a->at[i] = a->at[i - 1];
        a->owner[i] = a->owner[i - 1];
        a->vanishing[i] = a->vanishing[i - 1];
    }
    a->at[place] = spare;
    root_set(&a->at[place], r);
    a->owner[place] = k;
    a->vanishing[place] = 1u << k;
    a->count++;
}

static void start(arrangement *a)
{
    for (unsigned long end = 0; end < 2; end++) {
        root_set_exact(&a->at[end], end);
        a->owner[end] = -1;
        a->vanishing[end] = 0;
    }
    a->count = 2;
}

/* Adds the roots of polynomials k in [from, to). */
static void add_roots(arrangement *a, const condition_system *s, int from, int to)
{
    poly_chain chain;
    root found[POLY_DEGREE_MAX];
    poly_chain_init(&chain);
    for (int i = 0; i < POLY_DEGREE_MAX; i++)
        root_init(&found[i]);
    for (int k = from; k < to; k++) {
        if (s->p[k].degree < 1)
            continue;
        poly_squarefree(&a->squarefree[k], &chain, &s->p[k]);
        int count = roots_isolate(&chain, found);
        for (int i = 0; i < count; i++)
            insert(a, &found[i], k);
    }
    poly_chain_clear(&chain);
    for (int i = 0; i < POLY_DEGREE_MAX; i++)
        root_clear(&found[i]);
}

void arrangement_build(arrangement *a, const condition_system *s)
{
    start(a);
    add_roots(a, s, 0, s->count);
}

int arrangement_sign(const arrangement *a, const condition_system *s, int k, int cell)
{
    const root *r = &a->at[cell / 2];
    if (cell % 2 == 0) {
        /* The bracket holds no other root than this one, so that its lower end tells the sign of those that do not
         * vanish. */
        if (s->p[k].degree < 0 || (a->vanishing[cell / 2] >> k & 1u))
            return 0;
        return poly_sign_at(&s->p[k], r->numerator, r->bits);
    }
    mpz_t between;
    unsigned long bits;
    mpz_init(between);
    roots_between(r, r + 1, between, &bits);
    int sign = poly_sign_at(&s->p[k], between, bits);
    mpz_clear(between);
    return sign;
}

static bool accepts(relation wanted, int sign)
{
    switch (wanted) {
    case IS_ZERO:
        return sign == 0;
    case NOT_NEGATIVE:
        return sign >= 0;
    default:
        return sign > 0;
    }
}

/* The first cell in which conditions 0 .. count - 1 hold. */
static bool first_cell(const arrangement *a, const condition_system *s, int count, int *cell)
{
    for (*cell = 0; *cell <= 2 * a->count - 2; ++*cell) {
        bool holds = true;
        for (int k = 0; k < count && holds; k++)
            holds = accepts(s->wanted[k], arrangement_sign(a, s, k, *cell));
        if (holds)
            return true;
    }
    return false;
}

bool system_first(const condition_system *s, root *first, poly *owner)
{
    arrangement a;
    int cell;
    arrangement_init(&a);
    start(&a);
    add_roots(&a, s, 0, 1);
    /* Most pairs end here: condition 0 alone holds nowhere, and the other sequences are not needed. */
    bool found = first_cell(&a, s, 1, &cell);
    if (found) {
        add_roots(&a, s, 1, s->count);
        found = first_cell(&a, s, s->count, &cell);
    }
    if (found) {
        root_set(first, &a.at[cell / 2]);
        const poly *p = owner_of(&a, cell / 2);
        if (p == NULL)
            owner->degree = -1;
        else
            poly_set(owner, p);
    }
    arrangement_clear(&a);
    return found;
}
