/* driver/clock.c: the monotonic clock, for reports and time limits. */
#include <time.h>

#include "driver/engine.h"

double rdli_now(void)
{
    struct timespec now;
    clock_gettime(CLOCK_MONOTONIC, &now);
    return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}
