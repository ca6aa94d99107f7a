/* Counts that are to be fitted to: are they exact, and do their families agree? */
#include "cli/inputs.h"

#include <math.h>

static double records_of(const bal_cells *counts, size_t v) {
    const bal_network *network = bal_cells_network(counts);
    size_t cells = bal_network_rows(network, v) * bal_network_outcomes(network, v);
    const double *n = bal_cells_family(counts, v);
    double records = 0;
    for (size_t c = 0; c < cells; c++) records += n[c];
    return records;
}

static void warn_of_families(const bali_inputs *inputs, const bal_domain *domain, size_t v, double records, size_t first, double first_records) {
    bal_error notice = {0};
    (void)bal_error_set(&notice, BAL_ERR_DATA, "families-differ",
                        "the counts of %s are of %.15g records and those of %s of %.15g, so sums over families mix different records; this is as "
                        "it should be only where cells were missing or a variable was not recorded",
                        bal_domain_name(domain, first), first_records, bal_domain_name(domain, v), records);
    notice.status = BAL_OK;
    inputs->notices.tell(inputs->notices.context, BAL_WARNING, &notice);
}

bal_status bali_check_counts(bali_inputs *inputs, const bal_cells *counts, bal_error *err) {
    const bal_network *network = bal_cells_network(counts);
    const bal_domain *domain = bal_network_domain(network);
    size_t first = BAL_NONE, other = BAL_NONE;
    double first_records = 0, other_records = 0;
    for (size_t v = 0; v < bal_network_variables(network); v++) {
        double records = records_of(counts, v);
        if (records >= 0x1p53) {
            bal_error_context(err, 0, bal_domain_name(domain, v));
            return bal_error_set(err, BAL_ERR_DATA, "count-too-large",
                                 "the counts of %s sum to 2^53 or more, where they are no longer exact; divide all counts by one number",
                                 bal_domain_name(domain, v));
        }
        if (bali_is_unrecorded(&inputs->facts, network, v)) continue;
        if (first == BAL_NONE) {
            first = v;
            first_records = records;
        } else if (other == BAL_NONE && fabs(records - first_records) > 1e-9 * fmax(records, first_records)) {
            other = v;
            other_records = records;
        }
    }
    inputs->facts.composite = inputs->facts.by_family || other != BAL_NONE;
    if (other != BAL_NONE && !inputs->facts.by_family) warn_of_families(inputs, domain, other, other_records, first, first_records);
    return BAL_OK;
}
