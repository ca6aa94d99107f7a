#include "model/domain.h"

#include "support/fixtures.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static const char *const yes_no[] = {"yes", "no"};

static bal_status make_domain(const bal_variable_spec *variables, size_t n, bal_domain **out, bal_error *err) {
    *out = (bal_domain *)variables; /* anything but NULL: a failure has to clear it */
    return bal_domain_create(variables, n, out, err);
}

START_TEST(a_domain_keeps_its_texts_in_order) {
    char name[] = "Fever", label[] = "high";
    const char *outcomes[] = {"none", label, "\xC3\xA9lev\xC3\xA9" "e"};
    const bal_variable_spec variables[] = {{name, outcomes, 3}, {"Test result", yes_no, 2}, {"fever", yes_no, 1}};
    bal_domain *domain;
    ck_assert_int_eq(make_domain(variables, 3, &domain, NULL), BAL_OK);
    memset(name, 'x', 5); /* what the domain was made of may go */
    memset(label, 'x', 4);

    ck_assert_uint_eq(bal_domain_variables(domain), 3);
    ck_assert_str_eq(bal_domain_name(domain, 0), "Fever");
    ck_assert_str_eq(bal_domain_name(domain, 1), "Test result");
    ck_assert_uint_eq(bal_domain_outcomes(domain, 0), 3);
    ck_assert_uint_eq(bal_domain_outcomes(domain, 2), 1);
    ck_assert_str_eq(bal_domain_outcome(domain, 0, 1), "high");
    ck_assert_str_eq(bal_domain_outcome(domain, 0, 2), "\xC3\xA9lev\xC3\xA9" "e");
    ck_assert_str_eq(bali_domain_names(domain)[1], "Test result");
    ck_assert_str_eq(bali_domain_labels(domain, 0)[0], "none");
    bal_domain_free(domain);
}
END_TEST

START_TEST(names_are_found_exactly) {
    const bal_variable_spec variables[] = {{"Fever", yes_no, 2}, {"fever", yes_no, 2}};
    bal_domain *domain;
    ck_assert_int_eq(make_domain(variables, 2, &domain, NULL), BAL_OK);
    ck_assert_uint_eq(bal_domain_find(domain, "Fever"), 0);
    ck_assert_uint_eq(bal_domain_find(domain, "fever"), 1);
    ck_assert_uint_eq(bal_domain_find(domain, "Feve"), BAL_NONE);
    ck_assert_uint_eq(bal_domain_find(domain, ""), BAL_NONE);
    ck_assert_uint_eq(bali_domain_find(domain, "fevers", 5), 1);
    ck_assert_uint_eq(bal_domain_find_outcome(domain, 1, "no"), 1);
    ck_assert_uint_eq(bal_domain_find_outcome(domain, 1, "No"), BAL_NONE);
    ck_assert_uint_eq(bali_domain_find_outcome(domain, 1, "yes,no", 3), 0);
    bal_domain_free(domain);
}
END_TEST

#define TEN "0123456789"
#define FIFTY TEN TEN TEN TEN TEN
#define NAME_255 FIFTY FIFTY FIFTY FIFTY FIFTY "01234"

/* One variable X with the outcomes a, b unless said otherwise, and how its domain is refused. */
static const struct {
    const char *name, *outcome; /* of variable 1 */
    const char *code, *says, *variable;
} refusals[] = {
    {"", "a", "empty-name", "a variable has no name; give it one", ""},
    {NULL, "a", "empty-name", "a variable has no name", ""},
    {"X", "", "empty-name", "an outcome has no name", "X"},
    {"X", NULL, "empty-name", "an outcome has no name", "X"},
    {NAME_255 "5", "a", "long-name",
     "a variable \"0123456789012345678901234567890123456789...\" has 256 bytes; use at most 255", NAME_255},
    {"X", NAME_255 "5", "long-name", "has 256 bytes", "X"},
    {"Fever\x1B[31m", "a", "control-character", "a variable \"Fever\\x1B[31m\" holds the control character U+001B",
     "Fever\x1B[31m"},
    {"X", "a\nb", "control-character", "an outcome \"a\\x0Ab\" holds the control character U+000A; remove it", "X"},
    {"X", "a\tb", "control-character", "U+0009", "X"},
    {"X", "\u202Eabc", "control-character", "U+202E", "X"}, /* right-to-left override */
    {"X", "\xC2\x85", "control-character", "U+0085", "X"}, /* next line, a C1 control */
    {"X", "caf\xE9", "bad-utf8", "an outcome is not UTF-8", "X"},
    {"X\xC0\xAF", "a", "bad-utf8", "a variable is not UTF-8", "X\xC0\xAF"}, /* overlong */
    {"X", "\xED\xA0\x80", "bad-utf8", "not UTF-8", "X"},                    /* surrogate */
    {"W", "a", "duplicate-variable", "variable W stands twice, as number 1 and 2; rename or remove one", "W"},
    {"X", "b", "duplicate-outcome", "outcome \"b\" of X stands twice, as number 1 and 2; rename or remove one", "X"},
};

START_TEST(a_bad_name_is_refused) {
    const char *outcomes[] = {"b", refusals[_i].outcome};
    const bal_variable_spec variables[] = {{"W", yes_no, 2}, {refusals[_i].name, outcomes, 2}};
    bal_domain *domain;
    bal_error err = {0};
    ck_assert_int_eq(make_domain(variables, 2, &domain, &err), BAL_ERR_DATA);
    ck_assert_ptr_null(domain);
    ck_assert_str_eq(err.code, refusals[_i].code);
    ck_assert_msg(strstr(err.message, refusals[_i].says), "%s", err.message);
    ck_assert_str_eq(err.variable, refusals[_i].variable);
    ck_assert_ptr_nonnull(bal_code_find(err.code));
}
END_TEST

START_TEST(a_name_of_255_bytes_is_a_name) {
    const char *outcomes[] = {NAME_255, "b"};
    const bal_variable_spec variables[] = {{NAME_255, outcomes, 2}};
    bal_domain *domain;
    ck_assert_int_eq(make_domain(variables, 1, &domain, NULL), BAL_OK);
    ck_assert_uint_eq(bal_domain_find(domain, NAME_255), 0);
    bal_domain_free(domain);
}
END_TEST

/* n outcomes named 0, 1 ...; the texts behind them stand in text, 8 bytes each. */
static const char **number_outcomes(size_t n, char **text) {
    const char **outcomes = calloc(n, sizeof *outcomes);
    *text = calloc(n, 8);
    ck_assert(outcomes && *text);
    for (size_t k = 0; k < n; k++) {
        (void)snprintf(*text + 8 * k, 8, "%u", (unsigned)k % 1000000);
        outcomes[k] = *text + 8 * k;
    }
    return outcomes;
}

START_TEST(a_variable_has_1_to_65534_outcomes) {
    static const struct {
        size_t n;
        const char *code;
    } cases[] = {{0, "no-outcomes"}, {1, NULL}, {65534, NULL}, {65535, "too-many-outcomes"}, {SIZE_MAX, "too-many-outcomes"}};
    char *text;
    const char **outcomes = number_outcomes(65535, &text);
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        const bal_variable_spec variable = {"X", outcomes, cases[i].n};
        bal_domain *domain;
        bal_error err = {0};
        bal_status status = make_domain(&variable, 1, &domain, &err);
        ck_assert_int_eq(status, cases[i].code ? BAL_ERR_DATA : BAL_OK);
        if (cases[i].code) {
            ck_assert_ptr_null(domain);
            ck_assert_str_eq(err.code, cases[i].code);
            ck_assert_str_eq(err.variable, "X");
        } else {
            ck_assert_uint_eq(bal_domain_outcomes(domain, 0), cases[i].n);
            ck_assert_uint_eq(bal_domain_find_outcome(domain, 0, outcomes[cases[i].n - 1]), cases[i].n - 1);
        }
        bal_domain_free(domain);
    }
    free(outcomes);
    free(text);
}
END_TEST

START_TEST(a_domain_has_a_variable) {
    bal_domain *domain;
    bal_error err = {0};
    ck_assert_int_eq(bal_domain_create(NULL, 0, &domain, &err), BAL_ERR_DATA);
    ck_assert_ptr_null(domain);
    ck_assert_str_eq(err.code, "no-variables");
}
END_TEST

/* Pairs of one-variable or two-variable domains that differ in one thing. */
START_TEST(domains_are_equal_when_texts_and_order_are) {
    const char *const no_yes[] = {"no", "yes"};
    const bal_variable_spec all[][2] = {
        {{"A", yes_no, 2}, {"B", yes_no, 2}}, {{"B", yes_no, 2}, {"A", yes_no, 2}}, {{"A", no_yes, 2}, {"B", yes_no, 2}},
        {{"A", yes_no, 2}, {"B", yes_no, 1}}, {{"A", yes_no, 2}, {"b", yes_no, 2}},
    };
    enum { N = sizeof all / sizeof all[0] };
    bal_domain *domains[N], *again, *shorter;
    for (size_t i = 0; i < N; i++) ck_assert_int_eq(make_domain(all[i], 2, &domains[i], NULL), BAL_OK);
    ck_assert_int_eq(make_domain(all[0], 2, &again, NULL), BAL_OK);
    ck_assert_int_eq(make_domain(all[0], 1, &shorter, NULL), BAL_OK);
    ck_assert(bali_domain_equal(domains[0], domains[0]));
    ck_assert(bali_domain_equal(domains[0], again));
    ck_assert(!bali_domain_equal(domains[0], shorter));
    for (size_t i = 0; i < N; i++)
        for (size_t j = 0; j < N; j++) ck_assert_int_eq(bali_domain_equal(domains[i], domains[j]), i == j);
    for (size_t i = 0; i < N; i++) bal_domain_free(domains[i]);
    bal_domain_free(again);
    bal_domain_free(shorter);
}
END_TEST

START_TEST(a_domain_lives_until_its_last_holder_goes) {
    const bal_variable_spec variable = {"A", yes_no, 2};
    bal_domain *domain;
    ck_assert_int_eq(make_domain(&variable, 1, &domain, NULL), BAL_OK);
    bal_domain *held = bali_domain_hold(domain);
    bal_domain_free(domain);
    ck_assert_str_eq(bal_domain_name(held, 0), "A");
    bal_domain_free(held);
    bal_domain_free(NULL);
}
END_TEST

static bal_status make_and_free(void *context, bal_error *err) {
    (void)context;
    char *text;
    const char **outcomes = number_outcomes(40, &text);
    const bal_variable_spec variables[] = {{"A", outcomes, 40}, {"B", yes_no, 2}};
    bal_domain *domain;
    bal_status status = make_domain(variables, 2, &domain, err);
    if (status != BAL_OK) ck_assert_ptr_null(domain);
    bal_domain_free(domain);
    free(outcomes);
    free(text);
    return status;
}

START_TEST(a_domain_survives_failing_allocations) {
    ck_assert_uint_gt(survive_allocations(make_and_free, NULL), 44); /* at least every text */
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("domain");
    TCase *c = tcase_create("domain");
    tcase_add_test(c, a_domain_keeps_its_texts_in_order);
    tcase_add_test(c, names_are_found_exactly);
    tcase_add_loop_test(c, a_bad_name_is_refused, 0, sizeof refusals / sizeof refusals[0]);
    tcase_add_test(c, a_name_of_255_bytes_is_a_name);
    tcase_add_test(c, a_variable_has_1_to_65534_outcomes);
    tcase_add_test(c, a_domain_has_a_variable);
    tcase_add_test(c, domains_are_equal_when_texts_and_order_are);
    tcase_add_test(c, a_domain_lives_until_its_last_holder_goes);
    tcase_add_test(c, a_domain_survives_failing_allocations);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
