/* Judging a fit: held-out log-likelihood against maximum likelihood, and whether a table is enough. */
#ifndef BALLAST_JUDGE_H
#define BALLAST_JUDGE_H

#include "ballast/prior.h"
#include "ballast/table.h"

#ifdef __cplusplus
extern "C" {
#endif

/* Which records are held out. */
typedef enum bal_heldout_method {
    BAL_HELDOUT_FOLDS,   /* K parts, each predicted by a fit to the others */
    BAL_HELDOUT_GROUPS,  /* the same, one part a label of the fold column: a patient, a site, a period */
    BAL_HELDOUT_HOLDOUT, /* one random part, predicted by a fit to the rest */
    BAL_HELDOUT_TEST     /* a table of its own, predicted by a fit to all counts */
} bal_heldout_method;

/** How records are held out. Start from bal_heldout_options_defaults(): ten folds, once, seed 1. */
typedef struct bal_heldout_options {
    bal_heldout_method method;
    size_t folds;     /* FOLDS: 2 to BAL_HELDOUT_MOST_FOLDS; more folds than records leave some of them empty */
    double fraction;  /* HOLDOUT: of the records, in (0, 1) */
    size_t repeats;   /* FOLDS and HOLDOUT: >= 1 */
    uint64_t seed;
    unsigned threads; /* >= 1; changes no number */
    size_t count_bytes; /* refuse to take more memory for the parts' counts and the records' sums; 0 = no limit */
    size_t prediction_bytes; /* memory for the folds' predictions, 256 MiB; changes no number */
} bal_heldout_options;
BAL_API bal_heldout_options bal_heldout_options_defaults(void);

/** A mean over records of paired differences (Bayes minus ML) and its standard error. */
typedef struct bal_paired {
    double bayes, ml;       /* means per record */
    double mean_difference;
    double standard_error;  /* of the mean; NaN below two records */
} bal_paired;

/**
 * Bayes and maximum likelihood (ML) on held-out records. Logarithms are natural; "per record" is a mean.
 *
 * A held-out record is impossible for ML where some cell it needs has count 0 in a row that has records,
 * otherwise undefined where a row it needs has none, otherwise comparable. Comparable records are those
 * ML has seen, so a comparison on them alone favours ML.
 *
 * Over repeats, counts and totals are means over the repeats; a standard error is that of the records' means.
 * Means over no record are NaN.
 */
typedef struct bal_heldout {
    double records;              /* scored */
    double incomplete;           /* not scored, since a cell was missing */
    double impossible;           /* for ML */
    double undefined;            /* for ML */
    double comparable;
    double bayes_impossible;     /* records in a structural zero of the prior */
    double bayes_log_likelihood; /* nats, all records; -infinity when bayes_impossible > 0 */
    double ml_log_likelihood;    /* -infinity as soon as one record is impossible, NaN when some are undefined only */
    double prior_log_likelihood; /* the same for the prior alone, at the strength chosen in training */
    bal_paired on_comparable;    /* log-likelihood per record */
    double bayes_on_others;      /* log-likelihood per record on impossible and undefined records */
    double break_even;           /* what ML would need per record on the others to tie on all; NaN when there are none */
    bal_paired quadratic;        /* quadratic score per record, all records; lower is better */
    size_t parts;                /* folds, groups, or 1 */
    bool fewer_threads;          /* the system started fewer threads than were asked for */
    double least_strength, largest_strength; /* of the prior, over the training parts whose records were scored; NaN when there is none */
} bal_heldout;

/** More records than this are not scored: bal_heldout_run refuses. */
#define BAL_HELDOUT_MOST_RECORDS ((uint64_t)100000000)
#define BAL_HELDOUT_MOST_FOLDS ((size_t)65535)

/**
 * The fold of record i among K, by the key of a repeat: of each run of K consecutive records, record b K + t is
 * in fold p[t], p a shuffle of 0 ... K - 1 (Fisher & Yates) fed by splitmix64(key, b K + t).
 *
 * folds  n_folds fold numbers of run b, overwritten
 */
BAL_API void bal_fold_run(uint64_t key, uint64_t run, size_t n_folds, size_t *folds);
/** splitmix64(splitmix64(seed, purpose 1), repeat): the key of the folds of a repeat (from 0). */
BAL_API uint64_t bal_fold_key(uint64_t seed, uint64_t repeat);

/** Whether record i is held out by HOLDOUT: splitmix64(key, i) < fraction x 2^64; every record from 1 on, none at 0. */
BAL_API bool bal_is_held_out(uint64_t key, uint64_t record, double fraction);
/** splitmix64(splitmix64(seed, purpose 2), repeat): the key of the holdout of a repeat (from 0). */
BAL_API uint64_t bal_holdout_key(uint64_t seed, uint64_t repeat);

/**
 * Held-out comparison. Whatever the prior chooses from data it chooses anew inside each training part.
 *
 * counts  of the whole training data, as bal_tally gives them (with earlier counts, under a carried prior)
 * source  the records that are held out: those counted, or the test table; rewound and gone over. A record of whole weight w is
 *         w records. A variable without a column is left out with every family that touches it.
 *
 * Fails:  DATA "held-out-memory" beyond count_bytes; ARGUMENT for options out of range, or GROUPS without a fold column; DATA beyond BAL_HELDOUT_MOST_RECORDS, where a weight
 *         is not whole, and "changed-while-read" when records are held out that counts does not hold; whatever the source meets; MEMORY; NUMERIC.
 * Cost:   two passes over the records a repeat, O(records x (variables + arcs)), and parts times the cost of settling the
 *         prior; 8 bytes a cell and part for the parts' counts, and at most prediction_bytes (or one part's 48 bytes a
 *         cell, if that is more) for their predictions: where that is not enough for all parts, more passes. 32 bytes a record when
 *         repeats > 1.
 * Source: the impossible/undefined/comparable split is direct; Brier 1950 for the quadratic score.
 */
BAL_API BAL_MUST_CHECK bal_status bal_heldout_run(const bal_prior *prior, const bal_cells *counts, bal_source *source,
                                                  const bal_heldout_options *options, bal_heldout *out, bal_error *err);

/**
 * Is this table enough: the share of records that are alone in some row (cell) they need, which estimates the
 * chance that a new case meets a row (cell) that no record supports.
 */
typedef struct bal_support {
    double row_share, cell_share; /* over whole records; NaN without records */
} bal_support;

/**
 * The shares over whole records: a record counts when it is alone in a row (cell) of at least one family.
 *
 * counts, source  as above; source may be NULL, and its weights may be fractional: then out is NaN
 * row_shares, cell_shares  one a variable: the share for that family alone; may be NULL
 *
 * Fails:  ARGUMENT when the source has other variables; whatever the source meets; MEMORY.
 * Source: Good, Biometrika 40 (1953) 237-264, equation (9) for the missing mass.
 */
BAL_API BAL_MUST_CHECK bal_status bal_support_measure(const bal_cells *counts, bal_source *source, bal_support *out,
                                                      double *row_shares, double *cell_shares, bal_error *err);

#ifdef __cplusplus
}
#endif
#endif
