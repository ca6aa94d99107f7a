#include "support/document_texts.h"

#include "base/memory.h"
#include "formats/xmlbif.h"
#include "model/document.h"

#include <float.h>
#include <string.h>

static void tell(void *context, bal_severity severity, const bal_error *notice) {
    said *s = context;
    ck_assert_int_eq(severity, BAL_WARNING);
    ck_assert_int_eq(notice->status, BAL_OK);
    ck_assert_str_eq(notice->file, "model.xml");
    bali_text_printf(&s->text, "%s %zu:%zu %s\n", notice->code, notice->line, notice->column, notice->message);
    s->n++;
}

bal_status read_bytes(const char *bytes, size_t length, bal_network_options options, said *warnings, bal_document **out,
                      bal_error *err) {
    bal_notices notices = {tell, warnings};
    if (warnings) options.notices = &notices;
    bali_xml *xml = NULL;
    *out = NULL;
    char *copy = bali_duplicate(bytes, length);
    if (!copy) return bali_out_of_memory(err);
    bal_status status = bali_xml_create_take("model.xml", copy, length, &xml, err);
    if (status == BAL_OK) status = bali_xmlbif_document(xml, &options, out, err);
    bali_xml_free(xml);
    return status;
}

bal_document *read_or_fail(const char *bytes, bal_network_options options, said *warnings) {
    bal_document *document = NULL;
    bal_error err = {0};
    bal_status status = read_bytes(bytes, strlen(bytes), options, warnings, &document, &err);
    ck_assert_msg(status == BAL_OK, "%zu:%zu %s", err.line, err.column, err.message);
    return document;
}

bal_document *read_text(const char *bytes) {
    return read_or_fail(bytes, bal_network_options_defaults(), NULL);
}

void expect_refused_text(const char *bytes, bal_network_options options, size_t line, size_t column, const char *code,
                         const char *words) {
    bal_document *document = NULL;
    bal_error err = {0};
    bal_status status = read_bytes(bytes, strlen(bytes), options, NULL, &document, &err);
    ck_assert_msg(status == BAL_ERR_DATA || status == BAL_ERR_SYNTAX, "status %d for a text that should say \"%s\"",
                  (int)status, words);
    ck_assert_ptr_null(document);
    ck_assert_msg(strstr(err.message, words) != NULL, "\"%s\" lacks \"%s\"", err.message, words);
    ck_assert_msg(err.line == line && err.column == column, "%zu:%zu instead of %zu:%zu: %s", err.line, err.column,
                  line, column, err.message);
    ck_assert_msg(strcmp(err.code, code) == 0, "%s instead of %s: %s", err.code, code, err.message);
    ck_assert_str_eq(err.file, "model.xml");
}

void expect_table_row(const bal_document *document, size_t variable, size_t row, const double *expected) {
    const double *table = bali_document_table(document, variable);
    size_t outcomes = bal_network_outcomes(bal_document_network(document), variable);
    ck_assert_ptr_nonnull(table);
    for (size_t k = 0; k < outcomes; k++)
        ck_assert_double_eq_tol(table[row * outcomes + k], expected[k], 4 * DBL_EPSILON);
}

void print_document(const bal_document *document, char **text, size_t *length) {
    bal_error err = {0};
    bal_status status = bal_document_print(document, text, length, &err);
    ck_assert_msg(status == BAL_OK, "%s", err.message);
}

void expect_equal_documents(const bal_document *a, const bal_document *b) {
    const bal_network *network = bal_document_network(a);
    ck_assert(bal_network_equal(network, bal_document_network(b)));
    ck_assert_str_eq(bal_document_name(a), bal_document_name(b));
    for (size_t v = 0; v < bal_network_variables(network); v++) {
        size_t rows = bal_network_rows(network, v), cells = rows * bal_network_outcomes(network, v);
        const double *of_a = bali_document_table(a, v), *of_b = bali_document_table(b, v);
        ck_assert((of_a == NULL) == (of_b == NULL));
        if (of_a) ck_assert_mem_eq(of_a, of_b, cells * sizeof *of_a);
        of_a = bal_document_row_ess(a, v), of_b = bal_document_row_ess(b, v);
        ck_assert((of_a == NULL) == (of_b == NULL));
        if (of_a) ck_assert_mem_eq(of_a, of_b, rows * sizeof *of_a);
        for (bal_carried what = BAL_CARRIED_COUNTS; what <= BAL_CARRIED_PSEUDO_COUNTS; what++) {
            const bal_cells *in_a = bal_document_cells(a, what), *in_b = bal_document_cells(b, what);
            ck_assert((in_a == NULL) == (in_b == NULL));
            if (in_a) ck_assert_mem_eq(bal_cells_family(in_a, v), bal_cells_family(in_b, v), cells * sizeof(double));
        }
    }
    for (int of = BAL_OF_NETWORK; of <= BAL_OF_DEFINITION; of++) { /* in their order at each place */
        size_t n_a, n_b, i = 0, j = 0, at_a = 0, at_b = 0;
        const bali_property *of_a = bali_document_properties(a, &n_a), *of_b = bali_document_properties(b, &n_b);
        ck_assert_uint_eq(n_a, n_b);
        for (size_t v = 0; v <= bal_network_variables(network); v++) {
            size_t owner = v == bal_network_variables(network) ? BAL_NONE : v;
            for (i = j = 0;; i++, j++) {
                while (i < n_a && ((int)of_a[i].of != of || of_a[i].variable != owner)) i++;
                while (j < n_b && ((int)of_b[j].of != of || of_b[j].variable != owner)) j++;
                ck_assert((i < n_a) == (j < n_b));
                if (i == n_a) break;
                ck_assert_str_eq(of_a[i].text, of_b[j].text);
                at_a++, at_b++;
            }
        }
        ck_assert_uint_eq(at_a, at_b);
    }
}

void expect_round_trip(const bal_document *document) {
    char *first, *second;
    size_t first_length, second_length;
    print_document(document, &first, &first_length);
    said s = {0};
    bal_document *again = NULL;
    bal_error err = {0};
    bal_status status = read_bytes(first, first_length, bal_network_options_defaults(), &s, &again, &err);
    ck_assert_msg(status == BAL_OK, "%s", err.message);
    /* A foreign name that begins like Ballast's own is remarked upon each time. */
    size_t foreign = 0;
    for (const char *at = bali_text_string(&s.text); (at = strstr(at, "unknown-property ")); at++) foreign++;
    ck_assert_msg(s.n == foreign, "%s", bali_text_string(&s.text));
    expect_equal_documents(document, again);
    print_document(again, &second, &second_length);
    ck_assert_uint_eq(first_length, second_length);
    ck_assert_mem_eq(first, second, first_length);
    bal_text_free(first);
    bal_text_free(second);
    bal_document_free(again);
    bali_text_free(&s.text);
}
