/* `ballast check` as one page of 80 columns. */
#include "base/numbers.h"
#include "report/facts.h"
#include "report/words.h"

#include <math.h>

enum { ROWS_SHOWN = 5, FAMILIES_SHOWN = 3 };

static void put_network(bali_text *text, const bali_check_facts *facts, bali_text *words) {
    const bal_network *network = bal_document_network(facts->document);
    bali_put_visible(words, facts->data->inputs[0].name);
    bali_text_puts(words, ": ");
    bali_put_shape(words, network, bal_network_free_parameters(network));
    bali_text_puts(words, "; ");
    bali_text_puts(words, bal_document_cells(facts->document, BAL_CARRIED_TABLES) ? "tables" : "no tables (a structure alone)");
    if (bal_document_cells(facts->document, BAL_CARRIED_COUNTS)) bali_text_puts(words, ", counts");
    if (bal_document_cells(facts->document, BAL_CARRIED_PSEUDO_COUNTS)) bali_text_puts(words, ", pseudo-counts");
    bali_put_item(text, "network", words);
}

/* "complete", "12 more with a missing cell", "12 of them with a missing cell". */
static void put_completeness(bali_text *words, const bal_source_summary *summary) {
    if (summary->dropped == 0 && summary->incomplete == 0) {
        bali_text_puts(words, summary->records > 0 ? ", every one complete" : "");
        return;
    }
    bali_text_puts(words, "; ");
    bali_text_put_thousands(words, summary->dropped ? summary->dropped : summary->incomplete);
    bali_text_puts(words, summary->dropped ? " more with a missing cell" : " of them with a missing cell");
}

static void put_data(bali_text *text, const bali_check_facts *facts, bali_text *words) {
    const bali_data_facts *data = facts->data;
    const bal_domain *domain = bal_network_domain(bal_document_network(facts->document));
    bali_put_data_source(words, data);
    bali_text_puts(words, ": ");
    bali_put_records(words, data->records);
    bali_text_puts(words, data->records == 1 ? " record" : " records");
    if (data->fractional) bali_text_printf(words, " of weight %.6g", data->weight);
    if (data->from_table) put_completeness(words, &data->summary);
    size_t parameters = bal_network_free_parameters(bal_document_network(facts->document));
    if (parameters) bali_text_printf(words, "; %.2g records a free parameter", data->records / (double)parameters);
    for (size_t v = 0; data->summary.missing && v < bal_domain_variables(domain); v++) {
        if (data->summary.missing[v] == 0) continue;
        bali_text_puts(words, "\nmissing in ");
        bali_put_visible(words, bal_domain_name(domain, v));
        bali_text_puts(words, ": ");
        bali_text_put_thousands(words, data->summary.missing[v]);
    }
    bali_put_item(text, "data", words);
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
        bali_put_visible(text, bal_domain_name(domain, worst));
        bali_text_printf(text, " (%.1f of 100)", 100 * facts->row_shares[worst]);
    }
    if (n_shown) bali_text_putc(text, '\n');
}

static void put_support(bali_text *text, const bali_check_facts *facts, bali_text *words) {
    const bal_support *support = facts->support;
    bali_text_puts(text, "\nIs this table enough?\n  ");
    if (!isnan(support->row_share)) {
        bali_text_printf(words, "of 100 new cases, about %.0f will need a row that no record supports, and about %.0f a cell that none does (so many "
                                "of these records are alone in theirs)",
                         100 * support->row_share, 100 * support->cell_share);
    } else if (!facts->data->from_table) {
        bali_text_puts(words, "that takes the records themselves; --json tells what the counts say for each family");
    } else if (facts->data->fractional) {
        bali_text_puts(words, "that takes whole weights; --json tells what the counts say for each family");
    } else {
        bali_text_puts(words, "there are no records yet: every row rests on the prior");
    }
    bali_text_put_wrapped(text, bali_text_string(words), 2, 2);
    text->failed |= words->failed;
    bali_text_clear(words);
    if (!isnan(support->row_share)) put_worst_families(text, facts);
}

static void put_next(bali_text *text, const bali_check_facts *facts, bali_text *words) {
    if (facts->counts) {
        bali_text_puts(words, "ballast fit, with the same files and options");
    } else {
        bali_text_puts(words, "ballast check ");
        bali_put_visible(words, facts->data->inputs[0].name);
        bali_text_puts(words, " TABLE.csv says whether a table is enough");
    }
    bali_text_putc(text, '\n');
    bali_put_item(text, "next", words);
}

void bali_check_text(const bali_check_facts *facts, bali_text *text) {
    bali_text words = {0};
    put_network(text, facts, &words);
    if (facts->counts) {
        put_data(text, facts, &words);
        put_support(text, facts, &words);
        bali_row_counts rows = bali_count_rows(facts->counts);
        bali_text_printf(text, "\nOf %zu rows, %zu rest on 5 records or more, %zu on 1 to 4, %zu on none.\n", rows.rows, rows.data, rows.few,
                         rows.prior);
        bali_put_row_list(text, facts->counts, BAL_BASIS_PRIOR, ROWS_SHOWN, "no record (a fit will give prior belief there):");
        bali_put_row_list(text, facts->counts, BAL_BASIS_FEW, ROWS_SHOWN, "few records:");
    } else {
        bali_text_puts(text, "\nThe network is sound.\n");
    }
    put_next(text, facts, &words);
    text->failed |= words.failed;
    bali_text_free(&words);
}
