#include "support/harness.h"

#include "base/memory.h"

#include <dirent.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

static char scratch[256];
static pid_t scratch_owner;

static void remove_scratch(void) {
    if (scratch[0] == '\0' || getpid() != scratch_owner) return;
    DIR *dir = opendir(scratch);
    if (!dir) return;
    for (struct dirent *entry; (entry = readdir(dir));) {
        char path[1024];
        if (strcmp(entry->d_name, ".") == 0 || strcmp(entry->d_name, "..") == 0) continue;
        (void)snprintf(path, sizeof path, "%s/%s", scratch, entry->d_name);
        (void)unlink(path);
    }
    (void)closedir(dir);
    (void)rmdir(scratch);
}

const char *scratch_dir(void) {
    if (scratch[0] != '\0') return scratch;
    const char *base = getenv("TMPDIR");
    (void)snprintf(scratch, sizeof scratch, "%s/ballast-test-XXXXXX", base && *base ? base : "/tmp");
    if (!mkdtemp(scratch)) {
        perror(scratch);
        exit(1);
    }
    scratch_owner = getpid();
    (void)atexit(remove_scratch);
    return scratch;
}

const char *scratch_file(const char *name, const void *bytes, size_t length) {
    static char path[1024];
    (void)snprintf(path, sizeof path, "%s/%s", scratch_dir(), name);
    FILE *file = fopen(path, "wb");
    if (!file || fwrite(bytes, 1, length, file) != length || fclose(file) != 0) {
        perror(path);
        exit(1);
    }
    return path;
}

const char *test_path(const char *relative) {
    static char path[1024];
    const char *base = getenv("TESTS_DIR");
    (void)snprintf(path, sizeof path, "%s/%s", base ? base : "tests", relative);
    return path;
}

int run_suite(Suite *suite) {
    (void)scratch_dir(); /* made before Check forks, so that the parent removes it */
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_NORMAL);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}

size_t survive_allocations(bal_status (*action)(void *context, bal_error *err), void *context) {
    for (size_t n = 1;; n++) {
        bal_error err = {0};
        bali_memory_fail_at(n);
        bal_status status = action(context, &err);
        bali_memory_fail_at(0);
        if (status == BAL_OK) return n - 1;
        ck_assert_msg(status == BAL_ERR_MEMORY, "allocation %zu failed, and the status was %d: %s", n, (int)status, err.message);
        ck_assert_msg(err.status == BAL_ERR_MEMORY, "allocation %zu failed without a message", n);
        ck_assert_msg(n < 100000, "no end to allocations");
    }
}

bool near(double a, double b, double tolerance) {
    return fabs(a - b) <= tolerance * fmax(1, fabs(b));
}
