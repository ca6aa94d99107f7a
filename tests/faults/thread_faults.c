/*
 * A pthread_create that fails with EAGAIN, for LD_PRELOAD.
 *
 * THREADS_AT  the number of the thread from which on none can be started; not set: 1
 */
#define _GNU_SOURCE /* RTLD_NEXT */
#include <dlfcn.h>
#include <errno.h>
#include <pthread.h>
#include <stdatomic.h>
#include <stdlib.h>

static atomic_ulong started;

int pthread_create(pthread_t *restrict thread, const pthread_attr_t *restrict attributes, void *(*start)(void *), void *restrict argument) {
    int (*next)(pthread_t *, const pthread_attr_t *, void *(*)(void *), void *) = NULL;
    const char *at = getenv("THREADS_AT");
    if (atomic_fetch_add(&started, 1) + 1 >= (at ? strtoul(at, NULL, 10) : 1)) return EAGAIN;
    *(void **)&next = dlsym(RTLD_NEXT, "pthread_create");
    return next(thread, attributes, start, argument);
}
