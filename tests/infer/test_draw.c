#include "ballast/infer.h"

#include "ballast/tally.h"
#include "model/cells.h"
#include "support/fixtures.h"

#include <stdlib.h>
#include <string.h>

static bal_source *draw(const bal_cells *tables, uint64_t n_records, uint64_t seed) {
    bal_source *source;
    bal_error err = {0};
    ck_assert_msg(bal_draw_open(tables, n_records, seed, &source, &err) == BAL_OK, "%s", err.message);
    return source;
}

/* All records of a source, one number a variable; freed with free(). */
static int *read_all(bal_source *source, size_t n_records) {
    size_t n = bal_domain_variables(bal_source_domain(source)), at = 0, wrong = 0;
    int *codes = calloc(n_records * n + 1, sizeof *codes);
    ck_assert_ptr_nonnull(codes);
    for (;;) {
        bal_block block;
        ck_assert_int_eq(bal_source_next(source, &block, NULL), BAL_OK);
        if (block.n_records == 0) break;
        ck_assert_uint_le(at + block.n_records, n_records);
        for (size_t t = 0; t < block.n_records; t++, at++) {
            wrong += bal_block_place(&block, t) != at;
            for (size_t v = 0; v < n; v++) codes[at * n + v] = (int)bal_block_code(&block, v, t);
        }
    }
    ck_assert_uint_eq(at, n_records);
    ck_assert_uint_eq(wrong, 0);
    return codes;
}

/* The numbers again, from the words of the header and of Steele, Lea & Flood 2014. */
static uint64_t own_mix(uint64_t z) {
    z = (z ^ (z >> 30)) * 0xBF58476D1CE4E5B9u;
    z = (z ^ (z >> 27)) * 0x94D049BB133111EBu;
    return z ^ (z >> 31);
}

static uint64_t own_splitmix64(uint64_t s, uint64_t i) {
    const uint64_t g = 0x9E3779B97F4A7C15u;
    return own_mix(own_mix(s + g) + (i + 1) * g);
}

static int own_outcome(const bal_cells *tables, uint64_t seed, uint64_t i, size_t v, const int *record) {
    const bal_network *network = bal_cells_network(tables);
    uint64_t key = own_splitmix64(own_splitmix64(seed, 3), 0);
    double u = (double)(own_splitmix64(own_splitmix64(key, i), v) >> 11) / 0x1p53, reached = 0;
    size_t r = bal_network_outcomes(network, v);
    const double *row = bal_cells_family(tables, v) + cell_of(network, v, record) / r * r;
    for (size_t k = 0; k < r; k++)
        if (u < (reached += row[k])) return (int)k;
    return -1;
}

START_TEST(a_record_depends_on_seed_number_and_tables_alone) {
    enum { RECORDS = 300 };
    dice d = dice_of(_i);
    bal_network *network = random_network(&d, 7, 1, _i == 1 ? 300 : 5, _i == 1 ? 1 : 3);
    bal_cells *tables = random_tables(&d, network, 0.2);
    size_t n = bal_network_variables(network), wrong = 0;
    for (uint64_t seed = 1; seed <= 3; seed++) {
        bal_source *source = draw(tables, RECORDS, seed);
        int *codes = read_all(source, RECORDS);
        for (size_t i = 0; i < RECORDS; i++)
            for (size_t v = 0; v < n; v++) wrong += codes[i * n + v] != own_outcome(tables, seed, i, v, codes + i * n);
        free(codes);
        bal_source_free(source);
    }
    ck_assert_uint_eq(wrong, 0);
    bal_cells_free(tables);
    bal_network_free(network);
}
END_TEST

START_TEST(a_longer_draw_begins_with_the_shorter) {
    static const uint64_t lengths[] = {0, 1, 4095, 4096, 4097, 9000};
    dice d = dice_of(3);
    bal_network *network = random_network(&d, 4, 2, 4, 2);
    bal_cells *tables = random_tables(&d, network, 0);
    bal_source *longest = draw(tables, 9000, 42);
    int *all = read_all(longest, 9000);
    for (size_t l = 0; l < sizeof lengths / sizeof lengths[0]; l++) {
        bal_source *source = draw(tables, lengths[l], 42);
        int *codes = read_all(source, (size_t)lengths[l]);
        ck_assert_mem_eq(codes, all, (size_t)lengths[l] * 4 * sizeof *codes);
        free(codes);
        bal_source_free(source);
    }
    bal_source *other = draw(tables, 9000, 43);
    int *codes = read_all(other, 9000);
    ck_assert_mem_ne(codes, all, 9000 * 4 * sizeof *codes);
    free(codes);
    free(all);
    bal_source_free(other);
    bal_source_free(longest);
    bal_cells_free(tables);
    bal_network_free(network);
}
END_TEST

START_TEST(going_back_gives_the_same) {
    dice d = dice_of(4);
    bal_network *network = random_network(&d, 4, 2, 4, 2);
    bal_cells *tables = random_tables(&d, network, 0);
    bal_source *source = draw(tables, 5000, 7);
    bali_cells_all(tables)[0] = 99; /* copied: what it was made of may change */
    int *first = read_all(source, 5000);
    ck_assert_int_eq(bal_source_rewind(source, NULL), BAL_OK);
    bal_block block;
    ck_assert_int_eq(bal_source_next(source, &block, NULL), BAL_OK); /* broken off */
    ck_assert_int_eq(bal_source_rewind(source, NULL), BAL_OK);
    int *second = read_all(source, 5000);
    ck_assert_mem_eq(first, second, 5000 * 4 * sizeof *first);
    bal_source_summary summary;
    bal_source_summary_get(source, &summary);
    ck_assert(summary.records == 5000 && summary.dropped == 0 && !summary.missing && summary.n_ignored == 0);
    free(first);
    free(second);
    bal_source_free(source);
    bal_cells_free(tables);
    bal_network_free(network);
}
END_TEST

/* Counts of 60,000 records against the tables. The chi-squares of the rows add up; 48.72 is the 99.999 % point for 14
 * degrees of freedom (Python's mpmath): 2 of A, 3 x 3 of B given A, 3 of C, none where an outcome has probability 0 or
 * 1. */
START_TEST(frequencies_are_those_of_the_tables) {
    bal_network *network = network_of("A:#3 ; B:#4 | A ; C:#2 | A");
    static const double values[] = {0.2, 0.5, 0.3, /**/ 0.1, 0.2, 0.3, 0.4, 0.25, 0.25, 0.25, 0.25, 0.01, 0.01, 0.97, 0.01,
                                    /**/ 0.5, 0.5, 0.9, 0.1, 0.001, 0.999};
    bal_cells *tables = cells_of(network, values), *counts = NULL;
    bal_source *source = draw(tables, 60000, 1);
    ck_assert_int_eq(bal_tally(network, source, &counts, NULL), BAL_OK);
    double chi_square = 0;
    for (size_t v = 0; v < 3; v++) {
        size_t r = bal_network_outcomes(network, v);
        for (size_t c = 0; c < bal_network_rows(network, v) * r; c++) {
            const double *n = bal_cells_family(counts, v), *p = bal_cells_family(tables, v);
            double expected = p[c] * bali_row_sum(n + c / r * r, r);
            chi_square += (n[c] - expected) * (n[c] - expected) / expected;
        }
    }
    ck_assert_msg(chi_square < 48.72, "%g", chi_square);
    bal_cells_free(counts);
    bal_source_free(source);
    bal_cells_free(tables);
    bal_network_free(network);
}
END_TEST

START_TEST(what_has_no_probability_is_never_drawn) {
    bal_network *network = network_of("A:#4 ; B:#3 | A ; C:#3");
    /* The last row lacks a hair, as sums of rounded numbers do, only wider: what is left goes to the last outcome that can be. */
    static const double values[] = {0, 0.5, 0, 0.5, /**/ 1, 0, 0, 0, 1, 0, 0, 0, 1, 0.5, 0, 0.5, /**/ 0.25, 0.25, 0};
    bal_cells *tables = cells_of(network, values), *counts = NULL;
    bal_source *source = draw(tables, 50000, 1);
    ck_assert_int_eq(bal_tally(network, source, &counts, NULL), BAL_OK);
    for (size_t c = 0; c < bal_network_cells(network); c++)
        if (values[c] <= 0) ck_assert_double_eq(bali_cells_values(counts)[c], 0);
    ck_assert(bal_cells_family(counts, 1)[3 + 1] > 0 && bal_cells_family(counts, 1)[9 + 2] > 0);
    ck_assert(bal_cells_family(counts, 2)[1] > 2 * bal_cells_family(counts, 2)[0]);
    bal_cells_free(counts);
    bal_source_free(source);
    bal_cells_free(tables);
    bal_network_free(network);
}
END_TEST

START_TEST(more_than_254_outcomes_take_two_bytes) {
    bal_network *network = network_of("A:#1000 ; B:#2 | A");
    bal_cells *tables = equal_cells(network, 0.5);
    for (size_t k = 0; k < 1000; k++) bal_cells_edit(tables, 0)[k] = k < 500 ? 0 : 1.0 / 500;
    bal_source *source = draw(tables, 3000, 9);
    bal_block block;
    ck_assert_int_eq(bal_source_next(source, &block, NULL), BAL_OK);
    ck_assert_uint_eq(block.width, 2);
    size_t least = 1000, most = 0;
    for (size_t t = 0; t < block.n_records; t++) {
        size_t code = bal_block_code(&block, 0, t);
        if (code < least) least = code;
        if (code > most) most = code;
    }
    ck_assert_msg(least >= 500 && least < 520 && most > 980 && most < 1000, "%zu to %zu", least, most);
    bal_source_free(source);
    bal_cells_free(tables);
    bal_network_free(network);
}
END_TEST

static bal_status open_and_free(void *context, bal_error *err) {
    bal_source *source = context;
    bal_status status = bal_draw_open(context, 10, 1, &source, err);
    if (status != BAL_OK) ck_assert_ptr_null(source);
    bal_source_free(source);
    return status;
}

START_TEST(drawing_survives_failing_allocations) {
    bal_network *network = network_of("A:#3 ; B:#2 | A");
    bal_cells *tables = equal_cells(network, 0.5);
    ck_assert_uint_eq(survive_allocations(open_and_free, tables), 7);
    bal_cells_free(tables);
    bal_network_free(network);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("draw");
    TCase *c = tcase_create("draw");
    tcase_add_loop_test(c, a_record_depends_on_seed_number_and_tables_alone, 1, 6);
    tcase_add_test(c, a_longer_draw_begins_with_the_shorter);
    tcase_add_test(c, going_back_gives_the_same);
    tcase_add_test(c, frequencies_are_those_of_the_tables);
    tcase_add_test(c, what_has_no_probability_is_never_drawn);
    tcase_add_test(c, more_than_254_outcomes_take_two_bytes);
    tcase_add_test(c, drawing_survives_failing_allocations);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
