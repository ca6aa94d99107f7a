/* Where the numbers of a written file come from: no time stamps and no paths, so the same inputs give the same bytes. */
#ifndef CLI_PROVENANCE_H
#define CLI_PROVENANCE_H

#include "cli/inputs.h"

/**
 * Sets ballast.records, ballast.made-by, ballast.inputs and ballast.parts of a document.
 *
 * A part is one tally that went in: the SHA-256 of its counts as text, a line a family with its name and its counts in TABLE
 * order. Parts of a counts file that was read are taken over.
 *
 * carried  keep the parts the document has already, since their counts are kept
 *
 * Fails: MEMORY.
 */
BAL_MUST_CHECK bal_status bali_set_provenance(bal_document *document, const bali_inputs *inputs, bool carried, bal_error *err);

/** Adds the SHA-256 by which a tally is known as a part. Fails: MEMORY. */
BAL_MUST_CHECK bal_status bali_put_counts_hash(const bal_cells *counts, bali_text *value, bal_error *err);

/** Sets a property of the network to a text, which is emptied. Fails: MEMORY. */
BAL_MUST_CHECK bal_status bali_set_property(bal_document *document, const char *name, bali_text *value, bal_error *err);

#endif
