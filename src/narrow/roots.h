/* narrow/roots.h: touch at gap 0 by isolating the roots of the coplanarity cubic with certified signs in doubles. Inside
 * narrow only. */
#ifndef RDLI_ROOTS_H
#define RDLI_ROOTS_H

#include "narrow/filter.h"

/* For ordinary sizes (rdli_scale_points). False where doubles cannot decide: touch is then untouched. */
bool rdli_roots_touch(int kind, const rdl_motion *motion, rdl_touch *touch);

#endif
