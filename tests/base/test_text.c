#include "base/memory.h"
#include "base/text.h"
#include "support/harness.h"

#include <string.h>

START_TEST(text_grows) {
    bali_text text = {0};
    ck_assert_str_eq(bali_text_string(&text), "");
    bali_text_add(&text, "a\0b", 3);
    ck_assert(text.length == 3 && memcmp(text.bytes, "a\0b", 4) == 0);
    bali_text_clear(&text);
    ck_assert_str_eq(bali_text_string(&text), "");
    for (int i = 0; i < 5000; i++) bali_text_printf(&text, "%d,", i % 10);
    bali_text_puts(&text, "end");
    bali_text_putc(&text, '!');
    ck_assert_uint_eq(text.length, 10004);
    ck_assert_uint_eq(strlen(text.bytes), 10004);
    ck_assert_str_eq(text.bytes + 9994, "7,8,9,end!");
    bali_text_free(&text);
    ck_assert_ptr_null(text.bytes);
    bali_text_free(&text);
}
END_TEST

START_TEST(adding_nothing_is_fine) {
    bali_text text = {0};
    bali_text_add(&text, NULL, 0);
    bali_text_clear(&text);
    bali_text_puts(&text, "");
    ck_assert_str_eq(text.bytes, "");
    ck_assert(!text.failed);
    bali_text_free(&text);
}
END_TEST

static bal_status fill(void *context, bal_error *err) {
    (void)context;
    bali_text text = {0};
    for (int i = 0; i < 100; i++) {
        bali_text_puts(&text, "some words, ");
        bali_text_printf(&text, "%d", i);
        bali_text_put_visible(&text, "\n", 1);
        bali_text_pad(&text, 20);
    }
    bal_status status = text.failed ? bali_out_of_memory(err) : BAL_OK;
    bali_text_free(&text);
    return status;
}

START_TEST(no_memory_is_remembered) {
    ck_assert_uint_ge(survive_allocations(fill, NULL), 5);
    bali_text text = {0};
    bali_text_puts(&text, "kept");
    bali_memory_fail_at(1);
    bali_text_add(&text, "a longer one that needs room", 28);
    ck_assert(text.failed);
    bali_text_puts(&text, "x"); /* would fit, but what came before is missing */
    ck_assert_str_eq(text.bytes, "kept");
    bali_text_add(&text, "y", SIZE_MAX);
    ck_assert(text.failed);
    bali_text_clear(&text);
    bali_text_add(&text, "y", SIZE_MAX);
    ck_assert(text.failed);
    bali_text_free(&text);
}
END_TEST

static const struct {
    const char *start;
    size_t column;
    const char *padded;
} pads[] = {
    {"", 3, "   "},
    {"ab", 5, "ab   "},
    {"ab", 2, "ab "},
    {"abc", 2, "abc "},
    {"", 0, " "},
    {"a long line\nab", 4, "a long line\nab  "},
    {"\xC3\xA9\xE2\x89\xA5", 4, "\xC3\xA9\xE2\x89\xA5  "}, /* counted in characters */
};

START_TEST(pads_to_a_column) {
    bali_text text = {0};
    bali_text_puts(&text, pads[_i].start);
    bali_text_pad(&text, pads[_i].column);
    ck_assert_str_eq(bali_text_string(&text), pads[_i].padded);
    bali_text_free(&text);
}
END_TEST

START_TEST(shows_what_may_be_shown) {
    bali_text text = {0};
    const char given[] = "\xC3\xA9\033[0m\xE2\x80\xAE\xFF\0z";
    bali_text_put_visible(&text, given, sizeof given - 1);
    ck_assert_str_eq(text.bytes, "\xC3\xA9\\x1B[0m\\xE2\\x80\\xAE\\xFF\\x00z");
    bali_text_free(&text);
}
END_TEST

/* The slow twin: encodes a character by the table of RFC 3629, section 3. Returns its length. */
static size_t encode(uint32_t c, char *to) {
    if (c < 0x80) return to[0] = (char)c, 1;
    if (c < 0x800) return to[0] = (char)(0xC0 | c >> 6), to[1] = (char)(0x80 | (c & 0x3F)), 2;
    if (c < 0x10000)
        return to[0] = (char)(0xE0 | c >> 12), to[1] = (char)(0x80 | (c >> 6 & 0x3F)), to[2] = (char)(0x80 | (c & 0x3F)), 3;
    to[0] = (char)(0xF0 | c >> 18), to[1] = (char)(0x80 | (c >> 12 & 0x3F)), to[2] = (char)(0x80 | (c >> 6 & 0x3F));
    return to[3] = (char)(0x80 | (c & 0x3F)), 4;
}

START_TEST(every_character_decodes) {
    for (uint32_t c = 0; c < 0x200000; c++) {
        char bytes[4];
        size_t length = encode(c, bytes);
        bool valid = c <= 0x10FFFF && !(c >= 0xD800 && c <= 0xDFFF);
        uint32_t decoded = 0;
        size_t size = bali_utf8_next(bytes, length, &decoded);
        if (size != (valid ? length : 0) || (valid && decoded != c))
            ck_abort_msg("U+%04X: %zu bytes, U+%04X", (unsigned)c, size, (unsigned)decoded);
        if (length > 1 && bali_utf8_next(bytes, length - 1, &decoded) != 0) ck_abort_msg("U+%04X cut short was taken", (unsigned)c);
    }
}
END_TEST

START_TEST(every_pair_of_bytes_is_judged) {
    /* RFC 3629, section 4: of two bytes only 00-7F alone and C2-DF 80-BF are characters. */
    for (unsigned a = 0; a < 256; a++) {
        for (unsigned b = 0; b < 256; b++) {
            char bytes[2] = {(char)a, (char)b};
            uint32_t character;
            size_t wanted = a < 0x80 ? 1 : a >= 0xC2 && a <= 0xDF && b >= 0x80 && b <= 0xBF ? 2 : 0;
            if (bali_utf8_next(bytes, 2, &character) != wanted) ck_abort_msg("%02X %02X", a, b);
        }
    }
}
END_TEST

static const struct {
    const char *bytes;
    size_t length, good, count;
} checked[] = {
    {"", 0, 0, 0},
    {"abc", 3, 3, 3},
    {"a\0c", 3, 3, 3},
    {"a\xC3\xA9z", 4, 4, 3},
    {"a\xC3", 2, 1, 2},
    {"\xE0\x9F\xBF", 3, 0, 3},         /* overlong: RFC 3629 asks for E0 A0-BF */
    {"\xF0\x8F\xBF\xBF", 4, 0, 4},     /* overlong */
    {"ok\xED\xBF\xBF", 5, 2, 5},       /* surrogate */
    {"\xF4\x8F\xBF\xBF", 4, 4, 1},     /* U+10FFFF */
    {"\xF5\x80\x80\x80", 4, 0, 4},
    {"\xE2\x89\x41", 3, 0, 3},
};

START_TEST(finds_the_first_bad_byte) {
    ck_assert_uint_eq(bali_utf8_check(checked[_i].bytes, checked[_i].length), checked[_i].good);
    ck_assert_uint_eq(bali_utf8_count(checked[_i].bytes, checked[_i].length), checked[_i].count);
}
END_TEST

START_TEST(controls_are_known) {
    /* Unicode's Cc, and its Bidi_Control list (recalled from memory: 061C 200E 200F 202A-202E 2066-2069). */
    static const uint32_t controls[] = {0,      9,      10,     13,     27,     31,     127,    128,    0x9B,   159,
                                        0x61C,  0x200E, 0x200F, 0x2028, 0x2029, 0x202A, 0x202E, 0x2066, 0x2069, 0xFEFF};
    static const uint32_t others[] = {32, 'a', 126, 160, 0xE9, 0x61B, 0x200D, 0x2010, 0x202F, 0x2065, 0x206A, 0xFFFD, 0x1F600};
    for (size_t i = 0; i < sizeof controls / sizeof controls[0]; i++)
        ck_assert_msg(bali_is_control(controls[i]), "U+%04X", (unsigned)controls[i]);
    for (size_t i = 0; i < sizeof others / sizeof others[0]; i++)
        ck_assert_msg(!bali_is_control(others[i]), "U+%04X", (unsigned)others[i]);
}
END_TEST

static Suite *suite(void) {
    Suite *suite = suite_create("text");
    TCase *tests = tcase_create("text");
    tcase_add_test(tests, text_grows);
    tcase_add_test(tests, adding_nothing_is_fine);
    tcase_add_test(tests, no_memory_is_remembered);
    tcase_add_loop_test(tests, pads_to_a_column, 0, (int)(sizeof pads / sizeof pads[0]));
    tcase_add_test(tests, shows_what_may_be_shown);
    tcase_add_test(tests, every_character_decodes);
    tcase_add_test(tests, every_pair_of_bytes_is_judged);
    tcase_add_loop_test(tests, finds_the_first_bad_byte, 0, (int)(sizeof checked / sizeof checked[0]));
    tcase_add_test(tests, controls_are_known);
    suite_add_tcase(suite, tests);
    return suite;
}

int main(void) {
    return run_suite(suite());
}
