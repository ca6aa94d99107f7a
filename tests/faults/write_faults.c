/*
 * System calls that fail, fall short or meet a signal, for LD_PRELOAD.
 *
 * FAULT_CALL    the call that is meant: open openat read write fsync fchmod fchown linkat renameat close, or close-written: the close of
 *               what was written to
 * FAULT_AT      its number, counted from the beginning of main; not set: none
 * FAULT_ON      1: every one from that number on
 * FAULT_ERRNO   the number of the error that it fails with
 * FAULT_SHORT   1: instead, read and write do half of what they are asked
 * FAULT_SIGNAL  instead, the number of a signal that the process is sent; FAULT_AFTER=1: after the call, not before
 * NO_TMPFILE    1: the file system knows no unnamed files
 * FAULT_REPORT  a file that is given the number of these calls when the program ends
 */
#define _GNU_SOURCE /* RTLD_NEXT, O_TMPFILE */
#include <dlfcn.h>
#include <errno.h>
#include <fcntl.h>
#include <signal.h>
#include <stdarg.h>
#include <stdatomic.h>
#include <stdbool.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

int __libc_start_main(int (*program)(int, char **, char **), int argc, char **argv, void (*init)(void), void (*fini)(void),
                      void (*rtld_fini)(void), void *stack_end);

static struct {
    const char *call;
    unsigned long at;
    int error, signal;
    bool on, cut, after, no_tmpfile;
} fault;

enum { MOST_DESCRIPTORS = 256 };
static atomic_bool written[MOST_DESCRIPTORS];

static atomic_bool counting;
static atomic_ulong count;
static int (*real_main)(int, char **, char **);

static bool is_meant(const char *call) {
    if (!atomic_load(&counting) || !fault.call || strcmp(call, fault.call) != 0) return false;
    unsigned long number = atomic_fetch_add(&count, 1) + 1;
    return fault.at != 0 && (fault.on ? number >= fault.at : number == fault.at);
}

/* What is to happen before a call: true when it is to fail. */
static bool fails(bool meant) {
    if (meant && fault.signal && !fault.after) (void)kill(getpid(), fault.signal);
    if (!meant || fault.signal || fault.cut) return false;
    errno = fault.error;
    return true;
}

/* What is to happen behind it. */
static void behind(bool meant) {
    int error = errno;
    if (meant && fault.signal && fault.after) (void)kill(getpid(), fault.signal);
    errno = error;
}

static size_t amount(bool meant, size_t size) {
    return meant && fault.cut && size > 1 ? size / 2 : size;
}

static void *real(const char *name) {
    return dlsym(RTLD_NEXT, name);
}

/* O_TMPFILE has the bit of O_DIRECTORY in it, which alone takes no mode. */
static bool takes_mode(int flags) {
    return (flags & O_CREAT) || (flags & O_TMPFILE) == O_TMPFILE;
}

static bool is_refused(int flags) {
    if (!fault.no_tmpfile || (flags & O_TMPFILE) != O_TMPFILE) return false;
    errno = EOPNOTSUPP;
    return true;
}

int open(const char *path, int flags, ...) {
    int (*next)(const char *, int, ...) = NULL;
    mode_t mode = 0;
    va_list arguments;
    va_start(arguments, flags);
    if (takes_mode(flags)) mode = va_arg(arguments, mode_t);
    va_end(arguments);
    bool meant = is_meant("open");
    if (fails(meant)) return -1;
    *(void **)&next = real("open");
    int result = is_refused(flags) ? -1 : next(path, flags, mode);
    behind(meant);
    return result;
}

int openat(int folder, const char *path, int flags, ...) {
    int (*next)(int, const char *, int, ...) = NULL;
    mode_t mode = 0;
    va_list arguments;
    va_start(arguments, flags);
    if (takes_mode(flags)) mode = va_arg(arguments, mode_t);
    va_end(arguments);
    bool meant = is_meant("openat");
    if (fails(meant)) return -1;
    *(void **)&next = real("openat");
    int result = is_refused(flags) ? -1 : next(folder, path, flags, mode);
    behind(meant);
    return result;
}

ssize_t read(int descriptor, void *bytes, size_t size) {
    ssize_t (*next)(int, void *, size_t) = NULL;
    bool meant = is_meant("read");
    if (fails(meant)) return -1;
    *(void **)&next = real("read");
    ssize_t result = next(descriptor, bytes, amount(meant, size));
    behind(meant);
    return result;
}

ssize_t write(int descriptor, const void *bytes, size_t size) {
    ssize_t (*next)(int, const void *, size_t) = NULL;
    bool meant = is_meant("write");
    if (descriptor >= 0 && descriptor < MOST_DESCRIPTORS) atomic_store(&written[descriptor], true);
    if (fails(meant)) return -1;
    *(void **)&next = real("write");
    ssize_t result = next(descriptor, bytes, amount(meant, size));
    behind(meant);
    return result;
}

int fsync(int descriptor) {
    int (*next)(int) = NULL;
    bool meant = is_meant("fsync");
    if (fails(meant)) return -1;
    *(void **)&next = real("fsync");
    int result = next(descriptor);
    behind(meant);
    return result;
}

int fchmod(int descriptor, mode_t mode) {
    int (*next)(int, mode_t) = NULL;
    bool meant = is_meant("fchmod");
    if (fails(meant)) return -1;
    *(void **)&next = real("fchmod");
    int result = next(descriptor, mode);
    behind(meant);
    return result;
}

int fchown(int descriptor, uid_t owner, gid_t group) {
    int (*next)(int, uid_t, gid_t) = NULL;
    bool meant = is_meant("fchown");
    if (fails(meant)) return -1;
    *(void **)&next = real("fchown");
    int result = next(descriptor, owner, group);
    behind(meant);
    return result;
}

int linkat(int from_folder, const char *from, int to_folder, const char *to, int flags) {
    int (*next)(int, const char *, int, const char *, int) = NULL;
    bool meant = is_meant("linkat");
    if (fails(meant)) return -1;
    *(void **)&next = real("linkat");
    int result = next(from_folder, from, to_folder, to, flags);
    behind(meant);
    return result;
}

int renameat(int from_folder, const char *from, int to_folder, const char *to) {
    int (*next)(int, const char *, int, const char *) = NULL;
    bool meant = is_meant("renameat");
    if (fails(meant)) return -1;
    *(void **)&next = real("renameat");
    int result = next(from_folder, from, to_folder, to);
    behind(meant);
    return result;
}

/* A close that fails has closed all the same. */
int close(int descriptor) {
    int (*next)(int) = NULL;
    bool was_written = descriptor >= 0 && descriptor < MOST_DESCRIPTORS && atomic_exchange(&written[descriptor], false);
    bool meant = is_meant("close") || (was_written && is_meant("close-written"));
    *(void **)&next = real("close");
    bool failing = fails(meant);
    int error = errno, result = next(descriptor);
    behind(meant);
    if (!failing) return result;
    errno = error;
    return -1;
}

static void report(void) {
    const char *path = getenv("FAULT_REPORT");
    atomic_store(&counting, false);
    int file = path ? open(path, O_WRONLY | O_CREAT | O_TRUNC | O_CLOEXEC, 0666) : -1;
    if (file < 0) return;
    char text[32];
    int length = snprintf(text, sizeof text, "%lu\n", atomic_load(&count));
    if (write(file, text, (size_t)length) != length) abort();
    (void)close(file);
}

static int number_of(const char *name) {
    const char *text = getenv(name);
    return text ? (int)strtol(text, NULL, 10) : 0;
}

static int counted_main(int argc, char **argv, char **environment) {
    fault.call = getenv("FAULT_CALL");
    fault.at = (unsigned long)number_of("FAULT_AT");
    fault.on = number_of("FAULT_ON") != 0;
    fault.error = number_of("FAULT_ERRNO");
    fault.cut = number_of("FAULT_SHORT") != 0;
    fault.signal = number_of("FAULT_SIGNAL");
    fault.after = number_of("FAULT_AFTER") != 0;
    fault.no_tmpfile = number_of("NO_TMPFILE") != 0;
    (void)atexit(report);
    atomic_store(&counting, true);
    return real_main(argc, argv, environment);
}

int __libc_start_main(int (*program)(int, char **, char **), int argc, char **argv, void (*init)(void), void (*fini)(void),
                      void (*rtld_fini)(void), void *stack_end) {
    int (*next)(int (*)(int, char **, char **), int, char **, void (*)(void), void (*)(void), void (*)(void), void *) = NULL;
    *(void **)&next = real("__libc_start_main");
    real_main = program;
    return next(counted_main, argc, argv, init, fini, rtld_fini, stack_end);
}
