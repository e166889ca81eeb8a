/* oracle/apart.c: floors, the judgement "apart", and the least distance of a moving pair; see oracle.h. */
#include <math.h>

#include "oracle.h"

void oracle_floors_init(oracle_floors *floors)
{
    mpq_init(floors->start2);
    mpq_init(floors->end2);
    mpq_init(floors->path2);
}

void oracle_floors_clear(oracle_floors *floors)
{
    mpq_clear(floors->start2);
    mpq_clear(floors->end2);
    mpq_clear(floors->path2);
}

void oracle_floors_set(oracle_floors *floors, int kind, const double start[4][3], double gap, double share)
{
    mpq_t factor;
    mpq_init(factor);
    oracle_rest_distance2(kind, start, floors->start2);
    oracle_square_gap(floors->end2, gap, 0);
    if (mpq_cmp(floors->start2, floors->end2) < 0)
        mpq_set(floors->end2, floors->start2);
    mpq_set_d(factor, share);
    mpq_mul(factor, factor, factor);
    mpq_mul(floors->path2, floors->end2, factor);
    mpq_clear(factor);
}

oracle_apart oracle_pair_apart(int kind, const rdl_motion pieces[], size_t count, double gap, double share)
{
    oracle_apart answer = {0};
    oracle_floors floors;
    oracle_touch touch;
    mpq_t end2;
    mpq_init(end2);
    oracle_floors_init(&floors);
    oracle_touch_init(&touch);
    oracle_floors_set(&floors, kind, (const double(*)[3])pieces[0].start, gap, share);
    oracle_rest_distance2(kind, (const double(*)[3])pieces[count - 1].end, end2);
    answer.start_zero = mpq_sgn(floors.start2) == 0;
    answer.end_kept = mpq_cmp(end2, floors.end2) >= 0;
    answer.path_kept = true;
    for (size_t i = 0; i < count && answer.path_kept; i++) {
        oracle_find(kind, &pieces[i], floors.path2, &touch);
        answer.path_kept = !touch.touches;
    }
    answer.apart = answer.end_kept && answer.path_kept;
    oracle_touch_clear(&touch);
    oracle_floors_clear(&floors);
    mpq_clear(end2);
    return answer;
}

bool oracle_end_keeps_floor(int kind, const rdl_motion *motion, double gap)
{
    oracle_floors floors;
    mpq_t end2;
    mpq_init(end2);
    oracle_floors_init(&floors);
    oracle_floors_set(&floors, kind, motion->start, gap, 1.0);
    oracle_rest_distance2(kind, motion->end, end2);
    bool kept = mpq_cmp(end2, floors.end2) >= 0;
    oracle_floors_clear(&floors);
    mpq_clear(end2);
    return kept;
}

static bool reaches(int kind, const rdl_motion *motion, double gap, oracle_touch *touch)
{
    mpq_t gap2;
    mpq_init(gap2);
    oracle_square_gap(gap2, gap, 0);
    oracle_find(kind, motion, gap2, touch);
    mpq_clear(gap2);
    return touch->touches;
}

/* Upper bound of a square root of a non-negative rational, as a double; infinity when it is beyond all doubles. */
static double root_above(const mpq_t square)
{
    if (mpq_sgn(square) == 0)
        return 0.0;
    long above, below;
    double top = mpz_get_d_2exp(&above, mpq_numref(square)), bottom = mpz_get_d_2exp(&below, mpq_denref(square));
    long exponent = above - below;
    double ratio = top / bottom;
    if (exponent % 2 != 0) {
        ratio *= 2.0;
        exponent--;
    }
    double value = ldexp(sqrt(ratio) * (1.0 + 0x1p-48), (int)(exponent / 2));
    return nextafter(value, INFINITY);
}

void oracle_least_distance(int kind, const rdl_motion *motion, double *lo, double *hi)
{
    oracle_touch touch;
    mpq_t start2;
    mpq_init(start2);
    oracle_touch_init(&touch);
    oracle_rest_distance2(kind, motion->start, start2);
    *lo = *hi = 0.0;
    if (!reaches(kind, motion, 0.0, &touch)) {
        *hi = root_above(start2);
        *hi = *hi > 0x1p1023 ? 0x1.fffffffffffffp1023 : *hi;
        /* Halve on a logarithmic scale first: the least distance may be many orders below the start distance. */
        int top, bottom = -1100;
        (void)frexp(*hi, &top);
        while (top - bottom > 1) {
            int middle = (top + bottom) / 2;
            if (reaches(kind, motion, ldexp(1.0, middle), &touch))
                top = middle;
            else
                bottom = middle;
        }
        *lo = ldexp(1.0, bottom);
        *hi = fmin(*hi, ldexp(1.0, top));
        for (int i = 0; i < 32; i++) {
            double middle = *lo + 0.5 * (*hi - *lo);
            if (reaches(kind, motion, middle, &touch))
                *hi = middle;
            else
                *lo = middle;
        }
    }
    oracle_touch_clear(&touch);
    mpq_clear(start2);
}
