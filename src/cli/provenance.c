#include "cli/provenance.h"

#include "base/hash.h"
#include "base/memory.h"
#include "base/numbers.h"

#include <string.h>

bal_status bali_set_property(bal_document *document, const char *name, bali_text *value, bal_error *err) {
    bal_status status = value->failed ? bali_out_of_memory(err)
                                      : bal_document_set_property(document, BAL_OF_NETWORK, BAL_NONE, name, bali_text_string(value), err);
    bali_text_clear(value);
    return status;
}

bal_status bali_put_counts_hash(const bal_cells *counts, bali_text *value, bal_error *err) {
    const bal_network *network = bal_cells_network(counts);
    bali_hash *hash = bali_hash_create();
    if (!hash) return bali_out_of_memory(err);
    bali_text line = {0};
    for (size_t v = 0; v < bal_network_variables(network); v++) {
        size_t cells = bal_network_rows(network, v) * bal_network_outcomes(network, v);
        const double *n = bal_cells_family(counts, v);
        bali_text_clear(&line);
        bali_text_puts(&line, bal_domain_name(bal_network_domain(network), v));
        for (size_t c = 0; c < cells; c++) {
            bali_text_putc(&line, ' ');
            bali_text_put_number(&line, n[c]);
        }
        bali_text_putc(&line, '\n');
        value->failed |= line.failed;
        bali_hash_add(hash, bali_text_string(&line), line.length);
    }
    char digest[BALI_HASH_TEXT];
    bali_hash_take(hash, digest);
    bali_text_puts(value, digest);
    bali_text_free(&line);
    bali_hash_free(hash);
    return BAL_OK;
}

/* The parts the document has already, where they are kept, and those that came with the data. */
static bal_status put_parts(const bal_document *document, const bali_inputs *inputs, bool carried, bali_text *value, bal_error *err) {
    bool kept = carried && inputs->facts.earlier > 0; /* --carry 0 leaves nothing of them */
    const char *old = kept ? bal_document_property(document, BAL_OF_NETWORK, BAL_NONE, "ballast.parts") : NULL;
    const char *given = inputs->data_document
                            ? bal_document_property(inputs->data_document, BAL_OF_NETWORK, BAL_NONE, "ballast.parts")
                            : NULL;
    bool own = inputs->facts.n_data == 0; /* the document's own counts are the data: no part is new */
    if (own) old = bal_document_property(document, BAL_OF_NETWORK, BAL_NONE, "ballast.parts");
    if (old) bali_text_puts(value, old);
    if (own && old) return BAL_OK;
    if (old) bali_text_putc(value, ' ');
    if (given) bali_text_puts(value, given);
    return given ? BAL_OK : bali_put_counts_hash(inputs->counts, value, err);
}

/* "clinic.xml" sha256=..., "cases.csv" sha256=... */
static void put_inputs(const bali_data_facts *data, bali_text *value) {
    for (size_t i = 0; i < data->n_inputs; i++) {
        const bal_file_facts *file = &data->inputs[i];
        bali_text_puts(value, i ? ", \"" : "\"");
        bali_text_put_visible(value, file->name, strlen(file->name)); /* XML has no control characters */
        bali_text_printf(value, "\" %s%s", file->sha256[0] ? "sha256=" : "", file->sha256);
        if (!file->sha256[0]) bali_text_printf(value, "bytes=%llu", (unsigned long long)file->bytes);
    }
}

bal_status bali_set_provenance(bal_document *document, const bali_inputs *inputs, bool carried, bal_error *err) {
    bali_text value = {0};
    bali_text_put_number(&value, inputs->facts.records + inputs->facts.earlier);
    bal_status status = bali_set_property(document, "ballast.records", &value, err);
    bali_text_puts(&value, "ballast " BALLAST_VERSION);
    if (status == BAL_OK) status = bali_set_property(document, "ballast.made-by", &value, err);
    put_inputs(&inputs->facts, &value);
    if (status == BAL_OK) status = bali_set_property(document, "ballast.inputs", &value, err);
    if (status == BAL_OK) status = put_parts(document, inputs, carried, &value, err);
    if (status == BAL_OK) status = bali_set_property(document, "ballast.parts", &value, err);
    bali_text_free(&value);
    return status;
}
