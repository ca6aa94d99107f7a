#include "ballast/tally.h"

#include "base/memory.h"
#include "learn/indexing.h"
#include "model/cells.h"
#include "model/domain.h"

/* Adds the records of a block to the counts of every family. */
static void count_block(const bal_network *network, const bal_block *block, uint32_t *cells, bal_cells *counts) {
    for (size_t v = 0; v < bal_network_variables(network); v++) {
        double *family = bal_cells_edit(counts, v);
        bali_index_family(network, v, block, cells);
        for (size_t t = 0; t < block->n_records; t++)
            if (cells[t] != BALI_NO_CELL) family[cells[t]] += 1;
    }
}

bal_status bal_tally(const bal_network *network, bal_source *source, bal_cells **counts, bal_error *err) {
    *counts = NULL;
    if (!bali_domain_equal(bal_network_domain(network), bal_source_domain(source)))
        return bal_error_set(err, BAL_ERR_ARGUMENT, "other-network",
                             "the records follow other variables than the network; use records of the same variables");
    uint32_t *cells = NULL;
    size_t capacity = 0;
    bal_cells *made = NULL;
    bal_status status = bal_cells_create(network, &made, err);
    while (status == BAL_OK) {
        bal_block block;
        status = bal_source_next(source, &block, err);
        if (status != BAL_OK || block.n_records == 0) break;
        if (!bali_grow((void **)&cells, &capacity, block.n_records, sizeof *cells)) {
            status = bali_out_of_memory(err);
        } else {
            count_block(network, &block, cells, made);
        }
    }
    bali_free(cells);
    if (status == BAL_OK) {
        *counts = made;
    } else {
        bal_cells_free(made);
    }
    return status;
}

double bal_tally_records(const bal_cells *counts) {
    const bal_network *network = bal_cells_network(counts);
    return bali_row_sum(bal_cells_family(counts, 0), bal_network_rows(network, 0) * bal_network_outcomes(network, 0));
}
