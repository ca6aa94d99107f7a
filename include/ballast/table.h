/* Blocks of coded records, and the sources that give them. */
#ifndef BALLAST_TABLE_H
#define BALLAST_TABLE_H

#include "ballast/network.h"

#include <stdint.h>

#ifdef __cplusplus
extern "C" {
#endif

/**
 * Up to a few thousand records as columns of small integers.
 *
 * Columns follow a domain, not a network: columns[v] holds the outcome of variable v for every record
 * of the block, one byte a code when width is 1, a uint16_t when it is 2; it is NULL where the column is
 * not wanted or not in the table. The largest code of the width (255, 65535) means missing.
 *
 * Everything is borrowed from the source until its next call.
 */
typedef struct bal_block {
    size_t n_records;
    size_t n_columns;           /* variables of the domain */
    unsigned width;             /* bytes a code, 1 or 2 */
    const void *const *columns; /* n_columns pointers */
    const double *weights;      /* n_records case weights, whole multiples of 2^-32; NULL when every weight is 1 */
    const uint32_t *groups;     /* n_records numbers of the fold column's labels, by first appearance; NULL without one */
    uint64_t first_record;      /* place of the first record in the table(s), from 0, before dropping; a record of whole
                                   weight w takes w places */
    const uint64_t *places;     /* place of each record, or NULL when they follow first_record in order */
} bal_block;

/** The code of one cell of a column, or BAL_NONE when it is missing. */
static inline size_t bal_block_code(const bal_block *block, size_t variable, size_t t) {
    if (block->width == 1) {
        uint8_t code = ((const uint8_t *)block->columns[variable])[t];
        return code == UINT8_MAX ? BAL_NONE : code;
    }
    uint16_t code = ((const uint16_t *)block->columns[variable])[t];
    return code == UINT16_MAX ? BAL_NONE : code;
}

/** Where record t of the block stands in the table(s). */
static inline uint64_t bal_block_place(const bal_block *block, size_t t) {
    return block->places ? block->places[t] : block->first_record + t;
}

/* A source of blocks: a table, a simulation, records kept in memory. */
typedef struct bal_source bal_source;

/** What a pass over a source met. Complete once bal_source_next has given the empty block. */
typedef struct bal_source_summary {
    uint64_t records;            /* records given: after dropping; lines of the table, whatever their weight */
    uint64_t dropped;            /* records left out because a wanted cell was missing */
    uint64_t incomplete;         /* records given although a wanted cell was missing */
    uint64_t places;             /* places gone over: records given and dropped, whole weights expanded */
    double weight;               /* sum of the weights of the records given */
    bool fractional;             /* some weight is not whole: records have no places, and cannot be left out one by one */
    size_t n_groups;             /* labels of the fold column */
    const uint64_t *missing;     /* missing cells of each variable of the domain; borrowed; NULL when the source
                                    cannot have any */
    const char *const *ignored;  /* names of columns that no variable has; borrowed */
    size_t n_ignored;
} bal_source_summary;

/** The domain the columns follow; borrowed. */
BAL_API const bal_domain *bal_source_domain(const bal_source *source);

/**
 * The next block; n_records is 0 at the end, and stays so.
 *
 * Fails:  what the medium can meet: for a table file SYNTAX, DATA, IO and MEMORY with file, line,
 *         column, record and variable. After a failure the source can only be freed.
 */
BAL_API BAL_MUST_CHECK bal_status bal_source_next(bal_source *source, bal_block *block, bal_error *err);

/** Goes back to the first record. Fails: IO where the medium is a pipe (the message says what to do). */
BAL_API BAL_MUST_CHECK bal_status bal_source_rewind(bal_source *source, bal_error *err);

/** Fills the empty fields of err with the file, line and record of a place (see bal_block_place), as far
 *  as the source knows them. It may read the medium again; it never fails. */
BAL_API void bal_source_locate(bal_source *source, uint64_t place, bal_error *err);

BAL_API void bal_source_summary_get(const bal_source *source, bal_source_summary *out);
BAL_API void bal_source_free(bal_source *source);

/**
 * Wraps a source so that its records can be gone over again without reading the medium again.
 *
 * The first pass keeps the coded records while they fit in memory_limit bytes; later passes serve
 * them from memory. Once they do not fit, they are let go, and later passes read the medium again.
 *
 * source        taken: it is freed with the wrapper, and also when this call fails
 * memory_limit  bytes; 0 keeps nothing
 *
 * Fails:  MEMORY. (Memory that runs out later is not a failure: the records are let go.)
 * Cost:   one byte a cell and record (two with an outcome beyond the 254th), 8 a record for weights, if any.
 */
BAL_API BAL_MUST_CHECK bal_status bal_source_keep_take(bal_source *source, size_t memory_limit, bal_source **out,
                                                       bal_error *err);

/**
 * Several sources one after another, as one: the places of each follow those of the one before.
 *
 * sources  over one domain, n >= 1 of them; taken: they are freed with the joined one, and also when this call fails
 *
 * Fails:  MEMORY; ARGUMENT when the domains differ.
 */
BAL_API BAL_MUST_CHECK bal_status bal_source_join_take(bal_source *const *sources, size_t n, bal_source **out, bal_error *err);

#ifdef __cplusplus
}
#endif
#endif
