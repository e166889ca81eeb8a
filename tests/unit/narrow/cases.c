/* unit/narrow/cases.c: see cases.h. */
#include "cases.h"

#include <math.h>

#define TRIANGLE {0, 0, 0}, {1, 0, 0}, {0, 1, 0}

const known_case known_cases[] = {
    {"head-on", RDL_POINT_TRIANGLE, 1, 0.5, 0.5,
     {{{0.25, 0.25, 1}, TRIANGLE}, {{0.25, 0.25, -1}, TRIANGLE}}},
    {"on the hypotenuse", RDL_POINT_TRIANGLE, 1, 0.5, 0.5,
     {{{0.5, 0.5, 1}, TRIANGLE}, {{0.5, 0.5, -1}, TRIANGLE}}},
    {"lands at the end", RDL_POINT_TRIANGLE, 1, 1, 0,
     {{{0.25, 0.25, 1}, TRIANGLE}, {{0.25, 0.25, 0}, TRIANGLE}}},
    {"stops just above", RDL_POINT_TRIANGLE, 0, 1, 1,
     {{{0.25, 0.25, 1}, TRIANGLE}, {{0.25, 0.25, 0x1p-1074}, TRIANGLE}}},
    {"graze, double root", RDL_POINT_TRIANGLE, 1, 0.5, 0.5,
     {{{0, 0.25, 0.25}, {0, 0, 0}, {1, 0, 1}, {0, 1, 0}}, {{0.5, 0.25, -0.25}, {0, 0, 0}, {1, 0, -1}, {0, 1, 0}}}},
    {"two roots", RDL_POINT_TRIANGLE, 1, 0.375, 0.375,
     {{{0, 0.25, 0.234375}, {0, 0, 0}, {1, 0, 1}, {0, 1, 0}}, {{0.5, 0.25, -0.265625}, {0, 0, 0}, {1, 0, -1}, {0, 1, 0}}}},
    {"misses the graze by the least number", RDL_POINT_TRIANGLE, 0, 1, 1,
     {{{0, 0.25, 0.25}, {0, 0, -0x1p-1074}, {1, 0, 1}, {0, 1, -0x1p-1074}},
      {{0.5, 0.25, -0.25}, {0, 0, -0x1p-1074}, {1, 0, -1}, {0, 1, -0x1p-1074}}}},
    {"passes the corner", RDL_POINT_TRIANGLE, 1, 0.5, 0.5,
     {{{1, 0, 1}, TRIANGLE}, {{1, 0, -1}, TRIANGLE}}},
    {"passes beside the corner", RDL_POINT_TRIANGLE, 0, 1, 1,
     {{{0x1.0000000000001p0, 0, 1}, TRIANGLE}, {{0x1.0000000000001p0, 0, -1}, TRIANGLE}}},
    {"in the triangle's own plane", RDL_POINT_TRIANGLE, 1, 0.25, 0,
     {{{-0.25, 0.25, 0}, TRIANGLE}, {{0.75, 0.25, 0}, TRIANGLE}}},
    {"triangle without area", RDL_POINT_TRIANGLE, 1, 0.5, 0.5,
     {{{0.5, 0, 1}, {0, 0, 0}, {1, 0, 0}, {3, 0, 0}}, {{0.5, 0, -1}, {0, 0, 0}, {1, 0, 0}, {3, 0, 0}}}},
    {"triangle that is a point, along one line", RDL_POINT_TRIANGLE, 1, 0.75, 0.25,
     {{{0, 0, 0}, {3, 3, 3}, {3, 3, 3}, {3, 3, 3}}, {{4, 4, 4}, {3, 3, 3}, {3, 3, 3}, {3, 3, 3}}}},
    {"triangle on one line, turned over", RDL_POINT_TRIANGLE, 1, 0.5, 0.25,
     {{{0, 0, -1}, {0, 0, 2}, {0, 0, 2}, {0, 0, 3}}, {{0, 0, 0}, {0, 0, -1}, {0, 0, -1}, {0, 0, -4}}}},
    {"sizes of 1e300 and 1e-300", RDL_POINT_TRIANGLE, 1, 0.5, 0.5,
     {{{1e-300, 1e-300, 1e300}, {0, 0, 0}, {1e300, 0, 0}, {0, 1, 0}},
      {{1e-300, 1e-300, -1e300}, {0, 0, 0}, {1e300, 0, 0}, {0, 1, 0}}}},
    {"head-on edges", RDL_EDGE_EDGE, 1, 0.5, 0.5,
     {{{-1, 0, 0}, {1, 0, 0}, {0, -1, 1}, {0, 1, 1}}, {{-1, 0, 0}, {1, 0, 0}, {0, -1, -1}, {0, 1, -1}}}},
    {"triple root", RDL_EDGE_EDGE, 1, 0.5, 0.5,
     {{{0, 0, 0}, {0, -1, 1}, {-1, 0.5, 0.5}, {1, -1.5, -0.5}}, {{0, 0, 0}, {0, 1, 1}, {1, 1.5, 0.5}, {-1, -0.5, 1.5}}}},
    {"coplanar edges", RDL_EDGE_EDGE, 1, 0.5, 0,
     {{{0, 0, 0}, {2, 0, 0}, {1, 1, 0}, {1, 3, 0}}, {{0, 0, 0}, {2, 0, 0}, {1, -1, 0}, {1, 1, 0}}}},
    {"parallel edges", RDL_EDGE_EDGE, 1, 0.25, 0.75,
     {{{0, 0, 0}, {2, 0, 0}, {1, 0, 1}, {3, 0, 1}}, {{0, 0, 0}, {2, 0, 0}, {1, 0, -3}, {3, 0, -3}}}},
    {"collinear edges", RDL_EDGE_EDGE, 1, 0.5, 0,
     {{{0, 0, 0}, {1, 1, 1}, {2, 2, 2}, {3, 3, 3}}, {{0, 0, 0}, {1, 1, 1}, {0, 0, 0}, {1, 1, 1}}}},
    {"edges of no length", RDL_EDGE_EDGE, 1, 0.5, 0.5,
     {{{0, 0, 0}, {0, 0, 0}, {1, 2, 3}, {1, 2, 3}}, {{0, 0, 0}, {0, 0, 0}, {-1, -2, -3}, {-1, -2, -3}}}},
    {"ends meet at the end", RDL_EDGE_EDGE, 1, 1, 0,
     {{{0, 0, 0}, {1, 0, 0}, {1, 1, 1}, {1, 2, 5}}, {{0, 0, 0}, {1, 0, 0}, {1, 0, 0}, {1, 2, 5}}}},
};
const int known_case_count = sizeof known_cases / sizeof known_cases[0];

const int point_orders[6][4] = {{0, 1, 2, 3}, {0, 1, 3, 2}, {0, 2, 1, 3}, {0, 2, 3, 1}, {0, 3, 1, 2}, {0, 3, 2, 1}};
const int edge_orders[8][4] = {{0, 1, 2, 3}, {1, 0, 2, 3}, {0, 1, 3, 2}, {1, 0, 3, 2},
                               {2, 3, 0, 1}, {3, 2, 0, 1}, {2, 3, 1, 0}, {3, 2, 1, 0}};

rdl_motion motion_reversed(const rdl_motion *motion)
{
    rdl_motion result;
    for (int i = 0; i < 4; i++)
        for (int k = 0; k < 3; k++) {
            result.start[i][k] = motion->end[i][k];
            result.end[i][k] = motion->start[i][k];
        }
    return result;
}

rdl_motion motion_scaled(const rdl_motion *motion, int power)
{
    rdl_motion result;
    for (int i = 0; i < 4; i++)
        for (int k = 0; k < 3; k++) {
            result.start[i][k] = ldexp(motion->start[i][k], power);
            result.end[i][k] = ldexp(motion->end[i][k], power);
        }
    return result;
}

rdl_motion motion_permuted(const rdl_motion *motion, const int order[4])
{
    rdl_motion result;
    for (int i = 0; i < 4; i++)
        for (int k = 0; k < 3; k++) {
            result.start[i][k] = motion->start[order[i]][k];
            result.end[i][k] = motion->end[order[i]][k];
        }
    return result;
}
