#include "learn/zeros.h"

#include "base/memory.h"
#include "learn/indexing.h"
#include "learn/prior_parts.h"
#include "model/cells.h"
#include "model/domain.h"
#include "model/shape.h"

bal_status bali_refuse_zero(const bal_network *network, size_t variable, size_t cell, bal_error *err) {
    const bal_domain *domain = bal_network_domain(network);
    size_t r = bal_network_outcomes(network, variable);
    char given[200];
    bali_configuration_text(network, variable, cell / r, given, sizeof given);
    bal_status status = bal_error_set(
        err, BAL_ERR_DATA, "structural-zero", "%s=%s%s%s is impossible under the prior, yet records have it; correct them or the table, or use --prior-floor",
        bal_domain_name(domain, variable), bal_domain_outcome(domain, variable, cell % r), given[0] ? " given " : "", given);
    bal_error_context(err, 0, bal_domain_name(domain, variable));
    return status;
}

/* The first family and cell that hold counts where the prior has none; false when there is no such cell. */
static bool find_zero(const bal_prior *prior, const bal_cells *counts, size_t *variable, size_t *cell) {
    for (size_t v = 0; v < bal_network_variables(prior->network); v++) {
        size_t cells = bal_network_rows(prior->network, v) * bal_network_outcomes(prior->network, v);
        const double *unit = bal_cells_family(prior->units, v), *n = bal_cells_family(counts, v);
        for (size_t c = 0; c < cells; c++) {
            if (unit[c] > 0 || n[c] <= 0) continue;
            *variable = v;
            *cell = c;
            return true;
        }
    }
    return false;
}

/* The first record of a block in any structural zero; its number in the block, or the block's length. */
static size_t find_in_block(const bal_prior *prior, const bal_block *block, uint32_t *cells, size_t *variable, size_t *cell) {
    size_t first = block->n_records;
    for (size_t v = 0; v < bal_network_variables(prior->network); v++) {
        const double *unit = bal_cells_family(prior->units, v);
        bali_index_family(prior->network, v, block, cells);
        for (size_t t = 0; t < first; t++) {
            if (cells[t] == BALI_NO_CELL || unit[cells[t]] > 0 || (block->weights && block->weights[t] <= 0)) continue;
            first = t;
            *variable = v;
            *cell = cells[t];
        }
    }
    return first;
}

/* Goes over the records until one falls in a structural zero. Failing here only means that no record is named. */
static bool find_record(const bal_prior *prior, bal_source *source, size_t *variable, size_t *cell, uint64_t *place) {
    bool found = false;
    uint32_t *cells = NULL;
    size_t capacity = 0;
    bal_block block;
    if (!bali_domain_equal(bal_network_domain(prior->network), bal_source_domain(source))) return false;
    if (bal_source_rewind(source, NULL) != BAL_OK) return false;
    while (!found && bal_source_next(source, &block, NULL) == BAL_OK && block.n_records > 0) {
        if (!bali_grow((void **)&cells, &capacity, block.n_records, sizeof *cells)) break;
        size_t t = find_in_block(prior, &block, cells, variable, cell);
        found = t < block.n_records;
        if (found) *place = bal_block_place(&block, t);
    }
    bali_free(cells);
    return found;
}

bal_status bal_prior_check(const bal_prior *prior, const bal_cells *counts, bal_source *source, bal_error *err) {
    size_t variable, cell;
    uint64_t place;
    if (!prior->units || !find_zero(prior, counts, &variable, &cell)) return BAL_OK;
    bool located = source && find_record(prior, source, &variable, &cell, &place);
    bal_status status = bali_refuse_zero(prior->network, variable, cell, err);
    if (located) bal_source_locate(source, place, err);
    return status;
}
