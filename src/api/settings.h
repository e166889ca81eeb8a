/* api/settings.h: settings of a caller that may know fewer members than we do.
 * May be included by api/ only. */
#ifndef RDLI_API_SETTINGS_H
#define RDLI_API_SETTINGS_H

#include "base/internal.h"
#include "raddle/settings.h"

/* Checks `given` (NULL = all defaults) and writes the complete settings: defaults for every member that lies beyond
 * given->size. On error *full is untouched; the errors are those of rdl_settings_check. */
rdl_status rdli_settings_complete(const rdl_settings *given, rdl_settings *full, rdl_fault *fault);

#endif
