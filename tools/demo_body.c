/* demo_body.c: reading, joining and judging the demo's mesh body. */
#include "demo_body.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <assimp/cimport.h>
#include <assimp/postprocess.h>
#include <assimp/scene.h>

#include <raddle/rest.h>

static int add_mesh(mesh *out, const struct aiMesh *from, const struct aiMatrix4x4 *place)
{
    size_t first = out->point_count;
    double (*points)[3] = realloc(out->points, (first + from->mNumVertices + 1) * sizeof *points);
    if (!points)
        return 0;
    out->points = points;
    uint32_t (*faces)[3] = realloc(out->faces, (out->face_count + from->mNumFaces + 1) * sizeof *faces);
    if (!faces)
        return 0;
    out->faces = faces;
    for (unsigned i = 0; i < from->mNumVertices; i++) {
        struct aiVector3D p = from->mVertices[i];
        aiTransformVecByMatrix4(&p, place);
        const double point[3] = {(double)p.x, (double)p.y, (double)p.z};
        memcpy(points[out->point_count++], point, sizeof point);
    }
    for (unsigned f = 0; f < from->mNumFaces; f++) {
        if (from->mFaces[f].mNumIndices != 3)
            continue;
        for (int k = 0; k < 3; k++)
            faces[out->face_count][k] = (uint32_t)first + from->mFaces[f].mIndices[k];
        out->face_count++;
    }
    return 1;
}

static int add_node(mesh *out, const struct aiScene *scene, const struct aiNode *node, struct aiMatrix4x4 place)
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

/* Above the origin, feet at z = 0. */
static void stand_up(mesh *body, double height)
{
    double low[3], high[3];
    for (int k = 0; k < 3; k++)
        low[k] = high[k] = body->points[0][k];
    for (size_t i = 0; i < body->point_count; i++)
        for (int k = 0; k < 3; k++) {
            double x = body->points[i][k];
            low[k] = x < low[k] ? x : low[k];
            high[k] = x > high[k] ? x : high[k];
        }
    double scale = height / (high[2] - low[2]);
    for (size_t i = 0; i < body->point_count; i++)
        for (int k = 0; k < 3; k++)
            body->points[i][k] = scale * (body->points[i][k] - (k == 2 ? low[k] : 0.5 * (low[k] + high[k])));
}

/* Exact: counts meetings of edges and triangles that share no vertex. */
static rdl_status count_cuts(const mesh *body, size_t *cuts, rdl_fault *fault)
{
    rdl_part part = {"body", RDL_BODY, 1e-3, 0.0}; /* any thickness: tangles are about the surfaces */
    rdl_scene scene = {.size = sizeof scene, .part_count = 1, .parts = &part, .vertex_count = body->point_count,
                       .triangle_count = body->face_count,
                       .triangles = (const uint32_t (*)[3])body->faces};
    rdl_view places = {body->points, 0, RDL_FLOAT64};
    rdl_tangles tangles = {0, NULL};
    uint32_t *parts = calloc(body->point_count + 1, sizeof *parts);
    double *mass = malloc((body->point_count + 1) * sizeof *mass);
    rdl_status status = RDL_NO_MEMORY;
    if (parts && mass) {
        for (size_t i = 0; i < body->point_count; i++)
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

static int judge(const char *path, const mesh *body, char *why, size_t why_size)
{
    rdl_fault fault = {0, ""};
    mesh_faults faults;
    size_t cuts = 0;
    if (!mesh_inspect(body, &faults)) {
        snprintf(why, why_size, "%s", rdl_status_text(RDL_NO_MEMORY));
        return 0;
    }
    int closed = !faults.hole_count && !faults.open_edges && !faults.branched_edges && !faults.flipped_count;
    mesh_faults_free(&faults);
    if (!closed) {
        snprintf(why, why_size, "%s: the mesh is not closed", path);
        return 0;
    }
    rdl_status status = count_cuts(body, &cuts, &fault);
    if (status != RDL_OK) {
        snprintf(why, why_size, "%s: %s %llu: %s", path, fault.field, (unsigned long long)fault.index,
                 rdl_status_text(status));
        return 0;
    }
    if (cuts)
        snprintf(why, why_size, "%s: the mesh cuts itself in %zu places", path, cuts);
    return cuts == 0;
}

int demo_body_load(const char *path, double height, mesh *body, char *why, size_t why_size)
{
    memset(body, 0, sizeof *body);
    const struct aiScene *scene = aiImportFile(path, aiProcess_Triangulate);
    if (!scene || !scene->mRootNode) {
        snprintf(why, why_size, "%s: cannot be read as a mesh (%s)", path, scene ? "empty" : aiGetErrorString());
        return 0;
    }
    struct aiMatrix4x4 identity;
    aiIdentityMatrix4(&identity);
    int done = add_node(body, scene, scene->mRootNode, identity);
    aiReleaseImport(scene);
    if (!done || !mesh_weld(body)) {
        snprintf(why, why_size, "%s", rdl_status_text(RDL_NO_MEMORY));
        done = 0;
    } else if (body->face_count == 0) {
        snprintf(why, why_size, "%s: holds no triangles", path);
        done = 0;
    } else {
        stand_up(body, height);
        done = judge(path, body, why, why_size);
    }
    if (!done)
        mesh_free(body);
    return done;
}
