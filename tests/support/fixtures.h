/* Networks from compact text, records from arrays, and random ones of both from a seed. A fixture that cannot be made ends the
 * test: what it returns is never NULL. */
#ifndef SUPPORT_FIXTURES_H
#define SUPPORT_FIXTURES_H

#include "ballast/prior.h"
#include "ballast/table.h"
#include "support/harness.h"

/**
 * A network from text such as "A:yes,no ; B:x,y,z | A ; C:#300 | B,A": variables between semicolons, each its name, its outcomes
 * (#n stands for 0, 1 ... n - 1) and its parents, which may stand later. Blanks do not count.
 */
bal_network *network_of(const char *text);
/** The same with a limit of cells, giving back what bal_network_create does. */
bal_status network_try(const char *text, size_t max_cells, bal_network **out, bal_error *err);
/** The variable of that name. */
size_t variable_of(const bal_network *network, const char *name);

/** Cells of a network with these values, in network order. */
bal_cells *cells_of(const bal_network *network, const double *values);
/** Cells that all have one value. */
bal_cells *equal_cells(const bal_network *network, double value);
/** The cell of a family that a record falls in, or BAL_NONE when one is missing: the slow way, by bal_network_row. */
size_t cell_of(const bal_network *network, size_t variable, const int *record);
/** The counts of records, the slow way. codes: record after record, one number a variable; -1 = missing. */
bal_cells *counts_of(const bal_network *network, const int *codes, size_t n_records);

/** Records as a source. Start from = {0}. */
typedef struct fixture_table {
    const int *codes;        /* record after record, one number a variable; -1 = missing */
    size_t n_records;
    const uint64_t *places;  /* one a record, or NULL */
    size_t block_records;    /* 0 = 4096 */
    size_t fail_at;          /* the fail_at-th block, over all passes, fails with IO; 0 = none does */
    bool pipe;               /* cannot go back once a block was taken */
    bool weighted;           /* carries weights: 1 + the record's number, unless weights says otherwise */
    const double *weights;   /* one a record, or NULL */
    const uint32_t *groups;  /* numbers of the fold column's labels, one a record, or NULL */
    size_t n_groups;
    uint64_t all_places;     /* what the summary says; 0 = those that the records take */
    bool narrow;             /* columns of variable 0 are not there (NULL) */
} fixture_table;
bal_source *source_of(const bal_domain *domain, const fixture_table *table);
/** The same from plain records. */
bal_source *plain_source(const bal_network *network, const int *codes, size_t n_records);
/** Blocks (the empty last one included) that all fixture sources together have given so far. */
size_t fixture_blocks(void);

/** A carried prior: the pseudo-counts of an earlier fit. */
bal_prior *carried_prior(const bal_cells *pseudo_counts);
/** A prior by its options. */
bal_prior *prior_of(const bal_network *network, const bal_prior_options *options);
/** A prior of a kind at a given strength; BDEU, K2 or JEFFREYS. */
bal_prior *simple_prior(const bal_network *network, bal_prior_kind kind, double strength);
/** A prior of a kind whose strength is to be chosen. */
bal_prior *open_prior(const bal_network *network, bal_prior_kind kind, bal_strength_choice choice);
/** An expert prior from tables, every row worth row_ess cases. */
bal_prior *expert_prior(const bal_cells *tables, double row_ess, double floor, double strength);

/** A stream of random numbers that a seed fixes. */
typedef struct dice {
    uint64_t seed, at;
} dice;
dice dice_of(int seed);
/** A whole number below n. */
size_t roll(dice *d, size_t n);
/** A number in [0, 1). */
double chance(dice *d);

/** A network of n variables, with 1 (or least) to most outcomes and up to most_parents parents, in no particular order. */
bal_network *random_network(dice *d, size_t n, size_t least_outcomes, size_t most_outcomes, size_t most_parents);
/** The same network with variables, outcomes and every family's parents the other way round. */
bal_network *reversed_network(const bal_network *network);
/** Records of a network as the reversed one has them; freed with free(). */
int *reversed_codes(const bal_network *network, const int *codes, size_t n_records);
/** Tables of a network; about this share of the cells is zero, though none of the last outcomes. */
bal_cells *random_tables(dice *d, const bal_network *network, double zeros);
/** Records drawn from tables, about this share of their cells missing; freed with free(). */
int *random_codes(dice *d, const bal_cells *tables, size_t n_records, double missing);

#endif
