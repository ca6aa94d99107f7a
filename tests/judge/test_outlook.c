#include "judge/outlook.h"

#include "support/fixtures.h"

#include <float.h>
#include <math.h>

/* Outlooks of every cell, in network order. */
static void fill(const bal_prior *prior, const bal_cells *training, bali_outlook *cells, bal_strength *strength) {
    bal_error err = {0};
    ck_assert_msg(bali_outlook_fill(prior, training, cells, strength, &err) == BAL_OK, "%s", err.message);
}

/* K2 and counts that give every number as a fraction. */
START_TEST(a_cell_is_predicted_three_ways) {
    bal_network *network = network_of("A:#2 ; B:#3 | A");
    bal_cells *training = cells_of(network, (const double[]){5, 1, /**/ 4, 0, 1, /**/ 0, 0, 0});
    bal_prior *prior = simple_prior(network, BAL_PRIOR_K2, 1);
    static const struct {
        double bayes, prior, ml;
        bali_ml_view view;
        double quadratic_bayes, quadratic_ml;
    } expected[] = {
        {6.0 / 8, 1.0 / 2, 5.0 / 6, BALI_ML_COMPARABLE, 2.0 / 16, 2.0 / 36},
        {2.0 / 8, 1.0 / 2, 1.0 / 6, BALI_ML_COMPARABLE, 18.0 / 16, 50.0 / 36},
        {5.0 / 8, 1.0 / 3, 4.0 / 5, BALI_ML_COMPARABLE, 14.0 / 64, 2.0 / 25},
        {1.0 / 8, 1.0 / 3, 0, BALI_ML_IMPOSSIBLE, 78.0 / 64, 42.0 / 25},
        {2.0 / 8, 1.0 / 3, 1.0 / 5, BALI_ML_COMPARABLE, 62.0 / 64, 32.0 / 25},
        {1.0 / 3, 1.0 / 3, 0, BALI_ML_UNDEFINED, 6.0 / 9, 6.0 / 9},
        {1.0 / 3, 1.0 / 3, 0, BALI_ML_UNDEFINED, 6.0 / 9, 6.0 / 9},
        {1.0 / 3, 1.0 / 3, 0, BALI_ML_UNDEFINED, 6.0 / 9, 6.0 / 9},
    };
    bali_outlook cells[8];
    bal_strength strength;
    fill(prior, training, cells, &strength);
    for (size_t c = 0; c < 8; c++) {
        ck_assert(near(cells[c].log_bayes, log(expected[c].bayes), 4 * DBL_EPSILON));
        ck_assert(near(cells[c].log_prior, log(expected[c].prior), 4 * DBL_EPSILON));
        ck_assert_int_eq(cells[c].ml, expected[c].view);
        ck_assert(near(cells[c].log_ml, expected[c].view == BALI_ML_COMPARABLE ? log(expected[c].ml) : 0, 4 * DBL_EPSILON));
        ck_assert(near(cells[c].quadratic_bayes, expected[c].quadratic_bayes, 8 * DBL_EPSILON));
        ck_assert(near(cells[c].quadratic_ml, expected[c].quadratic_ml, 8 * DBL_EPSILON));
    }
    bal_prior_free(prior);
    bal_cells_free(training);
    bal_network_free(network);
}
END_TEST

/* A structural zero is impossible for Bayes whatever was counted there; what was counted there is kept out of its row. */
START_TEST(a_structural_zero_is_impossible) {
    bal_network *network = network_of("A:#3");
    bal_cells *tables = cells_of(network, (const double[]){0.5, 0, 0.5}),
              *training = cells_of(network, (const double[]){3, 7, 1});
    bal_prior *prior = expert_prior(tables, 4, 0, 1);
    bali_outlook cells[3];
    bal_strength strength;
    fill(prior, training, cells, &strength);
    ck_assert(near(cells[0].log_bayes, log(5.0 / 8), 4 * DBL_EPSILON));
    ck_assert(cells[1].log_bayes == -INFINITY && cells[1].log_prior == -INFINITY);
    ck_assert(near(cells[2].log_bayes, log(3.0 / 8), 4 * DBL_EPSILON));
    ck_assert(near(cells[1].quadratic_bayes, 1 + 25.0 / 64 + 9.0 / 64, 4 * DBL_EPSILON));
    ck_assert(near(cells[1].log_ml, log(7.0 / 11), 4 * DBL_EPSILON)); /* ML knows nothing of priors */
    bal_prior_free(prior);
    bal_cells_free(tables);
    bal_cells_free(training);
    bal_network_free(network);
}
END_TEST

START_TEST(the_strength_is_settled_on_the_training_part) {
    bal_network *network = network_of("A:#2");
    bal_cells *even = cells_of(network, (const double[]){50, 50}), *sure = cells_of(network, (const double[]){50, 0});
    bal_prior *prior = open_prior(network, BAL_PRIOR_BDEU, BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD);
    bali_outlook cells[2];
    bal_strength strength;
    fill(prior, even, cells, &strength);
    ck_assert(strength.value == 10000 && strength.at_end == 1);
    ck_assert(near(cells[0].log_bayes, log(0.5), 4 * DBL_EPSILON));
    fill(prior, sure, cells, &strength);
    ck_assert(strength.value == 0.01 && strength.at_end == -1);
    ck_assert(near(cells[0].log_bayes, log(50.005 / 50.01), 4 * DBL_EPSILON));
    bal_prior_free(prior);
    bal_cells_free(even);
    bal_cells_free(sure);
    bal_network_free(network);
}
END_TEST

typedef struct filling {
    const bal_prior *prior;
    const bal_cells *training;
} filling;

static bal_status fill_once(void *context, bal_error *err) {
    const filling *f = context;
    bali_outlook cells[8];
    bal_strength strength;
    return bali_outlook_fill(f->prior, f->training, cells, &strength, err);
}

START_TEST(an_outlook_survives_failing_allocations) {
    bal_network *network = network_of("A:#2 ; B:#3 | A");
    bal_cells *training = cells_of(network, (const double[]){5, 1, 4, 0, 1, 0, 1, 0});
    bal_prior *prior = open_prior(network, BAL_PRIOR_BDEU, BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD);
    ck_assert_uint_ge(survive_allocations(fill_once, &(filling){prior, training}), 5);
    bal_prior_free(prior);
    bal_cells_free(training);
    bal_network_free(network);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("outlook");
    TCase *c = tcase_create("outlook");
    tcase_add_test(c, a_cell_is_predicted_three_ways);
    tcase_add_test(c, a_structural_zero_is_impossible);
    tcase_add_test(c, the_strength_is_settled_on_the_training_part);
    tcase_add_test(c, an_outlook_survives_failing_allocations);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
