/* shot/disk.h: the file driver of the writer. Included by src/shot only.
 * HDF5 keeps a file open for as long as it has bytes that the disk refuses, and tries again when the process exits. This
 * driver can be told to give up: from then on it takes every write and drops it, so that closing works, and what is on
 * disk stays as it was. It also takes no locks (recordings may be read while they grow; two writers are kept apart by the
 * way the file is created) and follows no HDF5 environment variable. */
#ifndef RDLI_SHOT_DISK_H
#define RDLI_SHOT_DISK_H

#include <hdf5.h>

#include "base/internal.h"

/* Makes a property list use the driver. *given_up must outlive the file; true makes the driver drop what it is given.
 * *driver is to be released by H5FDunregister after the file is closed. */
bool rdli_disk_use(hid_t access, const bool *given_up, hid_t *driver);

#endif
