/* ballast tally: one pass over one or many tables; writes the network with its counts. */
#include "cli/commands.h"
#include "cli/inputs.h"
#include "cli/provenance.h"
#include "cli/results.h"

#include "base/memory.h"

/* Everything one call makes on its way. */
typedef struct tally_work {
    bali_console console;
    bali_inputs inputs;
    bali_results results;
} tally_work;

static bal_status write_network(tally_work *w, bal_error *err) {
    bal_document *document = NULL;
    char *text = NULL;
    size_t length;
    if (!w->results.output) return BAL_OK;
    bal_status status = bal_document_copy(w->inputs.document, &document, err);
    if (status == BAL_OK) status = bal_document_set_cells(document, BAL_CARRIED_COUNTS, w->inputs.counts, err);
    if (status == BAL_OK) status = bali_set_provenance(document, &w->inputs, false, err);
    if (status == BAL_OK) status = bal_document_print(document, &text, &length, err);
    if (status == BAL_OK) status = bali_output_write(w->results.output, text, length, err);
    bal_text_free(text);
    bal_document_free(document);
    return status;
}

static bal_status write_json(const tally_work *w, bal_error *err) {
    if (!w->results.json) return BAL_OK;
    bali_json json = {0};
    bali_tally_json(w->inputs.document, &w->inputs.facts, w->inputs.counts, &json);
    bal_status status = json.text.failed ? bali_out_of_memory(err)
                                         : bali_output_write(w->results.json, json.text.bytes, json.text.length, err);
    bali_json_free(&json);
    return status;
}

static bal_status tally(const bali_call *call, tally_work *w, bali_text *page, bal_error *err) {
    w->console.quiet = call->values[OPTION_QUIET].given;
    if (!call->values[OPTION_OUTPUT].given && !call->values[OPTION_JSON].given)
        return bal_error_set(err, BAL_ERR_ARGUMENT, "wrong-arguments", "tally needs -o FILE (- for standard output), --json FILE, or both");
    bali_data_options options = {.missing = bali_call_missing(call), .keep_records = false};
    bal_status status = bali_inputs_read_network(call, &w->console, &w->inputs, err);
    if (status == BAL_OK) status = bali_results_open(call, &w->results, err);
    if (status == BAL_OK) status = bali_inputs_read_data(call, &options, &w->inputs, err);
    if (w->inputs.fewer_threads) bali_warn_of_threads(&w->inputs);
    if (status == BAL_OK) status = write_network(w, err);
    if (status == BAL_OK) status = write_json(w, err);
    if (status == BAL_OK && w->results.page) bali_tally_text(&w->inputs.facts, w->inputs.counts, page);
    if (status == BAL_OK && page->failed) status = bali_out_of_memory(err);
    return status == BAL_OK ? bali_results_commit(&w->results, err) : status;
}

static int run(const bali_call *call) {
    tally_work w = {0};
    bal_error err = {0};
    bali_text page = {0};
    bal_status status = tally(call, &w, &page, &err);
    bali_results_abandon(&w.results);
    bali_console_end(&w.console);
    int exit = status == BAL_OK ? bali_console_print(bali_text_string(&page), page.length) : bali_console_fail(&w.console, &err);
    bali_text_free(&page);
    bali_inputs_free(&w.inputs);
    return exit;
}

static const option_id options[] = {OPTION_OUTPUT,   OPTION_MISSING,     OPTION_MISSING_LABEL, OPTION_UNRECORDED, OPTION_WEIGHT,
                                    OPTION_CODEBOOK, OPTION_DELIMITER,   OPTION_STRICT,        OPTION_TABLE_ORDER, OPTION_MAX_CELLS,
                                    OPTION_REDACT,   OPTION_JSON,        OPTION_QUIET,         OPTION_THREADS,     OPTION_HELP,
                                    N_OPTIONS};

const bali_command bali_cmd_tally = {
    "tally",
    "NETWORK TABLE ... -o FILE",
    2,
    MOST_ARGUMENTS,
    options,
    "Counts every family of NETWORK in one pass over one or many tables, and writes the network with its counts.",
    "The file holds all that the tables say to this network: ballast fit FILE gives what ballast fit NETWORK TABLE ... would, without the "
    "records. Memory does not grow with the tables. A family's counts of 1, and one site's counts by subtraction, can give records away: "
    "share a tally as you would share the table.",
    run,
};
