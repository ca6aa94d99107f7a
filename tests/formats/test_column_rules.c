#include "formats/column_rules.h"

#include "support/document_texts.h"

#include <string.h>

#define VARIABLE(name, outcomes, properties) "<VARIABLE><NAME>" name "</NAME>" outcomes properties "</VARIABLE>\n"
#define TWO "<OUTCOME>a</OUTCOME><OUTCOME>b</OUTCOME>"
#define THREE "<OUTCOME>low</OUTCOME><OUTCOME>mid</OUTCOME><OUTCOME>high</OUTCOME>"
#define SAYS(text) "\n<PROPERTY>" text "</PROPERTY>"

static const struct {
    const char *text;
    size_t line;
    const char *code, *words;
} refused[] = {
    {VARIABLE("fever", THREE, SAYS("ballast.cuts = 37.5")), 8, "bad-cuts", "has 1 cut for 3 outcomes; give one cut less than outcomes: 2"},
    {VARIABLE("fever", THREE, SAYS("ballast.cuts = 1 2 3")), 8, "bad-cuts", "has 3 cuts for 3 outcomes"},
    {VARIABLE("fever", THREE, SAYS("ballast.cuts =")), 8, "bad-cuts", "has 0 cuts for 3 outcomes"},
    {VARIABLE("fever", THREE, SAYS("ballast.cuts = 38.5 37.5")), 8, "bad-cuts", "does not ascend at \"37.5\""},
    {VARIABLE("fever", THREE, SAYS("ballast.cuts = 37.5 37.50")), 8, "bad-cuts", "does not ascend at \"37.50\""},
    {VARIABLE("fever", THREE, SAYS("ballast.cuts = 37,5 38,5")), 8, "bad-cuts", "\"37,5\", which is no number; write numbers with a decimal point"},
    {VARIABLE("fever", THREE, SAYS("ballast.cuts = 37.5 inf")), 8, "bad-cuts", "\"inf\", which is no finite number"},
    {VARIABLE("fever", THREE, SAYS("ballast.cuts = 37.5 nan")), 8, "bad-cuts", "\"nan\""},
    {VARIABLE("fever", THREE, SAYS("ballast.cuts = 37.5 1e400")), 8, "bad-cuts", "\"1e400\""},
    {VARIABLE("fever", THREE, SAYS("ballast.cuts = 1 2") SAYS("x = y") SAYS("ballast.cuts = 1 2")), 10, "duplicate-property",
     "a second ballast.cuts of one variable; the first is on line 8: remove one"},
    {VARIABLE("fever", THREE, SAYS("ballast.column = t") SAYS("ballast.column = u")), 9, "duplicate-property", "a second ballast.column"},
    {VARIABLE("fever", THREE, SAYS("ballast.column = ")), 8, "bad-column", "names no column"},
    {VARIABLE("fever", THREE, SAYS("ballast.column = t")) VARIABLE("cold", TWO, SAYS("ballast.column = t")), 10, "bad-column",
     "ballast.column of cold names the column \"t\", which is that of fever already"},
    {VARIABLE("fever", THREE, SAYS("ballast.column = smoker")), 8, "bad-column", "which is that of the variable of that name"},
};

START_TEST(wrong_properties_are_refused_where_they_stand) {
    char text[2048];
    ck_assert_uint_lt(strlen(HEAD) + strlen(refused[_i].text) + strlen(TAIL), sizeof text);
    strcpy(text, HEAD);
    strcat(text, refused[_i].text);
    strcat(text, TAIL);
    expect_refused_text(text, bal_network_options_defaults(), refused[_i].line, 1, refused[_i].code, refused[_i].words);
}
END_TEST

static void read_rules(bali_column_rules *rules, const bal_document *document) {
    *rules = (bali_column_rules){0};
    ck_assert_int_eq(bali_column_rules_read(rules, bal_network_domain(bal_document_network(document)), document, NULL), BAL_OK);
}

START_TEST(rules_are_read_and_written) {
    static const char text[] = HEAD VARIABLE("fever", THREE, SAYS(" ballast.cuts = -1.5\t\n 38.5e0 ") SAYS("ballast.column = temp c "))
        VARIABLE("one", "<OUTCOME>only</OUTCOME>", SAYS("ballast.cuts = ")) VARIABLE("swap", TWO, SAYS("ballast.column = tap"))
            VARIABLE("tap", TWO, SAYS("ballast.column = swap")) VARIABLE("own", TWO, SAYS("ballast.column = own")) TAIL;
    bal_document *document = read_text(text);
    bali_column_rules rules;
    read_rules(&rules, document);
    ck_assert_ptr_null(rules.cuts[0]);
    ck_assert_ptr_null(bali_column_rules_column(&rules, 0));
    ck_assert(rules.cuts[2][0] == -1.5 && rules.cuts[2][1] == 38.5);
    ck_assert_str_eq(bali_column_rules_column(&rules, 2), "temp c");
    ck_assert_uint_eq(bali_column_rules_find(&rules, "temp c!", 6), 2);
    ck_assert_uint_eq(bali_column_rules_find(&rules, "fever", 5), BAL_NONE);
    ck_assert_ptr_nonnull(rules.cuts[3]);
    ck_assert_uint_eq(bali_column_rules_find(&rules, "swap", 4), 5);
    ck_assert_uint_eq(bali_column_rules_find(&rules, "tap", 3), 4);
    ck_assert_uint_eq(bali_column_rules_find(&rules, "own", 3), 6);
    bali_column_rules_free(&rules);
    expect_round_trip(document);
    bal_document_free(document);
}
END_TEST

START_TEST(without_a_document_there_are_no_rules) {
    bali_column_rules rules = {0};
    bal_document *document = read_text(HEAD TAIL), *other = read_text(HEAD VARIABLE("x", TWO, "") TAIL);
    const bal_domain *domain = bal_network_domain(bal_document_network(document));
    bal_error err = {0};
    ck_assert_int_eq(bali_column_rules_read(&rules, domain, NULL, NULL), BAL_OK);
    ck_assert_uint_eq(bali_column_rules_find(&rules, "smoker", 6), BAL_NONE);
    ck_assert_ptr_null(bali_column_rules_column(&rules, 0));
    bali_column_rules_free(&rules);
    ck_assert_int_eq(bali_column_rules_read(&rules, domain, other, &err), BAL_ERR_ARGUMENT);
    ck_assert_str_eq(err.code, "other-network");
    bali_column_rules_free(&rules);
    bal_document_free(document);
    bal_document_free(other);
}
END_TEST

/* Against the rule in words: below the first, from one to below the next, from the last on. */
START_TEST(cuts_divide_the_line) {
    static const double cuts[] = {-2, 0, 0.1, 37.5};
    for (size_t n = 0; n <= 4; n++)
        for (double x = -4; x < 40; x += 0.0625) {
            size_t expected = 0;
            while (expected < n && !(x < cuts[expected])) expected++;
            ck_assert_uint_eq(bali_cuts_outcome(cuts, n, x), expected);
        }
    ck_assert_uint_eq(bali_cuts_outcome(cuts, 4, 37.5), 4);
    ck_assert_uint_eq(bali_cuts_outcome(cuts, 4, 37.499999999999993), 3);
    ck_assert_uint_eq(bali_cuts_outcome(cuts, 4, -1e308), 0);
    ck_assert_uint_eq(bali_cuts_outcome(cuts, 4, -0.0), 2);
}
END_TEST

static bal_status read_again(void *context, bal_error *err) {
    bali_column_rules rules = {0};
    const bal_document *document = context;
    bal_status status = bali_column_rules_read(&rules, bal_network_domain(bal_document_network(document)), document, err);
    bali_column_rules_free(&rules);
    return status;
}

START_TEST(memory_may_run_out) {
    bal_document *document = read_text(HEAD VARIABLE("fever", THREE, SAYS("ballast.cuts = 1 2") SAYS("ballast.column = t")) TAIL);
    ck_assert_uint_ge(survive_allocations(read_again, document), 6);
    bal_document_free(document);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("column_rules");
    TCase *c = tcase_create("column_rules");
    tcase_add_loop_test(c, wrong_properties_are_refused_where_they_stand, 0, sizeof refused / sizeof refused[0]);
    tcase_add_test(c, rules_are_read_and_written);
    tcase_add_test(c, without_a_document_there_are_no_rules);
    tcase_add_test(c, cuts_divide_the_line);
    tcase_add_test(c, memory_may_run_out);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
