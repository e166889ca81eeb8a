/* broad/apart_body.h: a certificate that a pair stays further apart than its gap, LANES_REALS pairs at a time. Included by
 * kernels_body.h.
 *
 * Let w, u, v be the frame of a pair, e = w + s u - r v (edges, 0 <= s, r <= 1) or e = w - b u - c v (point and triangle,
 * 0 <= b, c, b + c <= 1) the difference of a point of one feature and a point of the other. e is linear in time and in
 * the parameters of each feature, so for any d the least d . e over the whole step is taken at a corner at the start or
 * the end, and the distance is at least that over |d| (the convex hull bound, docs/method/broad.md). We take for d the
 * difference of the closest points in the middle of the step. Motion that both features share drops out of e, and
 * neighbours in a lock are told apart along their own normal rather than along the axes.
 *
 * Rounding, with u = 2^-23 (any rounding mode); the unit of length is the grid's step. d is what it is, whatever its own
 * rounding. A component of w, u or v is the exact difference of two whole numbers, converted with relative error u; the
 * coordinates themselves are within one step, so it is within two steps and a relative u of the truth. A dot product of
 * three terms adds three roundings per term, and the combination of the three dots two more, so with S = sum over k of
 * |d_k| (|w_k| + |u_k| + |v_k|) the computed least value is wrong by at most 8 u S + 6 |d|_1; 16 u S + 7 |d|_1 also covers
 * the rounding of S, of |d|_1 and of the subtraction. It certifies when L = least - that > 0 and
 * L^2 > gap^2 d . d (1 + 2^-16); the factor covers the eight roundings of the two sides. Underflow: gap is taken as 2^-50 at
 * least, and L > 2^-55 and d . d > 2^-100 are asked for, beside which losses below 2^-126 are nothing. Overflow gives
 * infinities and NaN, which compare as "not certified", but for L^2 = infinity, which holds when gap^2 d . d is finite. */

/* Three dots with d, of one end of the step. */
static inline lanes_real least_of_edges(lanes_real w, lanes_real u, lanes_real v)
{
    const lanes_real zero = lanes_all(0.0f);
    return lanes_sub(lanes_add(w, lanes_min(u, zero)), lanes_max(v, zero));
}

static inline lanes_real least_of_triangle(lanes_real w, lanes_real u, lanes_real v)
{
    return lanes_sub(w, lanes_max(lanes_max(u, v), lanes_all(0.0f)));
}

static inline lanes_real dot(const lanes_real a[3], const lanes_real b[3])
{
    return lanes_add(lanes_add(lanes_mul(a[0], b[0]), lanes_mul(a[1], b[1])), lanes_mul(a[2], b[2]));
}

static inline lanes_real within_unit(lanes_real x)
{
    return lanes_min(lanes_max(x, lanes_all(0.0f)), lanes_all(1.0f)); /* NaN gives 0 */
}

typedef struct frame {
    lanes_real w[3], u[3], v[3];
} frame;

/* Closest points of two segments (Eberly 2015, without its case analysis: any d will do). */
static inline void direction_of_edges(const frame *m, lanes_real d[3])
{
    lanes_real uu = dot(m->u, m->u), uv = dot(m->u, m->v), vv = dot(m->v, m->v), uw = dot(m->u, m->w), vw = dot(m->v, m->w);
    lanes_real determinant = lanes_sub(lanes_mul(uu, vv), lanes_mul(uv, uv));
    lanes_real s = within_unit(lanes_div(lanes_sub(lanes_mul(uv, vw), lanes_mul(vv, uw)), determinant));
    lanes_real r = within_unit(lanes_div(lanes_add(vw, lanes_mul(s, uv)), vv));
    s = within_unit(lanes_div(lanes_sub(lanes_mul(r, uv), uw), uu));
    for (unsigned k = 0; k < 3; k++)
        d[k] = lanes_sub(lanes_add(m->w[k], lanes_mul(s, m->u[k])), lanes_mul(r, m->v[k]));
}

/* From the segment base, base - side to the origin; kept in d and *square where it is shorter. */
static inline void try_side(const lanes_real base[3], const lanes_real side[3], lanes_real d[3], lanes_real *square)
{
    lanes_real r = within_unit(lanes_div(dot(base, side), dot(side, side))), x[3];
    for (unsigned k = 0; k < 3; k++)
        x[k] = lanes_sub(base[k], lanes_mul(r, side[k]));
    lanes_real own = dot(x, x);
    for (unsigned k = 0; k < 3; k++)
        d[k] = lanes_choose_less(own, *square, x[k], d[k]);
    *square = lanes_min(own, *square);
}

/* Closest point of a triangle: inside, or on one of the three sides. */
static inline void direction_of_triangle(const frame *m, lanes_real d[3])
{
    lanes_real uu = dot(m->u, m->u), uv = dot(m->u, m->v), vv = dot(m->v, m->v), uw = dot(m->u, m->w), vw = dot(m->v, m->w);
    lanes_real determinant = lanes_sub(lanes_mul(uu, vv), lanes_mul(uv, uv));
    lanes_real b = lanes_div(lanes_sub(lanes_mul(vv, uw), lanes_mul(uv, vw)), determinant);
    lanes_real c = lanes_div(lanes_sub(lanes_mul(uu, vw), lanes_mul(uv, uw)), determinant);
    lanes_real inside[3], side[3], base[3], square = lanes_all(INFINITY);
    for (unsigned k = 0; k < 3; k++) {
        inside[k] = lanes_sub(lanes_sub(m->w[k], lanes_mul(b, m->u[k])), lanes_mul(c, m->v[k]));
        side[k] = lanes_sub(m->v[k], m->u[k]);
        base[k] = lanes_sub(m->w[k], m->u[k]);
        d[k] = m->w[k];
    }
    try_side(m->w, m->u, d, &square);
    try_side(m->w, m->v, d, &square);
    try_side(base, side, d, &square);
    lanes_real least = lanes_min(lanes_min(b, c), lanes_sub(lanes_sub(lanes_all(1.0f), b), c));
    for (unsigned k = 0; k < 3; k++) /* least is NaN for a triangle without area */
        d[k] = lanes_choose_less(lanes_all(0.0f), least, inside[k], d[k]);
}

/* least - 16 u S of one end. */
static inline lanes_real sure_least(const frame *f, const lanes_real d[3], bool edges)
{
    lanes_real size = lanes_all(0.0f);
    for (unsigned k = 0; k < 3; k++)
        size = lanes_add(size, lanes_mul(lanes_abs(d[k]), lanes_add(lanes_add(lanes_abs(f->w[k]), lanes_abs(f->u[k])),
                                                                      lanes_abs(f->v[k]))));
    lanes_real w = dot(d, f->w), u = dot(d, f->u), v = dot(d, f->v);
    lanes_real least = edges ? least_of_edges(w, u, v) : least_of_triangle(w, u, v);
    return lanes_sub(least, lanes_mul(lanes_all(0x1p-19f), size));
}

/* Bit j: pair j stays apart for sure. */
static inline unsigned sure_apart(const frame *start, const frame *end, lanes_real gap, bool edges)
{
    frame middle;
    lanes_real d[3];
    for (unsigned k = 0; k < 3; k++) { /* twice the middle: the length of d does not matter */
        middle.w[k] = lanes_add(start->w[k], end->w[k]);
        middle.u[k] = lanes_add(start->u[k], end->u[k]);
        middle.v[k] = lanes_add(start->v[k], end->v[k]);
    }
    if (edges)
        direction_of_edges(&middle, d);
    else
        direction_of_triangle(&middle, d);
    lanes_real spread = lanes_add(lanes_add(lanes_abs(d[0]), lanes_abs(d[1])), lanes_abs(d[2]));
    lanes_real least = lanes_min(sure_least(start, d, edges), sure_least(end, d, edges));
    least = lanes_sub(least, lanes_mul(lanes_all(7.0f), spread));
    gap = lanes_max(gap, lanes_all(0x1p-50f));
    lanes_real square = dot(d, d), needed = lanes_mul(lanes_mul(gap, gap), lanes_mul(square, lanes_all(1.0f + 0x1p-16f)));
    return lanes_less(needed, lanes_mul(least, least)) & lanes_less(lanes_all(0x1p-55f), least) &
           lanes_less(lanes_all(0x1p-100f), square);
}

/* Frames at the start (at = 0) or the end (4) of the step; b[c]: the members of the records of corner c. */
static inline void frame_of_edges(const rdli_record *a, lanes_bits b[2][8], unsigned at, frame *f)
{
    const int32_t *first = at == 0 ? a[0].start : a[0].end, *last = at == 0 ? a[1].start : a[1].end;
    for (unsigned k = 0; k < 3; k++) {
        f->w[k] = lanes_difference(lanes_same(first[k]), b[0][at + k]);
        f->u[k] = lanes_difference(lanes_same(last[k]), lanes_same(first[k]));
        f->v[k] = lanes_difference(b[1][at + k], b[0][at + k]);
    }
}

static inline void frame_of_triangle(const rdli_record *a, lanes_bits b[3][8], unsigned at, frame *f)
{
    const int32_t *point = at == 0 ? a[0].start : a[0].end;
    for (unsigned k = 0; k < 3; k++) {
        f->w[k] = lanes_difference(lanes_same(point[k]), b[0][at + k]);
        f->u[k] = lanes_difference(b[1][at + k], b[0][at + k]);
        f->v[k] = lanes_difference(b[2][at + k], b[0][at + k]);
    }
}

/* Leaves out of scratch->row what stays apart from the element with corners a[]; the number left. */
static __attribute__((noinline)) size_t drop_apart(const rdli_query *query, rdli_scratch *scratch, const uint32_t *a, size_t count)
{
    const bool edges = query->self;
    const unsigned corners = edges ? 2 : 3;
    rdli_record own[2] = {query->records[a[0]], query->records[a[edges ? 1 : 0]]};
    float half = own[0].half > own[1].half ? own[0].half : own[1].half;
    uint32_t *to = scratch->row;
    for (size_t i = count; i % LANES_REALS != 0; i++) /* the last lanes need something to look at */
        scratch->row[i] = scratch->row[count - 1];
    for (size_t at = 0; at < count; at += LANES_REALS) {
        lanes_bits b[3][8];
        lanes_real other = lanes_all(0.0f);
        frame start, end;
        for (unsigned c = 0; c < corners; c++) {
            lanes_records(query->records, query->vertices_b + c, corners, scratch->row + at, b[c]);
            other = lanes_max(other, lanes_as_real(b[c][3]));
        }
        if (edges) {
            frame_of_edges(own, b, 0, &start);
            frame_of_edges(own, b, 4, &end);
        } else {
            frame_of_triangle(own, b, 0, &start);
            frame_of_triangle(own, b, 4, &end);
        }
        unsigned keep = ~sure_apart(&start, &end, lanes_add(lanes_all(half), other), edges);
        keep &= count - at < LANES_REALS ? (1u << (count - at)) - 1 : (1u << LANES_REALS) - 1;
        to = lanes_compress(to, scratch->row + at, keep);
    }
    return (size_t)(to - scratch->row);
}
