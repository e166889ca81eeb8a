/* narrow/distance.c: closest points at rest with a certified enclosure of the distance; exact end tests. */
#include "narrow/exact_pair.h"
#include "narrow/filter.h"
#include "narrow/stages.h"

/* An enclosure narrower than this, relative to the distance, needs no exact arithmetic: two orders finer than any margin
 * that the response works with. */
#define TIGHT 0x1p-36

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

static __attribute__((noinline)) void certain_enclosure(int kind, const double x[4][3], double *lo, double *hi)
{
    mp_limb_t limbs[RDLI_SMALL_ROOM];
    if (!exact_enclosure(limbs, RDLI_SMALL_ROOM, kind, x, lo, hi))
        wide_enclosure(kind, x, lo, hi);
}

/* Where the difference of the closest points cancels although they do not meet: the features' common normal, on the side
 * that doubles see; any direction where there is none. */
static void normal_of_features(int kind, const rdli_frame *f, double normal[3])
{
    double n[3] = {f->u[1] * f->v[2] - f->u[2] * f->v[1], f->u[2] * f->v[0] - f->u[0] * f->v[2],
        f->u[0] * f->v[1] - f->u[1] * f->v[0]};
    double length = sqrt(n[0] * n[0] + n[1] * n[1] + n[2] * n[2]);
    double side = f->w[0] * n[0] + f->w[1] * n[1] + f->w[2] * n[2];
    double sign = (side < 0) == (kind == RDL_POINT_TRIANGLE) ? -1 : 1;
    normal[0] = 1;
    normal[1] = normal[2] = 0;
    for (int k = 0; length > 0 && k < 3; k++)
        normal[k] = sign * n[k] / length;
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
    if (lo > 0 && hi - lo <= TIGHT * hi) {
        closest->distance_lo = shift ? nextafter(ldexp(lo, -shift), 0) : lo;
        closest->distance_hi = shift ? nextafter(ldexp(hi, -shift), (double)INFINITY) : hi;
        return;
    }
    certain_enclosure(kind, x, &closest->distance_lo, &closest->distance_hi);
    if (closest->distance_hi == 0)
        memset(closest->normal, 0, sizeof closest->normal);
    else if (length == 0)
        normal_of_features(kind, &frame, closest->normal);
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

/* distance(end) >= length, exactly; `end` holds what doubles know of it. */
static bool end_reaches(int kind, const rdl_motion *motion, const rdli_closest *end, double length)
{
    if (end->distance_lo >= length)
        return true;
    if (end->distance_hi < length)
        return false;
    return certain_compare(kind, motion, length) >= 0;
}

static bool end_keeps(int kind, const rdl_motion *motion, double gap, const rdli_closest *start, const rdli_closest *end)
{
    if (end_reaches(kind, motion, end, gap))
        return true;
    if (start->distance_hi <= end->distance_lo)
        return true;
    if (end->distance_hi < start->distance_lo)
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
    return end_keeps(kind, motion, gap, &start, &end);
}

void rdli_examine_open(int kind, const rdl_motion *motion, double gap, double share, const double floor_distance[2],
                       rdli_examined *examined)
{
    rdli_closest start, end;
    rdli_sized sized;
    rdli_sized_of(motion, &sized);
    rdli_frame first = rdli_frame_of(kind, (const double (*)[3])sized.motion.start);
    rdli_frame last = rdli_frame_of(kind, (const double (*)[3])sized.motion.end);
    double apart = rdli_frames_apart(kind, &first, &last); /* in units of the scaled motion */
    *examined = (rdli_examined){.quiet = apart > ldexp(gap, sized.shift)};
    if (examined->quiet)
        return;
    rdli_closest_points(kind, motion->start, &start);
    rdli_closest_points(kind, motion->end, &end);
    examined->start_lo = start.distance_lo;
    examined->start_hi = start.distance_hi;
    examined->contact_at_start = start.distance_hi == 0;
    double from = floor_distance ? floor_distance[1] : start.distance_hi;
    examined->end_floor = from < gap ? from : gap;
    /* never below the exact product */
    examined->path_floor = examined->end_floor > 0 ? nextafter(share * examined->end_floor, (double)INFINITY) : 0;
    if (floor_distance)
        examined->below_end = !end_reaches(kind, motion, &end, examined->end_floor);
    else
        examined->below_end = !nothing_moves(motion) && !end_keeps(kind, motion, gap, &start, &end);
    if (apart > ldexp(examined->path_floor, sized.shift))
        examined->touch = (rdl_touch){.time_lo = 1, .time_hi = 1, .stage = RDL_STAGE_DIRECTION, .order = 1};
    else
        rdli_find_open_touch(kind, motion, &sized, examined->path_floor, &examined->touch);
    examined->reaches_path = examined->touch.touches;
}

void rdli_examine(int kind, const rdl_motion *motion, double gap, double share, const double floor_distance[2],
                  rdli_examined *examined)
{
    rdl_touch touch;
    rdli_sized sized;
    rdli_sized_of(motion, &sized);
    if (rdli_screen_one(rdli_screen_choose(), kind, &sized, gap, &touch))
        *examined = (rdli_examined){.quiet = 1};
    else
        rdli_examine_open(kind, motion, gap, share, floor_distance, examined);
}
