#include "report/words.h"

#include "base/numbers.h"

#include <math.h>
#include <string.h>

void bali_put_visible(bali_text *text, const char *string) {
    bali_text_put_visible(text, string, strlen(string));
}

void bali_put_records(bali_text *text, double records) {
    if (records == floor(records)) {
        bali_text_put_thousands(text, (uint64_t)records);
    } else {
        bali_text_printf(text, "%.1f", records);
    }
}

void bali_put_number_of(bali_text *text, size_t n, const char *what) {
    bali_text_printf(text, "%zu %s%s", n, what, n == 1 ? "" : "s");
}

void bali_put_shape(bali_text *text, const bal_network *network, size_t free_parameters) {
    size_t rows = 0;
    for (size_t v = 0; v < bal_network_variables(network); v++) rows += bal_network_rows(network, v);
    const struct {
        size_t n;
        const char *what;
    } parts[] = {{bal_network_variables(network), "variable"},
                 {bal_network_arcs(network), "arc"},
                 {rows, "row"},
                 {bal_network_cells(network), "cell"},
                 {free_parameters, "free parameter"}};
    for (size_t i = 0; i < sizeof parts / sizeof parts[0]; i++) {
        bali_text_puts(text, i ? ", " : "");
        bali_put_number_of(text, parts[i].n, parts[i].what);
    }
}

void bali_put_item(bali_text *text, const char *label, bali_text *words) {
    bali_text_printf(text, "%-*s", BALI_LABEL_WIDTH, label);
    bali_text_put_wrapped(text, bali_text_string(words), BALI_LABEL_WIDTH, BALI_LABEL_WIDTH);
    text->failed |= words->failed;
    bali_text_clear(words);
}

void bali_put_data_source(bali_text *words, const bali_data_facts *data) {
    if (data->n_data == 0) {
        bali_text_puts(words, "the network's own counts");
        return;
    }
    bali_put_visible(words, data->inputs[data->first_data].name);
    if (data->n_data > 1) bali_text_printf(words, " and %zu more table%s", data->n_data - 1, data->n_data > 2 ? "s" : "");
}

void bali_put_row_list(bali_text *text, const bal_cells *counts, bal_basis basis, size_t most, const char *title) {
    enum { NAME_WIDTH = 59 };
    bali_row rows[8];
    size_t total = bali_list_rows(counts, basis, rows, most);
    if (total == 0) return;
    bali_text_printf(text, "  %s\n", title);
    for (size_t i = 0; i < total && i < most; i++) {
        bali_text_puts(text, "    ");
        bali_put_row_name(text, bal_cells_network(counts), rows[i].variable, rows[i].row, NAME_WIDTH);
        if (basis == BAL_BASIS_FEW) bali_text_printf(text, " (%.4g record%s)", rows[i].records, rows[i].records == 1 ? "" : "s");
        bali_text_putc(text, '\n');
    }
    if (total > most) bali_text_printf(text, "    and %zu more\n", total - most);
}
