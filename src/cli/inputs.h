/* The inputs of a command: a network, and data that are a table or a network file with counts. */
#ifndef CLI_INPUTS_H
#define CLI_INPUTS_H

#include "ballast.h"
#include "cli/console.h"
#include "cli/options.h"
#include "report/facts.h"

/** What was read. Start it with = {0}; bali_inputs_free in any case. */
typedef struct bali_inputs {
    bal_document *document;
    bal_document *data_document; /* DATA, when it is a network file */
    bal_source *source;          /* DATA, when it is a table: kept in memory where that is allowed */
    const bal_source *table;     /* the table inside source; borrowed */
    bal_cells *counts;
    bali_data_facts facts;
    bal_notices notices;
    char delimiter;              /* --delimiter, or 0 */
} bali_inputs;

/**
 * Reads the network (the call's first argument).
 *
 * Fails: as the reading does; before it ARGUMENT when --delimiter is none, or standard input is named twice.
 */
BAL_MUST_CHECK bal_status bali_inputs_read_network(const bali_call *call, bali_console *console, bali_inputs *inputs, bal_error *err);

/**
 * Reads and counts the data: the call's second argument, or the network's own counts when there is none.
 *
 * missing  what a missing cell does
 *
 * Fails: as the reading does; ARGUMENT "no-data" when there are neither data nor counts.
 */
BAL_MUST_CHECK bal_status bali_inputs_read_data(const bali_call *call, bal_missing missing, bali_inputs *inputs, bal_error *err);

void bali_inputs_free(bali_inputs *inputs);

/** --threads, or all cores. */
unsigned bali_call_threads(const bali_call *call);

#endif
