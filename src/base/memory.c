#include "base/memory.h"

#include <stdatomic.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

/* How many allocations are left until one fails; 0 = none will. Atomic, since threads allocate too. */
static atomic_size_t countdown;

static bool fails_now(void) {
    size_t left = atomic_load_explicit(&countdown, memory_order_relaxed);
    if (left == 0) return false;
    return atomic_fetch_sub_explicit(&countdown, 1, memory_order_relaxed) == 1;
}

void bali_memory_fail_at(size_t n) {
    atomic_store(&countdown, n);
}

bool bali_multiply(size_t a, size_t b, size_t *product) {
    if (b != 0 && a > SIZE_MAX / b) return false;
    *product = a * b;
    return true;
}

void *bali_allocate(size_t count, size_t size) {
    size_t bytes;
    if (!bali_multiply(count, size, &bytes) || fails_now()) return NULL;
    return calloc(bytes ? bytes : 1, 1);
}

void *bali_reallocate(void *memory, size_t count, size_t size) {
    size_t bytes;
    if (!bali_multiply(count, size, &bytes) || fails_now()) return NULL;
    return realloc(memory, bytes ? bytes : 1);
}

char *bali_duplicate(const char *text, size_t length) {
    if (length == SIZE_MAX) return NULL;
    char *copy = bali_allocate(length + 1, 1);
    if (copy && length) memcpy(copy, text, length);
    return copy;
}

void bali_free(void *memory) {
    free(memory);
}

bool bali_grow(void **array, size_t *capacity, size_t needed, size_t size) {
    if (needed <= *capacity) return true;
    size_t larger = *capacity < 8 ? 8 : *capacity;
    while (larger < needed) {
        if (larger > SIZE_MAX / 2) return false;
        larger *= 2;
    }
    void *moved = bali_reallocate(*array, larger, size);
    if (!moved) return false;
    *array = moved;
    *capacity = larger;
    return true;
}

size_t bali_machine_memory(void) {
    long pages = sysconf(_SC_PHYS_PAGES), page = sysconf(_SC_PAGESIZE);
    size_t bytes;
    return pages > 0 && page > 0 && bali_multiply((size_t)pages, (size_t)page, &bytes) ? bytes : 0;
}

bal_status bali_out_of_memory(bal_error *err) {
    return bal_error_set(err, BAL_ERR_MEMORY, "out-of-memory", "memory ran out; close other programs, or use fewer or smaller inputs");
}
