/* The XML guard, the decoder, and the elements with their places. What is well formed is decided by Extensible Markup Language
 * (XML) 1.0, fifth edition (2008); the cases name its sections. */
#include "formats/xml.h"
#include "formats/xml_decode.h"
#include "formats/xml_guard.h"

#include "base/memory.h"
#include "base/text.h"
#include "support/harness.h"

#include <libxml/parser.h>
#include <libxml/xmlmemory.h>
#include <string.h>

/* What a listener heard, as text: "(BIF 1:1" for a start, its attributes, "[text]", ")" for an end, "!code 1:1" for a remark. */
typedef struct hearing {
    bali_xml *xml;
    bali_text heard;
    bool in_text, deaf; /* deaf: hears nothing, for texts that are too long for it */
    size_t stop_after; /* starts; 0 = never */
} hearing;

static void close_text(hearing *h) {
    if (h->in_text) bali_text_putc(&h->heard, ']');
    h->in_text = false;
}

static void put_place(hearing *h, size_t at) {
    bal_error place = {0};
    bali_xml_place(h->xml, at, &place);
    ck_assert_uint_eq(place.line, bali_xml_line(h->xml, at));
    bali_text_printf(&h->heard, " %zu:%zu", place.line, place.column);
}

static bal_status on_start(void *context, const char *name, size_t at, bal_error *err) {
    hearing *h = context;
    if (h->deaf) return BAL_OK;
    close_text(h);
    bali_text_printf(&h->heard, "(%s", name);
    put_place(h, at);
    const char *attribute;
    for (size_t i = 0; (attribute = bali_xml_attribute_name(h->xml, i)); i++) {
        size_t length;
        const char *value = bali_xml_attribute(h->xml, attribute, &length);
        bali_text_printf(&h->heard, " %s=", attribute);
        bali_text_add(&h->heard, value, length);
    }
    if (h->stop_after > 0 && --h->stop_after == 0) return bal_error_set(err, BAL_ERR_DATA, "stop", "enough");
    return h->heard.failed ? bali_out_of_memory(err) : BAL_OK;
}

static bal_status on_text(void *context, const char *bytes, size_t length, bal_error *err) {
    hearing *h = context;
    if (h->deaf) return BAL_OK;
    if (!h->in_text) bali_text_putc(&h->heard, '[');
    h->in_text = true;
    bali_text_add(&h->heard, bytes, length);
    return h->heard.failed ? bali_out_of_memory(err) : BAL_OK;
}

static bal_status on_end(void *context, bal_error *err) {
    hearing *h = context;
    if (h->deaf) return BAL_OK;
    close_text(h);
    bali_text_putc(&h->heard, ')');
    return h->heard.failed ? bali_out_of_memory(err) : BAL_OK;
}

static void on_remark(void *context, size_t at, const char *code, const char *message) {
    hearing *h = context;
    ck_assert_uint_gt(strlen(message), 0);
    bali_text_printf(&h->heard, "!%s", code);
    put_place(h, at);
    bali_text_putc(&h->heard, ' ');
}

static bal_status hear_as(hearing h, const char *bytes, size_t length, bali_text *heard, bal_error *err) {
    char *copy = bali_duplicate(bytes, length);
    if (!copy) return bali_out_of_memory(err);
    bal_status status = bali_xml_create_take("model.xml", copy, length, &h.xml, err);
    if (status == BAL_OK) {
        bali_xml_listener listener = {.context = &h, .expected = "BIF", .start = on_start, .text = on_text, .end = on_end, .remark = on_remark};
        status = bali_xml_parse(h.xml, &listener, err);
    } else {
        ck_assert_ptr_null(h.xml);
    }
    bali_xml_free(h.xml);
    *heard = h.heard;
    return status;
}

static bal_status hear(const char *bytes, size_t length, bali_text *heard, bal_error *err) {
    return hear_as((hearing){0}, bytes, length, heard, err);
}

/* Parses, and fails the test unless it was heard like this. */
static void expect_heard(const char *bytes, size_t length, const char *expected) {
    bali_text heard = {0};
    bal_error err = {0};
    bal_status status = hear(bytes, length, &heard, &err);
    ck_assert_msg(status == BAL_OK, "%s", err.message);
    ck_assert_str_eq(bali_text_string(&heard), expected);
    bali_text_free(&heard);
}

/* Parses, and fails the test unless it is refused at a place, with words. */
static void expect_refused(const char *bytes, size_t length, size_t line, size_t column, const char *code, const char *words) {
    bali_text heard = {0};
    bal_error err = {0};
    bal_status status = hear(bytes, length, &heard, &err);
    ck_assert_msg(status == BAL_ERR_SYNTAX, "status %d for a text that should say \"%s\"", (int)status, words);
    ck_assert_msg(strstr(err.message, words) != NULL, "\"%s\" lacks \"%s\"", err.message, words);
    ck_assert_msg(err.line == line && err.column == column, "%zu:%zu instead of %zu:%zu: %s", err.line, err.column, line, column,
                  err.message);
    ck_assert_str_eq(err.code, code);
    ck_assert_str_eq(err.file, "model.xml");
    bali_text_free(&heard);
}

/* Repeats a text. */
static bali_text repeated(const char *text, size_t times) {
    bali_text all = {0};
    for (size_t i = 0; i < times; i++) bali_text_puts(&all, text);
    ck_assert(!all.failed);
    return all;
}

static void expect_limit(const bali_text *text, const char *words) {
    bali_text heard = {0};
    bal_error err = {0};
    bal_status status = hear_as((hearing){.deaf = true}, text->bytes, text->length, &heard, &err);
    if (words) {
        ck_assert_msg(status == BAL_ERR_SYNTAX && strcmp(err.code, "xml-limit") == 0, "%d %s", (int)status, err.message);
        ck_assert_msg(strstr(err.message, words) != NULL, "\"%s\" lacks \"%s\"", err.message, words);
        ck_assert_uint_gt(err.line, 0);
    } else {
        ck_assert_msg(status == BAL_OK, "%s", err.message);
    }
    bali_text_free(&heard);
}

#define LITERAL(text) (text), sizeof(text) - 1

START_TEST(events_come_in_order_with_their_places) {
    static const struct {
        const char *bytes, *heard;
    } cases[] = {
        {"<BIF/>", "(BIF 1:1)"},
        {"<BIF></BIF>", "(BIF 1:1)"},
        {"<?xml version=\"1.0\"?>\n<BIF>\n <A x='1' y=\"a&amp;b\">t</A>\n</BIF>\n", "(BIF 2:1[\n ](A 3:2 x=1 y=a&b[t])[\n])"},
        {"<BIF>a<!-- no -->b<?no?>c<![CDATA[<d>]]>e&lt;&#102;&#x67;</BIF>", "(BIF 1:1[abc<d>e<fg])"},
        {"<BIF><![CDATA[]]>a<![CDATA[b]]><![CDATA[c]]></BIF>", "(BIF 1:1[abc])"},
        {"<BIF>\xC3\xA9<A/></BIF>", "(BIF 1:1[\xC3\xA9](A 1:7))"},
        /* 2.11: each of these ends a line, and is heard as a newline */
        {"<BIF>\r\n<A/>\r<A/>\n<A/>\r\r\n<A/></BIF>", "(BIF 1:1[\n](A 2:1)[\n](A 3:1)[\n](A 4:1)[\n\n](A 6:1))"},
        {"<BIF\n a='1'\r\n><A\r/></BIF>", "(BIF 1:1 a=1(A 3:2))"},
        {"\xEF\xBB\xBF<BIF/>", "(BIF 1:1)"},
        {"\xEF\xBB\xBF<?xml version='1.0' encoding='ISO-8859-1'?><BIF>\xC3\xA9</BIF>", "(BIF 1:44[\xC3\xA9])"},
        {"<!-- a --><?b c?>\n<BIF/><!-- d --><?e?>\n", "(BIF 2:1)"},
        {"<p:BIF xmlns:p='u' p:x='1' y='2'/>", "(BIF 1:1 y=2)"},
        {"<BIF xmlns='' xmlns:p='u'/>", "(BIF 1:1)"},
        {"<BIF a='&amp;#38;&#38;&lt;&#60;&amp;'/>", "(BIF 1:1 a=&#38;&<<&)"},
        {"<BIF a=' > ' b='/>'/>", "(BIF 1:1 a= >  b=/>)"},
        {"<?xml version='1.1'?><BIF/>", "!xml-version 1:1 (BIF 1:22)"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++)
        expect_heard(cases[i].bytes, strlen(cases[i].bytes), cases[i].heard);
}
END_TEST

START_TEST(document_types_are_looked_through_and_left_out) {
    static const struct {
        const char *bytes, *heard;
    } cases[] = {
        {"<!DOCTYPE BIF><BIF/>", "(BIF 1:15)"},
        {"<!DOCTYPE BIF [\n <!ELEMENT BIF (A)*>\n <!ATTLIST BIF x CDATA #REQUIRED y (a|b) #IMPLIED>\n <!-- ] > --><?q ]?> ]>\n<BIF/>",
         "(BIF 5:1)"},
        {"<!DOCTYPE BIF [<!ATTLIST BIF x CDATA 'dflt' y NOTATION (a) #FIXED \"b\" z ID #IMPLIED>]><BIF/>",
         "!default-attribute 1:30 !default-attribute 1:45 (BIF 1:87)"},
        {"<!DOCTYPE BIF SYSTEM 'file:///etc/hostname'><BIF/>", "!external-dtd 1:15 (BIF 1:45)"},
        {"<!DOCTYPE BIF PUBLIC \"a\" \"http://localhost:9/x.dtd\" [] ><BIF/>", "!external-dtd 1:15 (BIF 1:57)"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) expect_heard(cases[i].bytes, strlen(cases[i].bytes), cases[i].heard);
}
END_TEST

START_TEST(what_is_not_well_formed_is_refused_at_its_place) {
    static const struct {
        const char *bytes;
        size_t line, column;
        const char *code, *words;
    } cases[] = {
        {"", 1, 1, "empty-file", "expected a network in the root element <BIF>"},
        {"  \n", 2, 1, "wrong-root", "there is no element"},
        {"age,sex\n1,2\n", 1, 1, "not-xml", "text where <BIF> is expected"},
        {"\n x<BIF/>", 2, 2, "not-xml", "text where <BIF> is expected"},
        {"<BIF/>\n x", 2, 2, "misplaced-text", "behind the end of the root element, which ends on line 1"},
        {"<BIF/>\n<BIF/>", 2, 1, "second-root", "the first ended on line 1"},
        {"<BIF/><![CDATA[a]]>", 1, 7, "misplaced-text", "outside the root"},
        {"<BIF>\n<A>\n</BIF>", 3, 1, "mismatched-tag", "</BIF> does not end <A>, which began on line 2"},
        {"<BIF></BIF></A>", 1, 12, "mismatched-tag", "never began"},
        {"<BIF>\n<A x='1", 2, 8, "truncated-xml", "inside a tag, and <BIF> of line 1"},
        {"<BIF>\n<A>te\nxt", 3, 3, "truncated-xml", "<A> of line 2 is still open"},
        {"<BIF><!-- a", 1, 12, "truncated-xml", "inside a comment"},
        {"<BIF><![CDATA[ a", 1, 17, "truncated-xml", "inside a CDATA section"},
        {"<BIF><?a b", 1, 11, "truncated-xml", "inside a processing instruction"},
        {"<BIF><![CDA", 1, 12, "truncated-xml", "inside markup"},
        {"<BI", 1, 4, "truncated-xml", "inside a tag"},
        {"<!DOCTYPE BIF [ <!ELEMENT ", 1, 27, "truncated-xml", "inside the document type declaration"},
        {"<!DOCTYPE BIF", 1, 14, "truncated-xml", "inside the document type declaration"},
        {"<!DOCTYPE BIF [ <!ATTLIST a b 'c", 1, 33, "truncated-xml", "inside the document type declaration"},
        {" <?xml version='1.0'?><BIF/>", 1, 2, "misplaced-xml-declaration", "first thing in the file"},
        {"<BIF><?xml version='1.0'?></BIF>", 1, 6, "misplaced-xml-declaration", "first thing in the file"},
        {"<?xml version='2.0'?><BIF/>", 1, 1, "xml-version", "XML version \"2.0\" is not read; use 1.0"},
        {"<BIF/><!DOCTYPE BIF>", 1, 7, "bad-xml", "before the root element"},
        {"<!DOCTYPE BIF><!DOCTYPE BIF><BIF/>", 1, 15, "bad-xml", "may stand once"},
        {"<!DOCTYPE BIF junk><BIF/>", 1, 15, "bad-xml", "declaration that is not well formed"},
        {"<!DOCTYPE BIF [ junk ]><BIF/>", 1, 17, "bad-xml", "neither an element nor an attribute list"},
        {"<!DOCTYPE BIF [ <!ATTLIST < > ]><BIF/>", 1, 27, "bad-xml", "attribute list that is not well formed"},
        {"<!DOCTYPE BIF [ <!ELEMENT a <b> ]><BIF/>", 1, 29, "bad-xml", "meets another <"},
        {"<!DOCTYPE BIF SYSTEM x><BIF/>", 1, 22, "bad-xml", "a quoted name is expected"},
        {"<!DOCTYPE BIF [\n <!ENTITY a 'b'>]><BIF/>", 2, 2, "entity-declaration", "entity declarations are not accepted"},
        {"<!DOCTYPE BIF [ <!ENTITY % a SYSTEM 'b'> %a; ]><BIF/>", 1, 17, "entity-declaration", "entity declarations are not accepted"},
        {"<!DOCTYPE BIF [ <!NOTATION a SYSTEM 'b'>]><BIF/>", 1, 17, "entity-declaration", "notation declarations are not accepted"},
        {"<!DOCTYPE BIF [ %a; ]><BIF/>", 1, 17, "entity-declaration", "parameter references are not accepted"},
        {"<!DOCTYPE BIF [ <!ELEMENT a %b;> ]><BIF/>", 1, 29, "entity-declaration", "parameter references are not accepted"},
        {"<!DOCTYPE BIF [ <!ATTLIST a b %c; #IMPLIED> ]><BIF/>", 1, 31, "entity-declaration", "parameter references are not accepted"},
        {"<BIF><!ENTITY a 'b'></BIF>", 1, 6, "entity-declaration", "entity declarations are not accepted"},
        {"<BIF><!ELEMENT a></BIF>", 1, 6, "bad-xml", "begins no comment and no CDATA"},
        {"<BIF>a < b</BIF>", 1, 8, "bad-xml", "a < that begins no tag"},
        {"<BIF><A <B/></BIF>", 1, 6, "bad-xml", "a tag that meets another <"},
        {"<BIF><A x='<B/></BIF>", 1, 6, "bad-xml", "meets a < before its end"},
        {"<BIF>\na &b; c</BIF>", 2, 3, "bad-xml", "an entity that is not one of XML's five"},
        {"<BIF a='&b;'/>", 1, 9, "bad-xml", "an entity that is not one of XML's five"},
        {"<BIF>a & b</BIF>", 1, 8, "bad-xml", "an & that begins no reference"},
        {"<BIF>\n&#0;</BIF>", 2, 1, "bad-xml", "a reference to a character that XML does not allow"},
        {"<BIF>&#xFFFE;</BIF>", 1, 6, "bad-xml", "a reference to a character that XML does not allow"},
        {"<BIF a=1/>", 1, 8, "bad-xml", "without quotes"},
        {"<BIF a/>", 1, 7, "bad-xml", "without a value"},
        {"<BIF a='1' a='2'/>", 1, 17, "bad-xml", "stands twice"},
        {"<BIF a='1'b='2'/>", 1, 11, "bad-xml", "a blank is missing"},
        {"<BIF>a ]]> b</BIF>", 1, 8, "bad-xml", "]]> in a text"},
        {"<BIF><!-- a -- b --></BIF>", 1, 13, "bad-xml", "-- inside a comment"},
        {"<p:BIF/>", 1, 7, "bad-xml", "a prefix that no xmlns attribute declares"},
        {"<BIF xmlns:a = ''/>", 1, 6, "bad-xml", "an empty namespace"},
        {"<BIF xmlns:xml='u'/>", 1, 19, "bad-xml", "not well-formed XML"},
        {"<9/>", 1, 2, "bad-xml", "not well-formed XML"},
        {"<BIF></BIF a='1'>", 1, 12, "bad-xml", "not well-formed XML"},
        /* the first thing that is wrong is the one that is told, whoever finds it */
        {"<BIF>\n&a;\n</B>", 2, 1, "bad-xml", "an entity that is not one of XML's five"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++)
        expect_refused(cases[i].bytes, strlen(cases[i].bytes), cases[i].line, cases[i].column, cases[i].code, cases[i].words);
}
END_TEST

START_TEST(other_kinds_of_file_are_refused_by_name) {
    static const struct {
        const char *bytes;
        size_t length;
        const char *code, *words;
    } cases[] = {
        {LITERAL("\x1F\x8B\x08\0\0\0\0\0"), "not-xml", "gzip data, not XML; decompress it first"},
        {LITERAL("BZh91AY"), "not-xml", "bzip2 data"},
        {LITERAL("PK\x03\x04....."), "not-xml", "a zip archive"},
        {LITERAL("%PDF-1.7"), "not-xml", "a PDF document"},
        {LITERAL("\xFF\xFE<\0B\0"), "encoding", "UTF-16LE text; save it as UTF-8 (iconv -f UTF-16LE -t UTF-8 FILE > NEW)"},
        {LITERAL("\xFE\xFF\0<\0B"), "encoding", "UTF-16BE text"},
        {LITERAL("<\0?\0x\0"), "encoding", "UTF-16LE text"},
        {LITERAL("\0<\0?\0x"), "encoding", "UTF-16BE text"},
        {LITERAL("\xFF\xFE\0\0<\0\0\0"), "encoding", "UTF-32LE text"},
        {LITERAL("\0\0\xFE\xFF\0\0\0<"), "encoding", "UTF-32BE text"},
        {LITERAL("<\0\0\0?\0\0\0"), "encoding", "UTF-32LE text"},
        {LITERAL("\0\0\0<\0\0\0?"), "encoding", "UTF-32BE text"},
        {LITERAL("<?xml version='1.0' encoding='UTF-16'?><BIF/>"), "encoding", "declares the encoding UTF-16, which its bytes are not; save it as UTF-8"},
        {LITERAL("<?xml version='1.0' encoding='KOI8-R'?><BIF/>"), "encoding", "KOI8-R is not read; save it as UTF-8 (iconv -f KOI8-R"},
        {LITERAL("<?xml version='1.0' encoding='UTF-7'?><BIF/>"), "encoding", "UTF-7 is not read; save it as UTF-8"},
        {LITERAL("<?xml version='1.0' encoding='$(x)'?><BIF/>"), "encoding", "\"$(x)\" is not read; save it as UTF-8 (with iconv)"},
        {LITERAL("<?xml version='1.0' encoding='ISO-8859-99'?><BIF/>"), "encoding", "ISO-8859-99 is not read"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++)
        expect_refused(cases[i].bytes, cases[i].length, 1, 1, cases[i].code, cases[i].words);
}
END_TEST

START_TEST(bytes_that_are_no_text_are_refused_at_their_place) {
    static const struct {
        const char *bytes;
        size_t length, line, column;
        const char *code, *words;
    } cases[] = {
        {LITERAL("<BIF>\r\n\xC3\xA9\xE9</BIF>"), 2, 2, "bad-encoding", "byte 0xE9 is not UTF-8; declare the encoding"},
        {LITERAL("<BIF>\xC0\xAF</BIF>"), 1, 6, "bad-encoding", "byte 0xC0 is not UTF-8"},
        {LITERAL("<BIF>\xED\xA0\x80\xED\xB0\x80</BIF>"), 1, 6, "bad-encoding", "byte 0xED is not UTF-8"},
        {LITERAL("<BIF>\xF4\x90\x80\x80</BIF>"), 1, 6, "bad-encoding", "byte 0xF4 is not UTF-8"},
        {LITERAL("<BIF>\xE2\x82"), 1, 6, "bad-encoding", "byte 0xE2 is not UTF-8"},
        {LITERAL("<BIF>\r\r\0</BIF>"), 3, 1, "forbidden-character", "character U+0000"},
        {LITERAL("<BIF>a\x01</BIF>"), 1, 7, "forbidden-character", "character U+0001"},
        {LITERAL("<BIF>\xEF\xBF\xBE</BIF>"), 1, 6, "forbidden-character", "character U+FFFE"},
        {LITERAL("<?xml version='1.0' encoding='US-ASCII'?>\n<BIF>\xC3\xA9</BIF>"), 2, 6, "bad-encoding", "byte 0xC3 is not US-ASCII"},
        {LITERAL("<?xml version='1.0' encoding='windows-1252'?>\n<BIF>a\x81</BIF>"), 2, 7, "bad-encoding",
         "byte 0x81 does not exist in windows-1252"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++)
        expect_refused(cases[i].bytes, cases[i].length, cases[i].line, cases[i].column, cases[i].code, cases[i].words);
}
END_TEST

/* The letters are those of the code charts: ISO/IEC 8859-1, -7, -15; windows-1252, -1251, -1258 (where an accent follows its letter). */
START_TEST(one_byte_encodings_come_out_as_utf8) {
    static const struct {
        const char *encoding, *bytes, *text;
    } cases[] = {
        {"ISO-8859-1", "\xE9\xFF", "\xC3\xA9\xC3\xBF"},          {"iso-8859-15", "\xA4", "\xE2\x82\xAC"},
        {"ISO-8859-7", "\xE1", "\xCE\xB1"},                       {"windows-1252", "\x80\x92", "\xE2\x82\xAC\xE2\x80\x99"},
        {"Windows-1251", "\xC0", "\xD0\x90"},                   {"windows-1258", "e\xEC", "\xC3\xA9"},
                            {"UTF-8", "\xC3\xA9", "\xC3\xA9"},
        {"utf8", "\xF0\x9F\x98\x80", "\xF0\x9F\x98\x80"},       {"us-ascii", "e", "e"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        bali_text bytes = {0}, expected = {0};
        bali_text_printf(&bytes, "<?xml version='1.0' encoding = \"%s\" ?>\r<BIF>%s</BIF>", cases[i].encoding, cases[i].bytes);
        bali_text_printf(&expected, "(BIF 2:1[%s])", cases[i].text);
        expect_heard(bytes.bytes, bytes.length, expected.bytes);
        bali_text_free(&bytes);
        bali_text_free(&expected);
    }
}
END_TEST

/* Longer than what is converted at a time. */
START_TEST(a_long_text_of_one_byte_characters_is_converted_whole) {
    bali_text bytes = repeated("\xE9", 100000), all = {0}, expected = {0}, letters = repeated("\xC3\xA9", 100000);
    bali_text_printf(&all, "<?xml version='1.0' encoding='ISO-8859-1'?><BIF>%s</BIF>", bytes.bytes);
    bali_text_printf(&expected, "(BIF 1:44[%s])", letters.bytes);
    expect_heard(all.bytes, all.length, expected.bytes);
    bali_text_free(&bytes);
    bali_text_free(&all);
    bali_text_free(&expected);
    bali_text_free(&letters);
}
END_TEST

/* libxml2 keeps 16 bits of line numbers unless told otherwise; here they are not its own. */
START_TEST(lines_beyond_65535_are_counted) {
    static const char *const ends[] = {"\n", "\r\n", "\r"};
    for (size_t i = 0; i < 3; i++) {
        bali_text all = {0}, lines = repeated(ends[i], 70000);
        bali_text_printf(&all, "<BIF>%s <A></B></BIF>", lines.bytes);
        expect_refused(all.bytes, all.length, 70001, 5, "mismatched-tag", "began on line 70001");
        bali_text_clear(&all);
        bali_text_printf(&all, "<BIF>%s &x;</BIF>", lines.bytes);
        expect_refused(all.bytes, all.length, 70001, 2, "bad-xml", "an entity");
        bali_text_free(&all);
        bali_text_free(&lines);
    }
}
END_TEST

/* A text of several pieces of every kind comes out whole and in order, whatever its length. */
START_TEST(long_texts_come_whole_and_in_order) {
    bali_text all = {0}, expected = {0};
    bali_text_puts(&all, "<BIF>");
    bali_text_puts(&expected, "(BIF 1:1[");
    for (size_t i = 0; i < 40; i++) {
        bali_text run = {0};
        for (size_t n = 0; n < 3000 * i; n++) bali_text_printf(&run, "%zu\xC3\xA9\xE2\x82\xAC ", n);
        bali_text_printf(&all, "%s<![CDATA[<%s]]>%s&amp;<?silent?><!-- silent -->", bali_text_string(&run), bali_text_string(&run),
                         i % 2 ? "" : "x");
        bali_text_printf(&expected, "%s<%s%s&", bali_text_string(&run), bali_text_string(&run), i % 2 ? "" : "x");
        bali_text_free(&run);
    }
    bali_text_puts(&all, "</BIF>");
    bali_text_puts(&expected, "])");
    ck_assert_uint_gt(all.length, 10000000);
    bali_text heard = {0};
    bal_error err = {0};
    ck_assert_int_eq(hear(all.bytes, all.length, &heard, &err), BAL_OK);
    ck_assert_uint_eq(heard.length, expected.length);
    ck_assert_mem_eq(heard.bytes, expected.bytes, heard.length);
    bali_text_free(&heard);
    bali_text_free(&all);
    bali_text_free(&expected);
}
END_TEST

/* opening + n x repeated + closing is accepted, with one more it is not. */
START_TEST(limits_hold_to_the_last_one) {
    static const struct {
        const char *opening, *again;
        size_t times;
        const char *closing, *words;
    } cases[] = {
        {"<BIF>", "<A/>", BALI_XML_MAX_ELEMENTS - 1, "</BIF>", "more than 1000000 elements"},
        {"<BIF>", "<?a?>", BALI_XML_MAX_INSTRUCTIONS, "</BIF>", "more than 1000000 processing instructions"},
        {"<BIF a='", "x", BALI_XML_MAX_TAG_BYTES - 11, "'/>", "a tag longer than 65536 bytes"},
        {"<BIF><!--", "x", BALI_XML_MAX_TAG_BYTES - 7, "--></BIF>", "a comment longer than 65536 bytes"},
        {"<BIF><?a ", "x", BALI_XML_MAX_TAG_BYTES - 6, "?></BIF>", "a processing instruction longer than 65536 bytes"},
        {"<BIF></BIF", " ", BALI_XML_MAX_TAG_BYTES - 6, ">", "a tag longer than 65536 bytes"},
        {"<!DOCTYPE BIF [<!ELEMENT A", " ", BALI_XML_MAX_TAG_BYTES - 12, ">]><BIF/>", "document type are longer than 65536 bytes"},
        {"<BIF a", "a", BALI_XML_MAX_NAME_BYTES - 1, "='1'/>", "longer than 255 bytes"},
        {"<a", "a", BALI_XML_MAX_NAME_BYTES - 1, "/>", "longer than 255 bytes"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        for (size_t more = 0; more < 2; more++) {
            bali_text all = {0}, middle = repeated(cases[i].again, cases[i].times + more);
            bali_text_printf(&all, "%s%s%s", cases[i].opening, middle.bytes, cases[i].closing);
            expect_limit(&all, more ? cases[i].words : NULL);
            bali_text_free(&all);
            bali_text_free(&middle);
        }
    }
}
END_TEST

START_TEST(depth_is_limited) {
    for (size_t more = 0; more < 2; more++) {
        bali_text all = repeated("<A>", BALI_XML_MAX_DEPTH + more), ends = repeated("</A>", BALI_XML_MAX_DEPTH + more);
        bali_text_add(&all, ends.bytes, ends.length);
        expect_limit(&all, more ? "nested more than 256 deep" : NULL);
        bali_text_free(&all);
        bali_text_free(&ends);
    }
    bali_text deep = repeated("<A>", 100000);
    expect_limit(&deep, "nested more than 256 deep");
    bali_text_free(&deep);
}
END_TEST

/* Numbered attributes, namespaces, and names over several tags. */
START_TEST(names_and_attributes_are_limited) {
    static const struct {
        const char *format;
        size_t in_a_tag, most;
        const char *words;
    } cases[] = {
        {" a%zu=''", 300, BALI_XML_MAX_ATTRIBUTES, "more than 256 attributes"},
        {" a%zu=''", 200, BALI_XML_MAX_NAMES - 2, "more than 1000 different names"},
        {" xmlns:a%zu='u'", 200, BALI_XML_MAX_NAMESPACES, "more than 256 namespace declarations"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        for (size_t more = 0; more < 2; more++) {
            bali_text all = {0};
            bali_text_puts(&all, "<BIF><A");
            for (size_t a = 0; a < cases[i].most + more; a++) {
                if (a > 0 && a % cases[i].in_a_tag == 0) bali_text_puts(&all, "/><A");
                bali_text_printf(&all, cases[i].format, a);
            }
            bali_text_puts(&all, "/></BIF>");
            expect_limit(&all, more ? cases[i].words : NULL);
            bali_text_free(&all);
        }
    }
}
END_TEST

START_TEST(a_listener_that_fails_ends_the_parse) {
    static const char bytes[] = "<BIF><A/><A/><A></BIF>";
    bali_text heard = {0};
    bal_error err = {0};
    ck_assert_int_eq(hear_as((hearing){.stop_after = 2}, LITERAL(bytes), &heard, &err), BAL_ERR_DATA);
    ck_assert_str_eq(err.code, "stop");
    ck_assert_str_eq(err.file, "model.xml");
    ck_assert_str_eq(heard.bytes, "(BIF 1:1(A 1:6");
    bali_text_free(&heard);
    ck_assert_int_eq(hear_as((hearing){.stop_after = 2}, LITERAL(bytes), &heard, NULL), BAL_ERR_DATA);
    bali_text_free(&heard);
}
END_TEST

/* Words of a text, each found again. */
START_TEST(text_is_retraced_to_its_place) {
    static const char bytes[] = "<BIF a='>'>0.1 <!-- 9 9 -->0.2&#32;0.3<![CDATA[ <4> ]]><?p 8?>0<!-- -->.5\n\n &lt;6 <A/> 7</BIF>";
    static const size_t columns[] = {12, 28, 36, 49, 63}; /* of the words on the first line */
    bali_xml *xml = NULL;
    bal_error err = {0};
    ck_assert_int_eq(bali_xml_create_take("model.xml", bali_duplicate(bytes, strlen(bytes)), strlen(bytes), &xml, &err), BAL_OK);
    bali_xml_retrace retrace = bali_xml_retrace_start(xml, 0);
    char before = ' ', byte;
    size_t words = 0, at;
    for (; bali_xml_retrace_next(&retrace, &byte, &at); before = byte) {
        if (!strchr(" \n", before) || strchr(" \n", byte)) continue;
        bal_error place = {0};
        bali_xml_place(xml, at, &place);
        ck_assert_uint_eq(place.line, words < 5 ? 1 : 3);
        ck_assert_uint_eq(place.column, words < 5 ? columns[words] : 2);
        words++;
    }
    ck_assert_uint_eq(words, 6);
    bali_xml_free(xml);

    ck_assert_int_eq(bali_xml_create_take("model.xml", bali_duplicate("<BIF/>x", 7), 7, &xml, &err), BAL_OK);
    retrace = bali_xml_retrace_start(xml, 0);
    ck_assert(!bali_xml_retrace_next(&retrace, &byte, &at));
    bali_xml_free(xml);
}
END_TEST

static const char sample[] =
    "<?xml version=\"1.0\" encoding=\"ISO-8859-1\"?>\n<!DOCTYPE BIF [\n<!ELEMENT BIF (A)*>\n<!ATTLIST A t CDATA 'n'>\n]>\n"
    "<BIF VERSION=\"0.3\" b='&lt;&#65;\xE9'>\n<A t=\"x\">a\xE9<!-- c --> &amp; <![CDATA[d]]></A>\n<?p q?><p:B xmlns:p='urn:u' p:c='1'/>\n</BIF>\n";

START_TEST(every_cut_is_refused_and_says_so) {
    size_t whole = strlen(sample) - 1; /* the last newline may be missing */
    for (size_t length = 0; length < whole; length++) {
        bali_text heard = {0};
        bal_error err = {0};
        ck_assert_msg(hear(sample, length, &heard, &err) == BAL_ERR_SYNTAX, "cut to %zu bytes", length);
        size_t line, column;
        bali_xml_position(sample, length, &line, &column);
        ck_assert_msg(err.line == line || strcmp(err.code, "empty-file") == 0, "cut to %zu bytes: line %zu, not %zu: %s", length,
                      err.line, line, err.message);
        bali_text_free(&heard);
    }
}
END_TEST

/* Whatever a byte becomes, the text is refused with a place, or heard the same way twice. */
START_TEST(any_changed_byte_is_refused_or_heard) {
    char bytes[sizeof sample];
    for (size_t i = 0; i < strlen(sample); i++) {
        for (unsigned change = 1; change < 256; change += 7) {
            memcpy(bytes, sample, sizeof sample);
            bytes[i] = (char)((unsigned char)bytes[i] ^ change);
            bali_text once = {0}, twice = {0};
            bal_error err = {0};
            bal_status status = hear(bytes, strlen(sample), &once, &err);
            ck_assert_msg(status == BAL_OK || (status == BAL_ERR_SYNTAX && err.line > 0 && err.message[0] != '\0'),
                          "byte %zu ^ %u: %d %s", i, change, (int)status, err.message);
            ck_assert_int_eq(hear(bytes, strlen(sample), &twice, NULL), status);
            ck_assert_str_eq(bali_text_string(&once), bali_text_string(&twice));
            bali_text_free(&once);
            bali_text_free(&twice);
        }
    }
}
END_TEST

START_TEST(random_bytes_are_refused) {
    uint64_t state = 7;
    for (size_t n = 0; n < 20000; n++) {
        static const char pieces[][12] = {"<", ">", "</", "/>", "<!--", "-->", "<![CDATA[", "]]>", "<?", "?>", "<!DOCTYPE", "[", "]", "\"", "'",
                                          "=", " ", "A", "xmlns", "&", ";", "#", "<!ATTLIST", "<!ELEMENT", "%", "\n", "\xC3\xA9", "(", ")"};
        bali_text bytes = {0}, heard = {0};
        bal_error err = {0};
        for (size_t p = 0; p < 12; p++) {
            state = state * 6364136223846793005u + 1442695040888963407u; /* Knuth's MMIX generator */
            bali_text_puts(&bytes, pieces[(state >> 33) % (sizeof pieces / sizeof pieces[0])]);
        }
        bal_status status = hear(bytes.bytes, bytes.length, &heard, &err);
        ck_assert_msg(status == BAL_ERR_SYNTAX || status == BAL_OK, "%s: %d %s", bytes.bytes, (int)status, err.message);
        bali_text_free(&bytes);
        bali_text_free(&heard);
    }
}
END_TEST

/* ---- memory that runs out, in libxml2 too: main() has it allocate through these ---- */

static size_t left_to_libxml2 = SIZE_MAX; /* allocations until it gets none any more */

static bool is_spent(void) {
    if (left_to_libxml2 == 0) return true;
    left_to_libxml2--;
    return false;
}

static void *allocate(size_t size) {
    return is_spent() ? NULL : bali_allocate(size, 1);
}

static void *reallocate(void *memory, size_t size) {
    return is_spent() ? NULL : bali_reallocate(memory, size, 1);
}

static char *duplicate(const char *text) {
    return is_spent() ? NULL : bali_duplicate(text, strlen(text));
}

/* How many allocations a run makes: a switch far away is met by so many fewer probes. */
static size_t allocations_of(const char *bytes, size_t length) {
    enum { FAR = 1000000 };
    bali_text heard = {0};
    bali_memory_fail_at(FAR);
    ck_assert_int_eq(hear(bytes, length, &heard, NULL), BAL_OK);
    bali_text_free(&heard);
    size_t probes = 0;
    for (void *probe; (probe = bali_allocate(1, 1)); probes++) bali_free(probe);
    return FAR - 1 - probes;
}

/* A run in which memory runs out says so, or gives exactly what it gives otherwise. Returns whether it said so. */
static bool is_refused(const char *bytes, size_t length, const bali_text *whole, size_t n) {
    bali_text heard = {0};
    bal_error err = {0};
    bal_status status = hear(bytes, length, &heard, &err);
    bali_memory_fail_at(0);
    left_to_libxml2 = SIZE_MAX;
    if (status == BAL_OK) {
        ck_assert_msg(heard.length == whole->length && memcmp(heard.bytes, whole->bytes, whole->length) == 0,
                      "allocation %zu failed, and something else was heard", n);
    } else {
        ck_assert_msg(status == BAL_ERR_MEMORY && err.status == BAL_ERR_MEMORY, "allocation %zu failed: %d %s", n, (int)status, err.message);
    }
    bali_text_free(&heard);
    return status != BAL_OK;
}

/* Each allocation fails once; and libxml2's fail for ever from each on. */
static void sweep(const char *bytes, size_t length) {
    bali_text whole = {0};
    ck_assert_int_eq(hear(bytes, length, &whole, NULL), BAL_OK);
    size_t n_allocations = allocations_of(bytes, length), once = 0, for_ever = 0;
    ck_assert_uint_gt(n_allocations, 20);
    for (size_t n = 1; n <= n_allocations; n++) {
        bali_memory_fail_at(n);
        once += is_refused(bytes, length, &whole, n);
        left_to_libxml2 = n - 1;
        for_ever += is_refused(bytes, length, &whole, n);
    }
    ck_assert_uint_gt(once, 10);
    ck_assert_uint_gt(for_ever, 10);
    bali_text_free(&whole);
}

START_TEST(memory_that_runs_out_anywhere_is_noticed) {
    sweep(LITERAL(sample));
    static const char plain[] = "<BIF VERSION='0.3' x='&#65;'>\n<A t=\"x\">a\xC3\xA9<!-- c --> &amp; <![CDATA[d]]></A>\n</BIF>";
    sweep(LITERAL(plain));
    bali_text all = {0}, text = repeated("0.25 \xC3\xA9\n", 60000);
    bali_text_printf(&all, "<BIF><A><B c='%.3000s'>%s</B></A></BIF>", text.bytes, text.bytes);
    sweep(all.bytes, all.length);
    bali_text_clear(&all); /* many names and attributes, deep */
    for (size_t i = 0; i < 60; i++) bali_text_printf(&all, "<a%zu xmlns:n%zu='u:%zu' n%zu:b='1' c%zu='%zu'>t", i, i, i, i, i, i);
    for (size_t i = 60; i-- > 0;) bali_text_printf(&all, "</a%zu>", i);
    sweep(all.bytes, all.length);
    bali_text_free(&all);
    bali_text_free(&text);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("xml");
    TCase *t = tcase_create("elements");
    tcase_set_timeout(t, 60);
    tcase_add_test(t, events_come_in_order_with_their_places);
    tcase_add_test(t, document_types_are_looked_through_and_left_out);
    tcase_add_test(t, what_is_not_well_formed_is_refused_at_its_place);
    tcase_add_test(t, other_kinds_of_file_are_refused_by_name);
    tcase_add_test(t, bytes_that_are_no_text_are_refused_at_their_place);
    tcase_add_test(t, one_byte_encodings_come_out_as_utf8);
    tcase_add_test(t, a_long_text_of_one_byte_characters_is_converted_whole);
    tcase_add_test(t, lines_beyond_65535_are_counted);
    tcase_add_test(t, long_texts_come_whole_and_in_order);
    tcase_add_test(t, limits_hold_to_the_last_one);
    tcase_add_test(t, depth_is_limited);
    tcase_add_test(t, names_and_attributes_are_limited);
    tcase_add_test(t, a_listener_that_fails_ends_the_parse);
    tcase_add_test(t, text_is_retraced_to_its_place);
    tcase_add_test(t, every_cut_is_refused_and_says_so);
    tcase_add_test(t, any_changed_byte_is_refused_or_heard);
    tcase_add_test(t, random_bytes_are_refused);
    tcase_add_test(t, memory_that_runs_out_anywhere_is_noticed);
    suite_add_tcase(s, t);
    return s;
}

int main(void) {
    if (xmlMemSetup(bali_free, allocate, reallocate, duplicate) != 0) return EXIT_FAILURE;
    xmlInitParser();
    int result = run_suite(suite());
    xmlCleanupParser();
    return result;
}
