/* api/query.c: the stateless questions of query.h. */
#include "narrow/narrow.h"

static rdl_status check_points(const double x[4][3], const char *field, size_t pair, rdl_fault *fault)
{
    for (int i = 0; i < 4; i++)
        for (int k = 0; k < 3; k++)
            if (!isfinite(x[i][k]))
                return rdli_fault_set(fault, RDL_NOT_FINITE, field, pair);
    return RDL_OK;
}

static rdl_status check(size_t count, const rdl_motion motions[], const double gaps[], rdl_fault *fault)
{
    for (size_t i = 0; i < count; i++) {
        rdl_status status = check_points(motions[i].start, "start", i, fault);
        if (status == RDL_OK)
            status = check_points(motions[i].end, "end", i, fault);
        if (status != RDL_OK)
            return status;
        if (gaps && !isfinite(gaps[i]))
            return rdli_fault_set(fault, RDL_NOT_FINITE, "gaps", i);
        if (gaps && gaps[i] < 0)
            return rdli_fault_set(fault, RDL_OUT_OF_RANGE, "gaps", i);
    }
    return RDL_OK;
}

rdl_status rdl_find_touches(int kind, size_t count, const rdl_motion motions[], const double gaps[], rdl_touch touches[],
                            rdl_fault *fault)
{
    if (kind != RDL_POINT_TRIANGLE && kind != RDL_EDGE_EDGE)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "kind", 0);
    if (count == 0)
        return RDL_OK;
    if (!motions || !touches)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, motions ? "touches" : "motions", 0);
    rdl_status status = check(count, motions, gaps, fault);
    if (status != RDL_OK)
        return status;
    rdli_find_touch_list(kind, count, motions, gaps, touches);
    return RDL_OK;
}
