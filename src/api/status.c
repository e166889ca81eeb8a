/* api/status.c: rdl_status_text, rdl_version. */
#include "base/internal.h"

const char *rdl_version(void)
{
    return RDL_VERSION_TEXT;
}

const char *rdl_status_text(rdl_status status)
{
    switch (status) {
    case RDL_OK: return "success";
    case RDL_BAD_ARGUMENT: return "missing or contradictory argument";
    case RDL_NOT_FINITE: return "not a finite number";
    case RDL_OUT_OF_RANGE: return "out of range";
    case RDL_REPEATED_VERTEX: return "an element repeats a vertex";
    case RDL_MIXED_PARTS: return "an element joins two parts";
    case RDL_BAD_MASS: return "mass is not greater than zero";
    case RDL_BAD_THICKNESS: return "half-thickness is negative or not finite";
    case RDL_ZERO_GAP: return "two parts would keep a gap of zero";
    case RDL_BAD_BOX: return "box with lower bound above upper bound";
    case RDL_BAD_SETTING: return "setting out of range";
    case RDL_TOO_LARGE: return "too many elements";
    case RDL_NO_MEMORY: return "out of memory";
    case RDL_CANCELLED: return "cancelled by the host";
    case RDL_LOOSE_VERTEX: return "vertex that no element uses";
    case RDL_BAD_MEMORY: return "engine memory does not fit this scene";
    case RDL_NO_FILE: return "cannot open file";
    case RDL_BAD_FILE: return "truncated, foreign or contradictory file";
    case RDL_BAD_VERSION: return "unknown format version";
    case RDL_WRITE_FAILED: return "write failed";
    case RDL_BAD_DIGEST: return "digest and data differ";
    case RDL_FILE_EXISTS: return "file exists";
    }
    return "unknown status";
}
