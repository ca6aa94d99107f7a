/* The inputs of a command: a network, and data that are tables or a network file with counts. */
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
    bal_codebook *codebook;
    bal_groups *groups;          /* labels of the fold column */
    bool *wanted;                /* one a variable: whether its column is read */
    bool *unrecorded;            /* one a variable */
    bal_source *source;          /* DATA, when it is tables: kept in memory where that is asked for */
    const bal_source **tables;   /* the tables inside source; borrowed */
    size_t n_tables;
    bal_cells *counts;           /* of DATA */
    bool fewer_threads;          /* the system started fewer threads than were asked for */
    bali_data_facts facts;
    bal_notices notices;
} bali_inputs;

/** How DATA is read. */
typedef struct bali_data_options {
    bal_missing missing;
    bool keep_records; /* in memory, as far as --memory allows, for further passes */
} bali_data_options;

/** Reads the network (the call's first argument). */
BAL_MUST_CHECK bal_status bali_inputs_read_network(const bali_call *call, bali_console *console, bali_inputs *inputs, bal_error *err);

/**
 * Reads and counts the data: the call's further arguments, or the network's own counts when there are none.
 *
 * Fails: as the reading does; ARGUMENT "no-data" when there are neither data nor counts.
 */
BAL_MUST_CHECK bal_status bali_inputs_read_data(const bali_call *call, const bali_data_options *options, bali_inputs *inputs,
                                                bal_error *err);

/** Opens one more table, read as the data are. Fails: as bal_table_open. */
BAL_MUST_CHECK bal_status bali_inputs_open_table(const bali_call *call, const bali_inputs *inputs, const char *path, bal_missing missing,
                                                 bal_source **out, bal_error *err);

/** How many records a document's counts stand for: what the file says, or what its first family counted; 0 without counts. */
double bali_document_records(const bal_document *document);

/**
 * Looks at counts that are to be fitted to: whether their families agree on the number of records goes into the facts, with a warning
 * where nothing explains it.
 *
 * Fails: DATA "count-too-large" where a family has more than 2^53 records, beyond which counts are not exact.
 */
BAL_MUST_CHECK bal_status bali_check_counts(bali_inputs *inputs, const bal_cells *counts, bal_error *err);

/** Adds a file to the facts. Fails: MEMORY. */
BAL_MUST_CHECK bal_status bali_inputs_add_file(bali_inputs *inputs, const bal_file_facts *file, bal_error *err);

/** Says that there were fewer threads than were asked for. */
void bali_warn_of_threads(const bali_inputs *inputs);

void bali_inputs_free(bali_inputs *inputs);

/** --missing as the library names it. */
bal_missing bali_call_missing(const bali_call *call);

/** --threads, or all cores. */
unsigned bali_call_threads(const bali_call *call);

/** --memory, or a quarter of the machine's. */
size_t bali_call_memory(const bali_call *call);

#endif
