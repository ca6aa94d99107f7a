#include "learn/zeros.h"

#include "ballast/prior.h"
#include "base/memory.h"
#include "support/fixtures.h"

#include <string.h>

/* A: one outcome cannot be. B given A=0: one outcome cannot be. */
static const char *const structure = "A:a0,a1,a2 ; B:b0,b1 | A";
static const double tables[] = {0.5, 0.5, 0, /**/ 1, 0, 0.5, 0.5, 0.5, 0.5};

typedef struct given {
    bal_network *network;
    bal_cells *expert;
    bal_prior *prior;
} given;

static void set_up(given *g) {
    g->network = network_of(structure);
    g->expert = cells_of(g->network, tables);
    g->prior = expert_prior(g->expert, 10, 0, 1);
}

static void tear_down(given *g) {
    bal_prior_free(g->prior);
    bal_cells_free(g->expert);
    bal_network_free(g->network);
}

static bal_status check(const given *g, const fixture_table *table, bool with_source, bal_error *err) {
    bal_cells *counts = counts_of(g->network, table->codes, table->n_records);
    bal_source *source = with_source ? source_of(bal_network_domain(g->network), table) : NULL;
    bal_status status = bal_prior_check(g->prior, counts, source, err);
    bal_source_free(source);
    bal_cells_free(counts);
    return status;
}

static const int possible[] = {0, 0, 1, 0, 1, 1, -1, 1, 1, -1};

START_TEST(possible_records_pass) {
    given g;
    set_up(&g);
    ck_assert_int_eq(check(&g, &(fixture_table){.codes = possible, .n_records = 5}, true, NULL), BAL_OK);
    ck_assert_int_eq(check(&g, &(fixture_table){.codes = possible, .n_records = 5}, false, NULL), BAL_OK);
    ck_assert_int_eq(check(&g, &(fixture_table){.codes = possible, .n_records = 0}, true, NULL), BAL_OK);
    tear_down(&g);
}
END_TEST

START_TEST(other_priors_have_no_structural_zeros) {
    bal_network *network = network_of(structure);
    bal_prior *prior = simple_prior(network, BAL_PRIOR_JEFFREYS, 1);
    bal_cells *counts = equal_cells(network, 1);
    ck_assert_int_eq(bal_prior_check(prior, counts, NULL, NULL), BAL_OK);
    bal_cells_free(counts);
    bal_prior_free(prior);
    bal_network_free(network);
}
END_TEST

/* Five records; which of them is the first in a structural zero, and where. */
static const struct {
    int codes[10];
    size_t record; /* one-based */
    const char *variable, *says;
} cases[] = {
    {{0, 0, 2, 0, 1, 1, 1, 0, 1, 0}, 2, "A", "A=a2 is impossible under the prior"},
    {{0, 0, 1, 0, 1, 1, 1, 0, 0, 1}, 5, "B", "B=b1 given A=a0 is impossible under the prior"},
    {{0, 1, 2, 0, 1, 1, 1, 0, 0, 1}, 1, "B", "B=b1 given A=a0"},  /* the first record, though A comes before B */
    {{1, 1, 2, 0, 0, 1, 1, 0, 0, 1}, 2, "A", "A=a2 is"},
    {{-1, 1, 0, -1, 2, -1, 1, 0, 0, 1}, 3, "A", "A=a2 is"},       /* where B is missing, A still counts */
    {{-1, 1, 0, -1, 1, -1, -1, 1, 0, 1}, 5, "B", "B=b1 given A=a0"},
};

START_TEST(the_first_record_in_a_structural_zero_is_named) {
    given g;
    set_up(&g);
    for (size_t block_records = 1; block_records <= 5; block_records++) {
        bal_error err = {0};
        fixture_table table = {.codes = cases[_i].codes, .n_records = 5, .block_records = block_records};
        ck_assert_int_eq(check(&g, &table, true, &err), BAL_ERR_DATA);
        ck_assert_str_eq(err.code, "structural-zero");
        ck_assert_msg(strstr(err.message, cases[_i].says), "%s", err.message);
        ck_assert_str_eq(err.variable, cases[_i].variable);
        ck_assert_uint_eq(err.record, cases[_i].record);
        ck_assert_str_eq(err.file, "fixture.csv");
        ck_assert_uint_eq(err.line, cases[_i].record + 1);
    }
    tear_down(&g);
}
END_TEST

START_TEST(places_count_the_records_that_were_dropped) {
    given g;
    set_up(&g);
    const uint64_t places[] = {0, 17, 18, 19, 20};
    bal_error err = {0};
    ck_assert_int_eq(check(&g, &(fixture_table){.codes = cases[0].codes, .n_records = 5, .places = places}, true, &err),
                     BAL_ERR_DATA);
    ck_assert_uint_eq(err.record, 18);
    tear_down(&g);
}
END_TEST

/* Counts alone, or a source that fails, still refuse: only the record is not named. */
START_TEST(without_the_records_the_cell_is_named) {
    given g;
    set_up(&g);
    bal_error err = {0};
    ck_assert_int_eq(check(&g, &(fixture_table){.codes = cases[1].codes, .n_records = 5}, false, &err), BAL_ERR_DATA);
    ck_assert_msg(strstr(err.message, cases[1].says), "%s", err.message);
    ck_assert_str_eq(err.variable, "B");
    ck_assert_uint_eq(err.record, 0);

    err = (bal_error){0};
    fixture_table broken = {
        .codes = cases[1].codes, .n_records = 5, .block_records = 2, .fail_at = 2}; /* before the fifth record */
    ck_assert_int_eq(check(&g, &broken, true, &err), BAL_ERR_DATA);
    ck_assert_str_eq(err.code, "structural-zero");
    ck_assert_uint_eq(err.record, 0);
    tear_down(&g);
}
END_TEST

START_TEST(a_pipe_that_was_read_still_refuses) {
    given g;
    set_up(&g);
    bal_source *pipe =
        source_of(bal_network_domain(g.network), &(fixture_table){.codes = cases[0].codes, .n_records = 5, .pipe = true});
    bal_cells *counts = counts_of(g.network, cases[0].codes, 5);
    bal_block block;
    bal_error err = {0};
    ck_assert_int_eq(bal_source_next(pipe, &block, NULL), BAL_OK);
    ck_assert_int_eq(bal_prior_check(g.prior, counts, pipe, &err), BAL_ERR_DATA);
    ck_assert_str_eq(err.code, "structural-zero");
    ck_assert_uint_eq(err.record, 0);
    bal_cells_free(counts);
    bal_source_free(pipe);
    tear_down(&g);
}
END_TEST

START_TEST(records_of_other_variables_name_none) {
    given g;
    set_up(&g);
    bal_network *other = network_of("A:#9");
    bal_source *source = plain_source(other, (const int[]){8, 8, 8}, 3);
    bal_cells *counts = counts_of(g.network, cases[0].codes, 5);
    bal_error err = {0};
    ck_assert_int_eq(bal_prior_check(g.prior, counts, source, &err), BAL_ERR_DATA);
    ck_assert_str_eq(err.code, "structural-zero");
    ck_assert_uint_eq(err.record, 0);
    bal_cells_free(counts);
    bal_source_free(source);
    bal_network_free(other);
    tear_down(&g);
}
END_TEST

START_TEST(a_floor_leaves_no_structural_zero) {
    given g;
    set_up(&g);
    bal_prior *floored = expert_prior(g.expert, 10, 1e-6, 1);
    bal_cells *counts = counts_of(g.network, cases[0].codes, 5);
    ck_assert_int_eq(bal_prior_check(floored, counts, NULL, NULL), BAL_OK);
    bal_cells_free(counts);
    bal_prior_free(floored);
    tear_down(&g);
}
END_TEST

/* Memory that runs out while the record is looked for costs its name, not the refusal. */
START_TEST(failing_allocations_do_not_let_a_record_pass) {
    given g;
    set_up(&g);
    bal_cells *counts = counts_of(g.network, cases[0].codes, 5);
    for (size_t n = 1; n <= 2; n++) {
        bal_source *source = plain_source(g.network, cases[0].codes, 5);
        bal_error err = {0};
        bali_memory_fail_at(n);
        bal_status status = bal_prior_check(g.prior, counts, source, &err);
        bali_memory_fail_at(0);
        ck_assert_int_eq(status, BAL_ERR_DATA);
        ck_assert_str_eq(err.code, "structural-zero");
        ck_assert_uint_eq(err.record, n == 1 ? 0 : 2);
        bal_source_free(source);
    }
    bal_cells_free(counts);
    tear_down(&g);
}
END_TEST

/* The first cell of all may be the zero, and small pseudo-counts are none. */
START_TEST(every_cell_is_looked_at) {
    bal_network *network = network_of("A:#2");
    bal_cells *expert = cells_of(network, (const double[]){0, 1});
    bal_prior *prior = expert_prior(expert, 0.5, 0, 1);
    for (int code = 0; code < 2; code++) {
        const int codes[] = {1, code};
        bal_cells *counts = counts_of(network, codes, 2);
        bal_source *source = plain_source(network, codes, 2);
        bal_error err = {0};
        ck_assert_int_eq(bal_prior_check(prior, counts, source, &err), code == 0 ? BAL_ERR_DATA : BAL_OK);
        ck_assert_uint_eq(err.record, code == 0 ? 2 : 0);
        bal_source_free(source);
        bal_cells_free(counts);
    }
    bal_prior_free(prior);
    bal_cells_free(expert);
    bal_network_free(network);
}
END_TEST

START_TEST(a_refusal_says_the_whole_configuration) {
    bal_network *network = network_of("A:x,y ; B:#3 ; C:p,q | B,A");
    bal_error err = {0};
    ck_assert_int_eq(bali_refuse_zero(network, 2, (2 * 2 + 1) * 2 + 0, &err), BAL_ERR_DATA);
    ck_assert_str_eq(err.message, "C=p given B=2, A=y is impossible under the prior, yet records have it; correct them or "
                                  "the table, or use --prior-floor");
    ck_assert_str_eq(err.variable, "C");
    bal_network_free(network);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("zeros");
    TCase *c = tcase_create("zeros");
    tcase_add_test(c, possible_records_pass);
    tcase_add_test(c, other_priors_have_no_structural_zeros);
    tcase_add_loop_test(c, the_first_record_in_a_structural_zero_is_named, 0, sizeof cases / sizeof cases[0]);
    tcase_add_test(c, places_count_the_records_that_were_dropped);
    tcase_add_test(c, without_the_records_the_cell_is_named);
    tcase_add_test(c, a_pipe_that_was_read_still_refuses);
    tcase_add_test(c, records_of_other_variables_name_none);
    tcase_add_test(c, a_floor_leaves_no_structural_zero);
    tcase_add_test(c, failing_allocations_do_not_let_a_record_pass);
    tcase_add_test(c, every_cell_is_looked_at);
    tcase_add_test(c, a_refusal_says_the_whole_configuration);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
