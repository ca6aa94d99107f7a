/* Tables read into text, for tests: records, what was told, and how it ended. */
#ifndef FORMATS_TABLE_DUMP_H
#define FORMATS_TABLE_DUMP_H

#include "ballast/formats.h"
#include "base/text.h"
#include "support/harness.h"

#include <inttypes.h>
#include <string.h>

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
static inline void put_error(bali_text *out, const bal_error *error) {
    bal_error copy = *error;
    const char *slash = strrchr(copy.file, '/');
    if (slash) memmove(copy.file, slash + 1, strlen(slash));
    char text[4096];
    bal_error_text(&copy, text, sizeof text);
    bali_text_printf(out, "%s\n", text);
}

static inline void listen(void *context, bal_severity severity, const bal_error *notice) {
    static const char *const marks[] = {"note ", "warning ", ""};
    listener *l = context;
    bali_text_puts(&l->told, marks[severity]);
    put_error(&l->told, notice);
    ck_assert_ptr_nonnull(bal_code_find(notice->code));
    ck_assert_int_eq(notice->status == BAL_OK, severity != BAL_PROBLEM);
    if (severity == BAL_PROBLEM && l->first.status == BAL_OK) l->first = *notice;
}

static inline void put_block(bali_text *out, const bal_block *block) {
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
static inline bal_status pass(bal_source *source, listener *l, bali_text *out, bal_error *err) {
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
static inline void read_file(const bal_variable_spec *variables, size_t n, const char *path, bal_table_options options,
                             bali_text *out) {
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

static inline void read_clinic(const char *text, bal_table_options options, bali_text *out) {
    read_file(clinic, 3, scratch_file("clinic.csv", text, strlen(text)), options, out);
}

#define HEADER "smoker,stage,place\n" /* of the clinic */

#endif
