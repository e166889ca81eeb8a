/* support/published.c: see published.h. Eight points a case: start, then end. */
#include "published.h"

#define FACE {0, 0, 0}, {1, 0, 0}, {0, 1, 0}
#define RAIL {0, 0, 0}, {2, 0, 0}

const published_case published_cases[] = {
    {"head on", RDL_POINT_TRIANGLE, 0, 1, 0.5, {{{0.25, 0.25, 1}, FACE}, {{0.25, 0.25, -1}, FACE}}},
    {"on an edge", RDL_POINT_TRIANGLE, 0, 1, 0.5, {{{0.5, 0.5, 1}, FACE}, {{0.5, 0.5, -1}, FACE}}},
    {"one bit beside the edge", RDL_POINT_TRIANGLE, 0, 0, 1,
     {{{0.5, 0.5 + 0x1p-53, 1}, FACE}, {{0.5, 0.5 + 0x1p-53, -1}, FACE}}},
    {"lands", RDL_POINT_TRIANGLE, 0, 1, 1, {{{0.25, 0.25, 1}, FACE}, {{0.25, 0.25, 0}, FACE}}},
    {"does not quite land", RDL_POINT_TRIANGLE, 0, 0, 1, {{{0.25, 0.25, 1}, FACE}, {{0.25, 0.25, 0x1p-1074}, FACE}}},
    {"leaves", RDL_POINT_TRIANGLE, 0, 1, 0, {{{0.25, 0.25, 0}, FACE}, {{0.25, 0.25, 1}, FACE}}},
    {"graze, double root", RDL_POINT_TRIANGLE, 0, 1, 0.5,
     {{{0, 0.25, 0.25}, {0, 0, 0}, {1, 0, 1}, {0, 1, 0}}, {{0.5, 0.25, -0.25}, {0, 0, 0}, {1, 0, -1}, {0, 1, 0}}}},
    {"no graze", RDL_POINT_TRIANGLE, 0, 0, 1,
     {{{0, 0.25, 0.25 + 0x1p-52}, {0, 0, 0}, {1, 0, 1}, {0, 1, 0}},
      {{0.5, 0.25, -0.25 + 0x1p-52}, {0, 0, 0}, {1, 0, -1}, {0, 1, 0}}}},
    {"two roots", RDL_POINT_TRIANGLE, 0, 1, 0.375,
     {{{0, 0.25, 0.25 - 0.015625}, {0, 0, 0}, {1, 0, 1}, {0, 1, 0}},
      {{0.5, 0.25, -0.25 - 0.015625}, {0, 0, 0}, {1, 0, -1}, {0, 1, 0}}}},
    {"head on", RDL_EDGE_EDGE, 0, 1, 0.5,
     {{{-1, 0, 0}, {1, 0, 0}, {0, -1, 1}, {0, 1, 1}}, {{-1, 0, 0}, {1, 0, 0}, {0, -1, -1}, {0, 1, -1}}}},
    {"triple root", RDL_EDGE_EDGE, 0, 1, 0.5,
     {{{0, 0, 0}, {0, -1, 1}, {-1, 0.5, 0.5}, {1, -1.5, -0.5}}, {{0, 0, 0}, {0, 1, 1}, {1, 1.5, 0.5}, {-1, -0.5, 1.5}}}},
    {"coplanar throughout", RDL_EDGE_EDGE, 0, 1, 0.5,
     {{RAIL, {1, 1, 0}, {1, 3, 0}}, {RAIL, {1, -1, 0}, {1, 1, 0}}}},
    {"collinear, meeting end on", RDL_EDGE_EDGE, 0, 1, 0.5,
     {{RAIL, {3, 0, 0}, {4, 0, 0}}, {RAIL, {1, 0, 0}, {2, 0, 0}}}},
    {"a point through a point", RDL_EDGE_EDGE, 0, 1, 0.25,
     {{{1, 1, 1}, {1, 1, 1}, {0, 0, 0}, {0, 0, 0}}, {{1, 1, 1}, {1, 1, 1}, {4, 4, 4}, {4, 4, 4}}}},
    {"face at a gap", RDL_POINT_TRIANGLE, 0.25, 1, 0.375, {{{0.25, 0.25, 1}, FACE}, {{0.25, 0.25, -1}, FACE}}},
    {"edges at a gap", RDL_EDGE_EDGE, 0.25, 1, 0.375,
     {{{-1, 0, 0}, {1, 0, 0}, {0, -1, 1}, {0, 1, 1}}, {{-1, 0, 0}, {1, 0, 0}, {0, -1, -1}, {0, 1, -1}}}},
    {"corner at a gap, 3-4-5", RDL_POINT_TRIANGLE, 5, 1, 0.375, {{{8, -3, 0}, FACE}, {{0, -3, 0}, FACE}}},
    {"edge at a gap", RDL_POINT_TRIANGLE, 3, 1, 0.875, {{{8, -3, 0}, FACE}, {{0, -3, 0}, FACE}}},
    {"below the gap at the start", RDL_POINT_TRIANGLE, 1, 1, 0, {{{0.25, 0.25, 1}, FACE}, {{0.25, 0.25, 2}, FACE}}},
    {"parallel edges slide within the gap", RDL_EDGE_EDGE, 1, 1, 0.25,
     {{RAIL, {6, 1, 0}, {7, 1, 0}}, {RAIL, {-10, 1, 0}, {-9, 1, 0}}}},
    {"parallel edges slide outside the gap", RDL_EDGE_EDGE, 1 - 2e-6, 0, 1,
     {{RAIL, {6, 1, 0}, {7, 1, 0}}, {RAIL, {-10, 1, 0}, {-9, 1, 0}}}},
};

const int published_count = (int)(sizeof published_cases / sizeof published_cases[0]);
