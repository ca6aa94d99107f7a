/* The interface of a block source: what a table, a simulation and kept records have in common. */
#ifndef MODEL_BLOCK_H
#define MODEL_BLOCK_H

#include "ballast/table.h"

#define BALI_BLOCK_RECORDS 4096

/** What a source does. summary and locate may be NULL. */
typedef struct bali_source_methods {
    bal_status (*next)(bal_source *source, bal_block *block, bal_error *err);
    bal_status (*rewind)(bal_source *source, bal_error *err);
    void (*locate)(bal_source *source, uint64_t place, bal_error *err);
    void (*summary)(const bal_source *source, bal_source_summary *out);
    void (*free)(bal_source *source); /* frees the source itself too, but not its domain */
} bali_source_methods;

/** The head of every source: a concrete source has this as its first member. */
struct bal_source {
    const bali_source_methods *methods;
    bal_domain *domain; /* held; bal_source_free gives it back */
};

/** Sets the head of a new source; takes a hold of the domain. */
void bali_source_init(bal_source *source, const bali_source_methods *methods, const bal_domain *domain);

/** 1, or 2 when a variable of the domain has more than 254 outcomes. */
unsigned bali_code_width(const bal_domain *domain);

#endif
