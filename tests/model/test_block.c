#include "model/block.h"

#include "support/fixtures.h"

#include <string.h>

START_TEST(codes_are_read_at_both_widths) {
    const uint8_t bytes[] = {0, 254, 255};
    const uint16_t words[] = {0, 255, 65534, 65535};
    const void *columns[] = {bytes};
    bal_block block = {.n_records = 3, .n_columns = 1, .width = 1, .columns = columns};
    ck_assert_uint_eq(bal_block_code(&block, 0, 0), 0);
    ck_assert_uint_eq(bal_block_code(&block, 0, 1), 254);
    ck_assert_uint_eq(bal_block_code(&block, 0, 2), BAL_NONE);
    columns[0] = words;
    block.width = 2;
    ck_assert_uint_eq(bal_block_code(&block, 0, 1), 255);
    ck_assert_uint_eq(bal_block_code(&block, 0, 2), 65534);
    ck_assert_uint_eq(bal_block_code(&block, 0, 3), BAL_NONE);
}
END_TEST

START_TEST(places_follow_the_first_or_are_given) {
    const uint64_t places[] = {7, 9, 12};
    bal_block block = {.n_records = 3, .first_record = 100};
    ck_assert_uint_eq(bal_block_place(&block, 2), 102);
    block.places = places;
    ck_assert_uint_eq(bal_block_place(&block, 2), 12);
}
END_TEST

static const struct {
    const char *text;
    unsigned width;
} widths[] = {{"A:a,b", 1}, {"A:#254", 1}, {"A:#255", 2}, {"A:a,b ; B:#255", 2}, {"A:#256 ; B:a", 2}};

START_TEST(two_bytes_a_code_from_255_outcomes) {
    bal_network *n = network_of(widths[_i].text);
    ck_assert_uint_eq(bali_code_width(bal_network_domain(n)), widths[_i].width);
    bal_network_free(n);
}
END_TEST

START_TEST(a_source_ends_with_an_empty_block_that_stays) {
    bal_network *n = network_of("A:a,b ; B:a,b,c");
    const int codes[] = {0, 1, 1, 2, -1, 0};
    bal_source *source = source_of(bal_network_domain(n), &(fixture_table){.codes = codes, .n_records = 3, .block_records = 2});
    bal_network_free(n); /* the source holds the domain */
    ck_assert_uint_eq(bal_domain_variables(bal_source_domain(source)), 2);
    const size_t sizes[] = {2, 1, 0, 0};
    for (size_t b = 0; b < 4; b++) {
        bal_block block = {.n_records = 99};
        ck_assert_int_eq(bal_source_next(source, &block, NULL), BAL_OK);
        ck_assert_uint_eq(block.n_records, sizes[b]);
    }
    ck_assert_int_eq(bal_source_rewind(source, NULL), BAL_OK);
    bal_block block;
    ck_assert_int_eq(bal_source_next(source, &block, NULL), BAL_OK);
    ck_assert_uint_eq(bal_block_code(&block, 1, 1), 2);
    bal_source_free(source);
    bal_source_free(NULL);
}
END_TEST

START_TEST(a_failing_source_hands_out_an_empty_block) {
    bal_network *n = network_of("A:a,b");
    const int codes[] = {0};
    bal_source *source = source_of(bal_network_domain(n), &(fixture_table){.codes = codes, .n_records = 1, .fail_at = 1});
    bal_block block = {.n_records = 99, .n_columns = 7};
    bal_error err = {0};
    ck_assert_int_eq(bal_source_next(source, &block, &err), BAL_ERR_IO);
    ck_assert_uint_eq(block.n_records, 0);
    ck_assert_uint_eq(block.n_columns, 0);
    bal_source_free(source);
    bal_network_free(n);
}
END_TEST

START_TEST(a_place_becomes_a_record_for_people) {
    bal_network *n = network_of("A:a,b");
    bal_source *source = plain_source(n, (const int[]){0}, 1);
    bal_error err = {0};
    bal_source_locate(source, 41, &err);
    ck_assert_str_eq(err.file, "fixture.csv");
    ck_assert_uint_eq(err.line, 43);
    ck_assert_uint_eq(err.record, 42);
    bal_source_locate(source, 1, &err); /* the first cause wins */
    ck_assert_uint_eq(err.record, 42);
    bal_source_locate(source, 1, NULL);
    bal_source_free(source);
    bal_network_free(n);
}
END_TEST

/* A source that cannot say where, and has nothing to sum up. */
static void free_bare(bal_source *source) {
    (void)source;
}

START_TEST(summary_and_locate_may_be_left_out) {
    bal_network *n = network_of("A:a,b");
    static const bali_source_methods methods = {.free = free_bare};
    bal_source source;
    bali_source_init(&source, &methods, bal_network_domain(n));
    bal_source_summary summary = {.records = 5};
    bal_source_summary_get(&source, &summary);
    ck_assert_uint_eq(summary.records, 0);
    bal_error err = {0};
    bal_source_locate(&source, 0, &err);
    ck_assert_uint_eq(err.record, 1);
    ck_assert_str_eq(err.file, "");
    bal_source_free(&source);
    bal_network_free(n);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("block");
    TCase *c = tcase_create("block");
    tcase_add_test(c, codes_are_read_at_both_widths);
    tcase_add_test(c, places_follow_the_first_or_are_given);
    tcase_add_loop_test(c, two_bytes_a_code_from_255_outcomes, 0, sizeof widths / sizeof widths[0]);
    tcase_add_test(c, a_source_ends_with_an_empty_block_that_stays);
    tcase_add_test(c, a_failing_source_hands_out_an_empty_block);
    tcase_add_test(c, a_place_becomes_a_record_for_people);
    tcase_add_test(c, summary_and_locate_may_be_left_out);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
