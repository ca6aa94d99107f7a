/* A codebook's lines, by variable. */
#include "formats/codebook.h"

#include "base/memory.h"
#include "base/names.h"
#include "formats/csv.h"
#include "formats/phrase.h"
#include "formats/spelling.h"
#include "model/domain.h"

#include <string.h>

enum { COLUMN_VARIABLE, COLUMN_OUTCOME, COLUMN_CODE, N_NAMED, MOST_LISTED = 10, LONGEST_CODE = 255 };

#define MOST_COLUMNS ((size_t)1 << 12)
#define MOST_LINES ((size_t)1 << 22)

static const char *const column_names[N_NAMED] = {"variable", "outcome", "code"};

struct bal_codebook {
    bal_domain *domain;
    char *file;
    bali_spellings *spellings; /* one a variable */
};

/* What one reading shares. */
typedef struct reading {
    bal_codebook *codebook;
    bali_csv *csv;
    const bal_notices *notices;
    bali_names *seen;          /* the codes of each variable */
    char **headings;           /* names of all columns */
    size_t n_columns, capacity;
    size_t at[N_NAMED];        /* place of each named column */
    char *cells[N_NAMED];      /* of the line at hand */
    size_t lines[N_NAMED], columns[N_NAMED]; /* where they stand */
    size_t n_lines;
} reading;

static bal_status place(const reading *r, size_t line, size_t column, const char *variable, bal_error *err) {
    bal_error_place(err, bali_csv_name(r->csv), line, column);
    bal_error_context(err, 0, variable);
    return err ? err->status : BAL_ERR_DATA;
}

static bal_status place_here(const reading *r, bal_error *err) {
    size_t line, column;
    bali_csv_place(r->csv, &line, &column);
    return place(r, line, column, NULL, err);
}

/* ---- the header ---- */

static bal_status refuse_absent(const reading *r, size_t named, bal_error *err) {
    bali_phrase phrase = {0};
    bali_difference how;
    const char *name = column_names[named];
    size_t near = bali_spelling_nearest(name, strlen(name), (const char *const *)r->headings, r->n_columns, &how);
    bali_phrase_add(&phrase, "the codebook has no column %s; its columns are variable, outcome and code", name);
    if (near != BALI_NO_NAME) {
        bali_phrase_add(&phrase, ": rename ");
        bali_phrase_quote(&phrase, r->headings[near], strlen(r->headings[near]));
    } else if (r->n_columns == 1) {
        bali_phrase_add(&phrase, ", with commas or tabs between them");
    }
    (void)bal_error_set(err, BAL_ERR_DATA, "missing-column", "%s", phrase.text);
    return place(r, 1, 0, NULL, err);
}

static void tell_ignored(const reading *r) {
    if (r->n_columns == N_NAMED || !r->notices || !r->notices->tell) return;
    bali_phrase phrase = {0};
    size_t listed = 0;
    for (size_t c = 0; c < r->n_columns && listed < MOST_LISTED && phrase.length < sizeof phrase.text / 2; c++) {
        bool named = c == r->at[COLUMN_VARIABLE] || c == r->at[COLUMN_OUTCOME] || c == r->at[COLUMN_CODE];
        if (named) continue;
        if (listed++ > 0) bali_phrase_add(&phrase, ", ");
        bali_phrase_text(&phrase, r->headings[c], strlen(r->headings[c]));
    }
    if (r->n_columns - N_NAMED > listed) bali_phrase_add(&phrase, " and %zu more", r->n_columns - N_NAMED - listed);
    bal_error notice = {0};
    (void)bal_error_set(&notice, BAL_OK, "ignored-columns", "of the codebook's columns, only variable, outcome and code are used; ignored: %s",
                        phrase.text);
    bal_error_place(&notice, bali_csv_name(r->csv), 1, 0);
    r->notices->tell(r->notices->context, BAL_WARNING, &notice);
}

static bal_status add_heading(reading *r, const bali_csv_cell *cell, bal_error *err) {
    if (r->n_columns == MOST_COLUMNS) {
        (void)bal_error_set(err, BAL_ERR_DATA, "too-many-columns", "the codebook has more than %zu columns; it needs variable, outcome and code",
                            MOST_COLUMNS);
        return place_here(r, err);
    }
    if (!bali_grow((void **)&r->headings, &r->capacity, r->n_columns + 1, sizeof *r->headings)) return bali_out_of_memory(err);
    char *heading = bali_duplicate(cell->text, cell->length);
    if (!heading) return bali_out_of_memory(err);
    r->headings[r->n_columns++] = heading;
    for (size_t i = 0; i < N_NAMED; i++) {
        if (strcmp(heading, column_names[i]) != 0) continue;
        if (r->at[i] != BAL_NONE) {
            (void)bal_error_set(err, BAL_ERR_DATA, "duplicate-column", "columns %zu and %zu are both named \"%s\"; rename or remove one",
                                r->at[i] + 1, r->n_columns, heading);
            return place_here(r, err);
        }
        r->at[i] = r->n_columns - 1;
    }
    return BAL_OK;
}

static bal_status read_header(reading *r, bal_error *err) {
    bali_csv_cell cell;
    do {
        bal_status status = bali_csv_next(r->csv, &cell, err);
        if (status == BAL_OK && !cell.text) {
            (void)bal_error_set(err, BAL_ERR_SYNTAX, "no-header", "the file is empty; the first line of a codebook is variable,outcome,code");
            return place(r, 1, 1, NULL, err);
        }
        if (status == BAL_OK) status = add_heading(r, &cell, err);
        if (status != BAL_OK) return status;
    } while (!cell.ends_record);
    for (size_t i = 0; i < N_NAMED; i++)
        if (r->at[i] == BAL_NONE) return refuse_absent(r, i, err);
    tell_ignored(r);
    return BAL_OK;
}

/* ---- the lines ---- */

static bal_status unknown(const reading *r, size_t named, size_t variable, bal_error *err) {
    const bal_domain *domain = r->codebook->domain;
    const char *text = r->cells[named], *owner = variable == BAL_NONE ? NULL : bal_domain_name(domain, variable);
    const char *const *names = owner ? bali_domain_labels(domain, variable) : bali_domain_names(domain);
    size_t n = owner ? bal_domain_outcomes(domain, variable) : bal_domain_variables(domain);
    bali_difference how;
    bali_phrase phrase = {0};
    bali_phrase_quote(&phrase, text, strlen(text));
    bali_phrase_add(&phrase, owner ? " is not an outcome of " : " is not a variable of the network");
    if (owner) bali_phrase_text(&phrase, owner, strlen(owner));
    size_t near = bali_spelling_nearest(text, strlen(text), names, n, &how);
    if (near == BALI_NO_NAME) {
        bali_phrase_add(&phrase, owner ? "; write one of its outcomes, such as " : "; write one of its variables, such as ");
        bali_phrase_quote(&phrase, names[0], strlen(names[0]));
    } else {
        bali_phrase_add(&phrase, "; did you mean ");
        bali_phrase_quote(&phrase, names[near], strlen(names[near]));
        bali_phrase_add(&phrase, "?");
    }
    (void)bal_error_set(err, BAL_ERR_DATA, owner ? "unknown-label" : "unknown-variable", "%s", phrase.text);
    return place(r, r->lines[named], r->columns[named], owner, err);
}

/* A code that stands for two outcomes. line is that of the other one; 0 when the code is the other outcome's label. */
static bal_status ambiguous(const reading *r, size_t variable, size_t outcome, size_t other, size_t line, bal_error *err) {
    const bal_domain *domain = r->codebook->domain;
    const char *code = r->cells[COLUMN_CODE], *name = bal_domain_name(domain, variable);
    const char *here = bal_domain_outcome(domain, variable, outcome), *there = bal_domain_outcome(domain, variable, other);
    bali_phrase phrase = {0};
    bali_phrase_add(&phrase, "the code ");
    bali_phrase_quote(&phrase, code, strlen(code));
    bali_phrase_add(&phrase, " of ");
    bali_phrase_text(&phrase, name, strlen(name));
    bali_phrase_add(&phrase, " stands for ");
    bali_phrase_quote(&phrase, here, strlen(here));
    bali_phrase_add(&phrase, " here, and ");
    if (line == 0) {
        bali_phrase_add(&phrase, "is another outcome of it; choose another code");
    } else {
        bali_phrase_add(&phrase, "for ");
        bali_phrase_quote(&phrase, there, strlen(there));
        bali_phrase_add(&phrase, " on line %zu; keep one", line);
    }
    (void)bal_error_set(err, BAL_ERR_DATA, "ambiguous-code", "%s", phrase.text);
    return place(r, r->lines[COLUMN_CODE], r->columns[COLUMN_CODE], name, err);
}

static bool add_spelling(bali_spellings *s, const char *code, size_t outcome, size_t line) {
    size_t codes = s->capacity, outcomes = s->capacity, lines = s->capacity;
    if (!bali_grow((void **)&s->codes, &codes, s->n + 1, sizeof *s->codes)) return false;
    if (!bali_grow((void **)&s->outcomes, &outcomes, s->n + 1, sizeof *s->outcomes)) return false;
    if (!bali_grow((void **)&s->lines, &lines, s->n + 1, sizeof *s->lines)) return false;
    s->capacity = lines;
    s->codes[s->n] = bali_duplicate(code, strlen(code));
    if (!s->codes[s->n]) return false;
    s->outcomes[s->n] = outcome;
    s->lines[s->n++] = line;
    return true;
}

/* The line at hand becomes a spelling. */
static bal_status take_line(reading *r, bal_error *err) {
    const bal_domain *domain = r->codebook->domain;
    const char *code = r->cells[COLUMN_CODE];
    size_t v = bali_domain_find(domain, r->cells[COLUMN_VARIABLE], strlen(r->cells[COLUMN_VARIABLE])), first;
    if (v == BAL_NONE) return unknown(r, COLUMN_VARIABLE, BAL_NONE, err);
    size_t k = bali_domain_find_outcome(domain, v, r->cells[COLUMN_OUTCOME], strlen(r->cells[COLUMN_OUTCOME]));
    if (k == BAL_NONE) return unknown(r, COLUMN_OUTCOME, v, err);
    size_t label = bali_domain_find_outcome(domain, v, code, strlen(code));
    if (label != BAL_NONE && label != k) return ambiguous(r, v, k, label, 0, err);
    bali_spellings *s = &r->codebook->spellings[v];
    first = bali_names_find(&r->seen[v], code, strlen(code));
    if (first != BALI_NO_NAME) return s->outcomes[first] == k ? BAL_OK : ambiguous(r, v, k, s->outcomes[first], s->lines[first], err);
    if (!add_spelling(s, code, k, r->lines[COLUMN_CODE])) return bali_out_of_memory(err);
    return bali_names_add(&r->seen[v], s->codes[s->n - 1], &first) ? BAL_OK : bali_out_of_memory(err);
}

static bal_status keep_cell(reading *r, size_t column, const bali_csv_cell *cell, bal_error *err) {
    for (size_t i = 0; i < N_NAMED; i++) {
        if (column != r->at[i]) continue;
        bali_csv_place(r->csv, &r->lines[i], &r->columns[i]);
        if (cell->length > LONGEST_CODE) {
            (void)bal_error_set(err, BAL_ERR_DATA, "long-name", "a %s of %zu bytes; at most %d are possible", column_names[i], cell->length,
                                LONGEST_CODE);
            return place(r, r->lines[i], r->columns[i], NULL, err);
        }
        bali_free(r->cells[i]);
        r->cells[i] = bali_duplicate(cell->text, cell->length);
        if (!r->cells[i]) return bali_out_of_memory(err);
    }
    return BAL_OK;
}

static bal_status ragged(const reading *r, size_t line, bool more, size_t n, bal_error *err) {
    (void)bal_error_set(err, BAL_ERR_SYNTAX, "ragged-record", "found %s%zu cell%s, expected %zu as in the header on line 1; quote a cell that holds "
                        "a delimiter", more ? "more than " : "", n, n == 1 ? "" : "s", r->n_columns);
    return place(r, line, 0, NULL, err);
}

/* Reads one line's cells; *ended says that there was none. Empty lines at the end are nothing. */
static bal_status read_line(reading *r, bool *ended, bal_error *err) {
    bali_csv_cell cell;
    size_t line = 0, blank = 0, column;
    bal_status status = bali_csv_next(r->csv, &cell, err);
    while (status == BAL_OK && cell.text && cell.length == 0 && cell.ends_record && !cell.quoted) {
        bali_csv_place(r->csv, &line, &column);
        if (blank == 0) blank = line;
        status = bali_csv_next(r->csv, &cell, err);
    }
    *ended = status == BAL_OK && !cell.text;
    if (status != BAL_OK || *ended) return status;
    if (blank > 0) {
        (void)bal_error_set(err, BAL_ERR_SYNTAX, "blank-line", "a blank line between records; remove it");
        return place(r, blank, 1, NULL, err);
    }
    bali_csv_place(r->csv, &line, &column);
    for (size_t c = 0;; c++) {
        if (c == r->n_columns) return ragged(r, line, true, c, err);
        status = keep_cell(r, c, &cell, err);
        if (status != BAL_OK) return status;
        if (cell.ends_record) return c + 1 == r->n_columns ? BAL_OK : ragged(r, line, false, c + 1, err);
        status = bali_csv_next(r->csv, &cell, err);
        if (status != BAL_OK) return status;
    }
}

static bal_status read_lines(reading *r, bal_error *err) {
    for (bool ended = false;;) {
        bal_status status = read_line(r, &ended, err);
        if (status != BAL_OK || ended) return status;
        if (r->n_lines++ == MOST_LINES) {
            (void)bal_error_set(err, BAL_ERR_DATA, "too-many-codes", "the codebook has more than %zu lines; is it the right file?", MOST_LINES);
            return place_here(r, err);
        }
        status = take_line(r, err);
        if (status != BAL_OK) return status;
    }
}

static bal_status keep_name(reading *r, bal_error *err) {
    const char *name = bali_csv_name(r->csv);
    r->codebook->file = bali_duplicate(name, strlen(name));
    return r->codebook->file ? BAL_OK : bali_out_of_memory(err);
}

static void end_reading(reading *r) {
    for (size_t v = 0; r->seen && v < bal_domain_variables(r->codebook->domain); v++) bali_names_free(&r->seen[v]);
    for (size_t c = 0; c < r->n_columns; c++) bali_free(r->headings[c]);
    for (size_t i = 0; i < N_NAMED; i++) bali_free(r->cells[i]);
    bali_free(r->seen);
    bali_free(r->headings);
    bali_csv_close(r->csv);
}

bal_status bal_codebook_read(const bal_domain *domain, const char *path, const bal_notices *notices, bal_codebook **out,
                             bal_file_facts *facts, bal_error *err) {
    *out = NULL;
    if (facts) *facts = (bal_file_facts){0};
    bal_codebook *codebook = bali_allocate(1, sizeof *codebook);
    if (!codebook) return bali_out_of_memory(err);
    codebook->domain = bali_domain_hold(domain);
    codebook->spellings = bali_allocate(bal_domain_variables(domain), sizeof *codebook->spellings);
    reading r = {.codebook = codebook, .notices = notices, .at = {BAL_NONE, BAL_NONE, BAL_NONE}};
    r.seen = bali_allocate(bal_domain_variables(domain), sizeof *r.seen);
    bal_status status = codebook->spellings && r.seen ? BAL_OK : bali_out_of_memory(err);
    if (status == BAL_OK) status = bali_csv_open(path, &(bali_csv_options){0}, &r.csv, err);
    if (status == BAL_OK) status = keep_name(&r, err);
    if (status == BAL_OK) status = read_header(&r, err);
    if (status == BAL_OK) status = read_lines(&r, err);
    if (status == BAL_OK && facts) bali_csv_facts(r.csv, facts);
    end_reading(&r);
    if (status == BAL_OK) *out = codebook;
    else bal_codebook_free(codebook);
    return status;
}

void bal_codebook_free(bal_codebook *codebook) {
    if (!codebook) return;
    for (size_t v = 0; codebook->spellings && v < bal_domain_variables(codebook->domain); v++) {
        bali_spellings *s = &codebook->spellings[v];
        for (size_t i = 0; i < s->n; i++) bali_free(s->codes[i]);
        bali_free(s->codes);
        bali_free(s->outcomes);
        bali_free(s->lines);
    }
    bali_free(codebook->spellings);
    bali_free(codebook->file);
    bal_domain_free(codebook->domain);
    bali_free(codebook);
}

const bal_domain *bali_codebook_domain(const bal_codebook *codebook) {
    return codebook->domain;
}

const char *bali_codebook_file(const bal_codebook *codebook) {
    return codebook->file;
}

const bali_spellings *bali_codebook_spellings(const bal_codebook *codebook, size_t variable) {
    return &codebook->spellings[variable];
}
