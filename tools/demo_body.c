/* demo_body.c: reading, joining and judging the demo's mesh body. */
#include "demo_body.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <assimp/cimport.h>
#include <assimp/postprocess.h>
#include <assimp/scene.h>

#include <raddle/rest.h>

typedef struct corner {
    double place[3];
    uint32_t id;
} corner;

typedef struct soup { /* everything the file holds, vertices not yet joined */
    corner *corners;
    size_t corner_count;
    uint32_t (*triangles)[3];
    size_t triangle_count;
} soup;

static int add_mesh(soup *out, const struct aiMesh *mesh, const struct aiMatrix4x4 *place)
{
    size_t first = out->corner_count;
    corner *corners = realloc(out->corners, (first + mesh->mNumVertices + 1) * sizeof *corners);
    if (!corners)
        return 0;
    out->corners = corners;
    uint32_t (*triangles)[3] = realloc(out->triangles, (out->triangle_count + mesh->mNumFaces + 1) * sizeof *triangles);
    if (!triangles)
        return 0;
    out->triangles = triangles;
    for (unsigned i = 0; i < mesh->mNumVertices; i++) {
        struct aiVector3D p = mesh->mVertices[i];
        aiTransformVecByMatrix4(&p, place);
        corners[first + i] = (corner){{(double)p.x, (double)p.y, (double)p.z}, (uint32_t)(first + i)};
    }
    out->corner_count += mesh->mNumVertices;
    for (unsigned f = 0; f < mesh->mNumFaces; f++) {
        if (mesh->mFaces[f].mNumIndices != 3)
            continue;
        for (int k = 0; k < 3; k++)
            triangles[out->triangle_count][k] = (uint32_t)first + mesh->mFaces[f].mIndices[k];
        out->triangle_count++;
    }
    return 1;
}

static int add_node(soup *out, const struct aiScene *scene, const struct aiNode *node, struct aiMatrix4x4 place)
{
    aiMultiplyMatrix4(&place, &node->mTransformation);
    for (unsigned m = 0; m < node->mNumMeshes; m++)
        if (!add_mesh(out, scene->mMeshes[node->mMeshes[m]], &place))
            return 0;
    for (unsigned c = 0; c < node->mNumChildren; c++)
        if (!add_node(out, scene, node->mChildren[c], place))
            return 0;
    return 1;
}

static int compare_places(const void *left, const void *right)
{
    const corner *a = left, *b = right;
    for (int k = 0; k < 3; k++)
        if (a->place[k] < b->place[k] || a->place[k] > b->place[k])
            return a->place[k] < b->place[k] ? -1 : 1;
    return 0;
}

/* Corners at exactly one place become one vertex; triangles that thereby lose their area are left out. */
static int join_corners(soup *in, demo_body *body)
{
    uint32_t *vertex_of = malloc((in->corner_count + 1) * sizeof *vertex_of);
    body->vertices = malloc((in->corner_count + 1) * sizeof *body->vertices);
    if (!vertex_of || !body->vertices) {
        free(vertex_of);
        return 0;
    }
    qsort(in->corners, in->corner_count, sizeof *in->corners, compare_places);
    for (size_t i = 0; i < in->corner_count; i++) {
        if (i == 0 || compare_places(&in->corners[i], &in->corners[i - 1]) != 0)
            memcpy(body->vertices[body->vertex_count++], in->corners[i].place, sizeof in->corners[i].place);
        vertex_of[in->corners[i].id] = (uint32_t)(body->vertex_count - 1);
    }
    for (size_t t = 0; t < in->triangle_count; t++) {
        uint32_t *v = in->triangles[t];
        for (int k = 0; k < 3; k++)
            v[k] = vertex_of[v[k]];
        if (v[0] != v[1] && v[1] != v[2] && v[2] != v[0])
            memmove(in->triangles[body->triangle_count++], v, sizeof *in->triangles);
    }
    body->triangles = in->triangles;
    in->triangles = NULL;
    free(vertex_of);
    return 1;
}

static int compare_edges(const void *left, const void *right)
{
    const uint32_t *a = left, *b = right;
    if (a[0] != b[0])
        return a[0] < b[0] ? -1 : 1;
    return a[1] < b[1] ? -1 : a[1] > b[1];
}

/* 1 when every directed edge occurs once and its reverse once: closed and consistently turned. -1: no memory. */
static int is_closed(const demo_body *body)
{
    size_t count = 3 * body->triangle_count;
    uint32_t (*edges)[2] = malloc((count + 1) * sizeof *edges);
    int closed = 1;
    if (!edges)
        return -1;
    for (size_t k = 0; k < count; k++) {
        edges[k][0] = body->triangles[k / 3][k % 3];
        edges[k][1] = body->triangles[k / 3][(k + 1) % 3];
    }
    qsort(edges, count, sizeof *edges, compare_edges);
    for (size_t k = 0; closed && k < count; k++) {
        const uint32_t back[2] = {edges[k][1], edges[k][0]};
        if ((k && compare_edges(edges[k], edges[k - 1]) == 0) ||
            !bsearch(back, edges, count, sizeof *edges, compare_edges))
            closed = 0;
    }
    free(edges);
    return closed;
}

static void stand_up(demo_body *body, double height)
{
    double low[3], high[3];
    for (int k = 0; k < 3; k++)
        low[k] = high[k] = body->vertices[0][k];
    for (size_t i = 0; i < body->vertex_count; i++)
        for (int k = 0; k < 3; k++) {
            double x = body->vertices[i][k];
            low[k] = x < low[k] ? x : low[k];
            high[k] = x > high[k] ? x : high[k];
        }
    double scale = height / (high[2] - low[2]);
    for (size_t i = 0; i < body->vertex_count; i++)
        for (int k = 0; k < 3; k++)
            body->vertices[i][k] = scale * (body->vertices[i][k] - (k == 2 ? low[k] : 0.5 * (low[k] + high[k])));
}

/* Exact: counts meetings of edges and triangles that share no vertex. */
static rdl_status count_cuts(const demo_body *body, size_t *cuts, rdl_fault *fault)
{
    rdl_part part = {"body", RDL_BODY, 1e-3, 0.0}; /* any thickness: tangles are about the surfaces */
    rdl_scene scene = {.size = sizeof scene, .part_count = 1, .parts = &part, .vertex_count = body->vertex_count,
                       .triangle_count = body->triangle_count,
                       .triangles = (const uint32_t (*)[3])body->triangles};
    rdl_view places = {body->vertices, 0, RDL_FLOAT64};
    rdl_tangles tangles = {0, NULL};
    uint32_t *parts = calloc(body->vertex_count + 1, sizeof *parts);
    double *mass = malloc((body->vertex_count + 1) * sizeof *mass);
    rdl_status status = RDL_NO_MEMORY;
    if (parts && mass) {
        for (size_t i = 0; i < body->vertex_count; i++)
            mass[i] = 1.0; /* the question is about shape, so no pair is left out as driven */
        scene.vertex_part = parts;
        scene.mass = mass;
        status = rdl_find_tangles(&scene, &places, 1, NULL, &tangles, fault);
    }
    if (status == RDL_OK) {
        *cuts = tangles.count;
        rdl_tangles_release(&tangles, NULL);
    }
    free(parts);
    free(mass);
    return status;
}

static int judge(const char *path, const demo_body *body, char *why, size_t why_size)
{
    rdl_fault fault = {0, ""};
    size_t cuts = 0;
    int closed = is_closed(body);
    if (closed < 0) {
        snprintf(why, why_size, "%s", rdl_status_text(RDL_NO_MEMORY));
        return 0;
    }
    if (!closed) {
        snprintf(why, why_size, "%s: the mesh is not closed", path);
        return 0;
    }
    rdl_status status = count_cuts(body, &cuts, &fault);
    if (status != RDL_OK) {
        snprintf(why, why_size, "%s: %s: %s %llu", path, rdl_status_text(status), fault.field,
                 (unsigned long long)fault.index);
        return 0;
    }
    if (cuts)
        snprintf(why, why_size, "%s: the mesh cuts itself in %zu places", path, cuts);
    return cuts == 0;
}

int demo_body_load(const char *path, double height, demo_body *body, char *why, size_t why_size)
{
    memset(body, 0, sizeof *body);
    const struct aiScene *scene = aiImportFile(path, aiProcess_Triangulate);
    if (!scene || !scene->mRootNode) {
        snprintf(why, why_size, "%s: cannot be read as a mesh (%s)", path, scene ? "empty" : aiGetErrorString());
        return 0;
    }
    soup all = {NULL, 0, NULL, 0};
    struct aiMatrix4x4 identity;
    aiIdentityMatrix4(&identity);
    int done = add_node(&all, scene, scene->mRootNode, identity);
    aiReleaseImport(scene);
    if (!done || !join_corners(&all, body)) {
        snprintf(why, why_size, "%s", rdl_status_text(RDL_NO_MEMORY));
        done = 0;
    } else if (body->triangle_count == 0) {
        snprintf(why, why_size, "%s: holds no triangles", path);
        done = 0;
    } else {
        stand_up(body, height);
        done = judge(path, body, why, why_size);
    }
    free(all.corners);
    free(all.triangles);
    if (!done)
        demo_body_free(body);
    return done;
}

void demo_body_free(demo_body *body)
{
    free(body->vertices);
    free(body->triangles);
    memset(body, 0, sizeof *body);
}
