/* K-fold held-out comparison of Bayes and maximum likelihood (ML).
 *
 * One pass counts every fold; a training part is all counts less its fold's. A second pass scores each record by the
 * predictions of the training part that did not see it. Sums run per fold in the order of records and are joined in the order
 * of folds, so neither threads nor memory change a bit of the result. */
#include "ballast/judge.h"
#include "ballast/tally.h"

#include "base/mathematics.h"
#include "base/memory.h"
#include "base/threads.h"
#include "judge/outlook.h"
#include "learn/indexing.h"
#include "model/cells.h"
#include "model/domain.h"

#include <math.h>

bal_heldout_options bal_heldout_options_defaults(void) {
    return (bal_heldout_options){.folds = 10, .seed = 1, .threads = 1, .prediction_bytes = (size_t)256 << 20};
}

/* What one fold's records came to. */
typedef struct fold_scores {
    uint64_t records, incomplete, impossible, undefined, comparable, bayes_impossible;
    bali_sum bayes, prior, bayes_on_others, bayes_on_comparable, ml_on_comparable, quadratic_bayes, quadratic_ml;
    bali_moments log_difference, quadratic_difference;
} fold_scores;

/* How one record of a block is predicted, summed over its families. */
typedef struct record_outlook {
    double log_bayes, log_prior, log_ml, quadratic_bayes, quadratic_ml;
    bool incomplete, impossible, undefined;
} record_outlook;

typedef struct heldout {
    const bal_prior *prior;
    const bal_cells *counts;
    const bal_network *network;
    bal_source *source;
    size_t n_folds, first, last;  /* folds [first, last) are scored in this pass */
    uint64_t key;
    bal_cells **fold_counts;      /* n_folds */
    bali_outlook *outlooks;       /* (last - first) x cells */
    bal_strength *strengths;      /* n_folds */
    fold_scores *scores;          /* n_folds */
    size_t *run;                  /* folds of one run of n_folds records */
    size_t *folds;                /* of each record of a block */
    uint32_t *cells;
    record_outlook *records;
    size_t folds_capacity, cells_capacity, records_capacity;
} heldout;

static bal_status make_room(heldout *h, size_t n, bal_error *err) {
    bool made = bali_grow((void **)&h->folds, &h->folds_capacity, n, sizeof *h->folds) &&
                bali_grow((void **)&h->cells, &h->cells_capacity, n, sizeof *h->cells) &&
                bali_grow((void **)&h->records, &h->records_capacity, n, sizeof *h->records);
    return made ? BAL_OK : bali_out_of_memory(err);
}

/* The fold of every record of a block. */
static void assign_folds(heldout *h, const bal_block *block) {
    uint64_t run = UINT64_MAX;
    for (size_t t = 0; t < block->n_records; t++) {
        uint64_t place = bal_block_place(block, t);
        if (place / h->n_folds != run) {
            run = place / h->n_folds;
            bal_fold_run(h->key, run, h->n_folds, h->run);
        }
        h->folds[t] = h->run[place % h->n_folds];
    }
}

/* Goes over all blocks with their records' folds assigned. */
typedef bal_status (*block_visitor)(heldout *h, const bal_block *block, bal_error *err);

static bal_status visit_blocks(heldout *h, block_visitor visit, bal_error *err) {
    bal_status status = bal_source_rewind(h->source, err);
    while (status == BAL_OK) {
        bal_block block;
        status = bal_source_next(h->source, &block, err);
        if (status != BAL_OK || block.n_records == 0) break;
        status = make_room(h, block.n_records, err);
        if (status != BAL_OK) break;
        assign_folds(h, &block);
        status = visit(h, &block, err);
    }
    return status;
}

/* Only folds with records have counts: a few records in many folds take no more memory than they need. */
static bal_status count_folds(heldout *h, const bal_block *block, bal_error *err) {
    bal_status status = BAL_OK;
    for (size_t t = 0; t < block->n_records && status == BAL_OK; t++)
        if (!h->fold_counts[h->folds[t]]) status = bal_cells_create(h->network, &h->fold_counts[h->folds[t]], err);
    if (status != BAL_OK) return status;
    for (size_t v = 0; v < bal_network_variables(h->network); v++) {
        bali_index_family(h->network, v, block, h->cells);
        for (size_t t = 0; t < block->n_records; t++)
            if (h->cells[t] != BALI_NO_CELL) bal_cells_edit(h->fold_counts[h->folds[t]], v)[h->cells[t]] += 1;
    }
    return BAL_OK;
}

/* The folds' counts have to make up the whole, or a training part would be something that never was. */
static bal_status check_fold_counts(const heldout *h, bal_error *err) {
    bal_cells *rest = NULL;
    bal_status status = bal_cells_copy(h->counts, &rest, err);
    for (size_t f = 0; f < h->n_folds && status == BAL_OK; f++)
        if (h->fold_counts[f]) bali_cells_subtract(rest, h->fold_counts[f]);
    for (size_t c = 0; c < bal_network_cells(h->network) && status == BAL_OK; c++)
        if (bali_cells_values(rest)[c] != 0)
            status = bal_error_set(err, BAL_ERR_DATA, "changed-while-read",
                                   "the records are not those that were counted; leave the table alone while it is read, then start again");
    bal_cells_free(rest);
    return status;
}

/* One task: fits to everything but one fold. */
static bal_status fit_without_fold(void *context, size_t task, bal_error *err) {
    heldout *h = context;
    size_t fold = h->first + task;
    bal_cells *training = NULL;
    if (!h->fold_counts[fold]) return BAL_OK; /* no record to predict */
    bal_status status = bal_cells_copy(h->counts, &training, err);
    if (status == BAL_OK) {
        bali_cells_subtract(training, h->fold_counts[fold]);
        status = bali_outlook_fill(h->prior, training, h->outlooks + task * bal_network_cells(h->network), &h->strengths[fold], err);
    }
    bal_cells_free(training);
    return status;
}

static void add_family(record_outlook *record, const bali_outlook *cell) {
    record->log_bayes += cell->log_bayes;
    record->log_prior += cell->log_prior;
    record->log_ml += cell->log_ml;
    record->quadratic_bayes += cell->quadratic_bayes;
    record->quadratic_ml += cell->quadratic_ml;
    record->impossible |= cell->ml == BALI_ML_IMPOSSIBLE;
    record->undefined |= cell->ml == BALI_ML_UNDEFINED;
}

static void add_comparable(fold_scores *s, const record_outlook *record) {
    s->comparable++;
    bali_sum_add(&s->bayes_on_comparable, record->log_bayes);
    bali_sum_add(&s->ml_on_comparable, record->log_ml);
    bali_moments_add(&s->log_difference, record->log_bayes - record->log_ml);
}

static void add_record(fold_scores *s, const record_outlook *record) {
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
    s->bayes_impossible += record->log_bayes == -INFINITY; /* a structural zero; it takes every sum it is in to minus infinity */
    bali_sum_add(&s->bayes, record->log_bayes);
    bali_sum_add(&s->prior, record->log_prior);
    if (record->impossible || record->undefined) {
        bali_sum_add(&s->bayes_on_others, record->log_bayes);
    } else {
        add_comparable(s, record);
    }
}

static bal_status score_block(heldout *h, const bal_block *block, bal_error *err) {
    (void)err;
    size_t n = block->n_records, n_cells = bal_network_cells(h->network);
    for (size_t t = 0; t < n; t++) h->records[t] = (record_outlook){0};
    for (size_t v = 0; v < bal_network_variables(h->network); v++) {
        const bali_outlook *family = h->outlooks + bal_network_offset(h->network, v);
        bali_index_family(h->network, v, block, h->cells);
        for (size_t t = 0; t < n; t++) {
            if (h->folds[t] < h->first || h->folds[t] >= h->last) continue;
            if (h->cells[t] == BALI_NO_CELL) {
                h->records[t].incomplete = true;
            } else {
                add_family(&h->records[t], &family[(h->folds[t] - h->first) * n_cells + h->cells[t]]);
            }
        }
    }
    for (size_t t = 0; t < n; t++)
        if (h->folds[t] >= h->first && h->folds[t] < h->last) add_record(&h->scores[h->folds[t]], &h->records[t]);
    return BAL_OK;
}

/* Scores folds [first, last) in one pass. */
static bal_status score_folds(heldout *h, unsigned threads, bal_error *err) {
    bal_status status = bali_run_tasks(fit_without_fold, h, h->last - h->first, threads, NULL, err);
    return status == BAL_OK ? visit_blocks(h, score_block, err) : status;
}

static bal_status score_all_folds(heldout *h, const bal_heldout_options *options, bal_error *err) {
    size_t cells = bal_network_cells(h->network);
    size_t at_once = options->prediction_bytes / (cells * sizeof *h->outlooks);
    if (at_once < 1) at_once = 1;
    if (at_once > h->n_folds) at_once = h->n_folds;
    h->outlooks = bali_allocate(at_once * cells, sizeof *h->outlooks);
    if (!h->outlooks) return bali_out_of_memory(err);
    bal_status status = BAL_OK;
    for (h->first = 0; h->first < h->n_folds && status == BAL_OK; h->first = h->last) {
        h->last = h->n_folds - h->first < at_once ? h->n_folds : h->first + at_once;
        status = score_folds(h, options->threads, err);
    }
    return status;
}

static void join_sum(bali_sum *to, const bali_sum *from) {
    bali_sum_add(to, from->total);
    if (isfinite(from->total)) bali_sum_add(to, from->correction); /* an infinite total has none */
}

static void join_folds(fold_scores *all, const fold_scores *s) {
    all->records += s->records;
    all->incomplete += s->incomplete;
    all->impossible += s->impossible;
    all->undefined += s->undefined;
    all->comparable += s->comparable;
    all->bayes_impossible += s->bayes_impossible;
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

static double mean(const bali_sum *sum, uint64_t n) {
    return n > 0 ? bali_sum_value(sum) / (double)n : NAN;
}

/* Where a record is impossible for Bayes the moments of the differences are lost, and the mean difference is minus infinity. */
static bal_paired paired(const bali_sum *bayes, const bali_sum *ml, const bali_moments *difference, uint64_t n) {
    bal_paired p = {mean(bayes, n), mean(ml, n), difference->mean, bali_moments_standard_error(difference)};
    if (!isfinite(p.bayes)) p.mean_difference = p.bayes;
    return p;
}

static void report_strengths(const heldout *h, bal_heldout *out) {
    out->least_strength = out->largest_strength = NAN; /* which gives way to any number */
    for (size_t f = 0; f < h->n_folds; f++) {
        if (h->scores[f].records == 0) continue;
        out->least_strength = fmin(out->least_strength, h->strengths[f].value);
        out->largest_strength = fmax(out->largest_strength, h->strengths[f].value);
    }
}

static void summarise(const heldout *h, bal_heldout *out) {
    fold_scores all = {0};
    for (size_t f = 0; f < h->n_folds; f++) join_folds(&all, &h->scores[f]);
    uint64_t others = all.impossible + all.undefined;
    double bayes = bali_sum_value(&all.bayes), ml = bali_sum_value(&all.ml_on_comparable);
    *out = (bal_heldout){
        .records = all.records,
        .incomplete = all.incomplete,
        .impossible = all.impossible,
        .undefined = all.undefined,
        .comparable = all.records - others,
        .bayes_impossible = all.bayes_impossible,
        .bayes_log_likelihood = bayes,
        .ml_log_likelihood = all.impossible ? -INFINITY : all.undefined ? NAN : ml,
        .prior_log_likelihood = bali_sum_value(&all.prior),
        .on_comparable = paired(&all.bayes_on_comparable, &all.ml_on_comparable, &all.log_difference, all.comparable),
        .bayes_on_others = mean(&all.bayes_on_others, others),
        .break_even = others > 0 ? (bayes - ml) / (double)others : NAN,
        .quadratic = paired(&all.quadratic_bayes, &all.quadratic_ml, &all.quadratic_difference, all.records),
    };
    report_strengths(h, out);
}

static bal_status check_options(const bal_cells *counts, const bal_source *source, const bal_heldout_options *options, bal_error *err) {
    if (!bali_domain_equal(bal_network_domain(bal_cells_network(counts)), bal_source_domain(source)))
        return bal_error_set(err, BAL_ERR_ARGUMENT, "other-network",
                             "the records follow other variables than the counts; use records of the same variables");
    if (options->folds < 2 || options->folds > BAL_HELDOUT_MOST_FOLDS)
        return bal_error_set(err, BAL_ERR_ARGUMENT, "bad-folds", "%zu folds are not possible; use 2 to %zu", options->folds,
                             BAL_HELDOUT_MOST_FOLDS);
    if (bal_tally_records(counts) > (double)BAL_HELDOUT_MOST_RECORDS)
        return bal_error_set(err, BAL_ERR_DATA, "too-many-held-out", "more than %llu records are not held out one by one; use --folds 0",
                             (unsigned long long)BAL_HELDOUT_MOST_RECORDS);
    return BAL_OK;
}

static bal_status make_folds(heldout *h, bal_error *err) {
    h->fold_counts = bali_allocate(h->n_folds, sizeof *h->fold_counts);
    h->strengths = bali_allocate(h->n_folds, sizeof *h->strengths);
    h->scores = bali_allocate(h->n_folds, sizeof *h->scores);
    h->run = bali_allocate(h->n_folds, sizeof *h->run);
    if (!h->fold_counts || !h->strengths || !h->scores || !h->run) return bali_out_of_memory(err);
    return BAL_OK;
}

static void free_folds(heldout *h) {
    for (size_t f = 0; h->fold_counts && f < h->n_folds; f++) bal_cells_free(h->fold_counts[f]);
    bali_free(h->fold_counts);
    bali_free(h->strengths);
    bali_free(h->scores);
    bali_free(h->run);
    bali_free(h->outlooks);
    bali_free(h->folds);
    bali_free(h->cells);
    bali_free(h->records);
}

bal_status bal_heldout_folds(const bal_prior *prior, const bal_cells *counts, bal_source *source, const bal_heldout_options *options,
                             bal_heldout *out, bal_error *err) {
    bal_status status = check_options(counts, source, options, err);
    if (status != BAL_OK) return status;
    heldout h = {.prior = prior,
                 .counts = counts,
                 .network = bal_cells_network(counts),
                 .source = source,
                 .n_folds = options->folds,
                 .key = bal_fold_key(options->seed, 0)};
    status = make_folds(&h, err);
    if (status == BAL_OK) status = visit_blocks(&h, count_folds, err);
    if (status == BAL_OK) status = check_fold_counts(&h, err);
    if (status == BAL_OK) status = score_all_folds(&h, options, err);
    if (status == BAL_OK) summarise(&h, out);
    free_folds(&h);
    return status;
}
