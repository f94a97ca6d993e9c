/* sha256.h - SHA-256 of some bytes, as hex (FIPS 180-4). */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CONFIG_SHA256_H
#define CONFIG_SHA256_H

#include <stddef.h>

/* 64 lower-case digits and a NUL. */
void sha256_hex(const void *bytes, size_t len, char hex[65]);

#endif
