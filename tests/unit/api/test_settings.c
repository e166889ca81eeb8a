/* Settings: the table against the struct, every bound, and callers with a shorter struct. */
#include <check.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "api/settings.h"

static double member(const rdl_settings *settings, size_t offset)
{
    double value;
    memcpy(&value, (const char *)settings + offset, sizeof value);
    return value;
}

static void set_member(rdl_settings *settings, size_t offset, double value)
{
    memcpy((char *)settings + offset, &value, sizeof value);
}

static rdl_status check_with(const rdl_setting_info *row, double value, rdl_fault *fault)
{
    rdl_settings settings;
    rdl_settings_default(&settings);
    set_member(&settings, row->offset, value);
    return rdl_settings_check(&settings, fault);
}

START_TEST(defaults_are_those_of_the_table)
{
    rdl_settings settings;
    size_t count = 0;
    const rdl_setting_info *table = rdl_settings_table(&count);
    memset(&settings, 0xff, sizeof settings);
    rdl_settings_default(&settings);
    ck_assert_uint_eq(settings.size, sizeof settings);
    ck_assert_uint_eq(count, (sizeof settings - sizeof(size_t)) / sizeof(double));
    for (size_t i = 0; i < count; i++) {
        ck_assert_uint_eq(table[i].offset, sizeof(size_t) + i * sizeof(double));
        ck_assert_double_eq(member(&settings, table[i].offset), table[i].initial);
    }
    ck_assert_int_eq(rdl_settings_check(&settings, NULL), RDL_OK);
    ck_assert_double_eq(settings.path_floor_share, 0.5);
    ck_assert_double_eq(settings.aim_margin, 2e-6);
    ck_assert_double_eq(settings.restitution, 0);
}
END_TEST

START_TEST(rows_are_named_and_described)
{
    size_t count = 0;
    const rdl_setting_info *table = rdl_settings_table(&count);
    static const char *const units[] = {"1", "count", "m/s", "switch"};
    for (size_t i = 0; i < count; i++) {
        size_t known = 0;
        for (size_t u = 0; u < sizeof units / sizeof units[0]; u++)
            known += strcmp(table[i].unit, units[u]) == 0;
        ck_assert_uint_eq(known, 1);
        ck_assert(strlen(table[i].name) > 0 && table[i].purpose[strlen(table[i].purpose) - 1] == '.');
        ck_assert(table[i].lowest <= table[i].initial && table[i].initial <= table[i].highest);
        for (size_t j = 0; j < i; j++)
            ck_assert_str_ne(table[i].name, table[j].name);
    }
}
END_TEST

START_TEST(each_bound_holds_and_names_its_row)
{
    size_t count = 0;
    const rdl_setting_info *table = rdl_settings_table(&count);
    for (size_t i = 0; i < count; i++) {
        const double bad[] = {NAN, INFINITY, -INFINITY, nextafter(table[i].lowest, -INFINITY),
                              nextafter(table[i].highest, INFINITY)};
        ck_assert_int_eq(check_with(&table[i], table[i].lowest, NULL), RDL_OK);
        ck_assert_int_eq(check_with(&table[i], table[i].highest, NULL), RDL_OK);
        for (size_t b = 0; b < sizeof bad / sizeof bad[0]; b++) {
            rdl_fault fault = {99, "untouched"};
            ck_assert_int_eq(check_with(&table[i], bad[b], &fault), RDL_BAD_SETTING);
            ck_assert_str_eq(fault.field, table[i].name);
            ck_assert_uint_eq(fault.index, i);
        }
        double between = 0.5 * (table[i].lowest + nextafter(table[i].highest, -INFINITY));
        if (between == floor(between))
            between += 0.5;
        ck_assert_int_eq(check_with(&table[i], between, NULL), table[i].whole ? RDL_BAD_SETTING : RDL_OK);
    }
}
END_TEST

START_TEST(missing_arguments_are_named)
{
    rdl_fault fault = {99, ""};
    ck_assert_int_eq(rdl_settings_check(NULL, &fault), RDL_BAD_ARGUMENT);
    ck_assert_str_eq(fault.field, "settings");
    rdl_settings_default(NULL);
    ck_assert_ptr_nonnull(rdl_settings_table(NULL));
    rdl_settings full;
    ck_assert_int_eq(rdli_settings_complete(NULL, &full, NULL), RDL_OK);
    ck_assert_int_eq(rdl_settings_check(&full, NULL), RDL_OK);
    ck_assert_uint_eq(full.size, sizeof full);
}
END_TEST

/* The caller's struct lies in a block of exactly its size, so that a sanitizer sees any read beyond it, and the byte
 * after the last whole member is a value that would be refused. */
START_TEST(every_shorter_size_gets_defaults_for_the_rest)
{
    size_t count = 0;
    const rdl_setting_info *table = rdl_settings_table(&count);
    for (size_t size = sizeof(size_t); size <= sizeof(rdl_settings); size++) {
        rdl_settings chosen, full;
        chosen.size = size;
        for (size_t i = 0; i < count; i++)
            set_member(&chosen, table[i].offset, table[i].offset + sizeof(double) <= size ? table[i].highest : NAN);
        void *block = malloc(size);
        ck_assert_ptr_nonnull(block);
        memcpy(block, &chosen, size);
        ck_assert_int_eq(rdl_settings_check(block, NULL), RDL_OK);
        ck_assert_int_eq(rdli_settings_complete(block, &full, NULL), RDL_OK);
        free(block);
        ck_assert_uint_eq(full.size, sizeof full);
        for (size_t i = 0; i < count; i++) {
            double wanted = table[i].offset + sizeof(double) <= size ? table[i].highest : table[i].initial;
            ck_assert_double_eq(member(&full, table[i].offset), wanted);
        }
    }
}
END_TEST

START_TEST(sizes_that_cannot_be_are_refused)
{
    rdl_settings settings, full;
    rdl_settings_default(&settings);
    const size_t bad[] = {0, 1, sizeof(size_t) - 1, sizeof settings + 1, sizeof settings + 64, SIZE_MAX};
    for (size_t i = 0; i < sizeof bad / sizeof bad[0]; i++) {
        rdl_fault fault = {99, ""};
        settings.size = bad[i];
        memset(&full, 0x5a, sizeof full);
        rdl_settings before = full;
        ck_assert_int_eq(rdl_settings_check(&settings, &fault), RDL_BAD_ARGUMENT);
        ck_assert_str_eq(fault.field, "size");
        ck_assert_int_eq(rdli_settings_complete(&settings, &full, NULL), RDL_BAD_ARGUMENT);
        ck_assert_mem_eq(&full, &before, sizeof full);
    }
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("settings");
    TCase *group = tcase_create("settings");
    tcase_add_test(group, defaults_are_those_of_the_table);
    tcase_add_test(group, rows_are_named_and_described);
    tcase_add_test(group, each_bound_holds_and_names_its_row);
    tcase_add_test(group, missing_arguments_are_named);
    tcase_add_test(group, every_shorter_size_gets_defaults_for_the_rest);
    tcase_add_test(group, sizes_that_cannot_be_are_refused);
    suite_add_tcase(suite, group);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_ENV);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
