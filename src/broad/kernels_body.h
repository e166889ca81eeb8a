/* broad/kernels_body.h: the inner loops over eight lanes. Included once by kernels_portable.c and once by kernels_avx2.c,
 * after their lanes. */
#ifndef LANES_KERNELS
#error "include the lanes first"
#endif

enum { STACK_ROOM = RDLI_WIDE * RDLI_LEVELS }; /* a pack opens into at most eight, at most once per level */

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

static double refit_elements(rdli_tree *tree, const rdl_box *boxes, const uint8_t *stale, uint32_t first, uint32_t last)
{
    enum { AHEAD = 24 }; /* elements: the time of some three gathers hides a miss of the second cache */
    const size_t places = (size_t)tree->pack_count[0] * RDLI_WIDE;
    double spread = 0;
    for (uint32_t p = first; p < last; p++) {
        const uint32_t *elements = tree->order + (size_t)p * RDLI_WIDE;
        if (stale != NULL && stale[p] == 0)
            continue;
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

static bool parts_muted(const rdli_query *query, uint32_t p, uint32_t q)
{
    uint64_t bit = (uint64_t)p * query->part_count + q;
    return p != RDLI_MIXED_PARTS && q != RDLI_MIXED_PARTS && (query->muted[bit / 64] >> (bit % 64) & 1);
}

/* One group of a, as the search sees it. */
typedef struct group_view {
    const rdli_pack *box; /* the group's box is number `place` of this pack */
    unsigned place;
    bool driven, awake;   /* all driven, some awake */
    uint32_t part, lowest;
} group_view;

static group_view view_group(const rdli_query *query, uint32_t group)
{
    const rdli_side *a = &query->a;
    const rdli_tree *tree = a->tree;
    group_view g = {.driven = false, .awake = true, .part = RDLI_MIXED_PARTS, .lowest = tree->lowest[1][group]};
    g.box = tree->levels == 1 ? tree->packs[1] : &tree->packs[2][group / RDLI_WIDE]; /* a crown has but one box, its own */
    g.place = tree->levels == 1 ? 0 : group % RDLI_WIDE;
    if (a->marks[0] != NULL) {
        g.driven = a->marks[1][group].driven == 0xFF;
        g.awake = a->marks[1][group].awake != 0;
    }
    if (a->parts[0] != NULL)
        g.part = a->parts[1][group];
    return g;
}

/* Children of a pack of b that the group has to look at. */
static unsigned worth_opening(const rdli_query *query, const group_view *g, unsigned level, uint32_t pack)
{
    const rdli_side *b = &query->b;
    unsigned mask = lanes_overlap(lanes_spread(g->box, g->place), &b->tree->packs[level][pack]);
    if (b->marks[0] != NULL) {
        mask &= g->driven ? ~(unsigned)b->marks[level][pack].driven : 0xFF;
        mask &= g->awake ? 0xFF : b->marks[level][pack].awake;
    }
    for (unsigned left = mask; left != 0; left &= left - 1) {
        unsigned i = (unsigned)__builtin_ctz(left);
        uint32_t child = pack * RDLI_WIDE + i;
        if ((query->self && b->tree->highest[level - 1][child] <= g->lowest) ||
            (b->parts[0] != NULL && parts_muted(query, g->part, b->parts[level - 1][child])))
            mask &= ~(1u << i);
    }
    return mask;
}

static void end_list(rdli_list *list, size_t count)
{
    for (size_t i = count; i % RDLI_WIDE != 0; i++)
        for (unsigned k = 0; k < 3; k++) {
            list->lo[k][i] = NOWHERE[0][k];
            list->hi[k][i] = NOWHERE[1][k];
        }
}

/* Level-0 packs are read eight times for every time that they are listed: have them come. */
static void fetch_children(const rdli_tree *tree, uint32_t pack, unsigned mask)
{
    for (; mask != 0; mask &= mask - 1) {
        const size_t child = (size_t)pack * RDLI_WIDE + (unsigned)__builtin_ctz(mask);
        for (unsigned k = 0; k < sizeof(rdli_pack); k += 64)
            __builtin_prefetch((const char *)&tree->packs[0][child] + k);
        __builtin_prefetch(&tree->order[child * RDLI_WIDE]);
    }
}

/* Lists the level-0 packs of b that the group overlaps; how many, even if they have no room. */
static size_t list_packs(const rdli_query *query, uint32_t group, rdli_scratch *scratch)
{
    struct { uint32_t pack, level; } stack[STACK_ROOM];
    const rdli_tree *tree = query->b.tree;
    const group_view g = view_group(query, group);
    size_t waiting = 0, count = 0;
    stack[waiting].pack = 0;
    stack[waiting++].level = tree->levels;
    while (waiting > 0) {
        const uint32_t pack = stack[--waiting].pack;
        const unsigned level = stack[waiting].level;
        unsigned mask = worth_opening(query, &g, level, pack);
        if (level == 1) {
            if (mask != 0 && count + RDLI_WIDE <= query->list_room)
                lanes_append_children(&scratch->group, count, &tree->packs[1][pack], pack * RDLI_WIDE,
                                      tree->highest[0] + (size_t)pack * RDLI_WIDE, mask);
            count += (size_t)__builtin_popcount(mask);
            fetch_children(tree, pack, mask);
            continue;
        }
        for (; mask != 0; mask &= mask - 1) {
            stack[waiting].pack = pack * RDLI_WIDE + (unsigned)__builtin_ctz(mask);
            stack[waiting++].level = level - 1;
        }
    }
    if (count <= query->list_room)
        end_list(&scratch->group, count);
    return count;
}

/* Asks query->keep about the pairs of child i of pack a with the children of pack b in mask. */
static unsigned kept(const rdli_query *query, uint32_t a, unsigned i, uint32_t b, unsigned mask)
{
    uint32_t corners_a[4], corners_b[4];
    for (unsigned c = 0; c < query->a.corner_count; c++)
        corners_a[c] = query->a.corners[((size_t)a * query->a.corner_count + c) * RDLI_WIDE + i];
    for (unsigned left = mask; left != 0; left &= left - 1) {
        unsigned j = (unsigned)__builtin_ctz(left);
        for (unsigned c = 0; c < query->b.corner_count; c++)
            corners_b[c] = query->b.corners[((size_t)b * query->b.corner_count + c) * RDLI_WIDE + j];
        if (!query->keep(query->rules, corners_a, corners_b))
            mask &= ~(1u << j);
    }
    return mask;
}

/* Leaves out the children of b whose parts are muted for child i of a. */
static unsigned audible(const rdli_query *query, uint32_t a, unsigned i, uint32_t b, unsigned mask)
{
    const uint32_t p = query->a.parts[0][a], q = query->b.parts[0][b];
    if (p != RDLI_MIXED_PARTS && q != RDLI_MIXED_PARTS)
        return parts_muted(query, p, q) ? 0 : mask;
    const uint32_t own = query->a.element_parts[(size_t)a * RDLI_WIDE + i];
    for (unsigned left = mask; left != 0; left &= left - 1) {
        unsigned j = (unsigned)__builtin_ctz(left);
        if (parts_muted(query, own, query->b.element_parts[(size_t)b * RDLI_WIDE + j]))
            mask &= ~(1u << j);
    }
    return mask;
}

/* The rules beyond boxes, order and shared vertices. */
static unsigned ruled(const rdli_query *query, uint32_t a, unsigned i, uint32_t b, unsigned mask)
{
    const rdli_marks *marks_a = &query->a.marks[0][a], *marks_b = &query->b.marks[0][b];
    mask &= welcome(marks_a, i, marks_b);
    if (mask != 0 && query->a.parts[0] != NULL)
        mask = audible(query, a, i, b, mask);
    if (mask != 0 && (marks_a->attached >> i & 1))
        mask = kept(query, a, i, b, mask & marks_b->attached) | (mask & ~(unsigned)marks_b->attached);
    return mask;
}

static void set_bit(uint64_t *bits, size_t words, size_t summary, uint32_t id)
{
    bits[id / 64] |= (uint64_t)1 << id % 64;
    bits[words + id / 4096] |= (uint64_t)1 << id / 64 % 64;
    bits[words + summary + id / 262144] |= (uint64_t)1 << id / 4096 % 64;
}

/* Sorts count distinct ids. bits: a bit set of `words` words, all zero, then its summary (bit w: word w is not zero) of
 * words / 64 + 1 words, then the summary of that; left zero. So a long row costs a few steps per id whatever its ids, and
 * a short one goes by counting, for each id, the ids below it. */
static void sort_row(uint32_t *ids, size_t count, uint32_t *to, uint64_t *bits, size_t words)
{
    if (count <= LANES_RANKED) {
        lanes_rank(ids, count, to);
        return;
    }
    const size_t summary = words / 64 + 1, top = words / 4096 + 1;
    for (size_t i = 0; i < count; i++)
        set_bit(bits, words, summary, ids[i]);
    for (size_t t = 0; t < top; t++) {
        for (uint64_t *high = &bits[words + summary + t]; *high != 0; *high &= *high - 1) {
            size_t s = t * 64 + (size_t)__builtin_ctzll(*high);
            for (uint64_t *middle = &bits[words + s]; *middle != 0; *middle &= *middle - 1) {
                size_t w = s * 64 + (size_t)__builtin_ctzll(*middle);
                for (; bits[w] != 0; bits[w] &= bits[w] - 1)
                    *to++ = (uint32_t)(w * 64 + (size_t)__builtin_ctzll(bits[w]));
            }
        }
    }
}

#include "broad/apart_body.h"

/* Takes `count` seconds from scratch->row. */
static void store_row(rdli_query *query, rdli_scratch *scratch, unsigned worker, uint32_t first, size_t count)
{
    if (query->emit == NULL) {
        uint32_t *place = rdli_rows_take(&query->rows, &query->portions[worker], count);
        if (place == NULL)
            return;
        sort_row(scratch->row, count, place, scratch->bits, query->bit_words);
        query->rows.rows[first] = (rdli_row){(uint64_t)(place - query->rows.seconds), (uint32_t)count, 0};
        return;
    }
    query->portions[worker].found += count;
    for (size_t i = 0; i < count; i++) {
        if (scratch->block_count == RDLI_EMIT_BLOCK)
            rdli_query_flush(query, worker);
        scratch->block[scratch->block_count++] = (rdli_pair){first, scratch->row[i]};
    }
}

/* From what overlaps the group, what overlaps its pack a; how many. */
static size_t narrow_to_pack(const rdli_query *query, rdli_scratch *scratch, uint32_t a, size_t listed, const bool self)
{
    const lanes_box box = lanes_spread(&query->a.tree->packs[1][a / RDLI_WIDE], a % RDLI_WIDE);
    const uint32_t lowest = query->a.tree->lowest[0][a];
    size_t count = 0;
    for (size_t at = 0; at < listed; at += RDLI_WIDE) {
        unsigned mask = lanes_overlap_listed(box, &scratch->group, at);
        if (self)
            mask &= lanes_above(scratch->group.highest + at, lowest);
        lanes_append_listed(&scratch->pack, count, &scratch->group, at, mask);
        count += (unsigned)__builtin_popcount(mask);
    }
    end_list(&scratch->pack, count);
    return count;
}

/* From what overlaps pack a, what overlaps its element i: first packs, then their children. Returns the number of hits. */
static inline size_t narrow_to_element(const rdli_query *query, rdli_scratch *scratch, uint32_t a, unsigned i, size_t listed,
                                       const bool self)
{
    const rdli_tree *tree_b = query->b.tree;
    const uint32_t id = query->a.tree->order[(size_t)a * RDLI_WIDE + i];
    const lanes_box box = lanes_spread(&query->a.tree->packs[0][a], i);
    uint32_t *near = scratch->near;
    for (size_t at = 0; at < listed; at += RDLI_WIDE) {
        unsigned mask = lanes_overlap_listed(box, &scratch->pack, at);
        if (self)
            mask &= lanes_above(scratch->pack.highest + at, id);
        near = lanes_compress(near, scratch->pack.packs + at, mask);
    }
    size_t hits = 0;
    for (const uint32_t *b = scratch->near; b < near; b++) {
        unsigned mask = lanes_overlap(box, &tree_b->packs[0][*b]);
        if (self)
            mask &= lanes_above(tree_b->order + (size_t)*b * RDLI_WIDE, id);
        scratch->hits[hits] = (uint64_t)*b << 8 | mask;
        hits += mask != 0;
    }
    return hits;
}

/* All pairs of the elements of pack a with those of the listed packs. self, ca and cb are constants in every call, so that
 * the branches and the loops over corners vanish. */
static inline __attribute__((always_inline)) void match_pack(rdli_query *query, uint32_t a, size_t listed, unsigned worker,
                                                             const bool self, const unsigned ca, const unsigned cb)
{
    rdli_scratch *scratch = &query->scratch[worker];
    const uint32_t *ids_a = query->a.tree->order + (size_t)a * RDLI_WIDE;
    const uint32_t *corners_a = query->a.corners + (size_t)a * RDLI_WIDE * ca;
    const bool ruled_too = query->a.marks[0] != NULL;
    const size_t places = query->a.tree->count - a * RDLI_WIDE;
    listed = narrow_to_pack(query, scratch, a, listed, self);
    for (unsigned i = 0; i < RDLI_WIDE && i < places; i++) {
        if (ids_a[i] < query->range_lo || ids_a[i] >= query->range_hi)
            continue;
        const size_t hits = narrow_to_element(query, scratch, a, i, listed, self);
        uint32_t *row = scratch->row;
        for (size_t h = 0; h < hits; h++) {
            const uint32_t b = (uint32_t)(scratch->hits[h] >> 8);
            const uint32_t *corners_b = query->b.corners + (size_t)b * RDLI_WIDE * cb;
            unsigned mask = (unsigned)scratch->hits[h] & 0xFF;
            for (unsigned x = 0; x < ca; x++)
                for (unsigned y = 0; y < cb; y++)
                    mask &= ~lanes_equal(corners_a[x * RDLI_WIDE + i], corners_b + y * RDLI_WIDE);
            if (ruled_too)
                mask = ruled(query, a, i, b, mask);
            row = lanes_compress(row, query->b.tree->order + (size_t)b * RDLI_WIDE, mask);
        }
        size_t count = (size_t)(row - scratch->row);
        if (count > 0 && query->records != NULL) {
            const uint32_t own[2] = {corners_a[i], corners_a[ca == 2 ? RDLI_WIDE + i : i]};
            count = drop_apart(query, scratch, own, count);
        }
        if (count > 0)
            store_row(query, scratch, worker, ids_a[i], count);
    }
}

static void match_group(rdli_query *query, uint32_t group, unsigned worker)
{
    rdli_scratch *scratch = &query->scratch[worker];
    if (query->done[group])
        return;
    if (query->a.tree->highest[1][group] < query->range_lo || query->a.tree->lowest[1][group] >= query->range_hi)
        return;
    const size_t listed = list_packs(query, group, scratch);
    if (listed > scratch->list_need)
        scratch->list_need = listed;
    if (listed > query->list_room - RDLI_WIDE)
        return; /* query.c makes the list longer and comes back */
    const uint32_t packs = query->a.tree->pack_count[0], first = group * RDLI_WIDE;
    const unsigned ca = query->a.corner_count, cb = query->b.corner_count;
    for (uint32_t a = first; a < packs && a < first + RDLI_WIDE; a++) {
        if (!query->self && ca == 1)
            match_pack(query, a, listed, worker, false, 1, 3);
        else if (!query->self)
            match_pack(query, a, listed, worker, false, 2, 3);
        else if (ca == 0)
            match_pack(query, a, listed, worker, true, 0, 0);
        else if (ca == 2)
            match_pack(query, a, listed, worker, true, 2, 2);
        else if (ca == 3)
            match_pack(query, a, listed, worker, true, 3, 3);
        else
            match_pack(query, a, listed, worker, true, ca, cb);
    }
    query->done[group] = 1;
}

const rdli_kernels LANES_KERNELS = {refit_elements, refit_inner, match_group};
