/* Simulation from a network. */
#ifndef BALLAST_INFER_H
#define BALLAST_INFER_H

#include "ballast/table.h"

#ifdef __cplusplus
extern "C" {
#endif

/**
 * A source of n_records simulated ones, drawn forwards through the network.
 *
 * Record i depends on the seed, i and the tables alone: with key = splitmix64(splitmix64(seed, 3), 0), variable v
 * of record i takes the uniform number u = (the upper 53 bits of splitmix64(splitmix64(key, i), v)) / 2^53, and is the first
 * outcome of its row at which the sum of the probabilities, from the first outcome on, is above u.
 *
 * tables  one row a parent configuration, each summing to 1; copied
 *
 * Fails:  MEMORY.
 * Cost:   O(outcomes) a cell; memory does not depend on n_records.
 * Source: splitmix64 from Steele, Lea & Flood, OOPSLA 2014.
 */
BAL_API BAL_MUST_CHECK bal_status bal_draw_open(const bal_cells *tables, uint64_t n_records, uint64_t seed,
                                                bal_source **out, bal_error *err);

#ifdef __cplusplus
}
#endif
#endif
