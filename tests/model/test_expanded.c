#include "model/expanded.h"

#include "support/fixtures.h"

#include <stdlib.h>
#include <string.h>

enum { RECORDS = 600, VARIABLES = 3, BLOCK = 64 };

typedef struct given {
    bal_network *network;
    int *codes;
    uint64_t places[RECORDS];
    double weights[RECORDS];
    uint32_t groups[RECORDS];
    fixture_table table;
} given;

/* Weights: a few, none, or so many that one record fills more than a block. */
static void set_up(given *g, int seed, const char *text) {
    dice d = dice_of(seed);
    g->network = network_of(text);
    bal_cells *tables = random_tables(&d, g->network, 0);
    g->codes = random_codes(&d, tables, RECORDS, 0.1);
    for (size_t i = 0; i < RECORDS; i++) {
        g->weights[i] = roll(&d, 200) == 0 ? 10000 : (double)roll(&d, 5);
        g->groups[i] = (uint32_t)roll(&d, 7);
        g->places[i] = i == 0 ? 0 : g->places[i - 1] + (uint64_t)g->weights[i - 1];
    }
    g->table = (fixture_table){.codes = g->codes, .n_records = RECORDS, .block_records = BLOCK, .places = g->places, .weighted = true,
                               .weights = g->weights, .groups = seed % 2 ? g->groups : NULL, .narrow = seed % 3 == 0};
    bal_cells_free(tables);
}

static void tear_down(given *g) {
    free(g->codes);
    bal_network_free(g->network);
}

/* Every record as often as it weighs, each time at the next place. */
static void check_pass(const given *g, bal_source *view) {
    size_t at = 0, repeated = 0, wrong = 0;
    uint64_t place = 0;
    for (;;) {
        bal_block block;
        ck_assert_int_eq(bal_source_next(view, &block, NULL), BAL_OK);
        if (block.n_records == 0) break;
        ck_assert_ptr_null(block.weights);
        ck_assert((block.groups != NULL) == (g->table.groups != NULL));
        ck_assert((block.columns[0] == NULL) == g->table.narrow);
        for (size_t t = 0; t < block.n_records; t++, repeated++, place++) {
            while ((double)repeated >= g->weights[at]) {
                repeated = 0;
                at++;
                ck_assert_uint_lt(at, RECORDS);
            }
            for (size_t v = g->table.narrow; v < VARIABLES; v++) {
                int code = g->codes[at * VARIABLES + v];
                wrong += bal_block_code(&block, v, t) != (code < 0 ? BAL_NONE : (size_t)code);
            }
            wrong += bal_block_place(&block, t) != place;
            wrong += block.groups && block.groups[t] != g->groups[at];
        }
    }
    ck_assert_uint_eq(wrong, 0);
    ck_assert_uint_eq(place, g->places[RECORDS - 1] + (uint64_t)g->weights[RECORDS - 1]);
}

START_TEST(a_record_is_as_many_as_it_weighs) {
    given g;
    set_up(&g, _i, _i % 4 ? "A:#3 ; B:#4 | A ; C:#2" : "A:#3 ; B:#4 ; C:#300");
    bal_source *source = source_of(bal_network_domain(g.network), &g.table), *view = NULL;
    ck_assert_int_eq(bali_expanded_open(source, &view, NULL), BAL_OK);
    for (int pass = 0; pass < 2; pass++) {
        check_pass(&g, view);
        ck_assert_int_eq(bal_source_rewind(view, NULL), BAL_OK);
    }
    bal_source_free(view);
    bal_source_free(source);
    tear_down(&g);
}
END_TEST

START_TEST(without_weights_it_comes_as_it_is) {
    given g;
    set_up(&g, 1, "A:#3 ; B:#4 | A ; C:#2");
    g.table.weighted = false;
    g.table.weights = NULL;
    for (size_t i = 0; i < RECORDS; i++) g.weights[i] = 1;
    for (size_t i = 0; i < RECORDS; i++) g.places[i] = i;
    bal_source *source = source_of(bal_network_domain(g.network), &g.table), *view = NULL;
    ck_assert_int_eq(bali_expanded_open(source, &view, NULL), BAL_OK);
    check_pass(&g, view);
    bal_source_free(view);
    bal_source_free(source);
    tear_down(&g);
}
END_TEST

START_TEST(fractions_are_refused) {
    given g;
    set_up(&g, 1, "A:#3 ; B:#4 | A ; C:#2");
    g.weights[70] = 0.5;
    bal_source *source = source_of(bal_network_domain(g.network), &g.table), *view = NULL;
    bal_block block = {.n_records = 1};
    bal_error err = {0};
    bal_status status = BAL_OK;
    ck_assert_int_eq(bali_expanded_open(source, &view, NULL), BAL_OK);
    while (status == BAL_OK && block.n_records > 0) status = bal_source_next(view, &block, &err);
    ck_assert_int_eq(status, BAL_ERR_DATA);
    ck_assert_str_eq(err.code, "fractional-weight");
    bal_source_free(view);
    bal_source_free(source);
    tear_down(&g);
}
END_TEST

static bal_status expand_and_read(void *context, bal_error *err) {
    const given *g = context;
    bal_source *source = source_of(bal_network_domain(g->network), &g->table), *view = NULL;
    bal_block block = {.n_records = 1};
    bal_status status = bali_expanded_open(source, &view, err);
    while (status == BAL_OK && block.n_records > 0) status = bal_source_next(view, &block, err);
    bal_source_free(view);
    bal_source_free(source);
    return status;
}

START_TEST(memory_may_run_out) {
    given g;
    set_up(&g, 1, "A:#3 ; B:#4 | A ; C:#2");
    ck_assert_uint_ge(survive_allocations(expand_and_read, &g), 5);
    tear_down(&g);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("expanded");
    TCase *c = tcase_create("expanded");
    tcase_add_loop_test(c, a_record_is_as_many_as_it_weighs, 0, 12);
    tcase_add_test(c, without_weights_it_comes_as_it_is);
    tcase_add_test(c, fractions_are_refused);
    tcase_add_test(c, memory_may_run_out);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
