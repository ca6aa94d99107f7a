/* `ballast fit` as JSON. */
#include "model/cells.h"
#include "report/facts.h"
#include "report/intervals.h"

#include "base/memory.h"

#include <math.h>

static const char *strength_choice(const bali_fit_facts *facts) {
    static const char *const words[] = {"given", "marginal-likelihood", "leave-one-out"};
    return words[bal_prior_choice(facts->prior)];
}

static void put_prior(bali_json *json, const bali_fit_facts *facts) {
    bal_prior_kind kind = bal_prior_kind_of(facts->prior);
    double value = facts->fit->strength.value;
    bool scaled = kind != BAL_PRIOR_BDEU && kind != BAL_PRIOR_CARRIED;
    bali_json_object(json, "prior");
    bali_json_string(json, "kind", bal_prior_kind_name(kind));
    bali_json_number(json, "ess", kind == BAL_PRIOR_BDEU ? value : NAN);
    bali_json_string(json, "ess_chosen", kind == BAL_PRIOR_BDEU ? strength_choice(facts) : NULL);
    bali_json_null(json, "strength");
    bali_json_null(json, "lean");
    bali_json_number(json, "scale", scaled ? value : NAN);
    bali_json_string(json, "scale_chosen", scaled ? strength_choice(facts) : NULL);
    bali_json_number(json, "row_ess",
                     kind == BAL_PRIOR_EXPERT && facts->prior_options->row_ess > 0 ? facts->prior_options->row_ess : NAN);
    bali_json_number(json, "floor", kind == BAL_PRIOR_EXPERT ? facts->prior_options->floor : NAN);
    bali_json_end_object(json);
}

static void put_scores(bali_json *json, const bali_fit_facts *facts) {
    const bal_fit *fit = facts->fit;
    bali_json_number(json, "log_marginal_likelihood", fit->scores.log_marginal_likelihood);
    bali_json_boolean(json, "composite", facts->data->composite);
    bali_json_number(json, "log_predictive", facts->log_predictive);
    bali_json_object(json, "loo");
    bali_json_number(json, "log_likelihood", fit->scores.leave_one_out);
    bali_json_number(json, "per_record", fit->scores.leave_one_out / bali_scored_records(facts));
    bali_json_end_object(json);
    bali_json_array(json, "other_priors");
    for (size_t i = 0; i < facts->n_others; i++) {
        const bal_other_prior *other = &facts->others[i];
        bali_json_object(json, NULL);
        bali_json_string(json, "kind", bal_prior_kind_name(other->kind));
        bali_json_number(json, "ess", other->kind == BAL_PRIOR_BDEU ? other->strength : NAN);
        bali_json_number(json, "loo_per_record", other->leave_one_out / bali_scored_records(facts));
        bali_json_end_object(json);
    }
    bali_json_end_array(json);
}

static void put_paired(bali_json *json, const char *key, const double *records, const bal_paired *paired) {
    bali_json_object(json, key);
    if (records) bali_json_number(json, "records", *records);
    bali_json_number(json, "bayes", paired->bayes);
    bali_json_number(json, "ml", paired->ml);
    bali_json_number(json, "mean_difference", paired->mean_difference);
    bali_json_number(json, "standard_error", paired->standard_error);
    bali_json_end_object(json);
}

static void put_likelihood(bali_json *json, const char *key, double log_likelihood, double records) {
    bali_json_object(json, key);
    bali_json_number(json, "log_likelihood", log_likelihood);
    bali_json_number(json, "per_record", records > 0 ? log_likelihood / records : NAN);
}

static void put_heldout(bali_json *json, const bal_heldout *h, const bal_heldout_options *options) {
    static const char *const methods[] = {"folds", "fold-column", "holdout", "test"};
    bool parts = options->method == BAL_HELDOUT_FOLDS || options->method == BAL_HELDOUT_GROUPS;
    bali_json_object(json, "heldout");
    bali_json_string(json, "method", methods[options->method]);
    if (parts) {
        bali_json_whole(json, "folds", h->parts);
    } else {
        bali_json_null(json, "folds");
    }
    bali_json_whole(json, "repeats", options->repeats);
    bali_json_number(json, "records", h->records);
    bali_json_number(json, "incomplete", h->incomplete);
    put_likelihood(json, "bayes", h->bayes_log_likelihood, h->records);
    bali_json_number(json, "impossible", h->bayes_impossible);
    bali_json_end_object(json);
    bali_json_object(json, "ml");
    bali_json_number(json, "log_likelihood", h->ml_log_likelihood);
    bali_json_number(json, "impossible", h->impossible);
    bali_json_number(json, "undefined", h->undefined);
    bali_json_end_object(json);
    put_likelihood(json, "prior_only", h->prior_log_likelihood, h->records);
    bali_json_end_object(json);
    put_paired(json, "comparable", &h->comparable, &h->on_comparable);
    bali_json_object(json, "others");
    bali_json_number(json, "records", h->impossible + h->undefined);
    bali_json_number(json, "bayes", h->bayes_on_others);
    bali_json_number(json, "break_even", h->break_even);
    bali_json_end_object(json);
    put_paired(json, "quadratic", NULL, &h->quadratic);
    bali_json_object(json, "strength"); /* of the prior, settled in each training part */
    bali_json_number(json, "least", h->least_strength);
    bali_json_number(json, "largest", h->largest_strength);
    bali_json_end_object(json);
    bali_json_end_object(json);
}

/* Room for the numbers of one row. */
typedef struct row_room {
    double *post, *ml, *low, *high;
    bali_intervals *intervals;
} row_room;

static bal_status put_row(bali_json *json, const bali_fit_facts *facts, size_t v, size_t row, row_room *room, bal_error *err) {
    const bal_network *network = bal_document_network(facts->document);
    size_t r = bal_network_outcomes(network, v);
    const double *n = bal_cells_family(facts->fit->counts, v) + row * r;
    const double *alpha = bal_cells_family(facts->fit->pseudo_counts, v) + row * r;
    double records = bali_row_sum(n, r), pseudo_records = bali_row_sum(alpha, r);
    for (size_t k = 0; k < r; k++) {
        room->post[k] = alpha[k] + n[k];
        room->ml[k] = records > 0 ? n[k] / records : NAN;
    }
    bal_status status = bali_intervals_row(room->intervals, room->post, r, room->low, room->high, err);
    if (status != BAL_OK) return status;
    bali_json_object(json, NULL);
    bali_json_given(json, "given", network, v, row);
    bali_json_number(json, "total", records);
    bali_json_string(json, "basis", bal_basis_name(bal_row_basis(records)));
    bali_json_numbers(json, "counts", n, r);
    bali_json_numbers(json, "pseudo_counts", alpha, r);
    bali_json_numbers(json, "mean", bal_cells_family(facts->fit->mean, v) + row * r, r);
    if (records > 0) {
        bali_json_numbers(json, "ml", room->ml, r);
    } else {
        bali_json_null(json, "ml");
    }
    bali_json_numbers(json, "low", room->low, r);
    bali_json_numbers(json, "high", room->high, r);
    bali_json_number(json, "data_share", bal_data_share(pseudo_records, records));
    bali_json_null(json, "conflict");
    bali_json_end_object(json);
    return BAL_OK;
}

static bal_status put_family(bali_json *json, const bali_fit_facts *facts, size_t v, row_room *room, bal_error *err) {
    const bal_network *network = bal_document_network(facts->document);
    const bal_domain *domain = bal_network_domain(network);
    size_t n_parents;
    const size_t *parents = bal_network_parents(network, v, &n_parents);
    bal_status status = BAL_OK;
    bali_json_object(json, NULL);
    bali_json_string(json, "variable", bal_domain_name(domain, v));
    bali_json_array(json, "parents");
    for (size_t p = 0; p < n_parents; p++) bali_json_string(json, NULL, bal_domain_name(domain, parents[p]));
    bali_json_end_array(json);
    bali_json_array(json, "outcomes");
    for (size_t k = 0; k < bal_domain_outcomes(domain, v); k++) bali_json_string(json, NULL, bal_domain_outcome(domain, v, k));
    bali_json_end_array(json);
    bali_json_boolean(json, "recorded", !bali_is_unrecorded(facts->data, network, v));
    bali_json_number(json, "log_marginal_likelihood", facts->fit->family_scores[v]);
    bali_json_array(json, "rows");
    for (size_t row = 0; row < bal_network_rows(network, v) && status == BAL_OK; row++) status = put_row(json, facts, v, row, room, err);
    bali_json_end_array(json);
    bali_json_end_object(json);
    if (status != BAL_OK) bal_error_context(err, 0, bal_domain_name(domain, v));
    return status;
}

static bal_status put_families(bali_json *json, const bali_fit_facts *facts, bal_error *err) {
    const bal_network *network = bal_document_network(facts->document);
    size_t widest = 1, n = bal_network_variables(network);
    for (size_t v = 0; v < n; v++)
        if (bal_network_outcomes(network, v) > widest) widest = bal_network_outcomes(network, v);
    double *numbers = bali_allocate(widest, 4 * sizeof *numbers);
    bali_intervals *intervals = bali_allocate(1, sizeof *intervals);
    bal_status status = numbers && intervals ? BAL_OK : bali_out_of_memory(err);
    bali_json_array(json, "families");
    if (status == BAL_OK) {
        intervals->level = facts->level;
        row_room room = {numbers, numbers + widest, numbers + 2 * widest, numbers + 3 * widest, intervals};
        for (size_t v = 0; v < n && status == BAL_OK; v++) status = put_family(json, facts, v, &room, err);
    }
    bali_json_end_array(json);
    bali_free(numbers);
    bali_free(intervals);
    return status;
}

bal_status bali_fit_json(const bali_fit_facts *facts, bali_json *json, bal_error *err) {
    bali_json_object(json, NULL);
    bali_json_head(json, "fit", facts->document, facts->fit->pseudo_counts, facts->data, true);
    put_prior(json, facts);
    bali_json_string(json, "estimate", facts->maximum_likelihood ? "ml" : "mean");
    bali_json_number(json, "level", facts->level);
    put_scores(json, facts);
    if (facts->heldout) {
        put_heldout(json, facts->heldout, facts->heldout_options);
    } else {
        bali_json_null(json, "heldout");
    }
    bal_status status = put_families(json, facts, err);
    bali_json_end_object(json);
    if (status == BAL_OK && json->text.failed) status = bali_out_of_memory(err);
    return status;
}
