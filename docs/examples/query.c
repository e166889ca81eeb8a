/* The narrow phase on its own: when does a falling point meet a triangle, and when does it come within 0.1 m of it?
 * Build: cc -std=c17 query.c $(pkg-config --cflags --libs raddle) */
#include <stdio.h>

#include <raddle/query.h>

int main(void)
{
    /* Vertex 0 is the point; it falls from z = 1 to z = -1 through the resting triangle 1-2-3. */
    const rdl_motion motion = {.start = {{0.25, 0.25, 1}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}},
                               .end = {{0.25, 0.25, -1}, {0, 0, 0}, {1, 0, 0}, {0, 1, 0}}};
    const rdl_motion motions[] = {motion, motion};
    const double gaps[] = {0, 0.1};
    rdl_touch touches[2];
    rdl_fault fault = {0, ""};
    rdl_status status = rdl_find_touches(RDL_POINT_TRIANGLE, 2, motions, gaps, touches, &fault);
    if (status != RDL_OK) {
        fprintf(stderr, "%s (%s %llu)\n", rdl_status_text(status), fault.field, (unsigned long long)fault.index);
        return 1;
    }
    for (int i = 0; i < 2; i++)
        printf("gap %.1f: %s, first at %.3f of the step\n", gaps[i], touches[i].touches ? "touches" : "stays apart",
               touches[i].time_lo);
    return 0;
}
