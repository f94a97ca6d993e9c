/* suite.h - every test program defines this one function. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TESTS_SUITE_H
#define TESTS_SUITE_H

#include <check.h>

Suite *suite(void);

#endif
