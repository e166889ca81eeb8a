/* shot/publish.h: how a finished file gets its name. Included by src/shot only. */
#ifndef RDLI_SHOT_PUBLISH_H
#define RDLI_SHOT_PUBLISH_H

#include "base/internal.h"

/* Creates an empty file that did not exist before; with replace an old one of that name is removed first.
 * RDL_FILE_EXISTS, RDL_NO_FILE (no such folder), RDL_WRITE_FAILED. */
rdl_status rdli_publish_claim(const char *path, bool replace);
/* Whether something of that name exists, a dangling link included. */
bool rdli_publish_exists(const char *path);
/* Brings `from` to the disk and gives it the name `to`. Without replace an existing `to` is never lost, also when it
 * appears at the last moment: RDL_FILE_EXISTS, and `from` stays. */
rdl_status rdli_publish_rename(const char *from, const char *to, bool replace);

#endif
