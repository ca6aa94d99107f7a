#include "formats/table_columns.h"

#include "base/memory.h"
#include "formats/codebook.h"
#include "formats/phrase.h"
#include "model/block.h"
#include "model/domain.h"

enum { MOST_BLOCK_BYTES = 64 << 20, FEWEST_RECORDS = 16 };

static bool copy_spellings(bali_table_columns *columns, const bal_table_options *options) {
    columns->spellings = bali_allocate(options->n_missing_labels + 1, sizeof *columns->spellings);
    if (!columns->spellings) return false;
    for (size_t i = 0; i <= options->n_missing_labels; i++) {
        const char *text = i == 0 ? "NA" : options->missing_labels[i - 1];
        char *copy = bali_duplicate(text, strlen(text));
        if (!copy) return false;
        columns->spellings[columns->n_spellings++] = copy;
    }
    return bali_label_codes_build(&columns->missing, (const char *const *)columns->spellings, columns->n_spellings);
}

/* Numbers are no codes where a number is a number. */
static bal_status check_codes(const bal_domain *domain, size_t variable, const bal_codebook *codebook, bal_error *err) {
    const bali_spellings *spellings = bali_codebook_spellings(codebook, variable);
    double number;
    for (size_t i = 0; i < spellings->n; i++) {
        const char *code = spellings->codes[i], *name = bal_domain_name(domain, variable);
        if (!bali_number_read(code, strlen(code), &number)) continue;
        bali_phrase phrase = {0};
        bali_phrase_add(&phrase, "the number ");
        bali_phrase_quote(&phrase, code, strlen(code));
        bali_phrase_add(&phrase, " cannot be a code of ");
        bali_phrase_text(&phrase, name, strlen(name));
        bali_phrase_add(&phrase, ", whose column holds numbers by ballast.cuts; remove this line, or the cuts");
        (void)bal_error_set(err, BAL_ERR_DATA, "ambiguous-code", "%s", phrase.text);
        bal_error_place(err, bali_codebook_file(codebook), spellings->lines[i], 0);
        bal_error_context(err, 0, name);
        return err ? err->status : BAL_ERR_DATA;
    }
    return BAL_OK;
}

/* The labels that a column's cells may have, in the order of their codes. */
static bool build_labels(bali_table_column *column, const bal_domain *domain, const bali_spellings *spellings) {
    size_t outcomes = bal_domain_outcomes(domain, column->variable), more = spellings ? spellings->n : 0;
    column->n_outcomes = column->cuts ? 0 : outcomes;
    column->outcomes = spellings ? spellings->outcomes : NULL;
    column->texts = bali_allocate(column->n_outcomes + more, sizeof *column->texts);
    if (!column->texts) return false;
    for (size_t k = 0; k < column->n_outcomes; k++) column->texts[k] = bal_domain_outcome(domain, column->variable, k);
    for (size_t i = 0; i < more; i++) {
        column->texts[column->n_outcomes + i] = spellings->codes[i];
        if (spellings->codes[i][0] == '\0') column->empty = spellings->outcomes[i];
    }
    return bali_label_codes_build(&column->labels, column->texts, column->n_outcomes + more);
}

/* Whether a text with a NUL behind is one of the column's labels; the slow way, since such a text cannot be read in words. */
static bool is_label(const bali_table_column *column, size_t n_labels, const char *text) {
    size_t k = 0;
    while (k < n_labels && strcmp(column->texts[k], text) != 0) k++;
    return k < n_labels;
}

static bal_status create_column(bali_table_columns *columns, const bal_domain *domain, const char *heading, const bali_column_rules *rules,
                                const bal_codebook *codebook, bali_table_column *column, bal_error *err) {
    size_t variable = column->variable;
    const bali_spellings *spellings = codebook ? bali_codebook_spellings(codebook, variable) : NULL;
    column->name = bal_domain_name(domain, variable);
    column->heading = heading;
    column->heading_length = strlen(heading);
    column->empty = BALI_MISSING;
    column->cuts = rules->cuts ? rules->cuts[variable] : NULL;
    column->n_cuts = bal_domain_outcomes(domain, variable) - 1;
    bal_status status = column->cuts && codebook ? check_codes(domain, variable, codebook, err) : BAL_OK;
    if (status != BAL_OK) return status;
    column->codes = bali_allocate(columns->capacity, columns->width);
    columns->by_variable[variable] = column->codes;
    if (!column->codes || !build_labels(column, domain, spellings)) return bali_out_of_memory(err);
    size_t n_labels = column->n_outcomes + (spellings ? spellings->n : 0);
    column->heading_unknown = !is_label(column, n_labels, heading);
    for (size_t i = 0; i < columns->n_spellings; i++) {
        const char *spelling = columns->spellings[i];
        if (is_label(column, n_labels, spelling)) column->contested = true;
        if (strcmp(heading, spelling) == 0) column->heading_unknown = false;
    }
    return BAL_OK;
}

static bool is_wanted(const bal_table_options *options, size_t variable) {
    return variable != BAL_NONE && (!options->wanted || options->wanted[variable]);
}

static bool make_room(bali_table_columns *columns, const bal_domain *domain, size_t n_columns, size_t n_wanted) {
    columns->width = bali_code_width(domain);
    columns->capacity = BALI_BLOCK_RECORDS;
    while (columns->capacity > FEWEST_RECORDS && n_wanted * columns->width > MOST_BLOCK_BYTES / columns->capacity)
        columns->capacity /= 2;
    columns->columns = bali_allocate(n_wanted, sizeof *columns->columns);
    columns->by_place = bali_allocate(n_columns, sizeof *columns->by_place);
    columns->by_variable = bali_allocate(bal_domain_variables(domain), sizeof *columns->by_variable);
    return columns->columns && columns->by_place && columns->by_variable;
}

bal_status bali_table_columns_create(bali_table_columns *columns, const bal_domain *domain, const bali_table_header *header,
                                     const bali_column_rules *rules, const bal_table_options *options, bal_error *err) {
    size_t n_wanted = 0;
    if (options->codebook && !bali_domain_equal(domain, bali_codebook_domain(options->codebook)))
        return bal_error_set(err, BAL_ERR_ARGUMENT, "other-network",
                             "the codebook follows other variables than the table; read it for the same variables");
    for (size_t c = 0; c < header->n_columns; c++) n_wanted += is_wanted(options, header->variables[c]);
    if (!make_room(columns, domain, header->n_columns, n_wanted) || !copy_spellings(columns, options)) return bali_out_of_memory(err);
    bal_status status = BAL_OK;
    for (size_t c = 0; c < header->n_columns && status == BAL_OK; c++) {
        if (!is_wanted(options, header->variables[c])) continue;
        bali_table_column *column = columns->by_place[c] = &columns->columns[columns->n_columns++];
        column->variable = header->variables[c];
        status = create_column(columns, domain, header->names[c], rules, options->codebook, column, err);
    }
    return status;
}

void bali_table_columns_free(bali_table_columns *columns) {
    for (size_t i = 0; i < columns->n_spellings; i++) bali_free(columns->spellings[i]);
    for (size_t i = 0; i < columns->n_columns; i++) {
        bali_label_codes_free(&columns->columns[i].labels);
        bali_free(columns->columns[i].texts);
        bali_free(columns->columns[i].codes);
    }
    bali_label_codes_free(&columns->missing);
    bali_free(columns->spellings);
    bali_free(columns->columns);
    bali_free(columns->by_place);
    bali_free(columns->by_variable);
    *columns = (bali_table_columns){0};
}
