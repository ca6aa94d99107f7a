#include "formats/column_rules.h"

#include "base/memory.h"
#include "base/numbers.h"
#include "formats/phrase.h"
#include "model/document.h"
#include "model/domain.h"

#include <string.h>

static bool is_blank(char c) {
    return c == ' ' || c == '\t' || c == '\n' || c == '\r';
}

/* What is wrong with a variable's property; its name stands first in the message. */
static bal_status refuse_property(const bal_domain *domain, size_t variable, const char *code, const bali_phrase *what,
                                  bal_error *err) {
    bali_phrase phrase = {0};
    const char *name = bal_domain_name(domain, variable);
    bali_phrase_add(&phrase, "%s of ", strcmp(code, "bad-cuts") == 0 ? BALI_CUTS_PROPERTY : BALI_COLUMN_PROPERTY);
    bali_phrase_text(&phrase, name, strlen(name));
    bali_phrase_add(&phrase, " %s", what->text);
    (void)bal_error_set(err, BAL_ERR_DATA, code, "%s", phrase.text);
    bal_error_context(err, 0, name);
    return err ? err->status : BAL_ERR_DATA;
}

static bal_status refuse_cut(const bal_domain *domain, size_t variable, const char *text, size_t length, bal_error *err) {
    bali_phrase what = {0};
    bali_phrase_add(&what, "holds ");
    bali_phrase_quote(&what, text, length);
    bali_phrase_add(&what, memchr(text, ',', length) ? ", which is no number; write numbers with a decimal point and blanks between them"
                                                      : ", which is no finite number; write numbers like 37.5");
    return refuse_property(domain, variable, "bad-cuts", &what, err);
}

static bal_status read_cuts(bali_column_rules *rules, const bal_domain *domain, size_t variable, const char *text, bal_error *err) {
    size_t expected = bal_domain_outcomes(domain, variable) - 1, n = 0;
    double *cuts = rules->cuts[variable] = bali_allocate(expected + 1, sizeof *cuts);
    if (!cuts) return bali_out_of_memory(err);
    for (;;) {
        while (is_blank(*text)) text++;
        size_t length = 0;
        while (text[length] != '\0' && !is_blank(text[length])) length++;
        if (length == 0) break;
        double cut;
        if (!bali_number_read(text, length, &cut)) return refuse_cut(domain, variable, text, length, err);
        bali_phrase what = {0};
        if (n > 0 && n <= expected && !(cuts[n - 1] < cut)) {
            bali_phrase_add(&what, "does not ascend at ");
            bali_phrase_quote(&what, text, length);
            bali_phrase_add(&what, "; every cut is above the one before");
            return refuse_property(domain, variable, "bad-cuts", &what, err);
        }
        if (n < expected) cuts[n] = cut;
        n++;
        text += length;
    }
    if (n == expected) return BAL_OK;
    bali_phrase what = {0};
    bali_phrase_add(&what, "has %zu cut%s for %zu outcomes; give one cut less than outcomes: %zu", n, n == 1 ? "" : "s", expected + 1,
                    expected);
    return refuse_property(domain, variable, "bad-cuts", &what, err);
}

static bal_status read_column(bali_column_rules *rules, const bal_domain *domain, size_t variable, const char *text, bal_error *err) {
    size_t length = strlen(text), first;
    while (length > 0 && is_blank(text[length - 1])) length--;
    bali_phrase what = {0};
    if (length == 0) {
        bali_phrase_add(&what, "names no column; write the column's name behind the =, or remove the property");
        return refuse_property(domain, variable, "bad-column", &what, err);
    }
    char *name = rules->columns[variable] = bali_duplicate(text, length);
    if (!name || !bali_names_add(&rules->named, name, &first)) return bali_out_of_memory(err);
    if (first == BALI_NO_NAME) {
        rules->variables[rules->named.n_names - 1] = variable;
        return BAL_OK;
    }
    const char *other = bal_domain_name(domain, rules->variables[first]);
    bali_phrase_add(&what, "names the column ");
    bali_phrase_quote(&what, name, length);
    bali_phrase_add(&what, ", which is that of ");
    bali_phrase_text(&what, other, strlen(other));
    bali_phrase_add(&what, " already; a column holds one variable");
    return refuse_property(domain, variable, "bad-column", &what, err);
}

/* A column cannot be both that of the variable it is named as and that of another one. */
static bal_status check_names(const bali_column_rules *rules, const bal_domain *domain, bal_error *err) {
    for (size_t v = 0; v < rules->n_variables; v++) {
        const char *name = rules->columns[v];
        size_t other = name ? bali_domain_find(domain, name, strlen(name)) : BAL_NONE;
        if (other == BAL_NONE || rules->columns[other]) continue;
        bali_phrase what = {0};
        bali_phrase_add(&what, "names the column ");
        bali_phrase_quote(&what, name, strlen(name));
        bali_phrase_add(&what, ", which is that of the variable of that name; a column holds one variable");
        if (other != v) return refuse_property(domain, v, "bad-column", &what, err);
    }
    return BAL_OK;
}

bal_status bali_column_rules_read(bali_column_rules *rules, const bal_domain *domain, const bal_document *document, bal_error *err) {
    size_t n_properties, n = bal_domain_variables(domain);
    if (!document) return BAL_OK;
    if (!bali_domain_equal(domain, bal_network_domain(bal_document_network(document))))
        return bal_error_set(err, BAL_ERR_ARGUMENT, "other-network",
                             "the document follows other variables than the table; use one of the same variables");
    rules->n_variables = n;
    rules->columns = bali_allocate(n, sizeof *rules->columns);
    rules->cuts = bali_allocate(n, sizeof *rules->cuts);
    rules->variables = bali_allocate(n, sizeof *rules->variables);
    if (!rules->columns || !rules->cuts || !rules->variables) return bali_out_of_memory(err);
    const bali_property *properties = bali_document_properties(document, &n_properties);
    for (size_t i = 0; i < n_properties; i++) {
        const bali_property *p = &properties[i];
        if (p->of != BAL_OF_VARIABLE) continue;
        const char *column = bali_property_value(p->text, BALI_COLUMN_PROPERTY), *cuts = bali_property_value(p->text, BALI_CUTS_PROPERTY);
        bal_status status = BAL_OK;
        if (column && !rules->columns[p->variable]) status = read_column(rules, domain, p->variable, column, err);
        if (cuts && !rules->cuts[p->variable]) status = read_cuts(rules, domain, p->variable, cuts, err);
        if (status != BAL_OK) return status;
    }
    return check_names(rules, domain, err);
}

void bali_column_rules_free(bali_column_rules *rules) {
    for (size_t v = 0; v < rules->n_variables; v++) {
        if (rules->columns) bali_free(rules->columns[v]);
        if (rules->cuts) bali_free(rules->cuts[v]);
    }
    bali_names_free(&rules->named);
    bali_free(rules->columns);
    bali_free(rules->cuts);
    bali_free(rules->variables);
    *rules = (bali_column_rules){0};
}

size_t bali_column_rules_find(const bali_column_rules *rules, const char *name, size_t length) {
    size_t i = bali_names_find(&rules->named, name, length);
    return i == BALI_NO_NAME ? BAL_NONE : rules->variables[i];
}

const char *bali_column_rules_column(const bali_column_rules *rules, size_t variable) {
    return rules->columns ? rules->columns[variable] : NULL;
}

size_t bali_cuts_outcome(const double *cuts, size_t n, double number) {
    size_t low = 0, high = n;
    while (low < high) {
        size_t middle = low + (high - low) / 2;
        if (cuts[middle] <= number) low = middle + 1;
        else high = middle;
    }
    return low;
}
