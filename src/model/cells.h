/* One double a cell of every family: sums and comparisons. */
#ifndef MODEL_CELLS_H
#define MODEL_CELLS_H

#include "ballast/network.h"

/** All cells of all families as one array of bal_network_cells(network) numbers, to read and to write. */
const double *bali_cells_values(const bal_cells *cells);
double *bali_cells_all(bal_cells *cells);

/** to += from, and to -= from; cells of equal networks. */
void bali_cells_add(bal_cells *to, const bal_cells *from);
void bali_cells_subtract(bal_cells *to, const bal_cells *from);

/** to = from; cells of equal networks. */
void bali_cells_assign(bal_cells *to, const bal_cells *from);

/** All cells 0 again. */
void bali_cells_clear(bal_cells *cells);

/** Whether every cell holds a whole number. */
bool bali_cells_are_whole(const bal_cells *cells);

/** The sum of n numbers, in order; n is a row's length, so no compensation is needed for counts. */
double bali_row_sum(const double *row, size_t n);

#endif
