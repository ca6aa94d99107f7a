#include "model/shape.h"

#include "support/fixtures.h"

#include <string.h>

START_TEST(the_first_parent_runs_slowest) {
    bal_network *n = network_of("A:a0,a1 ; B:b0,b1,b2 ; C:x,y | B,A");
    size_t outcomes[2], row = 0;
    for (size_t b = 0; b < 3; b++)
        for (size_t a = 0; a < 2; a++, row++) {
            ck_assert_uint_eq(bal_network_row(n, 2, (size_t[]){b, a}), row);
            bal_network_configuration(n, 2, row, outcomes);
            ck_assert(outcomes[0] == b && outcomes[1] == a);
        }
    ck_assert_uint_eq(bal_network_row(n, 0, NULL), 0); /* no parent, one row */
    bal_network_free(n);
}
END_TEST

START_TEST(row_and_configuration_are_inverse) {
    dice d = dice_of(_i);
    bal_network *n = random_network(&d, 8, 1, 5, 4);
    for (size_t v = 0; v < bal_network_variables(n); v++)
        for (size_t row = 0; row < bal_network_rows(n, v); row++) {
            size_t outcomes[8], n_parents;
            const size_t *parents = bal_network_parents(n, v, &n_parents);
            bal_network_configuration(n, v, row, outcomes);
            for (size_t p = 0; p < n_parents; p++) ck_assert_uint_lt(outcomes[p], bal_network_outcomes(n, parents[p]));
            ck_assert_msg(bal_network_row(n, v, outcomes) == row, "seed %d, variable %zu, row %zu", _i, v, row);
        }
    bal_network_free(n);
}
END_TEST

START_TEST(a_row_is_named_by_its_parents) {
    bal_network *n = network_of("A:a0,a1 ; B b:b0,b1,b2 ; C:x,y | B b,A");
    bali_text text = {0};
    bali_put_configuration(&text, n, 2, 3);
    ck_assert_str_eq(bali_text_string(&text), "B b=b1, A=a1");
    bali_text_clear(&text);
    bali_put_configuration(&text, n, 0, 0);
    ck_assert_str_eq(bali_text_string(&text), "");
    bali_text_free(&text);

    char buffer[64];
    ck_assert_str_eq(bali_configuration_text(n, 2, 4, buffer, sizeof buffer), "B b=b2, A=a0");
    ck_assert_str_eq(bali_configuration_text(n, 1, 0, buffer, sizeof buffer), "");
    bal_network_free(n);
}
END_TEST

/* Whatever the buffer's size, the text is a prefix of the whole, ends at a character's end, and stays inside. */
START_TEST(a_buffer_is_never_overrun) {
    bal_network *n = network_of("\xC3\x84:\xE2\x82\xAC,a1 ; C:x,y | \xC3\x84"); /* A umlaut = euro sign */
    const char *whole = "\xC3\x84=\xE2\x82\xAC";
    static const size_t kept[] = {0, 0, 0, 2, 3, 3, 3, 6, 6};
    for (size_t size = 1; size <= 8; size++) {
        char buffer[16];
        memset(buffer, '#', sizeof buffer);
        (void)bali_configuration_text(n, 1, 0, buffer, size);
        ck_assert_msg(strlen(buffer) == kept[size] && memcmp(buffer, whole, kept[size]) == 0, "size %zu gives %s", size, buffer);
        for (size_t i = size; i < sizeof buffer; i++) ck_assert_int_eq(buffer[i], '#');
    }
    bal_network_free(n);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("shape");
    TCase *c = tcase_create("shape");
    tcase_add_test(c, the_first_parent_runs_slowest);
    tcase_add_loop_test(c, row_and_configuration_are_inverse, 1, 11);
    tcase_add_test(c, a_row_is_named_by_its_parents);
    tcase_add_test(c, a_buffer_is_never_overrun);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
