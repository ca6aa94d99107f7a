/* From lists of numbers to tables: their order, their lengths, rows that have to sum to 1, and what is warned of on the
 * way. */
#include "support/document_texts.h"

#include <string.h>

/* 2 x 2 x 3: with FOR slowest, cell k of row j stands at 4 k + j. */
START_TEST(the_other_table_order_is_read_when_asked_for) {
    static const char bytes[] = HEAD "<VARIABLE><NAME>old</NAME><OUTCOME>no</OUTCOME><OUTCOME>yes</OUTCOME></VARIABLE>"
                                     "<DEFINITION><FOR>cough</FOR><GIVEN>smoker</GIVEN><GIVEN>old</GIVEN><TABLE>\n"
                                     "0.1 0.2 0.3 0.4\n 0.2 0.3 0.4 0.5\n 0.7 0.5 0.3 0.1</TABLE></DEFINITION>" TAIL;
    bal_network_options options = bal_network_options_defaults();
    expect_refused_text(
        bytes, options, 8, 1, "row-sum",
        "row smoker=no, old=no of cough sums to 0.6, not to 1; every row sums to 1 with the outcomes of FOR "
        "slowest: use "
        "--table-order for-slowest");
    options.for_slowest = true;
    bal_document *document = read_or_fail(bytes, options, NULL);
    expect_table_row(document, 1, 0, (double[]){0.1, 0.2, 0.7});
    expect_table_row(document, 1, 3, (double[]){0.4, 0.5, 0.1});
    bal_document_free(document);
    expect_refused_text(
        HEAD
        "<DEFINITION><FOR>cough</FOR><GIVEN>smoker</GIVEN><TABLE>0.1 0.2 0.7\n0.5 0.25 0.25</TABLE></DEFINITION>" TAIL,
        options, 7, 57, "row-sum", "with the outcomes of FOR fastest: leave out --table-order for-slowest");
    expect_refused_text(
        HEAD
        "<DEFINITION><FOR>cough</FOR><GIVEN>smoker</GIVEN><TABLE>0.1 0.2 0.3\n0.5 0.6 0.25</TABLE></DEFINITION>" TAIL,
        options, 7, 61, "row-sum", "row smoker=yes of cough sums to 0.95, not to 1; correct its numbers");
}
END_TEST

START_TEST(warnings_are_told_with_their_place) {
    static const struct {
        const char *bytes, *expected;
    } cases[] = {
        {"<BIF>"
         "<NETWORK><VARIABLE><NAME>a</NAME><OUTCOME>b</OUTCOME></VARIABLE></NETWORK></BIF>",
         "no-version 1:1 the root element has no VERSION; read as version 0.3\n"},
        {HEAD "<note>1 &lt; <b/> 2</note>\n<note/><VARIABLE a='1' TYPE='nature' "
              "xml:lang='en'><NAME>x</NAME><OUTCOME>y</OUTCOME></VARIABLE><memo/>" TAIL,
         "unknown-element 7:1 element <note> is not of this format and is passed over; it will not be written\n"
         "unknown-attribute 8:8 attribute a of <VARIABLE> is not known, and not used\n"
         "unknown-element 8:97 element <memo> is not of this format and is passed over; it will not be written\n"},
        {"<!DOCTYPE BIF [<!ATTLIST VARIABLE TYPE (nature|decision) 'nature'>]>\n"
         "<BIF VERSION='0.3'><NETWORK><VARIABLE><NAME>a</NAME>"
         "<OUTCOME>b</OUTCOME></VARIABLE></NETWORK></BIF>",
         ""},
        {"<!DOCTYPE BIF [<!ATTLIST VARIABLE TYPE (nature|decision) \"decision\">]>\n"
         "<BIF VERSION='0.3'><NETWORK><VARIABLE><NAME>a</NAME>"
         "<OUTCOME>b</OUTCOME></VARIABLE></NETWORK></BIF>",
         "default-attribute 1:35 the default value \"decision\" of attribute TYPE of VARIABLE in the document type is "
         "not applied; write it in "
         "each tag\n"},
        {HEAD "<DEFINITION><FOR>smoker</FOR><TABLE>0.5\n0.499</TABLE></DEFINITION>" TAIL,
         "row-renormalised 7:37 the row of smoker sums to 0.999 and was divided by that\n"},
        {HEAD "<DEFINITION><FOR>smoker</FOR><TABLE>0.5 0.500000001</TABLE></DEFINITION>" TAIL, ""},
        {HEAD "<DEFINITION><FOR>smoker</FOR><TABLE>0.5 0.499999</TABLE></DEFINITION>" TAIL, ""},
        {HEAD "<DEFINITION><FOR>smoker</FOR><TABLE>0.5 0.4999988</TABLE></DEFINITION>" TAIL,
         "row-renormalised 7:37 the row of smoker sums to 0.9999988 and was divided by that\n"},
        {HEAD "<DEFINITION><FOR>cough</FOR><GIVEN>smoker</GIVEN><TABLE>0.33 0.33 0.33\n0.34 0.34 "
              "0.34</TABLE></DEFINITION>" TAIL,
         "row-renormalised 7:57 row smoker=no of cough sums to 0.99 and was divided by that\n"
         "row-renormalised 8:1 row smoker=yes of cough sums to 1.02 and was divided by that\n"},
        /* nearly uniform numbers, off by little in one order and right in the other */
        {HEAD "<VARIABLE><NAME>b</NAME><OUTCOME>1</OUTCOME><OUTCOME>2</OUTCOME></VARIABLE><DEFINITION><FOR>smoker</"
              "FOR><GIVEN>b</GIVEN><TABLE>0.495 0.505\n"
              "0.505 0.495</TABLE></DEFINITION>" TAIL,
         ""},
        {HEAD "<VARIABLE><NAME>b</NAME><OUTCOME>1</OUTCOME><OUTCOME>2</OUTCOME></VARIABLE><DEFINITION><FOR>smoker</"
              "FOR><GIVEN>b</GIVEN>\n<TABLE>0.495 0.495\n"
              "0.505 0.505</TABLE></DEFINITION>" TAIL,
         "row-renormalised 8:8 row b=1 of smoker sums to 0.99 and was divided by that; every row sums to 1 with the "
         "outcomes of FOR slowest: use "
         "--table-order for-slowest\n"
         "row-renormalised 9:1 row b=2 of smoker sums to 1.01 and was divided by that; every row sums to 1 with the "
         "outcomes of FOR slowest: use "
         "--table-order for-slowest\n"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        said s = {0};
        bal_document_free(read_or_fail(cases[i].bytes, bal_network_options_defaults(), &s));
        ck_assert_str_eq(bali_text_string(&s.text), cases[i].expected);
        bali_text_free(&s.text);
    }
}
END_TEST

START_TEST(ten_warnings_of_a_kind_are_told_and_the_rest_counted) {
    for (int n = 10; n <= 30; n += 20) {
        bali_text bytes = {0};
        said s = {0};
        bali_text_puts(&bytes, HEAD "<VARIABLE><NAME>many</NAME>");
        for (int k = 0; k < 100 * n; k++) bali_text_printf(&bytes, "<OUTCOME>%d</OUTCOME>", k);
        bali_text_puts(&bytes, "</VARIABLE><DEFINITION><FOR>smoker</FOR><GIVEN>many</GIVEN><TABLE>");
        for (int k = 0; k < 100 * n; k++) bali_text_puts(&bytes, "0.5 0.499\n");
        bali_text_puts(&bytes, "</TABLE></DEFINITION>");
        for (int k = 0; k < n; k++) bali_text_printf(&bytes, "<odd%d/>", k);
        bali_text_puts(&bytes, TAIL);
        bal_document_free(read_or_fail(bytes.bytes, bal_network_options_defaults(), &s));
        ck_assert_uint_eq(s.n, n == 10 ? 21 : 22);
        ck_assert_ptr_nonnull(strstr(s.text.bytes, n == 10
                                                       ? "further-warnings 0:0 and 990 more of [row-renormalised]\n"
                                                       : "further-warnings 0:0 and 2990 more of [row-renormalised]\n"));
        ck_assert((strstr(s.text.bytes, "further-warnings 0:0 and 20 more of [unknown-element]\n") != NULL) ==
                  (n == 30));
        bali_text_free(&s.text);
        bali_text_free(&bytes);
    }
}
END_TEST

/* Divided by their sum: 1/3 each; and 0.98 and 1.02 exactly are within 0.02. */
START_TEST(rows_are_renormalised) {
    static const struct {
        const char *row;
        double expected[3];
    } cases[] = {
        {"0.333333 0.333333 0.333333", {1.0 / 3, 1.0 / 3, 1.0 / 3}},
        {"0.333 0.333 0.333", {1.0 / 3, 1.0 / 3, 1.0 / 3}},
        {"0.49 0.49 0", {0.5, 0.5, 0}},
        {"0.51 0.51 0", {0.5, 0.5, 0}},
        {"0 1e-300 1", {0, 1e-300, 1}},
        {"1.000001 0 0", {1, 0, 0}},
        {"0 1.02 0", {0, 1, 0}},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        bali_text bytes = {0};
        bali_text_printf(&bytes, "%s<DEFINITION><FOR>cough</FOR><TABLE>%s</TABLE></DEFINITION>%s", HEAD, cases[i].row,
                         TAIL);
        bal_document *document = read_text(bytes.bytes);
        expect_table_row(document, 1, 0, cases[i].expected);
        bal_document_free(document);
        bali_text_free(&bytes);
    }
}
END_TEST

/* 40 parents of 10 outcomes are 10^40 cells; 32 parents of 4 outcomes and 2 own ones just overflow 64 bits. */
START_TEST(too_many_cells_are_refused_before_they_are_allocated) {
    static const struct { size_t parents, outcomes; } cases[] = {{40, 10}, {32, 4}, {22, 2}};
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        bali_text bytes = {0};
        bali_text_puts(&bytes, HEAD);
        for (size_t p = 0; p < cases[i].parents; p++) {
            bali_text_printf(&bytes, "<VARIABLE><NAME>p%zu</NAME>", p);
            for (size_t k = 0; k < cases[i].outcomes; k++) bali_text_printf(&bytes, "<OUTCOME>%zu</OUTCOME>", k);
            bali_text_puts(&bytes, "</VARIABLE>");
        }
        bali_text_puts(&bytes, "\n<DEFINITION><FOR>smoker</FOR>");
        for (size_t p = 0; p < cases[i].parents; p++) bali_text_printf(&bytes, "<GIVEN>p%zu</GIVEN>", p);
        bali_text_puts(&bytes, "<TABLE>0.5 0.5</TABLE></DEFINITION>" TAIL);
        expect_refused_text(bytes.bytes, bal_network_options_defaults(), 8, 1, "too-many-cells", "over 4194304 cells");
        bali_text_free(&bytes);
    }
    bal_network_options options = bal_network_options_defaults();
    options.max_cells = 4;
    expect_refused_text(HEAD "<DEFINITION><FOR>cough</FOR>\n<TABLE>0 0 0 0 0</TABLE></DEFINITION>" TAIL, options, 8, 1,
                        "too-many-cells", "more than 4 numbers; correct the list, or raise --max-cells");
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("draft");
    TCase *t = tcase_create("draft");
    tcase_set_timeout(t, 60);
    tcase_add_test(t, the_other_table_order_is_read_when_asked_for);
    tcase_add_test(t, warnings_are_told_with_their_place);
    tcase_add_test(t, ten_warnings_of_a_kind_are_told_and_the_rest_counted);
    tcase_add_test(t, rows_are_renormalised);
    tcase_add_test(t, too_many_cells_are_refused_before_they_are_allocated);
    suite_add_tcase(s, t);
    return s;
}

int main(void) {
    return run_suite(suite());
}
