/* What a command found, handed to the reports. Everything is borrowed. */
#ifndef REPORT_FACTS_H
#define REPORT_FACTS_H

#include "base/json.h"
#include "base/text.h"
#include "ballast/fit.h"
#include "ballast/formats.h"
#include "ballast/judge.h"
#include "ballast/posterior.h"

/** The files that went in, and the records of the table among them. */
typedef struct bali_data_facts {
    bal_file_facts *inputs;     /* the network first, then what gave the data, then codebook and test table */
    size_t n_inputs;
    size_t first_data, n_data;  /* those that gave the data */
    bool from_table;            /* false: the counts came with a network file */
    bool by_family;             /* records with missing cells were counted in the families they are complete for */
    bool composite;             /* families count different records, so sums over families mix them */
    bool fractional;            /* some count is not whole: nothing can be left out one by one */
    bal_source_summary summary; /* of the table(s) */
    double records;             /* that were counted; under whole weights those the weights stand for */
    double weight;
    double earlier;             /* records whose counts were carried over, times --carry */
    const bool *unrecorded;     /* one a variable; NULL when there is none */
} bali_data_facts;

/** All that `ballast fit` tells. */
typedef struct bali_fit_facts {
    const bal_document *document;
    const bali_data_facts *data;
    const bal_prior *prior;
    const bal_prior_options *prior_options;
    const bal_fit *fit;
    const bal_other_prior *others;
    size_t n_others;
    double log_predictive;             /* carried: of the new counts given the old, nats; NaN otherwise */
    const bal_heldout *heldout;        /* NULL when nothing was held out */
    const bal_heldout_options *heldout_options;
    double level;
    bool maximum_likelihood;           /* --estimate ml */
    const char *written;               /* base name of the file written, or NULL */
    const char *json;                  /* base name of the JSON file, or NULL */
} bali_fit_facts;

void bali_fit_text(const bali_fit_facts *facts, bali_text *text);
/** Fails: NUMERIC when an interval cannot be computed; MEMORY. */
BAL_MUST_CHECK bal_status bali_fit_json(const bali_fit_facts *facts, bali_json *json, bal_error *err);

/** All that `ballast check` tells. */
typedef struct bali_check_facts {
    const bal_document *document;
    const bali_data_facts *data;
    const bal_cells *counts;          /* NULL without data */
    const bal_support *support;       /* NULL without data */
    const double *row_shares, *cell_shares; /* one a variable */
} bali_check_facts;

void bali_check_text(const bali_check_facts *facts, bali_text *text);
void bali_check_json(const bali_check_facts *facts, bali_json *json);

/** `ballast tally`: what was counted. */
void bali_tally_text(const bali_data_facts *data, const bal_cells *counts, bali_text *text);
void bali_tally_json(const bal_document *document, const bali_data_facts *data, const bal_cells *counts, bali_json *json);

/** `ballast draw`: what was simulated. */
void bali_draw_json(const bal_document *document, const bali_data_facts *data, uint64_t records, uint64_t seed, bali_json *json);

/** The key "ballast", with which every JSON result begins. */
void bali_json_ballast(bali_json *json, const char *command);

/**
 * The opening keys of a result about a network: ballast, inputs, network, data (null without data).
 * pseudo_counts  of a fit, whose structural zeros are no free parameters; NULL when there is none
 */
void bali_json_head(bali_json *json, const char *command, const bal_document *document, const bal_cells *pseudo_counts,
                    const bali_data_facts *data, bool has_data);

/** sum over rows of the cells that can happen, less one: all cells can where pseudo_counts is NULL. */
size_t bali_free_parameters(const bal_network *network, const bal_cells *pseudo_counts);

/** The object {parent: outcome} of a row under a key. */
void bali_json_given(bali_json *json, const char *key, const bal_network *network, size_t variable, size_t row);

/** Rows of a network by what they rest on. */
typedef struct bali_row_counts {
    size_t rows, prior, few, data;
} bali_row_counts;
bali_row_counts bali_count_rows(const bal_cells *counts);

/** Whether a family touches a variable that nobody recorded. */
bool bali_is_unrecorded(const bali_data_facts *data, const bal_network *network, size_t variable);

/** Records that the leave-one-out score runs over, carried ones included; NaN when there is none. */
double bali_scored_records(const bali_fit_facts *facts);

/** One row of a network. */
typedef struct bali_row {
    size_t variable, row;
    double records;
} bali_row;

/**
 * Lists up to most rows that rest on this basis, in network order.
 * Returns how many there are in all.
 */
size_t bali_list_rows(const bal_cells *counts, bal_basis basis, bali_row *rows, size_t most);

/** Lists up to most rows with records whose pseudo-counts sum to less than 1; returns how many there are in all. */
size_t bali_list_thin_rows(const bal_fit *fit, bali_row *rows, size_t most);

/** Adds "Variable | Parent=outcome, ..." cut to a width in characters with "..." at its end. */
void bali_put_row_name(bali_text *text, const bal_network *network, size_t variable, size_t row, size_t width);

#endif
