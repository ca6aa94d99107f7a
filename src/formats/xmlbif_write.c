/* A document as XMLBIF 0.3: one row of a table a line, so that people can read it and line-wise tools can compare it.
 */
#include "formats/xmlbif.h"

#include "base/markup.h"
#include "base/memory.h"
#include "base/numbers.h"
#include "model/document.h"

#include <string.h>

/* The declarations say what the format is; a reader that checks a document against its type finds them here. */
static const char head[] = "<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n"
                           "<!DOCTYPE BIF [\n"
                           "  <!ELEMENT BIF (NETWORK)*>\n"
                           "  <!ATTLIST BIF VERSION CDATA #REQUIRED>\n"
                           "  <!ELEMENT NETWORK (NAME, (PROPERTY | VARIABLE | DEFINITION)*)>\n"
                           "  <!ELEMENT NAME (#PCDATA)>\n"
                           "  <!ELEMENT VARIABLE (NAME, (OUTCOME | PROPERTY)*)>\n"
                           "  <!ATTLIST VARIABLE TYPE (nature | decision | utility) \"nature\">\n"
                           "  <!ELEMENT OUTCOME (#PCDATA)>\n"
                           "  <!ELEMENT DEFINITION (FOR | GIVEN | TABLE | PROPERTY)*>\n"
                           "  <!ELEMENT FOR (#PCDATA)>\n"
                           "  <!ELEMENT GIVEN (#PCDATA)>\n"
                           "  <!ELEMENT TABLE (#PCDATA)>\n"
                           "  <!ELEMENT PROPERTY (#PCDATA)>\n"
                           "]>\n"
                           "<BIF VERSION=\"" BALI_XMLBIF_VERSION "\">\n"
                           "  <NETWORK>\n";

static const char foot[] = "  </NETWORK>\n</BIF>\n";

/* Where each family's and variable's properties are: a chain in the document's order. */
typedef struct writer {
    const bal_document *document;
    const bal_network *network;
    const bal_domain *domain;
    const bali_property *properties;
    size_t *first[3], *next; /* first[of][variable or 0], next[property]: index + 1, 0 = none */
    bali_text text;
} writer;

static void put_element(writer *w, const char *indent, const char *name, const char *content) {
    bali_text_printf(&w->text, "%s<%s>", indent, name);
    bali_markup_content(&w->text, content, strlen(content));
    bali_text_printf(&w->text, "</%s>\n", name);
}

static bool chain_properties(writer *w) {
    size_t n_properties, n = bal_network_variables(w->network);
    w->properties = bali_document_properties(w->document, &n_properties);
    w->next = bali_allocate(n_properties, sizeof *w->next);
    for (size_t of = 0; of < 3; of++) w->first[of] = bali_allocate(n, sizeof *w->first[of]);
    if (!w->next || !w->first[0] || !w->first[1] || !w->first[2]) return false;
    for (size_t i = n_properties; i-- > 0;) {
        const bali_property *p = &w->properties[i];
        size_t *first = &w->first[p->of][p->of == BAL_OF_NETWORK ? 0 : p->variable];
        w->next[i] = *first;
        *first = i + 1;
    }
    return true;
}

static void put_properties(writer *w, bal_property_of of, size_t variable, const char *indent) {
    for (size_t i = w->first[of][variable]; i > 0; i = w->next[i - 1])
        put_element(w, indent, "PROPERTY", w->properties[i - 1].text);
}

static void put_variable(writer *w, size_t v) {
    bali_text_puts(&w->text, "    <VARIABLE TYPE=\"nature\">\n");
    put_element(w, "      ", "NAME", bal_domain_name(w->domain, v));
    for (size_t k = 0; k < bal_domain_outcomes(w->domain, v); k++)
        put_element(w, "      ", "OUTCOME", bal_domain_outcome(w->domain, v, k));
    put_properties(w, BAL_OF_VARIABLE, v, "      ");
    bali_text_puts(&w->text, "    </VARIABLE>\n");
}

/* Numbers, so many a line. */
static void put_numbers(writer *w, const double *values, size_t rows, size_t in_a_row) {
    for (size_t j = 0; j < rows; j++) {
        bali_text_puts(&w->text, "        ");
        for (size_t k = 0; k < in_a_row; k++) {
            if (k > 0) bali_text_putc(&w->text, ' ');
            bali_text_put_number(&w->text, values[j * in_a_row + k]);
        }
        bali_text_putc(&w->text, '\n');
    }
}

static void put_cells(writer *w, size_t v, bali_draft_list which, const double *values) {
    size_t rows = bal_network_rows(w->network, v), outcomes = bal_network_outcomes(w->network, v);
    if (!values) return;
    if (which == BALI_LIST_TABLE) {
        bali_text_puts(&w->text, "      <TABLE>\n");
        put_numbers(w, values, rows, outcomes);
        bali_text_puts(&w->text, "      </TABLE>\n");
    } else {
        bali_text_printf(&w->text, "      <PROPERTY>%s =\n", bali_draft_list_name(which));
        put_numbers(w, values, rows, outcomes);
        bali_text_puts(&w->text, "      </PROPERTY>\n");
    }
}

/* One number when every row has the same. */
static void put_row_ess(writer *w, size_t v) {
    const double *row_ess = bal_document_row_ess(w->document, v);
    size_t rows = bal_network_rows(w->network, v), equal = 1;
    if (!row_ess) return;
    while (equal < rows && row_ess[equal] == row_ess[0]) equal++;
    bali_text_printf(&w->text, "      <PROPERTY>%s =", bali_draft_list_name(BALI_LIST_ROW_ESS));
    for (size_t j = 0; j < (equal == rows ? 1 : rows); j++) {
        bali_text_putc(&w->text, ' ');
        bali_text_put_number(&w->text, row_ess[j]);
    }
    bali_text_puts(&w->text, "</PROPERTY>\n");
}

static const double *family(const bal_document *document, bal_carried what, size_t v) {
    const bal_cells *cells = bal_document_cells(document, what);
    return cells ? bal_cells_family(cells, v) : NULL;
}

static void put_definition(writer *w, size_t v) {
    size_t n_parents;
    const size_t *parents = bal_network_parents(w->network, v, &n_parents);
    bali_text_puts(&w->text, "    <DEFINITION>\n");
    put_element(w, "      ", "FOR", bal_domain_name(w->domain, v));
    for (size_t p = 0; p < n_parents; p++) put_element(w, "      ", "GIVEN", bal_domain_name(w->domain, parents[p]));
    put_cells(w, v, BALI_LIST_TABLE, bali_document_table(w->document, v));
    put_cells(w, v, BALI_LIST_COUNTS, family(w->document, BAL_CARRIED_COUNTS, v));
    put_cells(w, v, BALI_LIST_PSEUDO_COUNTS, family(w->document, BAL_CARRIED_PSEUDO_COUNTS, v));
    put_row_ess(w, v);
    put_properties(w, BAL_OF_DEFINITION, v, "      ");
    bali_text_puts(&w->text, "    </DEFINITION>\n");
}

static void put_document(writer *w) {
    size_t n = bal_network_variables(w->network);
    bali_text_puts(&w->text, head);
    put_element(w, "    ", "NAME", bal_document_name(w->document));
    put_properties(w, BAL_OF_NETWORK, 0, "    ");
    for (size_t v = 0; v < n; v++) put_variable(w, v);
    for (size_t v = 0; v < n; v++) put_definition(w, v);
    bali_text_puts(&w->text, foot);
}

bal_status bal_document_print(const bal_document *document, char **text, size_t *length, bal_error *err) {
    *text = NULL;
    *length = 0;
    const bal_network *network = bal_document_network(document);
    writer w = {.document = document, .network = network, .domain = bal_network_domain(network)};
    bool chained = chain_properties(&w);
    if (chained) put_document(&w);
    for (size_t of = 0; of < 3; of++) bali_free(w.first[of]);
    bali_free(w.next);
    if (!chained || w.text.failed) {
        bali_text_free(&w.text);
        return bali_out_of_memory(err);
    }
    *text = w.text.bytes;
    *length = w.text.length;
    return BAL_OK;
}

void bal_text_free(char *text) {
    bali_free(text);
}
