/* reduce_test.c: the result of a reduction as a C program that needs nothing but the installed library. */
#include <inttypes.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "judge.h"
#include "reduce.h"

/* The shortest text that reads back as the same number. */
static const char *number(double x, char text[40])
{
    for (int digits = 1; digits <= 17; digits++) {
        snprintf(text, 40, "%.*g", digits, x);
        if (strtod(text, NULL) == x)
            break;
    }
    if (isinf(x))
        strcpy(text, "INFINITY");
    return text;
}

static void write_points(FILE *file, const char *name, const double *x, size_t count)
{
    char a[40], b[40], c[40];
    fprintf(file, "static const double %s[%zu][3] = {\n", name, count);
    for (size_t v = 0; v < count; v++)
        fprintf(file, "    {%s, %s, %s},\n", number(x[3 * v], a), number(x[3 * v + 1], b), number(x[3 * v + 2], c));
    fprintf(file, "};\n");
}

static void write_rows(FILE *file, const char *name, const uint32_t *rows, size_t count, size_t width)
{
    if (count == 0)
        return;
    fprintf(file, "static const uint32_t %s[%zu][%zu] = {", name, count, width);
    for (size_t i = 0; i < count; i++) {
        fprintf(file, "%s{", i % 8 == 0 ? "\n    " : " ");
        for (size_t k = 0; k < width; k++)
            fprintf(file, "%s%" PRIu32, k > 0 ? ", " : "", rows[width * i + k]);
        fprintf(file, "},");
    }
    fprintf(file, "\n};\n");
}

static void write_numbers(FILE *file, const char *name, const double *x, size_t count)
{
    char text[40];
    fprintf(file, "static const double %s[%zu] = {", name, count);
    for (size_t i = 0; i < count; i++)
        fprintf(file, "%s%s,", i % 8 == 0 ? "\n    " : " ", number(x[i], text));
    fprintf(file, "\n};\n");
}

/* Names come from files: plain letters only. */
static void write_parts(FILE *file, const rdl_scene *scene)
{
    static const char *const kinds[] = {"RDL_STRANDS", "RDL_CLOTH", "RDL_BODY"};
    char a[40], b[40];
    fprintf(file, "static const rdl_part parts[%zu] = {\n", scene->part_count);
    for (size_t p = 0; p < scene->part_count; p++)
        fprintf(file, "    {\"part %zu\", %s, %s, %s},\n", p, kinds[scene->parts[p].kind],
                number(scene->parts[p].half_thickness, a), number(scene->parts[p].friction, b));
    fprintf(file, "};\n");
}

static void write_frictions(FILE *file, const rdl_scene *scene)
{
    char text[40];
    if (scene->pair_friction_count == 0)
        return;
    fprintf(file, "static const rdl_pair_friction frictions[%zu] = {\n", scene->pair_friction_count);
    for (size_t k = 0; k < scene->pair_friction_count; k++)
        fprintf(file, "    {{%" PRIu32 ", %" PRIu32 "}, %s},\n", scene->pair_friction[k].part[0],
                scene->pair_friction[k].part[1], number(scene->pair_friction[k].friction, text));
    fprintf(file, "};\n");
}

static void write_scene(FILE *file, const rdl_scene *scene)
{
    fprintf(file, "static rdl_scene scene = {.size = sizeof scene, .part_count = %zu, .parts = parts,\n"
                  "    .vertex_count = %zu, .vertex_part = vertex_part, .mass = mass,\n", scene->part_count,
            scene->vertex_count);
    if (scene->half_thickness != NULL)
        fprintf(file, "    .half_thickness = half_thickness,\n");
    if (scene->segment_count > 0)
        fprintf(file, "    .segment_count = %zu, .segments = segments,\n", scene->segment_count);
    if (scene->triangle_count > 0)
        fprintf(file, "    .triangle_count = %zu, .triangles = triangles,\n", scene->triangle_count);
    if (scene->muted_count > 0)
        fprintf(file, "    .muted_count = %zu, .muted_parts = muted_parts,\n", scene->muted_count);
    if (scene->attachment_count > 0)
        fprintf(file, "    .attachment_count = %zu, .attachments = attachments,\n", scene->attachment_count);
    if (scene->pair_friction_count > 0)
        fprintf(file, "    .pair_friction_count = %zu, .pair_friction = frictions,\n", scene->pair_friction_count);
    fprintf(file, "};\n\n");
}

static bool write_data(FILE *file, const reduced *r, bool with_edges)
{
    const rdl_scene *scene = &r->s.scene;
    judge *j = NULL;
    size_t edge_count = 0;
    if (judge_create(scene, 1, false, &j) != RDL_OK)
        return false;
    const uint32_t(*edges)[2] = judge_edges(j, &edge_count);
    fprintf(file, "enum { VERTICES = %zu", scene->vertex_count);
    if (with_edges)
        fprintf(file, ", EDGES = %zu, TRIANGLES = %zu", edge_count, scene->triangle_count);
    fprintf(file, " };\n\n");
    write_parts(file, scene);
    fprintf(file, "static const uint32_t vertex_part[%zu] = {", scene->vertex_count);
    for (size_t v = 0; v < scene->vertex_count; v++)
        fprintf(file, "%s%" PRIu32 ",", v % 16 == 0 ? "\n    " : " ", scene->vertex_part[v]);
    fprintf(file, "\n};\n");
    write_numbers(file, "mass", scene->mass, scene->vertex_count);
    if (scene->half_thickness != NULL)
        write_numbers(file, "half_thickness", scene->half_thickness, scene->vertex_count);
    write_rows(file, "segments", scene->segment_count > 0 ? scene->segments[0] : NULL, scene->segment_count, 2);
    write_rows(file, "triangles", scene->triangle_count > 0 ? scene->triangles[0] : NULL, scene->triangle_count, 3);
    if (with_edges)
        write_rows(file, "edges", edge_count > 0 ? edges[0] : NULL, edge_count, 2);
    write_rows(file, "muted_parts", scene->muted_count > 0 ? scene->muted_parts[0] : NULL, scene->muted_count, 2);
    write_rows(file, "attachments", scene->attachment_count > 0 ? scene->attachments[0] : NULL,
               scene->attachment_count, 2);
    write_frictions(file, scene);
    write_points(file, "start", r->s.start, scene->vertex_count);
    write_points(file, "proposed", r->s.proposed, scene->vertex_count);
    write_scene(file, scene);
    judge_destroy(j);
    return true;
}

/* ---- the part that asks ---- */

static const char *const step_code =
    "static double delivered[VERTICES][3];\n"
    "static rdl_report report;\n\n"
    "static int failed(rdl_status status, const rdl_fault *fault)\n"
    "{\n"
    "    if (status != RDL_OK)\n"
    "        printf(\"%s (%s %llu)\\n\", rdl_status_text(status), fault->field, (unsigned long long)fault->index);\n"
    "    return status != RDL_OK;\n"
    "}\n\n"
    "static int run(rdl_engine **engine, const rdl_settings *settings, unsigned threads)\n"
    "{\n"
    "    rdl_fault fault = {0, \"\"};\n"
    "    const rdl_host host = {.size = sizeof host, .threads = threads};\n"
    "    rdl_step step = {.size = sizeof step, .start = {start, 0, RDL_FLOAT64}, .proposed = {proposed, 0, RDL_FLOAT64},\n"
    "                     .duration = DURATION, .passes_max = PASSES_MAX};\n"
    "#if HOST_BITS == 32\n"
    "    static float narrow[VERTICES][3];\n"
    "    step.delivered = (rdl_output_view){narrow, 0, RDL_FLOAT32};\n"
    "#else\n"
    "    step.delivered = (rdl_output_view){delivered, 0, RDL_FLOAT64};\n"
    "#endif\n"
    "    if (failed(rdl_engine_create(&scene, settings, &host, engine, &fault), &fault))\n"
    "        return 0;\n"
    "    report.size = sizeof report;\n"
    "    if (failed(rdl_engine_step(*engine, &step, &report, &fault), &fault))\n"
    "        return 0;\n"
    "#if HOST_BITS == 32\n"
    "    for (size_t v = 0; v < VERTICES; v++)\n"
    "        for (size_t k = 0; k < 3; k++)\n"
    "            delivered[v][k] = (double)narrow[v][k];\n"
    "#endif\n"
    "    return 1;\n"
    "}\n\n";

static const char *const crossing_code =
    "/* Pairs that the scene's rules leave alone. */\n"
    "static int ignored(const uint32_t v[4], int first)\n"
    "{\n"
    "    int driven = 1;\n"
    "    for (int i = 0; i < 4; i++)\n"
    "        driven = driven && isinf(mass[v[i]]);\n"
    "    for (int i = 0; i < first; i++)\n"
    "        for (int k = first; k < 4; k++) {\n"
    "            if (v[i] == v[k])\n"
    "                return 1;\n"
    "            for (size_t a = 0; a < scene.attachment_count; a++)\n"
    "                if ((scene.attachments[a][0] == v[i] && scene.attachments[a][1] == v[k]) ||\n"
    "                    (scene.attachments[a][0] == v[k] && scene.attachments[a][1] == v[i]))\n"
    "                    return 1;\n"
    "        }\n"
    "    uint32_t p = vertex_part[v[0]], q = vertex_part[v[3]];\n"
    "    for (size_t m = 0; m < scene.muted_count; m++)\n"
    "        if ((scene.muted_parts[m][0] == p && scene.muted_parts[m][1] == q) ||\n"
    "            (scene.muted_parts[m][0] == q && scene.muted_parts[m][1] == p))\n"
    "            return 1;\n"
    "    return driven;\n"
    "}\n\n"
    "static int meets(int kind, const uint32_t v[4], const double (*from)[3], const double (*to)[3])\n"
    "{\n"
    "    rdl_motion motion;\n"
    "    rdl_touch touch;\n"
    "    if (ignored(v, kind == RDL_POINT_TRIANGLE ? 1 : 2))\n"
    "        return 0;\n"
    "    for (int i = 0; i < 4; i++)\n"
    "        for (int k = 0; k < 3; k++) {\n"
    "            motion.start[i][k] = from[v[i]][k];\n"
    "            motion.end[i][k] = to[v[i]][k];\n"
    "        }\n"
    "    if (rdl_find_touches(kind, 1, &motion, NULL, &touch, NULL) != RDL_OK || !touch.touches || touch.time_hi == 0)\n"
    "        return 0;\n"
    "    printf(\"%s of vertices %u %u %u %u meet at %.9g of the way\\n\",\n"
    "           kind == RDL_POINT_TRIANGLE ? \"point and triangle\" : \"edges\", (unsigned)v[0], (unsigned)v[1], (unsigned)v[2],\n"
    "           (unsigned)v[3], touch.time_hi);\n"
    "    return 1;\n"
    "}\n\n"
    "static int crosses(const double (*from)[3], const double (*to)[3])\n"
    "{\n"
    "    int found = 0;\n"
    "    for (uint32_t t = 0; t < TRIANGLES; t++)\n"
    "        for (uint32_t p = 0; p < VERTICES; p++) {\n"
    "            const uint32_t *c = scene.triangles[t], v[4] = {p, c[0], c[1], c[2]};\n"
    "            found += meets(RDL_POINT_TRIANGLE, v, from, to);\n"
    "        }\n"
    "    for (size_t a = 0; a < EDGES; a++)\n"
    "        for (size_t b = a + 1; b < EDGES; b++) {\n"
    "            const uint32_t v[4] = {edges[a][0], edges[a][1], edges[b][0], edges[b][1]};\n"
    "            found += meets(RDL_EDGE_EDGE, v, from, to);\n"
    "        }\n"
    "    return found;\n"
    "}\n\n";

static const char *const delivered_way =
    "    const double (*from)[3] = start;\n"
    "    for (size_t w = 0; w < report.waypoint_count; w++) {\n"
    "        const double (*to)[3] = (const double (*)[3])(report.waypoint_positions + 3 * VERTICES * w);\n"
    "        shows += crosses(from, to);\n"
    "        from = to;\n"
    "    }\n"
    "    shows += crosses(from, (const double (*)[3])delivered);\n";

static const char *const pierced_code =
    "static int pierced(const double (*at)[3])\n"
    "{\n"
    "    const rdl_view view = {at, 0, RDL_FLOAT64};\n"
    "    rdl_tangles tangles = {0, NULL};\n"
    "    rdl_fault fault = {0, \"\"};\n"
    "    int count = 0;\n"
    "    if (rdl_find_tangles(&scene, &view, 0, NULL, &tangles, &fault) != RDL_OK)\n"
    "        return 0;\n"
    "    for (size_t i = 0; i < tangles.count; i++)\n"
    "        if (tangles.items[i].relation == RDL_REST_PIERCE) {\n"
    "            printf(\"edge %u-%u pierces triangle %u\\n\", (unsigned)tangles.items[i].edge[0],\n"
    "                   (unsigned)tangles.items[i].edge[1], (unsigned)tangles.items[i].triangle);\n"
    "            count++;\n"
    "        }\n"
    "    rdl_tangles_release(&tangles, NULL);\n"
    "    return count;\n"
    "}\n\n";

static void write_settings(FILE *file, const char *name, const rdl_settings *settings)
{
    rdl_settings plain;
    char text[40];
    size_t count = 0;
    const rdl_setting_info *table = rdl_settings_table(&count);
    rdl_settings_default(&plain);
    fprintf(file, "    rdl_settings %s;\n    rdl_settings_default(&%s);\n", name, name);
    for (size_t row = 0; row < count; row++) {
        double mine, usual;
        memcpy(&mine, (const char *)settings + table[row].offset, sizeof mine);
        memcpy(&usual, (const char *)&plain + table[row].offset, sizeof usual);
        if (mine != usual)
            fprintf(file, "    %s.%s = %s;\n", name, table[row].name, number(mine, text));
    }
}

static void write_differs(FILE *file, const predicate *p)
{
    write_settings(file, "other", p->has_other ? &p->other : &p->settings);
    if (!p->has_other)
        fprintf(file, "    other.vector = settings.vector != 0 ? 0 : 1;\n");
    fprintf(file, "    static double first[VERTICES][3];\n"
                  "    memcpy(first, delivered, sizeof first);\n"
                  "    rdl_engine_destroy(engine);\n"
                  "    engine = NULL;\n"
                  "    if (!run(&engine, &other, 4))\n"
                  "        return 2;\n"
                  "    shows = memcmp(first, delivered, sizeof first) != 0;\n");
}

static void write_question(FILE *file, const predicate *p)
{
    static const char *const fields[] = {"(double)report.passes",     "(double)report.pairs",
                                         "(double)report.touches",    "(double)report.zone_count",
                                         "(double)report.substeps",   "(double)report.held_count",
                                         "report.worst_correction"};
    static const char *const verdicts[] = {"RDL_CLEAR", "RDL_RESOLVED", "RDL_PINCHED", "RDL_TANGLED"};
    char text[40];
    switch (p->kind) {
    case KEEP_VERDICT:
        fprintf(file, "    shows = report.verdict == %s;\n", verdicts[p->verdict]);
        break;
    case KEEP_ABOVE:
        fprintf(file, "    shows = %s > %s;\n", fields[p->measure], number(p->bound, text));
        break;
    case KEEP_DIFFERS:
        write_differs(file, p);
        break;
    case KEEP_INTERSECT:
        fprintf(file, "    shows = pierced(start) + pierced(%s);\n",
                p->as_given ? "proposed" : "(const double (*)[3])delivered");
        break;
    default:
        if (p->as_given)
            fprintf(file, "    shows = crosses(start, proposed);\n");
        else
            fprintf(file, "%s", delivered_way);
        if (p->kind == KEEP_MISSED)
            fprintf(file, "    shows = shows > 0 && report.verdict <= RDL_RESOLVED;\n");
    }
}

static void write_main(FILE *file, const predicate *p)
{
    fprintf(file, "int main(void)\n{\n    int shows = 0;\n");
    if (!p->as_given) {
        fprintf(file, "    rdl_engine *engine = NULL;\n");
        write_settings(file, "settings", &p->settings);
        fprintf(file, "    if (!run(&engine, &settings, 1))\n        return 2;\n");
    }
    write_question(file, p);
    if (!p->as_given)
        fprintf(file, "    rdl_engine_destroy(engine);\n");
    fprintf(file, "    printf(\"%%s\\n\", shows ? \"it shows\" : \"it does not show\");\n"
                  "    return shows ? 1 : 0;\n}\n");
}

int reduce_write_test(const reduced *r, const predicate *p, const finding *found, const char *path)
{
    cli_output output;
    int code = CLI_DONE;
    char text[40];
    bool path_judged = p->kind == KEEP_CROSSING || p->kind == KEEP_MISSED;
    if (!cli_output_begin(&output, "reduce", path, true, &code))
        return code;
    FILE *file = output.file;
    fprintf(file, "/* A reduced scene. What it shows: %s\n"
                  " * Build and run: cc -std=c17 FILE.c $(pkg-config --cflags --libs raddle) && ./a.out\n"
                  " * Exit code: 1 while it shows, 0 when it is gone, 2 when a call failed. */\n"
                  "#include <math.h>\n#include <stdint.h>\n#include <stdio.h>\n#include <string.h>\n\n"
                  "#include <raddle/raddle.h>\n\n", found->what);
    if (!p->as_given)
        fprintf(file, "#define HOST_BITS %d\n#define DURATION %s\n#define PASSES_MAX %" PRIu64 "u\n\n", r->s.host_bits,
                number(r->s.recorded.duration, text), r->s.recorded.passes_max);
    if (!write_data(file, r, path_judged)) {
        cli_output_drop(&output);
        return cli_fail("reduce", path, -1, RDL_NO_MEMORY, NULL);
    }
    if (!p->as_given)
        fprintf(file, "%s", step_code);
    if (path_judged)
        fprintf(file, "%s", crossing_code);
    if (p->kind == KEEP_INTERSECT)
        fprintf(file, "%s", pierced_code);
    write_main(file, p);
    return cli_output_end(&output, "reduce", &code) ? CLI_DONE : code;
}
