/* What the held-out records of a part, of a repeat, of all repeats came to. */
#ifndef JUDGE_PART_SCORES_H
#define JUDGE_PART_SCORES_H

#include "base/mathematics.h"
#include "ballast/judge.h"

/** How one record is predicted, summed over its families. */
typedef struct bali_record_outlook {
    double log_bayes, log_prior, log_ml, quadratic_bayes, quadratic_ml;
    bool incomplete, impossible, undefined;
} bali_record_outlook;

/** Sums over records. Start it with = {0}. */
typedef struct bali_part_scores {
    uint64_t records, incomplete, impossible, undefined, comparable;
    uint64_t bayes_impossible, prior_impossible, comparable_bayes_impossible, other_bayes_impossible;
    bali_sum bayes, prior, bayes_on_others, bayes_on_comparable, ml_on_comparable, quadratic_bayes, quadratic_ml;
    bali_moments log_difference, quadratic_difference;
} bali_part_scores;

void bali_part_scores_add(bali_part_scores *scores, const bali_record_outlook *record);

/** all += part, in this order. */
void bali_part_scores_join(bali_part_scores *all, const bali_part_scores *part);

/**
 * The comparison that the sums of n_repeats repeats amount to. Strengths and parts are left to the caller.
 *
 * log_means, quadratic_means  moments of the records' mean differences over the repeats, for the standard errors; NULL when there
 *                             is one repeat
 */
void bali_part_scores_report(const bali_part_scores *all, size_t n_repeats, const bali_moments *log_means,
                             const bali_moments *quadratic_means, bal_heldout *out);

#endif
