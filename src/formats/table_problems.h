/* Failures that are gathered while a table is read on: the first ten of a kind are told, the others counted. */
#ifndef FORMATS_TABLE_PROBLEMS_H
#define FORMATS_TABLE_PROBLEMS_H

#include "ballast/network.h"

#include <stdbool.h>
#include <stdint.h>

typedef enum bali_problem_kind {
    BALI_BAD_LABEL,
    BALI_BAD_NUMBER,
    BALI_BAD_WEIGHT,
    BALI_MISSING_GROUP,
    BALI_REPEATED_HEADER,
    BALI_MISSING_CELL,
    BALI_PROBLEM_KINDS
} bali_problem_kind;

#define BALI_MOST_TOLD 10

/** Made by bali_problems_create. */
typedef struct bali_problems {
    bal_notices notices;
    const bal_domain *domain;
    uint64_t counts[BALI_PROBLEM_KINDS];
    bool *untold; /* variables with unknown labels beyond those told */
    size_t n_untold;
    bal_error first; /* in file order; its status is BAL_OK while there is none */
    bal_error first_missing;
} bali_problems;

/** notices may be NULL. Returns false when there is no memory. */
bool bali_problems_create(bali_problems *problems, const bal_domain *domain, const bal_notices *notices);
void bali_problems_free(bali_problems *problems);

/** Counts one problem. Returns whether it is to be told, by bali_problems_tell. */
bool bali_problems_count(bali_problems *problems, bali_problem_kind kind, size_t variable);
void bali_problems_tell(bali_problems *problems, const bal_error *problem);

/** What the missing cells come to. */
typedef struct bali_missing_cells {
    const uint64_t *counts; /* one a variable */
    uint64_t incomplete;    /* records that have one */
    uint64_t records;       /* records read */
} bali_missing_cells;

/**
 * Tells the counts of the others, and last the failure that ended the reading early, if any; then makes failure the first
 * problem in file order. Where that is a missing cell its message is the sum of all of them.
 *
 * failure  its status is BAL_OK when the reading came to the end
 */
void bali_problems_conclude(bali_problems *problems, const bali_missing_cells *missing, bal_error *failure);

#endif
