#include "learn/counter.h"

#include "base/memory.h"
#include "learn/indexing.h"
#include "model/cells.h"

#include <math.h>

bal_status bali_counter_create(bali_counter *counter, const bal_network *network, bal_error *err) {
    *counter = (bali_counter){.network = network};
    counter->whole = bali_allocate(bal_network_cells(network), sizeof *counter->whole);
    return counter->whole ? BAL_OK : bali_out_of_memory(err);
}

void bali_counter_free(bali_counter *counter) {
    bali_free(counter->whole);
    bali_free(counter->fraction);
    bali_free(counter->cells);
    *counter = (bali_counter){0};
}

static bal_status need_fractions(bali_counter *counter, bal_error *err) {
    if (!counter->fraction) counter->fraction = bali_allocate(bal_network_cells(counter->network), sizeof *counter->fraction);
    return counter->fraction ? BAL_OK : bali_out_of_memory(err);
}

static bool has_fraction(const bal_block *block) {
    for (size_t t = 0; t < block->n_records; t++)
        if (block->weights[t] != floor(block->weights[t])) return true;
    return false;
}

static void count_records(const uint32_t *cells, size_t n, uint64_t *whole) {
    for (size_t t = 0; t < n; t++)
        if (cells[t] != BALI_NO_CELL) whole[cells[t]]++;
}

/* A fraction is a whole number of 2^-32, so both parts are exact; a carry goes over when the fractions are full. */
static void count_weights(const uint32_t *cells, const double *weights, size_t n, uint64_t *whole, uint64_t *fraction) {
    for (size_t t = 0; t < n; t++) {
        if (cells[t] == BALI_NO_CELL) continue;
        double floor_weight = floor(weights[t]);
        whole[cells[t]] += (uint64_t)floor_weight;
        if (!fraction) continue;
        uint64_t sum = fraction[cells[t]] + (uint64_t)((weights[t] - floor_weight) * 0x1p32);
        whole[cells[t]] += sum >> 32;
        fraction[cells[t]] = sum & UINT32_MAX;
    }
}

bal_status bali_counter_add(bali_counter *counter, const bal_block *block, bal_error *err) {
    if (!bali_grow((void **)&counter->cells, &counter->capacity, block->n_records, sizeof *counter->cells)) return bali_out_of_memory(err);
    if (block->weights && has_fraction(block) && need_fractions(counter, err) != BAL_OK) return BAL_ERR_MEMORY;
    for (size_t v = 0; v < bal_network_variables(counter->network); v++) {
        size_t offset = bal_network_offset(counter->network, v);
        bali_index_family(counter->network, v, block, counter->cells);
        if (block->weights) {
            count_weights(counter->cells, block->weights, block->n_records, counter->whole + offset,
                          counter->fraction ? counter->fraction + offset : NULL);
        } else {
            count_records(counter->cells, block->n_records, counter->whole + offset);
        }
    }
    return BAL_OK;
}

bal_status bali_counter_merge(bali_counter *to, const bali_counter *from, bal_error *err) {
    size_t n = bal_network_cells(to->network);
    if (from->fraction && need_fractions(to, err) != BAL_OK) return BAL_ERR_MEMORY;
    for (size_t c = 0; c < n; c++) to->whole[c] += from->whole[c];
    for (size_t c = 0; from->fraction && c < n; c++) {
        uint64_t sum = to->fraction[c] + from->fraction[c];
        to->whole[c] += sum >> 32;
        to->fraction[c] = sum & UINT32_MAX;
    }
    return BAL_OK;
}

void bali_counter_write(const bali_counter *counter, bal_cells *counts) {
    double *to = bali_cells_all(counts);
    for (size_t c = 0; c < bal_network_cells(counter->network); c++) {
        /* Below 2^21 whole and fraction fit one double together; above, the sum is rounded once. */
        to[c] = (double)counter->whole[c] + (counter->fraction ? (double)counter->fraction[c] * 0x1p-32 : 0);
    }
}
