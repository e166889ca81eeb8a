/* narrow/distance.c: closest points at rest with a certified enclosure of the distance; exact end tests. */
#include "narrow/exact_pair.h"
#include "narrow/filter.h"
#include "narrow/stages.h"

static const double unit = 0x1p-52;

static double size_of(const double v[3])
{
    return fabs(v[0]) + fabs(v[1]) + fabs(v[2]);
}

/* sqrt(num / den) 2^shift, rounded outward by more than the roundings here. */
static void root_of_ratio(rdli_ratio square, int64_t shift, double *lo, double *hi)
{
    int64_t top = rdli_int_bits(square.num) & ~(int64_t)1, bottom = rdli_int_bits(square.den) & ~(int64_t)1;
    double low = sqrt(rdli_int_below(square.num, -top) / rdli_int_above(square.den, -bottom)) * (1 - 4 * unit);
    double high = sqrt(rdli_int_above(square.num, -top) / rdli_int_below(square.den, -bottom)) * (1 + 4 * unit);
    shift += (top - bottom) / 2;
    shift = shift < -3000 ? -3000 : shift > 3000 ? 3000 : shift;
    *lo = nextafter(ldexp(low, (int)shift), 0);
    *lo = isinf(*lo) ? DBL_MAX : *lo;
    *hi = nextafter(ldexp(high, (int)shift), (double)INFINITY);
}

static bool exact_enclosure(mp_limb_t *limbs, size_t room, int kind, const double x[4][3], double *lo, double *hi)
{
    rdli_arena arena = {limbs, 0, room, false};
    rdl_motion rest;
    memcpy(rest.start, x, sizeof rest.start);
    memcpy(rest.end, x, sizeof rest.end);
    rdli_exact_pair pair;
    int u = rdli_common_unit(&rest, 0);
    rdli_exact_pair_of(&arena, kind, &rest, u, &pair);
    rdli_ratio square = rdli_squared_distance(&arena, &pair, 0);
    if (arena.overflow)
        return false;
    if (square.num.size == 0)
        *lo = *hi = 0;
    else
        root_of_ratio(square, u, lo, hi);
    return true;
}

static __attribute__((noinline)) bool wide_enclosure(int kind, const double x[4][3], double *lo, double *hi)
{
    mp_limb_t limbs[RDLI_LARGE_ROOM];
    return exact_enclosure(limbs, RDLI_LARGE_ROOM, kind, x, lo, hi);
}

__attribute__((noinline)) void rdli_exact_enclosure(int kind, const double x[4][3], rdli_enclosure *enclosure)
{
    mp_limb_t limbs[RDLI_SMALL_ROOM];
    if (!exact_enclosure(limbs, RDLI_SMALL_ROOM, kind, x, &enclosure->lo, &enclosure->hi))
        wide_enclosure(kind, x, &enclosure->lo, &enclosure->hi);
}

/* Where the difference of the closest points cancels: the unit normal of the features, on the side of d; zero where there
 * is none. */
static void normal_of_features(const rdli_frame *f, const double d[3], double normal[3])
{
    rdli_cross(f->u, f->v, normal);
    double length = rdli_length(normal);
    for (int k = 0; k < 3; k++)
        normal[k] = length > 0 ? normal[k] / length : 0;
    if (rdli_dot(normal, d) < 0)
        for (int k = 0; k < 3; k++)
            normal[k] = -normal[k];
}

/* The features do not meet, but doubles see no distance: their normal on the side that doubles see, or any direction. */
static void any_normal(int kind, const rdli_frame *f, double normal[3])
{
    double w[3];
    for (int k = 0; k < 3; k++)
        w[k] = kind == RDL_POINT_TRIANGLE ? f->w[k] : -f->w[k];
    normal_of_features(f, w, normal);
    if (rdli_dot(normal, normal) == 0)
        normal[0] = 1;
}

void rdli_closest_points(int kind, const double x[4][3], rdli_closest *closest)
{
    double scaled[4][3];
    int shift = rdli_scale_points((const double *)x, 12, (double *)scaled);
    rdli_frame frame = rdli_frame_of(kind, (const double (*)[3])scaled);
    rdli_nearest nearest;
    rdli_nearest_points(kind, &frame, &nearest);
    double length = sqrt(nearest.d[0] * nearest.d[0] + nearest.d[1] * nearest.d[1] + nearest.d[2] * nearest.d[2]);
    memcpy(closest->weight, nearest.weight, sizeof closest->weight);
    for (int k = 0; k < 3; k++)
        closest->normal[k] = length > 0 ? nearest.d[k] / length : 0;
    /* a feasible combination of the rounded frame: 6 roundings of sums of at most this size */
    double size = size_of(frame.w) + size_of(frame.u) + size_of(frame.v);
    double hi = length * (1 + 8 * unit) + 8 * unit * size + RDLI_UNDERFLOW;
    double lo = rdli_least_along(kind, (const double (*)[3])scaled, closest->normal) * (1 - 8 * unit);
    if (!(lo > 0 && hi - lo <= RDLI_TIGHT * hi)) {
        double normal[3];
        normal_of_features(&frame, closest->normal, normal);
        double other = rdli_least_along(kind, (const double (*)[3])scaled, normal) * (1 - 8 * unit);
        lo = other > lo ? other : lo;
    }
    if (lo > 0 && hi - lo <= RDLI_TIGHT * hi) {
        closest->distance_lo = rdli_unscaled(lo, shift, 0);
        closest->distance_hi = rdli_unscaled(hi, shift, (double)INFINITY);
        return;
    }
    rdli_enclosure exact;
    rdli_exact_enclosure(kind, x, &exact);
    closest->distance_lo = exact.lo;
    closest->distance_hi = exact.hi;
    if (closest->distance_hi == 0)
        memset(closest->normal, 0, sizeof closest->normal);
    else if (length == 0)
        any_normal(kind, &frame, closest->normal);
}

/* Sign of distance(end) - other, where other is a length or, where it is negative, the distance at the start. */
static bool compare_end(mp_limb_t *limbs, size_t room, int kind, const rdl_motion *motion, double other, int *order)
{
    rdli_arena arena = {limbs, 0, room, false};
    if (other >= 0) {
        *order = rdli_exact_against_gap(&arena, kind, motion, other, 1);
        return !arena.overflow;
    }
    rdli_exact_pair pair;
    rdli_exact_pair_of(&arena, kind, motion, rdli_common_unit(motion, 0), &pair);
    rdli_ratio start = rdli_squared_distance(&arena, &pair, 0), end = rdli_squared_distance(&arena, &pair, 1);
    *order = rdli_int_compare(rdli_int_mul(&arena, end.num, start.den), rdli_int_mul(&arena, start.num, end.den));
    return !arena.overflow;
}

static __attribute__((noinline)) int wide_compare(int kind, const rdl_motion *motion, double other)
{
    mp_limb_t limbs[RDLI_LARGE_ROOM];
    int order = -1;
    return compare_end(limbs, RDLI_LARGE_ROOM, kind, motion, other, &order) ? order : -1;
}

static __attribute__((noinline)) int certain_compare(int kind, const rdl_motion *motion, double other)
{
    mp_limb_t limbs[RDLI_SMALL_ROOM];
    int order = -1;
    if (compare_end(limbs, RDLI_SMALL_ROOM, kind, motion, other, &order))
        return order;
    return wide_compare(kind, motion, other);
}

/* Nothing moves. */
static bool nothing_moves(const rdl_motion *motion)
{
    for (int i = 0; i < 4; i++)
        for (int k = 0; k < 3; k++)
            if (motion->start[i][k] != motion->end[i][k])
                return false;
    return true;
}

bool rdli_end_reaches(int kind, const rdl_motion *motion, const rdli_enclosure *end, double length)
{
    if (end->lo >= length)
        return true;
    if (end->hi < length)
        return false;
    return certain_compare(kind, motion, length) >= 0;
}

bool rdli_end_keeps(int kind, const rdl_motion *motion, double gap, const rdli_enclosure ends[2])
{
    if (nothing_moves(motion) || rdli_end_reaches(kind, motion, &ends[1], gap) || ends[0].hi <= ends[1].lo)
        return true;
    if (ends[1].hi < ends[0].lo)
        return false;
    return certain_compare(kind, motion, -1) >= 0;
}

bool rdli_end_keeps_floor(int kind, const rdl_motion *motion, double gap)
{
    if (nothing_moves(motion))
        return true;
    rdli_closest start, end;
    rdli_closest_points(kind, motion->end, &end);
    if (end.distance_lo >= gap)
        return true;
    rdli_closest_points(kind, motion->start, &start);
    rdli_enclosure ends[2] = {{start.distance_lo, start.distance_hi}, {end.distance_lo, end.distance_hi}};
    return rdli_end_keeps(kind, motion, gap, ends);
}
