#include "support/heldout_twin.h"

#include "support/fixtures.h"

#include <math.h>
#include <stdlib.h>

typedef struct twin_record {
    bool incomplete, impossible, undefined;
    double log_bayes, log_prior, log_ml, quadratic_bayes, quadratic_ml;
} twin_record;

static size_t fold_of(const trial *t, size_t record) {
    size_t *run = malloc(t->n_folds * sizeof *run);
    ck_assert_ptr_nonnull(run);
    bal_fold_run(bal_fold_key(t->seed, 0), t->places[record] / t->n_folds, t->n_folds, run); /* test_folds.c has the rule */
    size_t fold = run[t->places[record] % t->n_folds];
    free(run);
    return fold;
}

static bal_cells *training_counts(const trial *t, const size_t *folds, size_t fold) {
    size_t n = bal_network_variables(t->network);
    bal_cells *counts = equal_cells(t->network, 0);
    for (size_t i = 0; i < t->n_records; i++)
        for (size_t v = 0; v < n && folds[i] != fold; v++) {
            size_t cell = cell_of(t->network, v, t->codes + i * n);
            if (cell != BAL_NONE) bal_cells_edit(counts, v)[cell] += 1;
        }
    return counts;
}

/* sum_k (p_k - 1[k = outcome])^2 */
static double quadratic(const double *p, size_t r, size_t outcome) {
    double sum = 0;
    for (size_t k = 0; k < r; k++) sum += (p[k] - (k == outcome)) * (p[k] - (k == outcome));
    return sum;
}

static void predict_family(const double *alpha, const double *n, size_t r, size_t outcome, twin_record *record) {
    double bayes[16], ml[16], alpha_total = 0, total = 0, n_total = 0;
    for (size_t k = 0; k < r; k++) {
        bayes[k] = alpha[k] > 0 ? alpha[k] + n[k] : 0; /* a structural zero */
        alpha_total += alpha[k];
        total += bayes[k];
        n_total += n[k];
    }
    for (size_t k = 0; k < r; k++) {
        bayes[k] /= total;
        ml[k] = n_total > 0 ? n[k] / n_total : 1 / (double)r;
    }
    if (n_total > 0 && n[outcome] <= 0) record->impossible = true;
    if (n_total <= 0) record->undefined = true;
    record->log_bayes += log(bayes[outcome]);
    record->log_prior += log(alpha[outcome] / alpha_total);
    record->log_ml += log(ml[outcome]);
    record->quadratic_bayes += quadratic(bayes, r, outcome);
    record->quadratic_ml += quadratic(ml, r, outcome);
}

static void predict_record(const trial *t, const int *codes, const bal_cells *alpha, const bal_cells *training,
                           twin_record *record) {
    for (size_t v = 0; v < bal_network_variables(t->network); v++) {
        size_t cell = cell_of(t->network, v, codes), r = bal_network_outcomes(t->network, v);
        if (cell == BAL_NONE) {
            record->incomplete = true;
            return;
        }
        predict_family(bal_cells_family(alpha, v) + cell / r * r, bal_cells_family(training, v) + cell / r * r, r, cell % r,
                       record);
    }
}

static void predict_fold(const trial *t, const size_t *folds, size_t fold, twin_record *records, bal_heldout *out) {
    size_t scored = 0;
    bal_strength strength;
    bal_cells *training = training_counts(t, folds, fold), *alpha = equal_cells(t->network, 0);
    ck_assert_int_eq(bal_prior_settle(t->prior, training, &strength, NULL), BAL_OK);
    bal_prior_fill(t->prior, strength.value, alpha);
    for (size_t i = 0; i < t->n_records; i++) {
        if (folds[i] != fold) continue;
        predict_record(t, t->codes + i * bal_network_variables(t->network), alpha, training, &records[i]);
        scored += !records[i].incomplete;
    }
    if (scored > 0) {
        out->least_strength = fmin(out->least_strength, strength.value); /* NaN at the start gives way */
        out->largest_strength = fmax(out->largest_strength, strength.value);
    }
    bal_cells_free(training);
    bal_cells_free(alpha);
}

/* Means, the paired difference, and its standard error by the sample standard deviation over sqrt n. */
static bal_paired pair(const double *bayes, const double *ml, size_t n) {
    double sum_bayes = 0, sum_ml = 0, squares = 0;
    for (size_t i = 0; i < n; i++) {
        sum_bayes += bayes[i];
        sum_ml += ml[i];
    }
    bal_paired p = {sum_bayes / (double)n, sum_ml / (double)n, (sum_bayes - sum_ml) / (double)n, NAN};
    for (size_t i = 0; i < n; i++) squares += (bayes[i] - ml[i] - p.mean_difference) * (bayes[i] - ml[i] - p.mean_difference);
    if (n >= 2) p.standard_error = sqrt(squares / (double)(n - 1)) / sqrt((double)n);
    return p;
}

static void sum_up(const twin_record *records, size_t n_records, bal_heldout *out) {
    double bayes[MOST_RECORDS] = {0}, ml[MOST_RECORDS] = {0}, quadratic_bayes[MOST_RECORDS] = {0},
           quadratic_ml[MOST_RECORDS] = {0};
    double others = 0, ml_total = 0;
    for (size_t i = 0; i < n_records; i++) {
        const twin_record *r = &records[i];
        if (r->incomplete) {
            out->incomplete++;
            continue;
        }
        quadratic_bayes[out->records] = r->quadratic_bayes;
        quadratic_ml[out->records++] = r->quadratic_ml;
        out->bayes_log_likelihood += r->log_bayes;
        out->prior_log_likelihood += r->log_prior;
        out->bayes_impossible += r->log_bayes == -INFINITY;
        if (r->impossible) out->impossible++;
        else if (r->undefined) out->undefined++;
        if (r->impossible || r->undefined) {
            others += r->log_bayes;
        } else {
            ml_total += r->log_ml;
            bayes[out->comparable] = r->log_bayes;
            ml[out->comparable++] = r->log_ml;
        }
    }
    double n_others = (double)(out->impossible + out->undefined);
    out->ml_log_likelihood = out->impossible ? -INFINITY : out->undefined ? NAN : ml_total;
    out->on_comparable = pair(bayes, ml, out->comparable);
    out->bayes_on_others = others / n_others;
    out->break_even = n_others > 0 ? (out->bayes_log_likelihood - ml_total) / n_others : NAN;
    out->quadratic = pair(quadratic_bayes, quadratic_ml, out->records);
}

bal_heldout heldout_twin(const trial *t) {
    bal_heldout out = {.least_strength = NAN, .largest_strength = NAN};
    twin_record *records = calloc(MOST_RECORDS, sizeof *records);
    size_t folds[MOST_RECORDS];
    ck_assert_ptr_nonnull(records);
    for (size_t i = 0; i < t->n_records; i++) folds[i] = fold_of(t, i);
    for (size_t f = 0; f < t->n_folds; f++) predict_fold(t, folds, f, records, &out);
    sum_up(records, t->n_records, &out);
    free(records);
    return out;
}
