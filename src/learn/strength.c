/* Choosing how strong a prior is.
 *
 * Both scores are sums over cells and rows of a function of (pseudo-count at strength 1, count). Cells that agree in both
 * are one term with a multiplicity, so that a large network with few distinct counts costs little:
 *
 *   log marginal likelihood  sum times x ln (s u)_n
 *   leave-one-out            sum times x n ln (s u + n - 1)          times < 0 for the rows' totals
 *
 * What is the same for every strength s is left out: ln u of a single record (n = 1: ln s + ln u), and n ln (n - 1) of the
 * leave-one-out terms. So a table that no strength explains better than another has no term at all, whatever the last bits of
 * a logarithm, and large counts do not drown the differences.
 */
#include "ballast/prior.h"

#include "base/mathematics.h"
#include "base/memory.h"
#include "base/numbers.h"
#include "learn/prior_parts.h"
#include "model/cells.h"

#include <math.h>
#include <stdlib.h>

typedef struct term {
    double unit, n, times;
} term;

typedef struct score_terms {
    term *terms;
    size_t n_terms, capacity;
    bool leave_one_out;
} score_terms;

static bool add_term(score_terms *s, double unit, double n, double times) {
    if (n <= 0) return true;
    if (n == 1 && unit > 0) unit = 1;
    if (!bali_grow((void **)&s->terms, &s->capacity, s->n_terms + 1, sizeof *s->terms)) return false;
    s->terms[s->n_terms++] = (term){unit, n, times};
    return true;
}

static bool add_family(score_terms *s, const bal_prior *prior, size_t v, const double *n) {
    size_t rows = bal_network_rows(prior->network, v), r = bal_network_outcomes(prior->network, v);
    const double *units = prior->units ? bal_cells_family(prior->units, v) : NULL;
    double constant = units ? 0 : bali_prior_unit(prior, v);
    for (size_t row = 0; row < rows; row++, n += r, units = units ? units + r : NULL) {
        double total = 0, unit_total = 0;
        for (size_t k = 0; k < r; k++) {
            double unit = units ? units[k] : constant;
            total += n[k];
            unit_total += unit;
            if (!add_term(s, unit, n[k], 1)) return false;
        }
        if (!add_term(s, unit_total, total, -1)) return false;
    }
    return true;
}

static int compare_terms(const void *a, const void *b) {
    const term *x = a, *y = b;
    if (x->unit != y->unit) return x->unit < y->unit ? -1 : 1;
    if (x->n != y->n) return x->n < y->n ? -1 : 1;
    return x->times < y->times ? -1 : x->times > y->times;
}

/* Joins terms that agree in unit and count; those that cancel are gone. */
static void merge_terms(score_terms *s) {
    if (s->n_terms > 0) qsort(s->terms, s->n_terms, sizeof *s->terms, compare_terms);
    size_t kept = 0;
    for (size_t i = 0; i < s->n_terms;) {
        term joined = s->terms[i++];
        for (; i < s->n_terms && s->terms[i].unit == joined.unit && s->terms[i].n == joined.n; i++) joined.times += s->terms[i].times;
        if (joined.times != 0) s->terms[kept++] = joined;
    }
    s->n_terms = kept;
}

static bal_status collect_terms(const bal_prior *prior, const bal_cells *counts, score_terms *s, bal_error *err) {
    for (size_t v = 0; v < bal_network_variables(prior->network); v++)
        if (!add_family(s, prior, v, bal_cells_family(counts, v))) return bali_out_of_memory(err);
    merge_terms(s);
    return BAL_OK;
}

static double value_of(const term *t, double alpha, bool leave_one_out) {
    if (!leave_one_out) return bali_log_pochhammer(alpha, t->n);
    return t->n > 1 ? t->n * log1p(alpha / (t->n - 1)) : log(alpha + (t->n - 1));
}

/* The score at a strength, less what all strengths have in common. */
static double score_at(double log_strength, void *context) {
    const score_terms *s = context;
    double strength = exp(log_strength);
    bali_sum sum = {0};
    for (size_t i = 0; i < s->n_terms; i++) {
        const term *t = &s->terms[i];
        bali_sum_add(&sum, t->times * value_of(t, strength * t->unit, s->leave_one_out));
    }
    double score = bali_sum_value(&sum);
    return isnan(score) ? -INFINITY : score;
}

/* The best point of the grid, refined between its neighbours. */
static double best_log_strength(score_terms *s, int *at_end, bool *found) {
    const double low = log(BAL_STRENGTH_LEAST), high = log(BAL_STRENGTH_MOST), step = (high - low) / (BAL_STRENGTH_POINTS - 1);
    double best = low, best_score = -INFINITY;
    for (int i = 0; i < BAL_STRENGTH_POINTS; i++) {
        double x = i == BAL_STRENGTH_POINTS - 1 ? high : low + i * step, score = score_at(x, s);
        if (score > best_score) {
            best = x;
            best_score = score;
        }
    }
    *found = isfinite(best_score);
    double refined = bali_maximise(score_at, s, fmax(low, best - step), fmin(high, best + step), 1e-4);
    if (score_at(refined, s) >= best_score) best = refined;
    *at_end = best < low + 1e-3 ? -1 : best > high - 1e-3 ? 1 : 0;
    return best;
}

static bal_status refuse_fractions(bal_error *err) {
    return bal_error_set(err, BAL_ERR_DATA, "fractional-weight",
                         "some counts are not whole, so no strength can be chosen by leaving records out one by one; "
                         "choose it by the marginal likelihood (auto), or give it");
}

bal_status bal_prior_settle(const bal_prior *prior, const bal_cells *counts, bal_strength *strength, bal_error *err) {
    *strength = (bal_strength){.value = prior->strength};
    if (prior->choice == BAL_STRENGTH_GIVEN) return BAL_OK;
    strength->value = 1;
    if (!counts) return BAL_OK;
    if (prior->choice == BAL_STRENGTH_BY_LEAVE_ONE_OUT && !bali_cells_are_whole(counts)) return refuse_fractions(err);
    score_terms s = {.leave_one_out = prior->choice == BAL_STRENGTH_BY_LEAVE_ONE_OUT};
    bal_status status = collect_terms(prior, counts, &s, err);
    if (status == BAL_OK && s.n_terms > 0) {
        bool found;
        double best = best_log_strength(&s, &strength->at_end, &found);
        if (!found)
            status = bal_error_set(err, BAL_ERR_NUMERIC, "no-strength",
                                   "no strength of the prior gives these counts a finite score; give the strength yourself");
        strength->chosen = true;
        strength->value = strength->at_end < 0   ? BAL_STRENGTH_LEAST
                          : strength->at_end > 0 ? BAL_STRENGTH_MOST
                                                 : bali_round_significant(exp(best), 3);
    }
    bali_free(s.terms);
    return status;
}
