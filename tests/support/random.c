/* support/random.c: see random.h. */
#include "random.h"

#include <math.h>

random_source random_from(uint64_t seed)
{
    return (random_source){seed};
}

uint64_t random_bits(random_source *source)
{
    uint64_t z = source->state += 0x9e3779b97f4a7c15u;
    z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9u;
    z = (z ^ (z >> 27)) * 0x94d049bb133111ebu;
    return z ^ (z >> 31);
}

uint32_t random_below(random_source *source, uint32_t bound)
{
    return (uint32_t)((random_bits(source) >> 32) * bound >> 32);
}

double random_between(random_source *source, double lo, double hi)
{
    return lo + (hi - lo) * ((double)(random_bits(source) >> 11) * 0x1p-53);
}

double random_grid(random_source *source, int reach)
{
    return (double)random_below(source, (uint32_t)(2 * reach + 1)) - reach;
}

void random_direction(random_source *source, double direction[3])
{
    double square;
    do {
        square = 0.0;
        for (int k = 0; k < 3; k++) {
            direction[k] = random_between(source, -1.0, 1.0);
            square += direction[k] * direction[k];
        }
    } while (square > 1.0 || square < 1e-4);
    for (int k = 0; k < 3; k++)
        direction[k] /= sqrt(square);
}

void random_rotation(random_source *source, double matrix[3][3])
{
    double q[4], square;
    do {
        square = 0.0;
        for (int k = 0; k < 4; k++) {
            q[k] = random_between(source, -1.0, 1.0);
            square += q[k] * q[k];
        }
    } while (square > 1.0 || square < 1e-4);
    for (int i = 0; i < 3; i++) {
        int j = (i + 1) % 3, k = (i + 2) % 3;
        matrix[i][i] = 1.0 - 2.0 * (q[j] * q[j] + q[k] * q[k]) / square;
        matrix[i][j] = 2.0 * (q[i] * q[j] - q[k] * q[3]) / square;
        matrix[i][k] = 2.0 * (q[i] * q[k] + q[j] * q[3]) / square;
    }
}
