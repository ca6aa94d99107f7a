#include "ballast/posterior.h"

#include "base/mathematics.h"
#include "model/cells.h"

#include <math.h>

/* (alpha_k + n_k) / sum of the same, for one row; uniform where the whole row is zero. */
static void mean_of_row(const double *alpha, const double *n, double *mean, size_t r) {
    double total = 0;
    for (size_t k = 0; k < r; k++) {
        mean[k] = alpha[k] + (n ? n[k] : 0);
        total += mean[k];
    }
    for (size_t k = 0; k < r; k++) mean[k] = total > 0 ? mean[k] / total : 1 / (double)r;
}

void bal_posterior_mean(const bal_cells *pseudo_counts, const bal_cells *counts, bal_cells *mean) {
    const bal_network *network = bal_cells_network(pseudo_counts);
    for (size_t v = 0; v < bal_network_variables(network); v++) {
        size_t r = bal_network_outcomes(network, v), cells = bal_network_rows(network, v) * r;
        const double *alpha = bal_cells_family(pseudo_counts, v);
        const double *n = counts ? bal_cells_family(counts, v) : NULL;
        double *to = bal_cells_edit(mean, v);
        for (size_t c = 0; c < cells; c += r) mean_of_row(alpha + c, n ? n + c : NULL, to + c, r);
    }
}

void bal_maximum_likelihood(const bal_cells *counts, bal_cells *tables, size_t *undefined_rows) {
    const bal_network *network = bal_cells_network(counts);
    size_t undefined = 0;
    for (size_t v = 0; v < bal_network_variables(network); v++) {
        size_t r = bal_network_outcomes(network, v), cells = bal_network_rows(network, v) * r;
        const double *n = bal_cells_family(counts, v);
        double *to = bal_cells_edit(tables, v);
        for (size_t c = 0; c < cells; c += r) {
            double total = bali_row_sum(n + c, r);
            undefined += total <= 0;
            for (size_t k = 0; k < r; k++) to[c + k] = total > 0 ? n[c + k] / total : 1 / (double)r;
        }
    }
    if (undefined_rows) *undefined_rows = undefined;
}

bal_status bal_credible_interval(double a, double b, double level, double *low, double *high, bal_error *err) {
    if (!(a > 0) || !(b > 0) || !isfinite(a) || !isfinite(b))
        return bal_error_set(err, BAL_ERR_ARGUMENT, "bad-shape", "Beta(%g, %g) does not exist; both shapes are finite and above 0", a, b);
    if (!(level > 0 && level < 1))
        return bal_error_set(err, BAL_ERR_ARGUMENT, "bad-level", "the level %g is not between 0 and 1", level);
    double lower, upper;
    if (!bali_beta_quantile(a, b, (1 - level) / 2, &lower) || !bali_beta_quantile(a, b, (1 + level) / 2, &upper))
        return bal_error_set(err, BAL_ERR_NUMERIC, "no-quantile",
                             "the interval of Beta(%g, %g) at level %g could not be computed; use a level nearer to 0.5", a, b, level);
    *low = lower;
    *high = upper;
    return BAL_OK;
}

bal_basis bal_row_basis(double records) {
    return records <= 0 ? BAL_BASIS_PRIOR : records < 5 ? BAL_BASIS_FEW : BAL_BASIS_DATA;
}

const char *bal_basis_name(bal_basis basis) {
    static const char *const names[] = {"prior", "few", "data"};
    return names[basis];
}

double bal_data_share(double pseudo_records, double records) {
    double all = pseudo_records + records;
    return all > 0 ? records / all : 0;
}
