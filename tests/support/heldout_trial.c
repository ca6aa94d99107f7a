#include "support/heldout_trial.h"

#include "model/cells.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { MOST_SCORED = TRIAL_RECORDS * TRIAL_REPEATS };

typedef struct twin_record {
    bool scored, incomplete, impossible, undefined; /* neither of the first two: not held out */
    double log_bayes, log_prior, log_ml, quadratic_bayes, quadratic_ml;
} twin_record;

/* The random numbers again, from their words: splitmix64(s, i) = mix(mix(s + g) + (i + 1) g), g = 0x9E3779B97F4A7C15, mix the finaliser
 * of Steele, Lea & Flood 2014. */
static uint64_t own_mix(uint64_t z) {
    z = (z ^ (z >> 30)) * 0xBF58476D1CE4E5B9u;
    z = (z ^ (z >> 27)) * 0x94D049BB133111EBu;
    return z ^ (z >> 31);
}

static uint64_t own_splitmix64(uint64_t s, uint64_t i) {
    const uint64_t g = 0x9E3779B97F4A7C15u;
    return own_mix(own_mix(s + g) + (i + 1) * g);
}

static size_t fold_of(const trial *t, size_t repeat, size_t record) {
    size_t n_folds = t->options.folds, *run = malloc(n_folds * sizeof *run);
    ck_assert_ptr_nonnull(run);
    bal_fold_run(bal_fold_key(t->options.seed, repeat), t->places[record] / n_folds, n_folds, run); /* test_partition.c has the rule */
    size_t fold = run[t->places[record] % n_folds];
    free(run);
    return fold;
}

/* Record i is held out where splitmix64(key, i) < F 2^64, the key splitmix64(splitmix64(seed, 2), repeat). */
static bool is_held_out(const trial *t, size_t repeat, size_t record) {
    uint64_t key = own_splitmix64(own_splitmix64(t->options.seed, 2), repeat);
    return (long double)own_splitmix64(key, t->places[record]) < ldexpl(t->options.fraction, 64);
}

/* The part of a record; BAL_NONE when it is not held out. */
static size_t part_of(const trial *t, size_t repeat, size_t record) {
    switch (t->options.method) {
    case BAL_HELDOUT_FOLDS: return fold_of(t, repeat, record);
    case BAL_HELDOUT_GROUPS: return t->groups[record];
    case BAL_HELDOUT_HOLDOUT: return is_held_out(t, repeat, record) ? 0 : BAL_NONE;
    case BAL_HELDOUT_TEST: return 0;
    }
    return BAL_NONE;
}

static size_t parts_of(const trial *t) {
    return t->options.method == BAL_HELDOUT_FOLDS ? t->options.folds : t->options.method == BAL_HELDOUT_GROUPS ? t->n_groups : 1;
}

/* Whether all that a family needs was recorded. */
static bool is_recorded(const trial *t, size_t v) {
    size_t n_parents;
    const size_t *parents = bal_network_parents(t->network, v, &n_parents);
    bool touched = v == 0;
    for (size_t p = 0; p < n_parents; p++) touched |= parents[p] == 0;
    return !(t->narrow && touched);
}

/* Counts of the records that are not in a part, and of the earlier ones. */
static bal_cells *counts_without(const trial *t, const size_t *parts, size_t part) {
    size_t n = bal_network_variables(t->network);
    bal_cells *counts = equal_cells(t->network, 0);
    if (t->earlier) bali_cells_assign(counts, t->earlier);
    if (t->options.method == BAL_HELDOUT_TEST) return counts;
    for (size_t i = 0; i < t->n_records; i++)
        for (size_t v = 0; v < n && (!parts || parts[i] != part); v++) {
            size_t cell = is_recorded(t, v) ? cell_of(t->network, v, t->codes + i * n) : BAL_NONE;
            if (cell != BAL_NONE) bal_cells_edit(counts, v)[cell] += t->weights ? t->weights[i] : 1;
        }
    return counts;
}

bal_cells *trial_all_counts(const trial *t) {
    return counts_without(t, NULL, 0);
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

static void predict_record(const trial *t, const int *codes, const bal_cells *alpha, const bal_cells *training, twin_record *record) {
    for (size_t v = 0; v < bal_network_variables(t->network); v++) {
        if (!is_recorded(t, v)) continue;
        size_t cell = cell_of(t->network, v, codes), r = bal_network_outcomes(t->network, v);
        if (cell == BAL_NONE) {
            record->incomplete = true;
            return;
        }
        predict_family(bal_cells_family(alpha, v) + cell / r * r, bal_cells_family(training, v) + cell / r * r, r, cell % r, record);
    }
    record->scored = true;
}

static void predict_part(const trial *t, const size_t *parts, size_t part, twin_record *records, bal_heldout *out) {
    size_t scored = 0;
    bal_strength strength;
    bal_cells *training = counts_without(t, parts, part), *alpha = equal_cells(t->network, 0);
    ck_assert_int_eq(bal_prior_settle(t->prior, training, &strength, NULL), BAL_OK);
    bal_prior_fill(t->prior, strength.value, alpha);
    for (size_t i = 0; i < t->n_records; i++) {
        if (parts[i] != part) continue;
        predict_record(t, t->codes + i * bal_network_variables(t->network), alpha, training, &records[i]);
        scored += records[i].scored;
    }
    if (scored > 0) {
        out->least_strength = fmin(out->least_strength, strength.value); /* NaN at the start gives way */
        out->largest_strength = fmax(out->largest_strength, strength.value);
    }
    bal_cells_free(training);
    bal_cells_free(alpha);
}

static double mean_of(const double *x, size_t n) {
    double sum = 0;
    for (size_t i = 0; i < n; i++) sum += x[i];
    return sum / (double)n;
}

/* The sample standard deviation over sqrt n. */
static double standard_error_of(const double *x, size_t n) {
    double mean = mean_of(x, n), squares = 0;
    for (size_t i = 0; i < n; i++) squares += (x[i] - mean) * (x[i] - mean);
    return n >= 2 ? sqrt(squares / (double)(n - 1)) / sqrt((double)n) : NAN;
}

/* Pairs of numbers, and of which record each is. */
typedef struct pairs {
    double bayes[MOST_SCORED], ml[MOST_SCORED];
    size_t record[MOST_SCORED], n;
} pairs;

static void add_pair(pairs *p, size_t record, double bayes, double ml) {
    p->bayes[p->n] = bayes;
    p->ml[p->n] = ml;
    p->record[p->n++] = record;
}

/* Means over all pairs; the standard error is that of the means of each record's differences, over the records that have any. */
static bal_paired pair_up(const pairs *p, size_t n_records) {
    double means[TRIAL_RECORDS];
    size_t n = 0;
    for (size_t i = 0; i < n_records; i++) {
        double own[TRIAL_REPEATS];
        size_t n_own = 0;
        for (size_t at = 0; at < p->n; at++)
            if (p->record[at] == i) own[n_own++] = p->bayes[at] - p->ml[at];
        if (n_own > 0) means[n++] = mean_of(own, n_own);
    }
    double bayes = mean_of(p->bayes, p->n), ml = mean_of(p->ml, p->n);
    bool impossible = bayes == -INFINITY;
    return (bal_paired){bayes, ml, bayes - ml, impossible ? NAN : standard_error_of(means, n)};
}

/* Totals over the repeats, divided by how many there are; means over everything that was scored in any repeat. */
static void sum_up(const trial *t, twin_record (*records)[TRIAL_RECORDS], bal_heldout *out) {
    static pairs likelihoods, quadratics;
    likelihoods.n = quadratics.n = 0;
    double others = 0, ml_total = 0, repeats = (double)t->options.repeats;
    for (size_t at = 0; at < t->options.repeats * t->n_records; at++) {
        const twin_record *r = &records[at / t->n_records][at % t->n_records];
        out->incomplete += r->incomplete;
        if (!r->scored) continue;
        out->records++;
        add_pair(&quadratics, at % t->n_records, r->quadratic_bayes, r->quadratic_ml);
        out->bayes_log_likelihood += r->log_bayes;
        out->prior_log_likelihood += r->log_prior;
        out->bayes_impossible += r->log_bayes == -INFINITY;
        out->impossible += r->impossible;
        out->undefined += r->undefined && !r->impossible;
        if (r->impossible || r->undefined) {
            others += r->log_bayes;
        } else {
            ml_total += r->log_ml;
            out->comparable++;
            add_pair(&likelihoods, at % t->n_records, r->log_bayes, r->log_ml);
        }
    }
    double n_others = out->impossible + out->undefined;
    out->ml_log_likelihood = out->impossible > 0 ? -INFINITY : out->undefined > 0 ? NAN : ml_total / repeats;
    out->on_comparable = pair_up(&likelihoods, t->n_records);
    out->bayes_on_others = others / n_others;
    out->break_even = n_others > 0 ? (out->bayes_log_likelihood - ml_total) / n_others : NAN;
    out->quadratic = pair_up(&quadratics, t->n_records);
    double *totals[] = {&out->records, &out->incomplete, &out->impossible, &out->undefined, &out->comparable, &out->bayes_impossible,
                        &out->bayes_log_likelihood, &out->prior_log_likelihood};
    for (size_t i = 0; i < sizeof totals / sizeof totals[0]; i++) *totals[i] /= repeats;
}

bal_heldout trial_twin(const trial *t) {
    bal_heldout out = {.least_strength = NAN, .largest_strength = NAN, .parts = parts_of(t)};
    twin_record (*records)[TRIAL_RECORDS] = calloc(TRIAL_REPEATS, sizeof *records);
    size_t parts[TRIAL_RECORDS];
    ck_assert_ptr_nonnull(records);
    ck_assert_uint_le(t->options.repeats, TRIAL_REPEATS);
    for (size_t r = 0; r < t->options.repeats; r++) {
        for (size_t i = 0; i < t->n_records; i++) parts[i] = part_of(t, r, i);
        for (size_t p = 0; p < out.parts; p++) predict_part(t, parts, p, records[r], &out);
    }
    sum_up(t, records, &out);
    free(records);
    return out;
}

/* ---- comparing ---- */

bool trial_close(double a, double b) {
    return a == b || (isnan(a) && isnan(b)) || near(a, b, 1e-12);
}

static void check_paired(const bal_paired *got, const bal_paired *expected, const char *what, int seed) {
    ck_assert_msg(trial_close(got->bayes, expected->bayes) && trial_close(got->ml, expected->ml) && trial_close(got->mean_difference, expected->mean_difference),
                  "seed %d, %s: %.17g %.17g %.17g, expected %.17g %.17g %.17g", seed, what, got->bayes, got->ml, got->mean_difference,
                  expected->bayes, expected->ml, expected->mean_difference);
    ck_assert_msg(trial_close(got->standard_error, expected->standard_error), "seed %d, %s: standard error %.17g, expected %.17g", seed, what,
                  got->standard_error, expected->standard_error);
}

void trial_check(const bal_heldout *got, const bal_heldout *expected, int seed) {
    const struct {
        const char *name;
        double got, expected;
    } numbers[] = {
        {"records", got->records, expected->records},
        {"incomplete", got->incomplete, expected->incomplete},
        {"impossible", got->impossible, expected->impossible},
        {"undefined", got->undefined, expected->undefined},
        {"comparable", got->comparable, expected->comparable},
        {"impossible for Bayes", got->bayes_impossible, expected->bayes_impossible},
        {"bayes", got->bayes_log_likelihood, expected->bayes_log_likelihood},
        {"ml", got->ml_log_likelihood, expected->ml_log_likelihood},
        {"prior", got->prior_log_likelihood, expected->prior_log_likelihood},
        {"others", got->bayes_on_others, expected->bayes_on_others},
        {"break-even", got->break_even, expected->break_even},
        {"least strength", got->least_strength, expected->least_strength},
        {"largest strength", got->largest_strength, expected->largest_strength},
    };
    for (size_t i = 0; i < sizeof numbers / sizeof numbers[0]; i++)
        ck_assert_msg(trial_close(numbers[i].got, numbers[i].expected), "seed %d, %s: %.17g, expected %.17g", seed, numbers[i].name, numbers[i].got,
                      numbers[i].expected);
    ck_assert_uint_eq(got->parts, expected->parts);
    check_paired(&got->on_comparable, &expected->on_comparable, "comparable", seed);
    check_paired(&got->quadratic, &expected->quadratic, "quadratic", seed);
}

/* All numbers, which stand before the number of parts and after it. */
void trial_check_bits(const bal_heldout *got, const bal_heldout *expected) {
    ck_assert_mem_eq(got, expected, offsetof(bal_heldout, parts));
    ck_assert_mem_eq(&got->least_strength, &expected->least_strength, sizeof got->least_strength);
    ck_assert_mem_eq(&got->largest_strength, &expected->largest_strength, sizeof got->largest_strength);
    ck_assert_uint_eq(got->parts, expected->parts);
}

/* ---- running ---- */

bal_source *trial_source(const trial *t, size_t block_records) {
    fixture_table table = {.codes = t->codes, .n_records = t->n_records, .places = t->places, .block_records = block_records, .narrow = t->narrow};
    table.weights = t->weights;
    table.groups = t->n_groups > 0 ? t->groups : NULL;
    table.n_groups = t->n_groups;
    return source_of(bal_network_domain(t->network), &table);
}

/* Goes over a source once, as counting does: its summary is complete after that. */
static void drain(bal_source *source) {
    bal_block block;
    do ck_assert_int_eq(bal_source_next(source, &block, NULL), BAL_OK);
    while (block.n_records > 0);
}

bal_status trial_try(const trial *t, unsigned threads, size_t prediction_bytes, bal_heldout *out, bal_error *err) {
    bal_cells *counts = trial_all_counts(t);
    bal_source *source = trial_source(t, 64);
    bal_heldout_options options = t->options;
    options.threads = threads;
    if (prediction_bytes > 0) options.prediction_bytes = prediction_bytes;
    drain(source);
    bal_status status = bal_heldout_run(t->prior, counts, source, &options, out, err);
    bal_source_free(source);
    bal_cells_free(counts);
    return status;
}

bal_heldout trial_run(const trial *t) {
    bal_heldout out;
    bal_error err = {0};
    ck_assert_msg(trial_try(t, 1, 0, &out, &err) == BAL_OK, "%s", err.message);
    return out;
}

bal_heldout_options folds_options(size_t n_folds, size_t repeats) {
    bal_heldout_options options = bal_heldout_options_defaults();
    options.folds = n_folds;
    options.repeats = repeats;
    return options;
}

void trial_set_up(trial *t, int seed, size_t n_records, double missing, size_t dropped, const bal_heldout_options *options) {
    dice d = dice_of(seed);
    *t = (trial){.n_records = n_records, .options = *options};
    t->options.seed = (uint64_t)seed;
    t->network = random_network(&d, 5, 1, 4, 2);
    bal_cells *tables = random_tables(&d, t->network, 0);
    t->codes = random_codes(&d, tables, n_records, missing);
    for (size_t i = 0, place = 0; i < n_records; i++, place++) {
        if (dropped > 0 && place % dropped == 0) place++;
        t->places[i] = place;
    }
    bal_cells_free(tables);
}

bal_cells *trial_other_counts(const trial *t, int seed, size_t n_records) {
    dice d = dice_of(seed);
    bal_cells *tables = random_tables(&d, t->network, 0);
    int *codes = random_codes(&d, tables, n_records, 0);
    trial other = {.network = t->network, .codes = codes, .n_records = n_records, .narrow = t->narrow, .options = folds_options(2, 1)};
    bal_cells *counts = trial_all_counts(&other);
    free(codes);
    bal_cells_free(tables);
    return counts;
}

void trial_tear_down(trial *t) {
    free(t->codes);
    bal_cells_free(t->earlier);
    bal_network_free(t->network);
}

void trial_check_all(trial *t, int seed) {
    dice d = dice_of(seed + 77);
    bal_cells *alpha = random_tables(&d, t->network, 0);
    bal_prior *priors[] = {
        simple_prior(t->network, BAL_PRIOR_BDEU, 1),
        open_prior(t->network, BAL_PRIOR_BDEU, BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD),
        open_prior(t->network, BAL_PRIOR_JEFFREYS, BAL_STRENGTH_BY_LEAVE_ONE_OUT),
        carried_prior(alpha),
    };
    for (size_t p = 0; p < sizeof priors / sizeof priors[0]; p++) {
        t->prior = priors[p];
        bal_heldout got = trial_run(t), expected = trial_twin(t);
        trial_check(&got, &expected, seed);
        bal_prior_free(priors[p]);
    }
    bal_cells_free(alpha);
}
