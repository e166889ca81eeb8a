/* api/rest.c: exact predicates at rest. */
#include "narrow/narrow.h"
#include "raddle/rest.h"

int rdl_edge_against_triangle(const double edge[2][3], const double triangle[3][3])
{
    return rdli_edge_against_triangle(edge, triangle);
}
