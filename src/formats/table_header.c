#include "formats/table_header.h"

#include "base/memory.h"
#include "base/names.h"
#include "formats/csv_look.h"
#include "formats/phrase.h"
#include "formats/spelling.h"
#include "model/domain.h"

#include <string.h>

enum { MOST_LISTED = 10, MOST_ABSENT_LISTED = 3 };

/* What one reading of the header shares. */
typedef struct reading {
    bali_table_header *header;
    bali_csv *csv;
    const bal_domain *domain;
    const bali_column_rules *rules;
    const bal_table_options *options;
    bali_names seen;
    size_t bytes; /* of all names */
} reading;

static bool is_wanted(const bal_table_options *options, size_t variable) {
    return !options->wanted || options->wanted[variable];
}

/* The variable whose column has this name. */
static size_t bound_variable(const reading *r, const char *name, size_t length) {
    size_t variable = bali_column_rules_find(r->rules, name, length);
    return variable != BAL_NONE ? variable : bali_domain_find(r->domain, name, length);
}

/* Whether a column is asked for by its own name. */
static bool is_asked_for(const reading *r, const char *name) {
    const char *weight = r->options->weight, *group = r->options->fold_column;
    return (weight && strcmp(weight, name) == 0) || (group && strcmp(group, name) == 0);
}

static bal_status refuse_column(const reading *r, size_t variable, bal_error *err) {
    size_t line, column;
    bali_csv_place(r->csv, &line, &column);
    bal_error_place(err, bali_csv_name(r->csv), line, column);
    if (variable != BAL_NONE) bal_error_context(err, 0, bal_domain_name(r->domain, variable));
    return err ? err->status : BAL_ERR_DATA;
}

/* Whether the first line, split at a delimiter, names a variable; *variable is that one. */
static bool names_variable(const reading *r, const char *line, size_t length, char delimiter, size_t *variable) {
    const char *piece;
    size_t at = 0, piece_length, pieces = 0;
    *variable = BAL_NONE;
    while (bali_csv_split(line, length, delimiter, &at, &piece, &piece_length)) {
        if (*variable == BAL_NONE) *variable = bound_variable(r, piece, piece_length);
        pieces++;
    }
    return pieces > 1 && *variable != BAL_NONE;
}

/* A header that holds no delimiter but names a variable when split at another one was read with the wrong one. Looked at
 * before any cell is read, since quotes make no sense either then. */
static bal_status check_delimiter(const reading *r, bal_error *err) {
    static const char usual[] = ";,\t|";
    size_t length, variable, at = 0, piece_length;
    const char *piece, *line = bali_csv_first_line(r->csv, &length);
    char delimiter = bali_csv_delimiter(r->csv);
    bool whole = bali_csv_split(line, length, delimiter, &at, &piece, &piece_length) && at > length;
    if (!whole || bound_variable(r, piece, piece_length) != BAL_NONE) return BAL_OK;
    for (const char *other = usual; *other; other++) {
        if (*other == delimiter || !names_variable(r, line, length, *other, &variable)) continue;
        bali_phrase phrase = {0};
        if (delimiter == '\t') bali_phrase_add(&phrase, "the header has no tab, but names ");
        else bali_phrase_add(&phrase, "the header has no \"%c\", but names ", delimiter);
        bali_phrase_text(&phrase, bal_domain_name(r->domain, variable), strlen(bal_domain_name(r->domain, variable)));
        if (*other == '\t') bali_phrase_add(&phrase, " when split at tabs; leave out --delimiter");
        else bali_phrase_add(&phrase, " when split at \"%c\"; give --delimiter '%c'", *other, *other);
        bal_status status = bal_error_set(err, BAL_ERR_DATA, "wrong-delimiter", "%s", phrase.text);
        bal_error_place(err, bali_csv_name(r->csv), 1, 1);
        return status;
    }
    return BAL_OK;
}

static bal_status no_header(const reading *r, const char *what, bal_error *err) {
    bal_status status = bal_error_set(err, BAL_ERR_SYNTAX, "no-header", "%s; the first line names the columns", what);
    bal_error_place(err, bali_csv_name(r->csv), 1, 1);
    return status;
}

static bal_status empty_column(const reading *r, const bali_csv_cell *cell, bal_error *err) {
    size_t number = r->header->n_columns + 1;
    if (number == 1 && cell->ends_record) return no_header(r, "the first line is blank", err);
    (void)bal_error_set(err, BAL_ERR_DATA, "empty-column",
                        "column %zu of the header has no name; name it, or remove it%s", number,
                        cell->ends_record ? " (a delimiter at the end of every line makes an empty column)" : "");
    return refuse_column(r, BAL_NONE, err);
}

static bal_status duplicate_column(const reading *r, size_t first, const char *name, size_t variable, bal_error *err) {
    bali_phrase phrase = {0};
    bali_phrase_quote(&phrase, name, strlen(name));
    (void)bal_error_set(err, BAL_ERR_DATA, "duplicate-column",
                        "columns %zu and %zu are both named %s; rename or remove one", first + 1, r->header->n_columns,
                        phrase.text);
    return refuse_column(r, variable, err);
}

static bal_status unexpected_column(const reading *r, const char *name, bal_error *err) {
    bali_phrase phrase = {0};
    bali_phrase_quote(&phrase, name, strlen(name));
    (void)bal_error_set(err, BAL_ERR_DATA, "unexpected-column",
                        "column %zu, %s, is not a variable; remove it, or leave out --strict", r->header->n_columns,
                        phrase.text);
    return refuse_column(r, BAL_NONE, err);
}

static bal_status too_many_columns(const reading *r, bal_error *err) {
    (void)bal_error_set(err, BAL_ERR_DATA, "too-many-columns",
                        "the header has more than %zu columns or %zu MiB; is the delimiter right, and are there line ends?",
                        BALI_MOST_COLUMNS, BALI_MOST_HEADER_BYTES >> 20);
    return refuse_column(r, BAL_NONE, err);
}

/* Adds a name; variables has the same capacity as names. */
static bool add_name(bali_table_header *header, const bali_csv_cell *cell, size_t variable) {
    size_t names = header->capacity, variables = header->capacity, n = header->n_columns + 1;
    if (!bali_grow((void **)&header->names, &names, n, sizeof *header->names)) return false;
    if (!bali_grow((void **)&header->variables, &variables, n, sizeof *header->variables)) return false;
    header->capacity = variables;
    char *copy = bali_duplicate(cell->text, cell->length);
    if (!copy) return false;
    header->variables[header->n_columns] = variable;
    header->names[header->n_columns++] = copy;
    return true;
}

static bal_status read_name(reading *r, const bali_csv_cell *cell, bal_error *err) {
    bali_table_header *header = r->header;
    if (cell->length == 0) return empty_column(r, cell, err);
    r->bytes += cell->length;
    if (header->n_columns == BALI_MOST_COLUMNS || r->bytes > BALI_MOST_HEADER_BYTES) return too_many_columns(r, err);
    size_t variable = bound_variable(r, cell->text, cell->length), first;
    if (!add_name(header, cell, variable)) return bali_out_of_memory(err);
    const char *name = header->names[header->n_columns - 1];
    if (!bali_names_add(&r->seen, name, &first)) return bali_out_of_memory(err);
    if (first != BALI_NO_NAME) return duplicate_column(r, first, name, variable, err);
    if (variable == BAL_NONE && r->options->strict && !is_asked_for(r, name)) return unexpected_column(r, name, err);
    return BAL_OK;
}

static bal_status read_names(reading *r, bal_error *err) {
    bali_csv_cell cell;
    do {
        bal_status status = bali_csv_next(r->csv, &cell, err);
        if (status != BAL_OK) return status;
        if (!cell.text) return no_header(r, "the file is empty", err);
        size_t column;
        if (r->header->n_columns == 0) bali_csv_place(r->csv, &r->header->line, &column);
        status = read_name(r, &cell, err);
        if (status != BAL_OK) return status;
    } while (!cell.ends_record);
    return BAL_OK;
}

/* Where a variable has both a column of its own name and the one its ballast.column names, the first is of no use. */
static bal_status unbind_own_names(reading *r, bal_error *err) {
    bali_table_header *header = r->header;
    for (size_t v = 0; v < r->rules->n_variables; v++) {
        const char *name = bal_domain_name(r->domain, v), *column = r->rules->columns[v];
        if (!column || strcmp(column, name) == 0 || bali_names_find(&r->seen, column, strlen(column)) == BALI_NO_NAME) continue;
        size_t own = bali_names_find(&r->seen, name, strlen(name));
        if (own == BALI_NO_NAME || header->variables[own] != v) continue;
        header->variables[own] = BAL_NONE;
        if (!r->options->strict || is_asked_for(r, name)) continue;
        bali_phrase phrase = {0};
        bali_phrase_quote(&phrase, name, strlen(name));
        (void)bal_error_set(err, BAL_ERR_DATA, "unexpected-column",
                            "column %zu, %s, is not used: ballast.column takes the variable from another one; remove it, or leave out "
                            "--strict",
                            own + 1, phrase.text);
        bal_error_place(err, bali_csv_name(r->csv), header->line, 0);
        return err ? err->status : BAL_ERR_DATA;
    }
    return BAL_OK;
}

static bal_status gather_ignored(reading *r, bal_error *err) {
    bali_table_header *header = r->header;
    header->ignored = bali_allocate(header->n_columns, sizeof *header->ignored);
    if (!header->ignored) return bali_out_of_memory(err);
    for (size_t c = 0; c < header->n_columns; c++)
        if (header->variables[c] == BAL_NONE && !is_asked_for(r, header->names[c])) header->ignored[header->n_ignored++] = header->names[c];
    return BAL_OK;
}

/* Finds a column that was asked for by its name. */
static bal_status find_asked_for(const reading *r, const char *name, const char *what, size_t *place, bal_error *err) {
    *place = BAL_NONE;
    if (!name) return BAL_OK;
    *place = bali_names_find(&r->seen, name, strlen(name));
    if (*place != BALI_NO_NAME) return BAL_OK;
    const bali_table_header *header = r->header;
    bali_difference how;
    bali_phrase phrase = {0};
    size_t near = bali_spelling_nearest(name, strlen(name), (const char *const *)header->names, header->n_columns, &how);
    bali_phrase_add(&phrase, "no column is named ");
    bali_phrase_quote(&phrase, name, strlen(name));
    bali_phrase_add(&phrase, ", which is to hold %s; ", what);
    if (near == BALI_NO_NAME) {
        bali_phrase_add(&phrase, "add it, or give the name of another column");
    } else {
        bali_phrase_add(&phrase, "did you mean ");
        bali_phrase_quote(&phrase, header->names[near], strlen(header->names[near]));
        bali_phrase_add(&phrase, "?");
    }
    (void)bal_error_set(err, BAL_ERR_DATA, "missing-column", "%s", phrase.text);
    bal_error_place(err, bali_csv_name(r->csv), header->line, 0);
    return err ? err->status : BAL_ERR_DATA;
}

/* Which wanted variables have no column. */
typedef struct absent {
    size_t wanted, missing;
    size_t first;               /* the first missing one that some column resembles, else the first */
    size_t nearest;             /* that column among the ignored, or BAL_NONE */
    bali_difference difference; /* of that column's name */
} absent;

static bal_status find_absent(const reading *r, absent *found, bool **is_missing, bal_error *err) {
    const bali_table_header *header = r->header;
    size_t n = bal_domain_variables(r->domain);
    *found = (absent){.first = BAL_NONE, .nearest = BAL_NONE};
    *is_missing = bali_allocate(n, sizeof **is_missing);
    if (!*is_missing) return bali_out_of_memory(err);
    for (size_t v = 0; v < n; v++) (*is_missing)[v] = is_wanted(r->options, v);
    for (size_t v = 0; v < n; v++) found->wanted += (*is_missing)[v];
    for (size_t c = 0; c < header->n_columns; c++)
        if (header->variables[c] != BAL_NONE) (*is_missing)[header->variables[c]] = false;
    for (size_t v = 0; v < n; v++) {
        if (!(*is_missing)[v]) continue;
        found->missing++;
        /* A network of thousands of variables against a table of thousands of columns is not worth every comparison. */
        bool worth = found->nearest == BAL_NONE && found->missing <= MOST_LISTED;
        const char *column = bali_column_rules_column(r->rules, v), *name = column ? column : bal_domain_name(r->domain, v);
        bali_difference how = BALI_DIFFERENT;
        size_t near = BALI_NO_NAME;
        if (worth) near = bali_spelling_nearest(name, strlen(name), header->ignored, header->n_ignored, &how);
        if (found->first == BAL_NONE || near != BALI_NO_NAME) found->first = v;
        if (near == BALI_NO_NAME) continue;
        found->nearest = near;
        found->difference = how;
    }
    return BAL_OK;
}

static size_t column_number(const bali_table_header *header, const char *name) {
    size_t c = 0;
    while (header->names[c] != name) c++;
    return c + 1;
}

static void say_nearest(const reading *r, const absent *found, bali_phrase *phrase) {
    const char *name = r->header->ignored[found->nearest], *how = bali_difference_words(found->difference);
    bali_phrase_add(phrase, how ? "; column %zu, " : "; did you mean column %zu, ", column_number(r->header, name));
    bali_phrase_quote(phrase, name, strlen(name));
    if (how) bali_phrase_add(phrase, ", differs %s", how);
    else bali_phrase_add(phrase, "?");
}

static void say_others(const reading *r, const absent *found, const bool *is_missing, bali_phrase *phrase) {
    size_t listed = 0;
    bali_phrase_add(phrase, "; nor has ");
    for (size_t v = 0; v < bal_domain_variables(r->domain) && listed < MOST_ABSENT_LISTED; v++) {
        if (!is_missing[v] || v == found->first) continue;
        if (listed++ > 0) bali_phrase_add(phrase, ", ");
        bali_phrase_text(phrase, bal_domain_name(r->domain, v), strlen(bal_domain_name(r->domain, v)));
    }
    if (found->missing - 1 > listed) bali_phrase_add(phrase, " (%zu in all)", found->missing - 1);
}

static bal_status refuse_absent(const reading *r, const absent *found, const bool *is_missing, bal_error *err) {
    const char *name = bal_domain_name(r->domain, found->first), *code = "missing-column";
    bali_phrase phrase = {0};
    bool none_bound = found->missing == found->wanted && found->nearest == BAL_NONE;
    if (none_bound && r->header->names[0][0] == '#') {
        code = "comment-line";
        bali_phrase_add(&phrase, "the first line begins with \"#\" and names no variable; remove comment lines");
    } else if (none_bound) {
        bali_phrase_add(&phrase, "no column is named as a variable (such as ");
        bali_phrase_text(&phrase, name, strlen(name));
        bali_phrase_add(&phrase, "); is the first line a header, and the delimiter right?");
    } else {
        bali_phrase_text(&phrase, name, strlen(name));
        bali_phrase_add(&phrase, " has no column");
        const char *column = bali_column_rules_column(r->rules, found->first);
        if (column) bali_phrase_add(&phrase, " ");
        if (column) bali_phrase_quote(&phrase, column, strlen(column));
        if (found->missing > 1) say_others(r, found, is_missing, &phrase);
        if (found->nearest != BAL_NONE) say_nearest(r, found, &phrase);
        else bali_phrase_add(&phrase, "; add it, or rename the column that holds it");
    }
    bal_status status = bal_error_set(err, BAL_ERR_DATA, code, "%s", phrase.text);
    bal_error_place(err, bali_csv_name(r->csv), r->header->line, 0);
    if (!none_bound) bal_error_context(err, 0, name);
    return status;
}

/* Every wanted variable has a column; where some may be absent, at least one has. */
static bal_status check_absent(const reading *r, bal_error *err) {
    absent found;
    bool *is_missing = NULL;
    bal_status status = find_absent(r, &found, &is_missing, err);
    size_t least = r->options->allow_absent ? found.wanted > 0 : found.wanted;
    if (status == BAL_OK && found.wanted - found.missing < least) status = refuse_absent(r, &found, is_missing, err);
    bali_free(is_missing);
    return status;
}

static void tell_ignored(const reading *r) {
    const bali_table_header *header = r->header;
    const bal_notices *notices = r->options->notices;
    if (header->n_ignored == 0 || !notices || !notices->tell) return;
    bali_phrase phrase = {0};
    size_t listed = 0;
    for (; listed < header->n_ignored && listed < MOST_LISTED && phrase.length < sizeof phrase.text / 2; listed++) {
        if (listed > 0) bali_phrase_add(&phrase, ", ");
        bali_phrase_text(&phrase, header->ignored[listed], strlen(header->ignored[listed]));
    }
    if (header->n_ignored > listed) bali_phrase_add(&phrase, " and %zu more", header->n_ignored - listed);
    bal_error notice = {0};
    const char *words = header->n_ignored == 1 ? "column is not a variable and is" : "columns are not variables and are";
    (void)bal_error_set(&notice, BAL_ERR_DATA, "ignored-columns", "%zu %s ignored: %s", header->n_ignored, words, phrase.text);
    bal_error_place(&notice, bali_csv_name(r->csv), header->line, 0);
    notice.status = BAL_OK;
    notices->tell(notices->context, BAL_WARNING, &notice);
}

bal_status bali_table_header_read(bali_table_header *header, bali_csv *csv, const bal_domain *domain,
                                  const bali_column_rules *rules, const bal_table_options *options, bal_error *err) {
    reading r = {.header = header, .csv = csv, .domain = domain, .rules = rules, .options = options};
    bal_status status = check_delimiter(&r, err);
    if (status == BAL_OK) status = read_names(&r, err);
    if (status == BAL_OK) status = unbind_own_names(&r, err);
    if (status == BAL_OK) status = gather_ignored(&r, err);
    if (status == BAL_OK) status = check_absent(&r, err);
    if (status == BAL_OK) status = find_asked_for(&r, options->weight, "the weights", &header->weight, err);
    if (status == BAL_OK) status = find_asked_for(&r, options->fold_column, "the labels of folds", &header->group, err);
    if (status == BAL_OK) tell_ignored(&r);
    bali_names_free(&r.seen);
    return status;
}

void bali_table_header_free(bali_table_header *header) {
    for (size_t c = 0; c < header->n_columns; c++) bali_free(header->names[c]);
    bali_free(header->names);
    bali_free(header->variables);
    bali_free(header->ignored);
    *header = (bali_table_header){0};
}
