/* Allocation whose sizes are checked for overflow, with a switch that makes the n-th one fail. */
#ifndef BASE_MEMORY_H
#define BASE_MEMORY_H

#include "ballast/error.h"

#include <stdbool.h>

/** count x size bytes of zeros, or NULL when there is no memory or the product overflows. A count or size of 0
 *  gives a pointer that may be freed. */
void *bali_allocate(size_t count, size_t size);

/** The same memory with count x size bytes, or NULL, and then memory is as it was. */
void *bali_reallocate(void *memory, size_t count, size_t size);

/** A copy of length bytes, with a NUL behind. */
char *bali_duplicate(const char *text, size_t length);

void bali_free(void *memory);

/**
 * Makes room for one more element in a growing array: doubles *capacity when it is reached.
 *
 * array     address of the array's pointer, as void * (bali_grow((void **)&items, ...))
 * Returns false, with the array as it was, when there is no memory.
 */
bool bali_grow(void **array, size_t *capacity, size_t needed, size_t size);

/** a x b; returns false and leaves *product alone when it overflows. */
bool bali_multiply(size_t a, size_t b, size_t *product);

/** Records that memory ran out; returns BAL_ERR_MEMORY, or the first cause when err holds one. */
bal_status bali_out_of_memory(bal_error *err);

/** Bytes of memory that the machine has; 0 when it does not say. */
size_t bali_machine_memory(void);

/** Tests: the n-th allocation from now on fails, once; 0 switches this off. Not for several threads. */
void bali_memory_fail_at(size_t n);

#endif
