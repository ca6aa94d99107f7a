/*
 * An allocator that fails, for LD_PRELOAD.
 *
 * FAILN         the number of the allocation that fails, counted from the beginning of main; 0 or not set: none
 * FAILON        1: all from that one on fail, not only that one
 * FAULT_REPORT  a file that is given the number of allocations when the program ends
 */
#define _GNU_SOURCE /* RTLD_NEXT; this is a test's tool for glibc, as the names below are */
#include <dlfcn.h>
#include <errno.h>
#include <fcntl.h>
#include <stdatomic.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

void *__libc_malloc(size_t size);
void *__libc_calloc(size_t count, size_t size);
void *__libc_realloc(void *memory, size_t size);
int __libc_start_main(int (*program)(int, char **, char **), int argc, char **argv, void (*init)(void), void (*fini)(void),
                      void (*rtld_fini)(void), void *stack_end);

static atomic_bool counting;
static atomic_ulong count;
static unsigned long fail_at;
static int fail_on;
static int (*real_main)(int, char **, char **);

static int fails(void) {
    if (!atomic_load(&counting)) return 0;
    unsigned long number = atomic_fetch_add(&count, 1) + 1;
    if (fail_at == 0 || (fail_on ? number < fail_at : number != fail_at)) return 0;
    errno = ENOMEM;
    return 1;
}

void *malloc(size_t size) {
    return fails() ? NULL : __libc_malloc(size);
}

void *calloc(size_t n, size_t size) {
    return fails() ? NULL : __libc_calloc(n, size);
}

void *realloc(void *memory, size_t size) {
    return fails() ? NULL : __libc_realloc(memory, size);
}

static void report(void) {
    const char *path = getenv("FAULT_REPORT");
    atomic_store(&counting, 0);
    int file = path ? open(path, O_WRONLY | O_CREAT | O_TRUNC | O_CLOEXEC, 0666) : -1;
    if (file < 0) return;
    char text[32];
    int length = snprintf(text, sizeof text, "%lu\n", atomic_load(&count));
    if (write(file, text, (size_t)length) != length) abort();
    (void)close(file);
}

static int counted_main(int argc, char **argv, char **environment) {
    const char *at = getenv("FAILN"), *on = getenv("FAILON");
    fail_at = at ? strtoul(at, NULL, 10) : 0;
    fail_on = on && strcmp(on, "1") == 0;
    (void)atexit(report);
    atomic_store(&counting, 1);
    return real_main(argc, argv, environment);
}

int __libc_start_main(int (*program)(int, char **, char **), int argc, char **argv, void (*init)(void), void (*fini)(void),
                      void (*rtld_fini)(void), void *stack_end) {
    int (*next)(int (*)(int, char **, char **), int, char **, void (*)(void), void (*)(void), void (*)(void), void *) = NULL;
    *(void **)&next = dlsym(RTLD_NEXT, "__libc_start_main");
    real_main = program;
    return next(counted_main, argc, argv, init, fini, rtld_fini, stack_end);
}
