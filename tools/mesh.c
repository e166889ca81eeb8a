/* mesh.c: see mesh.h. */
#include "mesh.h"

#include <stdlib.h>
#include <string.h>

typedef struct keyed_point {
    double place[3];
    uint32_t index;
} keyed_point;

static int compare_points(const void *a, const void *b)
{
    const keyed_point *x = a, *y = b;
    int order = memcmp(x->place, y->place, sizeof x->place);
    return order != 0 ? order : x->index < y->index ? -1 : x->index > y->index;
}

/* Each point's representative: the first of those with the same bits. */
static bool find_twins(const mesh *m, uint32_t *twin)
{
    keyed_point *keys = malloc(m->point_count * sizeof *keys);
    if (keys == NULL)
        return false;
    for (size_t i = 0; i < m->point_count; i++) {
        memcpy(keys[i].place, m->points[i], sizeof keys[i].place);
        keys[i].index = (uint32_t)i;
    }
    qsort(keys, m->point_count, sizeof *keys, compare_points);
    for (size_t i = 0; i < m->point_count; i++) {
        bool same = i > 0 && memcmp(keys[i - 1].place, keys[i].place, sizeof keys[i].place) == 0;
        twin[keys[i].index] = same ? twin[keys[i - 1].index] : keys[i].index;
    }
    free(keys);
    return true;
}

typedef struct keyed_face {
    uint32_t sorted[3], index;
} keyed_face;

static int compare_faces(const void *a, const void *b)
{
    const keyed_face *x = a, *y = b;
    for (size_t k = 0; k < 3; k++)
        if (x->sorted[k] != y->sorted[k])
            return x->sorted[k] < y->sorted[k] ? -1 : 1;
    return x->index < y->index ? -1 : x->index > y->index;
}

static void sort_three(const uint32_t in[3], uint32_t out[3])
{
    memcpy(out, in, 3 * sizeof *out);
    for (size_t pass = 0; pass < 2; pass++)
        for (size_t k = 0; k < 2; k++)
            if (out[k] > out[k + 1]) {
                uint32_t swap = out[k];
                out[k] = out[k + 1];
                out[k + 1] = swap;
            }
}

/* Marks faces that repeat the corners of an earlier one, in whatever order. */
static bool mark_doubles(const mesh *m, uint8_t *drop)
{
    keyed_face *keys = malloc(m->face_count * sizeof *keys);
    if (keys == NULL)
        return false;
    for (size_t f = 0; f < m->face_count; f++) {
        sort_three(m->faces[f], keys[f].sorted);
        keys[f].index = (uint32_t)f;
    }
    qsort(keys, m->face_count, sizeof *keys, compare_faces);
    for (size_t f = 1; f < m->face_count; f++)
        drop[keys[f].index] = memcmp(keys[f - 1].sorted, keys[f].sorted, sizeof keys[f].sorted) == 0;
    free(keys);
    return true;
}

static void drop_faces(mesh *m, const uint8_t *drop)
{
    size_t kept = 0;
    for (size_t f = 0; f < m->face_count; f++)
        if (!drop[f])
            memmove(m->faces[kept++], m->faces[f], sizeof m->faces[0]);
    m->face_count = kept;
}

/* New numbers for the points that are used, in their old order. */
static void renumber(mesh *m, uint32_t *number)
{
    size_t kept = 0;
    memset(number, 0, m->point_count * sizeof *number);
    for (size_t f = 0; f < m->face_count; f++)
        for (size_t k = 0; k < 3; k++)
            number[m->faces[f][k]] = 1;
    for (size_t i = 0; i < m->point_count; i++)
        if (number[i] != 0) {
            memmove(m->points[kept], m->points[i], sizeof m->points[0]);
            number[i] = (uint32_t)kept++;
        }
    for (size_t f = 0; f < m->face_count; f++)
        for (size_t k = 0; k < 3; k++)
            m->faces[f][k] = number[m->faces[f][k]];
    m->unused = m->point_count - m->welded - kept;
    m->point_count = kept;
}

bool mesh_weld(mesh *m)
{
    uint32_t *twin = malloc((m->point_count + 1) * sizeof *twin);
    uint8_t *drop = calloc(m->face_count + 1, 1);
    bool done = twin != NULL && drop != NULL;
    m->source_points = m->point_count;
    for (size_t i = 0; i < m->point_count; i++)
        for (size_t k = 0; k < 3; k++)
            m->points[i][k] += 0.0; /* -0 becomes 0 */
    done = done && find_twins(m, twin);
    for (size_t i = 0; done && i < m->point_count; i++)
        m->welded += twin[i] != i;
    for (size_t f = 0; done && f < m->face_count; f++) {
        uint32_t *face = m->faces[f];
        for (size_t k = 0; k < 3; k++)
            face[k] = twin[face[k]];
        drop[f] = face[0] == face[1] || face[1] == face[2] || face[2] == face[0];
        m->dropped_faces += drop[f];
    }
    if (done) {
        drop_faces(m, drop);
        memset(drop, 0, m->face_count + 1);
        done = m->face_count == 0 || mark_doubles(m, drop);
    }
    for (size_t f = 0; done && f < m->face_count; f++)
        m->double_faces += drop[f];
    if (done) {
        drop_faces(m, drop);
        renumber(m, twin);
    }
    free(twin);
    free(drop);
    return done;
}

bool mesh_follow(const mesh *raw, const mesh *welded, uint32_t *became)
{
    keyed_point *keys = malloc((welded->point_count + 1) * sizeof *keys);
    if (keys == NULL)
        return false;
    for (size_t i = 0; i < welded->point_count; i++) {
        memcpy(keys[i].place, welded->points[i], sizeof keys[i].place);
        keys[i].index = (uint32_t)i;
    }
    qsort(keys, welded->point_count, sizeof *keys, compare_points);
    for (size_t i = 0; i < raw->point_count; i++) {
        double place[3];
        size_t low = 0, high = welded->point_count;
        for (size_t k = 0; k < 3; k++)
            place[k] = raw->points[i][k] + 0.0;
        while (low < high) {
            size_t middle = low + (high - low) / 2;
            if (memcmp(keys[middle].place, place, sizeof place) < 0)
                low = middle + 1;
            else
                high = middle;
        }
        bool found = low < welded->point_count && memcmp(keys[low].place, place, sizeof place) == 0;
        became[i] = found ? keys[low].index : UINT32_MAX;
    }
    free(keys);
    return true;
}

typedef struct side {
    uint32_t low, high, face;
    uint32_t forward; /* 1: the face runs from low to high */
} side;

static int compare_sides(const void *a, const void *b)
{
    const side *x = a, *y = b;
    if (x->low != y->low)
        return x->low < y->low ? -1 : 1;
    if (x->high != y->high)
        return x->high < y->high ? -1 : 1;
    return x->face < y->face ? -1 : x->face > y->face;
}

static bool same_edge(const side *a, const side *b)
{
    return a->low == b->low && a->high == b->high;
}

static side *list_sides(const mesh *m)
{
    side *sides = malloc((3 * m->face_count + 1) * sizeof *sides);
    for (size_t f = 0; sides != NULL && f < m->face_count; f++)
        for (size_t k = 0; k < 3; k++) {
            uint32_t a = m->faces[f][k], b = m->faces[f][(k + 1) % 3];
            sides[3 * f + k] = (side){a < b ? a : b, a < b ? b : a, (uint32_t)f, a < b};
        }
    if (sides != NULL)
        qsort(sides, 3 * m->face_count, sizeof *sides, compare_sides);
    return sides;
}

static uint32_t find_root(uint32_t *parent, uint32_t v)
{
    while (parent[v] != v) {
        parent[v] = parent[parent[v]];
        v = parent[v];
    }
    return v;
}

/* Joins border edges that share a vertex into holes, named by their lowest vertex. */
static bool gather_holes(const mesh *m, const side *sides, size_t count, mesh_faults *faults)
{
    uint32_t *parent = malloc((m->point_count + 1) * sizeof *parent);
    uint32_t *length = calloc(m->point_count + 1, sizeof *length);
    bool done = parent != NULL && length != NULL;
    for (uint32_t v = 0; done && v < m->point_count; v++)
        parent[v] = v;
    for (size_t pass = 0; done && pass < 2; pass++)
        for (size_t i = 0; i < count; i++) {
            if ((i > 0 && same_edge(&sides[i - 1], &sides[i])) ||
                (i + 1 < count && same_edge(&sides[i], &sides[i + 1])))
                continue;
            uint32_t a = find_root(parent, sides[i].low), b = find_root(parent, sides[i].high);
            if (pass == 0)
                parent[a < b ? b : a] = a < b ? a : b;
            else
                length[a]++;
        }
    for (uint32_t v = 0; done && v < m->point_count; v++)
        faults->hole_count += length[v] > 0;
    faults->holes = done ? malloc((faults->hole_count + 1) * sizeof *faults->holes) : NULL;
    done = faults->holes != NULL;
    size_t used = 0;
    for (uint32_t v = 0; done && v < m->point_count; v++)
        if (length[v] > 0)
            faults->holes[used++] = (mesh_hole){v, length[v]};
    free(parent);
    free(length);
    return done;
}

bool mesh_inspect(const mesh *m, mesh_faults *faults)
{
    memset(faults, 0, sizeof *faults);
    size_t count = 3 * m->face_count;
    side *sides = list_sides(m);
    uint8_t *against = calloc(m->face_count + 1, 1);
    bool done = sides != NULL && against != NULL;
    for (size_t i = 0, next; done && i < count; i = next) {
        next = i + 1;
        while (next < count && same_edge(&sides[i], &sides[next]))
            next++;
        faults->open_edges += next - i == 1;
        faults->branched_edges += next - i > 2;
        if (next - i == 2 && sides[i].forward == sides[i + 1].forward)
            against[sides[i].face] = against[sides[i + 1].face] = 1;
    }
    done = done && gather_holes(m, sides, count, faults);
    for (size_t f = 0; done && f < m->face_count; f++)
        faults->flipped_count += against[f];
    faults->flipped = done ? malloc((faults->flipped_count + 1) * sizeof *faults->flipped) : NULL;
    done = faults->flipped != NULL;
    size_t used = 0;
    for (uint32_t f = 0; done && f < m->face_count; f++)
        if (against[f])
            faults->flipped[used++] = f;
    free(sides);
    free(against);
    return done;
}

void mesh_faults_free(mesh_faults *faults)
{
    free(faults->holes);
    free(faults->flipped);
}

void mesh_free(mesh *m)
{
    free(m->points);
    free(m->faces);
}
