/* From the records of a block to the cells of a family. */
#ifndef LEARN_INDEXING_H
#define LEARN_INDEXING_H

#include "ballast/table.h"

#define BALI_NO_CELL UINT32_MAX

/**
 * The cell of a family that each record of a block falls in: row x outcomes + outcome.
 *
 * cells  one a record, overwritten; BALI_NO_CELL where the variable or a parent is missing
 * Cost:  O(records x (1 + parents)).
 */
void bali_index_family(const bal_network *network, size_t variable, const bal_block *block, uint32_t *cells);

#endif
