#include "formats/table_dump.h"

#include <fcntl.h>
#include <stdio.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <unistd.h>

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
    TCase *tests = tcase_create("table_source");
    tcase_add_test(tests, records_come_in_blocks_whatever_the_line_end);
    tcase_add_test(tests, a_pipe_is_read_once);
    tcase_add_test(tests, a_pipe_cannot_be_read_again);
    tcase_add_test(tests, a_table_is_read_again);
    tcase_add_test(tests, records_of_one_column_are_located_behind_blank_lines);
    tcase_add_test(tests, standard_input_is_left_in_peace);
    tcase_add_test(tests, a_file_that_changes_is_noticed);
    tcase_add_test(tests, a_file_that_is_not_there_is_told);
    tcase_add_test(tests, memory_may_run_out_anywhere);
    tcase_set_timeout(tests, 60);
    suite_add_tcase(suite, tests);
    return suite;
}

int main(void) {
    return run_suite(suite());
}
