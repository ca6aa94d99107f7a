/* Names to indices by a hash table, and the nearest valid spelling of a wrong one. */
#ifndef BASE_NAMES_H
#define BASE_NAMES_H

#include <stdbool.h>
#include <stddef.h>

#define BALI_NO_NAME ((size_t)-1)

/** An index over names that live elsewhere. Start it with = {0}; it borrows every name. */
typedef struct bali_names {
    const char **names; /* in the order they were added */
    size_t *slots;      /* index + 1 into names, 0 = empty; open addressing */
    size_t n_names, capacity, n_slots;
} bali_names;

/** Adds a name as the next index. *first is BALI_NO_NAME, or the index that has the name already (then nothing is
 *  added). Returns false when there is no memory. */
bool bali_names_add(bali_names *names, const char *name, size_t *first);
/** The index of length bytes of text, or BALI_NO_NAME. */
size_t bali_names_find(const bali_names *names, const char *text, size_t length);
void bali_names_free(bali_names *names);

/**
 * The name nearest to a text: one that differs only in case or blanks, else within an edit distance of
 * max(1, length/4), at most 3 (Damerau-Levenshtein restricted to adjacent swaps; counted in bytes); else BALI_NO_NAME. Only
 * texts up to 255 bytes and the first 10,000 names are looked at, fewer where they are long.
 */
size_t bali_nearest(const char *text, size_t length, const char *const *names, size_t n_names);

#endif
