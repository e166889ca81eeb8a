/* import.c: `raddle import`: a mesh file becomes a shot of one pose. */
#include <assimp/cimport.h>
#include <assimp/mesh.h>
#include <assimp/postprocess.h>
#include <assimp/scene.h>
#include <inttypes.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "cli.h"
#include "mesh.h"
#include "verbs.h"

static const cli_option options[] = {
    {"o", "SHOT", "the shot to write"},
    {"kind", "body|cloth", "what the mesh is (default body: driven by the host)"},
    {"part", "NAME", "name of the part (default: the file's)"},
    {"half-thickness", "M", "half the thickness in metres (default 0 for a body; needed for cloth)"},
    {"friction", "MU", "Coulomb coefficient (default 0.3)"},
    {"density", "KG", "mass of cloth, kilograms per square metre (default 0.2)"},
    {"scale", "S", "metres per unit of the file (default 1)"},
    {"most", "N", "name at most N holes and N flipped faces (default 5)"},
    {"force", NULL, "replace SHOT if it exists"},
    {"json", NULL, "print one JSON object"},
};

static const cli_spec spec = {
    .verb = "import",
    .operands = "MESH...",
    .summary =
        "Turns a mesh file (OBJ, PLY, OFF, STL, glTF) into a shot of one pose: polygons become triangles, points with\n"
        "the same bits are joined, holes and flipped faces are named. Several files, in the order given, are the poses\n"
        "of one mesh: the points that are joined are those of the first.",
    .notes =
        "Findings (exit code 1): holes in a body, edges of more than two faces, faces that run against a neighbour.",
    .options = options,
    .option_count = sizeof options / sizeof options[0],
    .operands_min = 1,
    .operands_max = CLI_OPERANDS_MAX};

enum { NODES_DEEP = 500, COMPLAINT_MAX = 256 };

typedef struct importer {
    const char *path, *out, *part;
    bool cloth, force, json;
    double half_thickness, friction, density, scale;
    size_t most;
    mesh m;
    mesh_faults faults;
    size_t point_room, face_room;
    const char *const *poses; /* further files */
    size_t pose_count;
    mesh raw;         /* of the first file, before points were joined; only with poses */
    uint32_t *became; /* of its points */
} importer;

static bool make_room(importer *im, size_t points, size_t faces)
{
    if (im->m.point_count + points > INT32_MAX || im->m.face_count + faces > INT32_MAX)
        return false;
    if (im->m.point_count + points > im->point_room) {
        size_t room = 2 * im->point_room + points;
        double(*grown)[3] = realloc(im->m.points, room * sizeof *grown);
        if (grown == NULL)
            return false;
        im->m.points = grown;
        im->point_room = room;
    }
    if (im->m.face_count + faces > im->face_room) {
        size_t room = 2 * im->face_room + faces;
        uint32_t(*grown)[3] = realloc(im->m.faces, room * sizeof *grown);
        if (grown == NULL)
            return false;
        im->m.faces = grown;
        im->face_room = room;
    }
    return true;
}

typedef double frame_matrix[3][4];

static void combine(const frame_matrix outer, const struct aiMatrix4x4 *inner, frame_matrix out)
{
    const double in[4][4] = {{inner->a1, inner->a2, inner->a3, inner->a4},
                             {inner->b1, inner->b2, inner->b3, inner->b4},
                             {inner->c1, inner->c2, inner->c3, inner->c4},
                             {inner->d1, inner->d2, inner->d3, inner->d4}};
    for (size_t r = 0; r < 3; r++)
        for (size_t c = 0; c < 4; c++)
            out[r][c] =
                outer[r][0] * in[0][c] + outer[r][1] * in[1][c] + outer[r][2] * in[2][c] + outer[r][3] * in[3][c];
}

static bool add_mesh(importer *im, const struct aiMesh *source, const frame_matrix place)
{
    if (!make_room(im, source->mNumVertices, source->mNumFaces))
        return false;
    size_t first = im->m.point_count;
    for (unsigned v = 0; v < source->mNumVertices; v++) {
        const double p[3] = {source->mVertices[v].x, source->mVertices[v].y, source->mVertices[v].z};
        for (size_t r = 0; r < 3; r++)
            im->m.points[first + v][r] =
                (place[r][0] * p[0] + place[r][1] * p[1] + place[r][2] * p[2] + place[r][3]) * im->scale;
    }
    im->m.point_count += source->mNumVertices;
    for (unsigned f = 0; f < source->mNumFaces; f++) {
        const struct aiFace *face = &source->mFaces[f];
        bool fits = face->mNumIndices == 3;
        for (unsigned k = 0; fits && k < 3; k++)
            fits = face->mIndices[k] < source->mNumVertices;
        if (!fits) {
            im->m.skipped_lines++;
            continue;
        }
        uint32_t *row = im->m.faces[im->m.face_count++];
        for (unsigned k = 0; k < 3; k++)
            row[k] = (uint32_t)first + face->mIndices[k];
    }
    return true;
}

static bool add_node(importer *im, const struct aiScene *scene, const struct aiNode *node, const frame_matrix outer,
                     size_t depth)
{
    frame_matrix place;
    if (depth > NODES_DEEP)
        return false;
    combine(outer, &node->mTransformation, place);
    for (unsigned i = 0; i < node->mNumMeshes; i++)
        if (node->mMeshes[i] >= scene->mNumMeshes ||
            !add_mesh(im, scene->mMeshes[node->mMeshes[i]], (const double(*)[4])place))
            return false;
    for (unsigned i = 0; i < node->mNumChildren; i++)
        if (!add_node(im, scene, node->mChildren[i], (const double(*)[4])place, depth + 1))
            return false;
    return true;
}

/* assimp bends indices that are out of range to some vertex, and only its log says so. Keeps the first such message;
 * others are about materials and textures, which are of no concern here. */
static void on_log(const char *message, char *user)
{
    if (strstr(message, "out of range") == NULL || user[0] != '\0')
        return;
    const char *text = strstr(message, ": ");
    snprintf(user, COMPLAINT_MAX, "%s", text != NULL ? text + 2 : message);
    user[strcspn(user, "\n")] = '\0';
}

static const struct aiScene *load(const char *path, char complaint[])
{
    const struct aiLogStream log = {on_log, complaint};
    aiAttachLogStream(&log);
    const struct aiScene *scene = aiImportFile(path, aiProcess_Triangulate | aiProcess_ValidateDataStructure);
    aiDetachLogStream(&log);
    return scene;
}

static int read_raw(importer *im)
{
    static const frame_matrix unit = {{1, 0, 0, 0}, {0, 1, 0, 0}, {0, 0, 1, 0}};
    if (access(im->path, R_OK) != 0)
        return cli_fail("import", im->path, -1, RDL_NO_FILE, NULL);
    char complaint[COMPLAINT_MAX] = "";
    const struct aiScene *scene = load(im->path, complaint);
    if (scene == NULL || scene->mRootNode == NULL || complaint[0] != '\0') {
        cli_error("import", "%s: not a mesh that can be read: %s", cli_clean(im->path),
                  cli_clean(complaint[0] != '\0' ? complaint : aiGetErrorString()));
        aiReleaseImport(scene);
        return CLI_BAD_INPUT;
    }
    bool done = add_node(im, scene, scene->mRootNode, unit, 0);
    aiReleaseImport(scene);
    if (!done)
        return cli_fail("import", im->path, -1, RDL_NO_MEMORY, NULL);
    for (size_t v = 0; v < im->m.point_count; v++)
        for (size_t k = 0; k < 3; k++)
            if (!isfinite(im->m.points[v][k])) {
                cli_error("import", "%s: vertex %zu: %s", cli_clean(im->path), v, rdl_status_text(RDL_NOT_FINITE));
                return CLI_BAD_INPUT;
            }
    return CLI_DONE;
}

/* What later poses are compared with. */
static bool keep_raw(importer *im)
{
    const mesh *m = &im->m;
    im->raw.points = malloc((m->point_count + 1) * sizeof *m->points);
    im->raw.faces = malloc((m->face_count + 1) * sizeof *m->faces);
    im->became = malloc((m->point_count + 1) * sizeof *im->became);
    if (im->raw.points == NULL || im->raw.faces == NULL || im->became == NULL)
        return false;
    im->raw.point_count = m->point_count;
    im->raw.face_count = m->face_count;
    if (m->point_count > 0)
        memcpy(im->raw.points, m->points, m->point_count * sizeof *m->points);
    if (m->face_count > 0)
        memcpy(im->raw.faces, m->faces, m->face_count * sizeof *m->faces);
    return true;
}

static int read_mesh(importer *im)
{
    int code = read_raw(im);
    if (code != CLI_DONE)
        return code;
    if ((im->pose_count > 0 && !keep_raw(im)) || !mesh_weld(&im->m) ||
        (im->pose_count > 0 && !mesh_follow(&im->raw, &im->m, im->became)))
        return cli_fail("import", im->path, -1, RDL_NO_MEMORY, NULL);
    if (im->m.face_count == 0) {
        cli_error("import", "%s: the file has no triangles", cli_clean(im->path));
        return CLI_BAD_INPUT;
    }
    return mesh_inspect(&im->m, &im->faults) ? CLI_DONE : cli_fail("import", im->path, -1, RDL_NO_MEMORY, NULL);
}

/* A third of each triangle's mass to each of its corners. */
static void fill_mass(const importer *im, double *mass)
{
    const mesh *m = &im->m;
    for (size_t v = 0; v < m->point_count; v++)
        mass[v] = im->cloth ? 0 : HUGE_VAL;
    for (size_t f = 0; im->cloth && f < m->face_count; f++) {
        const double *a = m->points[m->faces[f][0]], *b = m->points[m->faces[f][1]], *c = m->points[m->faces[f][2]];
        double u[3], w[3];
        for (size_t k = 0; k < 3; k++) {
            u[k] = b[k] - a[k];
            w[k] = c[k] - a[k];
        }
        double n[3] = {u[1] * w[2] - u[2] * w[1], u[2] * w[0] - u[0] * w[2], u[0] * w[1] - u[1] * w[0]};
        double area = 0.5 * sqrt(n[0] * n[0] + n[1] * n[1] + n[2] * n[2]);
        for (size_t k = 0; k < 3; k++)
            mass[m->faces[f][k]] += im->density * area / 3;
    }
}

/* The pose of a further file: the same faces, and points that were one in the first file still are. */
static int read_pose(const importer *im, const char *path, double (*points)[3])
{
    importer next = {.path = path, .scale = im->scale};
    int code = read_raw(&next);
    const mesh *m = &next.m, *raw = &im->raw;
    bool same = code == CLI_DONE && m->point_count == raw->point_count && m->face_count == raw->face_count &&
                (m->face_count == 0 || memcmp(m->faces, raw->faces, m->face_count * sizeof *m->faces) == 0);
    if (code == CLI_DONE && !same) {
        cli_error("import", "%s: not the mesh of %s: %zu points and %zu triangles, or others", cli_clean(path),
                  cli_clean(im->path), m->point_count, m->face_count);
        code = CLI_BAD_INPUT;
    }
    uint8_t *placed = calloc(im->m.point_count + 1, 1);
    if (placed == NULL && code == CLI_DONE)
        code = cli_fail("import", path, -1, RDL_NO_MEMORY, NULL);
    for (size_t i = 0; code == CLI_DONE && i < raw->point_count; i++) {
        uint32_t v = im->became[i];
        if (v == UINT32_MAX)
            continue;
        if (placed[v] && (points[v][0] != m->points[i][0] || points[v][1] != m->points[i][1] || points[v][2] != m->points[i][2])) {
            cli_error("import", "%s: points that lie together in %s have parted (vertex %" PRIu32 ")", cli_clean(path),
                      cli_clean(im->path), v);
            code = CLI_BAD_INPUT;
        }
        memcpy(points[v], m->points[i], sizeof points[v]);
        placed[v] = 1;
    }
    free(placed);
    mesh_free(&next.m);
    return code;
}

static int append_poses(const importer *im, rdl_shot_writer *writer)
{
    double(*points)[3] = malloc((im->m.point_count + 1) * sizeof *points);
    int code = points != NULL ? CLI_DONE : cli_fail("import", im->path, -1, RDL_NO_MEMORY, NULL);
    for (size_t k = 0; code == CLI_DONE && k < im->pose_count; k++) {
        rdl_fault fault = {0, ""};
        code = cli_interrupted() ? CLI_INTERRUPTED : read_pose(im, im->poses[k], points);
        const rdl_shot_frame frame = {.time = (double)(k + 1) / 24, .delivered = points[0]};
        rdl_status status = code == CLI_DONE ? rdl_shot_append(writer, &frame, &fault) : RDL_OK;
        if (status != RDL_OK)
            code = cli_fail("import", im->out, (long long)k + 1, status, &fault);
        cli_progress("import", k + 1, im->pose_count);
    }
    cli_progress_end();
    free(points);
    return code;
}

static int write_shot(importer *im)
{
    mesh *m = &im->m;
    rdl_shot_writer *writer = NULL;
    rdl_shot_options shot;
    rdl_fault fault = {0, ""};
    uint32_t *part = calloc(m->point_count, sizeof *part);
    double *mass = malloc(m->point_count * sizeof *mass);
    rdl_status status = part != NULL && mass != NULL ? RDL_OK : RDL_NO_MEMORY;
    if (status == RDL_OK)
        fill_mass(im, mass);
    const rdl_part described = {im->part, im->cloth ? RDL_CLOTH : RDL_BODY, im->half_thickness, im->friction};
    const rdl_scene scene = {.size = sizeof scene,
                             .part_count = 1,
                             .parts = &described,
                             .vertex_count = m->point_count,
                             .vertex_part = part,
                             .mass = mass,
                             .triangle_count = m->face_count,
                             .triangles = (const uint32_t(*)[3])m->faces};
    rdl_shot_options_default(&shot);
    shot.contents = RDL_SHOT_DELIVERED;
    shot.overwrite = im->force;
    shot.created_by = "raddle import " RDL_VERSION_TEXT;
    if (status == RDL_OK)
        status = rdl_shot_create(im->out, &scene, &shot, &writer, &fault);
    const rdl_shot_frame frame = {.delivered = m->points[0]};
    if (status == RDL_OK)
        status = cli_interrupted() ? RDL_CANCELLED : rdl_shot_append(writer, &frame, &fault);
    int code = status == RDL_OK ? append_poses(im, writer) : CLI_DONE;
    if (status == RDL_OK && code == CLI_DONE) {
        status = rdl_shot_finish(writer, &fault);
        writer = NULL;
    }
    rdl_shot_discard(writer);
    free(part);
    free(mass);
    return status == RDL_OK ? code : cli_fail("import", im->out, -1, status, &fault);
}

static json_t *make_json(const importer *im, bool closed)
{
    const mesh *m = &im->m;
    json_t *holes = json_array(), *flipped = json_array();
    for (size_t i = 0; i < im->faults.hole_count && i < im->most; i++)
        json_array_append_new(holes, json_pack("{s:I, s:I}", "vertex", (json_int_t)im->faults.holes[i].first, "edges",
                                               (json_int_t)im->faults.holes[i].edges));
    for (size_t i = 0; i < im->faults.flipped_count && i < im->most; i++)
        json_array_append_new(flipped, json_integer((json_int_t)im->faults.flipped[i]));
    return json_pack("{s:o, s:o, s:o, s:s, s:I, s:I, s:I, s:I, s:I, s:I, s:I, s:b, s:I, s:I, s:I, s:I, s:o, s:o, s:I}",
                     "file", cli_json_text(im->path), "output", cli_json_text(im->out), "part", cli_json_text(im->part),
                     "kind", im->cloth ? "cloth" : "body", "vertices", (json_int_t)m->point_count, "triangles",
                     (json_int_t)m->face_count, "welded", (json_int_t)m->welded, "unused", (json_int_t)m->unused,
                     "dropped_triangles", (json_int_t)m->dropped_faces, "double_triangles", (json_int_t)m->double_faces,
                     "skipped", (json_int_t)m->skipped_lines, "closed", (int)closed, "open_edges",
                     (json_int_t)im->faults.open_edges, "branched_edges", (json_int_t)im->faults.branched_edges,
                     "hole_count", (json_int_t)im->faults.hole_count, "flipped_count",
                     (json_int_t)im->faults.flipped_count, "holes", holes, "flipped", flipped,
                     "poses", (json_int_t)im->pose_count + 1);
}

static void print_text(const importer *im, bool closed)
{
    const mesh *m = &im->m;
    const mesh_faults *faults = &im->faults;
    if (im->pose_count > 0)
        printf("%zu poses\n", im->pose_count + 1);
    printf("%s: %zu vertices (%zu joined, %zu unused), %zu triangles (%zu degenerate and %zu double ones dropped)\n",
           cli_clean(im->path), m->point_count, m->welded, m->unused, m->face_count, m->dropped_faces, m->double_faces);
    if (m->skipped_lines > 0)
        printf("%zu points and lines of the file were left out\n", m->skipped_lines);
    printf("%s\n", closed ? "closed: every edge has two faces" : "not closed");
    for (size_t i = 0; i < faults->hole_count && i < im->most; i++)
        printf("hole of %" PRIu32 " edges at vertex %" PRIu32 "\n", faults->holes[i].edges, faults->holes[i].first);
    if (faults->hole_count > im->most)
        printf("... and %zu more holes\n", faults->hole_count - im->most);
    if (faults->branched_edges > 0)
        printf("%zu edges have more than two faces\n", faults->branched_edges);
    for (size_t i = 0; i < faults->flipped_count && i < im->most; i++)
        printf("triangle %" PRIu32 " runs against a neighbour\n", faults->flipped[i]);
    if (faults->flipped_count > im->most)
        printf("... and %zu more such triangles\n", faults->flipped_count - im->most);
}

static int run(importer *im)
{
    int code = read_mesh(im);
    if (code == CLI_DONE)
        code = write_shot(im);
    if (code != CLI_DONE)
        return code;
    const mesh_faults *faults = &im->faults;
    bool closed = faults->open_edges == 0 && faults->branched_edges == 0;
    if (faults->flipped_count > 0 || faults->branched_edges > 0 || (!im->cloth && faults->open_edges > 0))
        code = CLI_FINDINGS;
    if (im->json)
        return cli_print_json("import", make_json(im, closed), code);
    print_text(im, closed);
    return code;
}

/* The file's name without folder and extension. */
static void default_name(const char *path, char name[256])
{
    const char *slash = strrchr(path, '/');
    snprintf(name, 256, "%s", slash != NULL ? slash + 1 : path);
    char *dot = strrchr(name, '.');
    if (dot != NULL && dot != name)
        *dot = '\0';
}

static bool take_number(const cli_line *line, const char *option, double lowest, double highest, double *value)
{
    const char *text = cli_value(&spec, line, option);
    return text == NULL || cli_number(&spec, option, text, lowest, highest, false, value);
}

static bool take_options(importer *im, const cli_line *line)
{
    const char *kind = cli_value(&spec, line, "kind");
    double most = 5;
    im->out = cli_value(&spec, line, "o");
    im->cloth = kind != NULL && strcmp(kind, "cloth") == 0;
    im->force = cli_value(&spec, line, "force") != NULL;
    im->json = cli_value(&spec, line, "json") != NULL;
    if (im->out == NULL) {
        cli_error("import", "-o SHOT is missing: where to write the shot");
        return false;
    }
    if (kind != NULL && !im->cloth && strcmp(kind, "body") != 0) {
        cli_error("import", "--kind: %s is neither body nor cloth", cli_clean(kind));
        return false;
    }
    if (im->cloth && cli_value(&spec, line, "half-thickness") == NULL) {
        cli_error("import", "--half-thickness is missing: cloth needs one");
        return false;
    }
    if (!take_number(line, "half-thickness", 0, 1e6, &im->half_thickness) ||
        !take_number(line, "friction", 0, 1e6, &im->friction) ||
        !take_number(line, "density", 1e-12, 1e12, &im->density) ||
        !take_number(line, "scale", 1e-12, 1e12, &im->scale) || !take_number(line, "most", 0, 1e9, &most))
        return false;
    im->most = (size_t)most;
    return true;
}

int verb_import(int argc, char **argv)
{
    static cli_line line; /* too large for some stacks */
    int code = CLI_DONE;
    char name[256];
    importer im = {.friction = 0.3, .density = 0.2, .scale = 1};
    if (!cli_read(&spec, argc, argv, &line, &code))
        return code;
    im.path = line.operands[0];
    im.poses = line.operands + 1;
    im.pose_count = line.operand_count - 1;
    if (!take_options(&im, &line))
        return CLI_BAD_INPUT;
    default_name(im.path, name);
    im.part = cli_value(&spec, &line, "part") != NULL ? cli_value(&spec, &line, "part") : name;
    code = run(&im);
    mesh_free(&im.m);
    mesh_faults_free(&im.faults);
    mesh_free(&im.raw);
    free(im.became);
    return code;
}
