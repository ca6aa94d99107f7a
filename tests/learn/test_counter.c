#include "learn/counter.h"

#include "ballast/tally.h"
#include "model/cells.h"
#include "support/fixtures.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { RECORDS = 2000, MOST_CELLS = 4096 };

__extension__ typedef unsigned __int128 wide;

typedef struct given {
    bal_network *network;
    int *codes;
    double weights[RECORDS];
    size_t n;
} given;

/* Weights from 2^-32 up, some of them whole, some large. */
static void set_up(given *g, int seed, bool whole) {
    dice d = dice_of(seed);
    g->network = random_network(&d, 5, 1, 4, 3);
    g->n = bal_network_variables(g->network);
    bal_cells *tables = random_tables(&d, g->network, 0.2);
    g->codes = random_codes(&d, tables, RECORDS, 0.1);
    for (size_t i = 0; i < RECORDS; i++) {
        double fraction = whole || roll(&d, 4) == 0 ? 0 : floor(chance(&d) * 0x1p32) * 0x1p-32;
        g->weights[i] = (double)roll(&d, roll(&d, 10) == 0 ? 1000000 : 3) + fraction;
    }
    bal_cells_free(tables);
}

static void tear_down(given *g) {
    free(g->codes);
    bal_network_free(g->network);
}

static bal_source *part_of(const given *g, size_t from, size_t n, size_t block_records) {
    fixture_table table = {.codes = g->codes + from * g->n, .n_records = n, .block_records = block_records, .weighted = true,
                           .weights = g->weights + from};
    return source_of(bal_network_domain(g->network), &table);
}

/* The slow way, in integers of 128 bits: units of 2^-32. The compiler's conversion rounds once, as IEEE 754 says. */
static void sum_up(const given *g, double *expected) {
    static wide sums[MOST_CELLS];
    ck_assert_uint_le(bal_network_cells(g->network), MOST_CELLS);
    memset(sums, 0, sizeof sums);
    for (size_t i = 0; i < RECORDS; i++)
        for (size_t v = 0; v < g->n; v++) {
            size_t cell = cell_of(g->network, v, g->codes + i * g->n);
            if (cell != BAL_NONE) sums[bal_network_offset(g->network, v) + cell] += (wide)(g->weights[i] * 0x1p32);
        }
    for (size_t c = 0; c < bal_network_cells(g->network); c++) expected[c] = (double)sums[c] * 0x1p-32;
}

static void expect_counts(const given *g, const bal_cells *counts) {
    double expected[MOST_CELLS];
    sum_up(g, expected);
    ck_assert(memcmp(bali_cells_values(counts), expected, bal_network_cells(g->network) * sizeof *expected) == 0);
}

START_TEST(weights_are_summed_exactly) {
    static const size_t block_records[] = {1, 7, 1999, 4096};
    given g;
    set_up(&g, _i, _i % 4 == 0);
    for (size_t b = 0; b < 4; b++) {
        bal_source *source = part_of(&g, 0, RECORDS, block_records[b]);
        bal_cells *counts = NULL;
        ck_assert_int_eq(bal_tally(g.network, source, &counts, NULL), BAL_OK);
        expect_counts(&g, counts);
        bal_cells_free(counts);
        bal_source_free(source);
    }
    tear_down(&g);
}
END_TEST

static void count_part(bali_counter *counter, const given *g, size_t from, size_t n) {
    bal_source *source = part_of(g, from, n, 64);
    bal_block block;
    ck_assert_int_eq(bali_counter_create(counter, g->network, NULL), BAL_OK);
    for (;;) {
        ck_assert_int_eq(bal_source_next(source, &block, NULL), BAL_OK);
        if (block.n_records == 0) break;
        ck_assert_int_eq(bali_counter_add(counter, &block, NULL), BAL_OK);
    }
    bal_source_free(source);
}

/* Parts merged in any order are one pass, bit by bit. */
START_TEST(parts_merge_in_any_order) {
    enum { PARTS = 8, EACH = RECORDS / PARTS };
    given g;
    set_up(&g, _i, false);
    if (_i % 2) /* some parts have whole weights only */
        for (size_t i = 0; i < EACH * 3; i++) g.weights[i] = floor(g.weights[i]);
    dice d = dice_of(_i);
    size_t order[PARTS];
    bali_counter parts[PARTS], all = {0};
    for (size_t p = 0; p < PARTS; p++) {
        count_part(&parts[p], &g, p * EACH, EACH);
        size_t other = roll(&d, p + 1);
        order[p] = order[other];
        order[other] = p;
    }
    ck_assert_int_eq(bali_counter_create(&all, g.network, NULL), BAL_OK);
    for (size_t p = 0; p < PARTS; p++) ck_assert_int_eq(bali_counter_merge(&all, &parts[order[p]], NULL), BAL_OK);
    bal_cells *counts = equal_cells(g.network, 7);
    bali_counter_write(&all, counts);
    expect_counts(&g, counts);
    bal_cells_free(counts);
    for (size_t p = 0; p < PARTS; p++) bali_counter_free(&parts[p]);
    bali_counter_free(&all);
    tear_down(&g);
}
END_TEST

/* 2^33 records of 2^-32 are 2; the carry of fractions goes over. */
START_TEST(fractions_carry_over) {
    bal_network *network = network_of("A:#1");
    static const int codes[4] = {0};
    static const double weights[] = {0x1p-32, 1 - 0x1p-32, 0.75, 0.25};
    bal_source *source = source_of(bal_network_domain(network), &(fixture_table){.codes = codes, .n_records = 4, .weighted = true, .weights = weights});
    bal_cells *counts = NULL;
    ck_assert_int_eq(bal_tally(network, source, &counts, NULL), BAL_OK);
    ck_assert_double_eq(bal_cells_family(counts, 0)[0], 2);
    bal_cells_free(counts);
    bal_source_free(source);
    bal_network_free(network);
}
END_TEST

static bal_status count_and_merge(void *context, bal_error *err) {
    const given *g = context;
    bali_counter a = {0}, b = {0};
    bal_block block;
    bal_source *source = part_of(g, 0, 100, 0);
    bal_status status = bali_counter_create(&a, g->network, err);
    if (status == BAL_OK) status = bali_counter_create(&b, g->network, err);
    if (status == BAL_OK) status = bal_source_next(source, &block, err);
    if (status == BAL_OK) status = bali_counter_add(&a, &block, err);
    if (status == BAL_OK) status = bali_counter_merge(&b, &a, err);
    bali_counter_free(&a);
    bali_counter_free(&b);
    bal_source_free(source);
    return status;
}

START_TEST(memory_may_run_out) {
    given g;
    set_up(&g, 1, false);
    ck_assert_uint_ge(survive_allocations(count_and_merge, &g), 5);
    tear_down(&g);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("counter");
    TCase *c = tcase_create("counter");
    tcase_add_loop_test(c, weights_are_summed_exactly, 1, 13);
    tcase_add_loop_test(c, parts_merge_in_any_order, 1, 13);
    tcase_add_test(c, fractions_carry_over);
    tcase_add_test(c, memory_may_run_out);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
