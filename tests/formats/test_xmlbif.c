/* Networks as XMLBIF 0.3: what is read, and what is refused and where. The format is that of the Interchange Format for
 * Bayesian Networks, XMLBIF 0.3 (1998), as include/ballast/formats.h has it. */
#include "base/hash.h"
#include "base/memory.h"
#include "model/document.h"
#include "support/document_texts.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

START_TEST(a_file_is_read_whole) {
    bal_document *document = read_text(
        HEAD "<PROPERTY> made by hand </PROPERTY>\n"
             "<DEFINITION>\n<TABLE> .25 <!-- no comma --> 75e-2 </TABLE><FOR>smoker</FOR></DEFINITION>\n"
             "<DEFINITION><FOR>cough</FOR>\n<GIVEN>smoker</GIVEN><TABLE>\n0.5 0.25 0.25\n0 0 1</TABLE>\n"
             "<PROPERTY>ballast.row-ess = 20 5</PROPERTY></DEFINITION>\n" TAIL);
    const bal_network *network = bal_document_network(document);
    const bal_domain *domain = bal_network_domain(network);
    ck_assert_str_eq(bal_document_name(document), "demo");
    ck_assert_uint_eq(bal_domain_variables(domain), 2);
    ck_assert_str_eq(bal_domain_name(domain, 0), "smoker");
    ck_assert_str_eq(bal_domain_name(domain, 1), "cough");
    ck_assert_uint_eq(bal_domain_outcomes(domain, 1), 3);
    ck_assert_str_eq(bal_domain_outcome(domain, 1, 2), "much");
    size_t n_parents;
    const size_t *parents = bal_network_parents(network, 1, &n_parents);
    ck_assert_uint_eq(n_parents, 1);
    ck_assert_uint_eq(parents[0], 0);
    expect_table_row(document, 0, 0, (double[]){0.25, 0.75});
    expect_table_row(document, 1, 0, (double[]){0.5, 0.25, 0.25});
    expect_table_row(document, 1, 1, (double[]){0, 0, 1});
    ck_assert_double_eq(bal_document_row_ess(document, 1)[0], 20);
    ck_assert_double_eq(bal_document_row_ess(document, 1)[1], 5);
    ck_assert_ptr_null(bal_document_row_ess(document, 0));
    ck_assert_ptr_null(bal_document_cells(document, BAL_CARRIED_COUNTS));
    size_t n_properties;
    ck_assert_str_eq(bali_document_properties(document, &n_properties)[0].text, " made by hand ");
    ck_assert_uint_eq(n_properties, 1);
    expect_round_trip(document);
    bal_document_free(document);
}
END_TEST

START_TEST(definitions_may_come_before_their_variables_and_be_missing) {
    bal_document *document = read_text(
        "<BIF VERSION='0.3'><NETWORK><DEFINITION><FOR>b</FOR><GIVEN>a</GIVEN></DEFINITION>"
        "<VARIABLE><OUTCOME>x</OUTCOME><OUTCOME>X</OUTCOME><NAME>a</NAME></VARIABLE>"
        "<VARIABLE><OUTCOME>x</OUTCOME><NAME>b</NAME></VARIABLE></NETWORK></BIF>");
    size_t n_parents;
    (void)bal_network_parents(bal_document_network(document), 1, &n_parents);
    ck_assert_uint_eq(n_parents, 1);
    (void)bal_network_parents(bal_document_network(document), 0, &n_parents);
    ck_assert_uint_eq(n_parents, 0);
    ck_assert_str_eq(bal_document_name(document), "");
    ck_assert_ptr_null(bal_document_cells(document, BAL_CARRIED_TABLES));
    ck_assert_ptr_null(bali_document_table(document, 0));
    bal_document_free(document);
}
END_TEST

START_TEST(tables_of_some_families_are_kept) {
    bal_document *document = read_text(HEAD
                                       "<DEFINITION><FOR>cough</FOR><TABLE>0.5 0.25 0.25</TABLE></DEFINITION>" TAIL);
    ck_assert_ptr_null(bal_document_cells(document, BAL_CARRIED_TABLES));
    ck_assert_ptr_null(bali_document_table(document, 0));
    expect_table_row(document, 1, 0, (double[]){0.5, 0.25, 0.25});
    bal_document_free(document);
}
END_TEST

START_TEST(counts_and_pseudo_counts_are_read) {
    bal_document *document = read_text(
        HEAD
        "<DEFINITION><FOR>smoker</FOR><PROPERTY>\n ballast.counts\t=12 3</PROPERTY>"
        "<PROPERTY>ballast.pseudo-counts = <![CDATA[0.5]]> 1e-1</PROPERTY></DEFINITION>"
        "<DEFINITION><FOR>cough</FOR><PROPERTY>ballast.pseudo-counts= 1 2 3</PROPERTY><PROPERTY>ballast.counts = 0 -0 7"
        "</PROPERTY><PROPERTY>ballast.row-ess=8</PROPERTY></DEFINITION>" TAIL);
    const double *counts = bal_cells_family(bal_document_cells(document, BAL_CARRIED_COUNTS), 0);
    const double *pseudo = bal_cells_family(bal_document_cells(document, BAL_CARRIED_PSEUDO_COUNTS), 0);
    static const double expected_counts[] = {12, 3, 0, 0, 7}, expected_pseudo[] = {0.5, 0.1, 1, 2, 3};
    for (size_t c = 0; c < 5; c++) {
        ck_assert_double_eq(counts[c], expected_counts[c]);
        ck_assert(!signbit(counts[c]));
        ck_assert_double_eq(pseudo[c], expected_pseudo[c]);
    }
    ck_assert_double_eq(bal_document_row_ess(document, 1)[0], 8);
    size_t n;
    (void)bali_document_properties(document, &n);
    ck_assert_uint_eq(n, 0);
    bal_document_free(document);
}
END_TEST

START_TEST(a_file_is_refused_with_its_place) {
    static const struct {
        const char *body;
        size_t line, column; /* line 0 is the first after HEAD */
        const char *code, *words;
    } cases[] = {
        /* variables */
        {"<VARIABLE/>", 0, 1, "empty-name", "a variable without a NAME"},
        {"<VARIABLE><NAME> </NAME></VARIABLE>", 0, 11, "empty-name", "an empty NAME"},
        {"<VARIABLE><NAME>a</NAME>\n<NAME>b</NAME></VARIABLE>", 1, 1, "duplicate-name",
         "a second NAME in one VARIABLE; the first is on line 7"},
        {"<VARIABLE><NAME>a</NAME></VARIABLE>", 0, 1, "no-outcomes", "a has no outcome"},
        {"<VARIABLE><NAME>smoker</NAME><OUTCOME>a</OUTCOME></VARIABLE>", 0, 11, "duplicate-variable",
         "smoker stands twice, first on line 5"},
        {"<VARIABLE><NAME>a</NAME><OUTCOME>b</OUTCOME>\n<OUTCOME> b</OUTCOME></VARIABLE>", 1, 1, "duplicate-outcome",
         "\"b\" of a stands twice, first on line 7"},
        {"<VARIABLE><NAME>a</NAME><OUTCOME/></VARIABLE>", 0, 25, "empty-name", "an empty OUTCOME"},
        {"<VARIABLE><NAME>a\nb</NAME></VARIABLE>", 0, 11, "control-character", "U+000A"},
        {"<VARIABLE><NAME>a&#x85;b</NAME></VARIABLE>", 0, 11, "control-character", "U+0085"},
        {"<VARIABLE TYPE='decision'><NAME>a</NAME></VARIABLE>", 0, 1, "variable-type",
         "TYPE \"decision\"; only nature is possible"},
        {"<VARIABLE TYPE=''/>", 0, 1, "variable-type", "TYPE \"\""},
        /* definitions */
        {"<DEFINITION/>", 0, 1, "no-definition-for", "without FOR"},
        {"<DEFINITION><FOR>smoker</FOR><FOR>cough</FOR></DEFINITION>", 0, 30, "duplicate-name",
         "a second FOR in one DEFINITION"},
        {"<DEFINITION><FOR>cuogh</FOR></DEFINITION>", 0, 13, "unknown-variable",
         "FOR \"cuogh\" is not a variable of this file; did you mean \"cough\"?"},
        {"<DEFINITION><FOR>age</FOR></DEFINITION>", 0, 13, "unknown-variable", "declare it as one"},
        {"<DEFINITION><FOR>cough</FOR>\n <GIVEN>Smoker</GIVEN></DEFINITION>", 1, 2, "unknown-parent",
         "parent \"Smoker\" is not a variable of this "
         "file; did you mean \"smoker\"?"},
        {"<DEFINITION><FOR>cough</FOR><GIVEN>smoker</GIVEN>\n<GIVEN>smoker</GIVEN></DEFINITION>", 1, 1,
         "duplicate-parent", "smoker of cough stands twice, first on line 7"},
        {"<DEFINITION><FOR>cough</FOR></DEFINITION>\n<DEFINITION><FOR>cough</FOR></DEFINITION>", 1, 1,
         "duplicate-definition", "cough has two definitions, the first on line 7"},
        {"<DEFINITION><FOR>cough</FOR><GIVEN>cough</GIVEN></DEFINITION>", 0, 29, "cycle", "cough -> cough"},
        {"<DEFINITION><FOR>cough</FOR><GIVEN>smoker</GIVEN></DEFINITION>\n<DEFINITION><FOR>smoker</FOR><GIVEN>cough</"
         "GIVEN></DEFINITION>",
         0, 1, "cycle", "run in a circle"},
        /* numbers */
        {"<DEFINITION><FOR>smoker</FOR>\n<TABLE>0.5</TABLE></DEFINITION>", 1, 1, "table-size",
         "TABLE of smoker has 1 numbers; expected 2 = 2 outcomes"},
        {"<DEFINITION><FOR>smoker</FOR><TABLE/></DEFINITION>", 0, 30, "table-size", "has 0 numbers"},
        {"<DEFINITION><FOR>cough</FOR><GIVEN>smoker</GIVEN><TABLE>1 0 0 1 0 0 1</TABLE></DEFINITION>", 0, 50,
         "table-size", "TABLE of cough has 7 numbers; expected 6 = 3 outcomes x 2 of smoker"},
        {"<DEFINITION><FOR>smoker</FOR><TABLE>0.5 0.5</TABLE>\n<TABLE>0.5 0.5</TABLE></DEFINITION>", 1, 1,
         "duplicate-table", "first is on line 7"},
        {"<DEFINITION><FOR>smoker</FOR><TABLE>1.1\n -0.1</TABLE></DEFINITION>", 0, 37, "bad-number",
         "\"1.1\" is more than 1"},
        {"<DEFINITION><FOR>smoker</FOR><TABLE>1\n -0.1</TABLE></DEFINITION>", 1, 2, "bad-number",
         "\"-0.1\" is negative"},
        {"<DEFINITION><FOR>smoker</FOR><TABLE>1 nan</TABLE></DEFINITION>", 0, 39, "bad-number",
         "\"nan\" is not a finite decimal number"},
        {"<DEFINITION><FOR>smoker</FOR><TABLE>1 inf</TABLE></DEFINITION>", 0, 39, "bad-number",
         "\"inf\" is not a finite decimal number"},
        {"<DEFINITION><FOR>smoker</FOR><TABLE>1 1e999</TABLE></DEFINITION>", 0, 39, "bad-number",
         "\"1e999\" is too large"},
        {"<DEFINITION><FOR>smoker</FOR><TABLE>1 0x1p-1</TABLE></DEFINITION>", 0, 39, "bad-number",
         "\"0x1p-1\" is not a finite decimal number"},
        {"<DEFINITION><FOR>smoker</FOR><TABLE>0,5 0.5</TABLE></DEFINITION>", 0, 37, "bad-number",
         "\"0,5\" is not a number; use a decimal point"},
        {"<DEFINITION><FOR>smoker</FOR><TABLE>1 .5.</TABLE></DEFINITION>", 0, 39, "bad-number",
         "\".5.\" is not a finite decimal number"},
        {"<DEFINITION><FOR>smoker</FOR><TABLE>0.5<![CDATA[ 0.]]><!-- 1 -->5x</TABLE></DEFINITION>", 0, 50, "bad-number",
         "\"0.5x\" is not"},
        {"<DEFINITION><FOR>smoker</FOR><TABLE>0.9\n0.07</TABLE></DEFINITION>", 0, 37, "row-sum",
         "the row of smoker sums to 0.97, not to 1; correct"},
        {"<DEFINITION><FOR>smoker</FOR><TABLE>0 0</TABLE></DEFINITION>", 0, 37, "row-sum", "sums to 0, not"},
        {"<DEFINITION><FOR>smoker</FOR><TABLE>0.5 0.4799</TABLE></DEFINITION>", 0, 37, "row-sum",
         "sums to 0.9799, not"},
        {"<DEFINITION><FOR>smoker</FOR><TABLE>0.5 0.5201</TABLE></DEFINITION>", 0, 37, "row-sum",
         "sums to 1.0201, not"},
        {"<DEFINITION><FOR>cough</FOR><GIVEN>smoker</GIVEN><TABLE>0.5 0.5 0\n0.5 0.6\t 0</TABLE></DEFINITION>", 1, 1,
         "row-sum", "row smoker=yes of cough sums to 1.1, not to 1"},
        /* properties */
        {"<DEFINITION><FOR>smoker</FOR><PROPERTY>ballast.counts = 1 2</PROPERTY></DEFINITION>", 0, 30,
         "incomplete-counts", "ballast.counts is given for smoker but not for cough"},
        {"<DEFINITION><FOR>cough</FOR><PROPERTY>ballast.counts = 1 "
         "2</PROPERTY></DEFINITION><DEFINITION><FOR>smoker</FOR>"
         "<PROPERTY>ballast.counts = 1 2</PROPERTY></DEFINITION>",
         0, 29, "table-size", "ballast.counts of cough has 2 numbers; expected 3 = 3 outcomes"},
        {"<DEFINITION><FOR>smoker</FOR>\n<PROPERTY> ballast.counts = 1\n -2</PROPERTY></DEFINITION>", 2, 2,
         "bad-number", "\"-2\" is negative"},
        {"<DEFINITION><FOR>smoker</FOR><PROPERTY>ballast.counts=x</PROPERTY></DEFINITION>", 0, 55, "bad-number",
         "\"x\" is not"},
        {"<DEFINITION><FOR>smoker</FOR><PROPERTY>ballast.counts = 1 2</PROPERTY>\n<PROPERTY>ballast.counts = 1 "
         "2</PROPERTY></DEFINITION>",
         1, 1, "duplicate-property", "a second ballast.counts in one definition; the first is on line 7"},
        {"<DEFINITION><FOR>cough</FOR><GIVEN>smoker</GIVEN><PROPERTY>ballast.row-ess = 1 2 3</PROPERTY></DEFINITION>",
         0, 50, "table-size", "ballast.row-ess of cough has 3 numbers; expected 1, or 2: one a row"},
        {"<DEFINITION><FOR>cough</FOR><PROPERTY>ballast.row-ess = 0</PROPERTY></DEFINITION>", 0, 57, "bad-number",
         "\"0\" is not more than 0"},
        {"<DEFINITION><FOR>cough</FOR><PROPERTY>ballast.row-ess =</PROPERTY></DEFINITION>", 0, 29, "table-size",
         "has 0 numbers"},
        {"<DEFINITION><FOR>cough</FOR><PROPERTY>\nballast.counts 1 2 3</PROPERTY></DEFINITION>", 0, 29, "bad-property",
         "a property ballast.counts without a =; write \"ballast.counts = ...\""},
        {"<DEFINITION><FOR>cough</FOR><PROPERTY>ballast.row-ess</PROPERTY></DEFINITION>", 0, 29, "bad-property",
         "a property ballast.row-ess without a ="},
        /* elements */
        {"<TABLE>1</TABLE>", 0, 1, "misplaced-element", "<TABLE> cannot stand in <NETWORK>"},
        {"<VARIABLE><FOR>a</FOR></VARIABLE>", 0, 11, "misplaced-element", "<FOR> cannot stand in <VARIABLE>"},
        {"<Definition/>", 0, 1, "misplaced-element", "<Definition> is written <DEFINITION>"},
        {"<PROBABILITY/>", 0, 1, "misplaced-element", "<PROBABILITY> is not of this format; write <DEFINITION>"},
        {"<VARIABLE><NAME>a<b/></NAME></VARIABLE>", 0, 18, "misplaced-element",
         "<b> inside <NAME>, which holds text only"},
        {"<DEFINITION><TABLE>1 <x/></TABLE></DEFINITION>", 0, 22, "misplaced-element", "<x> inside <TABLE>"},
        {"<VARIABLE>\na<NAME>a</NAME></VARIABLE>", 0, 1, "misplaced-text", "text directly inside <VARIABLE>"},
        {"<NAME>again</NAME>", 0, 1, "duplicate-name", "a second NAME in one NETWORK; the first is on line 4"},
        {"</NETWORK><NETWORK>", 0, 11, "second-network", "a second NETWORK; the first is on line 3"},
        {"<x>&y;</x>", 0, 4, "bad-xml", "an entity"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        bali_text bytes = {0};
        bali_text_printf(&bytes, "%s%s%s", HEAD, cases[i].body, TAIL);
        expect_refused_text(bytes.bytes, bal_network_options_defaults(), cases[i].line + HEAD_LINES + 1,
                            cases[i].column, cases[i].code, cases[i].words);
        bali_text_free(&bytes);
    }
}
END_TEST

START_TEST(other_roots_and_versions_are_refused) {
    static const struct {
        const char *bytes;
        const char *code, *words;
    } cases[] = {
        {"<html><body/></html>", "wrong-root", "the root element is <html>; expected <BIF>, of XMLBIF 0.3"},
        {"<svg xmlns='http://www.w3.org/2000/svg'/>", "wrong-root", "the root element is <svg>"},
        {"<bif/>", "wrong-root", "the root element is <bif>; expected <BIF>"},
        {"<BIF VERSION='0.4'/>", "format-version", "version \"0.4\" of the format is not read; use 0.3"},
        {"<BIF VERSION='0.3'/>", "no-network", "there is no NETWORK"},
        {"<BIF VERSION='0.3'><NETWORK/></BIF>", "no-variables", "there is no VARIABLE"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++)
        expect_refused_text(cases[i].bytes, bal_network_options_defaults(), 1, 1, cases[i].code, cases[i].words);
}
END_TEST

START_TEST(names_have_their_limits) {
    char name[300];
    memset(name, 'n', sizeof name);
    for (size_t length = BAL_MAX_NAME_BYTES; length <= BAL_MAX_NAME_BYTES + 1; length++) {
        bali_text bytes = {0};
        bali_text_printf(&bytes, "%s<VARIABLE><NAME>%.*s</NAME><OUTCOME>a</OUTCOME></VARIABLE>%s", HEAD, (int)length,
                         name, TAIL);
        if (length == BAL_MAX_NAME_BYTES) {
            bal_document_free(read_text(bytes.bytes));
        } else {
            expect_refused_text(bytes.bytes, bal_network_options_defaults(), 7, 11, "long-name",
                                "has 256 bytes; use at most 255");
        }
        bali_text_free(&bytes);
    }
    for (size_t n = BAL_MAX_OUTCOMES; n <= BAL_MAX_OUTCOMES + 1; n++) {
        bali_text bytes = {0};
        bali_text_puts(&bytes, HEAD "<VARIABLE><NAME>a</NAME>");
        for (size_t k = 0; k < n; k++) bali_text_printf(&bytes, "\n<OUTCOME>%zu</OUTCOME>", k);
        bali_text_puts(&bytes, "</VARIABLE>" TAIL);
        if (n == BAL_MAX_OUTCOMES) {
            bal_document_free(read_text(bytes.bytes));
        } else {
            expect_refused_text(bytes.bytes, bal_network_options_defaults(), 7 + BAL_MAX_OUTCOMES + 1, 1,
                                "too-many-outcomes", "at most 65534");
        }
        bali_text_free(&bytes);
    }
}
END_TEST

START_TEST(long_texts_belong_into_tables_and_properties) {
    enum { LONG = 30000000, LIMIT = 1 << 20 };
    char *run = bali_allocate(LONG + 1, 1);
    memset(run, ' ', LONG);
    bali_text bytes = {0};
    bali_text_printf(&bytes, "%s<DEFINITION><FOR>smoker</FOR><TABLE>0.5%s0.5</TABLE></DEFINITION>%s", HEAD, run, TAIL);
    bal_document *document = read_text(bytes.bytes);
    expect_table_row(document, 0, 0, (double[]){0.5, 0.5});
    bal_document_free(document);
    bali_text_clear(&bytes);
    memset(run, 'x', LONG);
    bali_text_printf(&bytes, "%s<PROPERTY>%s</PROPERTY>%s", HEAD, run, TAIL);
    document = read_text(bytes.bytes);
    size_t n;
    ck_assert_uint_eq(strlen(bali_document_properties(document, &n)[0].text), LONG);
    bal_document_free(document);

    static const char *const places[][2] = {
        {"<VARIABLE><NAME>", "</NAME></VARIABLE>"}, {"<odd>", "</odd>"}, {"<odd><x>", "</x></odd>"}};
    for (size_t i = 0; i < sizeof places / sizeof places[0]; i++) {
        bali_text_clear(&bytes);
        bali_text_printf(&bytes, "%s%s%.*s%s%s", HEAD, places[i][0], LIMIT + 1, run, places[i][1], TAIL);
        bal_error err = {0};
        ck_assert_int_eq(read_bytes(bytes.bytes, bytes.length, bal_network_options_defaults(), NULL, &document, &err),
                         BAL_ERR_DATA);
        ck_assert_str_eq(err.code, "xml-limit");
    }
    bali_text_free(&bytes);
    bali_free(run);
}
END_TEST

/* ---- files ---- */

static const char small[] = HEAD
    "<DEFINITION><FOR>smoker</FOR><TABLE>0.25 0.75</TABLE><PROPERTY>ballast.counts = 1 3</PROPERTY></DEFINITION>\n"
    "<DEFINITION><FOR>cough</FOR><GIVEN>smoker</GIVEN><TABLE>0.5 0.25 0.25 0 0 1</TABLE>\n"
    "<PROPERTY>ballast.counts = 1 0 0 0 2 "
    "1</PROPERTY><PROPERTY>ballast.row-ess=4</PROPERTY><PROPERTY>x</PROPERTY></DEFINITION>\n" TAIL;

START_TEST(files_are_read_with_their_facts_and_written) {
    const char *path = scratch_file("model.xml", small, strlen(small));
    bal_document *document = NULL;
    bal_file_facts facts;
    bal_error err = {0};
    ck_assert_int_eq(bal_document_read(path, NULL, &document, &facts, &err), BAL_OK);
    char expected[BALI_HASH_TEXT];
    bali_hash *hash = bali_hash_create();
    bali_hash_add(hash, small, strlen(small));
    bali_hash_take(hash, expected);
    bali_hash_free(hash);
    ck_assert_str_eq(facts.name, "model.xml");
    ck_assert_uint_eq(facts.bytes, strlen(small));
    ck_assert_str_eq(facts.sha256, expected);

    char again[1024];
    (void)snprintf(again, sizeof again, "%s/again.xml", scratch_dir());
    ck_assert_int_eq(bal_document_write(document, again, &err), BAL_OK);
    bal_document *back = NULL;
    ck_assert_int_eq(bal_document_read(again, NULL, &back, NULL, &err), BAL_OK);
    expect_equal_documents(document, back);
    bal_document_free(back);
    ck_assert_int_eq(bal_document_write(document, "/no/such/folder/x.xml", &err), BAL_ERR_IO);
    bal_document_free(document);

    err = (bal_error){0};
    ck_assert_int_eq(bal_document_read("/no/such/file.xml", NULL, &document, &facts, &err), BAL_ERR_IO);
    ck_assert_ptr_null(document);
    ck_assert_str_eq(facts.name, "");
    err = (bal_error){0};
    path = scratch_file("broken.xml", "<BIF>", 5);
    ck_assert_int_eq(bal_document_read(path, NULL, &document, &facts, &err), BAL_ERR_SYNTAX);
    ck_assert_str_eq(err.file, path);
    ck_assert_uint_eq(err.line, 1);
    ck_assert_str_eq(facts.sha256, "");
}
END_TEST

static bal_status read_and_print(void *context, bal_error *err) {
    const char *bytes = context;
    bal_document *document = NULL;
    char *text = NULL;
    size_t length = 0;
    said s = {0};
    bal_status status = read_bytes(bytes, strlen(bytes), bal_network_options_defaults(), NULL, &document, err);
    if (status != BAL_OK) ck_assert_ptr_null(document);
    if (status == BAL_OK) {
        status = bal_document_print(document, &text, &length, err);
        ck_assert((text == NULL) == (status != BAL_OK));
    }
    bal_text_free(text);
    bal_document_free(document);
    bali_text_free(&s.text);
    return status;
}

static bal_status read_path(void *context, bal_error *err) {
    bal_document *document = NULL;
    bal_file_facts facts;
    bal_status status = bal_document_read(context, NULL, &document, &facts, err);
    ck_assert((document == NULL) == (status != BAL_OK));
    bal_document_free(document);
    return status;
}

START_TEST(memory_that_runs_out_is_reported) {
    static char odd[] = HEAD
        "<odd/><even/><VARIABLE "
        "q=''><NAME>z</NAME><OUTCOME>1</OUTCOME><PROPERTY>v</PROPERTY></VARIABLE><DEFINITION><FOR>cough</FOR>"
        "<GIVEN>smoker</GIVEN><GIVEN>z</GIVEN><TABLE>0.5 0.25 0.249 0 0 1</TABLE></DEFINITION>" TAIL;
    char bytes[sizeof small];
    memcpy(bytes, small, sizeof small);
    ck_assert_uint_gt(survive_allocations(read_and_print, bytes), 50);
    ck_assert_uint_gt(survive_allocations(read_and_print, odd), 50);
    char path[1024];
    (void)snprintf(path, sizeof path, "%s", scratch_file("model.xml", small, strlen(small)));
    ck_assert_uint_gt(survive_allocations(read_path, path), 50);
}
END_TEST

/* Every byte becomes others; what is then still accepted is a document that comes back equal. */
START_TEST(any_changed_byte_is_refused_or_read) {
    char bytes[sizeof small];
    size_t accepted = 0;
    for (size_t i = 0; i < strlen(small); i++) {
        for (size_t change = 0; change < 12; change++) {
            static const unsigned char changes[12] = {1,  2,   4,   8,         16,        32,
                                                      64, 128, 255, '<' ^ '0', ' ' ^ '0', '-' ^ '0'};
            memcpy(bytes, small, sizeof small);
            bytes[i] = (char)((unsigned char)bytes[i] ^ changes[change]);
            bal_document *document = NULL;
            bal_error err = {0};
            bal_status status = read_bytes(bytes, strlen(small), bal_network_options_defaults(), NULL, &document, &err);
            if (status == BAL_OK) {
                expect_round_trip(document);
                accepted++;
            } else {
                ck_assert_msg((status == BAL_ERR_SYNTAX || status == BAL_ERR_DATA) && err.line > 0,
                              "byte %zu, change %zu: %d %s", i, change, (int)status, err.message);
                ck_assert_ptr_null(document);
            }
            bal_document_free(document);
        }
    }
    ck_assert_uint_gt(accepted, 100);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("xmlbif");
    TCase *t = tcase_create("xmlbif");
    tcase_set_timeout(t, 60);
    tcase_add_test(t, a_file_is_read_whole);
    tcase_add_test(t, definitions_may_come_before_their_variables_and_be_missing);
    tcase_add_test(t, tables_of_some_families_are_kept);
    tcase_add_test(t, counts_and_pseudo_counts_are_read);
    tcase_add_test(t, a_file_is_refused_with_its_place);
    tcase_add_test(t, other_roots_and_versions_are_refused);
    tcase_add_test(t, names_have_their_limits);
    tcase_add_test(t, long_texts_belong_into_tables_and_properties);
    tcase_add_test(t, files_are_read_with_their_facts_and_written);
    tcase_add_test(t, memory_that_runs_out_is_reported);
    tcase_add_test(t, any_changed_byte_is_refused_or_read);
    suite_add_tcase(s, t);
    return s;
}

int main(void) {
    return run_suite(suite());
}
