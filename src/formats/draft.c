/* From names to indices: variables, outcomes, parents. */
#include "formats/draft.h"

#include "base/memory.h"
#include "base/names.h"
#include "base/text.h"
#include "model/document.h"

#include <stdarg.h>
#include <stdio.h>
#include <string.h>

bali_draft_variable *bali_draft_add_variable(bali_draft *draft, size_t at) {
    if (!bali_grow((void **)&draft->variables, &draft->variable_capacity, draft->n_variables + 1,
                   sizeof *draft->variables))
        return NULL;
    bali_draft_variable *variable = &draft->variables[draft->n_variables++];
    *variable = (bali_draft_variable){.at = at, .first_outcome = draft->outcomes.n};
    return variable;
}

bali_draft_definition *bali_draft_add_definition(bali_draft *draft, size_t at) {
    if (!bali_grow((void **)&draft->definitions, &draft->definition_capacity, draft->n_definitions + 1,
                   sizeof *draft->definitions))
        return NULL;
    bali_draft_definition *definition = &draft->definitions[draft->n_definitions++];
    *definition = (bali_draft_definition){.at = at, .first_parent = draft->parents.n};
    return definition;
}

static bool add_take(bali_draft_texts *texts, bali_draft_text text, size_t *n) {
    if (!bali_grow((void **)&texts->texts, &texts->capacity, texts->n + 1, sizeof *texts->texts)) {
        bali_free(text.text);
        return false;
    }
    texts->texts[texts->n++] = text;
    ++*n;
    return true;
}

bool bali_draft_add_outcome_take(bali_draft *draft, bali_draft_text outcome) {
    return add_take(&draft->outcomes, outcome, &draft->variables[draft->n_variables - 1].n_outcomes);
}

bool bali_draft_add_parent_take(bali_draft *draft, bali_draft_text parent) {
    return add_take(&draft->parents, parent, &draft->definitions[draft->n_definitions - 1].n_parents);
}

static void free_texts(bali_draft_texts *texts) {
    for (size_t i = 0; i < texts->n; i++) bali_free(texts->texts[i].text);
    bali_free(texts->texts);
}

void bali_draft_free(bali_draft *draft) {
    for (size_t v = 0; v < draft->n_variables; v++) bali_free(draft->variables[v].name.text);
    for (size_t d = 0; d < draft->n_definitions; d++) {
        bali_free(draft->definitions[d].child.text);
        for (size_t l = 0; l < BALI_N_LISTS; l++) bali_number_list_free(&draft->definitions[d].lists[l]);
    }
    for (size_t p = 0; p < draft->n_properties; p++) bali_free(draft->properties[p].text);
    free_texts(&draft->outcomes);
    free_texts(&draft->parents);
    bali_free(draft->name.text);
    bali_free(draft->variables);
    bali_free(draft->definitions);
    bali_free(draft->properties);
    *draft = (bali_draft){0};
}

bal_status bali_draft_fail(const bali_draft *draft, size_t at, const char *variable, const char *code, bal_error *err,
                           const char *format, ...) {
    char message[sizeof err->message];
    va_list arguments;
    va_start(arguments, format);
    if (vsnprintf(message, sizeof message, format, arguments) < 0) message[0] = '\0';
    va_end(arguments);
    bal_status status = bal_error_set(err, BAL_ERR_DATA, code, "%s", message);
    bali_xml_place(draft->xml, at, err);
    bal_error_context(err, 0, variable);
    return status;
}

bal_status bali_draft_check_name(const bali_draft *draft, const char *what, const char *name, size_t length, size_t at,
                                 const char *variable, bal_error *err) {
    if (length == 0)
        return bali_draft_fail(draft, at, variable, "empty-name", err, "an empty %s; write the name into it", what);
    if (length > BAL_MAX_NAME_BYTES)
        return bali_draft_fail(draft, at, variable, "long-name", err, "%s \"%.40s...\" has %zu bytes; use at most %zu",
                               what, name, length, BAL_MAX_NAME_BYTES);
    for (size_t i = 0; i < length;) {
        uint32_t character = 0;
        size_t size = bali_utf8_next(name + i, length - i, &character);
        if (size == 0 || bali_is_control(character))
            return bali_draft_fail(draft, at, variable, "control-character", err,
                                   "%s \"%.*s\" holds the control character U+%04X; remove it", what, (int)length, name,
                                   (unsigned)character);
        i += size;
    }
    return BAL_OK;
}

/* What is built step by step; everything is freed at the end but the document. */
typedef struct resolution {
    const bali_draft *draft;
    bali_names variables;
    bal_domain *domain;
    bal_network *network;
    bal_document *document;
    bal_family_spec *families;                   /* one a variable; parents are owned */
    const bali_draft_definition **definition_of; /* one a variable, or NULL */
    size_t *child_of;                            /* one a definition */
} resolution;

static size_t line(const resolution *r, size_t at) {
    return bali_xml_line(r->draft->xml, at);
}

static bal_status check_outcomes(const resolution *r, const bali_draft_variable *variable, bal_error *err) {
    const char *name = variable->name.text;
    bali_names seen = {0};
    bal_status status = BAL_OK;
    if (variable->n_outcomes == 0)
        return bali_draft_fail(r->draft, variable->at, name, "no-outcomes", err,
                               "%s has no outcome; give it at least one", name);
    const bali_draft_text *outcomes = r->draft->outcomes.texts + variable->first_outcome;
    if (variable->n_outcomes > BAL_MAX_OUTCOMES)
        return bali_draft_fail(r->draft, outcomes[BAL_MAX_OUTCOMES].at, name, "too-many-outcomes", err,
                               "%s has %zu outcomes; at most %zu are possible", name, variable->n_outcomes,
                               BAL_MAX_OUTCOMES);
    for (size_t k = 0; k < variable->n_outcomes && status == BAL_OK; k++) {
        size_t first;
        if (!bali_names_add(&seen, outcomes[k].text, &first)) {
            status = bali_out_of_memory(err);
        } else if (first != BALI_NO_NAME) {
            status = bali_draft_fail(r->draft, outcomes[k].at, name, "duplicate-outcome", err,
                                     "outcome \"%s\" of %s stands twice, first on line %zu; rename or remove one",
                                     outcomes[k].text, name, line(r, outcomes[first].at));
        }
    }
    bali_names_free(&seen);
    return status;
}

static bal_status check_variables(resolution *r, bal_error *err) {
    const bali_draft *draft = r->draft;
    for (size_t v = 0; v < draft->n_variables; v++) {
        const bali_draft_variable *variable = &draft->variables[v];
        const char *name = variable->name.text;
        size_t first;
        if (!name)
            return bali_draft_fail(draft, variable->at, NULL, "empty-name", err,
                                   "a variable without a NAME; give it one");
        if (!bali_names_add(&r->variables, name, &first)) return bali_out_of_memory(err);
        if (first != BALI_NO_NAME)
            return bali_draft_fail(draft, variable->name.at, name, "duplicate-variable", err,
                                   "variable %s stands twice, first on line %zu; rename or remove one", name,
                                   line(r, draft->variables[first].name.at));
        bal_status status = check_outcomes(r, variable, err);
        if (status != BAL_OK) return status;
    }
    return BAL_OK;
}

static bal_status create_domain(resolution *r, bal_error *err) {
    const bali_draft *draft = r->draft;
    bal_variable_spec *specs = bali_allocate(draft->n_variables, sizeof *specs);
    const char **labels = bali_allocate(draft->outcomes.n, sizeof *labels);
    bal_status status = specs && labels ? BAL_OK : bali_out_of_memory(err);
    for (size_t k = 0; k < draft->outcomes.n && status == BAL_OK; k++) labels[k] = draft->outcomes.texts[k].text;
    for (size_t v = 0; v < draft->n_variables && status == BAL_OK; v++) {
        const bali_draft_variable *variable = &draft->variables[v];
        specs[v] = (bal_variable_spec){variable->name.text, labels + variable->first_outcome, variable->n_outcomes};
    }
    if (status == BAL_OK) status = bal_domain_create(specs, draft->n_variables, &r->domain, err);
    bali_free(specs);
    bali_free(labels);
    return status;
}

/* The variable that a FOR or a GIVEN names. */
static bal_status find(const resolution *r, const bali_draft_text *name, const char *what, const char *code,
                       size_t *variable, bal_error *err) {
    *variable = bali_names_find(&r->variables, name->text, strlen(name->text));
    if (*variable != BALI_NO_NAME) return BAL_OK;
    size_t nearest = bali_nearest(name->text, strlen(name->text), r->variables.names, r->variables.n_names);
    if (nearest == BALI_NO_NAME)
        return bali_draft_fail(r->draft, name->at, name->text, code, err,
                               "%s \"%s\" is not a variable of this file; declare it as one", what, name->text);
    return bali_draft_fail(r->draft, name->at, name->text, code, err,
                           "%s \"%s\" is not a variable of this file; did you mean \"%s\"?", what, name->text,
                           r->variables.names[nearest]);
}

static bal_status resolve_parents(resolution *r, const bali_draft_definition *definition, size_t child,
                                  bal_error *err) {
    const bali_draft *draft = r->draft;
    if (definition->n_parents == 0) return BAL_OK;
    size_t *parents = bali_allocate(definition->n_parents, sizeof *parents);
    if (!parents) return bali_out_of_memory(err);
    r->families[child] = (bal_family_spec){parents, definition->n_parents};
    const char *name = definition->child.text;
    const bali_draft_text *texts = draft->parents.texts + definition->first_parent;
    bali_names seen = {0};
    bal_status status = BAL_OK;
    for (size_t p = 0; p < definition->n_parents && status == BAL_OK; p++) {
        const bali_draft_text *parent = &texts[p];
        size_t first;
        status = find(r, parent, "parent", "unknown-parent", &parents[p], err);
        if (status != BAL_OK) break;
        if (!bali_names_add(&seen, parent->text, &first)) {
            status = bali_out_of_memory(err);
        } else if (first != BALI_NO_NAME) {
            status = bali_draft_fail(draft, parent->at, name, "duplicate-parent", err,
                                     "parent %s of %s stands twice, first on line %zu; remove one", parent->text, name,
                                     line(r, texts[first].at));
        } else if (parents[p] == child) {
            status = bali_draft_fail(draft, parent->at, name, "cycle", err,
                                     "the arcs run in a circle: %s -> %s; a variable cannot be its own parent", name,
                                     name);
        }
    }
    bali_names_free(&seen);
    return status;
}

static bal_status resolve_definitions(resolution *r, bal_error *err) {
    const bali_draft *draft = r->draft;
    r->families = bali_allocate(draft->n_variables, sizeof *r->families);
    r->definition_of = bali_allocate(draft->n_variables, sizeof *r->definition_of);
    r->child_of = bali_allocate(draft->n_definitions, sizeof *r->child_of);
    if (!r->families || !r->definition_of || !r->child_of) return bali_out_of_memory(err);
    for (size_t d = 0; d < draft->n_definitions; d++) {
        const bali_draft_definition *definition = &draft->definitions[d];
        const bali_draft_text *name = &definition->child;
        if (!name->text)
            return bali_draft_fail(draft, definition->at, NULL, "no-definition-for", err,
                                   "a DEFINITION without FOR; say which variable it is of");
        size_t child;
        bal_status status = find(r, name, "FOR", "unknown-variable", &child, err);
        if (status != BAL_OK) return status;
        if (r->definition_of[child])
            return bali_draft_fail(draft, definition->at, name->text, "duplicate-definition", err,
                                   "%s has two definitions, the first on line %zu; remove one", name->text,
                                   line(r, r->definition_of[child]->at));
        r->definition_of[child] = definition;
        r->child_of[d] = child;
        status = resolve_parents(r, definition, child, err);
        if (status != BAL_OK) return status;
    }
    return BAL_OK;
}

/* The network's own checks name a variable; its definition is the place. */
static bal_status create_network(resolution *r, size_t max_cells, bal_error *err) {
    bal_error found = {0};
    bal_status status = bal_network_create(r->domain, r->families, max_cells, &r->network, &found);
    if (status == BAL_OK) return BAL_OK;
    size_t v = bali_names_find(&r->variables, found.variable, strlen(found.variable));
    if (v != BALI_NO_NAME) {
        const bali_draft_definition *definition = r->definition_of[v];
        bali_xml_place(r->draft->xml, definition ? definition->at : r->draft->variables[v].at, &found);
    }
    if (err && err->status == BAL_OK) *err = found;
    return status;
}

static bal_status add_properties(const resolution *r, bal_error *err) {
    bal_status status = BAL_OK;
    for (size_t i = 0; i < r->draft->n_properties && status == BAL_OK; i++) {
        const bali_draft_property *p = &r->draft->properties[i];
        size_t variable = p->of == BAL_OF_NETWORK    ? BAL_NONE
                          : p->of == BAL_OF_VARIABLE ? p->owner
                                                     : r->child_of[p->owner];
        status = bali_document_add_property(r->document, p->of, variable, p->text, p->length, err);
    }
    return status;
}

static void free_resolution(resolution *r) {
    for (size_t v = 0; r->families && v < r->draft->n_variables; v++) bali_free((size_t *)r->families[v].parents);
    bali_free(r->families);
    bali_free(r->definition_of);
    bali_free(r->child_of);
    bali_names_free(&r->variables);
    bal_document_free(r->document);
    bal_network_free(r->network);
    bal_domain_free(r->domain);
}

bal_status bali_draft_resolve(const bali_draft *draft, const bal_network_options *options, bali_remarks *remarks,
                              bal_document **out, bal_error *err) {
    *out = NULL;
    resolution r = {.draft = draft};
    bal_status status = BAL_OK;
    if (draft->n_variables == 0)
        status = bali_draft_fail(draft, 0, NULL, "no-variables", err, "there is no VARIABLE; declare at least one");
    if (status == BAL_OK) status = check_variables(&r, err);
    if (status == BAL_OK) status = create_domain(&r, err);
    if (status == BAL_OK) status = resolve_definitions(&r, err);
    if (status == BAL_OK) status = create_network(&r, options->max_cells, err);
    if (status == BAL_OK) status = bal_document_create(r.network, draft->name.text, &r.document, err);
    if (status == BAL_OK)
        status = bali_draft_fill(draft, r.definition_of, options->for_slowest, remarks, r.document, err);
    if (status == BAL_OK) status = add_properties(&r, err);
    if (status == BAL_OK) status = bali_draft_check_columns(draft, r.document, err);
    if (status == BAL_OK) {
        *out = r.document;
        r.document = NULL;
    }
    free_resolution(&r);
    return status;
}
