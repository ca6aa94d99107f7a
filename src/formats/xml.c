/* The only file that sees libxml2, which checks that the file is well formed and resolves references. The guard goes
 * first, and keeps the books: what libxml2 gives is compared with what the guard saw, since a libxml2 that ran out of
 * memory can leave parts out without a word. */
#include "formats/xml.h"

#include "base/memory.h"
#include "base/text.h"
#include "formats/xml_decode.h"
#include "formats/xml_guard.h"

#include <libxml/parser.h>
#include <libxml/parserInternals.h>
#include <string.h>

/* How much is handed to libxml2 at a time: it keeps no more of the text than this. */
enum { PIECE = 1 << 18, LONGEST_REFERENCE = 300 };

struct bali_xml {
    char *file, *text;
    size_t length;
    bali_xml_declaration declaration;
    size_t known_at, known_line; /* a place whose line is known; lines are counted on from there */

    /* While parsing. */
    const bali_xml_listener *listener;
    bali_xml_guard guard;
    xmlParserCtxtPtr parser;
    size_t feeding, fed;             /* what libxml2 is given begins at feeding; it was given fed bytes before that */
    size_t starts, ends, attributes; /* what libxml2 has given */
    const xmlChar **attribute;       /* of the element that starts: name, prefix, URI, value, end */
    size_t n_attributes;
    bali_text value;   /* the attribute's that was asked for last */
    bal_status status; /* of the first failure */
    bal_error *err;
};

bal_status bali_xml_create_take(const char *file, char *bytes, size_t length, bali_xml **out, bal_error *err) {
    *out = NULL;
    bali_xml *xml = bali_allocate(1, sizeof *xml);
    if (!xml) {
        bali_free(bytes);
        return bali_out_of_memory(err);
    }
    xml->text = bytes;
    xml->length = length;
    xml->known_line = 1;
    xml->file = bali_duplicate(file, strlen(file));
    bal_status status = xml->file ? bali_xml_decode(&xml->text, &xml->length, &xml->declaration, err)
                                  : bali_out_of_memory(err);
    if (status != BAL_OK) {
        bal_error_place(err, file, 0, 0);
        bali_xml_free(xml);
        return status;
    }
    *out = xml;
    return BAL_OK;
}

void bali_xml_free(bali_xml *xml) {
    if (!xml) return;
    bali_xml_guard_free(&xml->guard);
    bali_text_free(&xml->value);
    bali_free(xml->text);
    bali_free(xml->file);
    bali_free(xml);
}

void bali_xml_place(bali_xml *xml, size_t at, bal_error *err) {
    size_t line, column;
    bali_xml_position(xml->text, at, &line, &column);
    bal_error_place(err, xml->file, line, column);
}

size_t bali_xml_line(bali_xml *xml, size_t at) {
    if (at < xml->known_at) {
        xml->known_at = 0;
        xml->known_line = 1;
    }
    const char *end = xml->text + at, *next = xml->text + xml->known_at;
    while (next < end && (next = memchr(next, '\n', (size_t)(end - next)))) {
        xml->known_line++;
        next++;
    }
    xml->known_at = at;
    return xml->known_line;
}

/* ---- what libxml2 says ---- */

/* The offset in the text that libxml2 has come to, from how many bytes it has read. */
static size_t parser_offset(const bali_xml *xml) {
    long consumed = xmlByteConsumed(xml->parser);
    size_t read = consumed < 0 ? xml->fed : (size_t)consumed, offset = xml->feeding + read;
    return offset > xml->fed && offset - xml->fed < xml->length ? offset - xml->fed : xml->feeding;
}

static void fail(bali_xml *xml, bal_status status) {
    if (xml->status == BAL_OK) xml->status = status;
}

static void on_start(void *context, const xmlChar *name, const xmlChar *prefix, const xmlChar *uri, int n_namespaces,
                     const xmlChar **namespaces, int n_attributes, int n_defaulted, const xmlChar **attributes) {
    bali_xml *xml = context;
    (void)prefix, (void)uri, (void)namespaces, (void)n_defaulted;
    if (xml->status != BAL_OK) return;
    if (xml->starts >= xml->guard.n_starts) {
        fail(xml, bali_out_of_memory(xml->err));
        return;
    }
    size_t at = xml->guard.starts[xml->starts++];
    xml->attribute = attributes;
    xml->n_attributes = (size_t)n_attributes;
    xml->attributes += (size_t)n_attributes + (size_t)n_namespaces;
    fail(xml, xml->listener->start(xml->listener->context, (const char *)name, at, xml->err));
    xml->n_attributes = 0;
}

static void on_end(void *context, const xmlChar *name, const xmlChar *prefix, const xmlChar *uri) {
    bali_xml *xml = context;
    (void)name, (void)prefix, (void)uri;
    if (xml->status != BAL_OK) return;
    xml->ends++;
    fail(xml, xml->listener->end(xml->listener->context, xml->err));
}

static void on_text(void *context, const xmlChar *bytes, int length) {
    bali_xml *xml = context;
    if (xml->status != BAL_OK || length <= 0) return;
    fail(xml, xml->listener->text(xml->listener->context, (const char *)bytes, (size_t)length, xml->err));
}

/* What libxml2 finds wrong, in our words where that is likely to be met; NULL else. */
static const char *explain(int code, char at_place) {
    if (at_place == '&' && code == XML_ERR_NAME_REQUIRED) code = XML_ERR_ENTITYREF_SEMICOL_MISSING;
    switch (code) {
    case XML_ERR_INVALID_CHAR:
    case XML_ERR_INVALID_CHARREF:
    case XML_ERR_INVALID_DEC_CHARREF:
    case XML_ERR_INVALID_HEX_CHARREF: return "a reference to a character that XML does not allow; remove it";
    case XML_ERR_UNDECLARED_ENTITY:
    case XML_WAR_UNDECLARED_ENTITY: return "an entity that is not one of XML's five; write the character itself";
    case XML_ERR_ENTITYREF_SEMICOL_MISSING: return "an & that begins no reference; write it as &amp;";
    case XML_ERR_ATTRIBUTE_NOT_STARTED: return "an attribute's value without quotes; put it into quotes";
    case XML_ERR_ATTRIBUTE_WITHOUT_VALUE: return "an attribute without a value; add it, or remove the attribute";
    case XML_ERR_ATTRIBUTE_REDEFINED: return "an attribute that stands twice in its tag; remove one";
    case XML_ERR_MISPLACED_CDATA_END: return "]]> in a text; write it as ]]&gt;";
    case XML_ERR_HYPHEN_IN_COMMENT: return "-- inside a comment; write something else";
    case XML_ERR_SPACE_REQUIRED: return "a blank is missing in a tag; add it";
    case XML_ERR_NAME_TOO_LONG: return "a name that is too long; shorten it";
    case XML_NS_ERR_UNDEFINED_NAMESPACE:
        return "a prefix that no xmlns attribute declares; declare it, or remove the prefix";
    default: return NULL;
    }
}

/* libxml2's own sentence, as ours are written: without the capital and the newline. */
static void set_other(bali_xml *xml, const char *sentence) {
    bali_text text = {0};
    size_t length = strcspn(sentence, "\n");
    while (length > 0 && strchr(". ", sentence[length - 1])) length--;
    bali_text_add(&text, sentence, length);
    (void)bal_error_set(xml->err, BAL_ERR_SYNTAX, "bad-xml", "not well-formed XML (%s); correct it",
                        bali_text_string(&text));
    bali_text_free(&text);
}

/* Where what is reported stands. libxml2 has come to the end of a reference, and of a ]]> it knows no more than the
 * text that it is in. */
static size_t place_of(const bali_xml *xml, int code) {
    size_t at = parser_offset(xml), back = at;
    const char *found;
    switch (code) {
    case XML_ERR_MISPLACED_CDATA_END:
        found = strstr(xml->text + at, "]]>");
        return found ? (size_t)(found - xml->text) : at;
    case XML_ERR_INVALID_CHAR:
    case XML_ERR_INVALID_CHARREF:
    case XML_ERR_INVALID_DEC_CHARREF:
    case XML_ERR_INVALID_HEX_CHARREF:
    case XML_ERR_UNDECLARED_ENTITY:
    case XML_WAR_UNDECLARED_ENTITY:
    case XML_ERR_ENTITYREF_SEMICOL_MISSING:
    case XML_ERR_NAME_REQUIRED:
        while (back > 0 && at - back < LONGEST_REFERENCE && !strchr("&<>\n", xml->text[back - 1])) back--;
        return back > 0 && xml->text[back - 1] == '&' ? back - 1 : at;
    default: return at;
    }
}

/* The first report counts: by default libxml2 would keep the last. What is only a warning is told by the guard. */
static void on_report(void *context, xmlErrorPtr report) {
    bali_xml *xml = context;
    if (report->level < XML_ERR_ERROR || xml->status != BAL_OK) return;
    /* A namespace for whose name there is no memory is reported as an empty one; those that are, the guard refuses. */
    bool is_empty_namespace = report->code == XML_NS_ERR_XML_NAMESPACE && report->str1;
    if (report->code == XML_ERR_NO_MEMORY || is_empty_namespace) {
        fail(xml, bali_out_of_memory(xml->err));
        return;
    }
    size_t at = place_of(xml, report->code);
    const char *words = explain(report->code, xml->text[at]);
    if (words) {
        (void)bal_error_set(xml->err, BAL_ERR_SYNTAX, "bad-xml", "%s", words);
    } else {
        set_other(xml, report->message ? report->message : "no reason given");
    }
    bali_xml_place(xml, at, xml->err);
    fail(xml, BAL_ERR_SYNTAX);
}

/* ---- guard and parser in step ---- */

static bal_status check_version(bali_xml *xml) {
    const char *version = xml->declaration.version;
    if (*version == '\0' || strcmp(version, "1.0") == 0) return BAL_OK;
    if (strncmp(version, "1.", 2) == 0) {
        xml->listener->remark(xml->listener->context, 0, "xml-version", "XML of a later version than 1.0, read as 1.0");
        return BAL_OK;
    }
    (void)bal_error_set(xml->err, BAL_ERR_SYNTAX, "xml-version", "XML version \"%s\" is not read; use 1.0", version);
    bali_xml_place(xml, 0, xml->err);
    return BAL_ERR_SYNTAX;
}

/* While libxml2 works, what it has to say outside a parser (that there is no memory) comes here too, instead of being
 * printed. These two belong to the thread, and are put back. */
typedef struct manners {
    xmlStructuredErrorFunc report;
    void *context;
} manners;

static manners take_reports(bali_xml *xml) {
    manners before = {xmlStructuredError, xmlStructuredErrorContext};
    xmlSetStructuredErrorFunc(xml, on_report);
    return before;
}

/* Flags that open files or resolve entities stay off, and so does HUGE: the limits it lifts (10 MB a text or a
 * look-ahead) are on trees and on single pieces of markup. A text that is told in pieces meets none, however long, and
 * markup is kept shorter by the guard. The encoding was dealt with before. */
static bal_status create_parser(bali_xml *xml) {
    xmlSAXHandler handler;
    memset(&handler, 0, sizeof handler);
    handler.initialized = XML_SAX2_MAGIC;
    handler.startElementNs = on_start;
    handler.endElementNs = on_end;
    handler.characters = on_text;
    handler.ignorableWhitespace = on_text;
    handler.cdataBlock = on_text;
    handler.serror = on_report;
    xml->parser = xmlCreatePushParserCtxt(&handler, xml, NULL, 0, NULL);
    if (!xml->parser) return bali_out_of_memory(xml->err);
    (void)xmlCtxtUseOptions(xml->parser,
                            XML_PARSE_NONET | XML_PARSE_NOERROR | XML_PARSE_NOWARNING | XML_PARSE_IGNORE_ENC);
    return BAL_OK;
}

/* A piece of a long text should not end inside a character. */
static size_t piece_length(const char *bytes, size_t length) {
    if (length <= PIECE) return length;
    size_t cut = PIECE;
    while (cut > PIECE - 4 && ((unsigned char)bytes[cut] & 0xC0) == 0x80) cut--;
    return cut;
}

static void feed_bytes(bali_xml *xml, const char *bytes, size_t length) {
    int code = xmlParseChunk(xml->parser, bytes, (int)length, 0);
    /* A failure without a report is one that libxml2 had no memory to report. */
    if (code != XML_ERR_OK && !xmlCtxtGetLastError(xml->parser)) fail(xml, bali_out_of_memory(xml->err));
    xml->fed += length;
}

static void feed(bali_xml *xml, size_t from, size_t to) {
    while (from < to && xml->status == BAL_OK) {
        size_t length = piece_length(xml->text + from, to - from);
        xml->feeding = from;
        feed_bytes(xml, xml->text + from, length);
        from += length;
    }
    xml->feeding = to;
}

/* Has libxml2 tell, or refuse, whatever it holds back until the next markup. */
static void flush(bali_xml *xml) {
    static const char empty[] = "<![CDATA[]]>";
    if (xml->status == BAL_OK && xml->guard.depth > 0) feed_bytes(xml, empty, strlen(empty));
}

/* libxml2 reads a long CDATA section 300 bytes at a call, and keeps the rest. So it gets an empty one instead, and the
 * section's text is told from here. */
static void tell_cdata(bali_xml *xml, size_t from, size_t to) {
    size_t text = from + strlen("<![CDATA["), end = to - strlen("]]>");
    flush(xml);
    while (text < end && xml->status == BAL_OK) {
        size_t piece = piece_length(xml->text + text, end - text);
        fail(xml, xml->listener->text(xml->listener->context, xml->text + text, piece, xml->err));
        text += piece;
    }
}

static void finish(bali_xml *xml) {
    if (xml->status != BAL_OK) return;
    if (xmlParseChunk(xml->parser, NULL, 0, 1) != XML_ERR_OK) fail(xml, bali_out_of_memory(xml->err));
}

/* The guard runs ahead by a piece; what it finds wrong is told only when the parser found nothing wrong before. */
static void parse(bali_xml *xml) {
    bali_xml_guard *guard = &xml->guard;
    bal_error found = {0};
    bal_status status = BAL_OK;
    size_t from = 0; /* where what has not been fed begins */
    while (guard->at < guard->length && status == BAL_OK && xml->status == BAL_OK) {
        size_t piece = guard->at;
        status = bali_xml_guard_next(guard, &found);
        bool is_fed = guard->piece == BALI_XML_MARKUP;
        if (status == BAL_OK && is_fed && guard->at - from < PIECE && guard->at < guard->length) continue;
        feed(xml, from, is_fed ? guard->at : piece);
        if (guard->piece == BALI_XML_CDATA) tell_cdata(xml, piece, guard->at);
        from = guard->at;
    }
    if (status == BAL_OK) status = bali_xml_guard_end(guard, &found);
    if (status == BAL_OK) {
        finish(xml);
    } else {
        flush(xml);
        if (xml->status == BAL_OK) *xml->err = found;
        fail(xml, status);
    }
}

/* Whether libxml2 gave every element and every attribute that the guard saw. */
static bool is_complete(const bali_xml *xml) {
    const bali_xml_guard *guard = &xml->guard;
    return xml->parser->wellFormed && xml->starts == guard->n_starts && xml->ends == guard->n_starts &&
           xml->attributes == guard->attributes;
}

bal_status bali_xml_parse(bali_xml *xml, const bali_xml_listener *listener, bal_error *err) {
    bal_error ignored = {0};
    xml->err = err ? err : &ignored;
    xml->listener = listener;
    xml->guard = (bali_xml_guard){.text = xml->text,
                                  .length = xml->length,
                                  .expected = listener->expected,
                                  .remark = listener->remark,
                                  .context = listener->context};
    xml->status = check_version(xml);
    xmlInitParser();
    manners before = take_reports(xml);
    if (xml->status == BAL_OK) xml->status = create_parser(xml);
    if (xml->status == BAL_OK) parse(xml);
    if (xml->status == BAL_OK && !is_complete(xml)) xml->status = bali_out_of_memory(xml->err);
    xmlFreeParserCtxt(xml->parser);
    xmlSetStructuredErrorFunc(before.context, before.report);
    xml->parser = NULL;
    bali_xml_guard_free(&xml->guard);
    if (xml->status != BAL_OK && xml->status != BAL_ERR_MEMORY) bal_error_place(xml->err, xml->file, 0, 0);
    return xml->status;
}

/* ---- attributes and places ---- */

const char *bali_xml_attribute_name(const bali_xml *xml, size_t i) {
    for (size_t a = 0; a < xml->n_attributes; a++) {
        if (xml->attribute[5 * a + 1]) continue; /* it has a prefix */
        if (i-- == 0) return (const char *)xml->attribute[5 * a];
    }
    return NULL;
}

/* libxml2 leaves one reference in values: every & in them stands as &#38;. */
static void resolve(bali_text *value, const char *bytes, const char *end) {
    static const char reference[] = "&#38;";
    bali_text_clear(value);
    for (const char *next; bytes < end && (next = memchr(bytes, '&', (size_t)(end - bytes))); bytes = next) {
        bali_text_add(value, bytes, (size_t)(next - bytes) + 1);
        next += strncmp(next, reference, strlen(reference)) == 0 ? strlen(reference) : 1;
    }
    bali_text_add(value, bytes, (size_t)(end - bytes));
}

const char *bali_xml_attribute(bali_xml *xml, const char *name, size_t *length) {
    for (size_t a = 0; a < xml->n_attributes; a++) {
        const xmlChar **attribute = xml->attribute + 5 * a;
        if (attribute[1] || strcmp((const char *)attribute[0], name) != 0) continue;
        resolve(&xml->value, (const char *)attribute[3], (const char *)attribute[4]);
        if (xml->value.failed) fail(xml, bali_out_of_memory(xml->err));
        *length = xml->value.length;
        return bali_text_string(&xml->value);
    }
    return NULL;
}

bali_xml_retrace bali_xml_retrace_start(const bali_xml *xml, size_t at) {
    char quote = '\0', last = '\0';
    for (; xml->text[at] != '\0' && (quote || xml->text[at] != '>'); at++) {
        last = xml->text[at];
        if (quote ? last == quote : last == '"' || last == '\'') quote = quote ? '\0' : last;
    }
    return (bali_xml_retrace){.text = last == '/' ? "" : xml->text, .at = last == '/' ? 0 : at + 1};
}
