/* The interface of a block source: what a table, a simulation and kept records have in common. */
#ifndef MODEL_BLOCK_H
#define MODEL_BLOCK_H

#include "ballast/table.h"

#define BALI_BLOCK_RECORDS 4096

/**
 * How a source is read in parts at once, each a source of its own. Parts have fixed bounds, whatever the number of threads. A part
 * says nothing to anybody: what it has to say makes join return false, and the source is then read in one piece, in order.
 */
typedef struct bali_source_parts {
    /** How many parts there are; 0 where the medium can only be read in one piece. */
    size_t (*count)(bal_source *source);
    /** Opens a part. Different parts may be opened, read and closed by different threads. */
    bal_status (*open)(bal_source *source, size_t part, bal_source **out, bal_error *err);
    /** Notes what a part came to, which was read to its end, and frees it. */
    void (*close)(bal_source *source, size_t part, bal_source *opened);
    /** Whether the parts, all of them closed, make up the whole without a remark; the summary is then theirs. */
    bool (*join)(bal_source *source);
} bali_source_parts;

/** What a source does. summary, locate and parts may be NULL. */
typedef struct bali_source_methods {
    bal_status (*next)(bal_source *source, bal_block *block, bal_error *err);
    bal_status (*rewind)(bal_source *source, bal_error *err);
    void (*locate)(bal_source *source, uint64_t place, bal_error *err);
    void (*summary)(const bal_source *source, bal_source_summary *out);
    void (*free)(bal_source *source); /* frees the source itself too, but not its domain */
    const bali_source_parts *parts;
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
