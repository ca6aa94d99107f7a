#include "judge/outlook.h"

#include "base/mathematics.h"
#include "model/cells.h"

#include <math.h>

/* The quadratic score of outcome k under p: sum p^2 - 2 p_k + 1. */
static double quadratic(double squares, double p) {
    return squares - 2 * p + 1;
}

static double sum_of_squares(const double *weights, size_t r, double total) {
    double squares = 0;
    for (size_t k = 0; k < r; k++) squares += (weights[k] / total) * (weights[k] / total);
    return squares;
}

static void fill_ml(const double *n, size_t r, bali_outlook *to) {
    double total = bali_row_sum(n, r);
    double squares = total > 0 ? sum_of_squares(n, r, total) : 1 / (double)r;
    for (size_t k = 0; k < r; k++) {
        double p = total > 0 ? n[k] / total : 1 / (double)r;
        to[k].ml = total <= 0 ? BALI_ML_UNDEFINED : n[k] <= 0 ? BALI_ML_IMPOSSIBLE : BALI_ML_COMPARABLE;
        to[k].log_ml = to[k].ml == BALI_ML_COMPARABLE ? log(p) : 0;
        to[k].quadratic_ml = quadratic(squares, p);
    }
}

/* alpha + n; a structural zero stays zero, whatever was counted there. */
static void add_counts(const bal_cells *counts, bal_cells *post) {
    const double *n = bali_cells_values(counts);
    double *alpha = bali_cells_all(post);
    for (size_t c = 0; c < bal_network_cells(bal_cells_network(post)); c++)
        if (alpha[c] > 0) alpha[c] += n[c];
}

/* alpha alone gives the prior's prediction. */
static void fill_bayes(const double *alpha, const double *post, size_t r, bali_outlook *to) {
    double alpha_total = bali_row_sum(alpha, r), total = bali_row_sum(post, r);
    double squares = sum_of_squares(post, r, total);
    for (size_t k = 0; k < r; k++) {
        to[k].log_prior = log(alpha[k] / alpha_total);
        to[k].log_bayes = log(post[k] / total);
        to[k].quadratic_bayes = quadratic(squares, post[k] / total);
    }
}

bal_status bali_outlook_fill(const bal_prior *prior, const bal_cells *training, bali_outlook *cells, bal_strength *strength,
                             bal_error *err) {
    const bal_network *network = bal_cells_network(training);
    bal_cells *alpha = NULL, *post = NULL;
    bal_status status = bal_prior_settle(prior, training, strength, err);
    if (status == BAL_OK) status = bal_cells_create(network, &alpha, err);
    if (status == BAL_OK) bal_prior_fill(prior, strength->value, alpha);
    if (status == BAL_OK) status = bal_cells_copy(alpha, &post, err);
    if (status != BAL_OK) goto done;

    add_counts(training, post);
    for (size_t v = 0; v < bal_network_variables(network); v++) {
        size_t r = bal_network_outcomes(network, v), n_cells = bal_network_rows(network, v) * r;
        const double *a = bal_cells_family(alpha, v), *p = bal_cells_family(post, v), *n = bal_cells_family(training, v);
        bali_outlook *to = cells + bal_network_offset(network, v);
        for (size_t c = 0; c < n_cells; c += r) {
            fill_bayes(a + c, p + c, r, to + c);
            fill_ml(n + c, r, to + c);
        }
    }

done:
    bal_cells_free(alpha);
    bal_cells_free(post);
    return status;
}
