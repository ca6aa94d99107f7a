/* Bytes into clean text: what is refused and where, and the encodings that are read. */
#include "support/hearing.h"

#include <string.h>

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
        {LITERAL("\xFF\xFE<\0B\0"), "encoding",
         "UTF-16LE text; save it as UTF-8 (iconv -f UTF-16LE -t UTF-8 FILE > NEW)"},
        {LITERAL("\xFE\xFF\0<\0B"), "encoding", "UTF-16BE text"},
        {LITERAL("<\0?\0x\0"), "encoding", "UTF-16LE text"},
        {LITERAL("\0<\0?\0x"), "encoding", "UTF-16BE text"},
        {LITERAL("\xFF\xFE\0\0<\0\0\0"), "encoding", "UTF-32LE text"},
        {LITERAL("\0\0\xFE\xFF\0\0\0<"), "encoding", "UTF-32BE text"},
        {LITERAL("<\0\0\0?\0\0\0"), "encoding", "UTF-32LE text"},
        {LITERAL("\0\0\0<\0\0\0?"), "encoding", "UTF-32BE text"},
        {LITERAL("<?xml version='1.0' encoding='UTF-16'?><BIF/>"), "encoding",
         "declares the encoding UTF-16, which its bytes are not; save it as UTF-8"},
        {LITERAL("<?xml version='1.0' encoding='KOI8-R'?><BIF/>"), "encoding",
         "KOI8-R is not read; save it as UTF-8 (iconv -f KOI8-R"},
        {LITERAL("<?xml version='1.0' encoding='UTF-7'?><BIF/>"), "encoding", "UTF-7 is not read; save it as UTF-8"},
        {LITERAL("<?xml version='1.0' encoding='$(x)'?><BIF/>"), "encoding",
         "\"$(x)\" is not read; save it as UTF-8 (with iconv)"},
        {LITERAL("<?xml version='1.0' encoding='ISO-8859-99'?><BIF/>"), "encoding", "ISO-8859-99 is not read"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++)
        expect_unheard(cases[i].bytes, cases[i].length, 1, 1, cases[i].code, cases[i].words);
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
        {LITERAL("<?xml version='1.0' encoding='US-ASCII'?>\n<BIF>\xC3\xA9</BIF>"), 2, 6, "bad-encoding",
         "byte 0xC3 is not US-ASCII"},
        {LITERAL("<?xml version='1.0' encoding='windows-1252'?>\n<BIF>a\x81</BIF>"), 2, 7, "bad-encoding",
         "byte 0x81 does not exist in windows-1252"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++)
        expect_unheard(cases[i].bytes, cases[i].length, cases[i].line, cases[i].column, cases[i].code, cases[i].words);
}
END_TEST

/* The letters are those of the code charts: ISO/IEC 8859-1, -7, -15; windows-1252, -1251, -1258 (where an accent
 * follows its letter). */
START_TEST(one_byte_encodings_come_out_as_utf8) {
    static const struct {
        const char *encoding, *bytes, *text;
    } cases[] = {
        {"ISO-8859-1", "\xE9\xFF", "\xC3\xA9\xC3\xBF"},
        {"iso-8859-15", "\xA4", "\xE2\x82\xAC"},
        {"ISO-8859-7", "\xE1", "\xCE\xB1"},
        {"windows-1252", "\x80\x92", "\xE2\x82\xAC\xE2\x80\x99"},
        {"Windows-1251", "\xC0", "\xD0\x90"},
        {"windows-1258", "e\xEC", "\xC3\xA9"},
        {"UTF-8", "\xC3\xA9", "\xC3\xA9"},
        {"utf8", "\xF0\x9F\x98\x80", "\xF0\x9F\x98\x80"},
        {"us-ascii", "e", "e"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        bali_text bytes = {0}, expected = {0};
        bali_text_printf(&bytes, "<?xml version='1.0' encoding = \"%s\" ?>\r<BIF>%s</BIF>", cases[i].encoding,
                         cases[i].bytes);
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

static Suite *suite(void) {
    Suite *s = suite_create("xml decode");
    TCase *t = tcase_create("xml decode");
    tcase_set_timeout(t, 60);
    tcase_add_test(t, other_kinds_of_file_are_refused_by_name);
    tcase_add_test(t, bytes_that_are_no_text_are_refused_at_their_place);
    tcase_add_test(t, one_byte_encodings_come_out_as_utf8);
    tcase_add_test(t, a_long_text_of_one_byte_characters_is_converted_whole);
    suite_add_tcase(s, t);
    return s;
}

int main(void) {
    return run_suite(suite());
}
