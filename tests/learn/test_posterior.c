#include "ballast/posterior.h"

#include "model/cells.h"
#include "support/fixtures.h"

#include <float.h>
#include <math.h>
#include <stdlib.h>

static bal_cells *pseudo_counts_of(const bal_prior *prior, const bal_network *network, double strength) {
    bal_cells *alpha = equal_cells(network, 0);
    bal_prior_fill(prior, strength, alpha);
    return alpha;
}

static bal_cells *mean_of(const bal_cells *alpha, const bal_cells *counts) {
    bal_cells *mean = equal_cells(bal_cells_network(alpha), NAN);
    bal_posterior_mean(alpha, counts, mean);
    return mean;
}

START_TEST(means_are_shares_of_pseudo_counts_and_counts) {
    bal_network *network = network_of("A:#2 ; B:#3 | A");
    bal_cells *alpha = cells_of(network, (const double[]){1, 1, 0.5, 0.5, 1, 2, 0, 6});
    bal_cells *counts = cells_of(network, (const double[]){4, 2, 3, 0, 0, 8, 0, 0});
    bal_cells *mean = mean_of(alpha, counts);
    static const double expected[] = {5.0 / 8, 3.0 / 8, 3.5 / 5, 0.5 / 5, 1.0 / 5, 10.0 / 16, 0, 6.0 / 16};
    for (size_t c = 0; c < 8; c++) ck_assert_double_eq(bali_cells_values(mean)[c], expected[c]);
    bal_cells_free(alpha);
    bal_cells_free(counts);
    bal_cells_free(mean);
    bal_network_free(network);
}
END_TEST

START_TEST(a_row_of_nothing_at_all_is_uniform) {
    bal_network *network = network_of("A:#4");
    bal_cells *nothing = equal_cells(network, 0), *mean = mean_of(nothing, nothing);
    for (size_t k = 0; k < 4; k++) ck_assert_double_eq(bali_cells_values(mean)[k], 0.25);
    bal_cells_free(nothing);
    bal_cells_free(mean);
    bal_network_free(network);
}
END_TEST

/* Laplace 1814, the rule of succession: after 1,826,213 sunrises the odds of one more are 1,826,214 to 1 (recalled from
 * memory). */
START_TEST(laplaces_rule_of_succession) {
    bal_network *network = network_of("Sun:rises,stays");
    bal_prior *k2 = simple_prior(network, BAL_PRIOR_K2, 1);
    bal_cells *alpha = pseudo_counts_of(k2, network, 1), *counts = cells_of(network, (const double[]){1826213, 0}),
              *mean = mean_of(alpha, counts);
    ck_assert(near(bali_cells_values(mean)[0] / bali_cells_values(mean)[1], 1826214, 4 * DBL_EPSILON));
    bal_cells_free(alpha);
    bal_cells_free(counts);
    bal_cells_free(mean);
    bal_prior_free(k2);
    bal_network_free(network);
}
END_TEST

/* Cooper & Herskovits 1992, ten cases: of five with x1 present four have x2 present, so that under K2 P(x2 = present |
 * x1 = present) = (4 + 1)/(5 + 2) (the worked substitution is recalled from memory). */
START_TEST(cooper_and_herskovits_expectation) {
    bal_network *network = network_of("x2:absent,present");
    bal_prior *k2 = simple_prior(network, BAL_PRIOR_K2, 1);
    bal_cells *alpha = pseudo_counts_of(k2, network, 1), *counts = cells_of(network, (const double[]){1, 4}),
              *mean = mean_of(alpha, counts);
    ck_assert_double_eq(bali_cells_values(mean)[1], 5.0 / 7);
    bal_cells_free(alpha);
    bal_cells_free(counts);
    bal_cells_free(mean);
    bal_prior_free(k2);
    bal_network_free(network);
}
END_TEST

typedef struct random_case {
    bal_network *network;
    bal_cells *tables, *counts;
    bal_prior *priors[4];
} random_case;

static void set_up(random_case *c, int seed, size_t n_records) {
    dice d = dice_of(seed);
    c->network = random_network(&d, 6, 1, 4, 3);
    c->tables = random_tables(&d, c->network, 0.2);
    int *codes = random_codes(&d, c->tables, n_records, 0);
    c->counts = counts_of(c->network, codes, n_records);
    free(codes);
    for (bal_prior_kind kind = BAL_PRIOR_BDEU; kind <= BAL_PRIOR_JEFFREYS; kind++)
        c->priors[kind] = simple_prior(c->network, kind, 3);
    c->priors[BAL_PRIOR_EXPERT] = expert_prior(c->tables, 12, 0, 1);
}

static void tear_down(random_case *c) {
    for (size_t p = 0; p < 4; p++) bal_prior_free(c->priors[p]);
    bal_cells_free(c->tables);
    bal_cells_free(c->counts);
    bal_network_free(c->network);
}

START_TEST(no_record_gives_the_prior) {
    random_case c;
    set_up(&c, _i, 0);
    for (size_t p = 0; p < 4; p++) {
        bal_cells *alpha = pseudo_counts_of(c.priors[p], c.network, 3), *mean = mean_of(alpha, NULL),
                  *same = mean_of(alpha, c.counts);
        for (size_t v = 0; v < bal_network_variables(c.network); v++) {
            size_t r = bal_network_outcomes(c.network, v);
            for (size_t cell = 0; cell < bal_network_rows(c.network, v) * r; cell++) {
                double expected = p == BAL_PRIOR_EXPERT ? bal_cells_family(c.tables, v)[cell] : 1 / (double)r;
                ck_assert(near(bal_cells_family(mean, v)[cell], expected, 4 * DBL_EPSILON));
                ck_assert_double_eq(bal_cells_family(mean, v)[cell], bal_cells_family(same, v)[cell]);
            }
        }
        bal_cells_free(alpha);
        bal_cells_free(mean);
        bal_cells_free(same);
    }
    tear_down(&c);
}
END_TEST

START_TEST(rows_sum_to_1) {
    random_case c;
    set_up(&c, _i, 80);
    for (size_t p = 0; p <= 4; p++) {
        bal_cells *alpha = p < 4 ? pseudo_counts_of(c.priors[p], c.network, 1) : NULL,
                  *mean = p < 4 ? mean_of(alpha, c.counts) : equal_cells(c.network, NAN);
        if (p == 4) bal_maximum_likelihood(c.counts, mean, NULL);
        for (size_t v = 0; v < bal_network_variables(c.network); v++) {
            size_t r = bal_network_outcomes(c.network, v);
            for (size_t row = 0; row < bal_network_rows(c.network, v); row++)
                ck_assert(near(bali_row_sum(bal_cells_family(mean, v) + row * r, r), 1, (double)r * DBL_EPSILON));
        }
        bal_cells_free(alpha);
        bal_cells_free(mean);
    }
    tear_down(&c);
}
END_TEST

START_TEST(the_order_of_outcomes_does_not_matter) {
    bal_network *network = network_of("A:#5");
    double alpha[] = {0.1, 0.2, 0.3, 0.4, 1e-3}, counts[] = {3, 0, 1, 7, 2}, first[5];
    for (size_t turn = 0; turn < 5; turn++) {
        double a[5], n[5];
        for (size_t k = 0; k < 5; k++) {
            a[k] = alpha[(k + turn) % 5];
            n[k] = counts[(k + turn) % 5];
        }
        bal_cells *pseudo_counts = cells_of(network, a), *cells = cells_of(network, n), *mean = mean_of(pseudo_counts, cells);
        for (size_t k = 0; k < 5; k++) {
            if (turn == 0) first[k] = bali_cells_values(mean)[k];
            ck_assert(fabs(bali_cells_values(mean)[k] - first[(k + turn) % 5]) <= 4 * DBL_EPSILON * first[(k + turn) % 5]);
        }
        bal_cells_free(pseudo_counts);
        bal_cells_free(cells);
        bal_cells_free(mean);
    }
    bal_network_free(network);
}
END_TEST

START_TEST(maximum_likelihood_is_raw_frequencies) {
    bal_network *network = network_of("A:#2 ; B:#3 | A ; C:#1 ; D:#2");
    bal_cells *counts = cells_of(network, (const double[]){1, 3, 0, 0, 0, 2, 0, 6, 0, 0, 1}), *tables = equal_cells(network, NAN);
    size_t undefined = 99;
    bal_maximum_likelihood(counts, tables, &undefined);
    static const double expected[] = {0.25, 0.75, 1.0 / 3, 1.0 / 3, 1.0 / 3, 0.25, 0, 0.75, 1, 0, 1};
    for (size_t c = 0; c < 11; c++) ck_assert_double_eq(bali_cells_values(tables)[c], expected[c]);
    ck_assert_uint_eq(undefined, 2); /* A = 0, and the one row of C */
    bal_maximum_likelihood(counts, tables, NULL);
    bal_cells_free(counts);
    bal_cells_free(tables);
    bal_network_free(network);
}
END_TEST

/* Quantiles that have a formula: of Beta(1, b) 1 - (1 - p)^(1/b), of Beta(a, 1) p^(1/a), of Beta(1/2, 1/2) sin^2(pi
 * p/2) (Abramowitz & Stegun 1964, 26.5), and Beta(4, 17), Beta(5, 16) of NIST/SEMATECH e-Handbook 7.2.4.2 (20 parts, 4
 * defective, 90 %: 0.071354 to 0.401029, recalled from memory; its upper limit came from a spreadsheet and is off by
 * 9e-7). */
START_TEST(intervals_are_equal_tailed) {
    double low, high, level = 0.9, p = 0.05, tolerance = 1e-10;
    ck_assert_int_eq(bal_credible_interval(1, 7, level, &low, &high, NULL), BAL_OK);
    ck_assert(near(low, 1 - pow(1 - p, 1.0 / 7), tolerance) && near(high, 1 - pow(p, 1.0 / 7), tolerance));
    ck_assert_int_eq(bal_credible_interval(3, 1, level, &low, &high, NULL), BAL_OK);
    ck_assert(near(low, cbrt(p), tolerance) && near(high, cbrt(1 - p), tolerance));
    ck_assert_int_eq(bal_credible_interval(0.5, 0.5, level, &low, &high, NULL), BAL_OK);
    ck_assert(near(low, pow(sin(acos(-1) * p / 2), 2), tolerance) && near(high, 1 - low, tolerance));
    ck_assert_int_eq(bal_credible_interval(4, 17, level, &low, &high, NULL), BAL_OK);
    ck_assert(near(low, 0.071354, 5e-7));
    ck_assert_int_eq(bal_credible_interval(5, 16, level, &low, &high, NULL), BAL_OK);
    ck_assert(near(high, 0.401029, 2e-6));
}
END_TEST

static const struct {
    double a, b, level;
    const char *code;
} bad_intervals[] = {
    {0, 1, 0.95, "bad-shape"},    {1, 0, 0.95, "bad-shape"},       {-1, 1, 0.95, "bad-shape"}, {NAN, 1, 0.95, "bad-shape"},
    {1, NAN, 0.95, "bad-shape"},  {INFINITY, 1, 0.95, "bad-shape"}, {1, 1, 0, "bad-level"},     {1, 1, 1, "bad-level"},
    {1, 1, NAN, "bad-level"},     {1, 1, 95, "bad-level"},          {1, 1, -0.5, "bad-level"},
};

START_TEST(an_interval_that_cannot_be_is_refused) {
    double low = 7, high = 8;
    bal_error err = {0};
    ck_assert_int_eq(
        bal_credible_interval(bad_intervals[_i].a, bad_intervals[_i].b, bad_intervals[_i].level, &low, &high, &err),
        BAL_ERR_ARGUMENT);
    ck_assert_str_eq(err.code, bad_intervals[_i].code);
    ck_assert(low == 7 && high == 8);
    ck_assert_ptr_nonnull(bal_code_find(err.code));
}
END_TEST

/* A level so near to 1 that (1 + level)/2 rounds to 1, and no quantile is there. */
START_TEST(a_level_beyond_doubles_is_refused) {
    double low = 7, high = 8;
    bal_error err = {0};
    ck_assert_int_eq(bal_credible_interval(2, 3, 1 - DBL_EPSILON / 2, &low, &high, &err), BAL_ERR_NUMERIC);
    ck_assert_str_eq(err.code, "no-quantile");
    ck_assert(low == 7 && high == 8);
}
END_TEST

START_TEST(a_row_says_what_it_rests_on) {
    static const struct {
        double records;
        bal_basis basis;
        const char *name;
    } rows[] = {{0, BAL_BASIS_PRIOR, "prior"},
                {1, BAL_BASIS_FEW, "few"},
                {4, BAL_BASIS_FEW, "few"},
                {5, BAL_BASIS_DATA, "data"},
                {1e9, BAL_BASIS_DATA, "data"}};
    for (size_t i = 0; i < sizeof rows / sizeof rows[0]; i++) {
        ck_assert_int_eq(bal_row_basis(rows[i].records), rows[i].basis);
        ck_assert_str_eq(bal_basis_name(rows[i].basis), rows[i].name);
    }
    ck_assert_double_eq(bal_data_share(1, 3), 0.75);
    ck_assert_double_eq(bal_data_share(5, 0), 0);
    ck_assert_double_eq(bal_data_share(0, 5), 1);
    ck_assert_double_eq(bal_data_share(0, 0), 0);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("posterior");
    TCase *c = tcase_create("posterior");
    tcase_add_test(c, means_are_shares_of_pseudo_counts_and_counts);
    tcase_add_test(c, a_row_of_nothing_at_all_is_uniform);
    tcase_add_test(c, laplaces_rule_of_succession);
    tcase_add_test(c, cooper_and_herskovits_expectation);
    tcase_add_loop_test(c, no_record_gives_the_prior, 1, 11);
    tcase_add_loop_test(c, rows_sum_to_1, 1, 11);
    tcase_add_test(c, the_order_of_outcomes_does_not_matter);
    tcase_add_test(c, maximum_likelihood_is_raw_frequencies);
    tcase_add_test(c, intervals_are_equal_tailed);
    tcase_add_loop_test(c, an_interval_that_cannot_be_is_refused, 0, sizeof bad_intervals / sizeof bad_intervals[0]);
    tcase_add_test(c, a_level_beyond_doubles_is_refused);
    tcase_add_test(c, a_row_says_what_it_rests_on);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
