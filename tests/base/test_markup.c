#include "base/markup.h"
#include "base/memory.h"
#include "support/harness.h"

#include <string.h>

/* What is given, and how it must stand in a value and in content. Sources: XML 1.0 (fifth edition), sections 2.2 (which characters
 * can be written), 2.4 (markup), 2.11 and 3.3.3 (what parsers do to line ends and attribute values). */
static const struct {
    const char *given;
    size_t length;
    const char *value, *content;
} escapes[] = {
    {"", 0, "", ""},
    {"plain", 5, "plain", "plain"},
    {"<script>", 8, "&lt;script&gt;", "&lt;script&gt;"},
    {"\"]]>", 4, "&quot;]]&gt;", "&quot;]]&gt;"},
    {"R&D's", 5, "R&amp;D&#39;s", "R&amp;D&#39;s"},
    {"&amp;", 5, "&amp;amp;", "&amp;amp;"},
    {"a--b", 4, "a--b", "a--b"},
    {"a\tb\nc\rd", 7, "a&#9;b&#10;c&#13;d", "a\tb\nc&#13;d"},
    {"\xC3\xA9\xE2\x89\xA5\xF0\x9F\x98\x80", 9, "\xC3\xA9\xE2\x89\xA5\xF0\x9F\x98\x80", "\xC3\xA9\xE2\x89\xA5\xF0\x9F\x98\x80"},
    {"a\0b\x01\x1F", 5, "a\xEF\xBF\xBD" "b\xEF\xBF\xBD\xEF\xBF\xBD", "a\xEF\xBF\xBD" "b\xEF\xBF\xBD\xEF\xBF\xBD"},
    {"\xEF\xBF\xBE.\xEF\xBF\xBF", 7, "\xEF\xBF\xBD.\xEF\xBF\xBD", "\xEF\xBF\xBD.\xEF\xBF\xBD"}, /* U+FFFE, U+FFFF */
    {"\xFFz\xC3", 3, "\xEF\xBF\xBDz\xEF\xBF\xBD", "\xEF\xBF\xBDz\xEF\xBF\xBD"},
    {"\x7F\xC2\x9B", 3, "\x7F\xC2\x9B", "\x7F\xC2\x9B"}, /* allowed, if discouraged */
};

START_TEST(markup_is_escaped) {
    bali_text value = {0}, content = {0};
    bali_markup_escape(&value, escapes[_i].given, escapes[_i].length);
    bali_markup_content(&content, escapes[_i].given, escapes[_i].length);
    ck_assert_str_eq(bali_text_string(&value), escapes[_i].value);
    ck_assert_str_eq(bali_text_string(&content), escapes[_i].content);
    bali_text_free(&value);
    bali_text_free(&content);
}
END_TEST

START_TEST(nothing_dangerous_comes_out) {
    for (int byte = 0; byte < 256; byte++) {
        char given[3] = {'a', (char)byte, 'z'};
        bali_text value = {0};
        bali_markup_escape(&value, given, 3);
        ck_assert_uint_eq(bali_utf8_check(value.bytes, value.length), value.length);
        ck_assert_ptr_null(strpbrk(value.bytes, "<>\"'\t\n\r"));
        ck_assert(value.bytes[0] == 'a' && value.bytes[value.length - 1] == 'z');
        bali_text_free(&value);
    }
}
END_TEST

static bal_status escape(void *context, bal_error *err) {
    (void)context;
    bali_text text = {0};
    for (int i = 0; i < 30; i++) bali_markup_escape(&text, "<a & b>", 7);
    bal_status status = text.failed ? bali_out_of_memory(err) : BAL_OK;
    bali_text_free(&text);
    return status;
}

START_TEST(no_memory_is_remembered) {
    ck_assert_uint_ge(survive_allocations(escape, NULL), 3);
}
END_TEST

static Suite *suite(void) {
    Suite *suite = suite_create("markup");
    TCase *tests = tcase_create("markup");
    tcase_add_loop_test(tests, markup_is_escaped, 0, (int)(sizeof escapes / sizeof escapes[0]));
    tcase_add_test(tests, nothing_dangerous_comes_out);
    tcase_add_test(tests, no_memory_is_remembered);
    suite_add_tcase(suite, tests);
    return suite;
}

int main(void) {
    return run_suite(suite());
}
