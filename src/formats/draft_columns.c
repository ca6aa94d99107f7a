/* What the properties of variables say of the columns of tables, checked where they stand. */
#include "base/memory.h"
#include "formats/column_rules.h"
#include "formats/draft.h"
#include "model/document.h"

#include <string.h>

static const char *const names[] = {BALI_COLUMN_PROPERTY, BALI_CUTS_PROPERTY};

enum { N_NAMES = sizeof names / sizeof names[0] };

/* Whether a property is one of those, and which; N_NAMES when not. */
static size_t which_name(const bali_draft_property *p) {
    size_t i = 0;
    if (p->of != BAL_OF_VARIABLE) return N_NAMES;
    while (i < N_NAMES && !bali_property_value(p->text, names[i])) i++;
    return i;
}

static bal_status check_once(const bali_draft *draft, bal_error *err) {
    size_t *first = bali_allocate(draft->n_variables, N_NAMES * sizeof *first); /* number + 1 of the property */
    if (!first) return bali_out_of_memory(err);
    bal_status status = BAL_OK;
    for (size_t i = 0; i < draft->n_properties && status == BAL_OK; i++) {
        const bali_draft_property *p = &draft->properties[i];
        size_t name = which_name(p);
        if (name == N_NAMES) continue;
        size_t *known = &first[p->owner * N_NAMES + name];
        if (*known)
            status = bali_draft_fail(draft, p->at, draft->variables[p->owner].name.text, "duplicate-property", err,
                                     "a second %s of one variable; the first is on line %zu: remove one", names[name],
                                     bali_xml_line(draft->xml, draft->properties[*known - 1].at));
        *known = i + 1;
    }
    bali_free(first);
    return status;
}

/* Where the property stands that an error is about. */
static void place(const bali_draft *draft, bal_error *found) {
    const char *name = strcmp(found->code, "bad-cuts") == 0 ? BALI_CUTS_PROPERTY : BALI_COLUMN_PROPERTY;
    for (size_t i = 0; i < draft->n_properties; i++) {
        const bali_draft_property *p = &draft->properties[i];
        if (p->of != BAL_OF_VARIABLE || !bali_property_value(p->text, name)) continue;
        if (strcmp(draft->variables[p->owner].name.text, found->variable) == 0) {
            bali_xml_place(draft->xml, p->at, found);
            return;
        }
    }
}

bal_status bali_draft_check_columns(const bali_draft *draft, const bal_document *document, bal_error *err) {
    bali_column_rules rules = {0};
    bal_error found = {0};
    bal_status status = check_once(draft, err);
    if (status != BAL_OK) return status;
    status = bali_column_rules_read(&rules, bal_network_domain(bal_document_network(document)), document, &found);
    bali_column_rules_free(&rules);
    if (status == BAL_OK) return BAL_OK;
    if (status == BAL_ERR_DATA) place(draft, &found);
    if (err && err->status == BAL_OK) *err = found;
    return status;
}
