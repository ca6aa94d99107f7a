/* What the guard lets through: what is well formed by Extensible Markup Language (XML) 1.0, fifth edition (2008), and
 * within the limits. */
#include "formats/xml_guard.h"

#include "support/hearing.h"

#include <string.h>

START_TEST(document_types_are_looked_through_and_left_out) {
    static const struct {
        const char *bytes, *heard;
    } cases[] = {
        {"<!DOCTYPE BIF><BIF/>", "(BIF 1:15)"},
        {"<!DOCTYPE BIF [\n <!ELEMENT BIF (A)*>\n <!ATTLIST BIF x CDATA #REQUIRED y (a|b) #IMPLIED>\n <!-- ] > --><?q "
         "]?> ]>\n<BIF/>",
         "(BIF 5:1)"},
        {"<!DOCTYPE BIF [<!ATTLIST BIF x CDATA 'dflt' y NOTATION (a) #FIXED \"b\" z ID #IMPLIED>]><BIF/>",
         "!default-attribute 1:30 !default-attribute 1:45 (BIF 1:87)"},
        {"<!DOCTYPE BIF SYSTEM 'file:///etc/hostname'><BIF/>", "!external-dtd 1:15 (BIF 1:45)"},
        {"<!DOCTYPE BIF PUBLIC \"a\" \"http://localhost:9/x.dtd\" [] ><BIF/>", "!external-dtd 1:15 (BIF 1:57)"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++)
        expect_heard(cases[i].bytes, strlen(cases[i].bytes), cases[i].heard);
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
        {"<!DOCTYPE BIF [\n <!ENTITY a 'b'>]><BIF/>", 2, 2, "entity-declaration",
         "entity declarations are not accepted"},
        {"<!DOCTYPE BIF [ <!ENTITY % a SYSTEM 'b'> %a; ]><BIF/>", 1, 17, "entity-declaration",
         "entity declarations are not accepted"},
        {"<!DOCTYPE BIF [ <!NOTATION a SYSTEM 'b'>]><BIF/>", 1, 17, "entity-declaration",
         "notation declarations are not accepted"},
        {"<!DOCTYPE BIF [ %a; ]><BIF/>", 1, 17, "entity-declaration", "parameter references are not accepted"},
        {"<!DOCTYPE BIF [ <!ELEMENT a %b;> ]><BIF/>", 1, 29, "entity-declaration",
         "parameter references are not accepted"},
        {"<!DOCTYPE BIF [ <!ATTLIST a b %c; #IMPLIED> ]><BIF/>", 1, 31, "entity-declaration",
         "parameter references are not accepted"},
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
        expect_unheard(cases[i].bytes, strlen(cases[i].bytes), cases[i].line, cases[i].column, cases[i].code,
                       cases[i].words);
}
END_TEST

static void expect_limit(const bali_text *text, const char *words) {
    bali_text heard = {0};
    bal_error err = {0};
    bal_status status = hear_as((hearing){.deaf = true}, text->bytes, text->length, &heard, &err);
    if (words) {
        ck_assert_msg(status == BAL_ERR_SYNTAX && strcmp(err.code, "xml-limit") == 0, "%d %s", (int)status,
                      err.message);
        ck_assert_msg(strstr(err.message, words) != NULL, "\"%s\" lacks \"%s\"", err.message, words);
        ck_assert_uint_gt(err.line, 0);
    } else {
        ck_assert_msg(status == BAL_OK, "%s", err.message);
    }
    bali_text_free(&heard);
}

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
        {"<!DOCTYPE BIF [<!ELEMENT A", " ", BALI_XML_MAX_TAG_BYTES - 12, ">]><BIF/>",
         "document type are longer than 65536 bytes"},
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

START_TEST(random_bytes_are_refused) {
    uint64_t state = 7;
    for (size_t n = 0; n < 20000; n++) {
        static const char pieces[][12] = {"<",  ">",  "</",        "/>", "<!--", "-->", "<![CDATA[", "]]>",
                                          "<?", "?>", "<!DOCTYPE", "[",  "]",    "\"",  "'",         "=",
                                          " ",  "A",  "xmlns",     "&",  ";",    "#",   "<!ATTLIST", "<!ELEMENT",
                                          "%",  "\n", "\xC3\xA9",  "(",  ")"};
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

static Suite *suite(void) {
    Suite *s = suite_create("xml guard");
    TCase *t = tcase_create("xml guard");
    tcase_set_timeout(t, 60);
    tcase_add_test(t, document_types_are_looked_through_and_left_out);
    tcase_add_test(t, what_is_not_well_formed_is_refused_at_its_place);
    tcase_add_test(t, limits_hold_to_the_last_one);
    tcase_add_test(t, depth_is_limited);
    tcase_add_test(t, names_and_attributes_are_limited);
    tcase_add_test(t, random_bytes_are_refused);
    suite_add_tcase(s, t);
    return s;
}

int main(void) {
    return run_suite(suite());
}
