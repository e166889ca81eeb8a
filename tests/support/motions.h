/* support/motions.h: the members of the families of families.h; each fills all eight points. */
#ifndef SUPPORT_MOTIONS_H
#define SUPPORT_MOTIONS_H

#include "raddle/query.h"
#include "random.h"

typedef void motion_maker(random_source *source, int kind, rdl_motion *motion);

motion_maker make_random, make_grid, make_small_grid, make_near_parallel, make_near_coplanar, make_tilted_plane,
    make_flat_plane, make_graze, make_triple_root, make_border, make_corner, make_at_start, make_at_end, make_tiny, make_subnormal,
    make_offset, make_mixed, make_rotation, make_sliver, make_zero_edge, make_fast_thin, make_cloth, make_strands,
    make_layers, make_still;

#endif
