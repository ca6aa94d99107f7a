#include "base/csv_writer.h"
#include "base/memory.h"
#include "support/harness.h"

#include <string.h>

/* Source: RFC 4180, section 2, rules 5 to 7; quoting of outer blanks and of empty cells is ours, since a reader here trims unquoted
 * cells and takes an empty one for missing. */
static const struct {
    const char *cell;
    char delimiter;
    const char *written;
} cells[] = {
    {"plain", ',', "plain"},
    {"two words", ',', "two words"},
    {"a,b", ',', "\"a,b\""},
    {"a,b", ';', "a,b"},
    {"a;b", ';', "\"a;b\""},
    {"a\tb", '\t', "\"a\tb\""},
    {"a\tb", ',', "a\tb"},
    {"say \"yes\"", ',', "\"say \"\"yes\"\"\""},
    {"\"", ',', "\"\"\"\""},
    {"\"\"", ',', "\"\"\"\"\"\""},
    {"line\nbreak", ',', "\"line\nbreak\""},
    {"carriage\rreturn", ',', "\"carriage\rreturn\""},
    {"", ',', "\"\""},
    {" ", ',', "\" \""},
    {" before", ',', "\" before\""},
    {"behind\t", ',', "\"behind\t\""},
    {"=1+1", ',', "=1+1"}, /* a table for programs: nothing is changed */
    {"\xC3\xA9", ',', "\xC3\xA9"},
};

START_TEST(cells_are_quoted_where_they_must_be) {
    bali_text text = {0};
    bali_csv_put(&text, cells[_i].cell, strlen(cells[_i].cell), cells[_i].delimiter);
    ck_assert_str_eq(bali_text_string(&text), cells[_i].written);
    bali_text_free(&text);
}
END_TEST

/* The slow twin: reads one cell by RFC 4180, trimming an unquoted one. */
static void read_back(const char *written, size_t length, char *cell, size_t *cell_length) {
    size_t n = 0;
    if (length > 0 && written[0] == '"') {
        for (size_t i = 1; i < length - 1; i++) {
            if (written[i] == '"') ck_assert_int_eq(written[++i], '"');
            cell[n++] = written[i];
        }
        ck_assert_int_eq(written[length - 1], '"');
    } else {
        while (length > 0 && (written[0] == ' ' || written[0] == '\t')) written++, length--;
        while (length > 0 && (written[length - 1] == ' ' || written[length - 1] == '\t')) length--;
        for (; n < length; n++) {
            ck_assert(!strchr(",\"\r\n", written[n]));
            cell[n] = written[n];
        }
    }
    *cell_length = n;
}

START_TEST(every_short_cell_reads_back) {
    static const char letters[] = "a,\" \n\r\t";
    for (int n = 0; n < 7 * 7 * 7 * 7; n++) {
        char cell[4], back[8];
        size_t length = (size_t)n % 5 < 4 ? (size_t)n % 5 : 4, back_length;
        for (size_t i = 0, rest = (size_t)n; i < 4; i++, rest /= 7) cell[i] = letters[rest % 7];
        bali_text text = {0};
        bali_csv_put(&text, cell, length, ',');
        read_back(bali_text_string(&text), text.length, back, &back_length);
        ck_assert(back_length == length && memcmp(back, cell, length) == 0);
        bali_text_free(&text);
    }
}
END_TEST

static bal_status put(void *context, bal_error *err) {
    (void)context;
    bali_text text = {0};
    for (int i = 0; i < 30; i++) bali_csv_put(&text, "a \"b\"", 5, ',');
    bal_status status = text.failed ? bali_out_of_memory(err) : BAL_OK;
    bali_text_free(&text);
    return status;
}

START_TEST(no_memory_is_remembered) {
    ck_assert_uint_ge(survive_allocations(put, NULL), 3);
}
END_TEST

static Suite *suite(void) {
    Suite *suite = suite_create("csv_writer");
    TCase *tests = tcase_create("csv_writer");
    tcase_add_loop_test(tests, cells_are_quoted_where_they_must_be, 0, (int)(sizeof cells / sizeof cells[0]));
    tcase_add_test(tests, every_short_cell_reads_back);
    tcase_add_test(tests, no_memory_is_remembered);
    suite_add_tcase(suite, tests);
    return suite;
}

int main(void) {
    return run_suite(suite());
}
