#include "ballast/score.h"

#include "base/mathematics.h"
#include "learn/zeros.h"

#include <math.h>

/* Checks one row and gives its totals. */
static bal_status check_row(const bal_network *network, size_t variable, size_t row, const double *alpha, const double *n, double *alpha_total,
                            double *n_total, bal_error *err) {
    size_t r = bal_network_outcomes(network, variable);
    const char *name = bal_domain_name(bal_network_domain(network), variable);
    *alpha_total = *n_total = 0;
    for (size_t k = 0; k < r; k++) {
        if (!(alpha[k] >= 0 && n[k] >= 0) || !isfinite(alpha[k]) || !isfinite(n[k]))
            return bal_error_set(err, BAL_ERR_ARGUMENT, "bad-count",
                                 "row %zu, outcome %zu of %s has pseudo-count %g and count %g; both are finite and not negative", row + 1,
                                 k + 1, name, alpha[k], n[k]);
        if (alpha[k] <= 0 && n[k] > 0) return bali_refuse_zero(network, variable, row * r + k, err);
        *alpha_total += alpha[k];
        *n_total += n[k];
    }
    return BAL_OK;
}

/* ln of the row's marginal likelihood: sum_k ln (alpha_k)_{n_k} - ln (alpha)_N, structural zeros left out. */
static void add_marginal(const double *alpha, const double *n, size_t r, double alpha_total, double n_total, bali_sum *sum) {
    for (size_t k = 0; k < r; k++)
        if (n[k] > 0) bali_sum_add(sum, bali_log_pochhammer(alpha[k], n[k]));
    if (n_total > 0) bali_sum_add(sum, -bali_log_pochhammer(alpha_total, n_total));
}

/* ln [(alpha_k + n_k - 1) / (alpha + N - 1)]; n - 1 first, so that a small alpha is not lost when n = 1. Near 1 by what the
 * other outcomes have, so that n_k times it keeps its digits when n_k is large. */
static double log_left_out(double alpha, double n, double alpha_total, double n_total) {
    double total = alpha_total + (n_total - 1), others = (alpha_total - alpha) + (n_total - n);
    return 2 * others < total ? log1p(-others / total) : log((alpha + (n - 1)) / total);
}

/* sum_k n_k ln [(alpha_k + n_k - 1) / (alpha + N - 1)] */
static void add_leave_one_out(const double *alpha, const double *n, size_t r, double alpha_total, double n_total, bali_sum *sum) {
    for (size_t k = 0; k < r; k++)
        if (n[k] > 0) bali_sum_add(sum, n[k] * log_left_out(alpha[k], n[k], alpha_total, n_total));
}

typedef void (*add_row)(const double *alpha, const double *n, size_t r, double alpha_total, double n_total, bali_sum *sum);

static bal_status score_family(const bal_cells *pseudo_counts, const bal_cells *counts, size_t variable, add_row add, double *score_nats,
                               bal_error *err) {
    const bal_network *network = bal_cells_network(counts);
    size_t rows = bal_network_rows(network, variable), r = bal_network_outcomes(network, variable);
    const double *alpha = bal_cells_family(pseudo_counts, variable), *n = bal_cells_family(counts, variable);
    bali_sum sum = {0};
    for (size_t row = 0; row < rows; row++, alpha += r, n += r) {
        double alpha_total, n_total;
        bal_status status = check_row(network, variable, row, alpha, n, &alpha_total, &n_total, err);
        if (status != BAL_OK) {
            bal_error_context(err, 0, bal_domain_name(bal_network_domain(network), variable));
            return status;
        }
        add(alpha, n, r, alpha_total, n_total, &sum);
    }
    double score = bali_sum_value(&sum);
    if (!isfinite(score))
        return bal_error_set(err, BAL_ERR_NUMERIC, "not-finite", "the score of %s is not a finite number; use larger pseudo-counts",
                             bal_domain_name(bal_network_domain(network), variable));
    *score_nats = score;
    return BAL_OK;
}

bal_status bal_log_marginal_likelihood(const bal_cells *pseudo_counts, const bal_cells *counts, size_t variable, double *score_nats,
                                       bal_error *err) {
    return score_family(pseudo_counts, counts, variable, add_marginal, score_nats, err);
}

bal_status bal_leave_one_out(const bal_cells *pseudo_counts, const bal_cells *counts, size_t variable, double *score_nats, bal_error *err) {
    return score_family(pseudo_counts, counts, variable, add_leave_one_out, score_nats, err);
}

bal_status bal_score(const bal_cells *pseudo_counts, const bal_cells *counts, bal_scores *out, bal_error *err) {
    bali_sum marginal = {0}, left_out = {0};
    for (size_t v = 0; v < bal_network_variables(bal_cells_network(counts)); v++) {
        double score;
        bal_status status = bal_log_marginal_likelihood(pseudo_counts, counts, v, &score, err);
        if (status != BAL_OK) return status;
        bali_sum_add(&marginal, score);
        status = bal_leave_one_out(pseudo_counts, counts, v, &score, err);
        if (status != BAL_OK) return status;
        bali_sum_add(&left_out, score);
    }
    *out = (bal_scores){bali_sum_value(&marginal), bali_sum_value(&left_out)};
    return BAL_OK;
}
