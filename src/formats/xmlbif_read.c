/* The elements of XMLBIF into a draft. What may stand where is one table; an element that the format does not know is
 * passed over with a warning, one that it knows has to be in its place. */
#include "formats/xmlbif.h"

#include "base/memory.h"
#include "base/names.h"
#include "base/text.h"

#include <string.h>
#include <strings.h>

/* Those up to DEFINITION hold elements, the others text. */
typedef enum element {
    FILE_ITSELF, BIF, NETWORK, VARIABLE, DEFINITION, NAME, OUTCOME, FOR, GIVEN, TABLE, PROPERTY, N_ELEMENTS
} element;

static const char *const element_names[N_ELEMENTS] = {
    "", "BIF", "NETWORK", "VARIABLE", "DEFINITION", "NAME", "OUTCOME", "FOR", "GIVEN", "TABLE", "PROPERTY",
};

static const struct {
    element inside, may_be;
} grammar[] = {
    {FILE_ITSELF, BIF},
    {BIF, NETWORK},
    {NETWORK, NAME},   {NETWORK, PROPERTY}, {NETWORK, VARIABLE},  {NETWORK, DEFINITION},
    {VARIABLE, NAME},  {VARIABLE, OUTCOME}, {VARIABLE, PROPERTY},
    {DEFINITION, FOR}, {DEFINITION, GIVEN}, {DEFINITION, TABLE},  {DEFINITION, PROPERTY},
};

/* Text outside TABLE and PROPERTY; a property's name; names that are told of as unknown. */
enum { LONGEST_TEXT = 1 << 20, LOOKED_FOR_EQUALS = 256, MOST_UNKNOWN = 10, DEEPEST = 5 };

typedef enum property_kind { UNDECIDED, PLAIN, NUMBERS } property_kind;

typedef struct reader {
    bali_draft *draft;
    bali_remarks *remarks;
    size_t max_cells;
    element path[DEEPEST]; /* the open elements; path[depth] is the innermost */
    size_t at[DEEPEST];    /* where each begins */
    size_t depth;
    size_t ignored;    /* open elements inside one that is passed over, itself included */
    size_t network_at; /* of NETWORK; 0 = not yet: the root comes first */
    size_t text_bytes; /* since the last tag */
    bali_text text;    /* of the innermost element, unless it is a list of numbers */
    size_t blanks;     /* at the beginning of a property's text */
    property_kind property;
    bali_number_reader numbers;
    char *unknown[MOST_UNKNOWN];
    size_t n_unknown;
} reader;

static element innermost(const reader *r) {
    return r->path[r->depth];
}

static bali_draft_variable *variable(const reader *r) {
    return &r->draft->variables[r->draft->n_variables - 1];
}

static bali_draft_definition *definition(const reader *r) {
    return &r->draft->definitions[r->draft->n_definitions - 1];
}

/* Whose statement is being read, for messages; NULL when that is not known yet. */
static const char *subject(const reader *r) {
    for (size_t d = 1; d <= r->depth; d++) {
        if (r->path[d] == VARIABLE) return variable(r)->name.text;
        if (r->path[d] == DEFINITION) return definition(r)->child.text;
    }
    return NULL;
}

static bool holds_text(element e) {
    return e >= NAME;
}

/* ---- tags ---- */

static element known_element(const char *name) {
    for (element e = BIF; e < N_ELEMENTS; e++)
        if (strcmp(name, element_names[e]) == 0) return e;
    return FILE_ITSELF;
}

static bool is_allowed(element inside, element e) {
    for (size_t i = 0; i < sizeof grammar / sizeof grammar[0]; i++)
        if (grammar[i].inside == inside && grammar[i].may_be == e) return true;
    return false;
}

static bal_status refuse_root(const reader *r, const char *name, size_t at, bal_error *err) {
    (void)bal_error_set(err, BAL_ERR_SYNTAX, "wrong-root", "the root element is <%.40s>; expected <BIF>, of XMLBIF %s",
                        name, BALI_XMLBIF_VERSION);
    bali_xml_place(r->draft->xml, at, err);
    return BAL_ERR_SYNTAX;
}

static bool attribute_is(const reader *r, const char *name, const char *value) {
    size_t length;
    const char *found = bali_xml_attribute(r->draft->xml, name, &length);
    return found && length == strlen(value) && memcmp(found, value, length) == 0;
}

static bal_status check_version(const reader *r, size_t at, bal_error *err) {
    size_t length;
    const char *version = bali_xml_attribute(r->draft->xml, "VERSION", &length);
    if (!version) {
        bali_remark(r->remarks, at, "no-version", NULL, "the root element has no VERSION; read as version %s",
                    BALI_XMLBIF_VERSION);
        return BAL_OK;
    }
    if (attribute_is(r, "VERSION", BALI_XMLBIF_VERSION)) return BAL_OK;
    return bali_draft_fail(r->draft, at, NULL, "format-version", err,
                           "version \"%.*s\" of the format is not read; use %s", (int)(length < 40 ? length : 40),
                           version, BALI_XMLBIF_VERSION);
}

static bal_status check_type(const reader *r, size_t at, bal_error *err) {
    size_t length;
    const char *type = bali_xml_attribute(r->draft->xml, "TYPE", &length);
    if (!type || attribute_is(r, "TYPE", "nature")) return BAL_OK;
    return bali_draft_fail(
        r->draft, at, NULL, "variable-type", err,
        "a variable of TYPE \"%.*s\"; only nature is possible, so remove the variable or change its type",
        (int)(length < 40 ? length : 40), type);
}

static void check_attributes(const reader *r, element e, size_t at) {
    const char *expected = e == BIF ? "VERSION" : e == VARIABLE ? "TYPE" : "", *name;
    for (size_t i = 0; (name = bali_xml_attribute_name(r->draft->xml, i)); i++)
        if (strcmp(name, expected) != 0)
            bali_remark(r->remarks, at, "unknown-attribute", NULL, "attribute %.40s of <%s> is not known, and not used",
                        name, element_names[e]);
}

static bal_status begin_list(reader *r, bali_draft_list which, bali_number_kind kind, size_t at, bal_error *err) {
    bali_number_list *list = &definition(r)->lists[which];
    const char *name = bali_draft_list_name(which), *child = definition(r)->child.text;
    if (list->given)
        return bali_draft_fail(r->draft, at, child, which == BALI_LIST_TABLE ? "duplicate-table" : "duplicate-property",
                               err, "a second %s in one definition; the first is on line %zu: remove one", name,
                               bali_xml_line(r->draft->xml, list->at));
    list->given = true;
    list->is_named = which != BALI_LIST_TABLE;
    list->at = at;
    r->numbers = (bali_number_reader){.xml = r->draft->xml, .list = list, .kind = kind, .limit = r->max_cells};
    return BAL_OK;
}

static bal_status begin(reader *r, element e, size_t at, bal_error *err) {
    bali_text_clear(&r->text);
    r->blanks = 0;
    r->property = UNDECIDED;
    switch (e) {
    case BIF: return check_version(r, at, err);
    case NETWORK:
        if (r->network_at > 0)
            return bali_draft_fail(r->draft, at, NULL, "second-network", err,
                                   "a second NETWORK; the first is on line %zu: keep one of them",
                                   bali_xml_line(r->draft->xml, r->network_at));
        r->network_at = at;
        return BAL_OK;
    case VARIABLE: return bali_draft_add_variable(r->draft, at) ? check_type(r, at, err) : bali_out_of_memory(err);
    case DEFINITION: return bali_draft_add_definition(r->draft, at) ? BAL_OK : bali_out_of_memory(err);
    case TABLE: return begin_list(r, BALI_LIST_TABLE, BALI_PROBABILITIES, at, err);
    default: return BAL_OK;
    }
}

/* An element that the format does not know. One that differs only in case, or that holds tables under another name, is
 * not passed over: what it says would be lost. */
static bal_status meet_unknown(reader *r, const char *name, size_t at, bal_error *err) {
    for (element e = BIF; e < N_ELEMENTS; e++)
        if (strcasecmp(name, element_names[e]) == 0)
            return bali_draft_fail(r->draft, at, subject(r), "misplaced-element", err, "<%.40s> is written <%s>", name,
                                   element_names[e]);
    if (innermost(r) == NETWORK && strcasecmp(name, "PROBABILITY") == 0)
        return bali_draft_fail(r->draft, at, NULL, "misplaced-element", err,
                               "<%.40s> is not of this format; write <DEFINITION>", name);
    r->ignored = 1;
    for (size_t i = 0; i < r->n_unknown; i++)
        if (strcmp(r->unknown[i], name) == 0) return BAL_OK;
    bali_remark(r->remarks, at, "unknown-element", subject(r),
                "element <%.40s> is not of this format and is passed over; it will not be "
                "written",
                name);
    if (r->n_unknown == MOST_UNKNOWN) return BAL_OK;
    r->unknown[r->n_unknown] = bali_duplicate(name, strlen(name));
    return r->unknown[r->n_unknown++] ? BAL_OK : bali_out_of_memory(err);
}

static bal_status start(void *context, const char *name, size_t at, bal_error *err) {
    reader *r = context;
    element inside = innermost(r), e = known_element(name);
    r->text_bytes = 0;
    if (r->ignored > 0) {
        r->ignored++;
        return BAL_OK;
    }
    if (inside == FILE_ITSELF && e != BIF) return refuse_root(r, name, at, err);
    if (holds_text(inside))
        return bali_draft_fail(r->draft, at, subject(r), "misplaced-element", err,
                               "element <%.40s> inside <%s>, which holds text only; "
                               "remove it",
                               name, element_names[inside]);
    if (e == FILE_ITSELF) return meet_unknown(r, name, at, err);
    if (!is_allowed(inside, e))
        return bali_draft_fail(r->draft, at, subject(r), "misplaced-element", err,
                               "<%s> cannot stand in <%s>; move it to its place", element_names[e],
                               element_names[inside]);
    check_attributes(r, e, at);
    r->depth++;
    r->path[r->depth] = e;
    r->at[r->depth] = at;
    return begin(r, e, at, err);
}

/* ---- text ---- */

static bool is_blank(char c) {
    return c == ' ' || c == '\n' || c == '\t' || c == '\r';
}

/* The text without blanks around it; ended by a NUL where it was. */
static const char *trimmed(const bali_text *text, size_t *length) {
    const char *from = bali_text_string(text), *to = from + text->length;
    while (from < to && is_blank(*from)) from++;
    while (to > from && is_blank(to[-1])) to--;
    *length = (size_t)(to - from);
    return from;
}

/* Whether a property of a definition is one of Ballast's lists of numbers shows once its = is there. A text may come
 * byte by byte, so only a little of it is looked at each time. */
static bal_status decide_property(reader *r, bal_error *err) {
    static const bali_number_kind kinds[BALI_N_LISTS] = {BALI_PROBABILITIES, BALI_COUNTS, BALI_COUNTS, BALI_STRENGTHS};
    while (r->blanks < r->text.length && is_blank(r->text.bytes[r->blanks])) r->blanks++;
    const char *from = r->text.bytes + r->blanks, *end = r->text.bytes + r->text.length;
    size_t length = (size_t)(end - from), looked_at = length < LOOKED_FOR_EQUALS ? length : LOOKED_FOR_EQUALS;
    const char *equals = memchr(from, '=', looked_at);
    if (!equals) {
        if (length >= LOOKED_FOR_EQUALS) r->property = PLAIN;
        return BAL_OK;
    }
    size_t name_length = (size_t)(equals - from);
    while (name_length > 0 && is_blank(from[name_length - 1])) name_length--;
    r->property = PLAIN;
    for (bali_draft_list l = BALI_LIST_COUNTS; l < BALI_N_LISTS; l++) {
        const char *name = bali_draft_list_name(l);
        if (name_length != strlen(name) || memcmp(from, name, name_length) != 0) continue;
        r->property = NUMBERS;
        bal_status status = begin_list(r, l, kinds[l], r->at[r->depth], err);
        if (status == BAL_OK) status = bali_number_feed(&r->numbers, equals + 1, (size_t)(end - equals) - 1, err);
        bali_text_clear(&r->text);
        return status;
    }
    return BAL_OK;
}

static bal_status refuse_stray(const reader *r, bal_error *err) {
    size_t at = r->at[r->depth];
    return bali_draft_fail(r->draft, at, subject(r), "misplaced-text", err,
                           "text directly inside <%s>, which holds elements only; remove it",
                           element_names[innermost(r)]);
}

static bal_status text(void *context, const char *bytes, size_t length, bal_error *err) {
    reader *r = context;
    element e = innermost(r);
    bool is_list = e == TABLE || (e == PROPERTY && r->property == NUMBERS);
    r->text_bytes += length;
    if (r->text_bytes > LONGEST_TEXT && (r->ignored > 0 || (e != TABLE && e != PROPERTY)))
        return bali_draft_fail(r->draft, r->at[r->depth], subject(r), "xml-limit", err,
                               "a text of more than %d bytes that is neither TABLE nor PROPERTY; shorten it",
                               LONGEST_TEXT);
    if (r->ignored > 0) return BAL_OK;
    bal_status status = BAL_OK;
    if (is_list) {
        status = bali_number_feed(&r->numbers, bytes, length, err);
    } else if (!holds_text(e)) {
        for (size_t i = 0; i < length; i++)
            if (!is_blank(bytes[i])) return refuse_stray(r, err);
    } else {
        bali_text_add(&r->text, bytes, length);
        if (r->text.failed) return bali_out_of_memory(err);
        if (e == PROPERTY && r->property == UNDECIDED && r->path[r->depth - 1] == DEFINITION)
            status = decide_property(r, err);
    }
    if (status != BAL_OK && subject(r)) bal_error_context(err, 0, subject(r));
    return status;
}

/* ---- ends ---- */

/* The text read as a name; taken by *out. */
static bal_status take_name(reader *r, bali_draft_text *out, bal_error *err) {
    size_t length;
    const char *name = trimmed(&r->text, &length);
    bool may_be_empty = r->path[r->depth - 1] == NETWORK;
    size_t at = r->at[r->depth];
    bal_status status = BAL_OK;
    if (length > 0 || !may_be_empty)
        status = bali_draft_check_name(r->draft, element_names[innermost(r)], name, length, at, subject(r), err);
    if (status != BAL_OK) return status;
    *out = (bali_draft_text){bali_duplicate(name, length), at};
    return out->text ? BAL_OK : bali_out_of_memory(err);
}

static bal_status take_only_name(reader *r, bali_draft_text *out, bal_error *err) {
    if (out->text)
        return bali_draft_fail(r->draft, r->at[r->depth], out->text, "duplicate-name", err,
                               "a second %s in one %s; the first is on line %zu: remove one",
                               element_names[innermost(r)], element_names[r->path[r->depth - 1]],
                               bali_xml_line(r->draft->xml, out->at));
    return take_name(r, out, err);
}

static bal_status take_another_name(reader *r, bool (*add_take)(bali_draft *draft, bali_draft_text text),
                                    bal_error *err) {
    bali_draft_text name = {0};
    bal_status status = take_name(r, &name, err);
    return status != BAL_OK || add_take(r->draft, name) ? status : bali_out_of_memory(err);
}

/* A list of numbers whose = is missing would otherwise be kept as a text that nobody reads. */
static bal_status check_plain(const reader *r, bal_error *err) {
    if (r->path[r->depth - 1] != DEFINITION) return BAL_OK;
    const char *text = bali_text_string(&r->text) + r->blanks;
    for (bali_draft_list l = BALI_LIST_COUNTS; l < BALI_N_LISTS; l++) {
        const char *name = bali_draft_list_name(l);
        size_t length = strlen(name);
        if (strncmp(text, name, length) == 0 && (text[length] == '\0' || is_blank(text[length])))
            return bali_draft_fail(r->draft, r->at[r->depth], subject(r), "bad-property", err,
                                   "a property %s without a =; write \"%s = ...\"", name, name);
    }
    return BAL_OK;
}

/* A name that begins like Ballast's own and is none of them would have no effect in silence. */
static void remark_unknown(reader *r, const char *text, size_t at) {
    static const char *const known[] = {"ballast.counts", "ballast.pseudo-counts", "ballast.row-ess", "ballast.cuts", "ballast.column",
                                        "ballast.records", "ballast.ess", "ballast.prior", "ballast.made-by", "ballast.inputs", "ballast.parts"};
    enum { N_KNOWN = sizeof known / sizeof known[0] };
    size_t length = strcspn(text, " \t\r\n=");
    if (strncmp(text, "ballast.", 8) != 0 || length > BAL_MAX_NAME_BYTES) return;
    for (size_t i = 0; i < N_KNOWN; i++)
        if (strlen(known[i]) == length && memcmp(known[i], text, length) == 0) return;
    size_t near = bali_nearest(text, length, known, N_KNOWN);
    bali_remark(r->remarks, at, "unknown-property", subject(r), "%.*s is no property of Ballast's and has no effect%s%s%s", (int)length, text,
                near == BALI_NO_NAME ? "" : "; did you mean ", near == BALI_NO_NAME ? "" : known[near], near == BALI_NO_NAME ? "" : "?");
}

static bal_status take_property(reader *r, bal_error *err) {
    if (r->property == NUMBERS) return bali_number_finish(&r->numbers, err);
    bali_draft *draft = r->draft;
    bal_status status = check_plain(r, err);
    if (status != BAL_OK) return status;
    if (!bali_grow((void **)&draft->properties, &draft->property_capacity, draft->n_properties + 1,
                   sizeof *draft->properties))
        return bali_out_of_memory(err);
    bali_draft_property *p = &draft->properties[draft->n_properties];
    switch (r->path[r->depth - 1]) {
    case VARIABLE: *p = (bali_draft_property){.of = BAL_OF_VARIABLE, .owner = draft->n_variables - 1}; break;
    case DEFINITION: *p = (bali_draft_property){.of = BAL_OF_DEFINITION, .owner = draft->n_definitions - 1}; break;
    default: *p = (bali_draft_property){.of = BAL_OF_NETWORK}; break;
    }
    p->at = r->at[r->depth];
    p->length = r->text.length;
    p->text = bali_duplicate(bali_text_string(&r->text), p->length);
    if (!p->text) return bali_out_of_memory(err);
    size_t length;
    remark_unknown(r, trimmed(&r->text, &length), p->at);
    draft->n_properties++;
    return BAL_OK;
}

static bal_status finish(reader *r, bal_error *err) {
    switch (innermost(r)) {
    case NAME: return take_only_name(r, r->path[r->depth - 1] == NETWORK ? &r->draft->name : &variable(r)->name, err);
    case OUTCOME: return take_another_name(r, bali_draft_add_outcome_take, err);
    case FOR: return take_only_name(r, &definition(r)->child, err);
    case GIVEN: return take_another_name(r, bali_draft_add_parent_take, err);
    case TABLE: return bali_number_finish(&r->numbers, err);
    case PROPERTY: return take_property(r, err);
    default: return BAL_OK;
    }
}

static bal_status end(void *context, bal_error *err) {
    reader *r = context;
    r->text_bytes = 0;
    if (r->ignored > 0) {
        r->ignored--;
        return BAL_OK;
    }
    bal_status status = finish(r, err);
    if (status != BAL_OK) return status;
    r->depth--;
    return BAL_OK;
}

/* ---- the whole ---- */

/* TYPE of VARIABLE has the default value nature in the format's own document type, and is read so. */
static void remark(void *context, size_t at, const char *code, const char *message) {
    reader *r = context;
    static const char usual[] = "the default value \"nature\" of attribute TYPE of VARIABLE ";
    if (strcmp(code, "default-attribute") == 0 && strncmp(message, usual, strlen(usual)) == 0) return;
    bali_remark(r->remarks, at, code, NULL, "%s", message);
}

bal_status bali_xmlbif_read(bali_draft *draft, size_t max_cells, bali_remarks *remarks, bal_error *err) {
    reader r = {.draft = draft, .remarks = remarks, .max_cells = max_cells};
    bali_xml_listener listener = {
        .context = &r, .expected = "BIF", .start = start, .text = text, .end = end, .remark = remark};
    bal_status status = bali_xml_parse(draft->xml, &listener, err);
    if (status == BAL_OK && r.network_at == 0)
        status = bali_draft_fail(draft, 0, NULL, "no-network", err, "there is no NETWORK in the BIF element; add it");
    for (size_t i = 0; i < r.n_unknown; i++) bali_free(r.unknown[i]);
    bali_text_free(&r.text);
    return status;
}
