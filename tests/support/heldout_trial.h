/* Records held out by the library and by its slow, obvious twin: one record after another, every part refitted from its records. */
#ifndef SUPPORT_HELDOUT_TRIAL_H
#define SUPPORT_HELDOUT_TRIAL_H

#include "ballast/judge.h"
#include "support/fixtures.h"

enum { TRIAL_RECORDS = 400, TRIAL_REPEATS = 4 };

/** What the records are, and how they are held out. */
typedef struct trial {
    bal_network *network;
    const bal_prior *prior;
    int *codes;
    uint64_t places[TRIAL_RECORDS];
    const double *weights;    /* for the program alone: the twin takes records one by one */
    uint32_t groups[TRIAL_RECORDS];
    size_t n_records, n_groups;
    bal_cells *earlier;       /* counts of earlier records, or for TEST of all training records; may be NULL */
    bool narrow;              /* nobody recorded variable 0 */
    bal_heldout_options options;
} trial;

/** Folds, so many times over; everything else as by default. */
bal_heldout_options folds_options(size_t n_folds, size_t repeats);
/** Records of a random network; every dropped-th place is left out, as dropping incomplete records does. The seed is also the trial's. */
void trial_set_up(trial *t, int seed, size_t n_records, double missing, size_t dropped, const bal_heldout_options *options);
void trial_tear_down(trial *t);
/** Counts of other records of the same network. */
bal_cells *trial_other_counts(const trial *t, int seed, size_t n_records);

/** The counts the library is given: of all records and the earlier ones. */
bal_cells *trial_all_counts(const trial *t);
/** The records as a source; block_records as in fixture_table. */
bal_source *trial_source(const trial *t, size_t block_records);
/** What the library makes of a trial; prediction_bytes 0 = as by default. */
bal_status trial_try(const trial *t, unsigned threads, size_t prediction_bytes, bal_heldout *out, bal_error *err);
/** The same, which has to go well. */
bal_heldout trial_run(const trial *t);
/** What the twin makes of it. */
bal_heldout trial_twin(const trial *t);

/** Equal to 1e-12, infinities and NaN included. */
bool trial_close(double a, double b);
/** Every number equal to 1e-12. seed: named when one is not. */
void trial_check(const bal_heldout *got, const bal_heldout *expected, int seed);
/** Every bit of every number equal. */
void trial_check_bits(const bal_heldout *got, const bal_heldout *expected);
/** Library and twin under a given strength, strengths chosen by either score, and a carried prior. */
void trial_check_all(trial *t, int seed);

#endif
