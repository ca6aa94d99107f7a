/* ballast fit: prior + counts -> posterior tables, and held-out log-likelihood against maximum likelihood. */
#include "cli/commands.h"
#include "cli/fitted.h"
#include "cli/fitting.h"
#include "cli/results.h"

#include "base/files.h"
#include "base/memory.h"

#include <string.h>

enum { THIN_ROWS_NAMED = 3 };

/* Everything one call makes on its way. */
typedef struct fit_work {
    bali_console console;
    bali_fitting fitting;
    bali_results results;
} fit_work;

static void name_outputs(const bali_call *call, bali_fit_facts *facts) {
    const option_value *output = &call->values[OPTION_OUTPUT], *json = &call->values[OPTION_JSON];
    facts->written = output->given ? bali_base_name(output->text) : NULL;
    facts->json = json->given ? bali_base_name(json->text) : NULL;
}

/* Rows whose pseudo-counts sum to less than 1 and that meet records have intervals that are too narrow. */
static bal_status warn_of_thin_rows(const fit_work *w, bal_error *err) {
    bali_row rows[THIN_ROWS_NAMED];
    size_t n = bali_list_thin_rows(w->fitting.fit, rows, THIN_ROWS_NAMED);
    if (n == 0) return BAL_OK;
    bali_text names = {0};
    for (size_t i = 0; i < n && i < THIN_ROWS_NAMED; i++) {
        bali_text_puts(&names, i ? "; " : "");
        bali_put_row_name(&names, bal_cells_network(w->fitting.fit->counts), rows[i].variable, rows[i].row, 60);
    }
    if (n > THIN_ROWS_NAMED) bali_text_printf(&names, "; and %zu more", n - THIN_ROWS_NAMED);
    bal_error notice = {0};
    (void)bal_error_set(&notice, BAL_ERR_DATA, "thin-prior",
                        "%zu %s pseudo-counts that sum to less than 1, so the intervals there are narrower than they should be; rows: %s", n,
                        n == 1 ? "row with records has" : "rows with records have", bali_text_string(&names));
    notice.status = BAL_OK;
    bool failed = names.failed;
    if (!failed) w->fitting.inputs.notices.tell(w->fitting.inputs.notices.context, BAL_WARNING, &notice);
    bali_text_free(&names);
    return failed ? bali_out_of_memory(err) : BAL_OK;
}

static bal_status write_fitted(fit_work *w, bal_error *err) {
    if (!w->results.output) return BAL_OK;
    bal_document *document = NULL;
    char *text = NULL;
    size_t length;
    bal_status status = bali_fitted_document(&w->fitting.facts, &w->fitting.inputs, &document, err);
    if (status == BAL_OK) status = bal_document_print(document, &text, &length, err);
    if (status == BAL_OK) status = bali_output_write(w->results.output, text, length, err);
    bal_text_free(text);
    bal_document_free(document);
    return status;
}

static bal_status write_json(fit_work *w, bal_error *err) {
    if (!w->results.json) return BAL_OK;
    bali_json json = {0};
    bal_status status = bali_fit_json(&w->fitting.facts, &json, err);
    if (status == BAL_OK) status = bali_output_write(w->results.json, json.text.bytes, json.text.length, err);
    bali_json_free(&json);
    return status;
}

static bal_status deliver(fit_work *w, bali_text *page, bal_error *err) {
    bal_status status = warn_of_thin_rows(w, err);
    if (status != BAL_OK) return status;
    if (w->results.page) bali_fit_text(&w->fitting.facts, page);
    if (page->failed) return bali_out_of_memory(err);
    status = write_fitted(w, err);
    if (status == BAL_OK) status = write_json(w, err);
    return status == BAL_OK ? bali_results_commit(&w->results, err) : status;
}

static bal_status fit(const bali_call *call, fit_work *w, bali_text *page, bal_error *err) {
    w->console.quiet = call->values[OPTION_QUIET].given;
    bal_status status = bali_fitting_prepare(call, &w->console, &w->fitting, err);
    if (status == BAL_OK) status = bali_results_open(call, &w->results, err);
    if (status == BAL_OK) status = bali_fitting_compute(call, &w->fitting, err);
    if (status != BAL_OK) return status;
    name_outputs(call, &w->fitting.facts);
    return deliver(w, page, err);
}

static int run(const bali_call *call) {
    fit_work *w = bali_allocate(1, sizeof *w);
    bal_error err = {0};
    bali_text page = {0};
    bali_console lost = {0};
    if (!w) return bali_out_of_memory(&err), bali_console_fail(&lost, &err);
    bal_status status = fit(call, w, &page, &err);
    bali_results_abandon(&w->results);
    bali_console_end(&w->console);
    int exit = status == BAL_OK ? bali_console_print(bali_text_string(&page), page.length) : bali_console_fail(&w->console, &err);
    bali_text_free(&page);
    bali_fitting_free(&w->fitting);
    bali_free(w);
    return exit;
}

static const option_id options[] = {OPTION_OUTPUT,  OPTION_PRIOR,         OPTION_ESS,       OPTION_SCALE,  OPTION_ROW_ESS,     OPTION_PRIOR_FLOOR,
                                    OPTION_CARRY,   OPTION_LEVEL,         OPTION_ESTIMATE,  OPTION_FOLDS,  OPTION_FOLD_COLUMN, OPTION_HOLDOUT,
                                    OPTION_TEST,    OPTION_REPEATS,       OPTION_MISSING,   OPTION_MISSING_LABEL, OPTION_UNRECORDED,
                                    OPTION_WEIGHT,  OPTION_CODEBOOK,      OPTION_DELIMITER,
                                    OPTION_STRICT,  OPTION_TABLE_ORDER,   OPTION_MAX_CELLS, OPTION_MEMORY, OPTION_REDACT,      OPTION_JSON,
                                    OPTION_QUIET,   OPTION_THREADS,       OPTION_SEED,      OPTION_HELP,   N_OPTIONS};

const bali_command bali_cmd_fit = {
    "fit",
    "NETWORK [DATA ...] [-o FILE]",
    1,
    MOST_ARGUMENTS,
    options,
    "Learns the tables of NETWORK from the records of DATA under a Dirichlet prior, and compares them with raw frequencies "
    "(maximum likelihood) on records that the fit had not seen.",
    "DATA is a table (CSV with a header, perhaps gzipped; - is standard input), several tables, which are one, or a network file that carries counts; without it NETWORK's own "
    "counts are the data. Every row of the result says how many records it rests on; a row without records is prior belief.",
    run,
};
