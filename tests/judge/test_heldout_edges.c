#include "support/heldout_trial.h"

#include <math.h>
#include <stdlib.h>
#include <time.h>

/* ---- by hand ---- */

/* Four folds of four records: each is predicted by the three others. K2, A and B apart.
 *
 *   A = 0 0 1 0, B = 0 1 1 2. Left out:  A: Bayes 3/5 3/5 1/5 3/5, ML 2/3 2/3 0 2/3.  B: Bayes 1/6 2/6 2/6 1/6, ML 0 1/3 1/3 0. */
START_TEST(a_table_by_hand) {
    static int codes[] = {0, 0, 0, 1, 1, 1, 0, 2};
    trial t = {.network = network_of("A:#2 ; B:#3"), .codes = codes, .n_records = 4, .options = folds_options(4, 1), .places = {0, 1, 2, 3}};
    bal_prior *prior = simple_prior(t.network, BAL_PRIOR_K2, 1);
    t.prior = prior;
    bal_heldout out = trial_run(&t);
    ck_assert(out.records == 4 && out.impossible == 3 && out.undefined == 0 && out.comparable == 1);
    double total = log(3.0 / 30) + log(6.0 / 30) + log(2.0 / 30) + log(3.0 / 30);
    ck_assert(trial_close(out.bayes_log_likelihood, total));
    ck_assert(trial_close(out.prior_log_likelihood, 4 * log(1.0 / 6)));
    ck_assert(out.ml_log_likelihood == -INFINITY);
    ck_assert(trial_close(out.on_comparable.bayes, log(6.0 / 30)) && trial_close(out.on_comparable.ml, log(2.0 / 9)));
    ck_assert(trial_close(out.on_comparable.mean_difference, log(0.9)) && isnan(out.on_comparable.standard_error));
    ck_assert(trial_close(out.bayes_on_others, (total - log(6.0 / 30)) / 3));
    ck_assert(trial_close(out.break_even, (total - log(2.0 / 9)) / 3));
    /* A: Bayes 2 (2/5)^2 thrice, 2 (4/5)^2 once; ML 2 (1/3)^2 thrice, 2 once.  B, in 36ths: the three left have counts 0 2 1, 1 1 1, 1 1 1,
     * 1 2 0; Bayes 25 + 9 + 4, 4 + 16 + 4, 4 + 16 + 4, 4 + 9 + 25; ML 1 + 4/9 + 1/9, 2/3, 2/3, 1/9 + 4/9 + 1. */
    ck_assert(trial_close(out.quadratic.bayes, ((3 * 8.0 + 32) / 25 + (38.0 + 24 + 24 + 38) / 36) / 4));
    ck_assert(trial_close(out.quadratic.ml, (3 * 2.0 / 9 + 2 + 2 * 14.0 / 9 + 2 * 2.0 / 3) / 4));
    bal_prior_free(prior);
    bal_network_free(t.network);
}
END_TEST

/* Two records, each the other's training part: in A the first is impossible, in B | A its row is without records. */
START_TEST(impossible_goes_before_undefined) {
    static int codes[] = {0, 0, 1, 1};
    trial t = {.network = network_of("A:#2 ; B:#2 | A"), .codes = codes, .n_records = 2, .options = folds_options(2, 1), .places = {0, 1}};
    bal_prior *prior = simple_prior(t.network, BAL_PRIOR_K2, 1);
    t.prior = prior;
    bal_heldout out = trial_run(&t);
    ck_assert(out.impossible == 2 && out.undefined == 0 && out.comparable == 0);
    ck_assert(out.ml_log_likelihood == -INFINITY);
    ck_assert(isnan(out.on_comparable.bayes) && isnan(out.on_comparable.mean_difference));
    ck_assert(trial_close(out.bayes_log_likelihood, 2 * log(1.0 / 3 * 1 / 2)) && trial_close(out.break_even, out.bayes_on_others));
    bal_prior_free(prior);
    bal_network_free(t.network);
}
END_TEST

START_TEST(undefined_alone_leaves_ml_without_a_total) {
    static int codes[] = {0};
    trial t = {.network = network_of("A:#2"), .codes = codes, .n_records = 1, .options = folds_options(10, 1)};
    bal_prior *prior = simple_prior(t.network, BAL_PRIOR_K2, 1);
    t.prior = prior;
    bal_heldout out = trial_run(&t);
    ck_assert(out.records == 1 && out.undefined == 1 && out.impossible == 0);
    ck_assert(isnan(out.ml_log_likelihood));
    ck_assert(trial_close(out.bayes_log_likelihood, log(0.5)) && trial_close(out.quadratic.ml, 0.5)); /* ML taken as uniform */
    bal_prior_free(prior);
    bal_network_free(t.network);
}
END_TEST

/* Variables, outcomes and parents the other way round: the folds are of records, so nothing changes but last bits. */
START_TEST(the_order_of_variables_and_outcomes_does_not_matter) {
    trial t, other;
    bal_heldout_options options = folds_options(7, 2);
    trial_set_up(&t, _i, 100, 0.02, 0, &options);
    other = t;
    other.network = reversed_network(t.network);
    other.codes = reversed_codes(t.network, t.codes, t.n_records);
    bal_prior *prior = open_prior(t.network, BAL_PRIOR_BDEU, BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD);
    bal_prior *prior_reversed = open_prior(other.network, BAL_PRIOR_BDEU, BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD);
    t.prior = prior;
    other.prior = prior_reversed;
    bal_heldout one = trial_run(&t), two = trial_run(&other);
    trial_check(&two, &one, _i);
    bal_prior_free(prior);
    bal_prior_free(prior_reversed);
    trial_tear_down(&other);
    trial_tear_down(&t);
}
END_TEST

/* As many folds as there may be, of a large table and few records: seconds would mean that empty folds are fitted too. */
START_TEST(empty_folds_cost_nothing) {
    bal_network *network = network_of("A:#50 ; B:#50 | A");
    static const int codes[] = {0, 1, 2, 3, 4, 5};
    bal_prior *prior = open_prior(network, BAL_PRIOR_BDEU, BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD);
    bal_cells *counts = counts_of(network, codes, 3);
    bal_source *source = plain_source(network, codes, 3);
    bal_heldout_options options = bal_heldout_options_defaults();
    options.folds = BAL_HELDOUT_MOST_FOLDS;
    bal_heldout out;
    clock_t start = clock();
    ck_assert_int_eq(bal_heldout_run(prior, counts, source, &options, &out, NULL), BAL_OK);
    ck_assert_msg((double)(clock() - start) / CLOCKS_PER_SEC < 1, "%g s", (double)(clock() - start) / CLOCKS_PER_SEC);
    ck_assert(out.records == 3);
    bal_source_free(source);
    bal_cells_free(counts);
    bal_prior_free(prior);
    bal_network_free(network);
}
END_TEST

/* ---- refusals ---- */

START_TEST(ten_folds_and_seed_1_are_the_defaults) {
    bal_heldout_options options = bal_heldout_options_defaults();
    ck_assert(options.folds == 10 && options.seed == 1 && options.threads == 1 && options.prediction_bytes == 268435456);
}
END_TEST

static const struct {
    bal_heldout_method method;
    size_t folds, repeats;
    double fraction;
    size_t groups;
    bal_status status;
    const char *code;
} wishes[] = {
    {BAL_HELDOUT_FOLDS, 0, 1, 0.2, 0, BAL_ERR_ARGUMENT, "bad-folds"},
    {BAL_HELDOUT_FOLDS, 1, 1, 0.2, 0, BAL_ERR_ARGUMENT, "bad-folds"},
    {BAL_HELDOUT_FOLDS, 2, 1, NAN, 0, BAL_OK, ""}, /* what does not matter is not looked at */
    {BAL_HELDOUT_FOLDS, 1000, 1, 0.2, 0, BAL_OK, ""},
    {BAL_HELDOUT_FOLDS, 65536, 1, 0.2, 0, BAL_ERR_ARGUMENT, "bad-folds"},
    {BAL_HELDOUT_FOLDS, SIZE_MAX, 1, 0.2, 0, BAL_ERR_ARGUMENT, "bad-folds"},
    {BAL_HELDOUT_FOLDS, 2, 0, 0.2, 0, BAL_ERR_ARGUMENT, "bad-repeats"},
    {BAL_HELDOUT_GROUPS, 0, 1, 0.2, 0, BAL_ERR_DATA, "bad-groups"},
    {BAL_HELDOUT_GROUPS, 0, 1, 0.2, 1, BAL_ERR_DATA, "bad-groups"},
    {BAL_HELDOUT_GROUPS, 0, 1, 0.2, 2, BAL_OK, ""},
    {BAL_HELDOUT_GROUPS, 0, 1, 0.2, 65536, BAL_ERR_DATA, "bad-groups"},
    {BAL_HELDOUT_HOLDOUT, 0, 1, 0, 0, BAL_ERR_ARGUMENT, "bad-fraction"},
    {BAL_HELDOUT_HOLDOUT, 0, 1, -0.5, 0, BAL_ERR_ARGUMENT, "bad-fraction"},
    {BAL_HELDOUT_HOLDOUT, 0, 1, 1, 0, BAL_ERR_ARGUMENT, "bad-fraction"},
    {BAL_HELDOUT_HOLDOUT, 0, 1, NAN, 0, BAL_ERR_ARGUMENT, "bad-fraction"},
    {BAL_HELDOUT_HOLDOUT, 0, 1, 0x1p-1074, 0, BAL_OK, ""},
    {BAL_HELDOUT_TEST, 0, 1, NAN, 0, BAL_OK, ""},
};

START_TEST(wishes_out_of_range_are_refused) {
    trial t;
    bal_heldout_options options = folds_options(wishes[_i].folds, wishes[_i].repeats);
    options.method = wishes[_i].method;
    options.fraction = wishes[_i].fraction;
    trial_set_up(&t, 1, 10, 0, 0, &options);
    t.n_groups = wishes[_i].groups;
    if (options.method == BAL_HELDOUT_TEST) t.earlier = trial_other_counts(&t, 1, 10);
    bal_prior *prior = simple_prior(t.network, BAL_PRIOR_K2, 1);
    t.prior = prior;
    bal_heldout out;
    bal_error err = {0};
    ck_assert_msg(trial_try(&t, 1, 0, &out, &err) == wishes[_i].status, "%d: %s", _i, err.message);
    ck_assert_str_eq(err.code ? err.code : "", wishes[_i].code);
    bal_prior_free(prior);
    trial_tear_down(&t);
}
END_TEST

/* Records that a summary counts beyond 10^8, a weight that is not whole, records held out that were never counted. */
static const struct {
    uint64_t all_places;
    double weights[3], counts[2];
    bal_status status;
    const char *code;
} tables[] = {
    {0, {1, 1, 1}, {3, 0}, BAL_OK, ""},
    {BAL_HELDOUT_MOST_RECORDS, {1, 1, 1}, {3, 0}, BAL_OK, ""},
    {BAL_HELDOUT_MOST_RECORDS + 1, {1, 1, 1}, {3, 0}, BAL_ERR_DATA, "too-many-held-out"},
    {0, {1, 0.5, 1}, {2.5, 0}, BAL_ERR_DATA, "fractional-weight"},
    {0, {1, 1, 1}, {0, 3}, BAL_ERR_DATA, "changed-while-read"},
    {0, {2, 1, 1}, {0, 0}, BAL_ERR_DATA, "changed-while-read"},
};

START_TEST(tables_that_cannot_be_held_out_are_refused) {
    bal_network *network = network_of("A:#2");
    bal_cells *counts = cells_of(network, tables[_i].counts);
    bal_prior *prior = simple_prior(network, BAL_PRIOR_K2, 1);
    static const int codes[] = {0, 0, 0};
    fixture_table table = {.codes = codes, .n_records = 3, .weights = tables[_i].weights, .all_places = tables[_i].all_places};
    bal_source *source = source_of(bal_network_domain(network), &table);
    bal_heldout_options options = bal_heldout_options_defaults();
    bal_heldout out;
    bal_error err = {0};
    ck_assert_int_eq(bal_heldout_run(prior, counts, source, &options, &out, &err), tables[_i].status);
    ck_assert_str_eq(err.code ? err.code : "", tables[_i].code);
    bal_source_free(source);
    bal_prior_free(prior);
    bal_cells_free(counts);
    bal_network_free(network);
}
END_TEST

START_TEST(what_the_source_meets_ends_it) {
    bal_network *network = network_of("A:#2");
    static const int codes[] = {0, 1, 0};
    bal_prior *prior = simple_prior(network, BAL_PRIOR_K2, 1);
    for (size_t fail_at = 1; fail_at <= 9; fail_at++) {
        bal_cells *counts = counts_of(network, codes, 3);
        fixture_table table = {.codes = codes, .n_records = 3, .block_records = 1, .fail_at = fail_at, .pipe = fail_at == 5};
        bal_source *source = source_of(bal_network_domain(network), &table);
        bal_heldout_options options = bal_heldout_options_defaults();
        bal_heldout out;
        bal_error err = {0};
        bal_status status = bal_heldout_run(prior, counts, source, &options, &out, &err);
        ck_assert_int_eq(status, fail_at < 9 ? BAL_ERR_IO : BAL_OK); /* two passes of four blocks */
        if (status != BAL_OK) ck_assert_str_eq(err.code, table.pipe ? "cannot-reread" : "cannot-read");
        bal_source_free(source);
        bal_cells_free(counts);
    }
    bal_prior_free(prior);
    bal_network_free(network);
}
END_TEST

typedef struct holding {
    const trial *trial;
    const bal_cells *counts;
    bal_source *source;
    unsigned threads;
} holding;

static bal_status hold_out_in_batches(void *context, bal_error *err) {
    const holding *h = context;
    bal_heldout_options options = h->trial->options;
    options.threads = h->threads;
    options.prediction_bytes = 5000;
    bal_heldout out;
    return bal_heldout_run(h->trial->prior, h->counts, h->source, &options, &out, err);
}

START_TEST(holding_out_survives_failing_allocations) {
    static const double weights[] = {1, 2, 0, 3};
    trial t;
    bal_heldout_options options = folds_options(5, 2);
    trial_set_up(&t, 2, _i ? 4 : 40, 0, 0, &options);
    if (_i) t.weights = weights;
    bal_prior *prior = open_prior(t.network, BAL_PRIOR_BDEU, BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD);
    t.prior = prior;
    bal_cells *counts = trial_all_counts(&t);
    bal_source *source = trial_source(&t, 0);
    for (unsigned threads = 1; threads <= 3; threads++)
        ck_assert_uint_ge(survive_allocations(hold_out_in_batches, &(holding){&t, counts, source, threads}), 30);
    bal_source_free(source);
    bal_cells_free(counts);
    bal_prior_free(prior);
    trial_tear_down(&t);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("heldout_edges");
    TCase *c = tcase_create("heldout_edges");
    tcase_set_timeout(c, 60);
    tcase_add_test(c, a_table_by_hand);
    tcase_add_test(c, impossible_goes_before_undefined);
    tcase_add_test(c, undefined_alone_leaves_ml_without_a_total);
    tcase_add_loop_test(c, the_order_of_variables_and_outcomes_does_not_matter, 1, 6);
    tcase_add_test(c, empty_folds_cost_nothing);
    tcase_add_test(c, ten_folds_and_seed_1_are_the_defaults);
    tcase_add_loop_test(c, wishes_out_of_range_are_refused, 0, sizeof wishes / sizeof wishes[0]);
    tcase_add_loop_test(c, tables_that_cannot_be_held_out_are_refused, 0, sizeof tables / sizeof tables[0]);
    tcase_add_test(c, what_the_source_meets_ends_it);
    tcase_add_loop_test(c, holding_out_survives_failing_allocations, 0, 2);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
