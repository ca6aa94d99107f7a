#include "model/domain.h"

#include "base/memory.h"
#include "base/text.h"

#include <stdatomic.h>
#include <string.h>

/* names.names is the table of the variables' names in order; labels[v] that of their outcomes. Both borrow from the
 * copies that stand in text. */
struct bal_domain {
    atomic_size_t holds;
    size_t n;
    bali_names names;
    bali_names *labels;
    char **copies;
    size_t n_copies;
};

static bal_status check_text(const char *what, const char *text, bal_error *err) {
    size_t length = text ? strlen(text) : 0;
    if (length == 0) return bal_error_set(err, BAL_ERR_DATA, "empty-name", "%s has no name; give it one", what);
    if (length > BAL_MAX_NAME_BYTES)
        return bal_error_set(err, BAL_ERR_DATA, "long-name", "%s \"%.40s...\" has %zu bytes; use at most %zu", what, text, length,
                             BAL_MAX_NAME_BYTES);
    for (size_t i = 0; i < length;) {
        uint32_t character;
        size_t size = bali_utf8_next(text + i, length - i, &character);
        if (size == 0) return bal_error_set(err, BAL_ERR_DATA, "bad-utf8", "%s is not UTF-8; save it as UTF-8", what);
        if (bali_is_control(character))
            return bal_error_set(err, BAL_ERR_DATA, "control-character",
                                 "%s \"%s\" holds the control character U+%04X; remove it", what, text, (unsigned)character);
        i += size;
    }
    return BAL_OK;
}

/* Copies a text into the domain and puts it into an index; *first says where it stood already. */
static bal_status keep(bal_domain *domain, bali_names *names, const char *text, size_t *first, bal_error *err) {
    char *copy = bali_duplicate(text, strlen(text));
    if (!copy) return bali_out_of_memory(err);
    domain->copies[domain->n_copies++] = copy;
    return bali_names_add(names, copy, first) ? BAL_OK : bali_out_of_memory(err);
}

static bal_status add_outcomes(bal_domain *domain, size_t v, const bal_variable_spec *spec, bal_error *err) {
    if (spec->n_outcomes == 0)
        return bal_error_set(err, BAL_ERR_DATA, "no-outcomes", "%s has no outcome; give it at least one", spec->name);
    if (spec->n_outcomes > BAL_MAX_OUTCOMES)
        return bal_error_set(err, BAL_ERR_DATA, "too-many-outcomes", "%s has %zu outcomes; at most %zu are possible", spec->name,
                             spec->n_outcomes, BAL_MAX_OUTCOMES);
    for (size_t k = 0; k < spec->n_outcomes; k++) {
        size_t first;
        bal_status status = check_text("an outcome", spec->outcomes[k], err);
        if (status == BAL_OK) status = keep(domain, &domain->labels[v], spec->outcomes[k], &first, err);
        if (status != BAL_OK) return status;
        if (first != BALI_NO_NAME)
            return bal_error_set(err, BAL_ERR_DATA, "duplicate-outcome",
                                 "outcome \"%s\" of %s stands twice, as number %zu and %zu; rename or remove one",
                                 spec->outcomes[k], spec->name, first + 1, k + 1);
    }
    return BAL_OK;
}

static bal_status add_variable(bal_domain *domain, size_t v, const bal_variable_spec *spec, bal_error *err) {
    size_t first;
    bal_status status = check_text("a variable", spec->name, err);
    if (status == BAL_OK) status = keep(domain, &domain->names, spec->name, &first, err);
    if (status != BAL_OK) return status;
    if (first != BALI_NO_NAME)
        return bal_error_set(err, BAL_ERR_DATA, "duplicate-variable",
                             "variable %s stands twice, as number %zu and %zu; rename or remove one", spec->name, first + 1, v + 1);
    return add_outcomes(domain, v, spec, err);
}

/* How many texts a domain of these variables keeps; outcomes beyond the limit are refused before they are kept. */
static size_t count_texts(const bal_variable_spec *variables, size_t n) {
    size_t texts = n;
    for (size_t v = 0; v < n; v++)
        if (variables[v].n_outcomes <= BAL_MAX_OUTCOMES) texts += variables[v].n_outcomes;
    return texts;
}

bal_status bal_domain_create(const bal_variable_spec *variables, size_t n, bal_domain **out, bal_error *err) {
    *out = NULL;
    if (n == 0) return bal_error_set(err, BAL_ERR_DATA, "no-variables", "there is no variable; declare at least one");
    bal_status status = BAL_OK;
    bal_domain *domain = bali_allocate(1, sizeof *domain);
    if (!domain) return bali_out_of_memory(err);
    atomic_init(&domain->holds, 1);
    domain->n = n;
    domain->labels = bali_allocate(n, sizeof *domain->labels);
    domain->copies = bali_allocate(count_texts(variables, n), sizeof *domain->copies);
    if (!domain->labels || !domain->copies) status = bali_out_of_memory(err);
    for (size_t v = 0; v < n && status == BAL_OK; v++) {
        status = add_variable(domain, v, &variables[v], err);
        if (status != BAL_OK && variables[v].name) bal_error_context(err, 0, variables[v].name);
    }
    if (status == BAL_OK) {
        *out = domain;
    } else {
        bal_domain_free(domain);
    }
    return status;
}

void bal_domain_free(bal_domain *domain) {
    if (!domain || atomic_fetch_sub(&domain->holds, 1) > 1) return;
    for (size_t v = 0; domain->labels && v < domain->n; v++) bali_names_free(&domain->labels[v]);
    for (size_t i = 0; i < domain->n_copies; i++) bali_free(domain->copies[i]);
    bali_names_free(&domain->names);
    bali_free(domain->labels);
    bali_free(domain->copies);
    bali_free(domain);
}

bal_domain *bali_domain_hold(const bal_domain *domain) {
    bal_domain *held = (bal_domain *)domain; /* only the count of holders changes */
    atomic_fetch_add(&held->holds, 1);
    return held;
}

size_t bal_domain_variables(const bal_domain *domain) {
    return domain->n;
}

const char *bal_domain_name(const bal_domain *domain, size_t variable) {
    return domain->names.names[variable];
}

size_t bal_domain_outcomes(const bal_domain *domain, size_t variable) {
    return domain->labels[variable].n_names;
}

const char *bal_domain_outcome(const bal_domain *domain, size_t variable, size_t outcome) {
    return domain->labels[variable].names[outcome];
}

const char *const *bali_domain_names(const bal_domain *domain) {
    return domain->names.names;
}

const char *const *bali_domain_labels(const bal_domain *domain, size_t variable) {
    return domain->labels[variable].names;
}

size_t bali_domain_find(const bal_domain *domain, const char *text, size_t length) {
    return bali_names_find(&domain->names, text, length);
}

size_t bali_domain_find_outcome(const bal_domain *domain, size_t variable, const char *text, size_t length) {
    return bali_names_find(&domain->labels[variable], text, length);
}

size_t bal_domain_find(const bal_domain *domain, const char *name) {
    return bali_domain_find(domain, name, strlen(name));
}

size_t bal_domain_find_outcome(const bal_domain *domain, size_t variable, const char *label) {
    return bali_domain_find_outcome(domain, variable, label, strlen(label));
}

static bool same_texts(const bali_names *a, const bali_names *b) {
    if (a->n_names != b->n_names) return false;
    for (size_t i = 0; i < a->n_names; i++)
        if (strcmp(a->names[i], b->names[i]) != 0) return false;
    return true;
}

bool bali_domain_equal(const bal_domain *a, const bal_domain *b) {
    if (a == b) return true;
    if (!same_texts(&a->names, &b->names)) return false;
    for (size_t v = 0; v < a->n; v++)
        if (!same_texts(&a->labels[v], &b->labels[v])) return false;
    return true;
}
