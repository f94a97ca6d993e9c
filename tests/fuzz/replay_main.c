/* Feeds every file of the folders named to a fuzz target, as a plain test.
 *
 * For each file its bytes are also cut short at a few lengths: what once broke
 * a target often breaks it torn as well.  A folder that is missing is fine. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <dirent.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>

enum { REPLAY_FILE_MAX = 1 << 20, REPLAY_CUTS = 8 };

int LLVMFuzzerTestOneInput(const uint8_t *bytes, size_t len);

/* A copy of its own length, so that a reader past the end is caught. */
static void feed(const uint8_t *bytes, size_t len)
{
    uint8_t *copy = malloc(len == 0 ? 1 : len);
    if (copy == NULL)
        abort();
    for (size_t i = 0; i < len; i++)
        copy[i] = bytes[i];
    LLVMFuzzerTestOneInput(copy, len);
    free(copy);
}

static int feed_file(const char *path)
{
    static uint8_t bytes[REPLAY_FILE_MAX];
    FILE *from = fopen(path, "rb");
    if (from == NULL)
        return 0;
    size_t len = fread(bytes, 1, sizeof bytes, from);
    fclose(from);
    feed(bytes, len);
    for (size_t i = 0; i < REPLAY_CUTS; i++)
        feed(bytes, len * i / REPLAY_CUTS);
    return 1;
}

int main(int argc, char **argv)
{
    int n = 0;
    for (int i = 1; i < argc; i++) {
        DIR *folder = opendir(argv[i]);
        struct dirent *entry;
        while (folder != NULL && (entry = readdir(folder)) != NULL) {
            char path[1024];
            snprintf(path, sizeof path, "%s/%s", argv[i], entry->d_name);
            if (entry->d_name[0] != '.')
                n += feed_file(path);
        }
        if (folder != NULL)
            closedir(folder);
    }
    feed((const uint8_t *)"", 0);
    printf("%d inputs\n", n);
    return 0;
}
