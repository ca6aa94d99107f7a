#include "cli/fitting.h"

#include "cli/prior_options.h"
#include "cli/twice.h"

#include <math.h>
#include <string.h>

/* What holding out may take, however little --memory allows for keeping records. */
static const size_t least_count_bytes = (size_t)256 << 20;

/* --folds, --fold-column, --holdout and --test are four ways of one thing, and only the random ones can be repeated. */
static bal_status read_heldout(const bali_call *call, bal_heldout_options *options, bal_error *err) {
    static const option_id ways[] = {OPTION_FOLDS, OPTION_FOLD_COLUMN, OPTION_HOLDOUT, OPTION_TEST};
    static const bal_heldout_method methods[] = {BAL_HELDOUT_FOLDS, BAL_HELDOUT_GROUPS, BAL_HELDOUT_HOLDOUT, BAL_HELDOUT_TEST};
    const option_value *values = call->values;
    size_t way = 0;
    *options = bal_heldout_options_defaults();
    for (size_t i = 1; i < sizeof ways / sizeof ways[0]; i++) {
        if (!values[ways[i]].given) continue;
        if (way != 0 || values[OPTION_FOLDS].given)
            return bal_error_set(err, BAL_ERR_ARGUMENT, "option-mismatch", "--%s and --%s are two ways to hold records out; give one of them",
                                 bali_option_table()[ways[way]].name, bali_option_table()[ways[i]].name);
        way = i;
    }
    options->method = methods[way];
    options->folds = (size_t)values[OPTION_FOLDS].whole;
    options->fraction = values[OPTION_HOLDOUT].number;
    options->repeats = (size_t)values[OPTION_REPEATS].whole;
    options->seed = values[OPTION_SEED].whole;
    options->threads = bali_call_threads(call);
    options->count_bytes = bali_call_memory(call) > least_count_bytes ? bali_call_memory(call) : least_count_bytes;
    bool random = (options->method == BAL_HELDOUT_FOLDS && options->folds > 0) || options->method == BAL_HELDOUT_HOLDOUT;
    if (options->repeats > 1 && !random)
        return bal_error_set(err, BAL_ERR_ARGUMENT, "option-mismatch", "--repeats goes with --folds and --holdout, whose parts are random; leave it out");
    return options->folds == 1 ? bal_error_set(err, BAL_ERR_ARGUMENT, "bad-folds", "one fold leaves nothing to fit to; give 0, or 2 and more") : BAL_OK;
}

bal_status bali_fitting_prepare(const bali_call *call, bali_console *console, bali_fitting *f, bal_error *err) {
    bal_status status = read_heldout(call, &f->heldout_options, err);
    if (status == BAL_OK) status = bali_prior_options_read(call, &f->prior_options, err);
    if (status == BAL_OK) status = bali_inputs_read_network(call, console, &f->inputs, err);
    if (status != BAL_OK) return status;
    if (f->prior_options.kind == BAL_PRIOR_EXPERT) f->prior_options.expert = f->inputs.document;
    if (f->prior_options.kind == BAL_PRIOR_CARRIED) f->prior_options.carried = f->inputs.document;
    status = bal_prior_create(bal_document_network(f->inputs.document), &f->prior_options, &f->prior, err);
    if (status != BAL_OK) bal_error_place(err, call->arguments[0], 0, 0);
    return status;
}

static size_t cells_of(const bal_network *network, size_t v) {
    return bal_network_rows(network, v) * bal_network_outcomes(network, v);
}

/* old x carry + new; new may be NULL. */
static bal_status carry(const bal_cells *old, double weight, const bal_cells *new_counts, bal_cells **out, bal_error *err) {
    const bal_network *network = bal_cells_network(old);
    bal_status status = bal_cells_copy(old, out, err);
    for (size_t v = 0; status == BAL_OK && v < bal_network_variables(network); v++) {
        double *to = bal_cells_edit(*out, v);
        const double *more = new_counts ? bal_cells_family(new_counts, v) : NULL;
        for (size_t c = 0; c < cells_of(network, v); c++) to[c] = to[c] * weight + (more ? more[c] : 0);
    }
    return status;
}

/* Log marginal likelihood of the earlier counts alone. */
static bal_status score_earlier(const bali_fitting *f, const bal_cells *earlier, double *score, bal_error *err) {
    bal_fit *fit = NULL;
    bal_status status = bal_fit_create(f->prior, earlier, &fit, err);
    if (status == BAL_OK) *score = fit->scores.log_marginal_likelihood;
    bal_fit_free(fit);
    return status;
}

/* Under a carried prior the file's counts, times --carry, and the new ones together; otherwise the new ones alone. */
static bal_status gather_counts(const bali_call *call, bali_fitting *f, double *earlier_score, bal_error *err) {
    double weight = call->values[OPTION_CARRY].number;
    const bal_cells *old = f->prior_options.kind == BAL_PRIOR_CARRIED ? bal_document_cells(f->inputs.document, BAL_CARRIED_COUNTS) : NULL;
    *earlier_score = f->prior_options.kind == BAL_PRIOR_CARRIED ? 0 : NAN;
    if (!old) return bal_cells_copy(f->inputs.counts, &f->counts, err);
    bal_cells *earlier = NULL;
    bool has_new = call->n_arguments > 1;
    bal_status status = carry(old, weight, NULL, &earlier, err);
    if (status == BAL_OK && has_new) status = bali_warn_of_known_part(&f->inputs, err);
    if (status == BAL_OK && has_new) status = carry(old, weight, f->inputs.counts, &f->counts, err);
    if (status == BAL_OK && !has_new) status = bal_cells_copy(earlier, &f->counts, err);
    if (status == BAL_OK) status = score_earlier(f, earlier, earlier_score, err);
    f->inputs.facts.earlier = weight * bali_document_records(f->inputs.document);
    if (!has_new) f->inputs.facts.records = f->inputs.facts.weight = 0;
    bal_cells_free(earlier);
    return status;
}

static bal_status compute_others(bali_fitting *f, bal_error *err) {
    bal_prior_options expert = bal_prior_options_defaults();
    expert.kind = BAL_PRIOR_EXPERT;
    expert.expert = f->inputs.document;
    f->facts.others = f->others;
    return bal_other_priors(bal_document_network(f->inputs.document), f->counts, f->prior_options.kind, &expert, f->others, &f->facts.n_others, err);
}

/* Says why there is no held-out comparison. */
static void tell_no_heldout(const bali_fitting *f, const char *code, const char *why) {
    bal_error notice = {0};
    (void)bal_error_set(&notice, BAL_ERR_DATA, code, "%s", why);
    notice.status = BAL_OK;
    f->inputs.notices.tell(f->inputs.notices.context, BAL_NOTE, &notice);
}

/* The test table is read as the data are, and predicted by a fit to all of them. */
static bal_status hold_out_table(const bali_call *call, bali_fitting *f, bal_error *err) {
    bal_source *table = NULL, *kept = NULL;
    bal_file_facts facts;
    bal_block block;
    bal_missing missing = bali_call_missing(call);
    bal_status status = bali_inputs_open_table(call, &f->inputs, call->values[OPTION_TEST].text, missing, &table, err);
    if (status == BAL_OK) status = bal_source_keep_take(table, bali_call_memory(call), &kept, err);
    while (status == BAL_OK && (status = bal_source_next(kept, &block, err)) == BAL_OK && block.n_records > 0) {} /* its facts and weights */
    if (status == BAL_OK) {
        bal_table_facts(table, &facts);
        status = bali_refuse_equal_test(&f->inputs, &facts, err);
        if (status == BAL_OK) status = bali_inputs_add_file(&f->inputs, &facts, err);
    }
    bal_source_summary summary = {0};
    if (status == BAL_OK) bal_source_summary_get(kept, &summary);
    if (status == BAL_OK && summary.fractional) {
        tell_no_heldout(f, "fractional-weight", "some weights of the test table are not whole, so it has no single records: no held-out comparison");
    } else if (status == BAL_OK) {
        status = bal_heldout_run(f->prior, f->counts, kept, &f->heldout_options, &f->heldout, err);
        f->facts.heldout = &f->heldout;
    }
    bal_source_free(kept);
    return status;
}

/* Whether the records of the data can be held out; says why not, where that may surprise. */
static bool has_records(const bali_call *call, const bali_fitting *f) {
    const bal_source_summary *summary = &f->inputs.facts.summary;
    const option_value *values = call->values;
    bool asked = values[OPTION_FOLDS].given || values[OPTION_FOLD_COLUMN].given || values[OPTION_HOLDOUT].given;
    if (!f->inputs.source && asked) {
        tell_no_heldout(f, "no-records", "the data are counts, which have no single records to hold out: no held-out comparison");
    } else if (summary->places > BAL_HELDOUT_MOST_RECORDS) {
        tell_no_heldout(f, "too-many-held-out", "more than 100 million records are not held out one by one: no held-out comparison");
    }
    return f->inputs.source && summary->records > 0 && summary->places <= BAL_HELDOUT_MOST_RECORDS;
}

static bal_status hold_out(const bali_call *call, bali_fitting *f, bal_error *err) {
    bool test = f->heldout_options.method == BAL_HELDOUT_TEST;
    if (f->inputs.facts.fractional) {
        tell_no_heldout(f, "fractional-weight",
                        "some counts are not whole, so records cannot be left out one by one: no leave-one-out and no held-out comparison");
        return BAL_OK;
    }
    if (test) return hold_out_table(call, f, err);
    if (f->heldout_options.method == BAL_HELDOUT_FOLDS && f->heldout_options.folds == 0) return BAL_OK;
    if (!has_records(call, f)) return BAL_OK;
    f->facts.heldout = &f->heldout;
    return bal_heldout_run(f->prior, f->counts, f->inputs.source, &f->heldout_options, &f->heldout, err);
}

static void collect_facts(const bali_call *call, bali_fitting *f, double earlier_score) {
    f->facts.document = f->inputs.document;
    f->facts.data = &f->inputs.facts;
    f->facts.prior = f->prior;
    f->facts.prior_options = &f->prior_options;
    f->facts.fit = f->fit;
    f->facts.log_predictive = f->fit->scores.log_marginal_likelihood - earlier_score;
    f->facts.heldout_options = &f->heldout_options;
    f->facts.level = call->values[OPTION_LEVEL].number;
    f->facts.maximum_likelihood = call->values[OPTION_ESTIMATE].word == 1;
}

/* Records of fractional weight cannot be left out one by one, also where their sums happen to be whole. */
static void leave_fractions_out(bali_fitting *f) {
    f->inputs.facts.fractional |= isnan(f->fit->scores.leave_one_out);
    if (f->inputs.facts.fractional) f->fit->scores.leave_one_out = NAN;
}

static bal_status check_choice(const bali_fitting *f, bal_error *err) {
    if (!f->inputs.facts.fractional || f->prior_options.choice != BAL_STRENGTH_BY_LEAVE_ONE_OUT) return BAL_OK;
    return bal_error_set(err, BAL_ERR_DATA, "fractional-weight",
                         "some weights are not whole, so no strength can be chosen by leaving records out; choose it by auto, or give it");
}

bal_status bali_fitting_compute(const bali_call *call, bali_fitting *f, bal_error *err) {
    bool held = f->heldout_options.method != BAL_HELDOUT_FOLDS || f->heldout_options.folds > 0;
    bali_data_options options = {.missing = bali_call_missing(call), .keep_records = held};
    double earlier_score = NAN;
    bal_status status = bali_inputs_read_data(call, &options, &f->inputs, err);
    if (status == BAL_OK) status = check_choice(f, err);
    if (status == BAL_OK) status = bal_prior_check(f->prior, f->inputs.counts, f->inputs.source, err);
    if (status == BAL_OK) status = gather_counts(call, f, &earlier_score, err);
    if (status == BAL_OK) status = bali_check_counts(&f->inputs, f->counts, err);
    if (status == BAL_OK) status = bal_fit_create(f->prior, f->counts, &f->fit, err);
    if (status != BAL_OK) return status;
    leave_fractions_out(f);
    collect_facts(call, f, earlier_score);
    status = compute_others(f, err);
    for (size_t i = 0; i < f->facts.n_others && f->inputs.facts.fractional; i++) f->others[i].leave_one_out = NAN;
    if (status == BAL_OK) status = hold_out(call, f, err);
    if (f->inputs.fewer_threads || f->heldout.fewer_threads) bali_warn_of_threads(&f->inputs);
    return status;
}

void bali_fitting_free(bali_fitting *f) {
    bal_fit_free(f->fit);
    bal_cells_free(f->counts);
    bal_prior_free(f->prior);
    bali_inputs_free(&f->inputs);
}
