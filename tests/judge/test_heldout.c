#include "support/heldout_trial.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const struct {
    size_t n_records, n_folds;
    double missing;
    size_t dropped, repeats;
} sizes[] = {
    {60, 10, 0, 0, 1},  {60, 2, 0, 0, 1},  {61, 3, 0.05, 0, 1}, {60, 10, 0, 3, 1},  {60, 10, 0.1, 7, 1}, {20, 20, 0, 0, 1},
    {20, 37, 0, 0, 1},  {20, 100, 0, 5, 1}, {1, 10, 0, 0, 1},   {1, 2, 0, 0, 1},    {2, 2, 0, 0, 1},     {0, 10, 0, 0, 1},
    {30, 5, 1, 0, 1},   {300, 10, 0, 0, 1}, {60, 10, 0, 0, 3},  {37, 2, 0.05, 4, 4}, {5, 3, 0, 0, 2},    {1, 2, 0, 0, 3},
    {0, 2, 0, 0, 2},    {30, 4, 1, 0, 2},
};

START_TEST(every_number_of_folds_is_the_twins) {
    for (int seed = 1; seed <= 6; seed++) {
        trial t;
        bal_heldout_options options = folds_options(sizes[_i].n_folds, sizes[_i].repeats);
        trial_set_up(&t, seed, sizes[_i].n_records, sizes[_i].missing, sizes[_i].dropped, &options);
        trial_check_all(&t, seed);
        trial_tear_down(&t);
    }
}
END_TEST

static const struct {
    size_t n_records;
    double fraction, missing;
    size_t dropped, repeats;
} holdouts[] = {
    {60, 0.2, 0, 0, 1}, {60, 0.5, 0.1, 3, 1}, {60, 0.3, 0, 0, 4}, {40, 0.9, 0.05, 5, 3}, {3, 0.5, 0, 0, 4}, {1, 0.5, 0, 0, 1},
    {0, 0.5, 0, 0, 2},  {30, 0x1p-60, 0, 0, 2}, {30, 1 - 0x1p-53, 0, 0, 2},
};

START_TEST(every_number_of_a_holdout_is_the_twins) {
    for (int seed = 1; seed <= 6; seed++) {
        trial t;
        bal_heldout_options options = bal_heldout_options_defaults();
        options.method = BAL_HELDOUT_HOLDOUT;
        options.fraction = holdouts[_i].fraction;
        options.repeats = holdouts[_i].repeats;
        trial_set_up(&t, seed, holdouts[_i].n_records, holdouts[_i].missing, holdouts[_i].dropped, &options);
        trial_check_all(&t, seed);
        trial_tear_down(&t);
    }
}
END_TEST

/* One part a label; labels of many records, of one, and of none that was left. */
START_TEST(every_number_of_groups_is_the_twins) {
    static const size_t n_groups[] = {2, 3, 7, 40};
    for (int seed = 1; seed <= 6; seed++) {
        trial t;
        dice d = dice_of(seed + 9);
        bal_heldout_options options = bal_heldout_options_defaults();
        options.method = BAL_HELDOUT_GROUPS;
        options.folds = 0; /* says nothing here */
        trial_set_up(&t, seed, 60, seed % 2 ? 0 : 0.05, 0, &options);
        t.n_groups = n_groups[_i];
        for (size_t i = 0; i < t.n_records; i++) t.groups[i] = (uint32_t)roll(&d, roll(&d, t.n_groups) + 1);
        trial_check_all(&t, seed);
        trial_tear_down(&t);
    }
}
END_TEST

/* A table of its own, predicted by a fit to all counts: with many training records, few, and none. */
START_TEST(every_number_of_a_test_table_is_the_twins) {
    static const size_t n_training[] = {100, 5, 0};
    for (int seed = 1; seed <= 6; seed++) {
        trial t;
        bal_heldout_options options = bal_heldout_options_defaults();
        options.method = BAL_HELDOUT_TEST;
        trial_set_up(&t, seed, seed == 6 ? 0 : 50, seed % 2 ? 0 : 0.05, 0, &options);
        t.earlier = trial_other_counts(&t, seed + 50, n_training[_i]);
        trial_check_all(&t, seed);
        trial_tear_down(&t);
    }
}
END_TEST

/* Earlier counts are in every training part; a variable that nobody recorded leaves its families out. */
START_TEST(earlier_counts_and_unrecorded_variables_are_the_twins) {
    for (int seed = 1; seed <= 8; seed++)
        for (bal_heldout_method method = BAL_HELDOUT_FOLDS; method <= BAL_HELDOUT_TEST; method++) {
            trial t;
            bal_heldout_options options = folds_options(5, 1);
            options.method = method;
            trial_set_up(&t, seed, 50, seed % 2 ? 0 : 0.05, 0, &options);
            t.narrow = _i != 0;
            t.n_groups = 2;
            for (size_t i = 0; i < t.n_records; i++) t.groups[i] = i % 3 == 0;
            t.earlier = trial_other_counts(&t, seed + 50, 20);
            trial_check_all(&t, seed);
            trial_tear_down(&t);
        }
}
END_TEST

/* A record of weight w is w records, so the table and its expansion agree in every bit, whatever way records are held out. */
START_TEST(weights_are_records) {
    enum { LINES = 40 };
    for (int seed = 1; seed <= 6; seed++) {
        trial t, all;
        double weights[LINES];
        bal_heldout_options options = folds_options(4, _i == BAL_HELDOUT_FOLDS || _i == BAL_HELDOUT_HOLDOUT ? 2 : 1);
        options.method = (bal_heldout_method)_i;
        trial_set_up(&t, seed, LINES, seed % 2 ? 0 : 0.05, 0, &options);
        all = t;
        t.n_groups = all.n_groups = 3;
        size_t n = bal_network_variables(t.network);
        all.codes = calloc(TRIAL_RECORDS * n, sizeof *all.codes);
        all.n_records = 0;
        dice d = dice_of(seed);
        for (size_t i = 0; i < LINES; i++) {
            weights[i] = (double)(i == 7 ? 150 : roll(&d, 5)); /* more than a block of the source; none at all */
            t.places[i] = all.n_records;
            t.groups[i] = (uint32_t)roll(&d, 3);
            for (size_t w = 0; w < (size_t)weights[i]; w++, all.n_records++) {
                memcpy(all.codes + all.n_records * n, t.codes + i * n, n * sizeof *all.codes);
                all.places[all.n_records] = all.n_records;
                all.groups[all.n_records] = t.groups[i];
            }
        }
        ck_assert_uint_gt(all.n_records, 150);
        t.weights = weights;
        bal_prior *prior = open_prior(t.network, BAL_PRIOR_BDEU, BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD);
        t.prior = all.prior = prior;
        t.earlier = all.earlier = trial_other_counts(&t, seed, 30);
        bal_heldout weighted, expanded, expected = trial_twin(&all);
        ck_assert_int_eq(trial_try(&t, 2, 0, &weighted, NULL), BAL_OK);
        ck_assert_int_eq(trial_try(&all, 2, 0, &expanded, NULL), BAL_OK);
        trial_check_bits(&weighted, &expanded);
        trial_check(&expanded, &expected, seed);
        bal_prior_free(prior);
        free(all.codes);
        trial_tear_down(&t);
    }
}
END_TEST

/* An expert whose tables have zeros, and records that fall in them or not: for Bayes they are impossible, in training too. */
START_TEST(structural_zeros_are_impossible_for_bayes) {
    double seen = 0;
    size_t comparable_too = 0;
    for (int seed = 1; seed <= 30; seed++) {
        trial t;
        bal_heldout_options options = folds_options(4, seed % 2 ? 1 : 3);
        trial_set_up(&t, seed, 40, 0, 0, &options);
        dice d = dice_of(seed + 1000);
        bal_cells *tables = random_tables(&d, t.network, seed % 3 ? 0.1 : 0);
        bal_prior *prior = expert_prior(tables, 6, 0, 1);
        t.prior = prior;
        bal_heldout got = trial_run(&t), expected = trial_twin(&t);
        trial_check(&got, &expected, seed);
        if (seed % 3 == 0) ck_assert(got.bayes_impossible == 0);
        if (got.bayes_impossible > 0) ck_assert(got.bayes_log_likelihood == -INFINITY);
        seen += got.bayes_impossible;
        comparable_too += got.on_comparable.bayes == -INFINITY;
        bal_prior_free(prior);
        bal_cells_free(tables);
        trial_tear_down(&t);
    }
    ck_assert(seen > 0); /* else the seeds test nothing */
    ck_assert_uint_gt(comparable_too, 0);
}
END_TEST

/* No training record can be in a structural zero, but a test record can: then no total and no mean over it is finite, and nothing
 * stands in its place. What ML had seen is as it would be without that record. */
START_TEST(a_test_record_in_a_structural_zero_leaves_no_finite_total) {
    static int codes[] = {0, 0, 0, 1, 1, 0};
    static const double tables[] = {0.5, 0.5, 1, 0, 0.5, 0.5}; /* A = 0 never has B = 1 */
    trial t = {.network = network_of("A:#2 ; B:#2 | A"), .codes = codes, .n_records = 3, .places = {0, 1, 2}};
    t.options = bal_heldout_options_defaults();
    t.options.method = BAL_HELDOUT_TEST;
    t.earlier = cells_of(t.network, (const double[]){4, 2, 4, 0, 1, 1});
    bal_cells *expert = cells_of(t.network, tables);
    bal_prior *prior = expert_prior(expert, 2, 0, 1);
    t.prior = prior;
    bal_heldout out = trial_run(&t), expected = trial_twin(&t);
    trial_check(&out, &expected, 0);
    ck_assert(out.records == 3 && out.bayes_impossible == 1 && out.impossible == 1 && out.undefined == 0 && out.comparable == 2);
    ck_assert(out.bayes_log_likelihood == -INFINITY && out.prior_log_likelihood == -INFINITY && out.ml_log_likelihood == -INFINITY);
    ck_assert(out.bayes_on_others == -INFINITY && out.break_even == -INFINITY);
    /* records 00 and 10: Bayes 5/8 x 1 and 3/8 x 2/4, ML 4/6 x 1 and 2/6 x 1/2 */
    ck_assert(trial_close(out.on_comparable.bayes, log(5.0 / 8 * 3 / 16) / 2) && trial_close(out.on_comparable.ml, log(4.0 / 6 / 6) / 2));
    ck_assert(isfinite(out.quadratic.bayes) && isfinite(out.quadratic.standard_error)); /* bounded, whatever is impossible */
    bal_prior_free(prior);
    bal_cells_free(expert);
    bal_cells_free(t.earlier);
    bal_network_free(t.network);
}
END_TEST

/* Over repeats a record counts once in a standard error, however often it was scored: as many repeats as one likes of the same parts
 * (one record a fold) change no number. */
START_TEST(repeats_of_the_same_parts_change_nothing) {
    trial t;
    bal_heldout_options options = folds_options(40, 1);
    trial_set_up(&t, 3, 40, 0, 0, &options);
    bal_prior *prior = simple_prior(t.network, BAL_PRIOR_K2, 1);
    t.prior = prior;
    bal_heldout once = trial_run(&t);
    t.options.repeats = 4;
    bal_heldout often = trial_run(&t);
    trial_check(&often, &once, 3);
    ck_assert(once.quadratic.standard_error > 0);
    bal_prior_free(prior);
    trial_tear_down(&t);
}
END_TEST

START_TEST(threads_and_memory_change_no_bit) {
    static const size_t prediction_bytes[] = {1, 5000, 50000, (size_t)1 << 30};
    trial t;
    bal_heldout_options options = folds_options(13, _i % 2 ? 1 : 3);
    options.method = _i < 5 ? BAL_HELDOUT_FOLDS : (bal_heldout_method)(_i - 4);
    if (options.method == BAL_HELDOUT_GROUPS || options.method == BAL_HELDOUT_TEST) options.repeats = 1;
    trial_set_up(&t, _i, 400, 0.02, 0, &options);
    t.n_groups = 11;
    for (size_t i = 0; i < t.n_records; i++) t.groups[i] = (uint32_t)(i * i % 11);
    if (options.method == BAL_HELDOUT_TEST) t.earlier = trial_other_counts(&t, _i, 100);
    bal_prior *prior = open_prior(t.network, BAL_PRIOR_BDEU, BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD);
    t.prior = prior;
    bal_heldout first;
    ck_assert_int_eq(trial_try(&t, 1, 0, &first, NULL), BAL_OK);
    for (unsigned threads = 1; threads <= 8; threads *= 2)
        for (size_t b = 0; b < sizeof prediction_bytes / sizeof prediction_bytes[0]; b++) {
            bal_heldout again;
            ck_assert_int_eq(trial_try(&t, threads, prediction_bytes[b], &again, NULL), BAL_OK);
            trial_check_bits(&again, &first);
        }
    bal_prior_free(prior);
    trial_tear_down(&t);
}
END_TEST

/* Less memory means more passes, down to one fold a pass: one to count, and one for each batch of folds. */
START_TEST(less_memory_takes_more_passes) {
    trial t;
    bal_heldout_options options = folds_options(8, 1);
    trial_set_up(&t, 1, 64, 0, 0, &options); /* one block, and the empty one behind it, a pass; one pass more goes before */
    bal_prior *prior = simple_prior(t.network, BAL_PRIOR_K2, 1);
    t.prior = prior;
    bal_heldout out;
    size_t before = fixture_blocks();
    ck_assert_int_eq(trial_try(&t, 1, 0, &out, NULL), BAL_OK);
    ck_assert_uint_eq(fixture_blocks() - before, 2 * 3);
    before = fixture_blocks();
    ck_assert_int_eq(trial_try(&t, 1, 1, &out, NULL), BAL_OK);
    ck_assert_uint_eq(fixture_blocks() - before, 2 * 10);
    bal_prior_free(prior);
    trial_tear_down(&t);
}
END_TEST

/* ---- what is chosen, is chosen without the held-out records ---- */

/* Two variables that agree in ten records of twelve: the whole table and its halves want different strengths. */
START_TEST(the_strength_is_chosen_inside_the_training_part) {
    static int codes[] = {0, 0, 1, 1, 0, 0, 1, 1, 0, 1, 0, 0, 1, 1, 0, 0, 1, 1, 1, 0, 0, 0, 1, 1};
    trial t = {.network = network_of("A:#2 ; B:#2 | A"), .codes = codes, .n_records = 12, .options = folds_options(2, 1)};
    for (size_t i = 0; i < 12; i++) t.places[i] = i;
    bal_prior *open = open_prior(t.network, BAL_PRIOR_BDEU, BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD);
    bal_cells *counts = counts_of(t.network, codes, 12);
    bal_strength whole;
    ck_assert_int_eq(bal_prior_settle(open, counts, &whole, NULL), BAL_OK);
    bal_prior *given = simple_prior(t.network, BAL_PRIOR_BDEU, whole.value);
    t.prior = open;
    bal_heldout inside = trial_run(&t), expected = trial_twin(&t);
    t.prior = given;
    bal_heldout outside = trial_run(&t);
    trial_check(&inside, &expected, 0);
    ck_assert(whole.chosen && outside.least_strength == whole.value && outside.largest_strength == whole.value);
    ck_assert(inside.least_strength != whole.value || inside.largest_strength != whole.value);
    ck_assert(fabs(inside.bayes_log_likelihood - outside.bayes_log_likelihood) > 1e-3);
    bal_prior_free(open);
    bal_prior_free(given);
    bal_cells_free(counts);
    bal_network_free(t.network);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("heldout");
    TCase *c = tcase_create("heldout");
    tcase_set_timeout(c, 60);
    tcase_add_loop_test(c, every_number_of_folds_is_the_twins, 0, sizeof sizes / sizeof sizes[0]);
    tcase_add_loop_test(c, every_number_of_a_holdout_is_the_twins, 0, sizeof holdouts / sizeof holdouts[0]);
    tcase_add_loop_test(c, every_number_of_groups_is_the_twins, 0, 4);
    tcase_add_loop_test(c, every_number_of_a_test_table_is_the_twins, 0, 3);
    tcase_add_loop_test(c, earlier_counts_and_unrecorded_variables_are_the_twins, 0, 2);
    tcase_add_loop_test(c, weights_are_records, BAL_HELDOUT_FOLDS, BAL_HELDOUT_TEST + 1);
    tcase_add_test(c, structural_zeros_are_impossible_for_bayes);
    tcase_add_test(c, a_test_record_in_a_structural_zero_leaves_no_finite_total);
    tcase_add_test(c, repeats_of_the_same_parts_change_nothing);
    tcase_add_loop_test(c, threads_and_memory_change_no_bit, 1, 8);
    tcase_add_test(c, less_memory_takes_more_passes);
    tcase_add_test(c, the_strength_is_chosen_inside_the_training_part);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
