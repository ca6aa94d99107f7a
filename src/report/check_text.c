/* `ballast check` as one page of 80 columns. */
#include "base/numbers.h"
#include "report/facts.h"

#include <math.h>
#include <string.h>

enum { ROWS_SHOWN = 5, FAMILIES_SHOWN = 3, PAGE_WIDTH = 79 };

static void put_visible(bali_text *text, const char *string) {
    bali_text_put_visible(text, string, strlen(string));
}

static void put_network(bali_text *text, const bali_check_facts *facts) {
    const bal_network *network = bal_document_network(facts->document);
    size_t rows = 0;
    for (size_t v = 0; v < bal_network_variables(network); v++) rows += bal_network_rows(network, v);
    bali_text_puts(text, "network   ");
    put_visible(text, facts->data->inputs[0].name);
    bali_text_printf(text, ": %zu variables, %zu arcs, %zu rows, %zu cells,\n          %zu free parameters; ",
                     bal_network_variables(network), bal_network_arcs(network), rows, bal_network_cells(network),
                     bal_network_free_parameters(network));
    bali_text_puts(text, bal_document_cells(facts->document, BAL_CARRIED_TABLES) ? "tables" : "no tables (a structure alone)");
    if (bal_document_cells(facts->document, BAL_CARRIED_COUNTS)) bali_text_puts(text, ", counts");
    if (bal_document_cells(facts->document, BAL_CARRIED_PSEUDO_COUNTS)) bali_text_puts(text, ", pseudo-counts");
    bali_text_putc(text, '\n');
}

static void put_data(bali_text *text, const bali_check_facts *facts) {
    const bali_data_facts *data = facts->data;
    const bal_domain *domain = bal_network_domain(bal_document_network(facts->document));
    bali_text_puts(text, "data      ");
    put_visible(text, data->inputs[data->n_inputs > 1].name);
    bali_text_puts(text, ": ");
    bali_text_put_thousands(text, (uint64_t)data->records);
    bali_text_puts(text, data->summary.dropped ? " complete records; " : " records, every one complete");
    if (data->summary.dropped) {
        bali_text_put_thousands(text, data->summary.dropped);
        bali_text_puts(text, " with a missing cell");
    }
    size_t parameters = bal_network_free_parameters(bal_document_network(facts->document));
    if (parameters) bali_text_printf(text, "; %.2g a free parameter", data->records / (double)parameters);
    bali_text_putc(text, '\n');
    for (size_t v = 0; data->summary.missing && v < bal_domain_variables(domain); v++) {
        if (data->summary.missing[v] == 0) continue;
        bali_text_puts(text, "          missing in ");
        put_visible(text, bal_domain_name(domain, v));
        bali_text_puts(text, ": ");
        bali_text_put_thousands(text, data->summary.missing[v]);
        bali_text_putc(text, '\n');
    }
}

/* The families whose rows new cases are most likely to find empty, the worst first. */
static void put_worst_families(bali_text *text, const bali_check_facts *facts) {
    const bal_domain *domain = bal_network_domain(bal_document_network(facts->document));
    size_t shown[FAMILIES_SHOWN], n_shown = 0;
    for (; n_shown < FAMILIES_SHOWN; n_shown++) {
        size_t worst = BAL_NONE;
        for (size_t v = 0; v < bal_domain_variables(domain); v++) {
            bool taken = false;
            for (size_t i = 0; i < n_shown; i++) taken |= shown[i] == v;
            if (taken || !(facts->row_shares[v] > 0)) continue;
            if (worst == BAL_NONE || facts->row_shares[v] > facts->row_shares[worst]) worst = v;
        }
        if (worst == BAL_NONE) break;
        shown[n_shown] = worst;
        bali_text_puts(text, n_shown ? ", " : "  most of them for ");
        put_visible(text, bal_domain_name(domain, worst));
        bali_text_printf(text, " (%.1f of 100)", 100 * facts->row_shares[worst]);
    }
    if (n_shown) bali_text_putc(text, '\n');
}

static void put_support(bali_text *text, const bali_check_facts *facts) {
    const bal_support *support = facts->support;
    bali_text_puts(text, "\nIs this table enough?\n");
    if (isnan(support->row_share)) {
        bali_text_puts(text, facts->data->from_table ? "  there are no records yet: every row rests on the prior\n"
                                                     : "  that takes the records themselves; counts alone tell it for each family in --json\n");
        return;
    }
    bali_text words = {0};
    bali_text_printf(&words, "of 100 new cases, about %.0f will meet a row that no record supports, and about %.0f a cell (the share of records "
                             "alone in a row, or cell, they need)",
                     100 * support->row_share, 100 * support->cell_share);
    bali_text_puts(text, "  ");
    bali_text_put_wrapped(text, bali_text_string(&words), 2, 2);
    text->failed |= words.failed;
    bali_text_free(&words);
    put_worst_families(text, facts);
}

static void put_row_list(bali_text *text, const bali_check_facts *facts, bal_basis basis, size_t total, const char *title) {
    bali_row rows[ROWS_SHOWN];
    if (total == 0) return;
    (void)bali_list_rows(facts->counts, basis, rows, ROWS_SHOWN);
    bali_text_printf(text, "  %s\n", title);
    for (size_t i = 0; i < total && i < ROWS_SHOWN; i++) {
        bali_text_puts(text, "    ");
        bali_put_row_name(text, bal_cells_network(facts->counts), rows[i].variable, rows[i].row, PAGE_WIDTH - 20);
        if (basis == BAL_BASIS_FEW) bali_text_printf(text, " (%g record%s)", rows[i].records, rows[i].records == 1 ? "" : "s");
        bali_text_putc(text, '\n');
    }
    if (total > ROWS_SHOWN) bali_text_printf(text, "    and %zu more, all in --json\n", total - ROWS_SHOWN);
}

void bali_check_text(const bali_check_facts *facts, bali_text *text) {
    put_network(text, facts);
    if (!facts->counts) {
        bali_text_puts(text, "\nThe network is sound. next      ballast check ");
        put_visible(text, facts->data->inputs[0].name);
        bali_text_puts(text, " TABLE.csv\n");
        return;
    }
    put_data(text, facts);
    put_support(text, facts);
    bali_row_counts rows = bali_count_rows(facts->counts);
    bali_text_printf(text, "\nOf %zu rows, %zu rest on 5 records or more, %zu on 1 to 4, %zu on none.\n", rows.rows, rows.data, rows.few, rows.prior);
    put_row_list(text, facts, BAL_BASIS_PRIOR, rows.prior, "no record (a fit will give prior belief there):");
    put_row_list(text, facts, BAL_BASIS_FEW, rows.few, "few records:");
}
