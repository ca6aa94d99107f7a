/* Arcs between numbered variables: an order with parents first, or the cycle that makes one impossible. */
#ifndef MODEL_GRAPH_H
#define MODEL_GRAPH_H

#include "ballast/network.h"

/**
 * Puts variables in an order with parents before children, the smallest number first among those that are ready.
 *
 * order   n places, overwritten
 * cycle   n places; when there is a cycle, *n_cycle of them, each a parent of the next and the last of the first
 *
 * Returns BAL_OK with *n_cycle 0, or with *n_cycle > 0 when there is a cycle; MEMORY.
 * Cost: O(variables + arcs).
 */
BAL_MUST_CHECK bal_status bali_graph_order(const bal_family_spec *families, size_t n, size_t *order, size_t *cycle,
                                           size_t *n_cycle, bal_error *err);

#endif
