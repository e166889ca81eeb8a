/* narrow/interval.h: gap > 0 in double arithmetic. Inside narrow only. */
#ifndef RDLI_INTERVAL_H
#define RDLI_INTERVAL_H

#include "narrow/narrow.h"

enum rdli_settled { RDLI_UNSETTLED = 0, RDLI_SETTLED = 1 };

/* motion of ordinary size (rdli_scale_points), gap > 0. Settled answers are certified: free, or touching with a bracket
 * of at most 2^-21 whose lower end is certified free. */
enum rdli_settled rdli_interval_gap(int kind, const rdl_motion *motion, double gap, rdl_touch *touch);

#endif
