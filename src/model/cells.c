#include "model/cells.h"

#include "base/memory.h"
#include "model/shape.h"

#include <math.h>
#include <string.h>

struct bal_cells {
    bal_network *network;
    double *values;
};

bal_status bal_cells_create(const bal_network *network, bal_cells **out, bal_error *err) {
    *out = NULL;
    bal_cells *cells = bali_allocate(1, sizeof *cells);
    if (!cells) return bali_out_of_memory(err);
    cells->values = bali_allocate(bal_network_cells(network), sizeof *cells->values);
    if (!cells->values) {
        bali_free(cells);
        return bali_out_of_memory(err);
    }
    cells->network = bali_network_hold(network);
    *out = cells;
    return BAL_OK;
}

bal_status bal_cells_copy(const bal_cells *from, bal_cells **out, bal_error *err) {
    bal_status status = bal_cells_create(from->network, out, err);
    if (status == BAL_OK) bali_cells_assign(*out, from);
    return status;
}

void bal_cells_free(bal_cells *cells) {
    if (!cells) return;
    bal_network_free(cells->network);
    bali_free(cells->values);
    bali_free(cells);
}

const bal_network *bal_cells_network(const bal_cells *cells) {
    return cells->network;
}

const double *bal_cells_family(const bal_cells *cells, size_t variable) {
    return cells->values + bal_network_offset(cells->network, variable);
}

double *bal_cells_edit(bal_cells *cells, size_t variable) {
    return cells->values + bal_network_offset(cells->network, variable);
}

const double *bali_cells_values(const bal_cells *cells) {
    return cells->values;
}

double *bali_cells_all(bal_cells *cells) {
    return cells->values;
}

void bali_cells_add(bal_cells *to, const bal_cells *from) {
    size_t n = bal_network_cells(to->network);
    for (size_t c = 0; c < n; c++) to->values[c] += from->values[c];
}

void bali_cells_subtract(bal_cells *to, const bal_cells *from) {
    size_t n = bal_network_cells(to->network);
    for (size_t c = 0; c < n; c++) to->values[c] -= from->values[c];
}

void bali_cells_assign(bal_cells *to, const bal_cells *from) {
    memcpy(to->values, from->values, bal_network_cells(to->network) * sizeof *to->values);
}

void bali_cells_clear(bal_cells *cells) {
    for (size_t c = 0; c < bal_network_cells(cells->network); c++) cells->values[c] = 0;
}

bool bali_cells_are_whole(const bal_cells *cells) {
    for (size_t c = 0; c < bal_network_cells(cells->network); c++)
        if (cells->values[c] != floor(cells->values[c])) return false;
    return true;
}

double bali_row_sum(const double *row, size_t n) {
    double sum = 0;
    for (size_t k = 0; k < n; k++) sum += row[k];
    return sum;
}
