#include "learn/indexing.h"

/* cells = cells x outcomes + code, for codes of one and of two bytes; a missing code stays missing. */
static void append_bytes(const uint8_t *codes, uint32_t outcomes, uint32_t *cells, size_t n) {
    for (size_t t = 0; t < n; t++) {
        uint32_t next = cells[t] * outcomes + codes[t];
        cells[t] = cells[t] == BALI_NO_CELL || codes[t] == UINT8_MAX ? BALI_NO_CELL : next;
    }
}

static void append_words(const uint16_t *codes, uint32_t outcomes, uint32_t *cells, size_t n) {
    for (size_t t = 0; t < n; t++) {
        uint32_t next = cells[t] * outcomes + codes[t];
        cells[t] = cells[t] == BALI_NO_CELL || codes[t] == UINT16_MAX ? BALI_NO_CELL : next;
    }
}

static void append(const bal_block *block, size_t variable, size_t outcomes, uint32_t *cells) {
    const void *column = block->columns[variable];
    if (!column) {
        for (size_t t = 0; t < block->n_records; t++) cells[t] = BALI_NO_CELL;
    } else if (block->width == 1) {
        append_bytes(column, (uint32_t)outcomes, cells, block->n_records);
    } else {
        append_words(column, (uint32_t)outcomes, cells, block->n_records);
    }
}

void bali_index_family(const bal_network *network, size_t variable, const bal_block *block, uint32_t *cells) {
    size_t n_parents;
    const size_t *parents = bal_network_parents(network, variable, &n_parents);
    for (size_t t = 0; t < block->n_records; t++) cells[t] = 0;
    for (size_t p = 0; p < n_parents; p++) append(block, parents[p], bal_network_outcomes(network, parents[p]), cells);
    append(block, variable, bal_network_outcomes(network, variable), cells);
}
