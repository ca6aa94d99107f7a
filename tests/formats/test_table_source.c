#include "ballast/formats.h"
#include "base/memory.h"
#include "base/text.h"
#include "support/harness.h"

#include <fcntl.h>
#include <inttypes.h>
#include <stdio.h>
#include <string.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <unistd.h>

static const char *const yes_no[] = {"no", "yes"};
static const char *const stages[] = {"1", "2", "NA", "1-2", "stage two"};
static const char *const places[] = {"caf\xC3\xA9", "home", "ward with a long name"};
static const bal_variable_spec clinic[] = {{"smoker", yes_no, 2}, {"stage", stages, 5}, {"place", places, 3}};
static const bal_variable_spec one[] = {{"smoker", yes_no, 2}};

typedef struct listener {
    bali_text told;
    bal_error first;
} listener;

/* Writes a message with the base name of the file only, since scratch folders differ. */
static void put_error(bali_text *out, const bal_error *error) {
    bal_error copy = *error;
    const char *slash = strrchr(copy.file, '/');
    if (slash) memmove(copy.file, slash + 1, strlen(slash));
    char text[4096];
    bal_error_text(&copy, text, sizeof text);
    bali_text_printf(out, "%s\n", text);
}

static void listen(void *context, bal_severity severity, const bal_error *notice) {
    static const char *const marks[] = {"note ", "warning ", ""};
    listener *l = context;
    bali_text_puts(&l->told, marks[severity]);
    put_error(&l->told, notice);
    ck_assert_ptr_nonnull(bal_code_find(notice->code));
    ck_assert_int_eq(notice->status == BAL_OK, severity != BAL_PROBLEM);
    if (severity == BAL_PROBLEM && l->first.status == BAL_OK) l->first = *notice;
}

static void put_block(bali_text *out, const bal_block *block) {
    for (size_t t = 0; t < block->n_records; t++) {
        bali_text_printf(out, "%" PRIu64 ":", bal_block_place(block, t));
        for (size_t v = 0; v < block->n_columns; v++) {
            if (!block->columns[v]) bali_text_puts(out, " ~");
            else if (bal_block_code(block, v, t) == BAL_NONE) bali_text_puts(out, " -");
            else bali_text_printf(out, " %zu", bal_block_code(block, v, t));
        }
        bali_text_putc(out, '\n');
    }
}

/* One pass: the records, what was told, and how it ended. */
static bal_status pass(bal_source *source, listener *l, bali_text *out, bal_error *err) {
    bal_block block = {.n_records = 1};
    bal_status status = BAL_OK;
    while (status == BAL_OK && block.n_records > 0) {
        status = bal_source_next(source, &block, err);
        if (status == BAL_OK) put_block(out, &block);
    }
    bali_text_puts(out, bali_text_string(&l->told));
    bali_text_clear(&l->told);
    bal_source_summary summary;
    bal_source_summary_get(source, &summary);
    if (status == BAL_OK) bali_text_printf(out, "= %" PRIu64 " -%" PRIu64 "\n", summary.records, summary.dropped);
    return status;
}

/* Opens a file and goes over it once; ends with the error that came back, unless that is the first problem told. */
static void read_file(const bal_variable_spec *variables, size_t n, const char *path, bal_table_options options, bali_text *out) {
    listener l = {0};
    bal_notices notices = {listen, &l};
    bal_domain *domain = NULL;
    bal_source *source = NULL;
    bal_error err = {0};
    options.notices = &notices;
    ck_assert_int_eq(bal_domain_create(variables, n, &domain, NULL), BAL_OK);
    bal_status status = bal_table_open(domain, path, &options, &source, &err);
    ck_assert((status == BAL_OK) == (source != NULL));
    if (status == BAL_OK) status = pass(source, &l, out, &err);
    else bali_text_puts(out, bali_text_string(&l.told));
    ck_assert_int_eq(status, err.status);
    ck_assert(status == BAL_OK || bal_code_find(err.code) != NULL);
    if (status != BAL_OK && l.first.status == BAL_OK) put_error(out, &err);
    if (l.first.status != BAL_OK) {
        ck_assert_str_eq(err.code, l.first.code);
        ck_assert_uint_eq(err.line, l.first.line);
        ck_assert_uint_eq(err.column, l.first.column);
    }
    if (source && status != BAL_OK) { /* it stays failed */
        bal_error again = {0};
        bal_block block;
        ck_assert_int_eq(bal_source_next(source, &block, &again), err.status);
        ck_assert_str_eq(again.message, err.message);
        ck_assert_uint_eq(block.n_records, 0);
    }
    bal_source_free(source);
    bal_domain_free(domain);
    bali_text_free(&l.told);
}

static void read_clinic(const char *text, bal_table_options options, bali_text *out) {
    read_file(clinic, 3, scratch_file("clinic.csv", text, strlen(text)), options, out);
}

enum { STOP = 0, DROP = 1, STRICT = 2, REDACT = 4, ABSENT = 8, ONE = 16, UNWANTED = 32 };

typedef struct table_case {
    const char *text;
    unsigned how;
    const char *expected;
} table_case;

#define HEADER "smoker,stage,place\n"

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
     "clinic.csv:2:1: \"x\" is not an outcome of smoker (no, yes) [unknown-label]\n"
     "clinic.csv:2:3: \"9\" is not an outcome of stage (1, 2, NA, 1-2, stage two) [unknown-label]\n"
     "clinic.csv:2:5: \"y\" is not an outcome of place (caf\xC3\xA9, home, ward with a long name) [unknown-label]\n"
     "clinic.csv:4:4: \"8\" is not an outcome of stage (1, 2, NA, 1-2, stage two) [unknown-label]\n"},

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

/* A table of n records that need two bytes a code and more than one block; every 7th lacks a cell. */
static void make_long_table(bali_text *text, size_t n, const char *end) {
    bali_text_printf(text, "wide,smoker%s", end);
    for (size_t i = 0; i < n; i++) bali_text_printf(text, "w%zu,%s%s", i % 300, i % 7 == 6 ? "" : yes_no[i % 2], end);
}

static void check_long_table(const char *path, size_t n) {
    static char names[300][8];
    static const char *labels[300];
    for (size_t i = 0; i < 300; i++) {
        (void)snprintf(names[i], sizeof names[i], "w%zu", i);
        labels[i] = names[i];
    }
    bal_variable_spec variables[] = {{"smoker", yes_no, 2}, {"wide", labels, 300}};
    bal_domain *domain = NULL;
    bal_source *source = NULL;
    bal_block block = {.n_records = 1};
    bal_table_options options = bal_table_options_defaults();
    options.missing = BAL_MISSING_DROP;
    ck_assert_int_eq(bal_domain_create(variables, 2, &domain, NULL), BAL_OK);
    ck_assert_int_eq(bal_table_open(domain, path, &options, &source, NULL), BAL_OK);
    size_t record = 0, given = 0;
    for (int blocks = 0; block.n_records > 0; blocks++) {
        ck_assert_int_eq(bal_source_next(source, &block, NULL), BAL_OK);
        ck_assert_uint_eq(block.width, 2);
        ck_assert_uint_eq(block.n_columns, 2);
        if (block.n_records > 0) ck_assert_uint_eq(block.first_record, bal_block_place(&block, 0));
        for (size_t t = 0; t < block.n_records; t++, record++, given++) {
            if (record % 7 == 6) record++;
            ck_assert_uint_eq(bal_block_place(&block, t), record);
            ck_assert_uint_eq(bal_block_code(&block, 0, t), record % 2);
            ck_assert_uint_eq(bal_block_code(&block, 1, t), record % 300);
        }
    }
    ck_assert_uint_eq(given, n - n / 7);
    bal_source_free(source);
    bal_domain_free(domain);
}

START_TEST(records_come_in_blocks_whatever_the_line_end) {
    static const char *const ends[] = {"\n", "\r\n", "\r"};
    for (size_t e = 0; e < 3; e++) {
        bali_text text = {0};
        make_long_table(&text, 20000, ends[e]);
        check_long_table(scratch_file("long.csv", text.bytes, text.length), 20000);
        bali_text_free(&text);
    }
}
END_TEST

START_TEST(a_pipe_is_read_once) {
    char path[512];
    (void)snprintf(path, sizeof path, "%s/pipe", scratch_dir());
    (void)unlink(path);
    ck_assert_int_eq(mkfifo(path, 0600), 0);
    bali_text text = {0};
    make_long_table(&text, 9000, "\n");
    pid_t child = fork();
    ck_assert_int_ge(child, 0);
    if (child == 0) {
        int to = open(path, O_WRONLY);
        for (size_t i = 0; to >= 0 && i < text.length; i += 13)
            if (write(to, text.bytes + i, text.length - i < 13 ? text.length - i : 13) < 0) _exit(1);
        _exit(0);
    }
    check_long_table(path, 9000);
    int ended;
    ck_assert_int_eq(waitpid(child, &ended, 0), child);
    bali_text_free(&text);
    (void)unlink(path);
}
END_TEST

START_TEST(a_pipe_cannot_be_read_again) {
    char path[512];
    (void)snprintf(path, sizeof path, "%s/once", scratch_dir());
    (void)unlink(path);
    ck_assert_int_eq(mkfifo(path, 0600), 0);
    pid_t child = fork();
    if (child == 0) {
        FILE *file = fopen(path, "wb");
        _exit(!file || fputs(HEADER "no,1,home\n", file) == EOF || fclose(file) != 0);
    }
    bal_domain *domain = NULL;
    bal_source *source = NULL;
    bal_block block;
    bal_error err = {0}, place = {0};
    bal_table_options options = bal_table_options_defaults();
    ck_assert_int_eq(bal_domain_create(clinic, 3, &domain, NULL), BAL_OK);
    ck_assert_int_eq(bal_table_open(domain, path, &options, &source, NULL), BAL_OK);
    ck_assert_int_eq(bal_source_rewind(source, NULL), BAL_OK); /* nothing was read yet */
    ck_assert_int_eq(bal_source_next(source, &block, NULL), BAL_OK);
    ck_assert_uint_eq(block.n_records, 1);
    bal_source_locate(source, 0, &place);
    ck_assert_uint_eq(place.line, 0);
    ck_assert_uint_eq(place.record, 1);
    ck_assert_int_eq(bal_source_rewind(source, &err), BAL_ERR_IO);
    ck_assert_str_eq(err.code, "cannot-reread");
    ck_assert_int_eq(bal_source_next(source, &block, &err), BAL_ERR_IO);
    bal_source_free(source);
    bal_domain_free(domain);
    int ended;
    ck_assert_int_eq(waitpid(child, &ended, 0), child);
    (void)unlink(path);
}
END_TEST

START_TEST(a_table_is_read_again) {
    static const char text[] = "note,smoker,stage,place\n,no,1,home\n\"two\nlines\",NA,2,home\n,yes,NA,home\n\n\n";
    listener l = {0};
    bal_notices notices = {listen, &l};
    bal_domain *domain = NULL;
    bal_source *source = NULL;
    bal_block block;
    bal_file_facts facts;
    bal_table_options options = bal_table_options_defaults();
    options.missing = BAL_MISSING_DROP;
    options.notices = &notices;
    ck_assert_int_eq(bal_domain_create(clinic, 3, &domain, NULL), BAL_OK);
    ck_assert_int_eq(bal_table_open(domain, scratch_file("again.csv", text, sizeof text - 1), &options, &source, NULL), BAL_OK);
    for (int i = 0; i < 3; i++) {
        bali_text out = {0};
        bal_error err = {0};
        if (i == 2) ck_assert_int_eq(bal_source_next(source, &block, NULL), BAL_OK); /* rewound in the middle */
        if (i > 0) ck_assert_int_eq(bal_source_rewind(source, NULL), BAL_OK);
        ck_assert_int_eq(pass(source, &l, &out, &err), BAL_OK);
        ck_assert_str_eq(bali_text_string(&out),
                         i > 0 ? "0: 0 0 1\n2: 1 2 1\n= 2 -1\n"
                               : "0: 0 0 1\n2: 1 2 1\n"
                                 "warning again.csv:1: 1 column is not a variable and is ignored: note [ignored-columns]\n"
                                 "note again.csv:5:6: \"NA\" is an outcome of stage, so it is not taken as a missing cell there "
                                 "[outcome-not-missing]\n= 2 -1\n");
        bali_text_free(&out);
    }
    bal_table_facts(source, &facts);
    ck_assert_str_eq(facts.name, "again.csv");
    ck_assert_uint_eq(facts.bytes, sizeof text - 1);
    ck_assert_uint_eq(strlen(facts.sha256), 64);
    /* Lines of records, the second of which takes two; asked for in the middle of a pass, which goes on. */
    static const struct {
        uint64_t place;
        size_t line;
    } lines[] = {{0, 2}, {1, 3}, {2, 5}, {99, 0}};
    ck_assert_int_eq(bal_source_rewind(source, NULL), BAL_OK);
    for (size_t i = 0; i < 4; i++) {
        bal_error err = {0};
        bal_source_locate(source, lines[i].place, &err);
        ck_assert_uint_eq(err.line, lines[i].line);
        ck_assert_uint_eq(err.record, lines[i].place + 1);
        ck_assert_int_eq(err.status, BAL_OK);
    }
    bali_text out = {0};
    ck_assert_int_eq(pass(source, &l, &out, NULL), BAL_OK);
    ck_assert_str_eq(bali_text_string(&out), "0: 0 0 1\n2: 1 2 1\n= 2 -1\n");
    bali_text_free(&out);
    bali_text_free(&l.told);
    bal_source_free(source);
    bal_domain_free(domain);
}
END_TEST

START_TEST(records_of_one_column_are_located_behind_blank_lines) {
    static const char text[] = "smoker\nno\n\n\nyes\n";
    bal_domain *domain = NULL;
    bal_source *source = NULL;
    bal_table_options options = bal_table_options_defaults();
    ck_assert_int_eq(bal_domain_create(one, 1, &domain, NULL), BAL_OK);
    ck_assert_int_eq(bal_table_open(domain, scratch_file("one.csv", text, sizeof text - 1), &options, &source, NULL), BAL_OK);
    for (uint64_t i = 0; i < 4; i++) {
        bal_error err = {0};
        bal_source_locate(source, i, &err);
        ck_assert_uint_eq(err.line, i + 2);
    }
    bal_source_free(source);
    bal_domain_free(domain);
}
END_TEST

/* A file as standard input can be read again, and locating must not move it under the pass. */
START_TEST(standard_input_is_left_in_peace) {
    bali_text text = {0};
    make_long_table(&text, 60000, "\n");
    int kept = dup(STDIN_FILENO), file = open(scratch_file("stdin.csv", text.bytes, text.length), O_RDONLY);
    ck_assert(file >= 0 && dup2(file, STDIN_FILENO) == STDIN_FILENO && close(file) == 0);
    bal_domain *domain = NULL;
    bal_source *source = NULL;
    bal_block block = {.n_records = 1};
    bal_table_options options = bal_table_options_defaults();
    options.missing = BAL_MISSING_DROP;
    ck_assert_int_eq(bal_domain_create(one, 1, &domain, NULL), BAL_OK);
    ck_assert_int_eq(bal_table_open(domain, "-", &options, &source, NULL), BAL_OK);
    for (int i = 0; i < 2; i++) {
        bal_source_summary summary;
        for (block.n_records = 1; block.n_records > 0;) {
            bal_error place = {0};
            ck_assert_int_eq(bal_source_next(source, &block, NULL), BAL_OK);
            bal_source_locate(source, 5, &place);
            ck_assert_uint_eq(place.line, 0);
            ck_assert_str_eq(place.file, "standard input");
        }
        bal_source_summary_get(source, &summary);
        ck_assert_uint_eq(summary.records + summary.dropped, 60000);
        ck_assert_int_eq(bal_source_rewind(source, NULL), BAL_OK);
    }
    bal_source_free(source);
    bal_domain_free(domain);
    bali_text_free(&text);
    if (kept >= 0) ck_assert(dup2(kept, STDIN_FILENO) == STDIN_FILENO && close(kept) == 0);
}
END_TEST

START_TEST(a_file_that_changes_is_noticed) {
    bali_text text = {0};
    make_long_table(&text, 60000, "\n");
    char path[512];
    (void)snprintf(path, sizeof path, "%s", scratch_file("moving.csv", text.bytes, text.length));
    bal_domain *domain = NULL;
    bal_source *source = NULL;
    bal_block block;
    bal_error err = {0};
    bal_table_options options = bal_table_options_defaults();
    options.missing = BAL_MISSING_DROP;
    ck_assert_int_eq(bal_domain_create(one, 1, &domain, NULL), BAL_OK);
    ck_assert_int_eq(bal_table_open(domain, path, &options, &source, NULL), BAL_OK);
    ck_assert_int_eq(bal_source_next(source, &block, &err), BAL_OK);
    FILE *file = fopen(path, "ab");
    ck_assert(file && fputs("w1,no\n", file) != EOF && fclose(file) == 0);
    bal_status status = BAL_OK;
    while (status == BAL_OK && block.n_records > 0) status = bal_source_next(source, &block, &err);
    ck_assert_int_eq(status, BAL_ERR_DATA);
    ck_assert_str_eq(err.code, "changed-while-read");
    bal_source_free(source);
    bal_domain_free(domain);
    bali_text_free(&text);
}
END_TEST

START_TEST(a_file_that_is_not_there_is_told) {
    bali_text out = {0};
    read_file(one, 1, "no-such-file.csv", bal_table_options_defaults(), &out);
    ck_assert_ptr_nonnull(strstr(bali_text_string(&out), "no-such-file.csv: cannot be opened"));
    bali_text_free(&out);
}
END_TEST

static bal_status read_twice(void *context, bal_error *err) {
    static const char *const labels[] = {"?"};
    const bal_domain *domain = context;
    char path[512];
    (void)snprintf(path, sizeof path, "%s/memory.csv", scratch_dir());
    bal_table_options options = bal_table_options_defaults();
    options.missing = BAL_MISSING_DROP;
    options.missing_labels = labels;
    options.n_missing_labels = 1;
    bal_source *source = NULL;
    bal_block block = {.n_records = 1};
    bal_status status = bal_table_open(domain, path, &options, &source, err);
    ck_assert((status == BAL_OK) == (source != NULL));
    while (status == BAL_OK && block.n_records > 0) status = bal_source_next(source, &block, err);
    if (status == BAL_OK) status = bal_source_rewind(source, err);
    if (status == BAL_OK) status = bal_source_next(source, &block, err);
    bal_source_free(source);
    return status;
}

START_TEST(memory_may_run_out_anywhere) {
    static const char text[] = "id,\"smoker\",stage,place\n1,no,\"1\",\"ho\"\"me\"\n2,yes,?,home\n";
    static const char *const quoted[] = {"ho\"me", "home"};
    bal_variable_spec variables[] = {clinic[0], clinic[1], {"place", quoted, 2}};
    bal_domain *domain = NULL;
    ck_assert_int_eq(bal_domain_create(variables, 3, &domain, NULL), BAL_OK);
    (void)scratch_file("memory.csv", text, sizeof text - 1);
    ck_assert_uint_ge(survive_allocations(read_twice, domain), 25);
    bal_domain_free(domain);
}
END_TEST

static Suite *suite(void) {
    Suite *suite = suite_create("table_source");
    TCase *tables = tcase_create("tables"), *passes = tcase_create("passes");
    tcase_add_loop_test(tables, tables_are_read_or_refused, 0, sizeof cases / sizeof cases[0]);
    tcase_add_test(tables, missing_labels_are_the_callers);
    tcase_add_test(tables, missing_cells_are_counted_by_variable);
    tcase_add_test(tables, without_a_listener_the_error_sums_up);
    tcase_add_test(tables, ten_of_a_kind_are_told_then_a_count);
    tcase_add_test(tables, a_half_repeated_header_is_told_in_full);
    tcase_add_test(tables, a_name_may_be_an_outcome);
    tcase_add_test(passes, records_come_in_blocks_whatever_the_line_end);
    tcase_add_test(passes, a_pipe_is_read_once);
    tcase_add_test(passes, a_pipe_cannot_be_read_again);
    tcase_add_test(passes, a_table_is_read_again);
    tcase_add_test(passes, records_of_one_column_are_located_behind_blank_lines);
    tcase_add_test(passes, standard_input_is_left_in_peace);
    tcase_add_test(passes, a_file_that_changes_is_noticed);
    tcase_add_test(passes, a_file_that_is_not_there_is_told);
    tcase_add_test(passes, memory_may_run_out_anywhere);
    suite_add_tcase(suite, tables);
    suite_add_tcase(suite, passes);
    return suite;
}

int main(void) {
    return run_suite(suite());
}
