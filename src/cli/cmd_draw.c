/* ballast draw: simulates records from a network. */
#include "cli/commands.h"
#include "cli/inputs.h"
#include "cli/results.h"

#include "base/csv_writer.h"
#include "base/memory.h"

#include <string.h>

static void put_header(const bal_domain *domain, bali_text *text) {
    for (size_t v = 0; v < bal_domain_variables(domain); v++) {
        if (v > 0) bali_text_putc(text, ',');
        bali_csv_put(text, bal_domain_name(domain, v), strlen(bal_domain_name(domain, v)), ',');
    }
    bali_text_putc(text, '\n');
}

static void put_block(const bal_domain *domain, const bal_block *block, bali_text *text) {
    for (size_t t = 0; t < block->n_records; t++) {
        for (size_t v = 0; v < block->n_columns; v++) {
            const char *label = bal_domain_outcome(domain, v, bal_block_code(block, v, t));
            if (v > 0) bali_text_putc(text, ',');
            bali_csv_put(text, label, strlen(label), ',');
        }
        bali_text_putc(text, '\n');
    }
}

static bal_status write_records(bal_source *source, bali_output *output, bal_error *err) {
    const bal_domain *domain = bal_source_domain(source);
    bali_text text = {0};
    bal_block block;
    bal_status status;
    put_header(domain, &text);
    do {
        status = bal_source_next(source, &block, err);
        if (status != BAL_OK) break;
        put_block(domain, &block, &text);
        status = text.failed ? bali_out_of_memory(err) : bali_output_write(output, bali_text_string(&text), text.length, err);
        bali_text_clear(&text);
    } while (status == BAL_OK && block.n_records > 0);
    bali_text_free(&text);
    return status;
}

static bal_status write_json(const bali_call *call, const bali_inputs *inputs, const bali_results *results, bal_error *err) {
    if (!results->json) return BAL_OK;
    bali_json json = {0};
    bali_draw_json(inputs->document, &inputs->facts, call->values[OPTION_RECORDS].whole, call->values[OPTION_SEED].whole, &json);
    bal_status status = json.text.failed ? bali_out_of_memory(err) : bali_output_write(results->json, json.text.bytes, json.text.length, err);
    bali_json_free(&json);
    return status;
}

static bal_status draw(const bali_call *call, bali_console *console, bali_inputs *inputs, bali_results *results, bal_error *err) {
    if (!call->values[OPTION_RECORDS].given || !call->values[OPTION_OUTPUT].given)
        return bal_error_set(err, BAL_ERR_ARGUMENT, "wrong-arguments", "draw needs --records N and -o FILE (- for standard output)");
    bal_status status = bali_inputs_read_network(call, console, inputs, err);
    if (status != BAL_OK) return status;
    const bal_cells *tables = bal_document_cells(inputs->document, BAL_CARRIED_TABLES);
    if (!tables) {
        status = bal_error_set(err, BAL_ERR_DATA, "no-tables", "drawing needs a table for every variable; add the missing TABLE elements, or fit");
        bal_error_place(err, call->arguments[0], 0, 0);
        return status;
    }
    bal_source *source = NULL;
    status = bali_results_open(call, results, err);
    if (status == BAL_OK)
        status = bal_draw_open(tables, call->values[OPTION_RECORDS].whole, call->values[OPTION_SEED].whole, &source, err);
    if (status == BAL_OK) status = write_records(source, results->output, err);
    if (status == BAL_OK) status = write_json(call, inputs, results, err);
    if (status == BAL_OK) status = bali_results_commit(results, err);
    bal_source_free(source);
    return status;
}

static int run(const bali_call *call) {
    bali_console console = {.quiet = call->values[OPTION_QUIET].given};
    bali_inputs inputs = {0};
    bali_results results = {0};
    bal_error err = {0};
    bal_status status = draw(call, &console, &inputs, &results, &err);
    bali_results_abandon(&results);
    bali_console_end(&console);
    int exit = status == BAL_OK ? 0 : bali_console_fail(&console, &err);
    bali_inputs_free(&inputs);
    return exit;
}

static const option_id options[] = {OPTION_RECORDS, OPTION_OUTPUT, OPTION_TABLE_ORDER, OPTION_MAX_CELLS, OPTION_JSON, OPTION_QUIET, OPTION_THREADS,
                                    OPTION_SEED,    OPTION_HELP,   N_OPTIONS};

const bali_command bali_cmd_draw = {
    "draw",
    "NETWORK --records N -o FILE",
    1,
    1,
    options,
    "Simulates N records from the tables of NETWORK and writes them as CSV: for tests, for planning, for trying the rest out.",
    "Record i depends on the seed, on i and on the tables alone, so a longer draw begins with the shorter one.",
    run,
};
