/* A table file as a source of blocks, as far as its reading in parts needs to know it. */
#ifndef FORMATS_TABLE_SOURCE_H
#define FORMATS_TABLE_SOURCE_H

#include "formats/table_reader.h"
#include "formats/weights.h"
#include "model/block.h"

/** A table of less than two parts is read in order, and its bytes hashed as they come. */
#define BALI_PART_BYTES ((uint64_t)8 << 20)

/** What one part of a table came to. */
typedef struct bali_table_note {
    bool closed;
    size_t remarks;      /* what it had to say */
    uint64_t start, end; /* bytes of its first record and behind its last */
    uint64_t records, given, dropped, incomplete, places;
    bali_weight_sum weight;
    bool fractional, weighs;
    uint64_t *missing; /* one a variable */
} bali_table_note;

typedef struct bali_table {
    bal_source source;
    char *path;
    bali_table_reader reader;
    bal_groups *groups; /* borrowed; NULL without a fold column */
    size_t n;           /* records in the block */
    uint64_t *places;   /* of each */
    double *weights;    /* of each; NULL when every one is 1 */
    uint32_t *numbers;  /* of its group */
    uint64_t given, dropped, incomplete;
    uint64_t end;            /* places gone over */
    bali_weight_sum weight;  /* of the records given */
    bool fractional, weighs; /* some weight is not whole; some weight is above 0 */
    bool told_end;

    bal_table_options options; /* with which a part is opened */
    uint64_t part_bytes;       /* BALI_PART_BYTES, but for tests */
    bool is_part;
    uint64_t bound;            /* a part ends where a record begins at this byte or behind it; 0 = at the end of the file */
    uint64_t start;            /* a part's first record */
    bali_table_note *notes;    /* of the parts; NULL until the first is counted */
    size_t n_notes;
} bali_table;

/** As bal_table_open. */
BAL_MUST_CHECK bal_status bali_table_open(const bal_domain *domain, const char *path, const bal_table_options *options, bali_table **out,
                                          bal_error *err);

/** How a table is read in parts (table_parts.c). */
extern const bali_source_parts bali_table_parts;
void bali_table_notes_free(bali_table *table);

#endif
