/* narrow/roots.h: touch at gap 0 by isolating the roots of the coplanarity cubic with certified signs in doubles. Inside
 * narrow only. */
#ifndef RDLI_ROOTS_H
#define RDLI_ROOTS_H

#include "narrow/filter.h"

/* A quadratic in Bernstein form on [0, 1], each coefficient certain to the bound, also after restriction. */
typedef struct rdli_quadratic {
    double c[3], bound;
} rdli_quadratic;

/* The pair's polynomials in doubles: n = u x v and f = w . n, with bounds. */
typedef struct rdli_cubic {
    int kind, spans, most_spans;
    rdli_frame at[2];
    rdli_quadratic n[3];
    double f[4], bound;
    double pad, size;
} rdli_cubic;
rdli_cubic rdli_cubic_of(int kind, const rdli_frame *start, const rdli_frame *end);

enum rdli_inside { RDLI_INSIDE_NO, RDLI_INSIDE_MAYBE, RDLI_INSIDE_YES };

/* Where the meeting point lies at any instant of [a, b] at which the pair is coplanar: certainly outside a feature,
 * certainly inside both, or unknown. */
enum rdli_inside rdli_cubic_inside(const rdli_cubic *s, double a, double b);

/* For a pair that is coplanar all the time: does the point of the couple (rdli_point_segments: 3 for PT, 4 for EE) come onto
 * its segment in (0, 1)? YES: [lo, hi] encloses the first such time and [0, lo] is free of such times. MAYBE: [0, lo] is free
 * of such times where hi >= 0. */
enum rdli_inside rdli_planar_event(const rdli_cubic *s, int couple, double *lo, double *hi);

/* Gap 0, for coordinates that are integers of at most 59 bits in some unit: exact signs in words of 128 bits, for a contact
 * at the start, planar motion, and a contact at the end with nothing before it. shift: of the frames in s
 * (rdli_scale_points). False where that does not decide: touch is then untouched. */
bool rdli_words_touch(const rdli_cubic *s, const rdl_motion *motion, int shift, rdl_touch *touch);

/* For frames of ordinary size (rdli_scale_points). False where doubles cannot decide: touch is then untouched. */
bool rdli_roots_touch(const rdli_cubic *cubic, rdl_touch *touch);

#endif
