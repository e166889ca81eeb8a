/* narrow/roots.h: touch at gap 0 by isolating the roots of the coplanarity cubic with certified signs in doubles. Inside
 * narrow only. */
#ifndef RDLI_ROOTS_H
#define RDLI_ROOTS_H

#include "narrow/filter.h"

/* For frames of ordinary size (rdli_scale_points). False where doubles cannot decide: touch is then untouched. */
bool rdli_roots_touch(int kind, const rdli_frame *start, const rdli_frame *end, rdl_touch *touch);

#endif
