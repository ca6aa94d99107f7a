#include "base/names.h"

#include "base/memory.h"

#include <stdint.h>
#include <string.h>

enum { LONGEST_COMPARED = 255, MOST_COMPARED = 10000, MOST_STEPS = 10000000 };

/* FNV-1a, 64 bits (Fowler, Noll & Vo), with a last mix so that the low bits are good. */
static size_t hash(const char *text, size_t length) {
    uint64_t h = 0xCBF29CE484222325u;
    for (size_t i = 0; i < length; i++) h = (h ^ (unsigned char)text[i]) * 0x100000001B3u;
    return (size_t)(h ^ h >> 32);
}

/* The slot that holds the text, or the empty one where it would go. */
static size_t slot_of(const bali_names *names, const char *text, size_t length) {
    size_t slot = hash(text, length) & (names->n_slots - 1);
    while (names->slots[slot] != 0) {
        const char *name = names->names[names->slots[slot] - 1];
        if (strlen(name) == length && memcmp(name, text, length) == 0) break;
        slot = (slot + 1) & (names->n_slots - 1);
    }
    return slot;
}

static bool rehash(bali_names *names) {
    size_t n_slots = names->n_slots ? names->n_slots * 2 : 16;
    size_t *slots = bali_allocate(n_slots, sizeof *slots);
    if (!slots) return false;
    bali_free(names->slots);
    names->slots = slots;
    names->n_slots = n_slots;
    for (size_t i = 0; i < names->n_names; i++) {
        const char *name = names->names[i];
        names->slots[slot_of(names, name, strlen(name))] = i + 1;
    }
    return true;
}

bool bali_names_add(bali_names *names, const char *name, size_t *first) {
    if (2 * (names->n_names + 1) > names->n_slots && !rehash(names)) return false;
    size_t slot = slot_of(names, name, strlen(name));
    *first = BALI_NO_NAME;
    if (names->slots[slot] != 0) {
        *first = names->slots[slot] - 1;
        return true;
    }
    if (!bali_grow((void **)&names->names, &names->capacity, names->n_names + 1, sizeof *names->names)) return false;
    names->names[names->n_names++] = name;
    names->slots[slot] = names->n_names;
    return true;
}

size_t bali_names_find(const bali_names *names, const char *text, size_t length) {
    if (names->n_slots == 0) return BALI_NO_NAME;
    size_t slot = slot_of(names, text, length);
    return names->slots[slot] ? names->slots[slot] - 1 : BALI_NO_NAME;
}

void bali_names_free(bali_names *names) {
    bali_free(names->names);
    bali_free(names->slots);
    *names = (bali_names){0};
}

static char lower(char c) {
    return c >= 'A' && c <= 'Z' ? (char)(c - 'A' + 'a') : c;
}

static bool is_blank(char c) {
    return c == ' ' || c == '\t' || c == '_' || c == '-';
}

/* Equal but for ASCII case, blanks, underscores and hyphens. */
static bool alike(const char *a, size_t length_a, const char *b, size_t length_b) {
    size_t i = 0, j = 0;
    for (;;) {
        while (i < length_a && is_blank(a[i])) i++;
        while (j < length_b && is_blank(b[j])) j++;
        if (i == length_a || j == length_b) return i == length_a && j == length_b;
        if (lower(a[i++]) != lower(b[j++])) return false;
    }
}

static size_t least(size_t a, size_t b) {
    return a < b ? a : b;
}

/* Edits between two texts of at most 255 bytes: insert, delete, replace, swap neighbours. */
static size_t distance(const char *a, size_t length_a, const char *b, size_t length_b) {
    size_t rows[3][LONGEST_COMPARED + 1];
    size_t *before = rows[0], *above = rows[1], *row = rows[2];
    for (size_t j = 0; j <= length_b; j++) above[j] = j;
    for (size_t i = 1; i <= length_a; i++) {
        row[0] = i;
        for (size_t j = 1; j <= length_b; j++) {
            row[j] = least(least(above[j], row[j - 1]) + 1, above[j - 1] + (a[i - 1] != b[j - 1]));
            if (i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1]) row[j] = least(row[j], before[j - 2] + 1);
        }
        size_t *oldest = before;
        before = above;
        above = row;
        row = oldest;
    }
    return above[length_b];
}

size_t bali_nearest(const char *text, size_t length, const char *const *names, size_t n_names) {
    if (length == 0 || length > LONGEST_COMPARED) return BALI_NO_NAME;
    size_t budget = MOST_STEPS; /* of comparing bytes: many long names are not worth the time */
    size_t best = BALI_NO_NAME, best_distance = least(length / 4 > 1 ? length / 4 : 1, 3) + 1;
    for (size_t i = 0; i < least(n_names, MOST_COMPARED); i++) {
        size_t other = strlen(names[i]);
        if (alike(text, length, names[i], other)) return i;
        size_t gap = other > length ? other - length : length - other;
        if (other > LONGEST_COMPARED || gap >= best_distance) continue;
        if (length * other > budget) break;
        budget -= length * other;
        size_t edits = distance(text, length, names[i], other);
        /* A one-letter label is not a misspelling of every other one. */
        if (edits < best_distance && edits < length) {
            best = i;
            best_distance = edits;
        }
    }
    return best;
}
