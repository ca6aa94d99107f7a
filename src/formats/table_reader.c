#include "formats/table_reader.h"

#include "base/memory.h"
#include "formats/table_messages.h"
#include "formats/weights.h"

#include <string.h>

/* Where the cell at hand stands: the one the reader gave last, or an empty line before it. */
static void cell_place(const bali_table_reader *t, size_t *line, size_t *column) {
    if (t->held.text) {
        *line = t->record_line;
        *column = 1;
    } else {
        bali_csv_place(t->csv, line, column);
    }
}

static void place_error(const bali_table_reader *t, bal_error *error, size_t line, size_t column, const char *variable) {
    bal_error_place(error, bali_csv_name(t->csv), line, column);
    bal_error_context(error, (size_t)t->place + 1, variable);
}

static void tell(const bali_table_reader *t, bal_severity severity, bal_error *notice) {
    notice->status = BAL_OK;
    if (t->notices.tell) t->notices.tell(t->notices.context, severity, notice);
}

/* A text that is no outcome, or no number where numbers are expected. */
static void report_text(bali_table_reader *t, const bali_table_column *c, const char *text, size_t length, const bali_table_suspect *at) {
    if (!bali_problems_count(&t->problems, c->cuts ? BALI_BAD_NUMBER : BALI_BAD_LABEL, c->variable)) return;
    /* With every record on a line of its own the line tells the record. */
    bool obvious = at->line == t->header.line + 1 + t->place;
    bali_bad_label label = {.domain = t->domain, .variable = c->variable, .text = text, .length = length,
                            .record = obvious ? 0 : t->place + 1, .redact = t->redact};
    bali_phrase phrase = {0};
    if (c->cuts) bali_say_bad_number(&label, &phrase);
    else bali_say_bad_label(&label, &phrase);
    bal_error problem = {0};
    (void)bal_error_set(&problem, BAL_ERR_DATA, c->cuts ? "bad-number-cell" : "unknown-label", "%s", phrase.text);
    place_error(t, &problem, at->line, at->column, c->name);
    bali_problems_tell(&t->problems, &problem);
}

static void report_missing(bali_table_reader *t, const bali_table_column *c) {
    t->missing[c->variable]++;
    t->has_missing = true;
    if (t->policy != BAL_MISSING_STOP || !bali_problems_count(&t->problems, BALI_MISSING_CELL, c->variable)) return;
    size_t line, column;
    bal_error problem = {0};
    bali_phrase phrase = {0};
    bali_phrase_text(&phrase, c->name, strlen(c->name));
    (void)bal_error_set(&problem, BAL_ERR_DATA, "missing-cells", "%s is missing here; fill it in, or see --missing", phrase.text);
    cell_place(t, &line, &column);
    place_error(t, &problem, line, column, c->name);
    bali_problems_tell(&t->problems, &problem);
}

static void report_header(bali_table_reader *t) {
    if (!bali_problems_count(&t->problems, BALI_REPEATED_HEADER, BAL_NONE)) return;
    bal_error problem = {0};
    (void)bal_error_set(&problem, BAL_ERR_DATA, "repeated-header",
                        "line %zu repeats the header, as where files were joined; remove it", t->record_line);
    place_error(t, &problem, t->record_line, 1, NULL);
    bali_problems_tell(&t->problems, &problem);
}

/* A byte order mark may stand before the name: that of a second file joined to the first. */
static bool is_name(const bali_table_column *c, const bali_csv_cell *cell) {
    size_t skip = cell->length >= 3 && memcmp(cell->text, "\xEF\xBB\xBF", 3) == 0 ? 3 : 0;
    return cell->length - skip == c->heading_length && memcmp(cell->text + skip, c->heading, c->heading_length) == 0;
}

/* The record is no second header after all: what was put aside is reported. The columns before this one all hold their
 * names. */
static void report_suspects(bali_table_reader *t, const bali_table_column *c) {
    t->alike = false;
    for (size_t i = 0, s = 0; t->n_suspects > 0 && &t->columns.columns[i] != c; i++) {
        const bali_table_column *other = &t->columns.columns[i];
        if (!other->heading_unknown) continue;
        report_text(t, other, other->heading, other->heading_length, &t->suspects[s]);
        if (s + 1 < BALI_MOST_TOLD) s++; /* later ones are only counted */
    }
    t->n_suspects = 0;
}

static void take_unknown(bali_table_reader *t, const bali_table_column *c, const bali_csv_cell *cell) {
    bali_table_suspect at;
    if (!t->alike) {
        cell_place(t, &at.line, &at.column);
        report_text(t, c, cell->text, cell->length, &at);
        return;
    }
    if (t->n_suspects < BALI_MOST_TOLD) {
        cell_place(t, &at.line, &at.column);
        t->suspects[t->n_suspects] = at;
    }
    t->n_suspects++;
}

/* Told once a column. */
static void note_contested(bali_table_reader *t, bali_table_column *c, const bali_csv_cell *cell) {
    if (!bali_table_columns_missing(&t->columns, cell)) return;
    c->contested = false;
    size_t line, column;
    bal_error note = {0};
    bali_phrase phrase = {0};
    bali_phrase_quote(&phrase, cell->text, cell->length);
    bali_phrase_add(&phrase, " is an outcome of ");
    bali_phrase_text(&phrase, c->name, strlen(c->name));
    (void)bal_error_set(&note, BAL_ERR_DATA, "outcome-not-missing", "%s, so it is not taken as a missing cell there", phrase.text);
    cell_place(t, &line, &column);
    place_error(t, &note, line, column, c->name);
    tell(t, BAL_NOTE, &note);
}

static void take_cell(bali_table_reader *t, bali_table_column *c, const bali_csv_cell *cell) {
    if (t->alike && !is_name(c, cell)) report_suspects(t, c);
    size_t code = bali_table_columns_code(&t->columns, c, cell);
    if (code == BALI_MISSING) report_missing(t, c);
    else if (code == BALI_UNKNOWN) take_unknown(t, c, cell);
    else if (c->contested) note_contested(t, c, cell);
    if (t->columns.width == 1) ((uint8_t *)c->codes)[t->n] = (uint8_t)code;
    else ((uint16_t *)c->codes)[t->n] = (uint16_t)code;
}

static void report_weight(bali_table_reader *t, const char *text, size_t length, const bali_table_suspect *at) {
    if (!bali_problems_count(&t->problems, BALI_BAD_WEIGHT, BAL_NONE)) return;
    bal_error problem = {0};
    bali_phrase phrase = {0};
    bali_say_bad_weight(text, length, t->redact, &phrase);
    (void)bal_error_set(&problem, BAL_ERR_DATA, "bad-weight", "%s", phrase.text);
    place_error(t, &problem, at->line, at->column, t->header.names[t->header.weight]);
    bali_problems_tell(&t->problems, &problem);
}

static void take_weight(bali_table_reader *t, const bali_csv_cell *cell) {
    const char *name = t->header.names[t->header.weight];
    if (bali_weight_read(cell->text, cell->length, &t->weight)) return;
    t->weight = 0;
    cell_place(t, &t->weight_at.line, &t->weight_at.column);
    t->weight_is_name = cell->length == strlen(name) && memcmp(cell->text, name, cell->length) == 0;
    if (!t->weight_is_name) report_weight(t, cell->text, cell->length, &t->weight_at);
}

/* A record without a label belongs to no fold. What is missing elsewhere is missing here, unless it is an outcome in this column. */
static void take_group(bali_table_reader *t, const bali_csv_cell *cell) {
    const bali_table_column *c = t->columns.by_place[t->header.group];
    bool missing = bali_table_columns_missing(&t->columns, cell);
    if (missing && cell->length > 0 && c) missing = bali_table_columns_code(&t->columns, c, cell) >= BALI_MISSING;
    bali_text_clear(&t->group);
    bali_text_add(&t->group, cell->text, cell->length);
    if (!missing || !bali_problems_count(&t->problems, BALI_MISSING_GROUP, BAL_NONE)) return;
    size_t line, column;
    bal_error problem = {0};
    (void)bal_error_set(&problem, BAL_ERR_DATA, "missing-group", "the label of the fold is missing here; fill it in, or remove the record");
    cell_place(t, &line, &column);
    place_error(t, &problem, line, column, t->header.names[t->header.group]);
    bali_problems_tell(&t->problems, &problem);
}

/* Adds the column's name to what the reader of cells says. */
static bal_status broken_cell(bali_table_reader *t, size_t column) {
    if (column >= t->header.n_columns || t->failure.line == 0) return t->failure.status;
    const char *name = t->header.names[column];
    bali_phrase phrase = {0};
    bali_phrase_add(&phrase, "%s (in column ", t->failure.message);
    bali_phrase_text(&phrase, name, strlen(name));
    bali_phrase_add(&phrase, ")");
    memcpy(t->failure.message, phrase.text, sizeof phrase.text);
    bal_error_context(&t->failure, (size_t)t->place + 1, name);
    return t->failure.status;
}

static bal_status comment_line(bali_table_reader *t) {
    bal_status status = bal_error_set(&t->failure, BAL_ERR_SYNTAX, "comment-line",
                                      "the line begins with \"#\" and is no record; remove comment lines");
    place_error(t, &t->failure, t->record_line, 1, NULL);
    return status;
}

static bal_status short_record(bali_table_reader *t, size_t n_cells) {
    if (t->is_comment) return comment_line(t);
    const char *hint = "is a delimiter missing, or a quote not closed?";
    bal_status status = bal_error_set(&t->failure, BAL_ERR_SYNTAX, "ragged-record",
                                      "found %zu cell%s, expected %zu as in the header on line %zu; %s", n_cells,
                                      n_cells == 1 ? "" : "s", t->header.n_columns, t->header.line, hint);
    place_error(t, &t->failure, t->record_line, 0, NULL);
    return status;
}

/* There is a cell more than columns: reads on to say how many there are; a line may have no end. */
static bal_status long_record(bali_table_reader *t, const bali_csv_cell *first_beyond) {
    if (t->is_comment) return comment_line(t);
    size_t line, column, n_cells = t->header.n_columns + 1;
    bool at_end = first_beyond->ends_record && first_beyond->length == 0;
    bali_csv_cell cell = *first_beyond;
    bali_csv_place(t->csv, &line, &column);
    for (; !cell.ends_record && n_cells < BALI_MOST_COLUMNS; n_cells++)
        if (bali_csv_next(t->csv, &cell, NULL) != BAL_OK || !cell.text) break;
    bal_status status = bal_error_set(&t->failure, BAL_ERR_SYNTAX, "ragged-record",
                                      "found %zu cells%s, expected %zu as in the header on line %zu; %s", n_cells,
                                      n_cells < BALI_MOST_COLUMNS ? "" : " or more", t->header.n_columns, t->header.line,
                                      at_end ? "remove the delimiter at the end of the line"
                                             : "quote a cell that holds a delimiter, or remove what is too much");
    place_error(t, &t->failure, line, column, NULL);
    return status;
}

static bal_status blank_line(bali_table_reader *t) {
    bal_status status = bal_error_set(&t->failure, BAL_ERR_SYNTAX, "blank-line",
                                      "a blank line between records; remove it");
    place_error(t, &t->failure, t->blank_line, 1, NULL);
    return status;
}

static bool is_blank_line(const bali_csv_cell *cell) {
    return cell->length == 0 && !cell->quoted && cell->ends_record;
}

/* Gives the first empty line that was met before the cell that is held. */
static void give_blank_line(bali_table_reader *t, bali_csv_cell *cell) {
    static const char empty[BALI_CSV_READABLE] = "";
    *cell = (bali_csv_cell){.text = empty, .ends_record = true};
    t->blank_lines--;
    t->record_line = t->blank_line++;
}

/* Whether empty lines at the end may be records: cells of a single column in which the empty cell is an outcome. */
static bool may_be_records(const bali_table_reader *t) {
    const bali_table_column *only = t->header.n_columns == 1 ? t->columns.by_place[0] : NULL;
    return t->blank_lines > 0 && only && only->empty != BALI_MISSING;
}

static bal_status blank_end(bali_table_reader *t) {
    bal_status status = bal_error_set(&t->failure, BAL_ERR_SYNTAX, "blank-line",
                                      "blank lines end the table, and an empty cell is an outcome here; remove them, or write \"\" for "
                                      "records");
    place_error(t, &t->failure, t->blank_line, 1, NULL);
    return status;
}

/* Gives the first cell of the next record; its text is NULL at the end. Empty lines at the end are nothing. */
static bal_status begin_record(bali_table_reader *t, bali_csv_cell *cell) {
    size_t column;
    bool held = t->held.text != NULL;
    if (held && t->blank_lines > 0) {
        give_blank_line(t, cell);
        return BAL_OK;
    }
    *cell = t->held;
    t->held = (bali_csv_cell){0};
    for (bool blank = !held; blank;) {
        bal_status status = bali_csv_next(t->csv, cell, &t->failure);
        if (status != BAL_OK) return broken_cell(t, 0);
        if (!cell->text) return may_be_records(t) ? blank_end(t) : BAL_OK;
        blank = is_blank_line(cell);
        if (!blank) break;
        bali_csv_place(t->csv, &t->record_line, &column);
        if (t->blank_lines++ == 0) t->blank_line = t->record_line;
    }
    if (t->blank_lines > 0 && t->header.n_columns > 1) return blank_line(t);
    if (t->blank_lines > 0) {
        t->held = *cell;
        give_blank_line(t, cell);
        return BAL_OK;
    }
    bali_csv_place(t->csv, &t->record_line, &column);
    return BAL_OK;
}

bal_status bali_table_read_record(bali_table_reader *t, size_t n) {
    bali_csv_cell cell;
    bal_status status = begin_record(t, &cell);
    if (status != BAL_OK) return status;
    t->ended = !cell.text;
    if (t->ended) return BAL_OK;
    t->n = n;
    t->has_missing = false;
    t->alike = true;
    t->n_suspects = 0;
    t->weight = 1;
    t->weight_is_name = false;
    t->is_comment = cell.length > 0 && cell.text[0] == '#' && !cell.quoted;
    const bali_table_column *first = t->columns.by_place[0];
    if (t->is_comment && first && bali_table_columns_code(&t->columns, first, &cell) == BALI_UNKNOWN)
        return comment_line(t);
    for (size_t c = 0;; c++) {
        if (c == t->header.n_columns) return long_record(t, &cell);
        if (t->columns.by_place[c]) take_cell(t, t->columns.by_place[c], &cell);
        if (c == t->header.weight) take_weight(t, &cell);
        if (c == t->header.group) take_group(t, &cell);
        if (cell.ends_record && c + 1 < t->header.n_columns) return short_record(t, c + 1);
        if (cell.ends_record) break;
        status = bali_csv_next(t->csv, &cell, &t->failure);
        if (status != BAL_OK) return broken_cell(t, c + 1);
    }
    bool is_header = t->alike && t->n_suspects > 0;
    const char *weight = t->weight_is_name ? t->header.names[t->header.weight] : NULL;
    if (is_header) report_header(t);
    else if (weight) report_weight(t, weight, strlen(weight), &t->weight_at);
    t->incomplete += t->has_missing;
    t->place++;
    return t->group.failed ? bali_out_of_memory(&t->failure) : BAL_OK;
}

/* Steps over the first record, which was read before. */
static bal_status skip_record(bali_csv *csv, bal_error *err) {
    bali_csv_cell cell;
    bal_status status;
    do status = bali_csv_next(csv, &cell, err);
    while (status == BAL_OK && cell.text && !cell.ends_record);
    return status;
}

bal_status bali_table_reader_rewind(bali_table_reader *t) {
    if (t->place == 0 && !t->ended) return BAL_OK; /* nothing was read: a pipe may go on */
    bal_status status = bali_csv_rewind(t->csv, &t->failure);
    if (status == BAL_OK) status = skip_record(t->csv, &t->failure);
    t->place = t->incomplete = 0;
    t->ended = false;
    t->blank_lines = 0;
    t->held = (bali_csv_cell){0};
    memset(t->missing, 0, bal_domain_variables(t->domain) * sizeof *t->missing);
    return status;
}

/* Reads one record for its line and its weight. *line is 0 at the end. */
static bal_status read_weight(bali_csv *csv, size_t weight_column, size_t *line, double *weight) {
    bali_csv_cell cell;
    size_t column;
    *line = 0;
    *weight = 1;
    for (size_t c = 0;; c++) {
        bal_status status = bali_csv_next(csv, &cell, NULL);
        if (status != BAL_OK || !cell.text) return status;
        if (c == 0) bali_csv_place(csv, line, &column);
        if (c == weight_column && !bali_weight_read(cell.text, cell.length, weight)) *weight = 0;
        if (cell.ends_record) return BAL_OK;
    }
}

void bali_table_reader_find(const bali_table_reader *t, const char *path, uint64_t place, size_t *record, size_t *line) {
    bali_csv *csv = NULL;
    bali_csv_options options = {.delimiter = bali_csv_delimiter(t->csv)};
    size_t n = 0, at = 0;
    uint64_t end = 0;
    double weight;
    *line = 0;
    *record = t->header.weight == BAL_NONE ? (size_t)place + 1 : 0;
    if (!bali_csv_can_rewind(t->csv) || strcmp(path, "-") == 0) return;
    bal_status status = bali_csv_open(path, &options, &csv, NULL);
    if (status == BAL_OK) status = skip_record(csv, NULL);
    while (status == BAL_OK && end <= place) {
        status = read_weight(csv, t->header.weight, &at, &weight);
        if (at == 0) break;
        end += bali_weight_places(weight);
        n++;
    }
    if (status == BAL_OK && end > place) {
        *record = n;
        *line = at;
    }
    bali_csv_close(csv);
}

bal_status bali_table_reader_open(bali_table_reader *t, const bal_domain *domain, const char *path,
                                  const bal_table_options *options, bal_error *err) {
    t->domain = domain;
    t->policy = options->missing;
    t->redact = options->redact;
    t->header.weight = t->header.group = BAL_NONE;
    if (options->notices) t->notices = *options->notices;
    if (options->fold_column && !options->groups)
        return bal_error_set(err, BAL_ERR_ARGUMENT, "option-mismatch",
                             "a fold column needs groups to number its labels in; make them with bal_groups_create");
    bali_csv_options csv_options = {.delimiter = options->delimiter, .redact = options->redact};
    bal_status status = bali_column_rules_read(&t->rules, domain, options->document, err);
    if (status == BAL_OK) status = bali_csv_open(path, &csv_options, &t->csv, err);
    if (status == BAL_OK) status = bali_table_header_read(&t->header, t->csv, domain, &t->rules, options, err);
    if (status == BAL_OK) status = bali_table_columns_create(&t->columns, domain, &t->header, &t->rules, options, err);
    if (status != BAL_OK) return status;
    t->missing = bali_allocate(bal_domain_variables(domain), sizeof *t->missing);
    if (!t->missing) return bali_out_of_memory(err);
    return bali_problems_create(&t->problems, domain, options->notices) ? BAL_OK : bali_out_of_memory(err);
}

void bali_table_reader_close(bali_table_reader *t) {
    bali_csv_close(t->csv);
    bali_table_header_free(&t->header);
    bali_table_columns_free(&t->columns);
    bali_column_rules_free(&t->rules);
    bali_text_free(&t->group);
    bali_problems_free(&t->problems);
    bali_free(t->missing);
}
