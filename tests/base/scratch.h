/* What the tests of files and outputs look at: paths in the scratch folder, what stands there, open descriptors. */
#ifndef BASE_SCRATCH_H
#define BASE_SCRATCH_H

#include "support/harness.h"

#include <dirent.h>
#include <fcntl.h>
#include <stdio.h>
#include <sys/stat.h>

/* The path that in_scratch gave last. */
static char scratch_name[512];

/* A path in the scratch folder; good until the next call. */
static inline const char *in_scratch(const char *name) {
    (void)snprintf(scratch_name, sizeof scratch_name, "%s/%s", scratch_dir(), name);
    return scratch_name;
}

/* A file of the scratch folder with something old in it. */
static inline const char *old_file(const char *name) {
    (void)scratch_file(name, "old", 3);
    return in_scratch(name);
}

/* The bytes of a file, or "(none)"; good until the next call. */
static inline const char *content(const char *of) {
    static char bytes[1 << 18];
    FILE *file = fopen(of, "rb");
    if (!file) return "(none)";
    size_t length = fread(bytes, 1, sizeof bytes - 1, file);
    (void)fclose(file);
    bytes[length] = '\0';
    return bytes;
}

/* How many entries the scratch folder has: a temporary file left behind shows. */
static inline int entries(void) {
    int n = 0;
    DIR *folder = opendir(scratch_dir());
    while (folder && readdir(folder)) n++;
    if (folder) (void)closedir(folder);
    return n;
}

/* How many descriptors are open: nothing may leave one behind. */
static inline int open_descriptors(void) {
    int n = 0;
    for (int descriptor = 0; descriptor < 256; descriptor++) n += fcntl(descriptor, F_GETFD) >= 0;
    return n;
}

static inline mode_t mode_of(const char *of) {
    struct stat now = {0};
    return stat(of, &now) == 0 ? now.st_mode & 07777 : 0;
}

#endif
