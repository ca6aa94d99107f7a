#include "formats/xml_guard.h"

#include "base/memory.h"
#include "formats/xml_decode.h"

#include <stdarg.h>
#include <stdio.h>
#include <string.h>
#include <strings.h>

/* How much of a name is shown in a message. */
enum { SHOWN = 40 };

bool bali_xml_is_blank(char c) {
    return c == ' ' || c == '\n' || c == '\t';
}

bal_status bali_xml_guard_fail(const bali_xml_guard *guard, size_t at, const char *code, bal_error *err,
                               const char *format, ...) {
    char message[sizeof err->message];
    va_list arguments;
    va_start(arguments, format);
    if (vsnprintf(message, sizeof message, format, arguments) < 0) message[0] = '\0';
    va_end(arguments);
    bal_status status = bal_error_set(err, BAL_ERR_SYNTAX, code, "%s", message);
    size_t line, column;
    bali_xml_position(guard->text, at, &line, &column);
    bal_error_place(err, NULL, line, column);
    return status;
}

static size_t line_of(const bali_xml_guard *guard, size_t at) {
    size_t line, column;
    bali_xml_position(guard->text, at, &line, &column);
    return line;
}

static int shown(size_t bytes) {
    return bytes < SHOWN ? (int)bytes : SHOWN;
}

/* The file ends too early: says where, inside what, and which element is open. */
static bal_status fail_truncated(const bali_xml_guard *guard, size_t begin, const char *what, bal_error *err) {
    if (guard->depth == 0)
        return bali_xml_guard_fail(guard, guard->length, "truncated-xml", err,
                                   "the file ends inside %s that begins on line %zu; get a complete copy of it", what,
                                   line_of(guard, begin));
    const bali_xml_open_tag *tag = &guard->open[guard->depth - 1];
    return bali_xml_guard_fail(
        guard, guard->length, "truncated-xml", err,
        "the file ends inside %s, and <%.*s> of line %zu is still open; get a complete copy of it", what,
        shown(tag->name_bytes), guard->text + tag->at + 1, line_of(guard, tag->at));
}

static bal_status fail_limit(const bali_xml_guard *guard, size_t begin, const char *what, bal_error *err) {
    return bali_xml_guard_fail(guard, begin, "xml-limit", err, "%s longer than %zu bytes; shorten it", what,
                               BALI_XML_MAX_TAG_BYTES);
}

bal_status bali_xml_guard_find(const bali_xml_guard *guard, size_t begin, size_t from, const char *text,
                               const char *what, size_t *behind, bal_error *err) {
    size_t size = strlen(text),
           end = guard->length - begin > BALI_XML_MAX_TAG_BYTES ? begin + BALI_XML_MAX_TAG_BYTES : guard->length;
    for (size_t i = from; i + size <= end; i++) {
        const char *first = memchr(guard->text + i, text[0], end - size + 1 - i);
        if (!first) break;
        i = (size_t)(first - guard->text);
        if (memcmp(first, text, size) != 0) continue;
        *behind = i + size;
        return BAL_OK;
    }
    return end == guard->length ? fail_truncated(guard, begin, what, err) : fail_limit(guard, begin, what, err);
}

void bali_xml_guard_blank(bali_xml_guard *guard, size_t from, size_t to) {
    for (size_t i = from; i < to; i++)
        if (guard->text[i] != '\n') guard->text[i] = ' ';
}

static bal_status comment(bali_xml_guard *guard, bal_error *err) {
    return bali_xml_guard_find(guard, guard->at, guard->at + 4, "-->", "a comment", &guard->at, err);
}

/* Nothing in an instruction is wanted, and the parser would act on some (a catalogue's). Outside the root it is blanked
 * out, since the parser has to see whatever stands there; elsewhere it is left out. */
static bal_status instruction(bali_xml_guard *guard, bal_error *err) {
    size_t begin = guard->at, end = begin;
    bal_status status = bali_xml_guard_find(guard, begin, begin + 2, "?>", "a processing instruction", &end, err);
    if (status != BAL_OK) return status;
    bool is_declaration = strncasecmp(guard->text + begin + 2, "xml", 3) == 0 &&
                          (bali_xml_is_blank(guard->text[begin + 5]) || guard->text[begin + 5] == '?');
    if (is_declaration && begin > 0)
        return bali_xml_guard_fail(
            guard, begin, "misplaced-xml-declaration", err,
            "the XML declaration has to be the first thing in the file; remove what stands before it");
    if (++guard->instructions > BALI_XML_MAX_INSTRUCTIONS)
        return bali_xml_guard_fail(guard, begin, "xml-limit", err, "more than %zu processing instructions; use fewer",
                                   BALI_XML_MAX_INSTRUCTIONS);
    if (guard->depth > 0) {
        guard->piece = BALI_XML_SILENT;
    } else if (!is_declaration) {
        bali_xml_guard_blank(guard, begin, end);
    }
    guard->at = end;
    return BAL_OK;
}

/* Character data that may be long: a table can be written as one. */
static bal_status cdata(bali_xml_guard *guard, bal_error *err) {
    size_t begin = guard->at;
    if (guard->depth == 0)
        return bali_xml_guard_fail(guard, begin, "misplaced-text", err, "text outside the root element; remove it");
    const char *end = strstr(guard->text + begin + 9, "]]>");
    if (!end) return fail_truncated(guard, begin, "a CDATA section", err);
    guard->at = (size_t)(end - guard->text) + 3;
    guard->piece = BALI_XML_CDATA;
    return BAL_OK;
}

static bal_status text(bali_xml_guard *guard, bal_error *err) {
    const char *end = memchr(guard->text + guard->at, '<', guard->length - guard->at);
    size_t behind = end ? (size_t)(end - guard->text) : guard->length;
    for (size_t i = guard->at; guard->depth == 0 && i < behind; i++) {
        if (bali_xml_is_blank(guard->text[i])) continue;
        if (guard->n_starts > 0)
            return bali_xml_guard_fail(guard, i, "misplaced-text", err,
                                       "text behind the end of the root element, which ends on line %zu; remove it",
                                       line_of(guard, guard->root_end));
        return bali_xml_guard_fail(guard, i, "not-xml", err, "text where <%s> is expected; give the network's XML file",
                                   guard->expected);
    }
    guard->at = behind;
    return BAL_OK;
}

static size_t name_bytes(const bali_xml_guard *guard, size_t from) {
    size_t i = from;
    while (i < guard->length && !bali_xml_is_blank(guard->text[i]) && !strchr("/>=\"'<", guard->text[i])) i++;
    return i - from;
}

/* A name of an element or attribute is short, and one of few. */
static bal_status check_name(bali_xml_guard *guard, size_t at, size_t bytes, bal_error *err) {
    if (bytes > BALI_XML_MAX_NAME_BYTES)
        return bali_xml_guard_fail(guard, at, "xml-limit", err,
                                   "the name of an element or attribute is longer than %zu bytes; shorten it",
                                   BALI_XML_MAX_NAME_BYTES);
    if (bali_names_find(&guard->names, guard->text + at, bytes) != BALI_NO_NAME) return BAL_OK;
    if (guard->names.n_names == BALI_XML_MAX_NAMES)
        return bali_xml_guard_fail(guard, at, "xml-limit", err,
                                   "more than %zu different names of elements and attributes; use fewer",
                                   BALI_XML_MAX_NAMES);
    size_t first;
    char *copy = bali_duplicate(guard->text + at, bytes);
    if (copy && bali_names_add(&guard->names, copy, &first)) return BAL_OK;
    bali_free(copy);
    return bali_out_of_memory(err);
}

/* *i stands on the quote before an attribute's value; afterwards behind the one after it. */
static bal_status value(const bali_xml_guard *guard, size_t *i, bal_error *err) {
    char quote = guard->text[(*i)++];
    for (; *i < guard->length && *i - guard->at < BALI_XML_MAX_TAG_BYTES; ++*i) {
        if (guard->text[*i] == '<')
            return bali_xml_guard_fail(guard, guard->at, "bad-xml", err,
                                       "an attribute's value that meets a < before its end; is a quote missing?");
        if (guard->text[*i] != quote) continue;
        ++*i;
        return BAL_OK;
    }
    return BAL_OK; /* the caller sees where that is */
}

/* A namespace is declared at an offset. An empty one for a prefix is an error that the parser also reports when it had
 * no memory for the name. */
static bal_status check_namespace(bali_xml_guard *guard, size_t at, size_t bytes, bal_error *err) {
    if (++guard->namespaces > BALI_XML_MAX_NAMESPACES)
        return bali_xml_guard_fail(guard, at, "xml-limit", err, "more than %zu namespace declarations; use fewer",
                                   BALI_XML_MAX_NAMESPACES);
    const char *value = guard->text + at + bytes;
    while (bali_xml_is_blank(*value) || *value == '=') value++;
    if (guard->text[at + strlen("xmlns")] == ':' && (strncmp(value, "''", 2) == 0 || strncmp(value, "\"\"", 2) == 0))
        return bali_xml_guard_fail(guard, at, "bad-xml", err, "an empty namespace; write its name into the quotes");
    return BAL_OK;
}

static bal_status attribute_name(bali_xml_guard *guard, size_t *i, bal_error *err) {
    size_t at = *i, bytes = name_bytes(guard, at);
    *i = at + (bytes ? bytes : 1);
    if (bytes == 0) return BAL_OK;
    bal_status status = BAL_OK;
    if (strncmp(guard->text + at, "xmlns", 5) == 0) status = check_namespace(guard, at, bytes, err);
    return status == BAL_OK ? check_name(guard, at, bytes, err) : status;
}

/* Goes over a tag's attributes from an offset to the tag's >; *end is where that stands. */
static bal_status attributes(bali_xml_guard *guard, size_t from, size_t *end, bal_error *err) {
    size_t begin = guard->at, in_tag = 0;
    for (size_t i = from; i < guard->length;) {
        char c = guard->text[i];
        bal_status status = BAL_OK;
        if (i - begin >= BALI_XML_MAX_TAG_BYTES) return fail_limit(guard, begin, "a tag", err);
        if (c == '<')
            return bali_xml_guard_fail(guard, begin, "bad-xml", err,
                                       "a tag that meets another < before its end; is a > missing?");
        if (c == '>') {
            *end = i;
            return BAL_OK;
        }
        if (bali_xml_is_blank(c) || c == '=' || c == '/') {
            i++;
        } else if (c == '"' || c == '\'') {
            guard->attributes++;
            if (++in_tag > BALI_XML_MAX_ATTRIBUTES)
                return bali_xml_guard_fail(guard, begin, "xml-limit", err,
                                           "a tag with more than %zu attributes; use fewer", BALI_XML_MAX_ATTRIBUTES);
            status = value(guard, &i, err);
        } else {
            status = attribute_name(guard, &i, err);
        }
        if (status != BAL_OK) return status;
    }
    return fail_truncated(guard, begin, "a tag", err);
}

static bal_status open_element(bali_xml_guard *guard, size_t bytes, bal_error *err) {
    size_t at = guard->at;
    if (guard->depth == 0 && guard->n_starts > 0)
        return bali_xml_guard_fail(guard, at, "second-root", err,
                                   "a second root element <%.*s>; the first ended on line %zu: keep one of them",
                                   shown(bytes), guard->text + at + 1, line_of(guard, guard->root_end));
    if (guard->depth == BALI_XML_MAX_DEPTH)
        return bali_xml_guard_fail(guard, at, "xml-limit", err, "elements nested more than %zu deep; use fewer levels",
                                   BALI_XML_MAX_DEPTH);
    if (guard->n_starts == BALI_XML_MAX_ELEMENTS)
        return bali_xml_guard_fail(guard, at, "xml-limit", err, "more than %zu elements; use fewer",
                                   BALI_XML_MAX_ELEMENTS);
    if (!bali_grow((void **)&guard->starts, &guard->capacity, guard->n_starts + 1, sizeof *guard->starts))
        return bali_out_of_memory(err);
    guard->starts[guard->n_starts++] = at;
    guard->open[guard->depth++] = (bali_xml_open_tag){at, bytes};
    return BAL_OK;
}

static void close_element(bali_xml_guard *guard, size_t behind) {
    if (--guard->depth == 0) guard->root_end = behind;
}

static bal_status start_tag(bali_xml_guard *guard, bal_error *err) {
    size_t end = 0, bytes = name_bytes(guard, guard->at + 1);
    if (bytes == 0 && guard->at + 1 < guard->length)
        return bali_xml_guard_fail(guard, guard->at, "bad-xml", err, "a < that begins no tag; write it as &lt;");
    bal_status status = bytes > BALI_XML_MAX_TAG_BYTES ? fail_limit(guard, guard->at, "a tag", err)
                                                       : check_name(guard, guard->at + 1, bytes, err);
    if (status == BAL_OK) status = attributes(guard, guard->at + 1 + bytes, &end, err);
    if (status == BAL_OK) status = open_element(guard, bytes, err);
    if (status != BAL_OK) return status;
    if (guard->text[end - 1] == '/') close_element(guard, end + 1);
    guard->at = end + 1;
    return BAL_OK;
}

static bal_status end_tag(bali_xml_guard *guard, bal_error *err) {
    size_t begin = guard->at, behind = begin, bytes = name_bytes(guard, begin + 2);
    bal_status status = bali_xml_guard_find(guard, begin, begin + 2, ">", "a tag", &behind, err);
    if (status != BAL_OK) return status;
    const char *name = guard->text + begin + 2;
    if (guard->depth == 0)
        return bali_xml_guard_fail(guard, begin, "mismatched-tag", err,
                                   "</%.*s> ends an element that never began; remove it", shown(bytes), name);
    const bali_xml_open_tag *tag = &guard->open[guard->depth - 1];
    const char *opened = guard->text + tag->at + 1;
    if (bytes != tag->name_bytes || memcmp(name, opened, bytes) != 0)
        return bali_xml_guard_fail(guard, begin, "mismatched-tag", err,
                                   "</%.*s> does not end <%.*s>, which began on line %zu; write </%.*s> first",
                                   shown(bytes), name, shown(tag->name_bytes), opened, line_of(guard, tag->at),
                                   shown(tag->name_bytes), opened);
    close_element(guard, behind);
    guard->at = behind;
    return BAL_OK;
}

static bool starts_with(const bali_xml_guard *guard, const char *text) {
    return strncmp(guard->text + guard->at, text, strlen(text)) == 0;
}

static bal_status declaration(bali_xml_guard *guard, bal_error *err) {
    static const char *const beginnings[] = {"<!--", "<![CDATA[", "<!DOCTYPE"};
    for (size_t i = 0; i < sizeof beginnings / sizeof beginnings[0]; i++)
        if (guard->length - guard->at < strlen(beginnings[i]) &&
            strncmp(guard->text + guard->at, beginnings[i], guard->length - guard->at) == 0)
            return fail_truncated(guard, guard->at, "markup", err);
    if (starts_with(guard, "<!ENTITY"))
        return bali_xml_guard_fail(guard, guard->at, "entity-declaration", err,
                                   "entity declarations are not accepted; write the text itself in their place");
    return bali_xml_guard_fail(guard, guard->at, "bad-xml", err,
                               "a <! that begins no comment and no CDATA section; remove it");
}

bal_status bali_xml_guard_next(bali_xml_guard *guard, bal_error *err) {
    guard->piece = BALI_XML_MARKUP;
    if (guard->text[guard->at] != '<') return text(guard, err);
    if (starts_with(guard, "<!--")) return comment(guard, err);
    if (starts_with(guard, "<![CDATA[")) return cdata(guard, err);
    if (starts_with(guard, "<!DOCTYPE")) return bali_xml_guard_doctype(guard, err);
    if (starts_with(guard, "<!")) return declaration(guard, err);
    if (starts_with(guard, "<?")) return instruction(guard, err);
    if (starts_with(guard, "</")) return end_tag(guard, err);
    return start_tag(guard, err);
}

bal_status bali_xml_guard_end(const bali_xml_guard *guard, bal_error *err) {
    if (guard->length == 0)
        return bali_xml_guard_fail(guard, 0, "empty-file", err,
                                   "the file is empty; expected a network in the root element <%s>", guard->expected);
    if (guard->depth > 0) return fail_truncated(guard, guard->length, "the text", err);
    if (guard->n_starts == 0)
        return bali_xml_guard_fail(guard, guard->length, "wrong-root", err,
                                   "there is no element; expected the root element <%s>", guard->expected);
    return BAL_OK;
}

void bali_xml_guard_free(bali_xml_guard *guard) {
    for (size_t i = 0; i < guard->names.n_names; i++) bali_free((char *)guard->names.names[i]);
    bali_names_free(&guard->names);
    bali_free(guard->starts);
    guard->starts = NULL;
}
