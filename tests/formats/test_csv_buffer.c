#include "base/memory.h"
#include "base/text.h"
#include "formats/csv.h"
#include "support/harness.h"

#include <string.h>

START_TEST(a_cell_may_have_a_mebibyte) {
    static const struct {
        size_t length;
        bool quoted;
        const char *code;
    } cases[] = {
        {BALI_CSV_CELL_LIMIT, false, NULL},          {BALI_CSV_CELL_LIMIT + 1, false, "cell-too-long"},
        {BALI_CSV_CELL_LIMIT, true, NULL},           {BALI_CSV_CELL_LIMIT + 1, true, "unclosed-quote"},
        {3 * BALI_CSV_CELL_LIMIT, false, "cell-too-long"}, {3 * BALI_CSV_CELL_LIMIT, true, "unclosed-quote"},
    };
    /* Some end just before, in and behind the closing quote. */
    static const size_t chunks[] = {0, 4096, BALI_CSV_CELL_LIMIT - 1, BALI_CSV_CELL_LIMIT + 6, BALI_CSV_CELL_LIMIT + 7,
                                    BALI_CSV_CELL_LIMIT + 8, 5 * BALI_CSV_CELL_LIMIT};
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        bali_text text = {0};
        bali_text_puts(&text, cases[i].quoted ? "a,b\nx,\"" : "a,b\nx,");
        for (size_t n = 0; n < cases[i].length; n++) bali_text_putc(&text, n % 2 ? 'y' : cases[i].quoted ? '\n' : ',' + 1);
        bali_text_puts(&text, cases[i].quoted ? "\"\n" : "\n");
        const char *path = scratch_file("long.csv", text.bytes, text.length);
        for (size_t c = 0; c < sizeof chunks / sizeof chunks[0]; c++) {
            bali_csv_options options = {.chunk_bytes = chunks[c]};
            bali_csv *csv = NULL;
            bali_csv_cell cell;
            bal_error err = {0};
            ck_assert_int_eq(bali_csv_open(path, &options, &csv, &err), BAL_OK);
            for (int k = 0; k < 3; k++) ck_assert_int_eq(bali_csv_next(csv, &cell, &err), BAL_OK);
            bal_status status = bali_csv_next(csv, &cell, &err);
            if (cases[i].code) {
                ck_assert_int_eq(status, BAL_ERR_SYNTAX);
                ck_assert_str_eq(err.code, cases[i].code);
                ck_assert_uint_eq(err.line, 2);
                ck_assert_uint_eq(err.column, 3);
            } else {
                ck_assert_int_eq(status, BAL_OK);
                ck_assert_uint_eq(cell.length, cases[i].length);
                ck_assert(cell.ends_record);
            }
            bali_csv_close(csv);
        }
        bali_text_free(&text);
    }
}
END_TEST

/* Columns stay right where the line's start left the buffer long ago. */
START_TEST(columns_are_counted_over_many_reads) {
    enum { CELLS = 3000 };
    bali_text text = {0};
    for (int i = 0; i < CELLS; i++) bali_text_printf(&text, "%s\xC3\xA9%d", i ? "," : "", i % 10);
    bali_text_puts(&text, "\n\"p\nq\",r\n");
    bali_csv_options options = {.chunk_bytes = 64};
    bali_csv *csv = NULL;
    bali_csv_cell cell;
    size_t line, column;
    ck_assert_int_eq(bali_csv_open(scratch_file("wide.csv", text.bytes, text.length), &options, &csv, NULL), BAL_OK);
    for (size_t i = 0; i < CELLS; i++) {
        ck_assert_int_eq(bali_csv_next(csv, &cell, NULL), BAL_OK);
        if (i % 7 != 0) continue; /* asking or not changes nothing */
        bali_csv_place(csv, &line, &column);
        ck_assert_uint_eq(line, 1);
        ck_assert_uint_eq(column, 3 * i + 1);
    }
    ck_assert(cell.ends_record);
    for (size_t i = 0; i < 2; i++) {
        ck_assert_int_eq(bali_csv_next(csv, &cell, NULL), BAL_OK);
        bali_csv_place(csv, &line, &column);
        ck_assert_uint_eq(line, 2 + i);
        ck_assert_uint_eq(column, i ? 4 : 1);
    }
    bali_csv_close(csv);
    bali_text_free(&text);
}
END_TEST

START_TEST(a_file_is_read_again_and_hashed_once) {
    /* The digest is the first example of FIPS 180-4: SHA-256 of "abc". */
    static const char digest[] = "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad";
    bali_csv_options options = {.chunk_bytes = 2};
    bali_csv *csv = NULL;
    bali_csv_cell cell;
    bal_file_facts facts;
    ck_assert_int_eq(bali_csv_open(scratch_file("facts.csv", "abc", 3), &options, &csv, NULL), BAL_OK);
    ck_assert(bali_csv_can_rewind(csv));
    ck_assert_int_eq(bali_csv_rewind(csv, NULL), BAL_OK); /* before the end: the hash starts anew */
    for (int pass = 0; pass < 3; pass++) {
        ck_assert_int_eq(bali_csv_next(csv, &cell, NULL), BAL_OK);
        ck_assert(cell.length == 3 && memcmp(cell.text, "abc", 3) == 0 && cell.ends_record);
        ck_assert_int_eq(bali_csv_next(csv, &cell, NULL), BAL_OK);
        ck_assert_ptr_null(cell.text);
        ck_assert_int_eq(bali_csv_next(csv, &cell, NULL), BAL_OK);
        ck_assert_ptr_null(cell.text);
        bali_csv_facts(csv, &facts);
        ck_assert_str_eq(facts.name, "facts.csv");
        ck_assert_uint_eq(facts.bytes, 3);
        ck_assert_str_eq(facts.sha256, digest);
        ck_assert_int_eq(bali_csv_rewind(csv, NULL), BAL_OK);
    }
    bali_csv_close(csv);
}
END_TEST

START_TEST(a_pass_that_was_left_is_not_hashed) {
    bali_text text = {0};
    for (int i = 0; i < 500; i++) bali_text_printf(&text, "line,%d\n", i);
    const char *path = scratch_file("left.csv", text.bytes, text.length);
    bal_file_facts facts[2];
    for (int left = 0; left < 2; left++) {
        bali_csv_options options = {.chunk_bytes = 100};
        bali_csv *csv = NULL;
        bali_csv_cell cell = {.text = ""};
        ck_assert_int_eq(bali_csv_open(path, &options, &csv, NULL), BAL_OK);
        for (int i = 0; left && i < 300; i++) ck_assert_int_eq(bali_csv_next(csv, &cell, NULL), BAL_OK);
        if (left) ck_assert_int_eq(bali_csv_rewind(csv, NULL), BAL_OK);
        while (cell.text) ck_assert_int_eq(bali_csv_next(csv, &cell, NULL), BAL_OK);
        bali_csv_facts(csv, &facts[left]);
        bali_csv_close(csv);
    }
    ck_assert_uint_eq(strlen(facts[0].sha256), 64);
    ck_assert_str_eq(facts[0].sha256, facts[1].sha256);
    ck_assert_uint_eq(facts[1].bytes, text.length);
    bali_text_free(&text);
}
END_TEST

START_TEST(large_files_are_not_hashed) {
    for (size_t over = 0; over < 2; over++) {
        size_t length = ((size_t)8 << 20) + over;
        char *bytes = bali_allocate(length, 1);
        memset(bytes, 'x', length);
        for (size_t i = 99; i < length; i += 100) bytes[i] = '\n';
        bali_csv_options options = {0};
        bali_csv *csv = NULL;
        bali_csv_cell cell = {.text = ""};
        bal_file_facts facts;
        ck_assert_int_eq(bali_csv_open(scratch_file("large.csv", bytes, length), &options, &csv, NULL), BAL_OK);
        while (cell.text) ck_assert_int_eq(bali_csv_next(csv, &cell, NULL), BAL_OK);
        bali_csv_facts(csv, &facts);
        ck_assert_uint_eq(facts.bytes, length);
        ck_assert_uint_eq(strlen(facts.sha256), over ? 0 : 64);
        bali_csv_close(csv);
        bali_free(bytes);
    }
}
END_TEST

static Suite *suite(void) {
    Suite *suite = suite_create("csv_buffer");
    TCase *tests = tcase_create("csv_buffer");
    tcase_add_test(tests, a_cell_may_have_a_mebibyte);
    tcase_add_test(tests, columns_are_counted_over_many_reads);
    tcase_add_test(tests, a_file_is_read_again_and_hashed_once);
    tcase_add_test(tests, a_pass_that_was_left_is_not_hashed);
    tcase_add_test(tests, large_files_are_not_hashed);
    tcase_set_timeout(tests, 60);
    suite_add_tcase(suite, tests);
    return suite;
}

int main(void) {
    return run_suite(suite());
}
