/* Counts of every family: all that a table says to a network. */
#ifndef BALLAST_TALLY_H
#define BALLAST_TALLY_H

#include "ballast/table.h"

#ifdef __cplusplus
extern "C" {
#endif

/**
 * Counts every family of a network in one pass over a source, from where the source stands to its end.
 *
 * Records with a missing cell in a family are not counted in that family; a source that stops at or drops
 * incomplete records has none.
 *
 * network  over the source's domain
 * counts   made here; whole numbers, exact up to 2^53 records; the caller frees them
 *
 * Fails:  whatever the source meets; ARGUMENT when the domains differ; MEMORY.
 * Cost:   O(records x (variables + arcs)); memory O(cells), whatever the number of records.
 */
BAL_API BAL_MUST_CHECK bal_status bal_tally(const bal_network *network, bal_source *source, bal_cells **counts,
                                            bal_error *err);

/**
 * The same on several threads: where the source can be read in parts (a regular file), parts with fixed bounds are counted by
 * themselves and added, which changes no count. Whatever a part meets that has to be told makes the source be read again in order, so
 * that messages come as they would on one thread.
 *
 * source     at its first record
 * n_threads  >= 1
 * fewer      whether the system started fewer threads than were asked for and of use; may be NULL
 */
BAL_API BAL_MUST_CHECK bal_status bal_tally_threads(const bal_network *network, bal_source *source, unsigned n_threads, bool *fewer,
                                                    bal_cells **counts, bal_error *err);

/** sum over the cells of the first family: how many records were counted. */
BAL_API double bal_tally_records(const bal_cells *counts);

#ifdef __cplusplus
}
#endif
#endif
