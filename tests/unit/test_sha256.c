/* SHA-256 of config against published examples.
 *
 * Source: FIPS 180-4 and its example values (NIST, "Examples with
 * Intermediate Values", SHA-256: "abc" and the 448-bit message), the
 * million 'a' of FIPS 180-2 appendix B.3, and NIST CAVS SHA256ShortMsg (empty
 * message).
 */
/* SPDX-License-Identifier: Apache-2.0 */
#include <stdlib.h>
#include <string.h>

#include "config/sha256.h"
#include "tests/suite.h"

static void expect(const void *bytes, size_t len, const char *hex)
{
    char got[65];
    sha256_hex(bytes, len, got);
    ck_assert_str_eq(got, hex);
}

START_TEST(the_published_messages_give_the_published_digests)
{
    const char *two = "abcdbcdecdefdefgefghfghighijhijkijkljklmklmnlmnomnop"
                      "nopq";
    expect("", 0,
           "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855");
    expect("abc", 3,
           "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
    expect(two, strlen(two),
           "248d6a61d20638b8e5c026930c3e6039a33ce45964ff2167f6ecedd419db06c1");
}
END_TEST

START_TEST(a_million_letters_a_give_the_published_digest)
{
    char *text = malloc(1000000);
    ck_assert_ptr_nonnull(text);
    memset(text, 'a', 1000000);
    expect(text, 1000000,
           "cdc76e5c9914fb9281a1c7e284d73e67f1809a48a497200e046d39ccc7112cd0");
    free(text);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("sha256");
    TCase *t = tcase_create("sha256");
    tcase_add_test(t, the_published_messages_give_the_published_digests);
    tcase_add_test(t, a_million_letters_a_give_the_published_digest);
    suite_add_tcase(s, t);
    return s;
}
