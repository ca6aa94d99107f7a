/* ballast fit: prior + counts -> posterior tables, and held-out log-likelihood against maximum likelihood. */
#include "cli/commands.h"
#include "cli/fitted.h"
#include "cli/inputs.h"
#include "cli/prior_options.h"
#include "cli/results.h"

#include "base/files.h"
#include "base/memory.h"

#include <string.h>

enum { THIN_ROWS_NAMED = 3 };

/* Everything one fit makes on its way. */
typedef struct fit_work {
    bali_console console;
    bali_inputs inputs;
    bali_results results;
    bal_prior_options prior_options;
    bal_prior *prior;
    bal_fit *fit;
    bal_other_prior others[BAL_PRIOR_KINDS];
    bal_heldout heldout;
    bali_fit_facts facts;
} fit_work;

static bal_status prepare(const bali_call *call, fit_work *w, bal_error *err) {
    w->console.quiet = call->values[OPTION_QUIET].given;
    bal_status status = bali_prior_options_read(call, &w->prior_options, err);
    if (status == BAL_OK) status = bali_inputs_read_network(call, &w->console, &w->inputs, err);
    if (status != BAL_OK) return status;
    if (w->prior_options.kind == BAL_PRIOR_EXPERT) w->prior_options.expert = w->inputs.document;
    status = bal_prior_create(bal_document_network(w->inputs.document), &w->prior_options, &w->prior, err);
    if (status == BAL_OK) return bali_results_open(call, &w->results, err);
    bal_error_place(err, call->arguments[0], 0, 0);
    return status;
}

static bal_status compute_others(fit_work *w, bal_error *err) {
    bal_prior_options expert = bal_prior_options_defaults();
    expert.kind = BAL_PRIOR_EXPERT;
    expert.expert = w->inputs.document;
    w->facts.others = w->others;
    return bal_other_priors(bal_document_network(w->inputs.document), w->inputs.counts, w->prior_options.kind, &expert, w->others,
                            &w->facts.n_others, err);
}

static bal_status hold_out(const bali_call *call, fit_work *w, bal_error *err) {
    bal_heldout_options options = bal_heldout_options_defaults();
    options.folds = (size_t)call->values[OPTION_FOLDS].whole;
    options.seed = call->values[OPTION_SEED].whole;
    options.threads = bali_call_threads(call);
    double records = w->inputs.facts.records;
    if (options.folds == 0 || !w->inputs.source || records < 1 || records > (double)BAL_HELDOUT_MOST_RECORDS) return BAL_OK;
    bal_status status = bal_heldout_folds(w->prior, w->inputs.counts, w->inputs.source, &options, &w->heldout, err);
    w->facts.heldout = &w->heldout;
    w->facts.folds = options.folds;
    return status;
}

static bal_status compute(const bali_call *call, fit_work *w, bal_error *err) {
    bal_missing missing = call->values[OPTION_MISSING].word == 1 ? BAL_MISSING_DROP : BAL_MISSING_STOP;
    bal_status status = bali_inputs_read_data(call, missing, &w->inputs, err);
    if (status == BAL_OK) status = bal_prior_check(w->prior, w->inputs.counts, w->inputs.source, err);
    if (status == BAL_OK) status = bal_fit_create(w->prior, w->inputs.counts, &w->fit, err);
    if (status == BAL_OK) status = compute_others(w, err);
    if (status == BAL_OK) status = hold_out(call, w, err);
    return status;
}

static void collect_facts(const bali_call *call, fit_work *w) {
    const option_value *output = &call->values[OPTION_OUTPUT], *json = &call->values[OPTION_JSON];
    w->facts.document = w->inputs.document;
    w->facts.data = &w->inputs.facts;
    w->facts.prior = w->prior;
    w->facts.prior_options = &w->prior_options;
    w->facts.fit = w->fit;
    w->facts.level = call->values[OPTION_LEVEL].number;
    w->facts.maximum_likelihood = call->values[OPTION_ESTIMATE].word == 1;
    w->facts.written = output->given ? bali_base_name(output->text) : NULL;
    w->facts.json = json->given ? bali_base_name(json->text) : NULL;
}

/* Rows whose pseudo-counts sum to less than 1 and that meet records have intervals that are too narrow. */
static bal_status warn_of_thin_rows(const fit_work *w, bal_error *err) {
    bali_row rows[THIN_ROWS_NAMED];
    size_t n = bali_list_thin_rows(w->fit, rows, THIN_ROWS_NAMED);
    if (n == 0) return BAL_OK;
    bali_text names = {0};
    for (size_t i = 0; i < n && i < THIN_ROWS_NAMED; i++) {
        bali_text_puts(&names, i ? "; " : "");
        bali_put_row_name(&names, bal_cells_network(w->fit->counts), rows[i].variable, rows[i].row, 60);
    }
    if (n > THIN_ROWS_NAMED) bali_text_printf(&names, "; and %zu more", n - THIN_ROWS_NAMED);
    bal_error notice = {0};
    (void)bal_error_set(&notice, BAL_ERR_DATA, "thin-prior",
                        "%zu rows with records have pseudo-counts that sum to less than 1, so their intervals are narrower than they should "
                        "be; rows: %s",
                        n, bali_text_string(&names));
    notice.status = BAL_OK;
    bool failed = names.failed;
    if (!failed) w->inputs.notices.tell(w->inputs.notices.context, BAL_WARNING, &notice);
    bali_text_free(&names);
    return failed ? bali_out_of_memory(err) : BAL_OK;
}

static bal_status write_fitted(fit_work *w, bal_error *err) {
    if (!w->results.output) return BAL_OK;
    bal_document *document = NULL;
    char *text = NULL;
    size_t length;
    bal_status status = bali_fitted_document(&w->facts, &document, err);
    if (status == BAL_OK) status = bal_document_print(document, &text, &length, err);
    if (status == BAL_OK) status = bali_output_write(w->results.output, text, length, err);
    bal_text_free(text);
    bal_document_free(document);
    return status;
}

static bal_status write_json(fit_work *w, bal_error *err) {
    if (!w->results.json) return BAL_OK;
    bali_json json = {0};
    bal_status status = bali_fit_json(&w->facts, &json, err);
    if (status == BAL_OK) status = bali_output_write(w->results.json, json.text.bytes, json.text.length, err);
    bali_json_free(&json);
    return status;
}

static bal_status deliver(fit_work *w, bali_text *page, bal_error *err) {
    bal_status status = warn_of_thin_rows(w, err);
    if (status != BAL_OK) return status;
    if (w->results.page) bali_fit_text(&w->facts, page);
    if (page->failed) return bali_out_of_memory(err);
    status = write_fitted(w, err);
    if (status == BAL_OK) status = write_json(w, err);
    return status == BAL_OK ? bali_results_commit(&w->results, err) : status;
}

static int run(const bali_call *call) {
    fit_work *w = bali_allocate(1, sizeof *w);
    bal_error err = {0};
    bali_text page = {0};
    bali_console lost = {0};
    if (!w) return bali_out_of_memory(&err), bali_console_fail(&lost, &err);
    bal_status status = prepare(call, w, &err);
    if (status == BAL_OK) status = compute(call, w, &err);
    if (status == BAL_OK) {
        collect_facts(call, w);
        status = deliver(w, &page, &err);
    }
    bali_results_abandon(&w->results);
    bali_console_end(&w->console);
    int exit = status == BAL_OK ? bali_console_print(bali_text_string(&page), page.length) : bali_console_fail(&w->console, &err);
    bali_text_free(&page);
    bal_fit_free(w->fit);
    bal_prior_free(w->prior);
    bali_inputs_free(&w->inputs);
    bali_free(w);
    return exit;
}

static const option_id options[] = {OPTION_OUTPUT,  OPTION_PRIOR,         OPTION_ESS,       OPTION_SCALE,  OPTION_ROW_ESS,     OPTION_PRIOR_FLOOR,
                                    OPTION_LEVEL,   OPTION_ESTIMATE,      OPTION_FOLDS,     OPTION_MISSING, OPTION_MISSING_LABEL, OPTION_DELIMITER,
                                    OPTION_STRICT,  OPTION_TABLE_ORDER,   OPTION_MAX_CELLS, OPTION_MEMORY, OPTION_REDACT,      OPTION_JSON,
                                    OPTION_QUIET,   OPTION_THREADS,       OPTION_SEED,      OPTION_HELP,   N_OPTIONS};

const bali_command bali_cmd_fit = {
    "fit",
    "NETWORK [DATA] [-o FILE]",
    1,
    2,
    options,
    "Learns the tables of NETWORK from the records of DATA under a Dirichlet prior, and compares them with raw frequencies "
    "(maximum likelihood) on records that the fit had not seen.",
    "DATA is a table (CSV with a header; - is standard input) or a network file that carries counts; without it NETWORK's own "
    "counts are the data. Every row of the result says how many records it rests on; a row without records is prior belief.",
    run,
};
