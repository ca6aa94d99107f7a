#include "ballast/fit.h"

#include "base/mathematics.h"
#include "base/memory.h"
#include "ballast/posterior.h"
#include "ballast/tally.h"
#include "model/cells.h"

#include <math.h>

static bal_status score_families(bal_fit *fit, bal_error *err) {
    size_t n = bal_network_variables(bal_cells_network(fit->counts));
    bool whole = bali_cells_are_whole(fit->counts); /* else there is no record to leave out */
    bali_sum marginal = {0}, left_out = {0};
    for (size_t v = 0; v < n; v++) {
        double score = NAN;
        bal_status status = bal_log_marginal_likelihood(fit->pseudo_counts, fit->counts, v, &fit->family_scores[v], err);
        if (status == BAL_OK && whole) status = bal_leave_one_out(fit->pseudo_counts, fit->counts, v, &score, err);
        if (status != BAL_OK) return status;
        bali_sum_add(&marginal, fit->family_scores[v]);
        bali_sum_add(&left_out, score);
    }
    fit->scores = (bal_scores){bali_sum_value(&marginal), bali_sum_value(&left_out)};
    return BAL_OK;
}

bal_status bal_fit_create(const bal_prior *prior, const bal_cells *counts, bal_fit **out, bal_error *err) {
    *out = NULL;
    const bal_network *network = bal_cells_network(counts);
    bal_fit *fit = bali_allocate(1, sizeof *fit);
    if (!fit) return bali_out_of_memory(err);
    fit->family_scores = bali_allocate(bal_network_variables(network), sizeof *fit->family_scores);
    bal_status status = fit->family_scores ? bal_prior_check(prior, counts, NULL, err) : bali_out_of_memory(err);
    if (status == BAL_OK) status = bal_cells_copy(counts, &fit->counts, err);
    if (status == BAL_OK) status = bal_cells_create(network, &fit->pseudo_counts, err);
    if (status == BAL_OK) status = bal_cells_create(network, &fit->mean, err);
    if (status == BAL_OK) status = bal_prior_settle(prior, counts, &fit->strength, err);
    if (status == BAL_OK) {
        bal_prior_fill(prior, fit->strength.value, fit->pseudo_counts);
        bal_posterior_mean(fit->pseudo_counts, counts, fit->mean);
        fit->records = bal_tally_records(counts);
        status = score_families(fit, err);
    }
    if (status == BAL_OK) {
        *out = fit;
    } else {
        bal_fit_free(fit);
    }
    return status;
}

void bal_fit_free(bal_fit *fit) {
    if (!fit) return;
    bal_cells_free(fit->counts);
    bal_cells_free(fit->pseudo_counts);
    bal_cells_free(fit->mean);
    bali_free(fit->family_scores);
    bali_free(fit);
}

/* The prior of a kind as it would be tried; false when it cannot serve here. */
static bool options_of(bal_prior_kind kind, const bal_prior_options *expert, bal_prior_options *options) {
    *options = bal_prior_options_defaults();
    options->kind = kind;
    if (kind != BAL_PRIOR_BDEU) options->choice = BAL_STRENGTH_GIVEN;
    if (kind == BAL_PRIOR_CARRIED) return false; /* there is one only where it is asked for */
    if (kind != BAL_PRIOR_EXPERT) return true;
    if (!expert) return false;
    options->expert = expert->expert;
    options->row_ess = expert->row_ess;
    options->floor = expert->floor;
    return true;
}

/* Scores one kind; *served is false when the expert's tables cannot serve or the counts contradict them. */
static bal_status try_prior(const bal_network *network, const bal_cells *counts, const bal_prior_options *options, bal_other_prior *out,
                            bool *served, bal_error *err) {
    bal_prior *prior = NULL;
    bal_fit *fit = NULL;
    bal_error own = {0};
    bal_status status = bal_prior_create(network, options, &prior, &own);
    if (status == BAL_OK) status = bal_fit_create(prior, counts, &fit, &own);
    *served = status == BAL_OK;
    if (*served) *out = (bal_other_prior){options->kind, fit->strength.value, fit->scores.leave_one_out};
    bal_fit_free(fit);
    bal_prior_free(prior);
    if (*served || status == BAL_ERR_DATA || status == BAL_ERR_ARGUMENT) return BAL_OK;
    return bal_error_set(err, status, own.code, "%s", own.message);
}

bal_status bal_other_priors(const bal_network *network, const bal_cells *counts, bal_prior_kind used, const bal_prior_options *expert,
                            bal_other_prior *out, size_t *n, bal_error *err) {
    *n = 0;
    bal_status status = BAL_OK;
    for (bal_prior_kind kind = 0; kind < BAL_PRIOR_KINDS && status == BAL_OK; kind++) {
        bal_prior_options options;
        bool served = false;
        if (kind == used || !options_of(kind, expert, &options)) continue;
        status = try_prior(network, counts, &options, &out[*n], &served, err);
        *n += served;
    }
    return status;
}
