/* shot/disk.h: the file driver of the writer. Included by src/shot only.
 * HDF5 does not recover from writes that the disk refuses: it keeps the file open, tries again when the process exits,
 * and may not even get that far. So it never hears of them: the driver notes the first refusal, takes every later write
 * and drops it, and lets the file be closed as if all were well. Its user looks at the note after each operation; what
 * is on disk stays as it was at the refusal. The driver also takes no locks (recordings may be read while they grow;
 * two writers are kept apart by the way the file is created) and follows no HDF5 environment variable. */
#ifndef RDLI_SHOT_DISK_H
#define RDLI_SHOT_DISK_H

#include <hdf5.h>

#include "base/internal.h"

/* Makes a property list use the driver. *refused must outlive the file: the driver sets it when the disk refuses a
 * write, and while it is true it drops what it is given. *driver is to be released by H5FDunregister after the file is
 * closed. */
bool rdli_disk_use(hid_t access, bool *refused, hid_t *driver);

#endif
