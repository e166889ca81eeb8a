/* shot/quiet.h: a truce with the host's own use of HDF5. Included by src/shot only. */
#ifndef RDLI_SHOT_QUIET_H
#define RDLI_SHOT_QUIET_H

#include <hdf5.h>

#include "base/internal.h"

/* HDF5 prints its error stack unless told not to, and every call of it clears that stack. Both belong to the host: they
 * are set aside on entry to each public call and put back before it returns. */
typedef struct rdli_quiet {
    hid_t stack;
    bool set_aside;
    unsigned is_new; /* which of HDF5's two interfaces the host's printer has */
    H5E_auto1_t old_print;
    H5E_auto2_t new_print;
    void *print_data;
} rdli_quiet;

void rdli_quiet_begin(rdli_quiet *quiet);
void rdli_quiet_end(rdli_quiet *quiet);

#endif
