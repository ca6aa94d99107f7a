#include "formats/csv.h"
#include "formats/csv_look.h"
#include "support/harness.h"

#include <string.h>

#define BYTES(text) text, sizeof text - 1

START_TEST(the_delimiter_is_guessed_or_given) {
    static const struct {
        const char *name, *text;
        char given, delimiter;
    } cases[] = {
        {"d.csv", "a,b\n", 0, ','},       {"d.csv", "a\tb\n", 0, '\t'}, {"d.tsv", "a,b\n", 0, '\t'},   {"d.TSV", "ab\n", 0, '\t'},
        {"d.csv", "\"a\tb\",c\n", 0, ','}, {"d.csv", "a;b\n", 0, ','},   {"d.csv", "a;b\n", ';', ';'},  {"d.tsv", "a,b\n", ',', ','},
        {"d.csv", "a\nb\tc\n", 0, ','},    {"tsv", "a\n", 0, ','},       {"d.csv", "a|b\n", '|', '|'},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        bali_csv_options options = {.delimiter = cases[i].given};
        bali_csv *csv = NULL;
        size_t length;
        ck_assert_int_eq(bali_csv_open(scratch_file(cases[i].name, cases[i].text, strlen(cases[i].text)), &options, &csv, NULL), BAL_OK);
        ck_assert_msg(bali_csv_delimiter(csv) == cases[i].delimiter, "case %zu", i);
        const char *line = bali_csv_first_line(csv, &length);
        ck_assert_uint_eq(length, strcspn(cases[i].text, "\n"));
        ck_assert(memcmp(line, cases[i].text, length) == 0);
        bali_csv_close(csv);
    }
    static const char wrong[] = "\"\r\n a0\x7F\x80";
    for (size_t i = 0; i < sizeof wrong - 1; i++) {
        bali_csv_options options = {.delimiter = wrong[i]};
        bali_csv *csv = (bali_csv *)1;
        bal_error err = {0};
        ck_assert_int_eq(bali_csv_open("any.csv", &options, &csv, &err), BAL_ERR_ARGUMENT);
        ck_assert_str_eq(err.code, "bad-delimiter");
        ck_assert_ptr_null(csv);
    }
}
END_TEST

START_TEST(what_is_no_table_is_named) {
    static const struct {
        const char *bytes;
        size_t length;
        const char *code, *words;
    } cases[] = {
        /* gzip of the first bytes of gzip, made by zlib */
        {BYTES("\x1F\x8B\x08\x00\x00\x00\x00\x00\x00\x03\x01\x03\x00\xFC\xFF\x1F\x8B\x08\xED\xF4\x97\x3E\x03\x00\x00\x00"),
         "not-a-table", "gunzip"},
        {BYTES("PK\x03\x04\x14\0"), "not-a-table", "spreadsheet"},
        {BYTES("%PDF-1.7\n"), "not-a-table", "PDF"},
        {BYTES("\xD0\xCF\x11\xE0\xA1\xB1\x1A\xE1"), "not-a-table", "spreadsheet"},
        {BYTES("\xFF\xFE" "a\0,\0"), "encoding", "iconv -f UTF-16 -t UTF-8"},
        {BYTES("\xFE\xFF\0a\0,"), "encoding", "iconv -f UTF-16 -t UTF-8"},
        {BYTES("a\0,\0b\0\n\0"), "encoding", "UTF-16LE"},
        {BYTES("\0a\0,\0b\0\n"), "encoding", "UTF-16BE"},
        {BYTES("\xFF\xFE\0\0a\0\0\0"), "encoding", "UTF-32"},
        {BYTES("<?xml version=\"1.0\"?><BIF/>"), "not-a-table", "network"},
        {BYTES("\xEF\xBB\xBF\n <!DOCTYPE html>"), "not-a-table", "HTML"},
        {BYTES("<HTML><body>"), "not-a-table", "HTML"},
        {BYTES("sep=;\na;b\n"), "sep-line", "--delimiter"},
        {BYTES("\xEF\xBB\xBFsep=,\r\na,b\n"), "sep-line", "remove the line"},
        {BYTES("SEP=\t\na\tb\n"), "sep-line", "remove the line"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        bali_csv_options options = {0};
        bali_csv *csv = (bali_csv *)1;
        bal_error err = {0};
        const char *path = scratch_file("odd.csv", cases[i].bytes, cases[i].length);
        ck_assert_msg(bali_csv_open(path, &options, &csv, &err) == BAL_ERR_SYNTAX, "case %zu is taken for a table", i);
        ck_assert_ptr_null(csv);
        ck_assert_str_eq(err.code, cases[i].code);
        ck_assert_ptr_nonnull(bal_code_find(err.code));
        ck_assert_msg(strstr(err.message, cases[i].words) != NULL, "%s", err.message);
        ck_assert_str_eq(err.file, path);
        ck_assert_uint_eq(err.line, 1);
        ck_assert_uint_eq(err.column, 1);
    }
    /* What only resembles them is a table. */
    static const char *const tables[] = {"<5,>=5\n", "sep=\n", "separator\n", "PK\n", "BZh,b\n", "%PDF\n"};
    for (size_t i = 0; i < sizeof tables / sizeof tables[0]; i++) {
        bal_error err = {0};
        ck_assert_msg(bali_csv_look(tables[i], strlen(tables[i]), &err) == BAL_OK, "%s", err.message);
    }
    ck_assert_int_eq(bali_csv_look("a\0b,c\n", 6, NULL), BAL_OK); /* one NUL is refused where it stands */
}
END_TEST

START_TEST(a_line_is_split_outside_quotes) {
    static const struct {
        const char *line;
        const char *pieces[5];
    } cases[] = {
        {"", {""}},
        {"a", {"a"}},
        {"a;b", {"a", "b"}},
        {" a ;\"b;c\"; \"d\" ;", {"a", "b;c", "d", ""}},
        {"\"", {"\""}},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        const char *piece;
        size_t at = 0, length, n = 0;
        while (bali_csv_split(cases[i].line, strlen(cases[i].line), ';', &at, &piece, &length)) {
            ck_assert_ptr_nonnull(cases[i].pieces[n]);
            ck_assert_uint_eq(length, strlen(cases[i].pieces[n]));
            ck_assert(memcmp(piece, cases[i].pieces[n++], length) == 0);
        }
        ck_assert_ptr_null(cases[i].pieces[n]);
    }
}
END_TEST

static Suite *suite(void) {
    Suite *suite = suite_create("csv_look");
    TCase *tests = tcase_create("csv_look");
    tcase_add_test(tests, the_delimiter_is_guessed_or_given);
    tcase_add_test(tests, what_is_no_table_is_named);
    tcase_add_test(tests, a_line_is_split_outside_quotes);
    suite_add_tcase(suite, tests);
    return suite;
}

int main(void) {
    return run_suite(suite());
}
