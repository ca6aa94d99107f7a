/* Labels to codes by a small hash table, made for cells that stand in a read buffer.
 *
 * A label of up to eight bytes is compared in one step: its bytes are kept in a word. */
#ifndef FORMATS_LABEL_CODES_H
#define FORMATS_LABEL_CODES_H

#include "ballast/network.h"

#include <stdint.h>
#include <string.h>

#define BALI_NO_CODE UINT32_MAX

typedef struct bali_label_slot {
    uint64_t start; /* the first eight bytes, zeros behind the end */
    uint32_t length;
    uint32_t code; /* BALI_NO_CODE: the slot is empty */
} bali_label_slot;

/** Start it with = {0}. It borrows the labels. */
typedef struct bali_label_codes {
    const char *const *labels;
    bali_label_slot *slots;
    size_t mask;
} bali_label_codes;

/** Gives label k the code k; a label that stands twice keeps its first code. Returns false when there is no memory. */
bool bali_label_codes_build(bali_label_codes *codes, const char *const *labels, size_t n_labels);
void bali_label_codes_free(bali_label_codes *codes);

/** The first n (0 to 8) bytes of a word whose memory may be read whole, zeros behind them. */
static inline uint64_t bali_label_word(const char *text, size_t n) {
    static const unsigned char ones[16] = {0xFF, 0xFF, 0xFF, 0xFF, 0xFF, 0xFF, 0xFF, 0xFF};
    uint64_t word, mask;
    memcpy(&word, text, sizeof word);
    memcpy(&mask, ones + 8 - n, sizeof mask);
    return word & mask;
}

/* A multiplicative hash of the words of a text, the length included. The multiplier is 2^64 divided by the golden ratio
 * (Knuth, The Art of Computer Programming, volume 3, section 6.4). */
static inline uint64_t bali_label_hash(const char *text, size_t length) {
    const uint64_t multiplier = 0x9E3779B97F4A7C15u;
    uint64_t hash = length;
    for (; length > 8; text += 8, length -= 8) {
        hash = (hash ^ bali_label_word(text, 8)) * multiplier;
        hash ^= hash >> 32;
    }
    hash = (hash ^ bali_label_word(text, length)) * multiplier;
    return hash ^ hash >> 32;
}

/** The code of a text, or BALI_NO_CODE. BALI_CSV_READABLE bytes can be read from any byte of the text on. */
static inline uint32_t bali_label_codes_find(const bali_label_codes *codes, const char *text, size_t length) {
    uint64_t start = bali_label_word(text, length < 8 ? length : 8);
    for (size_t i = bali_label_hash(text, length) & codes->mask;; i = (i + 1) & codes->mask) {
        const bali_label_slot *slot = &codes->slots[i];
        if (slot->code == BALI_NO_CODE) return BALI_NO_CODE;
        if (slot->start != start || slot->length != length) continue;
        if (length <= 8 || memcmp(codes->labels[slot->code], text, length) == 0) return slot->code;
    }
}

#endif
