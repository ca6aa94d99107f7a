#include "formats/codebook.h"

#include "base/text.h"
#include "support/fixtures.h"

#include <string.h>

static const char *const yes_no[] = {"no", "yes"};
static const char *const stages[] = {"1", "2", "not done"};
static const bal_variable_spec clinic[] = {{"smoker", yes_no, 2}, {"stage", stages, 3}};

typedef struct codebook_case {
    const char *text;
    const char *expected; /* the spellings "variable code=outcome" in order, or the message */
} codebook_case;

#define HEADER "variable,outcome,code\n"

static const codebook_case cases[] = {
    {HEADER, ""},
    {HEADER "smoker,yes,1\nsmoker,no,0\n", "smoker 1=yes\nsmoker 0=no\n"},
    {"code,note,outcome,variable\n\"J, ja\",x,yes,smoker\r\nN,,no, smoker \n\n",
     "ignored-columns book.csv:1: of the codebook's columns, only variable, outcome and code are used; ignored: note [ignored-columns]\n"
     "smoker J, ja=yes\nsmoker N=no\n"},
    {"variable\toutcome\tcode\nstage\tnot done\t\n", "stage =not done\n"},
    {HEADER "stage,not done,\nstage,not done,\nstage,not done,NA\nstage,1,1\n", "stage =not done\nstage NA=not done\nstage 1=1\n"},
    {HEADER "smoker,yes,1\nsmoker,yes,Y\nstage,1,Y", "smoker 1=yes\nsmoker Y=yes\nstage Y=1\n"},
    {HEADER "smoker,yes,\" 1\"\n", "smoker  1=yes\n"},

    {"", "book.csv:1:1: the file is empty; the first line of a codebook is variable,outcome,code [no-header]\n"},
    {"variable,outcome\n", "book.csv:1: the codebook has no column code; its columns are variable, outcome and code [missing-column]\n"},
    {"Variable,outcome,code\n",
     "book.csv:1: the codebook has no column variable; its columns are variable, outcome and code: rename \"Variable\" [missing-column]\n"},
    {"variable;outcome;code\n",
     "book.csv:1: the codebook has no column variable; its columns are variable, outcome and code, with commas or tabs between them "
     "[missing-column]\n"},
    {"variable,outcome,code,code\n", "book.csv:1:23: columns 3 and 4 are both named \"code\"; rename or remove one [duplicate-column]\n"},
    {HEADER "smokr,yes,1\n", "book.csv:2:1: \"smokr\" is not a variable of the network; did you mean \"smoker\"? [unknown-variable]\n"},
    {HEADER "x123456,yes,1\n", "book.csv:2:1: \"x123456\" is not a variable of the network; write one of its variables, such as \"smoker\" "
                               "[unknown-variable]\n"},
    {HEADER "smoker,no,0\nsmoker,Yes,1\n", "book.csv:3:8: \"Yes\" is not an outcome of smoker; did you mean \"yes\"? [unknown-label]\n"},
    {HEADER "smoker,,1\n", "book.csv:2:8: \"\" is not an outcome of smoker; write one of its outcomes, such as \"no\" [unknown-label]\n"},
    {HEADER "smoker,no,0\nsmoker,yes,0\n",
     "book.csv:3:12: the code \"0\" of smoker stands for \"yes\" here, and for \"no\" on line 2; keep one [ambiguous-code]\n"},
    {HEADER "smoker,no,\nsmoker,yes,\n",
     "book.csv:3:12: the code \"\" of smoker stands for \"yes\" here, and for \"no\" on line 2; keep one [ambiguous-code]\n"},
    {HEADER "stage,1,2\n",
     "book.csv:2:9: the code \"2\" of stage stands for \"1\" here, and is another outcome of it; choose another code [ambiguous-code]\n"},
    {HEADER "smoker,no\n", "book.csv:2: found 2 cells, expected 3 as in the header on line 1; quote a cell that holds a delimiter [ragged-record]\n"},
    {HEADER "smoker,no,0,1\n",
     "book.csv:2: found more than 3 cells, expected 3 as in the header on line 1; quote a cell that holds a delimiter [ragged-record]\n"},
    {HEADER "smoker,no,0\n\nsmoker,yes,1\n", "book.csv:3:1: a blank line between records; remove it [blank-line]\n"},
    {HEADER "smoker,no,\"0\n", "book.csv:2:11: the quote that opens here is never closed; close it, or double a quote that belongs to the text "
                               "[unclosed-quote]\n"},
    {HEADER "smoker,no,\xE9\n", "book.csv:2:11: byte 0xE9 is not UTF-8; convert the file, such as with iconv -f WINDOWS-1252 -t UTF-8 [bad-utf8]\n"},
    {"PK\x03\x04", "book.csv:1:1: this looks like a zip archive or a spreadsheet (.xlsx, .ods); open it there and save it as CSV in UTF-8 "
                   "[not-a-table]\n"},
};

static void put_error(bali_text *out, const bal_error *error) {
    bal_error copy = *error;
    const char *slash = strrchr(copy.file, '/');
    if (slash) memmove(copy.file, slash + 1, strlen(slash));
    char text[4096];
    bal_error_text(&copy, text, sizeof text);
    bali_text_printf(out, "%s\n", text);
}

static void listen(void *context, bal_severity severity, const bal_error *notice) {
    ck_assert_int_eq(severity, BAL_WARNING);
    ck_assert_ptr_nonnull(bal_code_find(notice->code));
    bali_text_printf(context, "%s ", notice->code);
    put_error(context, notice);
}

static void put_spellings(bali_text *out, const bal_codebook *codebook) {
    for (size_t v = 0; v < bal_domain_variables(bali_codebook_domain(codebook)); v++) {
        const bali_spellings *s = bali_codebook_spellings(codebook, v);
        for (size_t i = 0; i < s->n; i++) bali_text_printf(out, "%s %s=%s\n", clinic[v].name, s->codes[i], clinic[v].outcomes[s->outcomes[i]]);
    }
}

static bal_domain *clinic_domain(void) {
    bal_domain *domain;
    ck_assert_int_eq(bal_domain_create(clinic, 2, &domain, NULL), BAL_OK);
    return domain;
}

START_TEST(codebooks_are_read_or_refused) {
    const char *text = cases[_i].text, *path = scratch_file("book.csv", text, strlen(text));
    bali_text out = {0};
    bal_error err = {0};
    bal_notices notices = {listen, &out};
    bal_domain *domain = clinic_domain();
    bal_codebook *codebook = NULL;
    bal_file_facts facts;
    bal_status status = bal_codebook_read(domain, path, &notices, &codebook, &facts, &err);
    ck_assert((status == BAL_OK) == (codebook != NULL));
    if (codebook) {
        put_spellings(&out, codebook);
        ck_assert_str_eq(facts.name, "book.csv");
        ck_assert_uint_eq(facts.bytes, strlen(text));
        ck_assert_uint_eq(strlen(facts.sha256), 64);
    } else {
        ck_assert_ptr_nonnull(bal_code_find(err.code));
        put_error(&out, &err);
    }
    ck_assert_str_eq(bali_text_string(&out), cases[_i].expected);
    bal_codebook_free(codebook);
    bal_domain_free(domain);
    bali_text_free(&out);
}
END_TEST

START_TEST(a_codebook_without_listener_and_facts) {
    static const char text[] = "variable,outcome,code,note\nsmoker,yes,1,\n";
    bal_domain *domain = clinic_domain();
    bal_codebook *codebook = NULL;
    ck_assert_int_eq(bal_codebook_read(domain, scratch_file("book.csv", text, strlen(text)), NULL, &codebook, NULL, NULL), BAL_OK);
    ck_assert_uint_eq(bali_codebook_spellings(codebook, 0)->n, 1);
    bal_codebook_free(codebook);
    ck_assert_int_eq(bal_codebook_read(domain, "/nowhere/book.csv", NULL, &codebook, NULL, NULL), BAL_ERR_IO);
    ck_assert_ptr_null(codebook);
    bal_codebook_free(NULL);
    bal_domain_free(domain);
}
END_TEST

typedef struct survivor {
    const bal_domain *domain;
    const char *path;
} survivor;

static bal_status read_it(void *context, bal_error *err) {
    const survivor *s = context;
    bal_codebook *codebook = NULL;
    bal_file_facts facts;
    bal_status status = bal_codebook_read(s->domain, s->path, NULL, &codebook, &facts, err);
    ck_assert((status == BAL_OK) == (codebook != NULL));
    bal_codebook_free(codebook);
    return status;
}

START_TEST(memory_may_run_out) {
    bal_domain *domain = clinic_domain();
    const char *text = cases[2].text;
    const char *path = scratch_file("again.csv", text, strlen(text));
    survivor s = {domain, path};
    ck_assert_uint_ge(survive_allocations(read_it, &s), 20);
    bal_domain_free(domain);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("codebook");
    TCase *c = tcase_create("codebook");
    tcase_add_loop_test(c, codebooks_are_read_or_refused, 0, sizeof cases / sizeof cases[0]);
    tcase_add_test(c, a_codebook_without_listener_and_facts);
    tcase_add_test(c, memory_may_run_out);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
