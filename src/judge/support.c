/* Is this table enough: records that are alone in a row or cell they need. */
#include "ballast/judge.h"

#include "base/memory.h"
#include "learn/indexing.h"
#include "model/cells.h"
#include "model/expanded.h"
#include "model/domain.h"

#include <math.h>

enum { ALONE_IN_ROW = 1, ALONE_IN_CELL = 2 };

/* Marks the cells of a family whose row, or who themselves, hold exactly one record. */
static void mark_cells(const bal_cells *counts, size_t v, uint8_t *marks, double *row_share, double *cell_share) {
    const bal_network *network = bal_cells_network(counts);
    size_t r = bal_network_outcomes(network, v), cells = bal_network_rows(network, v) * r;
    const double *n = bal_cells_family(counts, v);
    double records = 0, alone_in_row = 0, alone_in_cell = 0;
    for (size_t c = 0; c < cells; c += r) {
        double total = bali_row_sum(n + c, r);
        records += total;
        alone_in_row += total == 1;
        for (size_t k = 0; k < r; k++) {
            alone_in_cell += n[c + k] == 1;
            marks[c + k] = (uint8_t)((total == 1 ? ALONE_IN_ROW : 0) | (n[c + k] == 1 ? ALONE_IN_CELL : 0));
        }
    }
    if (row_share) row_share[v] = records > 0 ? alone_in_row / records : NAN;
    if (cell_share) cell_share[v] = records > 0 ? alone_in_cell / records : NAN;
}

typedef struct alone {
    const bal_network *network;
    const uint8_t *marks;    /* one a cell of all families */
    uint32_t *cells;
    uint8_t *found;          /* one a record of the block */
    size_t cells_capacity, found_capacity;
    uint64_t records, in_row, in_cell;
} alone;

static bal_status look_at_block(alone *a, const bal_block *block, bal_error *err) {
    size_t n = block->n_records;
    if (!bali_grow((void **)&a->cells, &a->cells_capacity, n, sizeof *a->cells) ||
        !bali_grow((void **)&a->found, &a->found_capacity, n, sizeof *a->found))
        return bali_out_of_memory(err);
    for (size_t t = 0; t < n; t++) a->found[t] = 0;
    for (size_t v = 0; v < bal_network_variables(a->network); v++) {
        const uint8_t *marks = a->marks + bal_network_offset(a->network, v);
        bali_index_family(a->network, v, block, a->cells);
        for (size_t t = 0; t < n; t++)
            if (a->cells[t] != BALI_NO_CELL) a->found[t] |= marks[a->cells[t]];
    }
    for (size_t t = 0; t < n; t++) {
        a->in_row += (a->found[t] & ALONE_IN_ROW) != 0;
        a->in_cell += (a->found[t] & ALONE_IN_CELL) != 0;
    }
    a->records += n;
    return BAL_OK;
}

/* Goes over the records, each as often as its weight says. */
static bal_status look_at_records(alone *a, bal_source *source, bal_error *err) {
    bal_source *records = NULL;
    bal_status status = bali_expanded_open(source, &records, err);
    if (status == BAL_OK) status = bal_source_rewind(records, err);
    while (status == BAL_OK) {
        bal_block block;
        status = bal_source_next(records, &block, err);
        if (status != BAL_OK || block.n_records == 0) break;
        status = look_at_block(a, &block, err);
    }
    bal_source_free(records);
    return status;
}

bal_status bal_support_measure(const bal_cells *counts, bal_source *source, bal_support *out, double *row_shares, double *cell_shares,
                               bal_error *err) {
    const bal_network *network = bal_cells_network(counts);
    alone a = {.network = network};
    bal_source_summary summary = {0};
    if (source) bal_source_summary_get(source, &summary);
    if (source && !bali_domain_equal(bal_network_domain(network), bal_source_domain(source)))
        return bal_error_set(err, BAL_ERR_ARGUMENT, "other-network",
                             "the records follow other variables than the counts; use records of the same variables");
    uint8_t *marks = bali_allocate(bal_network_cells(network), 1);
    bal_status status = marks ? BAL_OK : bali_out_of_memory(err);
    for (size_t v = 0; v < bal_network_variables(network) && status == BAL_OK; v++)
        mark_cells(counts, v, marks + bal_network_offset(network, v), row_shares, cell_shares);
    a.marks = marks;
    if (status == BAL_OK && source && !summary.fractional) status = look_at_records(&a, source, err);
    if (status == BAL_OK) {
        out->row_share = a.records ? (double)a.in_row / (double)a.records : NAN;
        out->cell_share = a.records ? (double)a.in_cell / (double)a.records : NAN;
    }
    bali_free(marks);
    bali_free(a.cells);
    bali_free(a.found);
    return status;
}
