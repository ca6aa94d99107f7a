#include "formats/table_dump.h"

#include <stdio.h>

enum { STOP = 0, DROP = 1, STRICT = 2, REDACT = 4, ABSENT = 8, ONE = 16, UNWANTED = 32 };

typedef struct table_case {
    const char *text;
    unsigned how;
    const char *expected;
} table_case;

static const table_case cases[] = {
    {HEADER "no,1,home\nyes,2,caf\xC3\xA9\n", STOP, "0: 0 0 1\n1: 1 1 0\n= 2 -0\n"},
    {"place,smoker,stage\n home ,\"no\", \"1\"\n", STOP,
     "clinic.csv:2:14: a quote behind blanks; remove the blanks, or quote the whole cell and double the quotes in it (in column stage) "
     "[misplaced-quote]\n"},
    {"place,smoker,stage\n home ,\"no\",\"1\"\r\n\"ward with a long name\",yes,stage two", STOP, "0: 0 0 1\n1: 1 4 2\n= 2 -0\n"},
    {"smoker\nno\nyes\n\n\n", ONE, "0: 0\n1: 1\n= 2 -0\n"},
    {HEADER "no,1,home\n\n \n", STOP, "0: 0 0 1\n= 1 -0\n"},
    {HEADER, STOP, "warning clinic.csv: the table has a header and no records: an empty batch [no-records]\n= 0 -0\n"},
    {"smoker,stage,place", STOP, "warning clinic.csv: the table has a header and no records: an empty batch [no-records]\n= 0 -0\n"},

    /* Headers. */
    {"", STOP, "clinic.csv:1:1: the file is empty; the first line names the columns [no-header]\n"},
    {"\xEF\xBB\xBF", STOP, "clinic.csv:1:1: the file is empty; the first line names the columns [no-header]\n"},
    {"\n" HEADER, STOP, "clinic.csv:1:1: the first line is blank; the first line names the columns [no-header]\n"},
    {"smoker,stage,smoker,place\n", STOP, "clinic.csv:1:14: columns 1 and 3 are both named \"smoker\"; rename or remove one [duplicate-column]\n"},
    {"id,smoker,stage,place,id\n", STOP, "clinic.csv:1:23: columns 1 and 5 are both named \"id\"; rename or remove one [duplicate-column]\n"},
    {"smoker,,stage,place\n", STOP, "clinic.csv:1:8: column 2 of the header has no name; name it, or remove it [empty-column]\n"},
    {"smoker,stage,place,\nno,1,home,\n", STOP,
     "clinic.csv:1:20: column 4 of the header has no name; name it, or remove it (a delimiter at the end of every line makes an empty "
     "column) [empty-column]\n"},
    {"smoker,place\nno,home\n", STOP, "clinic.csv:1: stage has no column; add it, or rename the column that holds it [missing-column]\n"},
    {"Smoker,stage,place\n", STOP,
     "clinic.csv:1: smoker has no column; column 1, \"Smoker\", differs only in upper and lower case [missing-column]\n"},
    {"id,smo ker,stage,place\n", STOP,
     "clinic.csv:1: smoker has no column; column 2, \"smo ker\", differs only in blanks [missing-column]\n"},
    {"id,smocker,stage,place\n", STOP, "clinic.csv:1: smoker has no column; did you mean column 2, \"smocker\"? [missing-column]\n"},
    {"smoker,Stage\n", STOP,
     "clinic.csv:1: stage has no column; nor has place; column 2, \"Stage\", differs only in upper and lower case [missing-column]\n"},
    {"x,y,z\n1,2,3\n", STOP,
     "clinic.csv:1: no column is named as a variable (such as smoker); is the first line a header, and the delimiter right? "
     "[missing-column]\n"},
    {"# made by hand\n" HEADER, STOP,
     "clinic.csv:1: the first line begins with \"#\" and names no variable; remove comment lines [comment-line]\n"},
    {"smoker;stage;place\nno;1;home\n", STOP,
     "clinic.csv:1:1: the header has no \",\", but names smoker when split at \";\"; give --delimiter ';' [wrong-delimiter]\n"},
    {"\"id\";\"stage\"\n\"1\";\"2\"\n", STOP,
     "clinic.csv:1:1: the header has no \",\", but names stage when split at \";\"; give --delimiter ';' [wrong-delimiter]\n"},
    {"id,smoker,stage,place,date\n7,no,1,home,now\n", STOP,
     "0: 0 0 1\nwarning clinic.csv:1: 2 columns are not variables and are ignored: id, date [ignored-columns]\n= 1 -0\n"},
    {"smoker,note\nno,x\n", ONE, "0: 0\nwarning clinic.csv:1: 1 column is not a variable and is ignored: note [ignored-columns]\n= 1 -0\n"},
    {"a,b,c,d,e,f,g,h,i,j,k,l,smoker\n", ONE,
     "warning clinic.csv:1: 12 columns are not variables and are ignored: a, b, c, d, e, f, g, h, i, j and 2 more [ignored-columns]\n"
     "warning clinic.csv: the table has a header and no records: an empty batch [no-records]\n= 0 -0\n"},
    {"smoker,stage,place,id\n", STRICT, "clinic.csv:1:20: column 4, \"id\", is not a variable; remove it, or leave out --strict [unexpected-column]\n"},
    {"smoker\nno\n", ABSENT, "0: 0 ~ ~\n= 1 -0\n"},
    {"x\nno\n", ABSENT,
     "clinic.csv:1: no column is named as a variable (such as smoker); is the first line a header, and the delimiter right? "
     "[missing-column]\n"},
    {"smoker,stage,place\nno,not looked at,\n", UNWANTED, "0: 0 ~ ~\n= 1 -0\n"},
    {"stage,smoker\nnot looked at,no\n", UNWANTED, "0: 0 ~ ~\n= 1 -0\n"},

    /* Labels. */
    {HEADER "no,1,home\nnoo,1,home\n", STOP, "clinic.csv:3:1: \"noo\" is not an outcome of smoker (no, yes); did you mean \"no\"? [unknown-label]\n"},
    {HEADER "No,1,home\n", STOP, "clinic.csv:2:1: \"No\" is not an outcome of smoker (no, yes); did you mean \"no\"? [unknown-label]\n"},
    {HEADER "no,1.0,home\n", STOP,
     "clinic.csv:2:4: \"1.0\" is not an outcome of stage (1, 2, NA, 1-2, stage two); did you mean \"1\"? [unknown-label]\n"},
    {HEADER "no,02-Jan,home\n", STOP,
     "clinic.csv:2:4: \"02-Jan\" is not an outcome of stage (1, 2, NA, 1-2, stage two); did a spreadsheet make a date of \"1-2\"? "
     "[unknown-label]\n"},
    {HEADER "no,1,cafe\xCC\x81\n", STOP,
     "clinic.csv:2:6: \"cafe\xCC\x81\" is not an outcome of place (caf\xC3\xA9, home, ward with a long name); \"caf\xC3\xA9\" differs only in "
     "Unicode normalisation [unknown-label]\n"},
    {HEADER "no,1,\" home\"\n", STOP,
     "clinic.csv:2:6: \" home\" is not an outcome of place (caf\xC3\xA9, home, ward with a long name); \"home\" differs only in blanks "
     "[unknown-label]\n"},
    {HEADER "no,1,N/A\n", STOP,
     "clinic.csv:2:6: \"N/A\" is not an outcome of place (caf\xC3\xA9, home, ward with a long name); if it means a missing cell, give "
     "--missing-label \"N/A\" [unknown-label]\n"},
    {HEADER "no,1,Mr Smith\n", REDACT,
     "clinic.csv:2:6: the text is not an outcome of place (caf\xC3\xA9, home, ward with a long name) [unknown-label]\n"},
    {HEADER "no,1,\x1B[31m\n", STOP, "clinic.csv:2:6: control character U+001B; remove it (in column place) [control-character]\n"},
    {HEADER "\"n\no\",1,home\nnoo,1,home\n", STOP,
     "clinic.csv:2:1: \"n\\x0Ao\" is not an outcome of smoker (no, yes); \"no\" differs only in blanks [unknown-label]\n"
     "clinic.csv:4:1: \"noo\" is not an outcome of smoker (no, yes) in record 2; did you mean \"no\"? [unknown-label]\n"},
    {HEADER "x,9,y\nno,1,home\nno,8,home\n", STOP,
     "clinic.csv:2:1: \"x\" is not an outcome of smoker (no, yes); if it is a code, --codebook says of what [unknown-label]\n"
     "clinic.csv:2:3: \"9\" is not an outcome of stage (1, 2, NA, 1-2, stage two); if it is a code, --codebook says of what [unknown-label]\n"
     "clinic.csv:2:5: \"y\" is not an outcome of place (caf\xC3\xA9, home, ward with a long name); if it is a code, --codebook says of what [unknown-label]\n"
     "clinic.csv:4:4: \"8\" is not an outcome of stage (1, 2, NA, 1-2, stage two); if it is a code, --codebook says of what [unknown-label]\n"},

    /* Missing cells. */
    {HEADER "no,1,\nNA,2,home\n\"\",1,home\nyes,1,home\n", STOP,
     "clinic.csv:2:6: place is missing here; fill it in, or see --missing [missing-cells]\n"
     "clinic.csv:3:1: smoker is missing here; fill it in, or see --missing [missing-cells]\n"
     "clinic.csv:4:1: smoker is missing here; fill it in, or see --missing [missing-cells]\n"
     "clinic.csv:2:6: 3 missing cells: 2 in smoker, 1 in place; the first is here; fill in what is missing, or see --missing: drop would "
     "leave out 3 of 4 records [missing-cells]\n"},
    {HEADER "no,1,\nNA,2,home\n\"\",1,home\nyes,1,home\n", DROP, "3: 1 0 1\n= 1 -3\n"},
    {HEADER "no,1,home\nNA,2,\nyes,1,home\n", DROP, "0: 0 0 1\n2: 1 0 1\n= 2 -1\n"},
    {HEADER "no,,home\n", DROP, "warning clinic.csv: each of its 1 records has a missing cell, so none is left [no-records]\n= 0 -1\n"},
    {HEADER "no,NA,home\nno,NA,home\n", STOP,
     "0: 0 2 1\n1: 0 2 1\nnote clinic.csv:2:4: \"NA\" is an outcome of stage, so it is not taken as a missing cell there "
     "[outcome-not-missing]\n= 2 -0\n"},
    {"smoker\nno\n\n\nyes\n\n", ONE | DROP, "0: 0\n3: 1\n= 2 -2\n"},
    {"smoker\nno\n\n\nyes\n\n", ONE,
     "clinic.csv:3:1: smoker is missing here; fill it in, or see --missing [missing-cells]\n"
     "clinic.csv:4:1: smoker is missing here; fill it in, or see --missing [missing-cells]\n"
     "clinic.csv:3:1: 2 missing cells: 2 in smoker; the first is here; fill in what is missing, or see --missing: drop would leave out 2 "
     "of 4 records [missing-cells]\n"},
    {HEADER "no,,home\nmaybe,1,home\n", STOP,
     "clinic.csv:2:4: stage is missing here; fill it in, or see --missing [missing-cells]\n"
     "clinic.csv:3:1: \"maybe\" is not an outcome of smoker (no, yes) [unknown-label]\n"
     "clinic.csv:2:4: 1 missing cell: 1 in stage; the first is here; fill in what is missing, or see --missing: drop would leave out 1 of "
     "2 records [missing-cells]\n"},

    /* Broken structure. */
    {HEADER "no,1,home\nno,1\n", STOP,
     "clinic.csv:3: found 2 cells, expected 3 as in the header on line 1; is a delimiter missing, or a quote not closed? [ragged-record]\n"},
    {HEADER "no,1,home,x,y\n", STOP,
     "clinic.csv:2:11: found 5 cells, expected 3 as in the header on line 1; quote a cell that holds a delimiter, or remove what is too much "
     "[ragged-record]\n"},
    {HEADER "no,1,home,\n", STOP,
     "clinic.csv:2:11: found 4 cells, expected 3 as in the header on line 1; remove the delimiter at the end of the line [ragged-record]\n"},
    {HEADER "# comment\n", STOP, "clinic.csv:2:1: the line begins with \"#\" and is no record; remove comment lines [comment-line]\n"},
    {"id," HEADER "#1,no,1,home\n# comment\n", STOP,
     "warning clinic.csv:1: 1 column is not a variable and is ignored: id [ignored-columns]\n"
     "clinic.csv:3:1: the line begins with \"#\" and is no record; remove comment lines [comment-line]\n"},
    {HEADER "# a,b,c,d\n", STOP, "clinic.csv:2:1: the line begins with \"#\" and is no record; remove comment lines [comment-line]\n"},
    {HEADER "no,1,home\n\nno,1,home\n", STOP, "clinic.csv:3:1: a blank line between records; remove it [blank-line]\n"},
    {HEADER "no,1,home\nmaybe,1,home\nno,1\n", STOP,
     "clinic.csv:3:1: \"maybe\" is not an outcome of smoker (no, yes) [unknown-label]\n"
     "clinic.csv:4: found 2 cells, expected 3 as in the header on line 1; is a delimiter missing, or a quote not closed? [ragged-record]\n"},
    {"smoker,stage,place,note\nno,1,home,b\xE9" "b\n", STOP,
     "warning clinic.csv:1: 1 column is not a variable and is ignored: note [ignored-columns]\n"
     "clinic.csv:2:12: byte 0xE9 is not UTF-8; convert the file, such as with iconv -f WINDOWS-1252 -t UTF-8 (in column note) [bad-utf8]\n"},
    {"smoker,note\nno,\"open\nyes,x\n", ONE,
     "warning clinic.csv:1: 1 column is not a variable and is ignored: note [ignored-columns]\n"
     "clinic.csv:2:4: the quote that opens here is never closed; close it, or double a quote that belongs to the text (in column note) "
     "[unclosed-quote]\n"},

    /* A header among the records. */
    {HEADER "no,1,home\n" HEADER "no,2,home\n", STOP,
     "clinic.csv:3:1: line 3 repeats the header, as where files were joined; remove it [repeated-header]\n"},
    {"\xEF\xBB\xBF" HEADER "no,1,home\n\xEF\xBB\xBF" HEADER, STOP,
     "clinic.csv:3:1: line 3 repeats the header, as where files were joined; remove it [repeated-header]\n"},
    {HEADER "smoker,stage,home\n", STOP,
     "clinic.csv:2:1: \"smoker\" is not an outcome of smoker (no, yes) [unknown-label]\n"
     "clinic.csv:2:8: \"stage\" is not an outcome of stage (1, 2, NA, 1-2, stage two) [unknown-label]\n"},
};

START_TEST(tables_are_read_or_refused) {
    const table_case *c = &cases[_i];
    static const bool wanted[] = {true, false, false};
    bal_table_options options = bal_table_options_defaults();
    options.missing = c->how & DROP ? BAL_MISSING_DROP : BAL_MISSING_STOP;
    options.strict = c->how & STRICT;
    options.redact = c->how & REDACT;
    options.allow_absent = c->how & ABSENT;
    options.wanted = c->how & UNWANTED ? wanted : NULL;
    bali_text out = {0};
    const char *path = scratch_file("clinic.csv", c->text, strlen(c->text));
    if (c->how & ONE) read_file(one, 1, path, options, &out);
    else read_file(clinic, 3, path, options, &out);
    ck_assert_str_eq(bali_text_string(&out), c->expected);
    bali_text_free(&out);
}
END_TEST

START_TEST(missing_labels_are_the_callers) {
    static const char *const labels[] = {"?", "yes", "a longer spelling", "?"};
    bal_table_options options = bal_table_options_defaults();
    options.missing_labels = labels;
    options.n_missing_labels = 4;
    options.missing = BAL_MISSING_DROP;
    bali_text out = {0};
    read_clinic(HEADER "no,?,home\nyes,1,home\nyes,1,a longer spelling\nno,1,\"?\"\nyes,2,home\n", options, &out);
    ck_assert_str_eq(bali_text_string(&out),
                     "1: 1 0 1\n4: 1 1 1\n"
                     "note clinic.csv:3:1: \"yes\" is an outcome of smoker, so it is not taken as a missing cell there [outcome-not-missing]\n"
                     "= 2 -3\n");
    bali_text_free(&out);
}
END_TEST

START_TEST(missing_cells_are_counted_by_variable) {
    static const char text[] = HEADER "no,,home\n,,\nyes,1,home\nno,1,NA\n";
    for (int policy = 0; policy < 2; policy++) {
        bal_domain *domain = NULL;
        bal_source *source = NULL;
        bal_block block;
        bal_source_summary summary;
        bal_table_options options = bal_table_options_defaults();
        options.missing = policy ? BAL_MISSING_DROP : BAL_MISSING_STOP;
        ck_assert_int_eq(bal_domain_create(clinic, 3, &domain, NULL), BAL_OK);
        ck_assert_int_eq(bal_table_open(domain, scratch_file("m.csv", text, sizeof text - 1), &options, &source, NULL), BAL_OK);
        for (int i = 0; i < 2 + policy; i++) {
            bal_status status = bal_source_next(source, &block, NULL);
            ck_assert_int_eq(status, policy ? BAL_OK : BAL_ERR_DATA);
        }
        bal_source_summary_get(source, &summary);
        ck_assert_uint_eq(summary.missing[0], 1);
        ck_assert_uint_eq(summary.missing[1], 2);
        ck_assert_uint_eq(summary.missing[2], 2);
        ck_assert_uint_eq(summary.records, policy ? 1 : 0);
        ck_assert_uint_eq(summary.dropped, policy ? 3 : 0);
        bal_source_free(source);
        bal_domain_free(domain);
    }
}
END_TEST

/* The error alone says it all where nobody listens. */
START_TEST(without_a_listener_the_error_sums_up) {
    static const char text[] = HEADER "no,,home\n,,home\nno,what,home\n";
    bal_domain *domain = NULL;
    bal_source *source = NULL;
    bal_block block;
    bal_error err = {0};
    bal_table_options options = bal_table_options_defaults();
    ck_assert_int_eq(bal_domain_create(clinic, 3, &domain, NULL), BAL_OK);
    ck_assert_int_eq(bal_table_open(domain, scratch_file("m.csv", text, sizeof text - 1), &options, &source, NULL), BAL_OK);
    ck_assert_int_eq(bal_source_next(source, &block, &err), BAL_ERR_DATA);
    ck_assert_str_eq(err.code, "missing-cells");
    ck_assert_str_eq(err.variable, "stage");
    ck_assert_uint_eq(err.record, 1);
    ck_assert_uint_eq(err.line, 2);
    ck_assert_uint_eq(err.column, 4);
    ck_assert_msg(strstr(err.message, "3 missing cells: 2 in stage, 1 in smoker; ") == err.message, "%s", err.message);
    ck_assert_msg(strstr(err.message, "2 of 3 records") != NULL, "%s", err.message);
    bal_source_free(source);
    bal_domain_free(domain);
}
END_TEST

START_TEST(ten_of_a_kind_are_told_then_a_count) {
    bali_text text = {0}, out = {0};
    bali_text_puts(&text, HEADER);
    for (int i = 0; i < 1240; i++) bali_text_puts(&text, i < 4 ? "maybe,1,home\n" : i % 2 ? "maybe,1,nowhere\n" : "no,7,home\n");
    for (int i = 0; i < 12; i++) bali_text_puts(&text, HEADER);
    read_clinic(bali_text_string(&text), bal_table_options_defaults(), &out);
    size_t lines = 0;
    for (const char *at = bali_text_string(&out); (at = strchr(at, '\n')); at++) lines++;
    ck_assert_uint_eq(lines, 10 + 10 + 2);
    ck_assert_ptr_nonnull(strstr(bali_text_string(&out), "\nclinic.csv: and 1,848 more unknown labels in 3 columns [unknown-label]\n"));
    ck_assert_ptr_nonnull(strstr(bali_text_string(&out), "\nclinic.csv: and 2 more repeated headers [repeated-header]\n"));
    bali_text_free(&text);
    bali_text_free(&out);
}
END_TEST

/* A header of more columns than suspects are kept for. */
START_TEST(a_half_repeated_header_is_told_in_full) {
    enum { N = 15 };
    static char names[N][8];
    bal_variable_spec variables[N];
    bali_text text = {0}, out = {0};
    for (int line = 0; line < 2; line++)
        for (size_t v = 0; v < N; v++) {
            (void)snprintf(names[v], sizeof names[v], "v%zu", v);
            variables[v] = (bal_variable_spec){names[v], yes_no, 2};
            bali_text_printf(&text, "%s%c", line && v + 1 == N ? "no" : names[v], v + 1 < N ? ',' : '\n');
        }
    read_file(variables, N, scratch_file("clinic.csv", text.bytes, text.length), bal_table_options_defaults(), &out);
    ck_assert_ptr_nonnull(strstr(bali_text_string(&out), "clinic.csv:2:1: \"v0\" is not an outcome of v0 (no, yes)"));
    ck_assert_ptr_nonnull(strstr(bali_text_string(&out), "clinic.csv:2:28: \"v9\" is not an outcome of v9 (no, yes)"));
    ck_assert_ptr_null(strstr(bali_text_string(&out), "v10 (no, yes)"));
    ck_assert_ptr_nonnull(strstr(bali_text_string(&out), "and 4 more unknown labels in 4 columns"));
    bali_text_free(&text);
    bali_text_free(&out);
}
END_TEST

/* A column whose name is also one of its outcomes is right in such a line. */
START_TEST(a_name_may_be_an_outcome) {
    static const bal_variable_spec variables[] = {{"yes", yes_no, 2}, {"stage", stages, 5}, {"place", places, 3}};
    bali_text out = {0};
    static const char text[] = "yes,stage,place\nyes,stage,home\n";
    read_file(variables, 3, scratch_file("clinic.csv", text, sizeof text - 1), bal_table_options_defaults(), &out);
    ck_assert_str_eq(bali_text_string(&out), "clinic.csv:2:5: \"stage\" is not an outcome of stage (1, 2, NA, 1-2, stage two) [unknown-label]\n");
    bali_text_clear(&out);
    read_file(variables, 1, scratch_file("clinic.csv", "yes\nyes\n", 8), bal_table_options_defaults(), &out);
    ck_assert_str_eq(bali_text_string(&out), "0: 1\n= 1 -0\n");
    bali_text_free(&out);
}
END_TEST

static Suite *suite(void) {
    Suite *suite = suite_create("table_reader");
    TCase *tests = tcase_create("table_reader");
    tcase_add_loop_test(tests, tables_are_read_or_refused, 0, sizeof cases / sizeof cases[0]);
    tcase_add_test(tests, missing_labels_are_the_callers);
    tcase_add_test(tests, missing_cells_are_counted_by_variable);
    tcase_add_test(tests, without_a_listener_the_error_sums_up);
    tcase_add_test(tests, ten_of_a_kind_are_told_then_a_count);
    tcase_add_test(tests, a_half_repeated_header_is_told_in_full);
    tcase_add_test(tests, a_name_may_be_an_outcome);
    suite_add_tcase(suite, tests);
    return suite;
}

int main(void) {
    return run_suite(suite());
}
