#include "ballast/score.h"

#include "model/cells.h"
#include "support/fixtures.h"

#include <float.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

static double log_marginal(const bal_cells *alpha, const bal_cells *counts, size_t v) {
    double score = NAN;
    bal_error err = {0};
    ck_assert_msg(bal_log_marginal_likelihood(alpha, counts, v, &score, &err) == BAL_OK, "%s", err.message);
    return score;
}

static double left_out(const bal_cells *alpha, const bal_cells *counts, size_t v) {
    double score = NAN;
    bal_error err = {0};
    ck_assert_msg(bal_leave_one_out(alpha, counts, v, &score, &err) == BAL_OK, "%s", err.message);
    return score;
}

static bal_scores scores_of(const bal_cells *alpha, const bal_cells *counts) {
    bal_scores scores = {NAN, NAN};
    bal_error err = {0};
    ck_assert_msg(bal_score(alpha, counts, &scores, &err) == BAL_OK, "%s", err.message);
    return scores;
}

/* The probability of a sequence with these counts of two outcomes, every pseudo-count alpha. */
static double sequence_probability(double alpha, double n_first, double n_second) {
    bal_network *network = network_of("X:a,b");
    bal_cells *pseudo_counts = equal_cells(network, alpha), *counts = cells_of(network, (const double[]){n_first, n_second});
    double score = log_marginal(pseudo_counts, counts, 0);
    bal_cells_free(pseudo_counts);
    bal_cells_free(counts);
    bal_network_free(network);
    return exp(score);
}

/* ---- published values ---- */

/* Cooper & Herskovits, Machine Learning 9 (1992) 309-347, Table 1: ten cases, and the exact K2 scores of two
 * structures: 2.23e-9 and 2.23e-10 as printed (recalled from memory), 1/449064000 and 1/4490640000 as fractions
 * (recomputed). */
static const int ten_cases[] = {1, 0, 0, 1, 1, 1, 0, 0, 1, 1, 1, 1, 0, 0, 0, 0, 1, 1, 1, 1, 1, 0, 0, 0, 1, 1, 1, 0, 0, 0};

START_TEST(cooper_and_herskovits) {
    static const struct {
        const char *network;
        double one_in;
    } structures[] = {{"x1:#2 ; x2:#2 | x1 ; x3:#2 | x2", 449064000.0}, {"x1:#2 ; x2:#2 | x1 ; x3:#2 | x1", 4490640000.0}};
    for (size_t i = 0; i < 2; i++) {
        bal_network *network = network_of(structures[i].network);
        bal_cells *alpha = equal_cells(network, 1), *counts = counts_of(network, ten_cases, 10);
        ck_assert(near(exp(-scores_of(alpha, counts).log_marginal_likelihood), structures[i].one_in, 1e-13));
        bal_cells_free(alpha);
        bal_cells_free(counts);
        bal_network_free(network);
    }
}
END_TEST

/* Krichevsky & Trofimov, IEEE Trans. Inf. Theory 27 (1981) 199-207, as tabled by Willems, Shtarkov & Tjalkens, ibid. 41
 * (1995) 653-664: the probability of a sequence with these counts under Jeffreys' prior (recalled from memory; exact
 * fractions). */
static const struct {
    double zeros, ones, above, below;
} krichevsky_trofimov[] = {
    {0, 0, 1, 1},  {1, 0, 1, 2},    {2, 0, 3, 8},  {1, 1, 1, 8},   {3, 0, 5, 16},   {2, 1, 1, 16}, {4, 0, 35, 128},
    {3, 1, 5, 128}, {2, 2, 3, 128}, {5, 0, 63, 256}, {4, 1, 7, 256}, {3, 2, 3, 256},
};

START_TEST(krichevsky_and_trofimov) {
    double p = sequence_probability(0.5, krichevsky_trofimov[_i].zeros, krichevsky_trofimov[_i].ones);
    ck_assert(near(p, krichevsky_trofimov[_i].above / krichevsky_trofimov[_i].below, 8 * DBL_EPSILON));
    p = sequence_probability(0.5, krichevsky_trofimov[_i].ones, krichevsky_trofimov[_i].zeros);
    ck_assert(near(p, krichevsky_trofimov[_i].above / krichevsky_trofimov[_i].below, 8 * DBL_EPSILON));
}
END_TEST

/* MacKay, Information Theory, Inference, and Learning Algorithms (2003), section 3.3, Table 3.5: the bent coin, a
 * uniform prior against p = 1/6; the ratios as printed (recalled from memory; the fourth is printed as .356, exactly it
 * is .35547). */
static const struct {
    double n_a, n_b, ratio, half_unit;
} bent_coin[] = {{5, 1, 222.2, 0.05},    {3, 3, 2.67, 0.005},   {2, 4, 0.71, 0.005}, {1, 5, 0.356, 0.0006},
                 {0, 6, 0.427, 0.0005},  {10, 10, 96.5, 0.05},  {3, 17, 0.2, 0.05},  {0, 20, 1.83, 0.005}};

START_TEST(mackays_bent_coin) {
    double fair = pow(1.0 / 6, bent_coin[_i].n_a) * pow(5.0 / 6, bent_coin[_i].n_b);
    double ratio = sequence_probability(1, bent_coin[_i].n_a, bent_coin[_i].n_b) / fair;
    ck_assert_msg(fabs(ratio - bent_coin[_i].ratio) <= bent_coin[_i].half_unit, "%g", ratio);
}
END_TEST

/* MacKay (2003), exercise 3.15: 140 heads in 250 spins, Beta(a, a) against p = 1/2; as printed (recalled from memory),
 * and recomputed with 50 digits (Python's mpmath). */
static const struct {
    double alpha, printed, half_unit, exact;
} euro[] = {{0.37, 0.25, 0.005, 0.24771964733648}, {1, 0.48, 0.005, 0.47672335916076},  {2.7, 0.82, 0.005, 0.81848730807694},
            {7.4, 1.3, 0.05, 1.28584576916645},    {20, 1.8, 0.05, 1.75770278587856},   {55, 1.9, 0.05, 1.93585970039914},
            {148, 1.7, 0.05, 1.68133505051220},    {403, 1.3, 0.05, 1.33835917438891},  {1096, 1.1, 0.05, 1.13921807449797}};

START_TEST(mackays_euro) {
    double ratio = sequence_probability(euro[_i].alpha, 140, 110) * 0x1p250;
    ck_assert_msg(fabs(ratio - euro[_i].printed) <= euro[_i].half_unit, "%g", ratio);
    ck_assert(near(ratio, euro[_i].exact, 1e-12));
}
END_TEST

/* Rows of two or three outcomes, and both scores to 25 digits (Python's mpmath with 50 digits). */
static const struct {
    double alpha[3], n[3], marginal, left_out;
} exact_rows[] = {
    {{0.5, 0.5, 0}, {1e9, 0, 0}, -10.93399786152290566515268, -0.5000000001250000000416667},
    {{0.5, 0.5, 0}, {1e9, 3, 0}, -72.47518671893976498889414, -62.92092531984176826847685},
    {{0.01, 0.02, 0}, {1e6, 1e6, 0}, -1386305.034470694706112043, -1386295.361120625644395572},
    {{1e6, 3, 0}, {7, 1e8, 0}, -5610151.168286097452985833, -995072.3020097621510198341},
    {{1e-9, 1, 0}, {1, 1, 0}, -21.41641301900635640267256, -22.1095601990663017124648},
    {{5e9, 5e9, 0}, {3, 4, 0}, -4.852030264219617165845625, -4.852030264519617165620625},
    {{2.5, 0.25, 7}, {0, 1, 2}, -4.476968950558336966716548, -4.618970999530722666290531},
};

START_TEST(scores_keep_their_digits) {
    bal_network *network = network_of("X:a,b,c");
    bal_cells *alpha = cells_of(network, exact_rows[_i].alpha), *counts = cells_of(network, exact_rows[_i].n);
    double total = bali_row_sum(exact_rows[_i].n, 3), terms = total * log(total + 1); /* the size of what is subtracted */
    double marginal = log_marginal(alpha, counts, 0), loo = left_out(alpha, counts, 0);
    ck_assert_msg(fabs(marginal - exact_rows[_i].marginal) <= 1e-12 + 8 * DBL_EPSILON * terms, "%.17g", marginal);
    ck_assert_msg(near(loo, exact_rows[_i].left_out, 4e-15), "%.17g", loo);
    bal_cells_free(alpha);
    bal_cells_free(counts);
    bal_network_free(network);
}
END_TEST

/* ---- laws ---- */

typedef struct random_case {
    bal_network *network;
    bal_cells *alpha, *counts;
    int *codes;
    size_t n_records, n;
} random_case;

/* Half of the seeds have an expert's pseudo-counts with structural zeros, in which no record falls. */
static void set_up(random_case *c, int seed, size_t n_records) {
    dice d = dice_of(seed);
    c->network = random_network(&d, 6, 1, 4, 3);
    c->n = bal_network_variables(c->network);
    c->n_records = n_records;
    bal_cells *tables = random_tables(&d, c->network, 0.2);
    c->codes = random_codes(&d, tables, n_records, 0);
    c->counts = counts_of(c->network, c->codes, n_records);
    c->alpha = equal_cells(c->network, 0);
    bal_prior *prior = seed % 2 ? expert_prior(tables, 6, 0, 1) : simple_prior(c->network, BAL_PRIOR_BDEU, 2.5);
    bal_prior_fill(prior, seed % 2 ? 1 : 2.5, c->alpha);
    bal_prior_free(prior);
    bal_cells_free(tables);
}

static void tear_down(random_case *c) {
    free(c->codes);
    bal_cells_free(c->alpha);
    bal_cells_free(c->counts);
    bal_network_free(c->network);
}

/* ln of the predictive probability of a record in one family, from pseudo-counts and counts by plain loops. */
static double log_prediction(const bal_cells *alpha, const bal_cells *counts, size_t v, size_t cell) {
    size_t r = bal_network_outcomes(bal_cells_network(alpha), v), row = cell / r * r;
    double total = 0;
    for (size_t k = 0; k < r; k++) total += bal_cells_family(alpha, v)[row + k] + bal_cells_family(counts, v)[row + k];
    return log((bal_cells_family(alpha, v)[cell] + bal_cells_family(counts, v)[cell]) / total);
}

/* Dawid 1984: the log-likelihoods of records predicted one after another, in whatever order, sum up to the log marginal
 * likelihood. */
START_TEST(one_step_predictions_multiply_to_the_marginal_likelihood) {
    random_case c;
    set_up(&c, _i, 120);
    double marginal = scores_of(c.alpha, c.counts).log_marginal_likelihood;
    for (size_t order = 0; order < 3; order++) {
        static const size_t strides[] = {1, 7, 113}; /* without a divisor in common with 120 */
        bal_cells *seen = equal_cells(c.network, 0);
        double sum = 0;
        for (size_t i = 0; i < c.n_records; i++) {
            const int *record = c.codes + (i * strides[order] + order) % c.n_records * c.n;
            for (size_t v = 0; v < c.n; v++) {
                size_t cell = cell_of(c.network, v, record);
                sum += log_prediction(c.alpha, seen, v, cell);
                bal_cells_edit(seen, v)[cell] += 1;
            }
        }
        ck_assert_msg(near(sum, marginal, 1e-12), "seed %d, order %zu: %.17g, %.17g", _i, order, sum, marginal);
        bal_cells_free(seen);
    }
    tear_down(&c);
}
END_TEST

START_TEST(leaving_one_out_is_what_brute_force_gives) {
    random_case c;
    set_up(&c, _i, 120);
    double sum = 0;
    for (size_t i = 0; i < c.n_records; i++) {
        bal_cells *others = counts_of(c.network, c.codes, i),
                  *behind = counts_of(c.network, c.codes + (i + 1) * c.n, c.n_records - i - 1);
        bali_cells_add(others, behind);
        for (size_t v = 0; v < c.n; v++) sum += log_prediction(c.alpha, others, v, cell_of(c.network, v, c.codes + i * c.n));
        bal_cells_free(others);
        bal_cells_free(behind);
    }
    double closed = scores_of(c.alpha, c.counts).leave_one_out;
    ck_assert_msg(near(sum, closed, 1e-12), "seed %d: %.17g, %.17g", _i, sum, closed);
    tear_down(&c);
}
END_TEST

START_TEST(the_scores_of_families_sum_up) {
    random_case c;
    set_up(&c, _i, 50);
    double marginal = 0, loo = 0;
    for (size_t v = 0; v < c.n; v++) {
        marginal += log_marginal(c.alpha, c.counts, v);
        loo += left_out(c.alpha, c.counts, v);
    }
    bal_scores scores = scores_of(c.alpha, c.counts);
    ck_assert(near(scores.log_marginal_likelihood, marginal, 1e-14));
    ck_assert(near(scores.leave_one_out, loo, 1e-14));
    ck_assert(scores.log_marginal_likelihood <= 0 && scores.leave_one_out <= 0);
    tear_down(&c);
}
END_TEST

/* Heckerman, Geiger & Chickering 1995: structures that say the same score the same under BDeu; K2 does not promise that. */
START_TEST(equivalent_structures_score_the_same_under_bdeu) {
    static const char *const chains[] = {"A:#2 ; B:#3 | A ; C:#4 | B", "A:#2 | B ; B:#3 ; C:#4 | B",
                                         "A:#2 | B ; B:#3 | C ; C:#4"};
    dice d = dice_of(_i);
    bal_network *first = network_of(chains[0]);
    bal_cells *tables = random_tables(&d, first, 0);
    int *codes = random_codes(&d, tables, 60, 0);
    double scores[3];
    for (size_t i = 0; i < 3; i++) {
        bal_network *network = network_of(chains[i]);
        bal_prior *prior = simple_prior(network, BAL_PRIOR_BDEU, 5);
        bal_cells *alpha = equal_cells(network, 0), *counts = counts_of(network, codes, 60);
        bal_prior_fill(prior, 5, alpha);
        scores[i] = scores_of(alpha, counts).log_marginal_likelihood;
        bal_cells_free(alpha);
        bal_cells_free(counts);
        bal_prior_free(prior);
        bal_network_free(network);
    }
    ck_assert(near(scores[1], scores[0], 1e-13) && near(scores[2], scores[0], 1e-13));
    free(codes);
    bal_cells_free(tables);
    bal_network_free(first);
}
END_TEST

START_TEST(the_order_of_variables_and_outcomes_does_not_matter) {
    random_case c;
    set_up(&c, _i, 80);
    bal_network *reversed = reversed_network(c.network);
    int *codes = reversed_codes(c.network, c.codes, c.n_records);
    bal_cells *counts = counts_of(reversed, codes, c.n_records);
    bal_prior *prior = simple_prior(c.network, BAL_PRIOR_BDEU, 2.5),
              *prior_reversed = simple_prior(reversed, BAL_PRIOR_BDEU, 2.5);
    bal_cells *alpha = equal_cells(c.network, 0), *alpha_reversed = equal_cells(reversed, 0);
    bal_prior_fill(prior, 2.5, alpha);
    bal_prior_fill(prior_reversed, 2.5, alpha_reversed);
    bal_scores one = scores_of(alpha, c.counts), other = scores_of(alpha_reversed, counts);
    ck_assert(near(other.log_marginal_likelihood, one.log_marginal_likelihood, 1e-14));
    ck_assert(near(other.leave_one_out, one.leave_one_out, 1e-14));
    free(codes);
    bal_cells_free(counts);
    bal_cells_free(alpha);
    bal_cells_free(alpha_reversed);
    bal_prior_free(prior);
    bal_prior_free(prior_reversed);
    bal_network_free(reversed);
    tear_down(&c);
}
END_TEST

START_TEST(no_record_scores_nothing) {
    random_case c;
    set_up(&c, _i, 0);
    bal_scores scores = scores_of(c.alpha, c.counts);
    ck_assert_double_eq(scores.log_marginal_likelihood, 0);
    ck_assert_double_eq(scores.leave_one_out, 0);
    tear_down(&c);
}
END_TEST

/* A structural zero scores as if the outcome did not exist, to the last bit: no special function has seen it. */
START_TEST(a_structural_zero_is_as_if_it_were_not_there) {
    bal_network *with = network_of("A:x,y,zero"), *without = network_of("A:x,y");
    bal_cells *alpha_with = cells_of(with, (const double[]){3, 5, 0}), *counts_with = cells_of(with, (const double[]){20, 1, 0});
    bal_cells *alpha = cells_of(without, (const double[]){3, 5}), *counts = cells_of(without, (const double[]){20, 1});
    ck_assert_double_eq(log_marginal(alpha_with, counts_with, 0), log_marginal(alpha, counts, 0));
    ck_assert_double_eq(left_out(alpha_with, counts_with, 0), left_out(alpha, counts, 0));
    bal_cells_free(alpha_with);
    bal_cells_free(counts_with);
    bal_cells_free(alpha);
    bal_cells_free(counts);
    bal_network_free(with);
    bal_network_free(without);
}
END_TEST

START_TEST(single_outcomes_score_nothing) {
    bal_network *network = network_of("A:only ; B:only | A");
    bal_cells *alpha = equal_cells(network, 0.3), *counts = equal_cells(network, 1000);
    bal_scores scores = scores_of(alpha, counts);
    ck_assert_double_eq(scores.log_marginal_likelihood, 0);
    ck_assert_double_eq(scores.leave_one_out, 0);
    bal_cells_free(alpha);
    bal_cells_free(counts);
    bal_network_free(network);
}
END_TEST

/* ---- refusals ---- */

static const struct {
    double alpha, n; /* of row 2 (B = 1), outcome 3 of A */
    bal_status status;
    const char *code, *says;
} refusals[] = {
    {-1, 3, BAL_ERR_ARGUMENT, "bad-count", "row 2, outcome 3 of A has pseudo-count -1 and count 3"},
    {NAN, 3, BAL_ERR_ARGUMENT, "bad-count", "row 2, outcome 3 of A"},
    {INFINITY, 3, BAL_ERR_ARGUMENT, "bad-count", "row 2, outcome 3 of A"},
    {1, -3, BAL_ERR_ARGUMENT, "bad-count", "row 2, outcome 3 of A has pseudo-count 1 and count -3"},
    {1, NAN, BAL_ERR_ARGUMENT, "bad-count", "row 2, outcome 3 of A"},
    {1, INFINITY, BAL_ERR_ARGUMENT, "bad-count", "row 2, outcome 3 of A"},
    {0, 1, BAL_ERR_DATA, "structural-zero", "A=2 given B=1 is impossible under the prior, yet records have it"},
};

START_TEST(a_bad_number_is_refused) {
    bal_network *network = network_of("A:#3 | B ; B:#2");
    bal_cells *alpha = equal_cells(network, 1), *counts = equal_cells(network, 2);
    bal_cells_edit(alpha, 0)[5] = refusals[_i].alpha;
    bal_cells_edit(counts, 0)[5] = refusals[_i].n;
    double score = 7;
    bal_scores scores = {8, 9};
    bal_error err = {0};
    ck_assert_int_eq(bal_log_marginal_likelihood(alpha, counts, 0, &score, &err), refusals[_i].status);
    ck_assert_str_eq(err.code, refusals[_i].code);
    ck_assert_msg(strstr(err.message, refusals[_i].says), "%s", err.message);
    ck_assert_str_eq(err.variable, "A");
    ck_assert_int_eq(bal_leave_one_out(alpha, counts, 0, &score, NULL), refusals[_i].status);
    ck_assert_int_eq(bal_score(alpha, counts, &scores, NULL), refusals[_i].status);
    ck_assert(score == 7 && scores.log_marginal_likelihood == 8 && scores.leave_one_out == 9); /* untouched */
    ck_assert_int_eq(bal_log_marginal_likelihood(alpha, counts, 1, &score, NULL), BAL_OK); /* the other family is fine */
    bal_cells_free(alpha);
    bal_cells_free(counts);
    bal_network_free(network);
}
END_TEST

/* Pseudo-counts whose row sums to infinity. */
START_TEST(a_score_that_is_not_finite_is_refused) {
    bal_network *network = network_of("A:#3");
    bal_cells *alpha = equal_cells(network, 1e308), *counts = equal_cells(network, 2);
    double score = 7;
    bal_error err = {0};
    ck_assert_int_eq(bal_log_marginal_likelihood(alpha, counts, 0, &score, &err), BAL_ERR_NUMERIC);
    ck_assert_str_eq(err.code, "not-finite");
    ck_assert_int_eq(bal_leave_one_out(alpha, counts, 0, &score, NULL), BAL_ERR_NUMERIC);
    ck_assert(score == 7);
    bal_cells_free(alpha);
    bal_cells_free(counts);
    bal_network_free(network);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("score");
    TCase *c = tcase_create("score");
    tcase_add_test(c, cooper_and_herskovits);
    tcase_add_loop_test(c, krichevsky_and_trofimov, 0, sizeof krichevsky_trofimov / sizeof krichevsky_trofimov[0]);
    tcase_add_loop_test(c, mackays_bent_coin, 0, sizeof bent_coin / sizeof bent_coin[0]);
    tcase_add_loop_test(c, mackays_euro, 0, sizeof euro / sizeof euro[0]);
    tcase_add_loop_test(c, scores_keep_their_digits, 0, sizeof exact_rows / sizeof exact_rows[0]);
    tcase_add_loop_test(c, one_step_predictions_multiply_to_the_marginal_likelihood, 1, 21);
    tcase_add_loop_test(c, leaving_one_out_is_what_brute_force_gives, 1, 21);
    tcase_add_loop_test(c, the_scores_of_families_sum_up, 1, 6);
    tcase_add_loop_test(c, equivalent_structures_score_the_same_under_bdeu, 1, 11);
    tcase_add_loop_test(c, the_order_of_variables_and_outcomes_does_not_matter, 1, 11);
    tcase_add_loop_test(c, no_record_scores_nothing, 1, 3);
    tcase_add_test(c, a_structural_zero_is_as_if_it_were_not_there);
    tcase_add_test(c, single_outcomes_score_nothing);
    tcase_add_loop_test(c, a_bad_number_is_refused, 0, sizeof refusals / sizeof refusals[0]);
    tcase_add_test(c, a_score_that_is_not_finite_is_refused);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
