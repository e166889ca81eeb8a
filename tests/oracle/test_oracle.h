/* oracle/test_oracle.h: the two halves of the oracle's own test. */
#ifndef ORACLE_TEST_H
#define ORACLE_TEST_H

#include <check.h>

Suite *loops_suite(void);

#endif
