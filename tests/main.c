/* Runs the one suite of a test program. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <check.h>
#include <stdlib.h>

#include "tests/suite.h"

int main(void)
{
    SRunner *runner = srunner_create(suite());
    srunner_run_all(runner, CK_ENV);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
