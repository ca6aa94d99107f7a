/* A table file as a source of blocks. */
#include "formats/table_source.h"

#include "base/memory.h"
#include "formats/groups.h"

#include <math.h>
#include <string.h>

bal_table_options bal_table_options_defaults(void) {
    return (bal_table_options){.missing = BAL_MISSING_STOP};
}

/* Says once that there is nothing to learn from. */
static void tell_end(bali_table *t) {
    const bal_notices *notices = &t->reader.notices;
    bool nothing = t->given == 0 || (t->weights && t->weight.whole == 0 && t->weight.parts == 0);
    if (t->told_end || !nothing) return;
    t->told_end = true;
    if (!notices->tell) return;
    bal_error notice = {0};
    if (t->reader.place == 0)
        (void)bal_error_set(&notice, BAL_ERR_DATA, "no-records", "the table has a header and no records: an empty batch");
    else if (t->given == 0)
        (void)bal_error_set(&notice, BAL_ERR_DATA, "no-records", "each of its %zu records has a missing cell, so none is left",
                            (size_t)t->reader.place);
    else
        (void)bal_error_set(&notice, BAL_ERR_DATA, "no-records", "every record that is complete has the weight 0, so none is left");
    bal_error_place(&notice, bali_csv_name(t->reader.csv), 0, 0);
    notice.status = BAL_OK;
    notices->tell(notices->context, BAL_WARNING, &notice);
}

/* Hands over what ended the reading, again and again if asked. */
static bal_status fail(const bali_table *t, bal_error *err) {
    const bal_error *failure = &t->reader.failure;
    if (!err) return failure->status;
    if (err->status == BAL_OK) *err = *failure;
    return err->status;
}

/* The number of the record's group. Records that do not count get no number of their own, as where they are not there at all. */
static bal_status take_number(bali_table *t, bal_error *failure) {
    const bali_text *label = &t->reader.group;
    uint32_t *number = &t->numbers[t->n];
    *number = 0;
    if (!(t->reader.weight > 0)) return BAL_OK;
    if (!bali_groups_number(t->groups, bali_text_string(label), label->length, number)) return bali_out_of_memory(failure);
    if (*number != UINT32_MAX) return BAL_OK;
    (void)bal_error_set(failure, BAL_ERR_DATA, "too-many-groups", "the fold column has more than %zu labels; give a column with few",
                        BALI_MOST_GROUPS);
    bal_error_place(failure, bali_csv_name(t->reader.csv), t->reader.record_line, 0);
    return failure->status;
}

static bal_status too_heavy(const bali_table *t, bal_error *failure) {
    bal_status status = bal_error_set(failure, BAL_ERR_DATA, "bad-weight",
                                      "the weights up to here sum to more than 2^53, beyond which counts are not exact; divide them all by "
                                      "one number");
    bal_error_place(failure, bali_csv_name(t->reader.csv), t->reader.record_line, 0);
    return status;
}

/* Keeps the record at n, or not. Once there is a problem no record is given any more, but all are looked at. */
static bal_status keep_record(bali_table *t) {
    bali_table_reader *reader = &t->reader;
    if (reader->problems.first.status != BAL_OK) return BAL_OK;
    uint64_t place = t->end;
    t->end += bali_weight_places(reader->weight);
    t->weighs |= reader->weight > 0;
    if (t->end > BALI_LARGEST_WEIGHT_SUM) return too_heavy(t, &reader->failure);
    if (reader->has_missing && reader->policy == BAL_MISSING_DROP) {
        t->dropped++;
        return BAL_OK;
    }
    t->fractional |= reader->weight != floor(reader->weight);
    bal_status status = t->groups ? take_number(t, &reader->failure) : BAL_OK;
    if (status != BAL_OK) return status;
    t->incomplete += reader->has_missing;
    bali_weight_add(&t->weight, reader->weight);
    if (t->weights) t->weights[t->n] = reader->weight;
    t->places[t->n++] = place;
    return BAL_OK;
}

/* A table in which nothing counts is a mistake, unless it is empty. */
static bal_status check_weights(const bali_table *t, bal_error *failure) {
    if (!t->weights || t->weighs || t->reader.place == 0) return BAL_OK;
    bal_status status = bal_error_set(failure, BAL_ERR_DATA, "no-weight", "no record has a weight above 0; is it the right column?");
    bal_error_place(failure, bali_csv_name(t->reader.csv), 0, 0);
    bal_error_context(failure, 0, t->reader.header.names[t->reader.header.weight]);
    return status;
}

static void hand_over(bali_table *t, bal_block *block) {
    bool in_order = !t->weights && (t->n == 0 || t->places[t->n - 1] - t->places[0] == t->n - 1);
    *block = (bal_block){.n_records = t->n,
                         .n_columns = bal_domain_variables(t->source.domain),
                         .width = t->reader.columns.width,
                         .columns = t->reader.columns.by_variable,
                         .weights = t->weights,
                         .groups = t->numbers,
                         .first_record = t->n ? t->places[0] : t->end,
                         .places = in_order ? NULL : t->places};
}

/* Whether the next record belongs to the next part. Blank lines that were met before it are read to their end here. */
static bool at_bound(const bali_table *t) {
    const bali_table_reader *reader = &t->reader;
    return t->bound > 0 && !reader->held.text && reader->blank_lines == 0 && bali_csv_offset(reader->csv) >= t->bound;
}

static bal_status next(bal_source *source, bal_block *block, bal_error *err) {
    bali_table *t = (bali_table *)source;
    bali_table_reader *reader = &t->reader;
    if (reader->failure.status != BAL_OK) return fail(t, err);
    bal_status status = BAL_OK;
    t->n = 0;
    while (!reader->ended && t->n < reader->columns.capacity) {
        if (at_bound(t)) {
            reader->ended = true;
            break;
        }
        status = bali_table_read_record(reader, t->n);
        if (status != BAL_OK) break;
        if (!reader->ended) status = keep_record(t);
        if (status != BAL_OK) break;
    }
    bool whole = reader->ended && !t->is_part;
    if (status == BAL_OK && whole && reader->problems.first.status == BAL_OK) status = check_weights(t, &reader->failure);
    if (status != BAL_OK || reader->problems.first.status != BAL_OK) {
        bali_missing_cells missing = {reader->missing, reader->incomplete, reader->place};
        bali_problems_conclude(&reader->problems, &missing, &reader->failure);
        return fail(t, err);
    }
    t->given += t->n;
    if (whole) tell_end(t);
    hand_over(t, block);
    return BAL_OK;
}

static bal_status rewind_table(bal_source *source, bal_error *err) {
    bali_table *t = (bali_table *)source;
    if (t->reader.failure.status != BAL_OK || bali_table_reader_rewind(&t->reader) != BAL_OK) return fail(t, err);
    t->n = 0;
    t->given = t->dropped = t->incomplete = t->end = 0;
    t->weight = (bali_weight_sum){0};
    t->fractional = t->weighs = false;
    return BAL_OK;
}

static void locate(bal_source *source, uint64_t place, bal_error *err) {
    const bali_table *t = (const bali_table *)source;
    size_t record, line;
    bali_table_reader_find(&t->reader, t->path, place, &record, &line);
    bal_error_place(err, bali_csv_name(t->reader.csv), line, 0);
    bal_error_context(err, record, NULL);
}

static void summary(const bal_source *source, bal_source_summary *out) {
    const bali_table *t = (const bali_table *)source;
    *out = (bal_source_summary){.records = t->given,
                                .dropped = t->dropped,
                                .incomplete = t->incomplete,
                                .places = t->end,
                                .weight = bali_weight_value(&t->weight),
                                .fractional = t->fractional,
                                .n_groups = t->groups ? bali_groups_count(t->groups) : 0,
                                .missing = t->reader.missing,
                                .ignored = t->reader.header.ignored,
                                .n_ignored = t->reader.header.n_ignored};
}

static void free_table(bal_source *source) {
    bali_table *t = (bali_table *)source;
    bali_table_reader_close(&t->reader);
    bali_table_notes_free(t);
    bali_free(t->places);
    bali_free(t->weights);
    bali_free(t->numbers);
    bali_free(t->path);
    bali_free(t);
}

static const bali_source_methods methods = {
    .next = next, .rewind = rewind_table, .locate = locate, .summary = summary, .free = free_table, .parts = &bali_table_parts};

static bal_status fill(bali_table *t, const char *path, const bal_table_options *options, bal_error *err) {
    size_t capacity = t->reader.columns.capacity;
    bool complete = true;
    t->path = bali_duplicate(path, strlen(path));
    t->places = bali_allocate(capacity, sizeof *t->places);
    if (options->weight) complete = (t->weights = bali_allocate(capacity, sizeof *t->weights)) != NULL;
    if (options->fold_column) complete = (t->numbers = bali_allocate(capacity, sizeof *t->numbers)) != NULL && complete;
    if (options->fold_column) t->groups = options->groups;
    return complete && t->path && t->places ? BAL_OK : bali_out_of_memory(err);
}

bal_status bali_table_open(const bal_domain *domain, const char *path, const bal_table_options *options, bali_table **out, bal_error *err) {
    *out = NULL;
    bali_table *t = bali_allocate(1, sizeof *t);
    if (!t) return bali_out_of_memory(err);
    bali_source_init(&t->source, &methods, domain);
    t->options = *options;
    t->part_bytes = BALI_PART_BYTES;
    bal_status status = bali_table_reader_open(&t->reader, t->source.domain, path, options, err);
    if (status == BAL_OK) status = fill(t, path, options, err);
    if (status == BAL_OK) *out = t;
    else bal_source_free(&t->source);
    return status;
}

bal_status bal_table_open(const bal_domain *domain, const char *path, const bal_table_options *options, bal_source **out,
                          bal_error *err) {
    bali_table *t = NULL;
    bal_status status = bali_table_open(domain, path, options, &t, err);
    *out = t ? &t->source : NULL;
    return status;
}

void bal_table_facts(const bal_source *source, bal_file_facts *facts) {
    *facts = (bal_file_facts){0};
    if (source->methods == &methods) bali_csv_facts(((const bali_table *)source)->reader.csv, facts);
}
