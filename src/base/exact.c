/* base/exact.c: signed integers on arenas. */
#include "base/exact.h"

static_assert(GMP_NUMB_BITS == 64 && sizeof(mp_limb_t) == 8, "limbs of 64 bits without nails");

static size_t length(rdli_int a)
{
    return (size_t)(a.size < 0 ? -a.size : a.size);
}

static mp_limb_t *take(rdli_arena *arena, size_t count)
{
    if (count > arena->room - arena->used) {
        arena->overflow = true;
        return NULL;
    }
    mp_limb_t *limbs = arena->limbs + arena->used;
    arena->used += count;
    return limbs;
}

/* Gives back the leading zero limbs of the newest block. */
static rdli_int trim(rdli_arena *arena, mp_limb_t *limb, size_t count, bool negative)
{
    size_t kept = count;
    while (kept > 0 && limb[kept - 1] == 0)
        kept--;
    arena->used -= count - kept;
    return (rdli_int){limb, negative ? -(int64_t)kept : (int64_t)kept};
}

static const rdli_int zero = {NULL, 0};

rdli_int rdli_int_of_word(rdli_arena *arena, uint64_t value)
{
    mp_limb_t *limb = take(arena, 1);
    if (!limb)
        return zero;
    limb[0] = value;
    return trim(arena, limb, 1, false);
}

/* value 2^shift, shift >= 0 */
static rdli_int place(rdli_arena *arena, uint64_t value, int64_t shift, bool negative)
{
    size_t skip = (size_t)(shift / 64);
    unsigned bits = (unsigned)(shift % 64);
    mp_limb_t *limb = take(arena, skip + 2);
    if (!limb)
        return zero;
    memset(limb, 0, skip * sizeof *limb);
    limb[skip] = value << bits;
    limb[skip + 1] = bits ? value >> (64 - bits) : 0;
    return trim(arena, limb, skip + 2, negative);
}

/* Splits x into an integer mantissa and the exponent of its lowest bit. */
static uint64_t split(double x, int *exponent)
{
    uint64_t bits;
    memcpy(&bits, &x, sizeof bits);
    uint64_t mantissa = bits & 0xfffffffffffffu;
    int biased = (int)(bits >> 52 & 0x7ff);
    if (biased)
        mantissa |= UINT64_C(1) << 52;
    else
        biased = 1;
    *exponent = biased - 1075;
    return mantissa;
}

int rdli_lowest_bit(double x)
{
    int exponent;
    uint64_t mantissa = split(x, &exponent);
    return mantissa ? exponent + __builtin_ctzll(mantissa) : INT_MAX;
}

rdli_int rdli_int_of_double(rdli_arena *arena, double x, int unit)
{
    int exponent;
    uint64_t mantissa = split(x, &exponent);
    if (!mantissa)
        return zero;
    int trailing = __builtin_ctzll(mantissa);
    return place(arena, mantissa >> trailing, (int64_t)exponent + trailing - unit, x < 0);
}

static int compare_magnitude(rdli_int a, rdli_int b)
{
    size_t na = length(a), nb = length(b);
    if (na != nb)
        return na < nb ? -1 : 1;
    return na ? mpn_cmp(a.limb, b.limb, (mp_size_t)na) : 0;
}

int rdli_int_compare(rdli_int a, rdli_int b)
{
    int sa = rdli_int_sign(a), sb = rdli_int_sign(b);
    if (sa != sb)
        return sa < sb ? -1 : 1;
    int c = compare_magnitude(a, b);
    return sa < 0 ? -c : c;
}

static rdli_int add_magnitudes(rdli_arena *arena, rdli_int a, rdli_int b, bool negative)
{
    if (length(a) < length(b)) {
        rdli_int c = a;
        a = b;
        b = c;
    }
    size_t na = length(a), nb = length(b);
    mp_limb_t *limb = take(arena, na + 1);
    if (!limb)
        return zero;
    limb[na] = mpn_add(limb, a.limb, (mp_size_t)na, b.limb, (mp_size_t)nb);
    return trim(arena, limb, na + 1, negative);
}

rdli_int rdli_int_add(rdli_arena *arena, rdli_int a, rdli_int b)
{
    if (a.size == 0)
        return b;
    if (b.size == 0)
        return a;
    if ((a.size < 0) == (b.size < 0))
        return add_magnitudes(arena, a, b, a.size < 0);
    int order = compare_magnitude(a, b);
    if (order == 0)
        return zero;
    if (order < 0) {
        rdli_int c = a;
        a = b;
        b = c;
    }
    size_t na = length(a);
    mp_limb_t *limb = take(arena, na);
    if (!limb)
        return zero;
    mpn_sub(limb, a.limb, (mp_size_t)na, b.limb, (mp_size_t)length(b));
    return trim(arena, limb, na, a.size < 0);
}

rdli_int rdli_int_sub(rdli_arena *arena, rdli_int a, rdli_int b)
{
    return rdli_int_add(arena, a, rdli_int_negate(b));
}

static size_t count_low_zeros(rdli_int a)
{
    size_t count = 0;
    while (a.limb[count] == 0)
        count++;
    return count;
}

static size_t count_zeros(const mp_limb_t *limb, size_t count)
{
    size_t zeros = 0;
    for (size_t i = 0; i < count; i++)
        zeros += limb[i] == 0;
    return zeros;
}

/* Numbers of very different size beside each other are mostly zeros: those limbs are left out. */
rdli_int rdli_int_mul(rdli_arena *arena, rdli_int a, rdli_int b)
{
    size_t na = length(a), nb = length(b);
    if (na == 0 || nb == 0)
        return zero;
    mp_limb_t *limb = take(arena, na + nb);
    if (!limb)
        return zero;
    size_t low_a = count_low_zeros(a), low_b = count_low_zeros(b);
    const mp_limb_t *x = a.limb + low_a, *y = b.limb + low_b;
    size_t nx = na - low_a, ny = nb - low_b;
    if (nx - count_zeros(x, nx) < ny - count_zeros(y, ny)) { /* fewer limbs to go through one by one */
        const mp_limb_t *other = x;
        x = y;
        y = other;
        size_t n = nx;
        nx = ny;
        ny = n;
    }
    memset(limb, 0, (low_a + low_b) * sizeof *limb);
    mp_limb_t *out = limb + low_a + low_b;
    out[nx] = mpn_mul_1(out, x, (mp_size_t)nx, y[0]);
    for (size_t i = 1; i < ny; i++)
        out[nx + i] = y[i] ? mpn_addmul_1(out + i, x, (mp_size_t)nx, y[i]) : 0;
    return trim(arena, limb, na + nb, (a.size < 0) != (b.size < 0));
}

rdli_int rdli_int_times_word(rdli_arena *arena, rdli_int a, uint64_t word)
{
    mp_limb_t limb = word;
    rdli_int b = {&limb, word != 0};
    return rdli_int_mul(arena, a, b);
}

static rdli_int shift_left(rdli_arena *arena, rdli_int a, int64_t bits)
{
    size_t n = length(a), skip = (size_t)(bits / 64);
    unsigned rest = (unsigned)(bits % 64);
    mp_limb_t *limb = take(arena, n + skip + 1);
    if (!limb)
        return zero;
    memset(limb, 0, skip * sizeof *limb);
    if (rest) {
        limb[n + skip] = mpn_lshift(limb + skip, a.limb, (mp_size_t)n, rest);
    } else {
        memcpy(limb + skip, a.limb, n * sizeof *limb);
        limb[n + skip] = 0;
    }
    return trim(arena, limb, n + skip + 1, a.size < 0);
}

rdli_int rdli_int_shift(rdli_arena *arena, rdli_int a, int64_t bits)
{
    if (a.size == 0 || bits == 0)
        return a;
    if (bits > 0)
        return shift_left(arena, a, bits);
    size_t n = length(a), drop = (size_t)(-bits / 64);
    unsigned rest = (unsigned)(-bits % 64);
    if (drop >= n)
        return zero;
    mp_limb_t *limb = take(arena, n - drop);
    if (!limb)
        return zero;
    if (rest)
        mpn_rshift(limb, a.limb + drop, (mp_size_t)(n - drop), rest);
    else
        memcpy(limb, a.limb + drop, (n - drop) * sizeof *limb);
    return trim(arena, limb, n - drop, a.size < 0);
}

int64_t rdli_int_bits(rdli_int a)
{
    size_t n = length(a);
    return n ? (int64_t)(n * 64) - __builtin_clzll(a.limb[n - 1]) : 0;
}

rdli_int rdli_int_keep(rdli_arena *arena, size_t mark, rdli_int a)
{
    size_t n = length(a);
    if (arena->overflow)
        return zero;
    if (n && a.limb >= arena->limbs + mark && a.limb < arena->limbs + arena->room) {
        memmove(arena->limbs + mark, a.limb, n * sizeof *a.limb);
        a.limb = arena->limbs + mark;
        arena->used = mark + n;
    } else {
        arena->used = mark;
    }
    return a;
}

/* The top 53 bits of |a| as an integer, their unit in *unit, and whether lower bits were dropped. */
static uint64_t top_bits(rdli_int a, int64_t *unit, bool *dropped)
{
    size_t n = length(a);
    int64_t shift = rdli_int_bits(a) - 53;
    if (shift <= 0)
        return n ? a.limb[0] : 0;
    size_t skip = (size_t)(shift / 64);
    unsigned bits = (unsigned)(shift % 64);
    uint64_t top = a.limb[skip] >> bits;
    if (bits && skip + 1 < n)
        top |= a.limb[skip + 1] << (64 - bits);
    *dropped = bits && a.limb[skip] << (64 - bits) != 0;
    for (size_t i = 0; i < skip; i++)
        *dropped = *dropped || a.limb[i] != 0;
    *unit += shift;
    return top;
}

/* value 2^unit, rounded down or up; value has at most 53 bits (54 for the power 2^53). */
static double pack(uint64_t value, int64_t unit, bool up)
{
    if (value == 0)
        return 0;
    if (unit < -1074) { /* below the subnormal unit: drop bits */
        int64_t shift = -1074 - unit;
        uint64_t kept = shift < 64 ? value >> shift : 0;
        if (up && (shift >= 64 || kept << shift != value))
            kept++;
        return ldexp((double)kept, -1074);
    }
    if (unit > 1100)
        return up ? (double)INFINITY : DBL_MAX;
    double x = ldexp((double)value, (int)unit);
    return !up && isinf(x) ? DBL_MAX : x;
}

double rdli_int_below(rdli_int a, int64_t unit)
{
    bool dropped = false;
    uint64_t top = top_bits(a, &unit, &dropped);
    return pack(top, unit, false);
}

double rdli_int_above(rdli_int a, int64_t unit)
{
    bool dropped = false;
    uint64_t top = top_bits(a, &unit, &dropped);
    return pack(top + dropped, unit, true);
}

static rdli_int coefficient_of_product(rdli_arena *arena, const rdli_poly *a, const rdli_poly *b, int k)
{
    size_t mark = arena->used;
    rdli_int sum = zero;
    for (int i = k > b->degree ? k - b->degree : 0; i <= k && i <= a->degree; i++)
        sum = rdli_int_add(arena, sum, rdli_int_mul(arena, a->c[i], b->c[k - i]));
    return rdli_int_keep(arena, mark, sum);
}

rdli_poly rdli_poly_mul(rdli_arena *arena, const rdli_poly *a, const rdli_poly *b)
{
    rdli_poly product = {.degree = a->degree + b->degree};
    assert(product.degree <= RDLI_POLY_DEGREE);
    for (int k = 0; k <= product.degree; k++)
        product.c[k] = coefficient_of_product(arena, a, b, k);
    return product;
}

rdli_poly rdli_poly_add(rdli_arena *arena, const rdli_poly *a, const rdli_poly *b)
{
    rdli_poly sum = {.degree = a->degree};
    assert(a->degree == b->degree);
    for (int k = 0; k <= a->degree; k++)
        sum.c[k] = rdli_int_add(arena, a->c[k], b->c[k]);
    return sum;
}

rdli_poly rdli_poly_sub(rdli_arena *arena, const rdli_poly *a, const rdli_poly *b)
{
    rdli_poly minus = *b;
    for (int k = 0; k <= b->degree; k++)
        minus.c[k] = rdli_int_negate(b->c[k]);
    return rdli_poly_add(arena, a, &minus);
}

bool rdli_poly_is_zero(const rdli_poly *a)
{
    for (int k = 0; k <= a->degree; k++)
        if (a->c[k].size)
            return false;
    return true;
}

int rdli_poly_one_sign(const rdli_poly *a)
{
    int sign = rdli_int_sign(a->c[0]);
    for (int k = 1; k <= a->degree; k++)
        if (rdli_int_sign(a->c[k]) != sign)
            return 0;
    return sign;
}
