/* oracle/loops.h: topology as a witness: quantities that motion without contact cannot change. No collision code. */
#ifndef ORACLE_LOOPS_H
#define ORACLE_LOOPS_H

#include <stdbool.h>
#include <stddef.h>

#include "raddle/query.h"

/* Gauss linking number of two closed polylines (the last point joins the first) by the solid angles of segment pairs
 * (Klenin & Langowski 2000, method 1a). False, with *number untouched, when the sum lies further than 1e-3 from an
 * integer: the loops then meet or nearly do, and the answer must not be used. *off = that distance. */
bool oracle_linking_number(const double (*a)[3], size_t a_count, const double (*b)[3], size_t b_count, long *number,
                           double *off);
/* Change of the linking number that the crossings of all segment pairs predict while the loops move from *0 to *1 along
 * straight lines: the signed sum of exact edge-edge crossings. False when a crossing is not an ordinary one (planar for
 * the whole step, a graze, on a vertex, or at an end of the step). */
bool oracle_linking_change(const double (*a0)[3], const double (*a1)[3], size_t a_count, const double (*b0)[3],
                           const double (*b1)[3], size_t b_count, long *change);
/* Winding number of a closed triangle mesh round a point by solid angles (van Oosterom & Strackee 1983); +1 inside when
 * the triangles turn counter-clockwise seen from outside. Fails like the linking number. */
bool oracle_winding_number(const double (*vertices)[3], const unsigned (*triangles)[3], size_t triangle_count,
                           const double point[3], long *number, double *off);

#endif
