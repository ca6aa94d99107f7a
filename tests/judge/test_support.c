#include "ballast/judge.h"

#include "support/fixtures.h"

#include <math.h>
#include <stdlib.h>

enum { MOST_VARIABLES = 8 };

typedef struct shares {
    bal_support all;
    double rows[MOST_VARIABLES], cells[MOST_VARIABLES];
} shares;

/* How many of the records fall in the cell (row) of record i. */
static size_t company(const bal_network *network, size_t v, const int *codes, size_t n_records, size_t i, bool row) {
    size_t n = bal_network_variables(network), r = row ? bal_network_outcomes(network, v) : 1, count = 0;
    size_t mine = cell_of(network, v, codes + i * n);
    for (size_t j = 0; j < n_records; j++) {
        size_t other = cell_of(network, v, codes + j * n);
        count += other != BAL_NONE && other / r == mine / r;
    }
    return count;
}

/* The same from the definition: a record counts when nobody else is in its row (cell) of some family. */
static shares slow_shares(const bal_network *network, const int *codes, size_t n_records) {
    size_t n = bal_network_variables(network), alone_in_row = 0, alone_in_cell = 0;
    shares s = {0};
    size_t complete[MOST_VARIABLES] = {0};
    for (size_t i = 0; i < n_records; i++) {
        bool row = false, cell = false;
        for (size_t v = 0; v < n; v++) {
            if (cell_of(network, v, codes + i * n) == BAL_NONE) continue;
            bool in_row = company(network, v, codes, n_records, i, true) == 1,
                 in_cell = company(network, v, codes, n_records, i, false) == 1;
            complete[v]++;
            s.rows[v] += in_row;
            s.cells[v] += in_cell;
            row |= in_row;
            cell |= in_cell;
        }
        alone_in_row += row;
        alone_in_cell += cell;
    }
    for (size_t v = 0; v < n; v++) {
        s.rows[v] /= (double)complete[v]; /* 0/0 = NaN where no record is complete */
        s.cells[v] /= (double)complete[v];
    }
    s.all = (bal_support){(double)alone_in_row / (double)n_records, (double)alone_in_cell / (double)n_records};
    return s;
}

static bool same(double a, double b) {
    return a == b || (isnan(a) && isnan(b));
}

static const struct {
    size_t n_records, block_records;
    double missing;
} sizes[] = {{0, 0, 0}, {1, 0, 0}, {2, 1, 0}, {30, 7, 0}, {100, 0, 0}, {100, 33, 0.2}, {100, 0, 1}};

START_TEST(shares_are_those_of_the_definition) {
    for (int seed = 1; seed <= 15; seed++) {
        dice d = dice_of(seed);
        bal_network *network = random_network(&d, MOST_VARIABLES, 1, 4, 3);
        bal_cells *tables = random_tables(&d, network, 0);
        size_t n = sizes[_i].n_records;
        int *codes = random_codes(&d, tables, n, sizes[_i].missing);
        bal_cells *counts = counts_of(network, codes, n);
        bal_source *source =
            source_of(bal_network_domain(network),
                      &(fixture_table){.codes = codes, .n_records = n, .block_records = sizes[_i].block_records});
        shares expected = slow_shares(network, codes, n), got = {0};
        ck_assert_int_eq(bal_support_measure(counts, source, &got.all, got.rows, got.cells, NULL), BAL_OK);
        ck_assert_msg(same(got.all.row_share, expected.all.row_share) && same(got.all.cell_share, expected.all.cell_share),
                      "seed %d", seed);
        for (size_t v = 0; v < MOST_VARIABLES; v++)
            ck_assert_msg(same(got.rows[v], expected.rows[v]) && same(got.cells[v], expected.cells[v]),
                          "seed %d, variable %zu", seed, v);
        ck_assert(!(got.all.row_share > got.all.cell_share)); /* who is alone in a row is alone in a cell */
        bal_source_free(source);
        free(codes);
        bal_cells_free(counts);
        bal_cells_free(tables);
        bal_network_free(network);
    }
}
END_TEST

START_TEST(counts_alone_give_the_families_shares) {
    bal_network *network = network_of("A:#3 ; B:#2 | A");
    bal_cells *counts = cells_of(network, (const double[]){1, 2, 1, /**/ 1, 0, 1, 1, 0, 1});
    bal_support all = {7, 7};
    double rows[2], cells[2];
    ck_assert_int_eq(bal_support_measure(counts, NULL, &all, rows, cells, NULL), BAL_OK);
    ck_assert(isnan(all.row_share) && isnan(all.cell_share));
    ck_assert(rows[0] == 0 && cells[0] == 0.5 && rows[1] == 0.5 && cells[1] == 1);
    ck_assert_int_eq(bal_support_measure(counts, NULL, &all, NULL, NULL, NULL), BAL_OK);
    bal_cells_free(counts);
    bal_network_free(network);
}
END_TEST

START_TEST(what_the_source_meets_ends_it) {
    bal_network *network = network_of("A:#3");
    const int codes[] = {0, 1, 2};
    bal_cells *counts = counts_of(network, codes, 3);
    bal_source *source = source_of(bal_network_domain(network),
                                   &(fixture_table){.codes = codes, .n_records = 3, .block_records = 1, .fail_at = 2});
    bal_support all = {7, 7};
    ck_assert_int_eq(bal_support_measure(counts, source, &all, NULL, NULL, NULL), BAL_ERR_IO);
    bal_source_free(source);
    bal_cells_free(counts);
    bal_network_free(network);
}
END_TEST

START_TEST(records_of_other_variables_are_refused) {
    bal_network *network = network_of("A:#2"), *other = network_of("A:#3");
    bal_cells *counts = equal_cells(network, 1);
    bal_source *source = plain_source(other, (const int[]){0, 2}, 2);
    bal_support all;
    bal_error err = {0};
    ck_assert_int_eq(bal_support_measure(counts, source, &all, NULL, NULL, &err), BAL_ERR_ARGUMENT);
    ck_assert_str_eq(err.code, "other-network");
    bal_source_free(source);
    bal_cells_free(counts);
    bal_network_free(network);
    bal_network_free(other);
}
END_TEST

typedef struct measuring {
    const bal_cells *counts;
    bal_source *source;
} measuring;

static bal_status measure(void *context, bal_error *err) {
    const measuring *m = context;
    bal_support all;
    return bal_support_measure(m->counts, m->source, &all, NULL, NULL, err);
}

START_TEST(measuring_survives_failing_allocations) {
    bal_network *network = network_of("A:#3 ; B:#2 | A");
    const int codes[] = {0, 1, 2, 0};
    bal_cells *counts = counts_of(network, codes, 2);
    bal_source *source = plain_source(network, codes, 2);
    ck_assert_uint_eq(survive_allocations(measure, &(measuring){counts, source}), 4);
    bal_source_free(source);
    bal_cells_free(counts);
    bal_network_free(network);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("support");
    TCase *c = tcase_create("support");
    tcase_add_loop_test(c, shares_are_those_of_the_definition, 0, sizeof sizes / sizeof sizes[0]);
    tcase_add_test(c, counts_alone_give_the_families_shares);
    tcase_add_test(c, what_the_source_meets_ends_it);
    tcase_add_test(c, records_of_other_variables_are_refused);
    tcase_add_test(c, measuring_survives_failing_allocations);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
