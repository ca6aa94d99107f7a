/* The elements of an XML file with their places, in order and whole, whatever the file and the memory. Numbers before
 * cases are sections of Extensible Markup Language (XML) 1.0, fifth edition (2008). */
#include "formats/xml.h"
#include "formats/xml_decode.h"

#include "base/memory.h"
#include "support/hearing.h"

#include <libxml/parser.h>
#include <libxml/xmlmemory.h>
#include <string.h>

START_TEST(events_come_in_order_with_their_places) {
    static const struct {
        const char *bytes, *heard;
    } cases[] = {
        {"<BIF/>", "(BIF 1:1)"},
        {"<BIF></BIF>", "(BIF 1:1)"},
        {"<?xml version=\"1.0\"?>\n<BIF>\n <A x='1' y=\"a&amp;b\">t</A>\n</BIF>\n",
         "(BIF 2:1[\n ](A 3:2 x=1 y=a&b[t])[\n])"},
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

/* libxml2 keeps 16 bits of line numbers unless told otherwise; here they are not its own. */
START_TEST(lines_beyond_65535_are_counted) {
    static const char *const ends[] = {"\n", "\r\n", "\r"};
    for (size_t i = 0; i < 3; i++) {
        bali_text all = {0}, lines = repeated(ends[i], 70000);
        bali_text_printf(&all, "<BIF>%s <A></B></BIF>", lines.bytes);
        expect_unheard(all.bytes, all.length, 70001, 5, "mismatched-tag", "began on line 70001");
        bali_text_clear(&all);
        bali_text_printf(&all, "<BIF>%s &x;</BIF>", lines.bytes);
        expect_unheard(all.bytes, all.length, 70001, 2, "bad-xml", "an entity");
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
        bali_text_printf(&all, "%s<![CDATA[<%s]]>%s&amp;<?silent?><!-- silent -->", bali_text_string(&run),
                         bali_text_string(&run), i % 2 ? "" : "x");
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
    static const char bytes[] =
        "<BIF a='>'>0.1 <!-- 9 9 -->0.2&#32;0.3<![CDATA[ <4> ]]><?p 8?>0<!-- -->.5\n\n &lt;6 <A/> 7</BIF>";
    static const size_t columns[] = {12, 28, 36, 49, 63}; /* of the words on the first line */
    bali_xml *xml = NULL;
    bal_error err = {0};
    ck_assert_int_eq(bali_xml_create_take("model.xml", bali_duplicate(bytes, strlen(bytes)), strlen(bytes), &xml, &err),
                     BAL_OK);
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

static const char sample[] = "<?xml version=\"1.0\" encoding=\"ISO-8859-1\"?>\n<!DOCTYPE BIF [\n<!ELEMENT BIF "
                             "(A)*>\n<!ATTLIST A t CDATA 'n'>\n]>\n"
                             "<BIF VERSION=\"0.3\" b='&lt;&#65;\xE9'>\n<A t=\"x\">a\xE9<!-- c --> &amp; "
                             "<![CDATA[d]]></A>\n<?p q?><p:B xmlns:p='urn:u' p:c='1'/>\n</BIF>\n";

START_TEST(every_cut_is_refused_and_says_so) {
    size_t whole = strlen(sample) - 1; /* the last newline may be missing */
    for (size_t length = 0; length < whole; length++) {
        bali_text heard = {0};
        bal_error err = {0};
        ck_assert_msg(hear(sample, length, &heard, &err) == BAL_ERR_SYNTAX, "cut to %zu bytes", length);
        size_t line, column;
        bali_xml_position(sample, length, &line, &column);
        ck_assert_msg(err.line == line || strcmp(err.code, "empty-file") == 0,
                      "cut to %zu bytes: line %zu, not %zu: %s", length, err.line, line, err.message);
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
        ck_assert_msg(status == BAL_ERR_MEMORY && err.status == BAL_ERR_MEMORY, "allocation %zu failed: %d %s", n,
                      (int)status, err.message);
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
    static const char plain[] =
        "<BIF VERSION='0.3' x='&#65;'>\n<A t=\"x\">a\xC3\xA9<!-- c --> &amp; <![CDATA[d]]></A>\n</BIF>";
    sweep(LITERAL(plain));
    bali_text all = {0}, text = repeated("0.25 \xC3\xA9\n", 60000);
    bali_text_printf(&all, "<BIF><A><B c='%.3000s'>%s</B></A></BIF>", text.bytes, text.bytes);
    sweep(all.bytes, all.length);
    bali_text_clear(&all); /* many names and attributes, deep */
    for (size_t i = 0; i < 60; i++)
        bali_text_printf(&all, "<a%zu xmlns:n%zu='u:%zu' n%zu:b='1' c%zu='%zu'>t", i, i, i, i, i, i);
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
    tcase_add_test(t, lines_beyond_65535_are_counted);
    tcase_add_test(t, long_texts_come_whole_and_in_order);
    tcase_add_test(t, a_listener_that_fails_ends_the_parse);
    tcase_add_test(t, text_is_retraced_to_its_place);
    tcase_add_test(t, every_cut_is_refused_and_says_so);
    tcase_add_test(t, any_changed_byte_is_refused_or_heard);
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
