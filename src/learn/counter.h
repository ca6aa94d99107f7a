/* Exact counting of weighted records: whole parts in 64 bits, fractions in units of 2^-32. */
#ifndef LEARN_COUNTER_H
#define LEARN_COUNTER_H

#include "ballast/table.h"

#include <stdint.h>

/** Counts of every family of a network while they grow. Start it with = {0}. Not for several threads at once. */
typedef struct bali_counter {
    const bal_network *network; /* borrowed */
    uint64_t *whole;            /* one a cell of all families: records of weight 1, or of whole weight */
    uint64_t *fraction;         /* the rest, in units of 2^-32, below 2^32 a record; NULL until there is one */
    uint32_t *cells;            /* of the records of a block, for one family */
    size_t capacity;
} bali_counter;

BAL_MUST_CHECK bal_status bali_counter_create(bali_counter *counter, const bal_network *network, bal_error *err);
void bali_counter_free(bali_counter *counter);

/** Counts the records of a block; a family in which a record misses a cell does not count it. Fails: MEMORY. */
BAL_MUST_CHECK bal_status bali_counter_add(bali_counter *counter, const bal_block *block, bal_error *err);

/** to += from, exactly and in any order. Fails: MEMORY. */
BAL_MUST_CHECK bal_status bali_counter_merge(bali_counter *to, const bali_counter *from, bal_error *err);

/** The counts as numbers, each rounded once; exact for whole ones up to 2^53. */
void bali_counter_write(const bali_counter *counter, bal_cells *counts);

#endif
