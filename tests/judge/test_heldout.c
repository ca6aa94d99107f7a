#include "ballast/judge.h"

#include "ballast/score.h"
#include "ballast/tally.h"
#include "support/fixtures.h"
#include "support/heldout_twin.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

/* ---- comparing ---- */

static bool close(double a, double b) {
    return a == b || (isnan(a) && isnan(b)) || near(a, b, 1e-12);
}

static void check_paired(const bal_paired *got, const bal_paired *expected, const char *what, int seed) {
    ck_assert_msg(close(got->bayes, expected->bayes) && close(got->ml, expected->ml) &&
                      close(got->mean_difference, expected->mean_difference),
                  "seed %d, %s: %.17g %.17g %.17g, expected %.17g %.17g %.17g", seed, what, got->bayes, got->ml,
                  got->mean_difference, expected->bayes, expected->ml, expected->mean_difference);
    ck_assert_msg(close(got->standard_error, expected->standard_error), "seed %d, %s: standard error %.17g, expected %.17g",
                  seed, what, got->standard_error, expected->standard_error);
}

static void check_heldout(const bal_heldout *got, const bal_heldout *expected, int seed) {
    ck_assert_uint_eq(got->records, expected->records);
    ck_assert_uint_eq(got->incomplete, expected->incomplete);
    ck_assert_uint_eq(got->impossible, expected->impossible);
    ck_assert_uint_eq(got->undefined, expected->undefined);
    ck_assert_uint_eq(got->comparable, expected->comparable);
    ck_assert_uint_eq(got->bayes_impossible, expected->bayes_impossible);
    const struct {
        const char *name;
        double got, expected;
    } numbers[] = {
        {"bayes", got->bayes_log_likelihood, expected->bayes_log_likelihood},
        {"ml", got->ml_log_likelihood, expected->ml_log_likelihood},
        {"prior", got->prior_log_likelihood, expected->prior_log_likelihood},
        {"others", got->bayes_on_others, expected->bayes_on_others},
        {"break-even", got->break_even, expected->break_even},
        {"least strength", got->least_strength, expected->least_strength},
        {"largest strength", got->largest_strength, expected->largest_strength},
    };
    for (size_t i = 0; i < sizeof numbers / sizeof numbers[0]; i++)
        ck_assert_msg(close(numbers[i].got, numbers[i].expected), "seed %d, %s: %.17g, expected %.17g", seed,
                      numbers[i].name, numbers[i].got, numbers[i].expected);
    check_paired(&got->on_comparable, &expected->on_comparable, "comparable", seed);
    check_paired(&got->quadratic, &expected->quadratic, "quadratic", seed);
}

/* ---- running ---- */

static bal_status hold_out(const trial *t, unsigned threads, size_t prediction_bytes, bal_heldout *out, bal_error *err) {
    bal_cells *counts = counts_of(t->network, t->codes, t->n_records);
    bal_source *source =
        source_of(bal_network_domain(t->network),
                  &(fixture_table){.codes = t->codes, .n_records = t->n_records, .places = t->places, .block_records = 64});
    bal_heldout_options options = bal_heldout_options_defaults();
    options.folds = t->n_folds;
    options.seed = t->seed;
    options.threads = threads;
    if (prediction_bytes > 0) options.prediction_bytes = prediction_bytes;
    bal_status status = bal_heldout_folds(t->prior, counts, source, &options, out, err);
    bal_source_free(source);
    bal_cells_free(counts);
    return status;
}

static bal_heldout held_out(const trial *t) {
    bal_heldout out;
    bal_error err = {0};
    ck_assert_msg(hold_out(t, 1, 0, &out, &err) == BAL_OK, "%s", err.message);
    return out;
}

/* Records of a random network; every dropped-th place is left out, as dropping incomplete records does. */
static void set_up(trial *t, int seed, size_t n_records, size_t n_folds, double missing, size_t dropped) {
    dice d = dice_of(seed);
    *t = (trial){.n_records = n_records, .n_folds = n_folds, .seed = (uint64_t)seed};
    t->network = random_network(&d, 5, 1, 4, 2);
    bal_cells *tables = random_tables(&d, t->network, 0);
    t->codes = random_codes(&d, tables, n_records, missing);
    for (size_t i = 0, place = 0; i < n_records; i++, place++) {
        if (dropped > 0 && place % dropped == 0) place++;
        t->places[i] = place;
    }
    bal_cells_free(tables);
}

static void tear_down(trial *t) {
    free(t->codes);
    bal_network_free(t->network);
}

static const struct {
    size_t n_records, n_folds;
    double missing;
    size_t dropped;
} sizes[] = {
    {60, 10, 0, 0},   {60, 2, 0, 0},  {61, 3, 0.05, 0}, {60, 10, 0, 3},  {60, 10, 0.1, 7}, {20, 20, 0, 0}, {20, 37, 0, 0},
    {20, 100, 0, 5},  {1, 10, 0, 0},  {1, 2, 0, 0},     {2, 2, 0, 0},    {0, 10, 0, 0},    {30, 5, 1, 0},  {300, 10, 0, 0},
};

START_TEST(every_number_is_the_twins) {
    for (int seed = 1; seed <= 6; seed++) {
        trial t;
        set_up(&t, seed, sizes[_i].n_records, sizes[_i].n_folds, sizes[_i].missing, sizes[_i].dropped);
        bal_prior *priors[] = {
            simple_prior(t.network, BAL_PRIOR_BDEU, 1),
            open_prior(t.network, BAL_PRIOR_BDEU, BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD),
            open_prior(t.network, BAL_PRIOR_JEFFREYS, BAL_STRENGTH_BY_LEAVE_ONE_OUT),
        };
        for (size_t p = 0; p < sizeof priors / sizeof priors[0]; p++) {
            t.prior = priors[p];
            bal_heldout got = held_out(&t), expected = heldout_twin(&t);
            check_heldout(&got, &expected, seed);
            bal_prior_free(priors[p]);
        }
        tear_down(&t);
    }
}
END_TEST

/* An expert whose tables have zeros, and records that fall in them or not: for Bayes they are impossible, in training too. */
START_TEST(structural_zeros_are_impossible_for_bayes) {
    uint64_t seen = 0, comparable_too = 0;
    for (int seed = 1; seed <= 30; seed++) {
        trial t;
        set_up(&t, seed, 40, 4, 0, 0);
        dice d = dice_of(seed + 1000);
        bal_cells *tables = random_tables(&d, t.network, seed % 3 ? 0.1 : 0);
        bal_prior *prior = expert_prior(tables, 6, 0, 1);
        t.prior = prior;
        bal_heldout got = held_out(&t), expected = heldout_twin(&t);
        check_heldout(&got, &expected, seed);
        if (seed % 3 == 0) ck_assert_uint_eq(got.bayes_impossible, 0);
        if (got.bayes_impossible) ck_assert(got.bayes_log_likelihood == -INFINITY);
        seen += got.bayes_impossible;
        comparable_too += got.on_comparable.bayes == -INFINITY;
        bal_prior_free(prior);
        bal_cells_free(tables);
        tear_down(&t);
    }
    ck_assert_uint_gt(seen, 0); /* else the seeds test nothing */
    ck_assert_uint_gt(comparable_too, 0);
}
END_TEST

START_TEST(threads_and_memory_change_no_bit) {
    static const size_t prediction_bytes[] = {1, 5000, 50000, (size_t)1 << 30};
    trial t;
    set_up(&t, _i, 400, 13, 0.02, 0);
    bal_prior *prior = open_prior(t.network, BAL_PRIOR_BDEU, BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD);
    t.prior = prior;
    bal_heldout first = held_out(&t);
    for (unsigned threads = 1; threads <= 8; threads *= 2)
        for (size_t b = 0; b < sizeof prediction_bytes / sizeof prediction_bytes[0]; b++) {
            bal_heldout again;
            memset(&again, 0x55, sizeof again);
            ck_assert_int_eq(hold_out(&t, threads, prediction_bytes[b], &again, NULL), BAL_OK);
            ck_assert_mem_eq(&again, &first, sizeof first);
        }
    bal_prior_free(prior);
    tear_down(&t);
}
END_TEST

/* Less memory means more passes, down to one fold a pass: one to count, and one for each batch of folds. */
START_TEST(less_memory_takes_more_passes) {
    trial t;
    set_up(&t, 1, 64, 8, 0, 0); /* one block, and the empty one behind it, a pass */
    bal_prior *prior = simple_prior(t.network, BAL_PRIOR_K2, 1);
    t.prior = prior;
    bal_heldout out;
    size_t before = fixture_blocks();
    ck_assert_int_eq(hold_out(&t, 1, 0, &out, NULL), BAL_OK);
    ck_assert_uint_eq(fixture_blocks() - before, 2 * 2);
    before = fixture_blocks();
    ck_assert_int_eq(hold_out(&t, 1, 1, &out, NULL), BAL_OK);
    ck_assert_uint_eq(fixture_blocks() - before, 2 * 9);
    bal_prior_free(prior);
    tear_down(&t);
}
END_TEST

/* ---- what is chosen, is chosen without the held-out records ---- */

/* Two variables that agree in ten records of twelve: the whole table and its halves want different strengths. */
START_TEST(the_strength_is_chosen_inside_the_training_part) {
    static int codes[] = {0, 0, 1, 1, 0, 0, 1, 1, 0, 1, 0, 0, 1, 1, 0, 0, 1, 1, 1, 0, 0, 0, 1, 1};
    trial t = {.network = network_of("A:#2 ; B:#2 | A"), .codes = codes, .n_records = 12, .n_folds = 2, .seed = 1};
    for (size_t i = 0; i < 12; i++) t.places[i] = i;
    bal_prior *open = open_prior(t.network, BAL_PRIOR_BDEU, BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD);
    bal_cells *counts = counts_of(t.network, codes, 12);
    bal_strength whole;
    ck_assert_int_eq(bal_prior_settle(open, counts, &whole, NULL), BAL_OK);
    bal_prior *given = simple_prior(t.network, BAL_PRIOR_BDEU, whole.value);
    t.prior = open;
    bal_heldout inside = held_out(&t), expected = heldout_twin(&t);
    t.prior = given;
    bal_heldout outside = held_out(&t);
    check_heldout(&inside, &expected, 0);
    ck_assert(whole.chosen && outside.least_strength == whole.value && outside.largest_strength == whole.value);
    ck_assert(inside.least_strength != whole.value || inside.largest_strength != whole.value);
    ck_assert(fabs(inside.bayes_log_likelihood - outside.bayes_log_likelihood) > 1e-3);
    bal_prior_free(open);
    bal_prior_free(given);
    bal_cells_free(counts);
    bal_network_free(t.network);
}
END_TEST

/* ---- by hand ---- */

/* Four folds of four records: each is predicted by the three others. K2, A and B apart.
 *
 *   A = 0 0 1 0, B = 0 1 1 2. Left out:  A: Bayes 3/5 3/5 1/5 3/5, ML 2/3 2/3 0 2/3.  B: Bayes 1/6 2/6 2/6 1/6, ML 0 1/3 1/3 0. */
START_TEST(a_table_by_hand) {
    static int codes[] = {0, 0, 0, 1, 1, 1, 0, 2};
    trial t = {.network = network_of("A:#2 ; B:#3"),
               .codes = codes,
               .n_records = 4,
               .n_folds = 4,
               .seed = 1,
               .places = {0, 1, 2, 3}};
    bal_prior *prior = simple_prior(t.network, BAL_PRIOR_K2, 1);
    t.prior = prior;
    bal_heldout out = held_out(&t);
    ck_assert(out.records == 4 && out.impossible == 3 && out.undefined == 0 && out.comparable == 1);
    double total = log(3.0 / 30) + log(6.0 / 30) + log(2.0 / 30) + log(3.0 / 30);
    ck_assert(close(out.bayes_log_likelihood, total));
    ck_assert(close(out.prior_log_likelihood, 4 * log(1.0 / 6)));
    ck_assert(out.ml_log_likelihood == -INFINITY);
    ck_assert(close(out.on_comparable.bayes, log(6.0 / 30)) && close(out.on_comparable.ml, log(2.0 / 9)));
    ck_assert(close(out.on_comparable.mean_difference, log(0.9)) && isnan(out.on_comparable.standard_error));
    ck_assert(close(out.bayes_on_others, (total - log(6.0 / 30)) / 3));
    ck_assert(close(out.break_even, (total - log(2.0 / 9)) / 3));
    /* A: Bayes 2 (2/5)^2 thrice, 2 (4/5)^2 once; ML 2 (1/3)^2 thrice, 2 once.  B, in 36ths: the three left have counts 0 2 1, 1 1 1, 1 1 1,
     * 1 2 0; Bayes 25 + 9 + 4, 4 + 16 + 4, 4 + 16 + 4, 4 + 9 + 25; ML 1 + 4/9 + 1/9, 2/3, 2/3, 1/9 + 4/9 + 1. */
    ck_assert(close(out.quadratic.bayes, ((3 * 8.0 + 32) / 25 + (38.0 + 24 + 24 + 38) / 36) / 4));
    ck_assert(close(out.quadratic.ml, (3 * 2.0 / 9 + 2 + 2 * 14.0 / 9 + 2 * 2.0 / 3) / 4));
    bal_prior_free(prior);
    bal_network_free(t.network);
}
END_TEST

/* Two records, each the other's training part: in A the first is impossible, in B | A its row is without records. */
START_TEST(impossible_goes_before_undefined) {
    static int codes[] = {0, 0, 1, 1};
    trial t = {
        .network = network_of("A:#2 ; B:#2 | A"), .codes = codes, .n_records = 2, .n_folds = 2, .seed = 1, .places = {0, 1}};
    bal_prior *prior = simple_prior(t.network, BAL_PRIOR_K2, 1);
    t.prior = prior;
    bal_heldout out = held_out(&t);
    ck_assert(out.impossible == 2 && out.undefined == 0 && out.comparable == 0);
    ck_assert(out.ml_log_likelihood == -INFINITY);
    ck_assert(isnan(out.on_comparable.bayes) && isnan(out.on_comparable.mean_difference));
    ck_assert(close(out.bayes_log_likelihood, 2 * log(1.0 / 3 * 1 / 2)) && close(out.break_even, out.bayes_on_others));
    bal_prior_free(prior);
    bal_network_free(t.network);
}
END_TEST

START_TEST(undefined_alone_leaves_ml_without_a_total) {
    static int codes[] = {0};
    trial t = {.network = network_of("A:#2"), .codes = codes, .n_records = 1, .n_folds = 10, .seed = 1};
    bal_prior *prior = simple_prior(t.network, BAL_PRIOR_K2, 1);
    t.prior = prior;
    bal_heldout out = held_out(&t);
    ck_assert(out.records == 1 && out.undefined == 1 && out.impossible == 0);
    ck_assert(isnan(out.ml_log_likelihood));
    ck_assert(close(out.bayes_log_likelihood, log(0.5)) && close(out.quadratic.ml, 0.5)); /* ML taken as uniform */
    bal_prior_free(prior);
    bal_network_free(t.network);
}
END_TEST

/* Variables, outcomes and parents the other way round: the folds are of records, so nothing changes but last bits. */
START_TEST(the_order_of_variables_and_outcomes_does_not_matter) {
    trial t, other;
    set_up(&t, _i, 100, 7, 0.02, 0);
    other = t;
    other.network = reversed_network(t.network);
    other.codes = reversed_codes(t.network, t.codes, t.n_records);
    bal_prior *prior = open_prior(t.network, BAL_PRIOR_BDEU, BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD);
    bal_prior *prior_reversed = open_prior(other.network, BAL_PRIOR_BDEU, BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD);
    t.prior = prior;
    other.prior = prior_reversed;
    bal_heldout one = held_out(&t), two = held_out(&other);
    check_heldout(&two, &one, _i);
    bal_prior_free(prior);
    bal_prior_free(prior_reversed);
    tear_down(&other);
    tear_down(&t);
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
    ck_assert_int_eq(bal_heldout_folds(prior, counts, source, &options, &out, NULL), BAL_OK);
    ck_assert_msg((double)(clock() - start) / CLOCKS_PER_SEC < 1, "%g s", (double)(clock() - start) / CLOCKS_PER_SEC);
    ck_assert_uint_eq(out.records, 3);
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
    size_t folds;
    bal_status status;
} fold_numbers[] = {{0, BAL_ERR_ARGUMENT}, {1, BAL_ERR_ARGUMENT},     {2, BAL_OK},
                    {1000, BAL_OK},        {65536, BAL_ERR_ARGUMENT}, {SIZE_MAX, BAL_ERR_ARGUMENT}};

START_TEST(folds_are_2_to_65535) {
    trial t;
    set_up(&t, 1, 10, fold_numbers[_i].folds, 0, 0);
    bal_prior *prior = simple_prior(t.network, BAL_PRIOR_K2, 1);
    t.prior = prior;
    bal_heldout out;
    bal_error err = {0};
    ck_assert_int_eq(hold_out(&t, 1, 0, &out, &err), fold_numbers[_i].status);
    if (fold_numbers[_i].status != BAL_OK) ck_assert_str_eq(err.code, "bad-folds");
    bal_prior_free(prior);
    tear_down(&t);
}
END_TEST

START_TEST(a_hundred_million_records_are_the_most) {
    bal_network *network = network_of("A:#2");
    bal_cells *counts = cells_of(network, (const double[]){1e8, 1});
    bal_prior *prior = simple_prior(network, BAL_PRIOR_K2, 1);
    bal_source *source = plain_source(network, (const int[]){0}, 1);
    bal_heldout_options options = bal_heldout_options_defaults();
    bal_heldout out;
    bal_error err = {0};
    ck_assert_int_eq(bal_heldout_folds(prior, counts, source, &options, &out, &err), BAL_ERR_DATA);
    ck_assert_str_eq(err.code, "too-many-held-out");
    bal_source_free(source);
    bal_prior_free(prior);
    bal_cells_free(counts);
    bal_network_free(network);
}
END_TEST

/* Counts of other records than the source's would make training parts that never were. */
START_TEST(counts_of_other_records_are_refused) {
    bal_network *network = network_of("A:#2");
    static const double others[][2] = {{2, 1}, {1, 1}, {0, 3}, {5, 5}, {4, 0}, {3, 1}};
    bal_prior *prior = simple_prior(network, BAL_PRIOR_K2, 1);
    for (size_t i = 0; i < 6; i++) {
        bal_cells *counts = cells_of(network, others[i]);
        bal_source *source = plain_source(network, (const int[]){0, 0, 0}, 3);
        bal_heldout_options options = bal_heldout_options_defaults();
        bal_heldout out;
        bal_error err = {0};
        ck_assert_int_eq(bal_heldout_folds(prior, counts, source, &options, &out, &err), BAL_ERR_DATA);
        ck_assert_str_eq(err.code, "changed-while-read");
        bal_source_free(source);
        bal_cells_free(counts);
    }
    bal_prior_free(prior);
    bal_network_free(network);
}
END_TEST

START_TEST(records_of_other_variables_are_refused) {
    bal_network *network = network_of("A:#2"), *other = network_of("A:#3");
    bal_prior *prior = simple_prior(network, BAL_PRIOR_K2, 1);
    bal_cells *counts = equal_cells(network, 1);
    bal_source *source = plain_source(other, (const int[]){0, 2}, 2);
    bal_heldout_options options = bal_heldout_options_defaults();
    bal_heldout out;
    bal_error err = {0};
    ck_assert_int_eq(bal_heldout_folds(prior, counts, source, &options, &out, &err), BAL_ERR_ARGUMENT);
    ck_assert_str_eq(err.code, "other-network");
    bal_source_free(source);
    bal_cells_free(counts);
    bal_prior_free(prior);
    bal_network_free(network);
    bal_network_free(other);
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
        bal_status status = bal_heldout_folds(prior, counts, source, &options, &out, &err);
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
    bal_heldout_options options = {.folds = h->trial->n_folds, .threads = h->threads, .prediction_bytes = 5000};
    bal_heldout out;
    return bal_heldout_folds(h->trial->prior, h->counts, h->source, &options, &out, err);
}

START_TEST(holding_out_survives_failing_allocations) {
    trial t;
    set_up(&t, 2, 40, 5, 0, 0);
    bal_prior *prior = open_prior(t.network, BAL_PRIOR_BDEU, BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD);
    t.prior = prior;
    bal_cells *counts = counts_of(t.network, t.codes, t.n_records);
    bal_source *source = source_of(bal_network_domain(t.network),
                                   &(fixture_table){.codes = t.codes, .n_records = t.n_records, .places = t.places});
    for (unsigned threads = 1; threads <= 3; threads++)
        ck_assert_uint_ge(survive_allocations(hold_out_in_batches, &(holding){&t, counts, source, threads}), 30);
    bal_source_free(source);
    bal_cells_free(counts);
    bal_prior_free(prior);
    tear_down(&t);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("heldout");
    TCase *c = tcase_create("heldout");
    tcase_set_timeout(c, 60);
    tcase_add_loop_test(c, every_number_is_the_twins, 0, sizeof sizes / sizeof sizes[0]);
    tcase_add_test(c, structural_zeros_are_impossible_for_bayes);
    tcase_add_loop_test(c, threads_and_memory_change_no_bit, 1, 4);
    tcase_add_test(c, less_memory_takes_more_passes);
    tcase_add_test(c, the_strength_is_chosen_inside_the_training_part);
    tcase_add_test(c, a_table_by_hand);
    tcase_add_test(c, impossible_goes_before_undefined);
    tcase_add_test(c, undefined_alone_leaves_ml_without_a_total);
    tcase_add_loop_test(c, the_order_of_variables_and_outcomes_does_not_matter, 1, 6);
    tcase_add_test(c, empty_folds_cost_nothing);
    tcase_add_test(c, ten_folds_and_seed_1_are_the_defaults);
    tcase_add_loop_test(c, folds_are_2_to_65535, 0, sizeof fold_numbers / sizeof fold_numbers[0]);
    tcase_add_test(c, a_hundred_million_records_are_the_most);
    tcase_add_test(c, counts_of_other_records_are_refused);
    tcase_add_test(c, records_of_other_variables_are_refused);
    tcase_add_test(c, what_the_source_meets_ends_it);
    tcase_add_test(c, holding_out_survives_failing_allocations);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
