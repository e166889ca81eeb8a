/* api/settings.c: the one table of settings, and the three calls that rest on it. */
#include "api/settings.h"

/* The bounds, and why they are where they are:
 * path_floor_share: sigma. At 0 a path could touch, at 1 the floor along the path would be the end floor and a rigid
 *   zone could not turn at all (its pairs keep cos(angle / 2) of their distance); 1/2 allows turns below 120 degrees.
 * aim_margin: solvers aim above a floor by this share. The promise allows at most 4e-6. Below 1.5e-6 the false-alarm band
 *   of a query at a gap (1e-6 of the gap) would leave too little room for the solver's own rounding, and a resolved pair
 *   would be reported as touching for ever.
 * recovery_speed: 0 keeps pairs that start below their gap where they are. */
static const rdl_setting_info table[] = {
    {"path_floor_share", "1", "Share of the end floor that a pair keeps along the whole path.",
     0.5, 0.05, 0.95, 0, offsetof(rdl_settings, path_floor_share)},
    {"aim_margin", "1", "Relative margin by which solvers aim above a floor.",
     2e-6, 1.5e-6, 4e-6, 0, offsetof(rdl_settings, aim_margin)},
    {"passes_max", "count", "Passes of detection and solve in one sub-step before a zone escalates.",
     40, 1, 1000, 1, offsetof(rdl_settings, passes_max)},
    {"substeps_max", "count", "Most sub-steps into which one step is cut.",
     64, 1, 65536, 1, offsetof(rdl_settings, substeps_max)},
    {"solver_sweeps", "count", "Most iterations of one zone solve.",
     600, 1, 100000, 1, offsetof(rdl_settings, solver_sweeps)},
    {"restitution", "1", "Coefficient of restitution of contacts: 0 stops the approach, 1 reverses it.",
     0, 0, 1, 0, offsetof(rdl_settings, restitution)},
    {"recovery_speed", "m/s", "Greatest speed at which pairs below their gap are moved apart.",
     0, 0, 1e9, 0, offsetof(rdl_settings, recovery_speed)},
    {"untangle", "switch", "1 attempts to undo tangles that the start state already has.",
     0, 0, 1, 1, offsetof(rdl_settings, untangle)},
    {"vector", "switch", "1 uses vector instructions where the machine has them; the bits are the same either way.",
     1, 0, 1, 1, offsetof(rdl_settings, vector)},
};

enum { ROWS = sizeof table / sizeof table[0] };

/* A member that was added to the struct but not to the table would never be checked. */
static_assert(sizeof(rdl_settings) == sizeof(size_t) + ROWS * sizeof(double), "one row per member of rdl_settings");

static double read_member(const rdl_settings *settings, size_t row)
{
    double value;
    memcpy(&value, (const char *)settings + table[row].offset, sizeof value);
    return value;
}

static void write_member(rdl_settings *settings, size_t row, double value)
{
    memcpy((char *)settings + table[row].offset, &value, sizeof value);
}

/* Reads settings->size only, never the member itself. */
static bool caller_has(const rdl_settings *settings, size_t row)
{
    return table[row].offset + sizeof(double) <= settings->size;
}

void rdl_settings_default(rdl_settings *settings)
{
    if (settings == NULL)
        return;
    settings->size = sizeof *settings;
    for (size_t row = 0; row < ROWS; row++)
        write_member(settings, row, table[row].initial);
}

const rdl_setting_info *rdl_settings_table(size_t *count)
{
    if (count != NULL)
        *count = ROWS;
    return table;
}

rdl_status rdl_settings_check(const rdl_settings *settings, rdl_fault *fault)
{
    if (settings == NULL)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "settings", 0);
    /* Larger: the caller may rely on a setting that this library does not know. Smaller: the size was never set. */
    if (settings->size < sizeof settings->size || settings->size > sizeof *settings)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "size", 0);
    for (size_t row = 0; row < ROWS && caller_has(settings, row); row++) {
        double value = read_member(settings, row);
        bool inside = value >= table[row].lowest && value <= table[row].highest; /* false for NaN */
        if (!inside || (table[row].whole && value != floor(value)))
            return rdli_fault_set(fault, RDL_BAD_SETTING, table[row].name, row);
    }
    return RDL_OK;
}

rdl_status rdli_settings_complete(const rdl_settings *given, rdl_settings *full, rdl_fault *fault)
{
    rdl_status status = given == NULL ? RDL_OK : rdl_settings_check(given, fault);
    if (status != RDL_OK)
        return status;
    rdl_settings_default(full);
    for (size_t row = 0; given != NULL && row < ROWS && caller_has(given, row); row++)
        write_member(full, row, read_member(given, row));
    return RDL_OK;
}
