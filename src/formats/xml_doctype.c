/* The document type declaration. Nothing of it is wanted: no entity, no default value, no other file. Its declarations
 * are looked through for what would have changed the document, and blanked out before the parser can see them. */
#include "formats/xml_guard.h"

#include <stdio.h>
#include <string.h>

/* Where an attribute-list declaration stands: ATTLIST element (name type default)*. */
typedef enum expected { ELEMENT, NAME, TYPE, DEFAULT } expected;

typedef struct word {
    size_t at, bytes;
} word;

static const char what[] = "the document type declaration";

static size_t skip_blanks(const bali_xml_guard *guard, size_t i) {
    while (bali_xml_is_blank(guard->text[i])) i++;
    return i;
}

static size_t skip_word(const bali_xml_guard *guard, size_t i) {
    while (guard->text[i] != '\0' && !bali_xml_is_blank(guard->text[i]) && !strchr("<>[]()\"'", guard->text[i])) i++;
    return i;
}

static bool begins(const bali_xml_guard *guard, size_t i, const char *text) {
    return strncmp(guard->text + i, text, strlen(text)) == 0;
}

/* *i stands on a quote; afterwards behind its partner. */
static bal_status skip_literal(const bali_xml_guard *guard, size_t begin, size_t *i, bal_error *err) {
    char quote[2] = {guard->text[*i], '\0'};
    return bali_xml_guard_find(guard, begin, *i + 1, quote, what, i, err);
}

static bal_status refuse_reference(const bali_xml_guard *guard, size_t at, bal_error *err) {
    return bali_xml_guard_fail(
        guard, at, "entity-declaration", err,
        "parameter references are not accepted; write the declarations themselves in their place");
}

static int shown(size_t bytes) {
    return bytes < 40 ? (int)bytes : 40;
}

/* The value is what stands between two offsets. */
static void remark_default(bali_xml_guard *guard, word element, word attribute, size_t from, size_t to) {
    char message[256];
    (void)snprintf(message, sizeof message,
                   "the default value \"%.*s\" of attribute %.*s of %.*s in the document type is not applied; write it "
                   "in each tag",
                   shown(to - from), guard->text + from, shown(attribute.bytes), guard->text + attribute.at,
                   shown(element.bytes), guard->text + element.at);
    guard->remark(guard->context, attribute.at, "default-attribute", message);
}

/* Looks through <!ATTLIST ...> from behind its keyword, for default values: a value in quotes is one, behind #FIXED
 * too. *i is then at its >. */
static bal_status attribute_list(bali_xml_guard *guard, size_t begin, size_t *i, bal_error *err) {
    expected next = ELEMENT;
    word element = {0}, attribute = {0};
    for (;;) {
        *i = skip_blanks(guard, *i);
        size_t from = *i;
        char c = guard->text[from];
        if (c == '>') return BAL_OK;
        if (from == guard->length) return bali_xml_guard_find(guard, begin, from, ">", what, i, err);
        if (c == '%') return refuse_reference(guard, from, err);
        if (c == '"' || c == '\'') {
            bal_status status = skip_literal(guard, begin, i, err);
            if (status != BAL_OK) return status;
            remark_default(guard, element, attribute, from + 1, *i - 1);
            next = NAME;
        } else if (c == '(') {
            bal_status status = bali_xml_guard_find(guard, begin, from, ")", what, i, err);
            if (status != BAL_OK) return status;
            next = DEFAULT;
        } else {
            *i = skip_word(guard, from);
            word here = {from, *i - from};
            if (here.bytes == 0)
                return bali_xml_guard_fail(guard, from, "bad-xml", err,
                                           "an attribute list that is not well formed; correct it");
            if (next == ELEMENT) element = here;
            if (next == NAME) attribute = here;
            next = next == DEFAULT ? NAME : next + 1;
        }
    }
}

/* Looks through any other declaration to its >. */
static bal_status other_declaration(const bali_xml_guard *guard, size_t begin, size_t *i, bal_error *err) {
    while (guard->text[*i] != '>') {
        char c = guard->text[*i];
        if (c == '%') return refuse_reference(guard, *i, err);
        if (c == '<')
            return bali_xml_guard_fail(guard, *i, "bad-xml", err,
                                       "a declaration that meets another < before its end; is a > missing?");
        if (c == '"' || c == '\'') {
            bal_status status = skip_literal(guard, begin, i, err);
            if (status != BAL_OK) return status;
        } else if (*i == guard->length) {
            return bali_xml_guard_find(guard, begin, *i, ">", what, i, err);
        } else {
            ++*i;
        }
    }
    return BAL_OK;
}

/* One piece of the internal subset, which begins at begin; *i is afterwards behind the piece. */
static bal_status subset_piece(bali_xml_guard *guard, size_t begin, size_t *i, bal_error *err) {
    size_t from = *i;
    if (begins(guard, from, "<!--")) return bali_xml_guard_find(guard, begin, from + 4, "-->", what, i, err);
    if (begins(guard, from, "<?")) return bali_xml_guard_find(guard, begin, from + 2, "?>", what, i, err);
    if (guard->text[from] == '%') return refuse_reference(guard, from, err);
    if (begins(guard, from, "<!ENTITY"))
        return bali_xml_guard_fail(guard, from, "entity-declaration", err,
                                   "entity declarations are not accepted; write the text itself in their place");
    if (begins(guard, from, "<!NOTATION"))
        return bali_xml_guard_fail(guard, from, "entity-declaration", err,
                                   "notation declarations are not accepted; remove this one");
    bal_status status;
    if (begins(guard, from, "<!ATTLIST")) {
        *i += strlen("<!ATTLIST");
        status = attribute_list(guard, begin, i, err);
    } else if (begins(guard, from, "<!ELEMENT")) {
        *i += strlen("<!ELEMENT");
        status = other_declaration(guard, begin, i, err);
    } else if (from == guard->length) {
        return bali_xml_guard_find(guard, begin, from, "]", what, i, err);
    } else {
        return bali_xml_guard_fail(guard, from, "bad-xml", err,
                                   "neither an element nor an attribute list is declared here; remove or correct it");
    }
    if (status == BAL_OK) ++*i; /* the > */
    return status;
}

/* *i stands behind the [ of the internal subset, and afterwards on its ]. */
static bal_status internal_subset(bali_xml_guard *guard, size_t *i, bal_error *err) {
    size_t begin = *i;
    for (;;) {
        *i = skip_blanks(guard, *i);
        if (*i - begin > BALI_XML_MAX_TAG_BYTES)
            return bali_xml_guard_fail(guard, begin, "xml-limit", err,
                                       "the declarations in the document type are longer than %zu bytes; shorten them",
                                       BALI_XML_MAX_TAG_BYTES);
        if (guard->text[*i] == ']') return BAL_OK;
        bal_status status = subset_piece(guard, begin, i, err);
        if (status != BAL_OK) return status;
    }
}

/* The name of another file that the declaration may give: said, never opened. *i is then behind it. */
static bal_status external_identifier(bali_xml_guard *guard, size_t begin, size_t *i, bal_error *err) {
    if (!begins(guard, *i, "SYSTEM") && !begins(guard, *i, "PUBLIC")) return BAL_OK;
    size_t at = *i, literals = guard->text[*i] == 'S' ? 1 : 2;
    bal_status status = BAL_OK;
    *i += strlen("SYSTEM");
    for (; literals > 0 && status == BAL_OK; literals--) {
        *i = skip_blanks(guard, *i);
        if (guard->text[*i] != '"' && guard->text[*i] != '\'')
            return bali_xml_guard_fail(guard, *i, "bad-xml", err,
                                       "a quoted name is expected in the document type declaration; add it");
        status = skip_literal(guard, begin, i, err);
    }
    if (status == BAL_OK)
        guard->remark(guard->context, at, "external-dtd",
                      "the document type names another file, which is not opened; nothing it "
                      "declares is applied");
    *i = skip_blanks(guard, *i);
    return status;
}

bal_status bali_xml_guard_doctype(bali_xml_guard *guard, bal_error *err) {
    size_t begin = guard->at;
    if (guard->has_doctype || guard->n_starts > 0)
        return bali_xml_guard_fail(
            guard, begin, "bad-xml", err,
            "a document type declaration may stand once, before the root element; remove this one");
    size_t name_end = skip_word(guard, skip_blanks(guard, begin + strlen("<!DOCTYPE")));
    size_t i = skip_blanks(guard, name_end);
    bal_status status = external_identifier(guard, begin, &i, err);
    if (status != BAL_OK) return status;
    if (guard->text[i] == '[') {
        i++;
        status = internal_subset(guard, &i, err);
        if (status != BAL_OK) return status;
        i = skip_blanks(guard, i + 1);
    }
    if (i == guard->length) return bali_xml_guard_find(guard, i, i, ">", what, &i, err);
    if (guard->text[i] != '>')
        return bali_xml_guard_fail(guard, i, "bad-xml", err,
                                   "a document type declaration that is not well formed; correct it");
    bali_xml_guard_blank(guard, name_end, i);
    guard->has_doctype = true;
    guard->at = i + 1;
    return BAL_OK;
}
