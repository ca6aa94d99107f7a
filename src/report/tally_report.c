/* `ballast tally` as a few lines of text and as JSON. */
#include "report/facts.h"
#include "report/words.h"

#include "base/numbers.h"

void bali_tally_text(const bali_data_facts *data, const bal_cells *counts, bali_text *text) {
    bali_text words = {0};
    bali_row_counts rows = bali_count_rows(counts);
    bali_put_data_source(&words, data);
    bali_text_puts(&words, ": ");
    bali_put_records(&words, data->records);
    bali_text_puts(&words, " records");
    if (data->summary.dropped > 0) {
        bali_text_puts(&words, "; ");
        bali_text_put_thousands(&words, data->summary.dropped);
        bali_text_puts(&words, " more left out, since a cell was missing");
    }
    if (data->by_family) {
        bali_text_puts(&words, "; ");
        bali_text_put_thousands(&words, data->summary.incomplete);
        bali_text_puts(&words, " of them incomplete, counted in the families they are complete for");
    }
    bali_put_item(text, "counted", &words);
    bali_text_printf(&words, "of %zu rows, %zu have 5 records or more, %zu have 1 to 4, %zu have none", rows.rows, rows.data, rows.few, rows.prior);
    bali_put_item(text, "rows", &words);
    bali_text_free(&words);
}

static void put_family(bali_json *json, const bal_cells *counts, size_t v) {
    const bal_network *network = bal_cells_network(counts);
    const bal_domain *domain = bal_network_domain(network);
    size_t n_parents;
    const size_t *parents = bal_network_parents(network, v, &n_parents);
    bali_json_object(json, NULL);
    bali_json_string(json, "variable", bal_domain_name(domain, v));
    bali_json_array(json, "parents");
    for (size_t p = 0; p < n_parents; p++) bali_json_string(json, NULL, bal_domain_name(domain, parents[p]));
    bali_json_end_array(json);
    bali_json_numbers(json, "counts", bal_cells_family(counts, v), bal_network_rows(network, v) * bal_network_outcomes(network, v));
    bali_json_end_object(json);
}

void bali_tally_json(const bal_document *document, const bali_data_facts *data, const bal_cells *counts, bali_json *json) {
    bali_json_object(json, NULL);
    bali_json_head(json, "tally", document, NULL, data, true);
    bali_json_array(json, "families");
    for (size_t v = 0; v < bal_network_variables(bal_cells_network(counts)); v++) put_family(json, counts, v);
    bali_json_end_array(json);
    bali_json_end_object(json);
}
