#include "ballast/prior.h"

#include "ballast/score.h"
#include "base/numbers.h"
#include "model/cells.h"
#include "support/fixtures.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static bal_strength settled(const bal_prior *prior, const bal_cells *counts) {
    bal_strength strength;
    bal_error err = {0};
    ck_assert_msg(bal_prior_settle(prior, counts, &strength, &err) == BAL_OK, "%s", err.message);
    return strength;
}

/* The score that a choice is by, at one strength, by the functions that score a fit. */
static double score_at(const bal_prior *prior, const bal_cells *counts, bal_cells *alpha, double strength) {
    bool leave_one_out = bal_prior_choice(prior) == BAL_STRENGTH_BY_LEAVE_ONE_OUT;
    double sum = 0;
    bal_error err = {0};
    bal_prior_fill(prior, strength, alpha);
    for (size_t v = 0; v < bal_network_variables(bal_cells_network(counts)); v++) {
        double score;
        bal_status status = leave_one_out ? bal_leave_one_out(alpha, counts, v, &score, &err)
                                          : bal_log_marginal_likelihood(alpha, counts, v, &score, &err);
        if (status != BAL_OK) ck_abort_msg("%s", err.message); /* an assertion each time would be slow */
        sum += score;
    }
    return sum;
}

/* Brute force: the best of n points, evenly spaced in the logarithm from 0.01 to 10000. */
static double dense_best(const bal_prior *prior, const bal_cells *counts, int n, double *best_score) {
    bal_cells *alpha = equal_cells(bal_cells_network(counts), 0);
    double best = NAN;
    *best_score = -INFINITY;
    for (int i = 0; i < n; i++) {
        double strength = exp(log(0.01) + i * log(1e6) / (n - 1)), score = score_at(prior, counts, alpha, strength);
        if (score <= *best_score) continue;
        *best_score = score;
        best = strength;
    }
    bal_cells_free(alpha);
    return best;
}

/* A value is the brute force's best, rounded: at most half a unit of its third digit and one of the brute force's steps
 * away, and then hardly worse. */
static void check_choice(const bal_prior *prior, const bal_cells *counts, int n, int seed) {
    double best_score, best = dense_best(prior, counts, n, &best_score), step = log(1e6) / (n - 1);
    bal_strength strength = settled(prior, counts);
    bal_cells *alpha = equal_cells(bal_cells_network(counts), 0);
    double score = score_at(prior, counts, alpha, strength.value);
    ck_assert_msg(strength.chosen, "seed %d", seed);
    ck_assert_msg(fabs(log(strength.value / best)) <= 0.0051 + step, "seed %d: %.17g, and by brute force %.17g", seed,
                  strength.value, best);
    ck_assert_msg(score >= best_score - 1e-4 * fmax(1, fabs(best_score)), "seed %d: score %.17g, by brute force %.17g", seed,
                  score, best_score);
    ck_assert_int_eq(strength.at_end, best < 0.01 * exp(step / 2) ? -1 : best > 10000 * exp(-step / 2) ? 1 : 0);
    bal_cells_free(alpha);
}

typedef struct random_case {
    bal_network *network;
    bal_cells *tables, *counts;
} random_case;

static void set_up(random_case *c, int seed, size_t n_variables) {
    dice d = dice_of(seed);
    c->network = random_network(&d, n_variables, 1, 3, 2);
    c->tables = random_tables(&d, c->network, 0);
    size_t n_records = 5 + roll(&d, 60);
    int *codes = random_codes(&d, c->tables, n_records, 0.02);
    c->counts = counts_of(c->network, codes, n_records);
    free(codes);
}

static void tear_down(random_case *c) {
    bal_cells_free(c->tables);
    bal_cells_free(c->counts);
    bal_network_free(c->network);
}

static void check_kinds(const random_case *c, int n, int seed) {
    for (bal_strength_choice choice = BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD; choice <= BAL_STRENGTH_BY_LEAVE_ONE_OUT; choice++)
        for (bal_prior_kind kind = BAL_PRIOR_BDEU; kind <= BAL_PRIOR_JEFFREYS; kind++) {
            bal_prior *prior = open_prior(c->network, kind, choice);
            check_choice(prior, c->counts, n, seed);
            bal_prior_free(prior);
        }
}

START_TEST(the_choice_is_that_of_20001_points) {
    random_case c;
    set_up(&c, _i, 3);
    check_kinds(&c, 20001, _i);
    tear_down(&c);
}
END_TEST

START_TEST(the_choice_is_that_of_brute_force_on_many_tables) {
    random_case c;
    set_up(&c, _i, 6);
    check_kinds(&c, 601, _i);
    tear_down(&c);
}
END_TEST

/* An expert whose scale is to be chosen. */
static bal_prior *open_expert(const bal_cells *tables, bal_strength_choice choice) {
    bal_document *document = NULL;
    ck_assert_int_eq(bal_document_create(bal_cells_network(tables), NULL, &document, NULL), BAL_OK);
    ck_assert_int_eq(bal_document_set_cells(document, BAL_CARRIED_TABLES, tables, NULL), BAL_OK);
    bal_prior_options options = {.kind = BAL_PRIOR_EXPERT, .choice = choice, .strength = 1, .expert = document, .row_ess = 10};
    bal_prior *prior = prior_of(bal_cells_network(tables), &options);
    bal_document_free(document);
    return prior;
}

START_TEST(an_experts_scale_is_chosen_too) {
    random_case c;
    set_up(&c, _i, 5);
    for (bal_strength_choice choice = BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD; choice <= BAL_STRENGTH_BY_LEAVE_ONE_OUT; choice++) {
        bal_prior *right = open_expert(c.tables, choice); /* the tables that the records were drawn from */
        check_choice(right, c.counts, 601, _i);
        bal_prior_free(right);
        dice d = dice_of(_i + 1000);
        bal_cells *others = random_tables(&d, c.network, 0);
        bal_prior *wrong = open_expert(others, choice);
        check_choice(wrong, c.counts, 601, _i);
        bal_prior_free(wrong);
        bal_cells_free(others);
    }
    tear_down(&c);
}
END_TEST

/* Tables whose best strength is known without looking: at an end, or none at all. */
static const struct {
    const char *network;
    double counts[8];
    double value;
    int at_end;
    bool chosen;
} known[] = {
    /* Every row has one outcome only: the less prior the better. */
    {"A:#2", {20, 0}, 0.01, -1, true},
    {"A:#2 ; B:#2 | A", {20, 0, 20, 0, 0, 0}, 0.01, -1, true},
    {"A:#3", {0, 1e9, 0}, 0.01, -1, true},
    /* Uniform, and more evenly so than chance allows: the more prior the better. */
    {"A:#2", {50, 50}, 10000, 1, true},
    {"A:#4", {1, 1, 1, 1}, 10000, 1, true},
    {"A:#2 ; B:#2 | A", {10, 10, 5, 5, 5, 5}, 10000, 1, true},
    /* No record. */
    {"A:#2", {0, 0}, 1, 0, false},
    {"A:#2 ; B:#2 | A", {0}, 1, 0, false},
    /* One record, or several that meet in no row: the same score whatever the strength. */
    {"A:#2", {1, 0}, 1, 0, false},
    {"A:#3", {0, 1, 0}, 1, 0, false},
    {"A:#2 ; B:#2 | A", {0, 1, 0, 0, 1, 0}, 1, 0, false},
    /* Nothing to choose between. */
    {"A:#1", {1000}, 1, 0, false},
    {"A:#1 ; B:#1 | A", {7, 7}, 1, 0, false},
};

START_TEST(known_choices) {
    bal_network *network = network_of(known[_i].network);
    bal_cells *counts = cells_of(network, known[_i].counts);
    for (bal_strength_choice choice = BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD; choice <= BAL_STRENGTH_BY_LEAVE_ONE_OUT; choice++)
        for (bal_prior_kind kind = BAL_PRIOR_BDEU; kind <= BAL_PRIOR_JEFFREYS; kind++) {
            bal_prior *prior = open_prior(network, kind, choice);
            bal_strength strength = settled(prior, counts);
            ck_assert_msg(strength.value == known[_i].value, "%.17g", strength.value);
            ck_assert_int_eq(strength.at_end, known[_i].at_end);
            ck_assert_int_eq(strength.chosen, known[_i].chosen);
            bal_prior_free(prior);
        }
    bal_cells_free(counts);
    bal_network_free(network);
}
END_TEST

START_TEST(a_given_strength_is_taken_as_it_is) {
    bal_network *network = network_of("A:#2");
    bal_cells *counts = cells_of(network, (const double[]){50, 50});
    bal_prior *prior = simple_prior(network, BAL_PRIOR_BDEU, 15.432109876);
    bal_strength strength = settled(prior, counts);
    ck_assert_double_eq(strength.value, 15.432109876);
    ck_assert(!strength.chosen && strength.at_end == 0);
    strength = settled(prior, NULL);
    ck_assert_double_eq(strength.value, 15.432109876);
    bal_prior_free(prior);
    prior = open_prior(network, BAL_PRIOR_BDEU, BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD);
    ck_assert_double_eq(settled(prior, NULL).value, 1);
    bal_prior_free(prior);
    bal_cells_free(counts);
    bal_network_free(network);
}
END_TEST

START_TEST(the_printed_value_reproduces_the_pseudo_counts) {
    random_case c;
    set_up(&c, _i, 6);
    for (bal_prior_kind kind = BAL_PRIOR_BDEU; kind <= BAL_PRIOR_JEFFREYS; kind++) {
        bal_prior *open = open_prior(c.network, kind, BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD);
        bal_strength strength = settled(open, c.counts);
        char text[BALI_NUMBER_BYTES];
        double read;
        (void)bali_number_write(strength.value, text);
        ck_assert(bali_number_read(text, strlen(text), &read));
        ck_assert_msg(strspn(text, "0.") + 4 >= strlen(text) || strlen(text) == 5, "%s has more than three digits", text);
        ck_assert_double_eq(bali_round_significant(strength.value, 3), strength.value);
        bal_prior *given = simple_prior(c.network, kind, read);
        bal_cells *a = equal_cells(c.network, 0), *b = equal_cells(c.network, 0);
        bal_prior_fill(open, strength.value, a);
        bal_prior_fill(given, settled(given, c.counts).value, b);
        ck_assert_mem_eq(bali_cells_values(a), bali_cells_values(b), bal_network_cells(c.network) * sizeof(double));
        bal_cells_free(a);
        bal_cells_free(b);
        bal_prior_free(open);
        bal_prior_free(given);
    }
    tear_down(&c);
}
END_TEST

/* Counts of a pair of variables times a factor. Their best ESS hardly moves with it, while the scores grow so large
 * that their last bits are worth more than an ESS is: 27.629, 26.979, 26.973, 26.973 by the marginal likelihood and
 * 31.222, 30.552, 30.5455, 30.5455 by leave-one-out, from the derivative's zero in 60-digit arithmetic (Python's
 * mpmath). */
static const struct {
    double factor, by_marginal_likelihood, by_leave_one_out;
} large[] = {{1e2, 27.6, 31.2}, {1e4, 27, 30.6}, {1e6, 27, 30.5}, {1e7, 27, 30.5}};

START_TEST(large_counts_are_settled) {
    bal_network *network = network_of("A:#2 ; B:#3 | A");
    double counts[] = {6, 4, 3, 2, 1, 1, 1, 2};
    for (size_t i = 0; i < 8; i++) counts[i] *= large[_i].factor;
    bal_cells *cells = cells_of(network, counts);
    bal_prior *marginal = open_prior(network, BAL_PRIOR_BDEU, BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD);
    bal_prior *left_out = open_prior(network, BAL_PRIOR_BDEU, BAL_STRENGTH_BY_LEAVE_ONE_OUT);
    ck_assert_double_eq(settled(marginal, cells).value, large[_i].by_marginal_likelihood);
    ck_assert_double_eq(settled(left_out, cells).value, large[_i].by_leave_one_out);
    bal_prior_free(marginal);
    bal_prior_free(left_out);
    bal_cells_free(cells);
    bal_network_free(network);
}
END_TEST

START_TEST(the_order_of_variables_and_outcomes_does_not_matter) {
    dice d = dice_of(_i);
    bal_network *network = random_network(&d, 6, 1, 4, 3), *reversed = reversed_network(network);
    bal_cells *tables = random_tables(&d, network, 0);
    int *codes = random_codes(&d, tables, 50, 0), *codes_reversed = reversed_codes(network, codes, 50);
    bal_cells *counts = counts_of(network, codes, 50), *counts_reversed = counts_of(reversed, codes_reversed, 50);
    for (bal_strength_choice choice = BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD; choice <= BAL_STRENGTH_BY_LEAVE_ONE_OUT; choice++) {
        bal_prior *one = open_prior(network, BAL_PRIOR_BDEU, choice), *other = open_prior(reversed, BAL_PRIOR_BDEU, choice);
        ck_assert_double_eq(settled(one, counts).value, settled(other, counts_reversed).value);
        bal_prior_free(one);
        bal_prior_free(other);
    }
    free(codes);
    free(codes_reversed);
    bal_cells_free(tables);
    bal_cells_free(counts);
    bal_cells_free(counts_reversed);
    bal_network_free(network);
    bal_network_free(reversed);
}
END_TEST

/* Counts of weighted records, some below 1. */
START_TEST(fractional_counts_are_settled) {
    bal_network *network = network_of("A:#2 ; B:#3 | A");
    bal_cells *counts = cells_of(network, (const double[]){6.25, 4.5, 0.25, 5.75, 0.25, 0.5, 0.5, 3.5});
    for (bal_prior_kind kind = BAL_PRIOR_BDEU; kind <= BAL_PRIOR_JEFFREYS; kind++) {
        bal_prior *prior = open_prior(network, kind, BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD);
        check_choice(prior, counts, 2001, 0);
        bal_prior_free(prior);
    }
    bal_cells_free(counts);
    bal_network_free(network);
}
END_TEST

START_TEST(counts_in_a_structural_zero_have_no_strength) {
    bal_network *network = network_of("A:#2");
    bal_cells *tables = cells_of(network, (const double[]){0, 1});
    bal_prior *prior = open_expert(tables, BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD);
    for (int n = 1; n <= 2; n++) {
        bal_cells *counts = cells_of(network, (const double[]){n, 3});
        bal_strength strength;
        bal_error err = {0};
        ck_assert_int_eq(bal_prior_settle(prior, counts, &strength, &err), BAL_ERR_NUMERIC);
        ck_assert_str_eq(err.code, "no-strength");
        bal_cells_free(counts);
    }
    bal_prior_free(prior);
    bal_cells_free(tables);
    bal_network_free(network);
}
END_TEST

typedef struct settling {
    const bal_prior *prior;
    const bal_cells *counts;
} settling;

static bal_status settle(void *context, bal_error *err) {
    const settling *s = context;
    bal_strength strength;
    return bal_prior_settle(s->prior, s->counts, &strength, err);
}

/* Families of 6, 7 and 8 outcomes: wherever the list of terms has to grow, at a cell or at a row's total, a term that found no
 * room must not be left out in silence. */
START_TEST(settling_survives_failing_allocations) {
    for (int outcomes = 6; outcomes <= 8; outcomes++) {
        char text[32];
        (void)snprintf(text, sizeof text, "A:#%d ; B:#9", outcomes);
        bal_network *network = network_of(text);
        bal_cells *counts = equal_cells(network, 2);
        bal_prior *prior = open_prior(network, BAL_PRIOR_BDEU, BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD);
        ck_assert_uint_eq(survive_allocations(settle, &(settling){prior, counts}), 3);
        bal_prior_free(prior);
        bal_cells_free(counts);
        bal_network_free(network);
    }
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("strength");
    TCase *c = tcase_create("strength");
    tcase_set_timeout(c, 60);
    tcase_add_loop_test(c, the_choice_is_that_of_20001_points, 1, 4);
    tcase_add_loop_test(c, the_choice_is_that_of_brute_force_on_many_tables, 1, 26);
    tcase_add_loop_test(c, an_experts_scale_is_chosen_too, 1, 16);
    tcase_add_loop_test(c, known_choices, 0, sizeof known / sizeof known[0]);
    tcase_add_test(c, a_given_strength_is_taken_as_it_is);
    tcase_add_loop_test(c, the_printed_value_reproduces_the_pseudo_counts, 1, 6);
    tcase_add_loop_test(c, large_counts_are_settled, 0, sizeof large / sizeof large[0]);
    tcase_add_loop_test(c, the_order_of_variables_and_outcomes_does_not_matter, 1, 11);
    tcase_add_test(c, fractional_counts_are_settled);
    tcase_add_test(c, counts_in_a_structural_zero_have_no_strength);
    tcase_add_test(c, settling_survives_failing_allocations);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
