/* narrow/screen_avx2.c: the screen four lanes wide, for x86-64 with AVX2. Elsewhere it is the portable one. */
#include "narrow/screen.h"

#if defined(__x86_64__)
#pragma GCC target("avx2")
#define SCREEN_NAME rdli_screen_avx2
#define SCREEN_WIDTH 4
#include "narrow/screen_kernel.h"
#else
void rdli_screen_avx2(int kind, const rdli_lanes *lanes, uint8_t verdict[RDLI_LANES])
{
    rdli_screen_portable(kind, lanes, verdict);
}
#endif
