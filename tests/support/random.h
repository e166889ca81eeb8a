/* support/random.h: seeded random numbers, the same on every machine. */
#ifndef SUPPORT_RANDOM_H
#define SUPPORT_RANDOM_H

#include <stdint.h>

/* splitmix64 (Steele, Lea & Flood 2014): any seed is fine. */
typedef struct random_source {
    uint64_t state;
} random_source;

random_source random_from(uint64_t seed);
uint64_t random_bits(random_source *source);
/* Uniform integer in [0, bound), bound > 0. */
uint32_t random_below(random_source *source, uint32_t bound);
/* Uniform in [lo, hi). */
double random_between(random_source *source, double lo, double hi);
/* Uniform integer in [-reach, reach], as a double. */
double random_grid(random_source *source, int reach);
/* Uniform direction. */
void random_direction(random_source *source, double direction[3]);
/* Random rotation matrix (Shoemake 1992). */
void random_rotation(random_source *source, double matrix[3][3]);

#endif
