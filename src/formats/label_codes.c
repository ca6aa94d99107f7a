#include "formats/label_codes.h"

#include "base/memory.h"

/* A label with eight zeros behind it, so that it can be read in words. */
static char *padded(const char *label, size_t length) {
    char *copy = bali_allocate(length + 8, 1);
    if (copy && length) memcpy(copy, label, length);
    return copy;
}

static bool add(bali_label_codes *codes, const char *label, uint32_t code) {
    size_t length = strlen(label);
    char *text = padded(label, length);
    if (!text) return false;
    if (bali_label_codes_find(codes, text, length) == BALI_NO_CODE) {
        size_t i = bali_label_hash(text, length) & codes->mask;
        while (codes->slots[i].code != BALI_NO_CODE) i = (i + 1) & codes->mask;
        codes->slots[i] = (bali_label_slot){
            .start = bali_label_word(text, length < 8 ? length : 8), .length = (uint32_t)length, .code = code};
    }
    bali_free(text);
    return true;
}

bool bali_label_codes_build(bali_label_codes *codes, const char *const *labels, size_t n_labels) {
    /* Second looks cost more than memory while there are few labels. */
    size_t n_slots = 16, roomy = n_labels < 64 ? 8 * n_labels : 2 * n_labels;
    while (n_slots < roomy) n_slots *= 2;
    codes->labels = labels;
    codes->mask = n_slots - 1;
    codes->slots = bali_allocate(n_slots, sizeof *codes->slots);
    if (!codes->slots) return false;
    for (size_t i = 0; i < n_slots; i++) codes->slots[i].code = BALI_NO_CODE;
    for (size_t k = 0; k < n_labels; k++)
        if (!add(codes, labels[k], (uint32_t)k)) return false;
    return true;
}

void bali_label_codes_free(bali_label_codes *codes) {
    bali_free(codes->slots);
    *codes = (bali_label_codes){0};
}
