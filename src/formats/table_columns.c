#include "formats/table_columns.h"

#include "base/memory.h"
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

static bool create_column(bali_table_columns *columns, const bal_domain *domain, size_t variable,
                          bali_table_column *column) {
    column->variable = variable;
    column->name = bal_domain_name(domain, variable);
    column->name_length = strlen(column->name);
    column->name_unknown = bal_domain_find_outcome(domain, variable, column->name) == BAL_NONE;
    for (size_t i = 0; i < columns->n_spellings; i++) {
        const char *spelling = columns->spellings[i];
        if (bal_domain_find_outcome(domain, variable, spelling) != BAL_NONE) column->contested = true;
        if (strcmp(column->name, spelling) == 0) column->name_unknown = false;
    }
    column->codes = bali_allocate(columns->capacity, columns->width);
    columns->by_variable[variable] = column->codes;
    size_t n_outcomes = bal_domain_outcomes(domain, variable);
    return column->codes && bali_label_codes_build(&column->labels, bali_domain_labels(domain, variable), n_outcomes);
}

static bool is_wanted(const bal_table_options *options, size_t variable) {
    return variable != BAL_NONE && (!options->wanted || options->wanted[variable]);
}

bool bali_table_columns_create(bali_table_columns *columns, const bal_domain *domain, const bali_table_header *header,
                               const bal_table_options *options) {
    size_t n_wanted = 0;
    for (size_t c = 0; c < header->n_columns; c++) n_wanted += is_wanted(options, header->variables[c]);
    columns->width = bali_code_width(domain);
    columns->capacity = BALI_BLOCK_RECORDS;
    while (columns->capacity > FEWEST_RECORDS && n_wanted * columns->width > MOST_BLOCK_BYTES / columns->capacity)
        columns->capacity /= 2;
    columns->columns = bali_allocate(n_wanted, sizeof *columns->columns);
    columns->by_place = bali_allocate(header->n_columns, sizeof *columns->by_place);
    columns->by_variable = bali_allocate(bal_domain_variables(domain), sizeof *columns->by_variable);
    if (!columns->columns || !columns->by_place || !columns->by_variable) return false;
    if (!copy_spellings(columns, options)) return false;
    for (size_t c = 0; c < header->n_columns; c++) {
        if (!is_wanted(options, header->variables[c])) continue;
        columns->by_place[c] = &columns->columns[columns->n_columns++];
        if (!create_column(columns, domain, header->variables[c], columns->by_place[c])) return false;
    }
    return true;
}

void bali_table_columns_free(bali_table_columns *columns) {
    for (size_t i = 0; i < columns->n_spellings; i++) bali_free(columns->spellings[i]);
    for (size_t i = 0; i < columns->n_columns; i++) {
        bali_label_codes_free(&columns->columns[i].labels);
        bali_free(columns->columns[i].codes);
    }
    bali_label_codes_free(&columns->missing);
    bali_free(columns->spellings);
    bali_free(columns->columns);
    bali_free(columns->by_place);
    bali_free(columns->by_variable);
    *columns = (bali_table_columns){0};
}
