#include "ballast/network.h"

#include "model/shape.h"
#include "support/fixtures.h"

#include <stdio.h>
#include <string.h>

START_TEST(a_network_says_its_sizes) {
    bal_network *n = network_of("A:yes,no ; B:x,y,z | A ; C:p,q | B,A ; D:only | C");
    ck_assert_uint_eq(bal_network_variables(n), 4);
    ck_assert_uint_eq(bal_network_arcs(n), 4);
    ck_assert_uint_eq(bal_network_cells(n), 2 + 6 + 12 + 2);
    ck_assert_uint_eq(bal_network_free_parameters(n), 1 + 2 * 2 + 6 * 1 + 0);
    static const struct {
        size_t rows, outcomes, offset;
    } families[] = {{1, 2, 0}, {2, 3, 2}, {6, 2, 8}, {2, 1, 20}};
    for (size_t v = 0; v < 4; v++) {
        ck_assert_uint_eq(bal_network_rows(n, v), families[v].rows);
        ck_assert_uint_eq(bal_network_outcomes(n, v), families[v].outcomes);
        ck_assert_uint_eq(bal_network_offset(n, v), families[v].offset);
    }
    size_t n_parents;
    const size_t *parents = bal_network_parents(n, 2, &n_parents);
    ck_assert_uint_eq(n_parents, 2);
    ck_assert(parents[0] == 1 && parents[1] == 0); /* in the order of the table */
    (void)bal_network_parents(n, 0, &n_parents);
    ck_assert_uint_eq(n_parents, 0);
    bal_network_free(n);
}
END_TEST

START_TEST(the_order_has_parents_first) {
    bal_network *n = network_of("A:a,b | C,B ; B:a,b | C ; C:a,b | D ; D:a,b ; E:a,b | A");
    const size_t expected[] = {3, 2, 1, 0, 4};
    ck_assert_mem_eq(bal_network_order(n), expected, sizeof expected);
    bal_network_free(n);
}
END_TEST

static const struct {
    const char *text;
    size_t max_cells;
    const char *code, *says, *variable;
} refusals[] = {
    {"A:a,b | A", 0, "cycle", "the arcs run in a circle: A -> A; remove one of them", "A"},
    {"A:a,b | B ; B:a,b | A", 0, "cycle", "circle: B -> A -> B;", "B"},
    {"Z:a,b ; A:a,b | C,Z ; B:a,b | A ; C:a,b | B", 0, "cycle", "circle: B -> C -> A -> B;", "B"},
    {"A:a,b | I ; B:a,b | A ; C:a,b | B ; D:a,b | C ; E:a,b | D ; F:a,b | E ; G:a,b | F ; H:a,b | G ; I:a,b | H", 0, "cycle",
     "circle: B -> C -> D -> E -> F -> G -> H -> I -> A -> B;", "B"},
    {"A:a,b | J ; B:a,b | A ; C:a,b | B ; D:a,b | C ; E:a,b | D ; F:a,b | E ; G:a,b | F ; H:a,b | G ; I:a,b | H ; J:a,b | I",
     0, "cycle", "circle: B -> C -> D -> E -> F -> G -> H -> I -> ... (10 arcs) -> A -> B;", "B"},
    {"A:a,b ; B:a,b | A,A", 0, "duplicate-parent", "B has the parent A twice; remove one", "B"},
    {"A:a,b ; B:a,b | A", 5, "too-many-cells",
     "the table of B with its 1 parents takes the network over 5 cells; "
     "use fewer parents or outcomes, or raise --max-cells",
     "B"},
    {"A:a,b,c,d,e,f", 5, "too-many-cells", "of A with its 0 parents", "A"},
    /* 2048 x 2048 = 2^22 cells stand at the limit; one variable more goes over it. */
    {"A:#2048 ; B:#2048 | A", 0, "too-many-cells", "of B with its 1 parents takes the network over 4194304 cells", "B"},
};

START_TEST(a_bad_network_is_refused) {
    bal_network *network;
    bal_error err = {0};
    ck_assert_int_eq(network_try(refusals[_i].text, refusals[_i].max_cells, &network, &err), BAL_ERR_DATA);
    ck_assert_ptr_null(network);
    ck_assert_str_eq(err.code, refusals[_i].code);
    ck_assert_msg(strstr(err.message, refusals[_i].says), "%s", err.message);
    ck_assert_str_eq(err.variable, refusals[_i].variable);
    ck_assert_ptr_nonnull(bal_code_find(err.code));
}
END_TEST

/* A cycle of names as long as they may be: cut between characters, and the advice still stands at the end. */
START_TEST(a_cycle_of_long_names_is_told_briefly) {
    char text[12 * 600], e_acute[253], *at = text;
    for (size_t i = 0; i < 252; i += 2) memcpy(e_acute + i, "\xC3\xA9", 3);
    for (int v = 0; v < 12; v++)
        at += sprintf(at, "%s%c%s:a,b | %c%s", v ? ";" : "", 'A' + v, e_acute, 'A' + (v + 1) % 12, e_acute);
    bal_network *network;
    bal_error err = {0};
    ck_assert_int_eq(network_try(text, 0, &network, &err), BAL_ERR_DATA);
    ck_assert_str_eq(err.code, "cycle");
    ck_assert_ptr_nonnull(strstr(err.message, " -> ... (12 arcs) -> "));
    ck_assert_str_eq(err.message + strlen(err.message) - 20, "; remove one of them");
    ck_assert_msg(!strstr(err.message, "\\x"), "%s", err.message); /* no half of a character */
    bal_network_free(network);
}
END_TEST

/* A child of n_outcomes with n_parents of parent_outcomes each. */
static bal_status wide_family(size_t n_parents, size_t parent_outcomes, size_t n_outcomes, size_t max_cells,
                              bal_network **out, bal_error *err) {
    char text[4096];
    size_t at = (size_t)snprintf(text, sizeof text, "Child:#%zu |", n_outcomes);
    for (size_t p = 0; p < n_parents; p++) at += (size_t)snprintf(text + at, sizeof text - at, "%sP%zu", p ? "," : "", p);
    for (size_t p = 0; p < n_parents; p++) at += (size_t)snprintf(text + at, sizeof text - at, ";P%zu:#%zu", p, parent_outcomes);
    return network_try(text, max_cells, out, err);
}

static const struct {
    size_t n_parents, parent_outcomes, n_outcomes;
} too_wide[] = {
    {40, 10, 10},     /* 10^41 */
    {63, 2, 2},       /* 2^64, which is 0 in 64 bits */
    {64, 2, 2},       /* 2^65 */
    {63, 2, 1},       /* 2^63: no overflow, and far too many */
    {7, 256, 256},    /* 2^64 */
    {5, 7133, 257},   /* about 4.7e21: modulo 2^64 an ordinary number */
    {28, 2, 2},       /* 2^29: above the largest limit there is */
};

START_TEST(a_family_that_overflows_is_refused) {
    size_t limits[] = {0, BAL_LARGEST_MAX_CELLS, SIZE_MAX};
    for (size_t i = 0; i < sizeof limits / sizeof limits[0]; i++) {
        bal_network *network;
        bal_error err = {0};
        bal_status status = wide_family(too_wide[_i].n_parents, too_wide[_i].parent_outcomes, too_wide[_i].n_outcomes,
                                        limits[i], &network, &err);
        ck_assert_int_eq(status, BAL_ERR_DATA);
        ck_assert_ptr_null(network);
        ck_assert_str_eq(err.code, "too-many-cells");
        ck_assert_str_eq(err.variable, "Child");
    }
}
END_TEST

START_TEST(the_limit_itself_is_allowed) {
    bal_network *network;
    bal_error err = {0};
    ck_assert_int_eq(network_try("A:a,b ; B:a,b | A", 6, &network, &err), BAL_OK);
    bal_network_free(network);
    ck_assert_int_eq(wide_family(20, 2, 2, 0, &network, &err), BAL_OK); /* 2^21 + 40 */
    ck_assert_uint_eq(bal_network_cells(network), ((size_t)1 << 21) + 40);
    bal_network_free(network);
}
END_TEST

START_TEST(a_parent_out_of_range_is_refused) {
    bal_network *n = network_of("A:a,b ; B:a,b"), *made = n;
    const size_t parent = 2;
    const bal_family_spec families[] = {{0}, {&parent, 1}};
    bal_error err = {0};
    ck_assert_int_eq(bal_network_create(bal_network_domain(n), families, 0, &made, &err), BAL_ERR_DATA);
    ck_assert_ptr_null(made);
    ck_assert_str_eq(err.code, "unknown-parent");
    ck_assert_str_eq(err.variable, "B");
    bal_network_free(n);
}
END_TEST

START_TEST(networks_are_equal_when_domain_and_parents_are) {
    static const char *const texts[] = {"A:a,b ; B:a,b | A ; C:a,b | A,B", "A:a,b ; B:a,b | A ; C:a,b | B,A",
                                        "A:a,b ; B:a,b | A ; C:a,b | A",   "A:a,b ; B:a,b | A ; C:a,b | B",
                                        "A:a,c ; B:a,b | A ; C:a,b | A,B", "A:a,b ; B:a,b ; C:a,b | A,B"};
    enum { N = sizeof texts / sizeof texts[0] };
    bal_network *networks[N], *again = network_of(texts[0]);
    for (size_t i = 0; i < N; i++) networks[i] = network_of(texts[i]);
    ck_assert(bal_network_equal(networks[0], again));
    for (size_t i = 0; i < N; i++)
        for (size_t j = 0; j < N; j++) ck_assert_int_eq(bal_network_equal(networks[i], networks[j]), i == j);
    for (size_t i = 0; i < N; i++) bal_network_free(networks[i]);
    bal_network_free(again);
}
END_TEST

START_TEST(a_network_lives_until_its_last_holder_goes) {
    bal_network *n = network_of("A:a,b"), *held = bali_network_hold(n);
    bal_network_free(n);
    ck_assert_str_eq(bal_domain_name(bal_network_domain(held), 0), "A");
    bal_network_free(held);
    bal_network_free(NULL);
}
END_TEST

static bal_status make_and_free(void *context, bal_error *err) {
    const bal_network *model = context;
    size_t n_parents, n = bal_network_variables(model);
    bal_family_spec families[8];
    for (size_t v = 0; v < n; v++) {
        families[v].parents = bal_network_parents(model, v, &n_parents);
        families[v].n_parents = n_parents;
    }
    bal_network *made = (bal_network *)model;
    bal_status status = bal_network_create(bal_network_domain(model), families, 0, &made, err);
    if (status != BAL_OK) ck_assert_ptr_null(made);
    if (status == BAL_OK) ck_assert(bal_network_equal(made, model));
    bal_network_free(made);
    return status;
}

START_TEST(a_network_survives_failing_allocations) {
    bal_network *n = network_of("A:a,b ; B:a,b | A ; C:a,b | A,B");
    ck_assert_uint_ge(survive_allocations(make_and_free, n), 5);
    bal_network_free(n);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("network");
    TCase *c = tcase_create("network");
    tcase_add_test(c, a_network_says_its_sizes);
    tcase_add_test(c, the_order_has_parents_first);
    tcase_add_loop_test(c, a_bad_network_is_refused, 0, sizeof refusals / sizeof refusals[0]);
    tcase_add_test(c, a_cycle_of_long_names_is_told_briefly);
    tcase_add_loop_test(c, a_family_that_overflows_is_refused, 0, sizeof too_wide / sizeof too_wide[0]);
    tcase_add_test(c, the_limit_itself_is_allowed);
    tcase_add_test(c, a_parent_out_of_range_is_refused);
    tcase_add_test(c, networks_are_equal_when_domain_and_parents_are);
    tcase_add_test(c, a_network_lives_until_its_last_holder_goes);
    tcase_add_test(c, a_network_survives_failing_allocations);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
