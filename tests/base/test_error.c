#include "base/text.h"
#include "support/harness.h"

#include <stdio.h>
#include <string.h>

START_TEST(first_cause_wins) {
    bal_error err = {0};
    ck_assert_int_eq(bal_error_set(&err, BAL_ERR_DATA, "first", "one %d", 1), BAL_ERR_DATA);
    ck_assert_int_eq(bal_error_set(&err, BAL_ERR_IO, "second", "two"), BAL_ERR_DATA);
    ck_assert_int_eq(err.status, BAL_ERR_DATA);
    ck_assert_str_eq(err.code, "first");
    ck_assert_str_eq(err.message, "one 1");
}
END_TEST

START_TEST(no_error_wanted) {
    ck_assert_int_eq(bal_error_set(NULL, BAL_ERR_NUMERIC, "any", "any"), BAL_ERR_NUMERIC);
    bal_error_place(NULL, "file", 1, 2);
    bal_error_context(NULL, 1, "variable");
}
END_TEST

START_TEST(place_fills_only_what_is_empty) {
    bal_error err = {0};
    bal_error_place(&err, NULL, 0, 0);
    ck_assert_str_eq(err.file, "");
    bal_error_place(&err, "cases.csv", 0, 0);
    bal_error_place(&err, "other.csv", 18, 9);
    bal_error_place(&err, "other.csv", 20, 11);
    ck_assert_str_eq(err.file, "cases.csv");
    ck_assert_uint_eq(err.line, 18);
    ck_assert_uint_eq(err.column, 9);

    bal_error line_only = {0};
    bal_error_place(&line_only, NULL, 5, 0);
    bal_error_place(&line_only, NULL, 6, 7); /* the column belongs to another line */
    ck_assert_uint_eq(line_only.line, 5);
    ck_assert_uint_eq(line_only.column, 0);
}
END_TEST

START_TEST(context_fills_only_what_is_empty) {
    bal_error err = {0};
    bal_error_context(&err, 0, NULL);
    bal_error_context(&err, 17, NULL);
    bal_error_context(&err, 18, "smoker");
    bal_error_context(&err, 19, "age");
    ck_assert_uint_eq(err.record, 17);
    ck_assert_str_eq(err.variable, "smoker");
}
END_TEST

/* What may be in a label, and what may be shown of it. Source of what is UTF-8: RFC 3629. */
static const struct {
    const char *given, *shown;
} visible[] = {
    {"plain", "plain"},
    {"\xC3\xA9t\xC3\xA9 \xE2\x89\xA5 \xF0\x9F\x98\x80", "\xC3\xA9t\xC3\xA9 \xE2\x89\xA5 \xF0\x9F\x98\x80"},
    {"a\033[31mred", "a\\x1B[31mred"},
    {"a\nb\tc\rd\x7F", "a\\x0A" "b\\x09" "c\\x0D" "d\\x7F"},
    {"\xC2\x9B" "31m", "\\xC2\\x9B" "31m"},                   /* U+009B, the one-character CSI */
    {"abc\xE2\x80\xAE" "gpj", "abc\\xE2\\x80\\xAE" "gpj"},    /* U+202E, right-to-left override */
    {"\xE2\x81\xA6x", "\\xE2\\x81\\xA6x"},                    /* U+2066, left-to-right isolate */
    {"\xEF\xBB\xBFx", "\\xEF\\xBB\\xBFx"},                    /* U+FEFF */
    {"\xFFx", "\\xFFx"},
    {"\xC0\xAF", "\\xC0\\xAF"},                               /* overlong */
    {"\xED\xA0\x80", "\\xED\\xA0\\x80"},                      /* surrogate */
    {"\xF4\x90\x80\x80", "\\xF4\\x90\\x80\\x80"},             /* above U+10FFFF */
    {"x\xE2\x82", "x\\xE2\\x82"},                             /* cut short */
};

START_TEST(hostile_text_is_made_visible) {
    bal_error err = {0};
    (void)bal_error_set(&err, BAL_ERR_DATA, "any", "%s", visible[_i].given);
    ck_assert_str_eq(err.message, visible[_i].shown);

    bal_error placed = {0};
    bal_error_place(&placed, visible[_i].given, 0, 0);
    ck_assert_str_eq(placed.file, visible[_i].given); /* kept as it is, so that the file can be found */
    (void)bal_error_set(&placed, BAL_ERR_DATA, "any", "m");
    char text[200], wanted[200];
    bal_error_text(&placed, text, sizeof text);
    (void)snprintf(wanted, sizeof wanted, "%s: m [any]", visible[_i].shown);
    ck_assert_str_eq(text, wanted);
}
END_TEST

static const struct {
    const char *file;
    size_t line, column;
    const char *code, *text;
} forms[] = {
    {"cases.csv", 18, 9, "unknown-label", "cases.csv:18:9: what is wrong [unknown-label]"},
    {"cases.csv", 18, 0, "unknown-label", "cases.csv:18: what is wrong [unknown-label]"},
    {"cases.csv", 0, 0, "unknown-label", "cases.csv: what is wrong [unknown-label]"},
    {NULL, 0, 0, "unknown-label", "what is wrong [unknown-label]"},
    {NULL, 18, 9, "unknown-label", "line 18:9: what is wrong [unknown-label]"},
    {NULL, 0, 0, NULL, "what is wrong"},
};

START_TEST(text_leaves_out_what_is_not_known) {
    bal_error err = {0};
    (void)bal_error_set(&err, BAL_ERR_DATA, forms[_i].code, "what is wrong");
    bal_error_place(&err, forms[_i].file, forms[_i].line, forms[_i].column);
    char text[200];
    bal_error_text(&err, text, sizeof text);
    ck_assert_str_eq(text, forms[_i].text);
}
END_TEST

/* Repeats a character until the string has length bytes or a few less. */
static void repeat(char *to, size_t length, const char *character) {
    size_t each = strlen(character), at = 0;
    while (at + each <= length) {
        memcpy(to + at, character, each);
        at += each;
    }
    to[at] = '\0';
}

static const char *const long_ones[] = {"a", "\xC3\xA9", "\xE2\x89\xA5", "\xF0\x9F\x98\x80"};

START_TEST(fields_are_cut_at_a_characters_end) {
    char given[3001];
    repeat(given, 3000, long_ones[_i]);
    size_t each = strlen(long_ones[_i]);
    bal_error err = {0};
    (void)bal_error_set(&err, BAL_ERR_DATA, "any", "%s", given);
    bal_error_place(&err, given, 1, 1);
    bal_error_context(&err, 1, given);
    const struct {
        const char *field;
        size_t size;
    } fields[] = {{err.message, sizeof err.message}, {err.file, sizeof err.file}, {err.variable, sizeof err.variable}};
    for (size_t f = 0; f < 3; f++) {
        size_t length = strlen(fields[f].field);
        ck_assert_uint_eq(length, (fields[f].size - 1) / each * each);
        ck_assert_uint_eq(bali_utf8_check(fields[f].field, length), length);
        ck_assert(memcmp(fields[f].field, given, length) == 0);
    }
}
END_TEST

START_TEST(bytes_that_are_no_characters_are_cut_too) {
    char given[3001];
    repeat(given, 3000, "\x80");
    bal_error err = {0};
    bal_error_place(&err, given, 0, 0);
    ck_assert_uint_ge(strlen(err.file), sizeof err.file - 4);
    (void)bal_error_set(&err, BAL_ERR_DATA, "any", "%s", given);
    ck_assert_uint_eq(strlen(err.message), (sizeof err.message - 1) / 4 * 4); /* whole \x80s */
}
END_TEST

START_TEST(text_of_any_size_is_a_beginning_of_the_whole) {
    bal_error err = {0};
    (void)bal_error_set(&err, BAL_ERR_DATA, "unknown-label", "\"m\xC3\xA4y\033\" is no outcome");
    bal_error_place(&err, "f\xE2\x89\xA5\xFF.csv", 123, 4567);
    char whole[200];
    bal_error_text(&err, whole, sizeof whole);
    ck_assert_str_eq(whole, "f\xE2\x89\xA5\\xFF.csv:123:4567: \"m\xC3\xA4y\\x1B\" is no outcome [unknown-label]");
    for (size_t size = 1; size <= strlen(whole) + 1; size++) {
        char text[200];
        memset(text, 'X', sizeof text);
        bal_error_text(&err, text, size);
        size_t length = strlen(text);
        ck_assert_uint_lt(length, size);
        ck_assert(memcmp(text, whole, length) == 0);
        ck_assert_uint_eq(bali_utf8_check(text, length), length);
        ck_assert_int_eq(text[size], 'X');
    }
    char untouched = 'X';
    bal_error_text(&err, &untouched, 0);
    ck_assert_int_eq(untouched, 'X');
}
END_TEST

START_TEST(codes_are_in_order_and_complete) {
    size_t n;
    const bal_code *codes = bal_codes(&n);
    ck_assert_uint_gt(n, 0);
    for (size_t i = 0; i < n; i++) {
        if (i > 0) ck_assert_msg(strcmp(codes[i - 1].code, codes[i].code) < 0, "%s is out of order or twice", codes[i].code);
        ck_assert(codes[i].code[0] && codes[i].cause && codes[i].example && codes[i].mend);
        ck_assert_msg(codes[i].cause[0] && codes[i].example[0] && codes[i].mend[0], "%s lacks a text", codes[i].code);
        ck_assert_msg(strspn(codes[i].code, "abcdefghijklmnopqrstuvwxyz0123456789-") == strlen(codes[i].code), "%s", codes[i].code);
        ck_assert_ptr_eq(bal_code_find(codes[i].code), &codes[i]);
    }
    ck_assert_ptr_null(bal_code_find("no-such-code"));
    ck_assert_ptr_null(bal_code_find(""));
}
END_TEST

static Suite *suite(void) {
    Suite *suite = suite_create("error");
    TCase *tests = tcase_create("error");
    tcase_add_test(tests, first_cause_wins);
    tcase_add_test(tests, no_error_wanted);
    tcase_add_test(tests, place_fills_only_what_is_empty);
    tcase_add_test(tests, context_fills_only_what_is_empty);
    tcase_add_loop_test(tests, hostile_text_is_made_visible, 0, (int)(sizeof visible / sizeof visible[0]));
    tcase_add_loop_test(tests, text_leaves_out_what_is_not_known, 0, (int)(sizeof forms / sizeof forms[0]));
    tcase_add_loop_test(tests, fields_are_cut_at_a_characters_end, 0, (int)(sizeof long_ones / sizeof long_ones[0]));
    tcase_add_test(tests, bytes_that_are_no_characters_are_cut_too);
    tcase_add_test(tests, text_of_any_size_is_a_beginning_of_the_whole);
    tcase_add_test(tests, codes_are_in_order_and_complete);
    suite_add_tcase(suite, tests);
    return suite;
}

int main(void) {
    return run_suite(suite());
}
