#include "learn/indexing.h"

#include "support/fixtures.h"

#include <stdlib.h>

enum { RECORDS = 200 };

/* Every family's cells of one block against the slow way. */
static void check_block(const bal_network *network, const bal_block *block, const int *codes, bool narrow) {
    size_t n = bal_network_variables(network);
    for (size_t v = 0; v < n; v++) {
        uint32_t cells[RECORDS];
        bali_index_family(network, v, block, cells);
        for (size_t t = 0; t < block->n_records; t++) {
            int record[64];
            for (size_t u = 0; u < n; u++) record[u] = narrow && u == 0 ? -1 : codes[t * n + u];
            size_t expected = cell_of(network, v, record);
            ck_assert_uint_eq(cells[t], expected == BAL_NONE ? BALI_NO_CELL : expected);
        }
    }
}

static const struct {
    size_t most_outcomes;
    double missing;
    bool narrow;
} cases[] = {{5, 0, false}, {5, 0.1, false}, {5, 1, false}, {5, 0.1, true}, {300, 0, false}, {300, 0.1, true}};

START_TEST(cells_are_those_of_the_slow_way) {
    for (int seed = 1; seed <= 10; seed++) {
        dice d = dice_of(seed);
        bal_network *network = random_network(&d, 6, 1, cases[_i].most_outcomes, cases[_i].most_outcomes > 100 ? 1 : 3);
        bal_cells *tables = random_tables(&d, network, 0);
        int *codes = random_codes(&d, tables, RECORDS, cases[_i].missing);
        bal_source *source = source_of(bal_network_domain(network),
                                       &(fixture_table){.codes = codes, .n_records = RECORDS, .narrow = cases[_i].narrow});
        bal_block block;
        ck_assert_int_eq(bal_source_next(source, &block, NULL), BAL_OK);
        ck_assert_uint_eq(block.n_records, RECORDS);
        check_block(network, &block, codes, cases[_i].narrow);
        bal_source_free(source);
        free(codes);
        bal_cells_free(tables);
        bal_network_free(network);
    }
}
END_TEST

/* A missing parent must not come back as a cell by way of arithmetic modulo 2^32. */
START_TEST(missing_stays_missing_through_every_parent) {
    bal_network *network = network_of("A:#2 ; B:#3 ; C:#4 ; D:#5 | A,B,C");
    for (int missing = 0; missing < 4; missing++) {
        int codes[] = {1, 2, 3, 4};
        codes[missing] = -1;
        bal_source *source = plain_source(network, codes, 1);
        bal_block block;
        uint32_t cell = 0;
        ck_assert_int_eq(bal_source_next(source, &block, NULL), BAL_OK);
        bali_index_family(network, 3, &block, &cell);
        ck_assert_uint_eq(cell, BALI_NO_CELL);
        bal_source_free(source);
    }
    bal_network_free(network);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("indexing");
    TCase *c = tcase_create("indexing");
    tcase_add_loop_test(c, cells_are_those_of_the_slow_way, 0, sizeof cases / sizeof cases[0]);
    tcase_add_test(c, missing_stays_missing_through_every_parent);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
