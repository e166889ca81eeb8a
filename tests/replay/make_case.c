/* make_case NUMBER FILE: one of the published check values of a moving pair, as a shot of one step: a point (the end of a
 * strand) and a triangle of cloth, or two strand segments. Numbers 1 to 5 are point and triangle, 6 to 8 two edges. */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <raddle/query.h>
#include <raddle/shot.h>

static const rdl_motion cases[8] = {
    /* head-on, at 1/2 with weights 1/2, 1/4, 1/4 */
    {{{0.25, 0.25, 1}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}}, {{0.25, 0.25, -1}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}}},
    /* on the hypotenuse */
    {{{0.5, 0.5, 1}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}}, {{0.5, 0.5, -1}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}}},
    /* lands at exactly 1 */
    {{{0.25, 0.25, 1}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}}, {{0.25, 0.25, 0}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}}},
    /* grazes: a double root at 1/2 */
    {{{0, 0.25, 0.25}, {0, 0, 0}, {1, 0, 1}, {0, 1, 0}}, {{0.5, 0.25, -0.25}, {0, 0, 0}, {1, 0, -1}, {0, 1, 0}}},
    /* the same a 64th lower: 3/8 and 5/8 */
    {{{0, 0.25, 0.234375}, {0, 0, 0}, {1, 0, 1}, {0, 1, 0}}, {{0.5, 0.25, -0.265625}, {0, 0, 0}, {1, 0, -1}, {0, 1, 0}}},
    /* edges head-on, in their middles */
    {{{-1, 0, 0}, {1, 0, 0}, {0, -1, 1}, {0, 1, 1}}, {{-1, 0, 0}, {1, 0, 0}, {0, -1, -1}, {0, 1, -1}}},
    /* a triple root at 1/2 */
    {{{0, 0, 0}, {0, -1, 1}, {-1, 0.5, 0.5}, {1, -1.5, -0.5}}, {{0, 0, 0}, {0, 1, 1}, {1, 1.5, 0.5}, {-1, -0.5, 1.5}}},
    /* in one plane all the time; at 1/2 the lower end arrives */
    {{{0, 0, 0}, {2, 0, 0}, {1, 1, 0}, {1, 3, 0}}, {{0, 0, 0}, {2, 0, 0}, {1, -1, 0}, {1, 1, 0}}}};

int main(int argc, char **argv)
{
    int number = argc == 3 ? atoi(argv[1]) : 0;
    if (number < 1 || number > 8)
        return 2;
    const rdl_motion *motion = &cases[number - 1];
    int point = number <= 5;
    static const double mass[5] = {1, 1, 1, 1, 1};
    static const uint32_t part_of[2][5] = {{0, 0, 1, 1, 0}, {0, 1, 1, 1, 0}};
    static const uint32_t point_segment[1][2] = {{0, 4}}, edges[2][2] = {{0, 1}, {2, 3}}, triangle[1][3] = {{1, 2, 3}};
    const rdl_part parts[2] = {{"first", RDL_STRANDS, 1e-6, 0}, {"second", point ? RDL_CLOTH : RDL_STRANDS, 1e-6, 0}};
    double start[5][3], proposed[5][3];
    memcpy(start, motion->start, sizeof motion->start);
    memcpy(proposed, motion->end, sizeof motion->end);
    for (int k = 0; k < 3; k++) { /* the rest of the strand that the point belongs to */
        start[4][k] = start[0][k] + (k == 2 ? 8 : 0);
        proposed[4][k] = proposed[0][k] + (k == 2 ? 8 : 0);
    }
    const rdl_scene scene = {.size = sizeof scene, .part_count = 2, .parts = parts, .vertex_count = point ? 5 : 4,
                             .vertex_part = part_of[point], .mass = mass, .segment_count = point ? 1 : 2,
                             .segments = point ? point_segment : edges, .triangle_count = point ? 1 : 0,
                             .triangles = triangle};
    rdl_shot_options options;
    rdl_shot_writer *writer = NULL;
    rdl_fault fault = {0, ""};
    rdl_shot_options_default(&options);
    options.contents = RDL_SHOT_START | RDL_SHOT_PROPOSED;
    options.overwrite = 1;
    const rdl_shot_frame frame = {.start = start[0], .proposed = proposed[0]};
    rdl_status status = rdl_shot_create(argv[2], &scene, &options, &writer, &fault);
    if (status == RDL_OK)
        status = rdl_shot_append(writer, &frame, &fault);
    if (status == RDL_OK)
        status = rdl_shot_finish(writer, &fault);
    if (status != RDL_OK)
        fprintf(stderr, "make_case: %s: %s\n", fault.field, rdl_status_text(status));
    return status == RDL_OK ? EXIT_SUCCESS : 3;
}
