#include "judge/part_scores.h"

#include <math.h>

/* Sums take finite terms only; records of probability zero are counted instead, and make the totals minus infinity. */
static void add_to_sum(bali_sum *sum, double log_p, uint64_t *impossible) {
    if (isfinite(log_p)) {
        bali_sum_add(sum, log_p);
    } else {
        ++*impossible;
    }
}

static void add_comparable(bali_part_scores *s, const bali_record_outlook *record) {
    s->comparable++;
    bali_sum_add(&s->ml_on_comparable, record->log_ml);
    add_to_sum(&s->bayes_on_comparable, record->log_bayes, &s->comparable_bayes_impossible);
    if (isfinite(record->log_bayes)) bali_moments_add(&s->log_difference, record->log_bayes - record->log_ml);
}

void bali_part_scores_add(bali_part_scores *s, const bali_record_outlook *record) {
    if (record->incomplete) {
        s->incomplete++;
        return;
    }
    s->records++;
    bali_sum_add(&s->quadratic_bayes, record->quadratic_bayes);
    bali_sum_add(&s->quadratic_ml, record->quadratic_ml);
    bali_moments_add(&s->quadratic_difference, record->quadratic_bayes - record->quadratic_ml);
    s->impossible += record->impossible;
    s->undefined += record->undefined && !record->impossible;
    add_to_sum(&s->bayes, record->log_bayes, &s->bayes_impossible);
    add_to_sum(&s->prior, record->log_prior, &s->prior_impossible);
    if (record->impossible || record->undefined) {
        add_to_sum(&s->bayes_on_others, record->log_bayes, &s->other_bayes_impossible);
    } else {
        add_comparable(s, record);
    }
}

static void join_sum(bali_sum *to, const bali_sum *from) {
    bali_sum_add(to, from->total);
    bali_sum_add(to, from->correction);
}

void bali_part_scores_join(bali_part_scores *all, const bali_part_scores *s) {
    all->records += s->records;
    all->incomplete += s->incomplete;
    all->impossible += s->impossible;
    all->undefined += s->undefined;
    all->comparable += s->comparable;
    all->bayes_impossible += s->bayes_impossible;
    all->prior_impossible += s->prior_impossible;
    all->comparable_bayes_impossible += s->comparable_bayes_impossible;
    all->other_bayes_impossible += s->other_bayes_impossible;
    join_sum(&all->bayes, &s->bayes);
    join_sum(&all->prior, &s->prior);
    join_sum(&all->bayes_on_others, &s->bayes_on_others);
    join_sum(&all->bayes_on_comparable, &s->bayes_on_comparable);
    join_sum(&all->ml_on_comparable, &s->ml_on_comparable);
    join_sum(&all->quadratic_bayes, &s->quadratic_bayes);
    join_sum(&all->quadratic_ml, &s->quadratic_ml);
    bali_moments_merge(&all->log_difference, &s->log_difference);
    bali_moments_merge(&all->quadratic_difference, &s->quadratic_difference);
}

/* A total over repeats as their mean; minus infinity when some record had probability zero. */
static double total(const bali_sum *sum, uint64_t impossible, double repeats) {
    return impossible ? -INFINITY : bali_sum_value(sum) / repeats;
}

static double mean(const bali_sum *sum, uint64_t impossible, uint64_t n) {
    return n == 0 ? NAN : impossible ? -INFINITY : bali_sum_value(sum) / (double)n;
}

static bal_paired on_comparable(const bali_part_scores *all, const bali_moments *means) {
    uint64_t n = all->comparable, impossible = all->comparable_bayes_impossible;
    bal_paired paired = {mean(&all->bayes_on_comparable, impossible, n), mean(&all->ml_on_comparable, 0, n), all->log_difference.mean,
                         bali_moments_standard_error(means)};
    if (n == 0) paired.mean_difference = NAN;
    if (impossible) paired.mean_difference = -INFINITY;
    if (impossible) paired.standard_error = NAN;
    return paired;
}

void bali_part_scores_report(const bali_part_scores *all, size_t n_repeats, const bali_moments *log_means,
                             const bali_moments *quadratic_means, bal_heldout *out) {
    double repeats = (double)n_repeats;
    uint64_t others = all->impossible + all->undefined;
    *out = (bal_heldout){
        .records = (double)all->records / repeats,
        .incomplete = (double)all->incomplete / repeats,
        .impossible = (double)all->impossible / repeats,
        .undefined = (double)all->undefined / repeats,
        .comparable = (double)all->comparable / repeats,
        .bayes_impossible = (double)all->bayes_impossible / repeats,
        .bayes_log_likelihood = total(&all->bayes, all->bayes_impossible, repeats),
        .ml_log_likelihood = all->impossible ? -INFINITY : all->undefined ? NAN : bali_sum_value(&all->ml_on_comparable) / repeats,
        .prior_log_likelihood = total(&all->prior, all->prior_impossible, repeats),
        .on_comparable = on_comparable(all, log_means ? log_means : &all->log_difference),
        .bayes_on_others = mean(&all->bayes_on_others, all->other_bayes_impossible, others),
    };
    out->quadratic = (bal_paired){mean(&all->quadratic_bayes, 0, all->records), mean(&all->quadratic_ml, 0, all->records),
                                  all->records ? all->quadratic_difference.mean : NAN,
                                  bali_moments_standard_error(quadratic_means ? quadratic_means : &all->quadratic_difference)};
    double lead = bali_sum_value(&all->bayes) - bali_sum_value(&all->ml_on_comparable);
    out->break_even = others == 0 ? NAN : all->bayes_impossible ? -INFINITY : lead / (double)others;
}
