/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/call.h"

int main(int argc, char **argv)
{
    return call_main(argc, argv);
}
