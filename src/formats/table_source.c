/* A table file as a source of blocks. */
#include "base/memory.h"
#include "formats/table_reader.h"
#include "model/block.h"

#include <string.h>

typedef struct table {
    bal_source source;
    char *path;
    bali_table_reader reader;
    size_t n;         /* records in the block */
    uint64_t *places; /* of each */
    uint64_t given, dropped;
    bool told_end;
} table;

bal_table_options bal_table_options_defaults(void) {
    return (bal_table_options){.missing = BAL_MISSING_STOP};
}

/* Says once that there is nothing to learn from. */
static void tell_end(table *t) {
    const bal_notices *notices = &t->reader.notices;
    if (t->told_end || t->given > 0) return;
    t->told_end = true;
    if (!notices->tell) return;
    bal_error notice = {0};
    if (t->reader.place == 0)
        (void)bal_error_set(&notice, BAL_ERR_DATA, "no-records", "the table has a header and no records: an empty batch");
    else
        (void)bal_error_set(&notice, BAL_ERR_DATA, "no-records",
                            "each of its %zu records has a missing cell, so none is left", (size_t)t->reader.place);
    bal_error_place(&notice, bali_csv_name(t->reader.csv), 0, 0);
    notice.status = BAL_OK;
    notices->tell(notices->context, BAL_WARNING, &notice);
}

/* Hands over what ended the reading, again and again if asked. */
static bal_status fail(const table *t, bal_error *err) {
    const bal_error *failure = &t->reader.failure;
    if (!err) return failure->status;
    if (err->status == BAL_OK) *err = *failure;
    return err->status;
}

/* Keeps the record at n, or not. Once there is a problem no record is given any more, but all are looked at. */
static void keep_record(table *t) {
    if (t->reader.problems.first.status != BAL_OK) return;
    if (t->reader.has_missing) t->dropped++;
    else t->places[t->n++] = t->reader.place - 1;
}

static void hand_over(table *t, bal_block *block) {
    bool in_order = t->n == 0 || t->places[t->n - 1] - t->places[0] == t->n - 1;
    *block = (bal_block){.n_records = t->n,
                         .n_columns = bal_domain_variables(t->source.domain),
                         .width = t->reader.columns.width,
                         .columns = t->reader.columns.by_variable,
                         .first_record = t->n ? t->places[0] : t->reader.place,
                         .places = in_order ? NULL : t->places};
}

static bal_status next(bal_source *source, bal_block *block, bal_error *err) {
    table *t = (table *)source;
    bali_table_reader *reader = &t->reader;
    if (reader->failure.status != BAL_OK) return fail(t, err);
    bal_status status = BAL_OK;
    t->n = 0;
    while (!reader->ended && t->n < reader->columns.capacity) {
        status = bali_table_read_record(reader, t->n);
        if (status != BAL_OK) break;
        if (!reader->ended) keep_record(t);
    }
    if (status != BAL_OK || reader->problems.first.status != BAL_OK) {
        bali_missing_cells missing = {reader->missing, reader->incomplete, reader->place};
        bali_problems_conclude(&reader->problems, &missing, &reader->failure);
        return fail(t, err);
    }
    t->given += t->n;
    if (reader->ended) tell_end(t);
    hand_over(t, block);
    return BAL_OK;
}

static bal_status rewind_table(bal_source *source, bal_error *err) {
    table *t = (table *)source;
    if (t->reader.failure.status != BAL_OK || bali_table_reader_rewind(&t->reader) != BAL_OK) return fail(t, err);
    t->n = 0;
    t->given = t->dropped = 0;
    return BAL_OK;
}

static void locate(bal_source *source, uint64_t place, bal_error *err) {
    const table *t = (const table *)source;
    size_t line = err->line ? 0 : bali_table_reader_line(&t->reader, t->path, place);
    bal_error_place(err, bali_csv_name(t->reader.csv), line, 0);
    bal_error_context(err, (size_t)place + 1, NULL);
}

static void summary(const bal_source *source, bal_source_summary *out) {
    const table *t = (const table *)source;
    *out = (bal_source_summary){.records = t->given,
                                .dropped = t->dropped,
                                .missing = t->reader.missing,
                                .ignored = t->reader.header.ignored,
                                .n_ignored = t->reader.header.n_ignored};
}

static void free_table(bal_source *source) {
    table *t = (table *)source;
    bali_table_reader_close(&t->reader);
    bali_free(t->places);
    bali_free(t->path);
    bali_free(t);
}

static const bali_source_methods methods = {
    .next = next, .rewind = rewind_table, .locate = locate, .summary = summary, .free = free_table};

bal_status bal_table_open(const bal_domain *domain, const char *path, const bal_table_options *options, bal_source **out,
                          bal_error *err) {
    *out = NULL;
    table *t = bali_allocate(1, sizeof *t);
    if (!t) return bali_out_of_memory(err);
    bali_source_init(&t->source, &methods, domain);
    bal_status status = bali_table_reader_open(&t->reader, t->source.domain, path, options, err);
    if (status == BAL_OK) {
        t->path = bali_duplicate(path, strlen(path));
        t->places = bali_allocate(t->reader.columns.capacity, sizeof *t->places);
        if (!t->path || !t->places) status = bali_out_of_memory(err);
    }
    if (status == BAL_OK) *out = &t->source;
    else bal_source_free(&t->source);
    return status;
}

void bal_table_facts(const bal_source *source, bal_file_facts *facts) {
    *facts = (bal_file_facts){0};
    if (source->methods == &methods) bali_csv_facts(((const table *)source)->reader.csv, facts);
}
