#include "report/facts.h"

#include "base/memory.h"
#include "support/fixtures.h"

#include <stdio.h>
#include <string.h>

/* Rows with 0, 1, 4, 5 and 100 records; A has one row of 110. */
static const char *const structure = "A:a,b,c,d,e ; B:x,y | A";
static const double some_counts[] = {0, 1, 4, 5, 100, /**/ 0, 0, 0, 1, 2, 2, 5, 0, 60, 40};

START_TEST(rows_are_counted_by_what_they_rest_on) {
    bal_network *network = network_of(structure);
    bal_cells *counts = cells_of(network, some_counts), *none = equal_cells(network, 0);
    bali_row_counts rows = bali_count_rows(counts);
    ck_assert(rows.rows == 6 && rows.prior == 1 && rows.few == 2 && rows.data == 3);
    rows = bali_count_rows(none);
    ck_assert(rows.rows == 6 && rows.prior == 6 && rows.few == 0 && rows.data == 0);
    bal_cells_free(counts);
    bal_cells_free(none);
    bal_network_free(network);
}
END_TEST

START_TEST(rows_are_listed_in_order) {
    bal_network *network = network_of(structure);
    bal_cells *counts = cells_of(network, some_counts);
    bali_row list[4];
    memset(list, 0x55, sizeof list);
    ck_assert_uint_eq(bali_list_rows(counts, BAL_BASIS_FEW, list, 4), 2);
    ck_assert(list[0].variable == 1 && list[0].row == 1 && list[0].records == 1);
    ck_assert(list[1].variable == 1 && list[1].row == 2 && list[1].records == 4);
    memset(list, 0x55, sizeof list);
    ck_assert_uint_eq(bali_list_rows(counts, BAL_BASIS_DATA, list, 1), 3); /* more than there is room for */
    ck_assert(list[0].variable == 0 && list[0].row == 0 && list[0].records == 110);
    ck_assert_uint_eq(list[1].variable, 0x5555555555555555u);
    ck_assert_uint_eq(bali_list_rows(counts, BAL_BASIS_PRIOR, NULL, 0), 1);
    bal_cells_free(counts);
    bal_network_free(network);
}
END_TEST

/* Thin rows have records, and pseudo-counts that sum to less than 1; exactly 1 is not less. */
START_TEST(thin_rows_meet_records_with_little_prior) {
    bal_network *network = network_of(structure);
    bal_cells *counts = cells_of(network, some_counts);
    static const double pseudo_counts[] = {0.25, 0.25, 0.25, 0.125, 0.0625, /**/ 0.1, 0.1, 0.1, 0.1, 0.5, 0.5, 0.5, 0.25, 2, 2};
    bal_cells *alpha = cells_of(network, pseudo_counts);
    bal_fit fit = {.counts = counts, .pseudo_counts = alpha};
    bali_row list[4];
    ck_assert_uint_eq(bali_list_thin_rows(&fit, list, 4), 3);
    ck_assert(list[0].variable == 0 && list[0].row == 0 && list[0].records == 110);
    ck_assert(list[1].variable == 1 && list[1].row == 1 && list[2].row == 3 && list[2].records == 5);
    memset(list, 0x55, sizeof list);
    ck_assert_uint_eq(bali_list_thin_rows(&fit, list, 1), 3);
    ck_assert_uint_eq(list[1].variable, 0x5555555555555555u);
    bal_cells_free(counts);
    bal_cells_free(alpha);
    bal_network_free(network);
}
END_TEST

/* \xC3\xA9 is an e with an acute accent. */
static const struct {
    const char *network;
    size_t variable, row, width;
    const char *name;
} names[] = {
    {"Fever:no,yes", 0, 0, 60, "Fever"},
    {"Fever:no,yes ; Cough:no,yes | Fever", 1, 1, 60, "Cough | Fever=yes"},
    {"A:x,y ; B:p,q ; C:m,n | B,A", 2, 1, 60, "C | B=p, A=y"},
    {"Fever:no,yes ; Cough:no,yes | Fever", 1, 1, 17, "Cough | Fever=yes"},
    {"Fever:no,yes ; Cough:no,yes | Fever", 1, 1, 16, "Cough | Fever..."},
    {"Fever:no,yes ; Cough:no,yes | Fever", 1, 1, 4, "C..."},
    {"Fever:no,yes ; Cough:no,yes | Fever", 1, 1, 3, "..."},
    {"\xC3\xA9\xC3\xA9\xC3\xA9\xC3\xA9\xC3\xA9\xC3\xA9:no,yes", 0, 0, 6, "\xC3\xA9\xC3\xA9\xC3\xA9\xC3\xA9\xC3\xA9\xC3\xA9"},
    {"\xC3\xA9\xC3\xA9\xC3\xA9\xC3\xA9\xC3\xA9\xC3\xA9:no,yes", 0, 0, 5, "\xC3\xA9\xC3\xA9..."},
};

START_TEST(a_row_name_fits_its_width) {
    bal_network *network = network_of(names[_i].network);
    bali_text text = {0};
    bali_text_puts(&text, "> ");
    bali_put_row_name(&text, network, names[_i].variable, names[_i].row, names[_i].width);
    ck_assert_str_eq(bali_text_string(&text) + 2, names[_i].name);
    bali_text_free(&text);
    bal_network_free(network);
}
END_TEST

/* Names as long as they may be, of as many parents as fit: the work grows with the text, not with its square. */
START_TEST(a_long_row_name_is_cut_too) {
    char network_text[40 * 300], *at = network_text;
    for (size_t v = 0; v < 20; v++) at += sprintf(at, "%s%c%0*d:no,yes", v ? ";" : "", (int)('a' + v), 253, 0);
    at += sprintf(at, "|");
    for (size_t v = 0; v < 19; v++) at += sprintf(at, "%s%c%0*d", v ? "," : "", (int)('a' + v), 253, 0);
    bal_network *network = network_of(network_text);
    bali_text text = {0};
    for (size_t row = 0; row < 100; row++) {
        bali_text_clear(&text);
        bali_put_row_name(&text, network, 19, row, 60);
        ck_assert_uint_eq(text.length, 60);
        ck_assert_str_eq(bali_text_string(&text) + 57, "...");
    }
    bali_text_free(&text);
    bal_network_free(network);
}
END_TEST

START_TEST(a_name_without_memory_is_remembered) {
    bal_network *network = network_of(names[1].network);
    bool failed = true;
    for (size_t n = 1; failed; n++) {
        bali_text text = {0};
        bali_memory_fail_at(n);
        bali_put_row_name(&text, network, 1, 1, 60);
        bali_memory_fail_at(0);
        failed = text.failed;
        if (!failed) ck_assert_str_eq(bali_text_string(&text), "Cough | Fever=yes");
        ck_assert(failed || n > 2);
        bali_text_free(&text);
    }
    bal_network_free(network);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("rows");
    TCase *c = tcase_create("rows");
    tcase_add_test(c, rows_are_counted_by_what_they_rest_on);
    tcase_add_test(c, rows_are_listed_in_order);
    tcase_add_test(c, thin_rows_meet_records_with_little_prior);
    tcase_add_loop_test(c, a_row_name_fits_its_width, 0, sizeof names / sizeof names[0]);
    tcase_add_test(c, a_long_row_name_is_cut_too);
    tcase_add_test(c, a_name_without_memory_is_remembered);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
