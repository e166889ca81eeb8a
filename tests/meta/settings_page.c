/* Prints docs/settings.md from the table of settings, so that the page cannot drift from the library. */
#include <stdio.h>

#include "raddle/settings.h"

int main(void)
{
    size_t count;
    const rdl_setting_info *table = rdl_settings_table(&count);
    puts("# Settings\n");
    puts("Every setting is one `double` member of `rdl_settings` (`raddle/settings.h`). Start from");
    puts("`rdl_settings_default`; zero is a value, never \"default\". The same names are the options of the `raddle`");
    puts("program and the attributes of `/settings` in a shot file. A value outside its range is refused with");
    puts("`RDL_BAD_SETTING` and the name of the setting. Settings are fixed when an engine is created.\n");
    puts("This page is printed by `tests/meta/settings_page.c` from the library's own table; a test compares the two.\n");
    puts("| name | unit | default | lowest | highest | whole numbers only | what it does |");
    puts("| --- | --- | --- | --- | --- | --- | --- |");
    for (size_t i = 0; i < count; i++)
        printf("| `%s` | %s | %.15g | %.15g | %.15g | %s | %s |\n", table[i].name, table[i].unit, table[i].initial,
               table[i].lowest, table[i].highest, table[i].whole ? "yes" : "no", table[i].purpose);
    return ferror(stdout) != 0;
}
