/* Held-out comparison of Bayes and maximum likelihood (ML).
 *
 * One pass counts every part; a training part is all counts less those held out. A second pass scores each record by the
 * predictions of the training part that did not see it. Sums run per part in the order of records and are joined in the order
 * of parts, so neither threads nor memory change a bit of the result. */
#include "ballast/judge.h"
#include "ballast/tally.h"

#include "base/memory.h"
#include "base/threads.h"
#include "judge/outlook.h"
#include "judge/part_scores.h"
#include "judge/partition.h"
#include "learn/indexing.h"
#include "model/cells.h"
#include "model/domain.h"
#include "model/expanded.h"

#include <math.h>

bal_heldout_options bal_heldout_options_defaults(void) {
    return (bal_heldout_options){.folds = 10, .fraction = 0.2, .repeats = 1, .seed = 1, .threads = 1, .prediction_bytes = (size_t)256 << 20};
}

/* One record's differences, summed over the repeats, by its place. */
typedef struct record_sums {
    double log_difference, quadratic_difference;
    uint32_t n_log, n_quadratic;
} record_sums;

typedef struct heldout {
    const bal_prior *prior;
    const bal_cells *counts;
    const bal_network *network;
    bal_source *source;
    bali_partition partition;
    size_t first, last;           /* parts [first, last) are scored in this pass */
    bal_cells **part_counts;      /* one a part, NULL where it has no record; none at all for a test table, whose records were never counted */
    bali_outlook *outlooks;       /* (last - first) x cells */
    bal_strength *strengths;      /* one a part */
    bali_part_scores *scores;     /* one a part, of the repeat at hand */
    bali_part_scores all;         /* over the repeats */
    double least_strength, largest_strength;
    bool fewer_threads;
    record_sums *sums;            /* by place; NULL when there is one repeat */
    size_t sums_capacity, n_sums;
    size_t *parts;                /* of each record of a block */
    uint32_t *cells;
    bali_record_outlook *records;
    size_t parts_capacity, cells_capacity, records_capacity;
} heldout;

static bal_status make_room(heldout *h, size_t n, bal_error *err) {
    bool made = bali_grow((void **)&h->parts, &h->parts_capacity, n, sizeof *h->parts) &&
                bali_grow((void **)&h->cells, &h->cells_capacity, n, sizeof *h->cells) &&
                bali_grow((void **)&h->records, &h->records_capacity, n, sizeof *h->records);
    return made ? BAL_OK : bali_out_of_memory(err);
}

/* Goes over all blocks with their records' parts assigned. */
typedef bal_status (*block_visitor)(heldout *h, const bal_block *block, bal_error *err);

static bal_status visit_blocks(heldout *h, block_visitor visit, bal_error *err) {
    bal_status status = bal_source_rewind(h->source, err);
    while (status == BAL_OK) {
        bal_block block;
        status = bal_source_next(h->source, &block, err);
        if (status != BAL_OK || block.n_records == 0) break;
        status = make_room(h, block.n_records, err);
        if (status != BAL_OK) break;
        bali_partition_assign(&h->partition, &block, h->parts);
        status = visit(h, &block, err);
    }
    return status;
}

/* Whether a family's columns are all in the table; a variable that nobody recorded leaves its families out. */
static bool is_recorded(const bal_network *network, size_t v, const bal_block *block) {
    size_t n_parents;
    const size_t *parents = bal_network_parents(network, v, &n_parents);
    if (!block->columns[v]) return false;
    for (size_t p = 0; p < n_parents; p++)
        if (!block->columns[parents[p]]) return false;
    return true;
}

/* Only parts with records have counts: a few records in many parts take no more memory than they need. */
static bal_status count_parts(heldout *h, const bal_block *block, bal_error *err) {
    bal_status status = BAL_OK;
    for (size_t t = 0; t < block->n_records && status == BAL_OK; t++)
        if (h->parts[t] != BALI_NOT_HELD_OUT && !h->part_counts[h->parts[t]])
            status = bal_cells_create(h->network, &h->part_counts[h->parts[t]], err);
    if (status != BAL_OK) return status;
    for (size_t v = 0; v < bal_network_variables(h->network); v++) {
        bali_index_family(h->network, v, block, h->cells);
        for (size_t t = 0; t < block->n_records; t++)
            if (h->cells[t] != BALI_NO_CELL && h->parts[t] != BALI_NOT_HELD_OUT)
                bal_cells_edit(h->part_counts[h->parts[t]], v)[h->cells[t]] += 1;
    }
    return BAL_OK;
}

/* Records that were never counted would make a training part that never was. */
static bal_status check_training(const bal_cells *training, bal_error *err) {
    const double *n = bali_cells_values(training);
    for (size_t c = 0; c < bal_network_cells(bal_cells_network(training)); c++)
        if (n[c] < 0)
            return bal_error_set(err, BAL_ERR_DATA, "changed-while-read",
                                 "the records held out are not among those counted; wait until the table is written, then start again");
    return BAL_OK;
}

/* One task: fits to everything but one part. */
static bal_status fit_without_part(void *context, size_t task, bal_error *err) {
    heldout *h = context;
    size_t part = h->first + task;
    bali_outlook *to = h->outlooks + task * bal_network_cells(h->network);
    if (!h->part_counts) return bali_outlook_fill(h->prior, h->counts, to, &h->strengths[part], err);
    if (!h->part_counts[part]) return BAL_OK; /* no record to predict */
    bal_cells *training = NULL;
    bal_status status = bal_cells_copy(h->counts, &training, err);
    if (status == BAL_OK) {
        bali_cells_subtract(training, h->part_counts[part]);
        status = check_training(training, err);
    }
    if (status == BAL_OK) status = bali_outlook_fill(h->prior, training, to, &h->strengths[part], err);
    bal_cells_free(training);
    return status;
}

static void add_family(bali_record_outlook *record, const bali_outlook *cell) {
    record->log_bayes += cell->log_bayes;
    record->log_prior += cell->log_prior;
    record->log_ml += cell->log_ml;
    record->quadratic_bayes += cell->quadratic_bayes;
    record->quadratic_ml += cell->quadratic_ml;
    record->impossible |= cell->ml == BALI_ML_IMPOSSIBLE;
    record->undefined |= cell->ml == BALI_ML_UNDEFINED;
}

static bool in_pass(const heldout *h, size_t part) {
    return part >= h->first && part < h->last; /* which BALI_NOT_HELD_OUT never is */
}

static void predict_block(heldout *h, const bal_block *block) {
    size_t n_cells = bal_network_cells(h->network);
    for (size_t t = 0; t < block->n_records; t++) h->records[t] = (bali_record_outlook){0};
    for (size_t v = 0; v < bal_network_variables(h->network); v++) {
        if (!is_recorded(h->network, v, block)) continue;
        const bali_outlook *family = h->outlooks + bal_network_offset(h->network, v);
        bali_index_family(h->network, v, block, h->cells);
        for (size_t t = 0; t < block->n_records; t++) {
            if (!in_pass(h, h->parts[t])) continue;
            if (h->cells[t] == BALI_NO_CELL) {
                h->records[t].incomplete = true;
            } else {
                add_family(&h->records[t], &family[(h->parts[t] - h->first) * n_cells + h->cells[t]]);
            }
        }
    }
}

/* Adds a record's differences to its sums over the repeats. */
static bal_status add_to_record(heldout *h, uint64_t place, const bali_record_outlook *record, bal_error *err) {
    if (place >= h->n_sums) {
        if (place >= SIZE_MAX || !bali_grow((void **)&h->sums, &h->sums_capacity, (size_t)place + 1, sizeof *h->sums))
            return bali_out_of_memory(err);
        while (h->n_sums <= place) h->sums[h->n_sums++] = (record_sums){0};
    }
    record_sums *sums = &h->sums[place];
    sums->quadratic_difference += record->quadratic_bayes - record->quadratic_ml;
    sums->n_quadratic++;
    if (record->impossible || record->undefined || !isfinite(record->log_bayes)) return BAL_OK;
    sums->log_difference += record->log_bayes - record->log_ml;
    sums->n_log++;
    return BAL_OK;
}

static bal_status score_block(heldout *h, const bal_block *block, bal_error *err, bool repeated) {
    predict_block(h, block);
    for (size_t t = 0; t < block->n_records; t++) {
        if (!in_pass(h, h->parts[t])) continue;
        bali_part_scores_add(&h->scores[h->parts[t]], &h->records[t]);
        if (!repeated || h->records[t].incomplete) continue;
        bal_status status = add_to_record(h, bal_block_place(block, t), &h->records[t], err);
        if (status != BAL_OK) return status;
    }
    return BAL_OK;
}

static bal_status score_once(heldout *h, const bal_block *block, bal_error *err) {
    return score_block(h, block, err, false);
}

static bal_status score_repeatedly(heldout *h, const bal_block *block, bal_error *err) {
    return score_block(h, block, err, true);
}

/* Parts whose predictions fit the memory at once; the others take further passes. */
static bal_status score_parts(heldout *h, const bal_heldout_options *options, size_t at_once, bal_error *err) {
    bal_status status = BAL_OK;
    for (h->first = 0; h->first < h->partition.n_parts && status == BAL_OK; h->first = h->last) {
        h->last = h->partition.n_parts - h->first < at_once ? h->partition.n_parts : h->first + at_once;
        unsigned started;
        status = bali_run_tasks(fit_without_part, h, h->last - h->first, options->threads, &started, err);
        h->fewer_threads |= started < options->threads && started < h->last - h->first;
        if (status == BAL_OK) status = visit_blocks(h, options->repeats > 1 ? score_repeatedly : score_once, err);
    }
    return status;
}

/* Joins the parts of a repeat to all, and empties them for the next. */
static void close_repeat(heldout *h) {
    for (size_t part = 0; part < h->partition.n_parts; part++) {
        bali_part_scores_join(&h->all, &h->scores[part]);
        if (h->scores[part].records > 0) {
            h->least_strength = fmin(h->least_strength, h->strengths[part].value);
            h->largest_strength = fmax(h->largest_strength, h->strengths[part].value);
        }
        h->scores[part] = (bali_part_scores){0};
        if (h->part_counts && h->part_counts[part]) bali_cells_clear(h->part_counts[part]);
    }
}

static bal_status run_repeats(heldout *h, const bal_heldout_options *options, bal_error *err) {
    size_t cells = bal_network_cells(h->network);
    size_t at_once = options->prediction_bytes / (cells * sizeof *h->outlooks);
    if (at_once < 1) at_once = 1;
    if (at_once > h->partition.n_parts) at_once = h->partition.n_parts;
    h->outlooks = bali_allocate(at_once * cells, sizeof *h->outlooks);
    if (!h->outlooks) return bali_out_of_memory(err);
    bal_status status = BAL_OK;
    for (size_t r = 0; r < options->repeats && status == BAL_OK; r++) {
        bali_partition_repeat(&h->partition, options, r);
        if (h->part_counts) status = visit_blocks(h, count_parts, err);
        if (status == BAL_OK) status = score_parts(h, options, at_once, err);
        close_repeat(h);
    }
    return status;
}

static void report(const heldout *h, const bal_heldout_options *options, bal_heldout *out) {
    bali_moments log_means = {0}, quadratic_means = {0};
    bool repeated = options->repeats > 1;
    for (size_t i = 0; i < h->n_sums; i++) {
        const record_sums *sums = &h->sums[i];
        if (sums->n_log > 0) bali_moments_add(&log_means, sums->log_difference / sums->n_log);
        if (sums->n_quadratic > 0) bali_moments_add(&quadratic_means, sums->quadratic_difference / sums->n_quadratic);
    }
    bali_part_scores_report(&h->all, options->repeats, repeated ? &log_means : NULL, repeated ? &quadratic_means : NULL, out);
    out->parts = h->partition.n_parts;
    out->fewer_threads = h->fewer_threads;
    out->least_strength = h->least_strength;
    out->largest_strength = h->largest_strength;
}

static bal_status make_parts(heldout *h, bool counted, bal_error *err) {
    size_t n = h->partition.n_parts;
    h->strengths = bali_allocate(n, sizeof *h->strengths);
    h->scores = bali_allocate(n, sizeof *h->scores);
    if (!h->strengths || !h->scores) return bali_out_of_memory(err);
    if (!counted) return BAL_OK;
    h->part_counts = bali_allocate(n, sizeof *h->part_counts);
    return h->part_counts ? BAL_OK : bali_out_of_memory(err);
}

static void free_parts(heldout *h) {
    for (size_t part = 0; h->part_counts && part < h->partition.n_parts; part++) bal_cells_free(h->part_counts[part]);
    bali_free(h->part_counts);
    bali_free(h->strengths);
    bali_free(h->scores);
    bali_free(h->outlooks);
    bali_free(h->sums);
    bali_free(h->parts);
    bali_free(h->cells);
    bali_free(h->records);
    bali_partition_free(&h->partition);
    bal_source_free(h->source);
}

/* At most as many parts as records have counts; sums are kept by place. */
static bal_status check_memory(const heldout *h, const bal_heldout_options *options, uint64_t places, bal_error *err) {
    double parts = fmin((double)h->partition.n_parts, (double)places), cells = (double)bal_network_cells(h->network);
    double bytes = options->method == BAL_HELDOUT_TEST ? 0 : parts * cells * sizeof(double);
    if (options->repeats > 1) bytes += (double)places * sizeof(record_sums);
    if (options->count_bytes == 0 || bytes <= (double)options->count_bytes) return BAL_OK;
    return bal_error_set(err, BAL_ERR_DATA, "held-out-memory",
                         "holding out %.0f parts%s would take %.3g MiB, more than the %.3g MiB allowed; use fewer parts, --folds 0, or a larger --memory",
                         parts, options->repeats > 1 ? " repeatedly" : "", bytes / 0x1p20, (double)options->count_bytes / 0x1p20);
}

bal_status bal_heldout_run(const bal_prior *prior, const bal_cells *counts, bal_source *source, const bal_heldout_options *options,
                           bal_heldout *out, bal_error *err) {
    bal_source_summary summary;
    bal_source_summary_get(source, &summary);
    if (!bali_domain_equal(bal_network_domain(bal_cells_network(counts)), bal_source_domain(source)))
        return bal_error_set(err, BAL_ERR_ARGUMENT, "other-network",
                             "the records follow other variables than the counts; use records of the same variables");
    if (summary.places > BAL_HELDOUT_MOST_RECORDS)
        return bal_error_set(err, BAL_ERR_DATA, "too-many-held-out", "more than %llu records are not held out one by one; use --folds 0",
                             (unsigned long long)BAL_HELDOUT_MOST_RECORDS);
    heldout h = {.prior = prior,
                 .counts = counts,
                 .network = bal_cells_network(counts),
                 .least_strength = NAN,
                 .largest_strength = NAN};
    bal_status status = bali_partition_create(options, summary.n_groups, &h.partition, err);
    if (status == BAL_OK) status = check_memory(&h, options, summary.places, err);
    if (status == BAL_OK) status = bali_expanded_open(source, &h.source, err);
    if (status == BAL_OK) status = make_parts(&h, options->method != BAL_HELDOUT_TEST, err);
    if (status == BAL_OK) status = run_repeats(&h, options, err);
    if (status == BAL_OK) report(&h, options, out);
    free_parts(&h);
    return status;
}
