/* narrow/screen_kernel.h: the first look in lanes: two directions, then the signs of the cubic. Included after lane_kernel.h. */

typedef struct block {
    frames at[2];
    vec gap, pad;
} block;

LANE_INLINE block block_of(int kind, const points *p, vec gap)
{
    block b = {{frames_of(kind, p->x[0]), frames_of(kind, p->x[1])}, gap, all(0)};
    vec size = larger(frames_size(&b.at[0]), frames_size(&b.at[1]));
    /* three rounded vectors, five roundings in a dot product of terms up to size |d|: 3 x 6 x sqrt(3) x 2^-52 < 2^-47 */
    b.pad = 0x1p-47 * size + RDLI_UNDERFLOW;
    return b;
}

/* All ones where the direction d, or its opposite, separates by more than the gap during the whole motion. */
LANE_INLINE bits separates(int kind, const block *b, const vec3 *d)
{
    vec w[2], u[2], v[2];
    for (int end = 0; end < 2; end++) {
        w[end] = dot(&b->at[end].w, d);
        u[end] = dot(&b->at[end].u, d);
        v[end] = dot(&b->at[end].v, d);
    }
    vec one = smaller(least(kind, w[0], u[0], v[0]), least(kind, w[1], u[1], v[1]));
    vec other = smaller(least(kind, -w[0], -u[0], -v[0]), least(kind, -w[1], -u[1], -v[1]));
    vec best = larger(one, other), bound = (b->gap + b->pad) * (b->gap + b->pad) * dot(d, d) * (1 + 0x1p-48);
    return (best > RDLI_UNDERFLOW) & (best * best > bound + RDLI_UNDERFLOW);
}

LANE_INLINE bits by_directions(int kind, const block *b)
{
    const frames *f = b->at;
    vec3 w = mixed(&f[0].w, &f[1].w, all(0.5), all(0.5)), u = mixed(&f[0].u, &f[1].u, all(0.5), all(0.5));
    vec3 v = mixed(&f[0].v, &f[1].v, all(0.5), all(0.5)), n, c;
    for (int k = 0; k < 3; k++) {
        n.c[k] = cross(&u, &v, k);
        c.c[k] = kind == RDL_POINT_TRIANGLE ? 3 * w.c[k] - (u.c[k] + v.c[k]) : 2 * w.c[k] + (v.c[k] - u.c[k]);
    }
    bits apart = separates(kind, b, &n);
    if (mask_of(~apart))
        apart |= separates(kind, b, &c);
    if (kind == RDL_EDGE_EDGE && mask_of(~apart)) {
        vec uu = dot(&u, &u), cu = dot(&c, &u);
        vec3 q;
        for (int k = 0; k < 3; k++)
            q.c[k] = uu * c.c[k] - cu * u.c[k];
        apart |= separates(kind, b, &q);
    }
    return apart;
}

/* f = w . (u x v): coefficients times 1, 3, 3, 1, and a bound for all four. */
LANE_INLINE void cubic_of(const block *b, vec f[4], vec *bound)
{
    const frames *at = b->at;
    vec size = all(0);
    for (int i = 0; i < 4; i++)
        f[i] = size;
    for (int k = 0; k < 3; k++) {
        int i = (k + 1) % 3, j = (k + 2) % 3;
        vec w0 = at[0].w.c[k], w1 = at[1].w.c[k];
        vec n0 = cross(&at[0].u, &at[0].v, k), n2 = cross(&at[1].u, &at[1].v, k);
        vec n1 = cross(&at[0].u, &at[1].v, k) + cross(&at[1].u, &at[0].v, k); /* twice the middle coefficient */
        f[0] += w0 * n0;
        f[1] += w0 * n1 + w1 * n0;
        f[2] += w1 * n1 + w0 * n2;
        f[3] += w1 * n2;
        vec ui = larger(absolute(at[0].u.c[i]), absolute(at[1].u.c[i]));
        vec uj = larger(absolute(at[0].u.c[j]), absolute(at[1].u.c[j]));
        vec vi = larger(absolute(at[0].v.c[i]), absolute(at[1].v.c[i]));
        vec vj = larger(absolute(at[0].v.c[j]), absolute(at[1].v.c[j]));
        size += larger(absolute(w0), absolute(w1)) * (ui * vj + uj * vi);
    }
    /* at most three times size in a sum; 3 differences, 2 products, 2 sums in n, 1 + 3 sums: 11 roundings */
    *bound = size * (64 * UNIT) + RDLI_UNDERFLOW;
}

/* All ones where the four coefficients have one certified sign. */
LANE_INLINE bits one_sign(const vec f[4], vec bound)
{
    bits plus = (f[0] > bound) & (f[1] > bound) & (f[2] > bound) & (f[3] > bound);
    bits minus = (-f[0] > bound) & (-f[1] > bound) & (-f[2] > bound) & (-f[3] > bound);
    return plus | minus;
}

/* Largest coordinate outside the range of rdli_scale_points, and not 0. */
LANE_INLINE bits is_odd_size(const points *p)
{
    vec four[4] = {all(0), all(0), all(0), all(0)};
    for (int end = 0; end < 2; end++)
        for (int i = 0; i < 4; i++)
            four[i] = largest_of(four[i], &p->x[end][i]);
    vec size = larger(larger(four[0], four[1]), larger(four[2], four[3]));
    return (size != 0) & ~((size > 0x1p-20) & (size < 0x1p20));
}

LANE_INLINE void screen_half(int kind, const rdli_quad *quad, int half, uint8_t verdict[RDLI_LANES])
{
    points p;
    load_points(quad, half, &p);
    block b = block_of(kind, &p, load(quad->gap + half));
    bits odd = is_odd_size(&p), apart = by_directions(kind, &b) & ~odd, cubic = apart & 0;
    bits undecided = ~(apart | odd) & (b.gap == 0);
    if (mask_of(undecided)) {
        vec f[4], bound;
        cubic_of(&b, f, &bound);
        cubic = undecided & one_sign(f, bound);
    }
    unsigned a = mask_of(apart), c = mask_of(cubic), o = mask_of(odd);
    for (int i = 0; i < LANE_WIDTH; i++)
        verdict[half + i] = (uint8_t)((a >> i & 1) * RDLI_SCREEN_DIRECTION + (c >> i & 1) * RDLI_SCREEN_CUBIC +
                                      (o >> i & 1) * RDLI_SCREEN_RESIZE);
}

static void screen(int kind, const rdli_quad *quad, uint8_t verdict[RDLI_LANES])
{
    for (int half = 0; half < RDLI_LANES; half += LANE_WIDTH) {
        if (kind == RDL_POINT_TRIANGLE)
            screen_half(RDL_POINT_TRIANGLE, quad, half, verdict);
        else
            screen_half(RDL_EDGE_EDGE, quad, half, verdict);
    }
}
