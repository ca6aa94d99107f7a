#include "cli/fitted.h"

#include "base/hash.h"
#include "base/memory.h"
#include "base/numbers.h"
#include "ballast.h"

#include <string.h>

static bal_status set(bal_document *document, const char *name, bali_text *value, bal_error *err) {
    bal_status status = value->failed ? bali_out_of_memory(err)
                                      : bal_document_set_property(document, BAL_OF_NETWORK, BAL_NONE, name, bali_text_string(value), err);
    bali_text_clear(value);
    return status;
}

/* The SHA-256 of the counts as text: a line a family, its name and its counts in TABLE order. */
static bal_status put_part(const bal_cells *counts, bali_text *value, bal_error *err) {
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

static void put_prior(const bali_fit_facts *facts, bali_text *value) {
    bal_prior_kind kind = bal_prior_kind_of(facts->prior);
    bali_text_puts(value, bal_prior_kind_name(kind));
    if (kind == BAL_PRIOR_BDEU) return;
    bali_text_puts(value, " scale=");
    bali_text_put_number(value, facts->fit->strength.value);
    if (kind != BAL_PRIOR_EXPERT) return;
    if (facts->prior_options->row_ess > 0) {
        bali_text_puts(value, " row-ess=");
        bali_text_put_number(value, facts->prior_options->row_ess);
    }
    bali_text_puts(value, " floor=");
    bali_text_put_number(value, facts->prior_options->floor);
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

static bal_status set_provenance(const bali_fit_facts *facts, bal_document *document, bal_error *err) {
    bali_text value = {0};
    bali_text_put_number(&value, facts->fit->records);
    bal_status status = set(document, "ballast.records", &value, err);
    if (status == BAL_OK && bal_prior_kind_of(facts->prior) == BAL_PRIOR_BDEU) {
        bali_text_put_number(&value, facts->fit->strength.value);
        status = set(document, "ballast.ess", &value, err);
    } else if (status == BAL_OK) {
        status = bal_document_set_property(document, BAL_OF_NETWORK, BAL_NONE, "ballast.ess", NULL, err);
    }
    put_prior(facts, &value);
    if (status == BAL_OK) status = set(document, "ballast.prior", &value, err);
    bali_text_puts(&value, "ballast " BALLAST_VERSION);
    if (status == BAL_OK) status = set(document, "ballast.made-by", &value, err);
    put_inputs(facts->data, &value);
    if (status == BAL_OK) status = set(document, "ballast.inputs", &value, err);
    if (status == BAL_OK) status = put_part(facts->fit->counts, &value, err);
    if (status == BAL_OK) status = set(document, "ballast.parts", &value, err);
    bali_text_free(&value);
    return status;
}

static bal_status set_tables(const bali_fit_facts *facts, bal_document *document, bal_error *err) {
    if (!facts->maximum_likelihood) return bal_document_set_cells(document, BAL_CARRIED_TABLES, facts->fit->mean, err);
    bal_cells *tables = NULL;
    bal_status status = bal_cells_create(bal_cells_network(facts->fit->counts), &tables, err);
    if (status == BAL_OK) {
        bal_maximum_likelihood(facts->fit->counts, tables, NULL);
        status = bal_document_set_cells(document, BAL_CARRIED_TABLES, tables, err);
    }
    bal_cells_free(tables);
    return status;
}

bal_status bali_fitted_document(const bali_fit_facts *facts, bal_document **out, bal_error *err) {
    bal_document *document = NULL;
    bal_status status = bal_document_copy(facts->document, &document, err);
    if (status == BAL_OK) status = set_tables(facts, document, err);
    if (status == BAL_OK) status = bal_document_set_cells(document, BAL_CARRIED_COUNTS, facts->fit->counts, err);
    if (status == BAL_OK) status = bal_document_set_cells(document, BAL_CARRIED_PSEUDO_COUNTS, facts->fit->pseudo_counts, err);
    if (status == BAL_OK) status = set_provenance(facts, document, err);
    if (status == BAL_OK) {
        *out = document;
    } else {
        bal_document_free(document);
        *out = NULL;
    }
    return status;
}
