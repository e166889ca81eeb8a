/* broad/kernels_body.h: the inner loops over eight lanes. Included once by kernels_portable.c and once by kernels_avx2.c,
 * after their lanes. */
#ifndef LANES_KERNELS
#error "include the lanes first"
#endif

enum { STACK_ROOM = 64 * 2 * RDLI_LEVELS }; /* a visit opens into at most 64, and both trees have few levels */

static const float NOWHERE[2][3] = {{INFINITY, INFINITY, INFINITY}, {-INFINITY, -INFINITY, -INFINITY}};

/* Empties what is left of the pack above the last pack of a level. */
static void fill_last(rdli_tree *tree, unsigned level, uint32_t last)
{
    if (last != tree->pack_count[level])
        return;
    for (uint32_t p = last; p % RDLI_WIDE != 0; p++)
        for (unsigned k = 0; k < 3; k++) {
            tree->packs[level + 1][p / RDLI_WIDE].lo[k][p % RDLI_WIDE] = NOWHERE[0][k];
            tree->packs[level + 1][p / RDLI_WIDE].hi[k][p % RDLI_WIDE] = NOWHERE[1][k];
        }
}

static double refit_elements(rdli_tree *tree, const rdl_box *boxes, uint32_t first, uint32_t last)
{
    enum { AHEAD = 24 }; /* elements: the time of some three gathers hides a miss of the second cache */
    const size_t places = (size_t)tree->pack_count[0] * RDLI_WIDE;
    double spread = 0;
    for (uint32_t p = first; p < last; p++) {
        const uint32_t *elements = tree->order + (size_t)p * RDLI_WIDE;
        if ((size_t)p * RDLI_WIDE + AHEAD + RDLI_WIDE <= places)
            for (unsigned i = 0; i < RDLI_WIDE; i++)
                __builtin_prefetch(&boxes[elements[AHEAD + i]]);
        rdli_pack *above = &tree->packs[1][p / RDLI_WIDE];
        spread += lanes_gather(boxes, elements, &tree->packs[0][p], above, p % RDLI_WIDE);
    }
    fill_last(tree, 0, last);
    /* The last pack repeats the last element in its unused places, so that the bound is right; they are emptied here. */
    for (size_t i = tree->count; last == tree->pack_count[0] && i < places; i++)
        for (unsigned k = 0; k < 3; k++) {
            tree->packs[0][last - 1].lo[k][i % RDLI_WIDE] = NOWHERE[0][k];
            tree->packs[0][last - 1].hi[k][i % RDLI_WIDE] = NOWHERE[1][k];
        }
    return spread / RDLI_WIDE;
}

static void refit_inner(rdli_tree *tree, unsigned level, uint32_t first, uint32_t last)
{
    for (uint32_t p = first; p < last; p++)
        lanes_bound(&tree->packs[level][p], &tree->packs[level + 1][p / RDLI_WIDE], p % RDLI_WIDE);
    fill_last(tree, level, last);
}

/* Children of b that may meet child i of a: not all driven on both sides, and somebody awake. */
static inline unsigned welcome(const rdli_marks *a, unsigned i, const rdli_marks *b)
{
    unsigned mask = 0xFF;
    if (a->driven >> i & 1)
        mask &= ~(unsigned)b->driven;
    if (!(a->awake >> i & 1))
        mask &= b->awake;
    return mask;
}

static inline const rdli_marks *marks_of(const rdli_side *side, unsigned level, uint32_t pack)
{
    return side->marks[0] == NULL ? NULL : &side->marks[level][pack];
}

/* The children of v's two packs that overlap the other pack's own box. */
static inline void row_masks(const rdli_walk *walk, rdli_visit v, const lanes_pack *a, const lanes_pack *b, unsigned *rows,
                             unsigned *columns)
{
    const rdli_tree *tree_a = walk->a.tree, *tree_b = walk->b.tree;
    *rows = lanes_overlap(&tree_b->packs[v.level_b + 1][v.b / RDLI_WIDE], v.b % RDLI_WIDE, *a);
    *columns = lanes_overlap(&tree_a->packs[v.level_a + 1][v.a / RDLI_WIDE], v.a % RDLI_WIDE, *b);
}

/* False: the packs are of two parts that ignore each other. Clears check_parts where nothing is left to be checked. */
static bool parts_may_meet(const rdli_walk *walk, rdli_visit *v)
{
    uint32_t p = walk->a.parts[v->level_a][v->a], q = walk->b.parts[v->level_b][v->b];
    if (p == RDLI_MIXED_PARTS || q == RDLI_MIXED_PARTS)
        return true;
    uint64_t bit = (uint64_t)p * walk->part_count + q;
    v->check_parts = 0;
    return !(walk->muted[bit / 64] >> (bit % 64) & 1);
}

/* Packs of one level: all pairs of children that overlap. */
static size_t expand_level(const rdli_walk *walk, rdli_visit v, rdli_visit *children)
{
    const unsigned level = v.level_a;
    const rdli_pack *packs_a = &walk->a.tree->packs[level][v.a], *packs_b = &walk->b.tree->packs[level][v.b];
    const rdli_marks *marks_a = marks_of(&walk->a, level, v.a), *marks_b = marks_of(&walk->b, level, v.b);
    const bool same = walk->self && v.a == v.b;
    lanes_pack a = lanes_load(packs_a), b = lanes_load(packs_b);
    unsigned rows = 0xFF, columns = 0xFF;
    size_t count = 0;
    rdli_visit child = {0, 0, (uint8_t)(level - 1), (uint8_t)(level - 1), v.check_parts, 0};
    if (!same)
        row_masks(walk, v, &a, &b, &rows, &columns);
    for (; rows != 0; rows &= rows - 1) {
        unsigned i = (unsigned)__builtin_ctz(rows);
        unsigned mask = lanes_overlap(packs_a, i, b) & columns;
        if (marks_a != NULL)
            mask &= welcome(marks_a, i, marks_b);
        if (same)
            mask &= 0xFFu << i;
        child.a = v.a * RDLI_WIDE + i;
        for (; mask != 0; mask &= mask - 1) {
            child.b = v.b * RDLI_WIDE + (unsigned)__builtin_ctz(mask);
            children[count++] = child;
        }
    }
    return count;
}

/* Packs of two levels: the children of the higher one that overlap the lower pack. */
static size_t expand_uneven(const rdli_walk *walk, rdli_visit v, rdli_visit *children)
{
    const bool open_a = v.level_a > v.level_b;
    const rdli_side *high = open_a ? &walk->a : &walk->b, *low = open_a ? &walk->b : &walk->a;
    const unsigned high_level = open_a ? v.level_a : v.level_b, low_level = open_a ? v.level_b : v.level_a;
    const uint32_t high_pack = open_a ? v.a : v.b, low_pack = open_a ? v.b : v.a;
    const rdli_marks *high_marks = marks_of(high, high_level, high_pack), *low_marks = marks_of(low, low_level, low_pack);
    lanes_pack eight = lanes_load(&high->tree->packs[high_level][high_pack]);
    unsigned mask = lanes_overlap(&low->tree->packs[low_level + 1][low_pack / RDLI_WIDE], low_pack % RDLI_WIDE, eight);
    size_t count = 0;
    for (; mask != 0; mask &= mask - 1) {
        unsigned i = (unsigned)__builtin_ctz(mask);
        if (high_marks != NULL && welcome(high_marks, i, low_marks) == 0)
            continue;
        rdli_visit child = v;
        *(open_a ? &child.a : &child.b) = high_pack * RDLI_WIDE + i;
        *(open_a ? &child.level_a : &child.level_b) -= 1;
        children[count++] = child;
    }
    return count;
}

static size_t expand(const rdli_walk *walk, rdli_visit v, rdli_visit *children)
{
    if (v.check_parts && !parts_may_meet(walk, &v))
        return 0;
    return v.level_a == v.level_b ? expand_level(walk, v, children) : expand_uneven(walk, v, children);
}

/* Asks walk->keep about each of the pairs. */
static unsigned kept(const rdli_walk *walk, rdli_visit v, unsigned i, unsigned mask)
{
    uint32_t a[4], b[4];
    unsigned left = mask;
    for (unsigned c = 0; c < walk->a.corner_count; c++)
        a[c] = walk->a.corners[((size_t)v.a * walk->a.corner_count + c) * RDLI_WIDE + i];
    for (; left != 0; left &= left - 1) {
        unsigned j = (unsigned)__builtin_ctz(left);
        for (unsigned c = 0; c < walk->b.corner_count; c++)
            b[c] = walk->b.corners[((size_t)v.b * walk->b.corner_count + c) * RDLI_WIDE + j];
        if (!walk->keep(walk->rules, a, b))
            mask &= ~(1u << j);
    }
    return mask;
}

/* Bit j: the first of the pair (id, ids[j]) lies in the walk's range. */
static unsigned in_range(const rdli_walk *walk, uint32_t id, const uint32_t *ids)
{
    unsigned id_inside = id >= walk->range_lo && id < walk->range_hi ? 0xFF : 0;
    if (!walk->self)
        return id_inside;
    /* The lower of two ids lies in [lo, hi): neither is below lo, and one of them is below hi. */
    unsigned not_below = id >= walk->range_lo ? lanes_within(ids, walk->range_lo, (uint32_t)INT32_MAX) : 0;
    return not_below & (id_inside | lanes_within(ids, walk->range_lo, walk->range_hi));
}

/* Two level-0 packs with ca and cb corners; constants in every call, so that the loops over corners vanish. */
static inline __attribute__((always_inline)) void leaves(const rdli_walk *walk, rdli_visit v, unsigned worker, unsigned ca,
                                                         unsigned cb)
{
    const rdli_pack *pack_a = &walk->a.tree->packs[0][v.a], *pack_b = &walk->b.tree->packs[0][v.b];
    const rdli_marks *marks_a = marks_of(&walk->a, 0, v.a), *marks_b = marks_of(&walk->b, 0, v.b);
    const uint32_t *ids_a = walk->a.tree->order + (size_t)v.a * RDLI_WIDE;
    const uint32_t *ids_b = walk->b.tree->order + (size_t)v.b * RDLI_WIDE;
    const uint32_t *corners_a = walk->a.corners + (size_t)v.a * RDLI_WIDE * ca;
    const uint32_t *corners_b = walk->b.corners + (size_t)v.b * RDLI_WIDE * cb;
    const bool same = walk->self && v.a == v.b;
    lanes_pack b = lanes_load(pack_b);
    unsigned rows = 0xFF, columns = 0xFF;
    if (!same) {
        lanes_pack a = lanes_load(pack_a);
        row_masks(walk, v, &a, &b, &rows, &columns);
    }
    if (columns == 0)
        return;
    rdli_sink_worker *out = &walk->sink->workers[worker];
    for (; rows != 0; rows &= rows - 1) {
        unsigned i = (unsigned)__builtin_ctz(rows);
        unsigned mask = lanes_overlap(pack_a, i, b);
        if (same)
            mask &= 0xFEu << i;
        if (mask == 0)
            continue;
        for (unsigned x = 0; x < ca; x++)
            for (unsigned y = 0; y < cb; y++)
                mask &= ~lanes_equal(corners_a[x * RDLI_WIDE + i], corners_b + y * RDLI_WIDE);
        if (marks_a != NULL) {
            mask &= welcome(marks_a, i, marks_b);
            if (mask != 0 && (v.check_parts || ((marks_a->attached >> i & 1) && marks_b->attached != 0)))
                mask = kept(walk, v, i, mask);
        }
        if (walk->ranged)
            mask &= in_range(walk, ids_a[i], ids_b);
        if (mask == 0)
            continue;
        if (out->next >= out->limit)
            rdli_sink_turn(walk->sink, worker);
        out->next = lanes_put(out->next, ids_a[i], ids_b, mask, walk->self ? LANES_SORTED : LANES_A_FIRST);
    }
}

static void visit_leaves(const rdli_walk *walk, rdli_visit v, unsigned worker)
{
    if (v.check_parts && !parts_may_meet(walk, &v))
        return;
    unsigned ca = walk->a.corner_count, cb = walk->b.corner_count;
    if (ca == 0)
        leaves(walk, v, worker, 0, 0);
    else if (ca == 2 && cb == 2)
        leaves(walk, v, worker, 2, 2);
    else if (ca == 1 && cb == 3)
        leaves(walk, v, worker, 1, 3);
    else if (ca == 3 && cb == 3)
        leaves(walk, v, worker, 3, 3);
    else
        leaves(walk, v, worker, ca, cb);
}

static void walk_visit(const rdli_walk *walk, rdli_visit v, unsigned worker)
{
    rdli_visit stack[STACK_ROOM];
    size_t count = 0;
    stack[count++] = v;
    while (count > 0) {
        v = stack[--count];
        if (v.level_a == 0 && v.level_b == 0)
            visit_leaves(walk, v, worker);
        else
            count += expand(walk, v, stack + count);
    }
}

static void set_bit(uint64_t *bits, size_t words, size_t summary, uint32_t id)
{
    bits[id / 64] |= (uint64_t)1 << id % 64;
    bits[words + id / 4096] |= (uint64_t)1 << id / 64 % 64;
    bits[words + summary + id / 262144] |= (uint64_t)1 << id / 4096 % 64;
}

static void sort_row(rdli_pair *pairs, size_t count, uint64_t *bits, size_t words)
{
    if (count <= LANES_RANKED) {
        uint32_t ids[LANES_RANKED];
        for (size_t i = 0; i < count; i++)
            ids[i] = pairs[i].second;
        for (size_t i = count; i % RDLI_WIDE != 0; i++)
            ids[i] = 0;
        lanes_rank(ids, count, pairs);
        return;
    }
    const size_t summary = words / 64 + 1, top = words / 4096 + 1;
    for (size_t i = 0; i < count; i++)
        set_bit(bits, words, summary, pairs[i].second);
    for (size_t t = 0; t < top; t++) {
        for (uint64_t *high = &bits[words + summary + t]; *high != 0; *high &= *high - 1) {
            size_t s = t * 64 + (size_t)__builtin_ctzll(*high);
            for (uint64_t *middle = &bits[words + s]; *middle != 0; *middle &= *middle - 1) {
                size_t w = s * 64 + (size_t)__builtin_ctzll(*middle);
                for (; bits[w] != 0; bits[w] &= bits[w] - 1)
                    (pairs++)->second = (uint32_t)(w * 64 + (size_t)__builtin_ctzll(bits[w]));
            }
        }
    }
}

const rdli_kernels LANES_KERNELS = {refit_elements, refit_inner, expand, walk_visit, sort_row};
