#include "ballast/fit.h"

#include "ballast/posterior.h"
#include "ballast/tally.h"
#include "model/cells.h"
#include "model/document.h"
#include "support/fixtures.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

typedef struct random_case {
    bal_network *network;
    bal_cells *tables, *counts;
    bal_document *expert;
} random_case;

static void set_up(random_case *c, int seed) {
    dice d = dice_of(seed);
    c->network = random_network(&d, 5, 2, 3, 2);
    c->tables = random_tables(&d, c->network, 0);
    int *codes = random_codes(&d, c->tables, 60, 0);
    c->counts = counts_of(c->network, codes, 60);
    free(codes);
    ck_assert_int_eq(bal_document_create(c->network, NULL, &c->expert, NULL), BAL_OK);
    ck_assert_int_eq(bal_document_set_cells(c->expert, BAL_CARRIED_TABLES, c->tables, NULL), BAL_OK);
}

static void tear_down(random_case *c) {
    bal_cells_free(c->tables);
    bal_cells_free(c->counts);
    bal_document_free(c->expert);
    bal_network_free(c->network);
}

static bool same(const bal_cells *a, const bal_cells *b) {
    return memcmp(bali_cells_values(a), bali_cells_values(b), bal_network_cells(bal_cells_network(a)) * sizeof(double)) == 0;
}

static bal_fit *fit_of(const bal_prior *prior, const bal_cells *counts) {
    bal_fit *fit;
    bal_error err = {0};
    ck_assert_msg(bal_fit_create(prior, counts, &fit, &err) == BAL_OK, "%s", err.message);
    return fit;
}

START_TEST(a_fit_is_its_parts) {
    random_case c;
    set_up(&c, _i);
    bal_prior *prior = open_prior(c.network, BAL_PRIOR_BDEU, BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD);
    bal_fit *fit = fit_of(prior, c.counts);
    bal_strength strength;
    bal_cells *alpha = equal_cells(c.network, 0), *mean = equal_cells(c.network, 0);
    ck_assert_int_eq(bal_prior_settle(prior, c.counts, &strength, NULL), BAL_OK);
    bal_prior_fill(prior, strength.value, alpha);
    bal_posterior_mean(alpha, c.counts, mean);
    bal_scores scores;
    ck_assert_int_eq(bal_score(alpha, c.counts, &scores, NULL), BAL_OK);

    ck_assert(same(fit->counts, c.counts) && fit->counts != c.counts);
    ck_assert(same(fit->pseudo_counts, alpha));
    ck_assert(same(fit->mean, mean));
    ck_assert_double_eq(fit->strength.value, strength.value);
    ck_assert_double_eq(fit->scores.log_marginal_likelihood, scores.log_marginal_likelihood);
    ck_assert_double_eq(fit->scores.leave_one_out, scores.leave_one_out);
    ck_assert_double_eq(fit->records, 60);
    for (size_t v = 0; v < bal_network_variables(c.network); v++) {
        double score;
        ck_assert_int_eq(bal_log_marginal_likelihood(alpha, c.counts, v, &score, NULL), BAL_OK);
        ck_assert_double_eq(fit->family_scores[v], score);
    }
    bal_fit_free(fit);
    bal_fit_free(NULL);
    bal_cells_free(alpha);
    bal_cells_free(mean);
    bal_prior_free(prior);
    tear_down(&c);
}
END_TEST

START_TEST(counts_the_prior_calls_impossible_are_refused) {
    bal_network *network = network_of("A:#2 ; B:#2 | A");
    bal_cells *tables = cells_of(network, (const double[]){0.5, 0.5, 1, 0, 0.5, 0.5}), *counts = equal_cells(network, 1);
    bal_prior *prior = expert_prior(tables, 5, 0, 1);
    bal_fit *fit = (bal_fit *)prior;
    bal_error err = {0};
    ck_assert_int_eq(bal_fit_create(prior, counts, &fit, &err), BAL_ERR_DATA);
    ck_assert_ptr_null(fit);
    ck_assert_str_eq(err.code, "structural-zero");
    ck_assert_str_eq(err.variable, "B");
    bal_prior_free(prior);
    bal_cells_free(tables);
    bal_cells_free(counts);
    bal_network_free(network);
}
END_TEST

/* A structural zero that no record contradicts: mean 0, and the rest of its row shares all. */
START_TEST(a_structural_zero_stays_zero) {
    bal_network *network = network_of("A:#3");
    bal_cells *tables = cells_of(network, (const double[]){0.5, 0, 0.5}), *counts = cells_of(network, (const double[]){3, 0, 1});
    bal_prior *prior = expert_prior(tables, 8, 0, 1);
    bal_fit *fit = fit_of(prior, counts);
    ck_assert_double_eq(bali_cells_values(fit->mean)[0], 7.0 / 12);
    ck_assert_double_eq(bali_cells_values(fit->mean)[1], 0);
    ck_assert_double_eq(bali_cells_values(fit->mean)[2], 5.0 / 12);
    bal_fit_free(fit);
    bal_prior_free(prior);
    bal_cells_free(tables);
    bal_cells_free(counts);
    bal_network_free(network);
}
END_TEST

/* Counts that are not whole hold no record to leave out: every other number is there, and a strength cannot be chosen that way. */
START_TEST(fractions_of_records_cannot_be_left_out) {
    random_case c;
    set_up(&c, _i);
    bal_prior *prior = open_prior(c.network, BAL_PRIOR_BDEU, BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD);
    bal_prior *by_leave_one_out = open_prior(c.network, BAL_PRIOR_BDEU, BAL_STRENGTH_BY_LEAVE_ONE_OUT);
    bal_cells_edit(c.counts, 0)[0] += _i % 2 ? 0x1p-32 : 0.5;
    bal_fit *fit = fit_of(prior, c.counts);
    ck_assert(isnan(fit->scores.leave_one_out) && isfinite(fit->scores.log_marginal_likelihood));
    double sum = 0;
    for (size_t v = 0; v < bal_network_variables(c.network); v++) sum += fit->family_scores[v];
    ck_assert(near(fit->scores.log_marginal_likelihood, sum, 1e-13));
    bal_fit_free(fit);

    bal_other_prior others[BAL_PRIOR_KINDS];
    bal_prior_options options = {.kind = BAL_PRIOR_EXPERT, .strength = 1, .expert = c.expert, .row_ess = 9};
    size_t n;
    ck_assert_int_eq(bal_other_priors(c.network, c.counts, BAL_PRIOR_BDEU, &options, others, &n, NULL), BAL_OK);
    ck_assert_uint_eq(n, 3);
    for (size_t i = 0; i < n; i++) ck_assert(isnan(others[i].leave_one_out));

    bal_error err = {0};
    ck_assert_int_eq(bal_fit_create(by_leave_one_out, c.counts, &fit, &err), BAL_ERR_DATA);
    ck_assert_str_eq(err.code, "fractional-weight");
    ck_assert_ptr_null(fit);
    bal_prior_free(prior);
    bal_prior_free(by_leave_one_out);
    tear_down(&c);
}
END_TEST

/* The sum of ln (alpha + n) / (alpha_row + n_row) over records that come one after another: what each was given when it came. */
static double one_step_predictions(const bal_network *network, const bal_cells *alpha, const bal_cells *earlier, const int *codes, size_t n_records) {
    size_t n = bal_network_variables(network);
    double sum = 0;
    bal_cells *seen = equal_cells(network, 0);
    bali_cells_assign(seen, earlier);
    for (size_t i = 0; i < n_records; i++)
        for (size_t v = 0; v < n; v++) {
            size_t cell = cell_of(network, v, codes + i * n), r = bal_network_outcomes(network, v), row = cell / r * r;
            const double *a = bal_cells_family(alpha, v);
            double *count = bal_cells_edit(seen, v);
            sum += log((a[cell] + count[cell]) / (bali_row_sum(a + row, r) + bali_row_sum(count + row, r)));
            count[cell] += 1;
        }
    bal_cells_free(seen);
    return sum;
}

/* New records given old ones: the difference of the two log marginal likelihoods under a carried prior (Dawid 1984), also where the
 * old counts were halved (the power prior of Ibrahim & Chen 2000). Tables of old and new are those of one batch. */
START_TEST(new_records_are_predicted_from_the_old) {
    random_case c;
    set_up(&c, _i);
    dice d = dice_of(_i + 40);
    int *codes = random_codes(&d, c.tables, 30, 0);
    bal_cells *alpha = random_tables(&d, c.network, 0), *more = counts_of(c.network, codes, 30);
    bal_prior *prior = carried_prior(alpha);
    for (size_t c_at = 0; c_at < bal_network_cells(c.network) && _i % 2; c_at++) bali_cells_all(c.counts)[c_at] *= 0.5;
    bal_fit *before = fit_of(prior, c.counts);
    bali_cells_add(more, c.counts);
    bal_fit *after = fit_of(prior, more);
    double got = after->scores.log_marginal_likelihood - before->scores.log_marginal_likelihood;
    ck_assert(near(got, one_step_predictions(c.network, alpha, c.counts, codes, 30), 1e-12));
    ck_assert(same(after->pseudo_counts, alpha));
    bal_fit_free(before);
    bal_fit_free(after);
    bal_prior_free(prior);
    bal_cells_free(alpha);
    bal_cells_free(more);
    free(codes);
    tear_down(&c);
}
END_TEST

static bal_prior_options expert_options(const random_case *c, double row_ess) {
    return (bal_prior_options){.kind = BAL_PRIOR_EXPERT, .strength = 1, .expert = c->expert, .row_ess = row_ess};
}

/* Each other prior is what a fit under it gives. */
START_TEST(other_priors_are_fits_of_their_own) {
    random_case c;
    set_up(&c, 3);
    bal_prior_options options = expert_options(&c, 9);
    for (bal_prior_kind used = BAL_PRIOR_BDEU; used <= BAL_PRIOR_EXPERT; used++) {
        bal_other_prior others[BAL_PRIOR_KINDS];
        size_t n = 99;
        ck_assert_int_eq(bal_other_priors(c.network, c.counts, used, &options, others, &n, NULL), BAL_OK);
        ck_assert_uint_eq(n, 3);
        for (size_t i = 0; i < n; i++) {
            bal_prior_kind kind = (bal_prior_kind)(i < used ? i : i + 1);
            ck_assert_int_eq(others[i].kind, kind);
            bal_prior *prior = kind == BAL_PRIOR_EXPERT ? prior_of(c.network, &options)
                               : kind == BAL_PRIOR_BDEU ? open_prior(c.network, kind, BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD)
                                                        : simple_prior(c.network, kind, 1);
            bal_fit *fit = fit_of(prior, c.counts);
            ck_assert_double_eq(others[i].leave_one_out, fit->scores.leave_one_out);
            ck_assert_double_eq(others[i].strength, fit->strength.value);
            bal_fit_free(fit);
            bal_prior_free(prior);
        }
    }
    tear_down(&c);
}
END_TEST

/* An expert who cannot serve is left out in silence: no options, no row ESS, zeros where records are. */
START_TEST(an_expert_who_cannot_serve_is_left_out) {
    random_case c;
    set_up(&c, 4);
    bal_other_prior others[BAL_PRIOR_KINDS];
    size_t n;
    ck_assert_int_eq(bal_other_priors(c.network, c.counts, BAL_PRIOR_BDEU, NULL, others, &n, NULL), BAL_OK);
    ck_assert_uint_eq(n, 2);
    bal_prior_options options = expert_options(&c, 0);
    bal_error err = {0};
    ck_assert_int_eq(bal_other_priors(c.network, c.counts, BAL_PRIOR_BDEU, &options, others, &n, &err), BAL_OK);
    ck_assert_uint_eq(n, 2);
    ck_assert_int_eq(err.status, BAL_OK);

    bal_cells *zeros = equal_cells(c.network, 0);
    for (size_t v = 0; v < bal_network_variables(c.network); v++)
        for (size_t row = 0; row < bal_network_rows(c.network, v); row++)
            bal_cells_edit(zeros, v)[row * bal_network_outcomes(c.network, v)] = 1;
    ck_assert_int_eq(bal_document_set_cells(c.expert, BAL_CARRIED_TABLES, zeros, NULL), BAL_OK);
    options = expert_options(&c, 9);
    ck_assert_int_eq(bal_other_priors(c.network, c.counts, BAL_PRIOR_BDEU, &options, others, &n, &err), BAL_OK);
    ck_assert_uint_eq(n, 2);
    bal_cells_free(zeros);
    tear_down(&c);
}
END_TEST

static bal_status fit_and_free(void *context, bal_error *err) {
    const random_case *c = context;
    bal_prior_options options = bal_prior_options_defaults();
    bal_prior *prior = NULL;
    bal_fit *fit = NULL;
    bal_status status = bal_prior_create(c->network, &options, &prior, err);
    if (status == BAL_OK) {
        fit = (bal_fit *)prior;
        status = bal_fit_create(prior, c->counts, &fit, err);
        if (status != BAL_OK) ck_assert_ptr_null(fit);
    }
    bal_fit_free(fit);
    bal_prior_free(prior);
    return status;
}

static bal_status compare_others(void *context, bal_error *err) {
    const random_case *c = context;
    bal_prior_options options = expert_options(c, 9);
    bal_other_prior others[BAL_PRIOR_KINDS];
    size_t n;
    return bal_other_priors(c->network, c->counts, BAL_PRIOR_K2, &options, others, &n, err);
}

START_TEST(a_fit_survives_failing_allocations) {
    random_case c;
    set_up(&c, 5);
    ck_assert_uint_ge(survive_allocations(fit_and_free, &c), 8);
    ck_assert_uint_ge(survive_allocations(compare_others, &c), 20);
    tear_down(&c);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("fit");
    TCase *c = tcase_create("fit");
    tcase_add_loop_test(c, a_fit_is_its_parts, 1, 6);
    tcase_add_test(c, counts_the_prior_calls_impossible_are_refused);
    tcase_add_test(c, a_structural_zero_stays_zero);
    tcase_add_loop_test(c, fractions_of_records_cannot_be_left_out, 1, 5);
    tcase_add_loop_test(c, new_records_are_predicted_from_the_old, 1, 9);
    tcase_add_test(c, other_priors_are_fits_of_their_own);
    tcase_add_test(c, an_expert_who_cannot_serve_is_left_out);
    tcase_add_test(c, a_fit_survives_failing_allocations);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
