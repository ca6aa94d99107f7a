/* The files a command writes: opened before any work is done, put in place when all of it succeeded. */
#ifndef CLI_RESULTS_H
#define CLI_RESULTS_H

#include "base/json.h"
#include "base/output.h"
#include "cli/options.h"

/** Outputs of one call. Start it with = {0}. */
typedef struct bali_results {
    bali_output *output; /* --output; NULL when not asked for */
    bali_output *json;   /* --json; NULL when not asked for */
    bool page;           /* text for people goes to standard output */
} bali_results;

/**
 * Opens --output and --json.
 *
 * Fails: ARGUMENT when an output is also an input (inputs: the call's arguments) or both are one file; IO; MEMORY.
 */
BAL_MUST_CHECK bal_status bali_results_open(const bali_call *call, bali_results *results, bal_error *err);

/** Puts every opened output in place; frees them, also on failure. */
BAL_MUST_CHECK bal_status bali_results_commit(bali_results *results, bal_error *err);

/** Drops every output; they stay as they were. */
void bali_results_abandon(bali_results *results);

#endif
