#include "ballast/tally.h"

#include "model/cells.h"
#include "support/fixtures.h"

#include <stdlib.h>
#include <string.h>

enum { RECORDS = 500 };

typedef struct given {
    bal_network *network;
    int *codes;
    size_t n;
} given;

static void set_up(given *g, int seed, double missing) {
    dice d = dice_of(seed);
    g->network = random_network(&d, 7, 1, 4, 3);
    g->n = bal_network_variables(g->network);
    bal_cells *tables = random_tables(&d, g->network, 0.2);
    g->codes = random_codes(&d, tables, RECORDS, missing);
    bal_cells_free(tables);
}

static void tear_down(given *g) {
    free(g->codes);
    bal_network_free(g->network);
}

static bal_cells *tally(const given *g, const int *codes, size_t n_records, size_t block_records) {
    bal_source *source = source_of(bal_network_domain(g->network),
                                   &(fixture_table){.codes = codes, .n_records = n_records, .block_records = block_records});
    bal_cells *counts = NULL;
    bal_error err = {0};
    ck_assert_msg(bal_tally(g->network, source, &counts, &err) == BAL_OK, "%s", err.message);
    bal_source_free(source);
    return counts;
}

static bool same(const bal_cells *a, const bal_cells *b) {
    size_t n = bal_network_cells(bal_cells_network(a));
    return n == bal_network_cells(bal_cells_network(b)) &&
           memcmp(bali_cells_values(a), bali_cells_values(b), n * sizeof(double)) == 0;
}

START_TEST(counts_are_those_of_the_slow_way) {
    static const size_t block_records[] = {1, 7, 499, 500, 4096};
    given g;
    set_up(&g, _i, _i % 2 ? 0.1 : 0);
    bal_cells *expected = counts_of(g.network, g.codes, RECORDS);
    for (size_t b = 0; b < sizeof block_records / sizeof block_records[0]; b++) {
        bal_cells *counts = tally(&g, g.codes, RECORDS, block_records[b]);
        ck_assert_msg(same(counts, expected), "seed %d, blocks of %zu", _i, block_records[b]);
        bal_cells_free(counts);
    }
    bal_cells_free(expected);
    tear_down(&g);
}
END_TEST

START_TEST(the_order_of_records_does_not_matter) {
    given g;
    set_up(&g, _i, 0.05);
    bal_cells *counts = tally(&g, g.codes, RECORDS, 0);
    int *reversed = malloc(RECORDS * g.n * sizeof *reversed);
    ck_assert_ptr_nonnull(reversed);
    for (size_t i = 0; i < RECORDS; i++) memcpy(reversed + i * g.n, g.codes + (RECORDS - 1 - i) * g.n, g.n * sizeof *reversed);
    bal_cells *backwards = tally(&g, reversed, RECORDS, 0);
    ck_assert(same(counts, backwards));
    free(reversed);
    bal_cells_free(backwards);
    bal_cells_free(counts);
    tear_down(&g);
}
END_TEST

START_TEST(tallies_of_parts_add_up) {
    given g;
    set_up(&g, _i, 0.05);
    dice d = dice_of(_i + 1000);
    bal_cells *all = tally(&g, g.codes, RECORDS, 0), *sum = equal_cells(g.network, 0);
    for (size_t from = 0; from < RECORDS;) {
        size_t n = 1 + roll(&d, RECORDS - from);
        bal_cells *part = tally(&g, g.codes + from * g.n, n, 0);
        bali_cells_add(sum, part);
        bal_cells_free(part);
        from += n;
    }
    ck_assert(same(sum, all));
    bal_cells_free(sum);
    bal_cells_free(all);
    tear_down(&g);
}
END_TEST

START_TEST(codes_of_two_bytes_count_too) {
    bal_network *network = network_of("A:#400 ; B:#2 | A");
    const int codes[] = {254, 0, 255, 1, 399, 1, 399, 1};
    bal_source *source = plain_source(network, codes, 4);
    bal_cells *counts;
    ck_assert_int_eq(bal_tally(network, source, &counts, NULL), BAL_OK);
    ck_assert_double_eq(bal_cells_family(counts, 0)[254], 1);
    ck_assert_double_eq(bal_cells_family(counts, 0)[255], 1);
    ck_assert_double_eq(bal_cells_family(counts, 1)[2 * 399 + 1], 2);
    ck_assert_double_eq(bal_tally_records(counts), 4);
    bal_cells_free(counts);
    bal_source_free(source);
    bal_network_free(network);
}
END_TEST

START_TEST(a_tally_starts_where_the_source_stands) {
    bal_network *network = network_of("A:#2");
    const int codes[] = {0, 0, 1};
    bal_source *source =
        source_of(bal_network_domain(network), &(fixture_table){.codes = codes, .n_records = 3, .block_records = 1});
    bal_block block;
    bal_cells *counts;
    ck_assert_int_eq(bal_source_next(source, &block, NULL), BAL_OK);
    ck_assert_int_eq(bal_tally(network, source, &counts, NULL), BAL_OK);
    ck_assert_double_eq(bal_cells_family(counts, 0)[0], 1);
    ck_assert_double_eq(bal_cells_family(counts, 0)[1], 1);
    bal_cells_free(counts);
    bal_source_free(source);
    bal_network_free(network);
}
END_TEST

START_TEST(records_are_those_of_the_first_family) {
    bal_network *network = network_of("A:#2 | B ; B:#2");
    const int codes[] = {0, 0, 1, 1, 1, -1, -1, 0, 1, 0};
    bal_cells *counts = counts_of(network, codes, 5);
    ck_assert_double_eq(bal_tally_records(counts), 3);
    bal_cells_free(counts);
    bal_network_free(network);
}
END_TEST

START_TEST(records_of_other_variables_are_refused) {
    bal_network *network = network_of("A:#2 ; B:#2"), *same_domain = network_of("A:#2 ; B:#2 | A"),
                *other = network_of("A:#2 ; B:#3");
    const int codes[] = {0, 1};
    bal_source *source = plain_source(same_domain, codes, 1), *wrong = plain_source(other, codes, 1);
    bal_cells *counts = equal_cells(network, 0), *first = counts;
    bal_error err = {0};
    ck_assert_int_eq(bal_tally(network, wrong, &counts, &err), BAL_ERR_ARGUMENT);
    ck_assert_ptr_null(counts);
    ck_assert_str_eq(err.code, "other-network");
    ck_assert_int_eq(bal_tally(network, source, &counts, NULL), BAL_OK); /* equal is enough */
    bal_cells_free(counts);
    bal_cells_free(first);
    bal_source_free(source);
    bal_source_free(wrong);
    bal_network_free(network);
    bal_network_free(same_domain);
    bal_network_free(other);
}
END_TEST

START_TEST(what_the_source_meets_ends_the_tally) {
    given g;
    set_up(&g, 1, 0);
    bal_source *source =
        source_of(bal_network_domain(g.network),
                  &(fixture_table){.codes = g.codes, .n_records = RECORDS, .block_records = 100, .fail_at = 3});
    bal_cells *counts = (bal_cells *)source;
    bal_error err = {0};
    ck_assert_int_eq(bal_tally(g.network, source, &counts, &err), BAL_ERR_IO);
    ck_assert_ptr_null(counts);
    ck_assert_str_eq(err.code, "cannot-read");
    bal_source_free(source);
    tear_down(&g);
}
END_TEST

static bal_status tally_and_free(void *context, bal_error *err) {
    const given *g = context;
    bal_source *source = plain_source(g->network, g->codes, RECORDS);
    bal_cells *counts = (bal_cells *)source;
    bal_status status = bal_tally(g->network, source, &counts, err);
    if (status != BAL_OK) ck_assert_ptr_null(counts);
    bal_cells_free(counts);
    bal_source_free(source);
    return status;
}

START_TEST(a_tally_survives_failing_allocations) {
    given g;
    set_up(&g, 1, 0);
    ck_assert_uint_eq(survive_allocations(tally_and_free, &g), 4);
    tear_down(&g);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("tally");
    TCase *c = tcase_create("tally");
    tcase_add_loop_test(c, counts_are_those_of_the_slow_way, 1, 21);
    tcase_add_loop_test(c, the_order_of_records_does_not_matter, 1, 6);
    tcase_add_loop_test(c, tallies_of_parts_add_up, 1, 11);
    tcase_add_test(c, codes_of_two_bytes_count_too);
    tcase_add_test(c, a_tally_starts_where_the_source_stands);
    tcase_add_test(c, records_are_those_of_the_first_family);
    tcase_add_test(c, records_of_other_variables_are_refused);
    tcase_add_test(c, what_the_source_meets_ends_the_tally);
    tcase_add_test(c, a_tally_survives_failing_allocations);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
