#include "model/document.h"

#include "base/memory.h"
#include "base/text.h"
#include "model/cells.h"
#include "model/shape.h"

#include <string.h>

enum { N_CARRIED = BAL_CARRIED_PSEUDO_COUNTS + 1 };

struct bal_document {
    bal_network *network;
    char *name;
    bal_cells *cells[N_CARRIED];
    bool *given;     /* which families have a TABLE; n variables */
    size_t n_given;
    double **row_ess; /* one array a variable, or NULL */
    bali_property *properties;
    size_t n_properties, capacity;
};

bal_status bal_document_create(const bal_network *network, const char *name, bal_document **out, bal_error *err) {
    *out = NULL;
    size_t n = bal_network_variables(network);
    bal_document *document = bali_allocate(1, sizeof *document);
    if (!document) return bali_out_of_memory(err);
    document->network = bali_network_hold(network);
    document->name = bali_duplicate(name ? name : "", name ? strlen(name) : 0);
    document->given = bali_allocate(n, sizeof *document->given);
    document->row_ess = bali_allocate(n, sizeof *document->row_ess);
    if (!document->name || !document->given || !document->row_ess) {
        bal_document_free(document);
        return bali_out_of_memory(err);
    }
    *out = document;
    return BAL_OK;
}

void bal_document_free(bal_document *document) {
    if (!document) return;
    for (size_t v = 0; document->row_ess && v < bal_network_variables(document->network); v++) bali_free(document->row_ess[v]);
    for (size_t c = 0; c < N_CARRIED; c++) bal_cells_free(document->cells[c]);
    for (size_t i = 0; i < document->n_properties; i++) bali_free(document->properties[i].text);
    bali_free(document->properties);
    bali_free(document->row_ess);
    bali_free(document->given);
    bali_free(document->name);
    bal_network_free(document->network);
    bali_free(document);
}

bal_status bal_document_copy(const bal_document *from, bal_document **out, bal_error *err) {
    bal_status status = bal_document_create(from->network, from->name, out, err);
    if (status != BAL_OK) return status;
    bal_document *to = *out;
    for (size_t c = 0; c < N_CARRIED && status == BAL_OK; c++)
        if (from->cells[c]) status = bal_cells_copy(from->cells[c], &to->cells[c], err);
    memcpy(to->given, from->given, bal_network_variables(from->network) * sizeof *to->given);
    to->n_given = from->n_given;
    for (size_t v = 0; v < bal_network_variables(from->network) && status == BAL_OK; v++)
        if (from->row_ess[v]) status = bali_document_set_row_ess(to, v, from->row_ess[v], err);
    for (size_t i = 0; i < from->n_properties && status == BAL_OK; i++) {
        const bali_property *p = &from->properties[i];
        status = bali_document_add_property(to, p->of, p->variable, p->text, strlen(p->text), err);
    }
    if (status != BAL_OK) {
        bal_document_free(to);
        *out = NULL;
    }
    return status;
}

const bal_network *bal_document_network(const bal_document *document) {
    return document->network;
}

const char *bal_document_name(const bal_document *document) {
    return document->name;
}

const bal_cells *bal_document_cells(const bal_document *document, bal_carried what) {
    if (what == BAL_CARRIED_TABLES && document->n_given < bal_network_variables(document->network)) return NULL;
    return document->cells[what];
}

bal_status bal_document_set_cells(bal_document *document, bal_carried what, const bal_cells *cells, bal_error *err) {
    bal_cells *copy = NULL;
    if (cells) {
        if (!bal_network_equal(bal_cells_network(cells), document->network))
            return bal_error_set(err, BAL_ERR_ARGUMENT, "other-network",
                                 "the numbers belong to another network; use numbers of the same network");
        bal_status status = bal_cells_copy(cells, &copy, err);
        if (status != BAL_OK) return status;
    }
    bal_cells_free(document->cells[what]);
    document->cells[what] = copy;
    if (what == BAL_CARRIED_TABLES) {
        size_t n = bal_network_variables(document->network);
        for (size_t v = 0; v < n; v++) document->given[v] = copy != NULL;
        document->n_given = copy ? n : 0;
    }
    return BAL_OK;
}

bal_status bali_document_set_tables(bal_document *document, const bal_cells *tables, const bool *given, bal_error *err) {
    bal_status status = bal_document_set_cells(document, BAL_CARRIED_TABLES, tables, err);
    if (status != BAL_OK) return status;
    document->n_given = 0;
    for (size_t v = 0; v < bal_network_variables(document->network); v++) {
        document->given[v] = given[v];
        document->n_given += given[v];
    }
    return BAL_OK;
}

const double *bali_document_table(const bal_document *document, size_t variable) {
    return document->given[variable] ? bal_cells_family(document->cells[BAL_CARRIED_TABLES], variable) : NULL;
}

const double *bal_document_row_ess(const bal_document *document, size_t variable) {
    return document->row_ess[variable];
}

bal_status bali_document_set_row_ess(bal_document *document, size_t variable, const double *row_ess, bal_error *err) {
    size_t rows = bal_network_rows(document->network, variable);
    double *copy = bali_allocate(rows, sizeof *copy);
    if (!copy) return bali_out_of_memory(err);
    memcpy(copy, row_ess, rows * sizeof *copy);
    bali_free(document->row_ess[variable]);
    document->row_ess[variable] = copy;
    return BAL_OK;
}

const bali_property *bali_document_properties(const bal_document *document, size_t *n) {
    *n = document->n_properties;
    return document->properties;
}

bal_status bali_document_add_property(bal_document *document, bal_property_of of, size_t variable, const char *text, size_t length,
                                      bal_error *err) {
    char *copy = bali_duplicate(text, length);
    if (!copy || !bali_grow((void **)&document->properties, &document->capacity, document->n_properties + 1,
                            sizeof *document->properties)) {
        bali_free(copy);
        return bali_out_of_memory(err);
    }
    document->properties[document->n_properties++] = (bali_property){of, of == BAL_OF_NETWORK ? BAL_NONE : variable, copy};
    return BAL_OK;
}

static const char *skip_blanks(const char *text) {
    return text + strspn(text, " \t\r\n");
}

const char *bali_property_value(const char *text, const char *name) {
    size_t length = strlen(name);
    text = skip_blanks(text);
    if (strncmp(text, name, length) != 0) return NULL;
    text = skip_blanks(text + length);
    return *text == '=' ? skip_blanks(text + 1) : NULL;
}

static size_t find_property(const bal_document *document, bal_property_of of, size_t variable, const char *name) {
    for (size_t i = 0; i < document->n_properties; i++) {
        const bali_property *p = &document->properties[i];
        if (p->of == of && (of == BAL_OF_NETWORK || p->variable == variable) && bali_property_value(p->text, name)) return i;
    }
    return BAL_NONE;
}

const char *bal_document_property(const bal_document *document, bal_property_of of, size_t variable, const char *name) {
    size_t i = find_property(document, of, variable, name);
    return i == BAL_NONE ? NULL : bali_property_value(document->properties[i].text, name);
}

bal_status bal_document_set_property(bal_document *document, bal_property_of of, size_t variable, const char *name,
                                     const char *value, bal_error *err) {
    size_t i = find_property(document, of, variable, name);
    if (!value) {
        if (i == BAL_NONE) return BAL_OK;
        bali_free(document->properties[i].text);
        document->n_properties--;
        memmove(&document->properties[i], &document->properties[i + 1],
                (document->n_properties - i) * sizeof *document->properties);
        return BAL_OK;
    }
    bal_status status = BAL_OK;
    bali_text text = {0};
    bali_text_printf(&text, "%s = %s", name, value);
    if (text.failed) {
        status = bali_out_of_memory(err);
    } else if (i == BAL_NONE) {
        status = bali_document_add_property(document, of, variable, text.bytes, text.length, err);
    } else {
        bali_free(document->properties[i].text);
        document->properties[i].text = text.bytes;
        text = (bali_text){0};
    }
    bali_text_free(&text);
    return status;
}
