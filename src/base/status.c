/* base/status.c: texts of the statuses, the fault record, the version. */
#include "base/internal.h"

rdl_status rdli_fault_set(rdl_fault *fault, rdl_status status, const char *field, uint64_t index)
{
    if (fault != NULL) {
        size_t n = strlen(field);
        if (n >= sizeof fault->field)
            n = sizeof fault->field - 1;
        memset(fault->field, 0, sizeof fault->field);
        memcpy(fault->field, field, n);
        fault->index = index;
    }
    return status;
}
