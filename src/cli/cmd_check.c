/* ballast check: validates a network and a table, and says whether the table is enough. */
#include "cli/commands.h"
#include "cli/inputs.h"
#include "cli/results.h"

#include "base/memory.h"

#include <string.h>

/* Everything one check makes on its way. */
typedef struct check_work {
    bali_console console;
    bali_inputs inputs;
    bali_results results;
    bal_support support;
    double *row_shares, *cell_shares;
    bali_check_facts facts;
} check_work;

static bal_status measure_data(const bali_call *call, check_work *w, bal_error *err) {
    size_t n = bal_network_variables(bal_document_network(w->inputs.document));
    w->row_shares = bali_allocate(n, sizeof *w->row_shares);
    w->cell_shares = bali_allocate(n, sizeof *w->cell_shares);
    if (!w->row_shares || !w->cell_shares) return bali_out_of_memory(err);
    /* Incomplete records are always counted here, and refused at the end: a check shows all it can. */
    bal_missing missing = bali_call_missing(call);
    bali_data_options options = {.missing = missing == BAL_MISSING_STOP ? BAL_MISSING_DROP : missing, .keep_records = true};
    bal_status status = bali_inputs_read_data(call, &options, &w->inputs, err);
    if (status == BAL_OK)
        status = bal_support_measure(w->inputs.counts, w->inputs.source, &w->support, w->row_shares, w->cell_shares, err);
    w->facts.counts = w->inputs.counts;
    w->facts.support = &w->support;
    w->facts.row_shares = w->row_shares;
    w->facts.cell_shares = w->cell_shares;
    return status;
}

static bal_status compute(const bali_call *call, check_work *w, bal_error *err) {
    w->console.quiet = call->values[OPTION_QUIET].given;
    bal_status status = bali_inputs_read_network(call, &w->console, &w->inputs, err);
    if (status != BAL_OK) return status;
    status = bali_results_open(call, &w->results, err);
    bool has_data = call->n_arguments > 1 || bal_document_cells(w->inputs.document, BAL_CARRIED_COUNTS);
    if (status == BAL_OK && has_data) status = measure_data(call, w, err);
    w->facts.document = w->inputs.document;
    w->facts.data = &w->inputs.facts;
    return status;
}

static bal_status deliver(check_work *w, bali_text *page, bal_error *err) {
    bali_json json = {0};
    bal_status status = BAL_OK;
    if (w->results.page) bali_check_text(&w->facts, page);
    if (w->results.json) {
        bali_check_json(&w->facts, &json);
        status = json.text.failed ? bali_out_of_memory(err) : bali_output_write(w->results.json, json.text.bytes, json.text.length, err);
    }
    if (page->failed) status = bali_out_of_memory(err);
    bali_json_free(&json);
    return status == BAL_OK ? bali_results_commit(&w->results, err) : status;
}

/* Passes on what a fit would refuse, and not again what was told already. */
static void tell_problems(void *console, bal_severity severity, const bal_error *notice) {
    if (severity == BAL_PROBLEM) bali_console_tell(console, severity, notice);
}

/* Reads the tables as a fit would, up to the first that it would refuse. */
static bal_status refuse_as_fit(const bali_call *call, check_work *w, bal_error *err) {
    bal_status status = BAL_OK;
    w->inputs.notices.tell = tell_problems;
    for (size_t i = 1; i < call->n_arguments && status == BAL_OK; i++) {
        bal_source *table = NULL;
        bal_block block = {.n_records = 1};
        if (strcmp(call->arguments[i], "-") == 0) continue; /* it was read, and is gone */
        status = bali_inputs_open_table(call, &w->inputs, call->arguments[i], BAL_MISSING_STOP, &table, err);
        while (status == BAL_OK && block.n_records > 0) status = bal_source_next(table, &block, err);
        bal_source_free(table);
    }
    return status;
}

/* Under --missing stop, incomplete records make the check fail as they would make a fit fail. */
static bal_status judge_missing(const bali_call *call, check_work *w, bal_error *err) {
    uint64_t dropped = w->inputs.facts.summary.dropped;
    if (dropped == 0 || bali_call_missing(call) != BAL_MISSING_STOP) return BAL_OK;
    bal_status status = refuse_as_fit(call, w, err);
    if (status != BAL_OK) return status;
    status = bal_error_set(err, BAL_ERR_DATA, "missing-cells",
                                      "%llu records have a missing cell, so a fit will refuse this table; fill them in, or give --missing drop",
                                      (unsigned long long)dropped);
    bal_error_place(err, call->arguments[1], 0, 0);
    return status;
}

static int run(const bali_call *call) {
    check_work *w = bali_allocate(1, sizeof *w);
    bal_error err = {0};
    bali_text page = {0};
    bali_console lost = {0};
    if (!w) return bali_out_of_memory(&err), bali_console_fail(&lost, &err);
    bal_status status = compute(call, w, &err);
    if (status == BAL_OK) status = deliver(w, &page, &err);
    bali_results_abandon(&w->results);
    bali_console_end(&w->console);
    int exit = status == BAL_OK ? bali_console_print(bali_text_string(&page), page.length) : bali_console_fail(&w->console, &err);
    if (status == BAL_OK && exit == 0 && judge_missing(call, w, &err) != BAL_OK) exit = bali_console_fail(&w->console, &err);
    bali_text_free(&page);
    bali_free(w->row_shares);
    bali_free(w->cell_shares);
    bali_inputs_free(&w->inputs);
    bali_free(w);
    return exit;
}

static const option_id options[] = {OPTION_MISSING,     OPTION_MISSING_LABEL, OPTION_UNRECORDED, OPTION_WEIGHT, OPTION_CODEBOOK, OPTION_DELIMITER, OPTION_STRICT, OPTION_TABLE_ORDER,
                                    OPTION_MAX_CELLS,   OPTION_MEMORY,        OPTION_REDACT,    OPTION_JSON,   OPTION_QUIET,
                                    OPTION_THREADS,     OPTION_SEED,          OPTION_HELP,      N_OPTIONS};

const bali_command bali_cmd_check = {
    "check",
    "NETWORK [TABLE ...]",
    1,
    MOST_ARGUMENTS,
    options,
    "Validates a network, and a table against it, and says whether the table is enough: of 100 new cases, about how many will meet "
    "a row, or a cell, that no record supports.",
    "The shares are those of records that are alone in a row (or cell) they need (Good 1953). Status 0 means that a fit will accept "
    "both inputs.",
    run,
};
