/* `ballast check` as JSON. */
#include "base/memory.h"
#include "model/cells.h"
#include "report/facts.h"

#include <math.h>

static void put_rows(bali_json *json, const char *key, const bal_cells *counts, bal_basis basis) {
    const bal_network *network = bal_cells_network(counts);
    bali_json_array(json, key);
    for (size_t v = 0; v < bal_network_variables(network); v++) {
        size_t r = bal_network_outcomes(network, v), rows = bal_network_rows(network, v);
        const double *n = bal_cells_family(counts, v);
        for (size_t row = 0; row < rows; row++) {
            double records = bali_row_sum(n + row * r, r);
            if (bal_row_basis(records) != basis) continue;
            bali_json_object(json, NULL);
            bali_json_string(json, "variable", bal_domain_name(bal_network_domain(network), v));
            bali_json_given(json, "given", network, v, row);
            bali_json_number(json, "total", records);
            bali_json_end_object(json);
        }
    }
    bali_json_end_array(json);
}

static void put_support(bali_json *json, const bali_check_facts *facts) {
    const bal_domain *domain = bal_network_domain(bal_document_network(facts->document));
    bali_json_object(json, "unsupported");
    bali_json_number(json, "row_share", facts->support->row_share);
    bali_json_number(json, "cell_share", facts->support->cell_share);
    bali_json_array(json, "families");
    for (size_t v = 0; v < bal_domain_variables(domain); v++) {
        bali_json_object(json, NULL);
        bali_json_string(json, "variable", bal_domain_name(domain, v));
        bali_json_number(json, "row_share", facts->row_shares[v]);
        bali_json_number(json, "cell_share", facts->cell_shares[v]);
        bali_json_end_object(json);
    }
    bali_json_end_array(json);
    bali_json_end_object(json);
}

void bali_check_json(const bali_check_facts *facts, bali_json *json) {
    size_t parameters = bal_network_free_parameters(bal_document_network(facts->document));
    bali_json_object(json, NULL);
    bali_json_head(json, "check", facts->document, NULL, facts->data, facts->counts != NULL);
    if (facts->counts) {
        put_support(json, facts);
        put_rows(json, "rows_without_records", facts->counts, BAL_BASIS_PRIOR);
        put_rows(json, "rows_with_few", facts->counts, BAL_BASIS_FEW);
        bali_json_number(json, "records_per_parameter", parameters ? facts->data->records / (double)parameters : NAN);
    } else {
        bali_json_null(json, "unsupported");
        bali_json_null(json, "rows_without_records");
        bali_json_null(json, "rows_with_few");
        bali_json_null(json, "records_per_parameter");
    }
    bali_json_end_object(json);
}
