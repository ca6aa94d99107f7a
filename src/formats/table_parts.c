/* A table read in parts of fixed size, whatever the number of threads.
 *
 * A part begins behind the first line end at or after its lower bound and ends where a record begins at or after its upper one.
 * A line end may lie inside quotes; then a part begins where the one before does not end, and the parts do not join. Every part opens
 * the file by its name again: where that is another file by now, the parts do not join either. */
#include "base/memory.h"
#include "formats/table_source.h"

#include <string.h>

static size_t parts_of(const bali_table *t) {
    bool fresh = t->reader.place == 0 && !t->reader.ended && t->reader.failure.status == BAL_OK;
    if (!fresh || t->options.fold_column || strcmp(t->path, "-") == 0) return 0;
    uint64_t size = bali_csv_seekable_size(t->reader.csv), n = size / t->part_bytes + (size % t->part_bytes > 0);
    return n < 2 || n > SIZE_MAX / sizeof(bali_table_note) ? 0 : (size_t)n;
}

static size_t count(bal_source *source) {
    bali_table *t = (bali_table *)source;
    if (t->notes) return t->n_notes;
    size_t n = parts_of(t);
    if (n > 0) t->notes = bali_allocate(n, sizeof *t->notes);
    if (t->notes) t->n_notes = n;
    return t->n_notes;
}

void bali_table_notes_free(bali_table *t) {
    for (size_t i = 0; i < t->n_notes; i++) bali_free(t->notes[i].missing);
    bali_free(t->notes);
    t->notes = NULL;
    t->n_notes = 0;
}

static void count_remark(void *remarks, bal_severity severity, const bal_error *notice) {
    (void)severity;
    (void)notice;
    ++*(size_t *)remarks;
}

static bal_status open_part(bal_source *source, size_t part, bal_source **out, bal_error *err) {
    const bali_table *whole = (const bali_table *)source;
    bali_table_note *note = &whole->notes[part];
    bal_notices quiet = {count_remark, &note->remarks};
    bal_table_options options = whole->options;
    options.notices = &quiet; /* which is copied */
    options.delimiter = bali_csv_delimiter(whole->reader.csv);
    bali_table *t = NULL;
    *out = NULL;
    bal_status status = bali_table_open(whole->source.domain, whole->path, &options, &t, err);
    if (status != BAL_OK) return status;
    note->remarks = bali_csv_same_file(t->reader.csv, whole->reader.csv) ? 0 : 1; /* those on the header were told before */
    t->is_part = true;
    t->bound = part + 1 < whole->n_notes ? (part + 1) * whole->part_bytes : 0;
    if (part > 0) status = bali_csv_seek(t->reader.csv, part * whole->part_bytes, err);
    t->start = bali_csv_offset(t->reader.csv);
    if (status == BAL_OK) *out = &t->source;
    else bal_source_free(&t->source);
    return status;
}

static void close_part(bal_source *source, size_t part, bal_source *opened) {
    bali_table *whole = (bali_table *)source, *t = (bali_table *)opened;
    bali_table_note *note = &whole->notes[part];
    *note = (bali_table_note){.closed = true,
                              .remarks = note->remarks,
                              .start = t->start,
                              .end = bali_csv_offset(t->reader.csv),
                              .records = t->reader.place,
                              .given = t->given,
                              .dropped = t->dropped,
                              .incomplete = t->incomplete,
                              .places = t->end,
                              .weight = t->weight,
                              .fractional = t->fractional,
                              .weighs = t->weighs,
                              .missing = t->reader.missing};
    t->reader.missing = NULL; /* kept with the note */
    bal_source_free(opened);
}

/* Whether the parts follow one another from the header to the end, and none had anything to say. */
static bool follow(const bali_table *t) {
    uint64_t at = bali_csv_offset(t->reader.csv);
    for (size_t i = 0; i < t->n_notes; i++) {
        const bali_table_note *note = &t->notes[i];
        if (!note->closed || note->remarks > 0 || note->start != at) return false;
        at = note->end;
    }
    return at == bali_csv_seekable_size(t->reader.csv);
}

static void take_over(bali_table *t, const bali_table_note *note) {
    t->reader.place += note->records;
    t->reader.incomplete += note->dropped + note->incomplete;
    t->given += note->given;
    t->dropped += note->dropped;
    t->incomplete += note->incomplete;
    t->end += note->places;
    t->fractional |= note->fractional;
    t->weighs |= note->weighs;
    bali_weight_join(&t->weight, &note->weight);
    for (size_t v = 0; v < bal_domain_variables(t->source.domain); v++) t->reader.missing[v] += note->missing[v];
}

/* Stands at the end of the file, as after reading it: its size is noted, and a change is noticed. */
static bool reach_end(bali_table *t) {
    bali_csv_cell cell;
    bal_error ignored = {0};
    t->reader.ended = true; /* also when this fails, so that a rewind goes back */
    return bali_csv_seek(t->reader.csv, bali_csv_seekable_size(t->reader.csv) + 1, &ignored) == BAL_OK &&
           bali_csv_next(t->reader.csv, &cell, &ignored) == BAL_OK && !cell.text;
}

static bool join(bal_source *source) {
    bali_table *t = (bali_table *)source;
    bool joined = follow(t);
    uint64_t places = 0, given = 0;
    bool weighs = false;
    for (size_t i = 0; i < t->n_notes; i++) {
        places += t->notes[i].places;
        given += t->notes[i].given;
        weighs |= t->notes[i].weighs;
    }
    /* What is said at a table's end is left to reading it in order. */
    joined = joined && given > 0 && weighs && places <= BALI_LARGEST_WEIGHT_SUM && reach_end(t);
    for (size_t i = 0; i < t->n_notes && joined; i++) take_over(t, &t->notes[i]);
    return joined;
}

const bali_source_parts bali_table_parts = {count, open_part, close_part, join};
