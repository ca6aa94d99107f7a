/* XMLBIF 0.3: the words of the format. */
#ifndef FORMATS_XMLBIF_H
#define FORMATS_XMLBIF_H

#include "formats/draft.h"

#define BALI_XMLBIF_VERSION "0.3"

/**
 * Reads an XMLBIF text into a draft.
 *
 * draft  its xml is what is read; filled also when the call fails, and freed by the caller
 *
 * Fails:  SYNTAX, DATA with file, line and column; MEMORY.
 * Cost:   O(length).
 */
BAL_MUST_CHECK bal_status bali_xmlbif_read(bali_draft *draft, size_t max_cells, bali_remarks *remarks, bal_error *err);

/** Reads an XMLBIF text into a document. Fails as bal_document_read. */
BAL_MUST_CHECK bal_status bali_xmlbif_document(bali_xml *xml, const bal_network_options *options, bal_document **out,
                                               bal_error *err);

#endif
