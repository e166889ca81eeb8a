/* shot/quiet.c: see quiet.h. Nothing else that is process-wide in HDF5 is touched: not its exit handler, not its
 * library-wide limits, not its plugin path. */
#include "shot/quiet.h"

void rdli_quiet_begin(rdli_quiet *quiet)
{
    memset(quiet, 0, sizeof *quiet);
    quiet->stack = H5Eget_current_stack(); /* first, since every other call clears it */
    quiet->set_aside = H5Eauto_is_v2(H5E_DEFAULT, &quiet->is_new) >= 0;
    if (quiet->set_aside && quiet->is_new)
        quiet->set_aside = H5Eget_auto2(H5E_DEFAULT, &quiet->new_print, &quiet->print_data) >= 0;
    else if (quiet->set_aside)
        quiet->set_aside = H5Eget_auto1(&quiet->old_print, &quiet->print_data) >= 0;
    if (quiet->set_aside)
        H5Eset_auto2(H5E_DEFAULT, NULL, NULL);
}

void rdli_quiet_end(rdli_quiet *quiet)
{
    if (quiet->set_aside && quiet->is_new)
        H5Eset_auto2(H5E_DEFAULT, quiet->new_print, quiet->print_data);
    else if (quiet->set_aside)
        H5Eset_auto1(quiet->old_print, quiet->print_data);
    if (quiet->stack >= 0)
        H5Eset_current_stack(quiet->stack); /* closes it too; last, for the same reason */
}
