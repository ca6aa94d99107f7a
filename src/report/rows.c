/* Rows of a network, counted and named for people. */
#include "model/cells.h"
#include "model/shape.h"
#include "report/facts.h"

#include <math.h>
#include <string.h>

bool bali_is_unrecorded(const bali_data_facts *data, const bal_network *network, size_t variable) {
    size_t n_parents;
    const size_t *parents = bal_network_parents(network, variable, &n_parents);
    if (!data->unrecorded) return false;
    bool touched = data->unrecorded[variable];
    for (size_t p = 0; p < n_parents; p++) touched |= data->unrecorded[parents[p]];
    return touched;
}

double bali_scored_records(const bali_fit_facts *facts) {
    double records = facts->data->records + facts->data->earlier;
    return records > 0 ? records : NAN;
}

size_t bali_free_parameters(const bal_network *network, const bal_cells *pseudo_counts) {
    size_t free_parameters = 0;
    for (size_t v = 0; v < bal_network_variables(network) && pseudo_counts; v++) {
        size_t r = bal_network_outcomes(network, v), rows = bal_network_rows(network, v);
        const double *alpha = bal_cells_family(pseudo_counts, v);
        for (size_t row = 0; row < rows; row++, alpha += r) {
            size_t possible = 0;
            for (size_t k = 0; k < r; k++) possible += alpha[k] > 0;
            free_parameters += possible > 0 ? possible - 1 : 0;
        }
    }
    return pseudo_counts ? free_parameters : bal_network_free_parameters(network);
}

bali_row_counts bali_count_rows(const bal_cells *counts) {
    bali_row_counts c = {0};
    const bal_network *network = bal_cells_network(counts);
    for (size_t v = 0; v < bal_network_variables(network); v++) {
        size_t r = bal_network_outcomes(network, v), rows = bal_network_rows(network, v);
        const double *n = bal_cells_family(counts, v);
        for (size_t row = 0; row < rows; row++, n += r) {
            bal_basis basis = bal_row_basis(bali_row_sum(n, r));
            c.prior += basis == BAL_BASIS_PRIOR;
            c.few += basis == BAL_BASIS_FEW;
            c.data += basis == BAL_BASIS_DATA;
        }
        c.rows += rows;
    }
    return c;
}

size_t bali_list_rows(const bal_cells *counts, bal_basis basis, bali_row *list, size_t most) {
    size_t found = 0;
    const bal_network *network = bal_cells_network(counts);
    for (size_t v = 0; v < bal_network_variables(network); v++) {
        size_t r = bal_network_outcomes(network, v), rows = bal_network_rows(network, v);
        const double *n = bal_cells_family(counts, v);
        for (size_t row = 0; row < rows; row++, n += r) {
            double records = bali_row_sum(n, r);
            if (bal_row_basis(records) != basis) continue;
            if (found < most) list[found] = (bali_row){v, row, records};
            found++;
        }
    }
    return found;
}

size_t bali_list_thin_rows(const bal_fit *fit, bali_row *list, size_t most) {
    size_t found = 0;
    const bal_network *network = bal_cells_network(fit->counts);
    for (size_t v = 0; v < bal_network_variables(network); v++) {
        size_t r = bal_network_outcomes(network, v), rows = bal_network_rows(network, v);
        const double *n = bal_cells_family(fit->counts, v), *alpha = bal_cells_family(fit->pseudo_counts, v);
        for (size_t row = 0; row < rows; row++, n += r, alpha += r) {
            double records = bali_row_sum(n, r);
            if (records <= 0 || bali_row_sum(alpha, r) >= 1) continue;
            if (found < most) list[found] = (bali_row){v, row, records};
            found++;
        }
    }
    return found;
}

/* Bytes that the first n characters of a text take. */
static size_t bytes_of_characters(const char *bytes, size_t length, size_t n) {
    size_t at = 0;
    for (; n > 0 && at < length; n--) {
        uint32_t character;
        size_t size = bali_utf8_next(bytes + at, length - at, &character);
        at += size > 0 ? size : 1;
    }
    return at;
}

void bali_put_row_name(bali_text *text, const bal_network *network, size_t variable, size_t row, size_t width) {
    bali_text name = {0};
    const char *label = bal_domain_name(bal_network_domain(network), variable);
    size_t n_parents;
    (void)bal_network_parents(network, variable, &n_parents);
    bali_text_put_visible(&name, label, strlen(label));
    if (n_parents > 0) {
        bali_text_puts(&name, " | ");
        bali_put_configuration(&name, network, variable, row);
    }
    const char *bytes = bali_text_string(&name);
    size_t kept = bytes_of_characters(bytes, name.length, width);
    if (kept < name.length) kept = bytes_of_characters(bytes, name.length, width > 3 ? width - 3 : 0);
    bali_text_add(text, bytes, kept);
    if (kept < name.length) bali_text_puts(text, "...");
    text->failed |= name.failed;
    bali_text_free(&name);
}
