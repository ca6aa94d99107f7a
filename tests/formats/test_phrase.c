#include "base/text.h"
#include "formats/phrase.h"
#include "support/harness.h"

#include <string.h>

START_TEST(pieces_are_put_together) {
    bali_phrase phrase = {0};
    bali_phrase_add(&phrase, "%d and ", 3);
    bali_phrase_quote(&phrase, "yes, that is", 3);
    bali_phrase_text(&phrase, "", 0);
    ck_assert_str_eq(phrase.text, "3 and \"yes\"");
    ck_assert_uint_eq(phrase.length, strlen(phrase.text));
}
END_TEST

START_TEST(counts_have_commas_between_thousands) {
    static const struct {
        uint64_t count;
        const char *text;
    } cases[] = {{0, "0"}, {999, "999"}, {1000, "1,000"}, {1234567, "1,234,567"}, {UINT64_MAX, "18,446,744,073,709,551,615"}};
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        bali_phrase phrase = {0};
        bali_phrase_count(&phrase, cases[i].count);
        ck_assert_str_eq(phrase.text, cases[i].text);
    }
}
END_TEST

START_TEST(long_texts_are_cut_at_a_character) {
    char text[200];
    for (size_t i = 0; i < sizeof text; i += 2) memcpy(text + i, "\xC3\xA9", 2);
    for (size_t before = 0; before < 3; before++) {
        bali_phrase phrase = {0};
        memset(text, 'x', before);
        for (size_t i = before; i + 1 < sizeof text; i += 2) memcpy(text + i, "\xC3\xA9", 2);
        bali_phrase_text(&phrase, text, sizeof text - before % 2);
        ck_assert_uint_eq(bali_utf8_check(phrase.text, phrase.length), phrase.length);
        ck_assert_uint_le(phrase.length, 48 + 3);
        ck_assert_str_eq(phrase.text + phrase.length - 3, "...");
    }
}
END_TEST

START_TEST(what_does_not_fit_is_cut_at_a_character) {
    static const char *const pieces[] = {"x", "\xC3\xA9", "\xE2\x82\xAC", "\xF0\x9F\x8D\x80"};
    for (size_t p = 0; p < sizeof pieces / sizeof pieces[0]; p++)
        for (size_t before = 0; before < 5; before++) {
            bali_phrase phrase = {0};
            bali_phrase_add(&phrase, "%.*s", (int)before, "yyyyy");
            for (int i = 0; i < 700; i++) bali_phrase_add(&phrase, "%s", pieces[p]);
            ck_assert_uint_lt(phrase.length, sizeof phrase.text);
            ck_assert_uint_ge(phrase.length + strlen(pieces[p]), sizeof phrase.text);
            ck_assert_uint_eq(strlen(phrase.text), phrase.length);
            ck_assert_uint_eq(bali_utf8_check(phrase.text, phrase.length), phrase.length);
        }
}
END_TEST

static Suite *suite(void) {
    Suite *suite = suite_create("phrase");
    TCase *tests = tcase_create("phrase");
    tcase_add_test(tests, pieces_are_put_together);
    tcase_add_test(tests, counts_have_commas_between_thousands);
    tcase_add_test(tests, long_texts_are_cut_at_a_character);
    tcase_add_test(tests, what_does_not_fit_is_cut_at_a_character);
    suite_add_tcase(suite, tests);
    return suite;
}

int main(void) {
    return run_suite(suite());
}
