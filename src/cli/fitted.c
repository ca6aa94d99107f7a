#include "cli/fitted.h"

#include "base/numbers.h"
#include "cli/provenance.h"

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

/* What prior the pseudo-counts are of; carried ones are of the prior they were carried from. */
static bal_status set_prior(const bali_fit_facts *facts, bal_document *document, bal_error *err) {
    if (bal_prior_kind_of(facts->prior) == BAL_PRIOR_CARRIED) return BAL_OK;
    bali_text value = {0};
    bal_status status;
    if (bal_prior_kind_of(facts->prior) == BAL_PRIOR_BDEU) {
        bali_text_put_number(&value, facts->fit->strength.value);
        status = bali_set_property(document, "ballast.ess", &value, err);
    } else {
        status = bal_document_set_property(document, BAL_OF_NETWORK, BAL_NONE, "ballast.ess", NULL, err);
    }
    put_prior(facts, &value);
    if (status == BAL_OK) status = bali_set_property(document, "ballast.prior", &value, err);
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

bal_status bali_fitted_document(const bali_fit_facts *facts, const bali_inputs *inputs, bal_document **out, bal_error *err) {
    bal_document *document = NULL;
    bal_status status = bal_document_copy(facts->document, &document, err);
    if (status == BAL_OK) status = set_tables(facts, document, err);
    if (status == BAL_OK) status = bal_document_set_cells(document, BAL_CARRIED_COUNTS, facts->fit->counts, err);
    if (status == BAL_OK) status = bal_document_set_cells(document, BAL_CARRIED_PSEUDO_COUNTS, facts->fit->pseudo_counts, err);
    if (status == BAL_OK) status = set_prior(facts, document, err);
    if (status == BAL_OK) status = bali_set_provenance(document, inputs, bal_prior_kind_of(facts->prior) == BAL_PRIOR_CARRIED, err);
    if (status == BAL_OK) {
        *out = document;
    } else {
        bal_document_free(document);
        *out = NULL;
    }
    return status;
}
