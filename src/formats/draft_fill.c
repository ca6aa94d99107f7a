/* From lists of numbers to cells: lengths, the order of a TABLE, and rows that have to sum to 1. */
#include "formats/draft.h"

#include "base/memory.h"
#include "base/text.h"
#include "model/document.h"
#include "model/shape.h"

#include <float.h>
#include <math.h>
#include <string.h>

/* How far a row's sum may be from 1: silently, and with a warning. The hair lets 0.98 and 0.999999 in, which are no
 * doubles. */
static const double hair = 1e-12, silent_tolerance = 1e-6, warned_tolerance = 0.02;

typedef struct filling {
    const bali_draft *draft;
    const bali_draft_definition *const *definition_of;
    bool for_slowest;
    bali_remarks *remarks;
    bal_document *document;
    const bal_network *network;
} filling;

const char *bali_draft_list_name(bali_draft_list which) {
    static const char *const names[] = {"TABLE", "ballast.counts", "ballast.pseudo-counts", "ballast.row-ess"};
    return names[which];
}

static const char *name_of(const filling *f, size_t variable) {
    return bal_domain_name(bal_network_domain(f->network), variable);
}

static const bali_number_list *list_of(const filling *f, size_t variable, bali_draft_list which) {
    const bali_draft_definition *definition = f->definition_of[variable];
    return definition && definition->lists[which].given ? &definition->lists[which] : NULL;
}

/* ---- lengths ---- */

static bal_status refuse_length(const filling *f, size_t variable, bali_draft_list which, bal_error *err) {
    const bali_number_list *list = list_of(f, variable, which);
    size_t n_parents, rows = bal_network_rows(f->network, variable),
                      outcomes = bal_network_outcomes(f->network, variable);
    const size_t *parents = bal_network_parents(f->network, variable, &n_parents);
    bali_text expected = {0};
    bali_text_printf(&expected, "%zu = %zu outcomes", rows * outcomes, outcomes);
    for (size_t p = 0; p < n_parents && p < 8; p++)
        bali_text_printf(&expected, " x %zu of %.40s", bal_network_outcomes(f->network, parents[p]),
                         name_of(f, parents[p]));
    if (n_parents > 8) bali_text_printf(&expected, " x ...");
    bal_status status = bali_draft_fail(f->draft, list->at, name_of(f, variable), "table-size", err,
                                        "%s of %.80s has %zu numbers; expected %s", bali_draft_list_name(which),
                                        name_of(f, variable), list->n, bali_text_string(&expected));
    bali_text_free(&expected);
    return status;
}

static bal_status check_length(const filling *f, size_t variable, bali_draft_list which, bal_error *err) {
    const bali_number_list *list = list_of(f, variable, which);
    size_t cells = bal_network_rows(f->network, variable) * bal_network_outcomes(f->network, variable);
    return list->n == cells ? BAL_OK : refuse_length(f, variable, which, err);
}

/* ---- rows that sum to 1 ---- */

/* The sum of n values that lie stride apart. */
static double sum_of(const double *values, size_t n, size_t stride) {
    double sum = 0;
    for (size_t i = 0; i < n; i++) sum += values[i * stride];
    return sum;
}

static bool is_near_one(double sum, double tolerance) {
    return fabs(sum - 1) <= tolerance + hair;
}

/* Rows as they come out of arithmetic: a sum of r numbers is off by up to about r units in the last place. Such rows
 * stay as they are, so that what was written reads back unchanged. */
static bool is_one(double sum, size_t outcomes) {
    return fabs(sum - 1) <= (double)(outcomes > 4 ? outcomes : 4) * DBL_EPSILON;
}

/* Whether every row sums to 1 when the list is read in an order: the outcomes slowest or not. */
static bool sums_to_one(const double *values, size_t rows, size_t outcomes, bool slowest) {
    for (size_t j = 0; j < rows; j++) {
        double sum = slowest ? sum_of(values + j, outcomes, rows) : sum_of(values + j * outcomes, outcomes, 1);
        if (!is_near_one(sum, silent_tolerance)) return false;
    }
    return true;
}

/* Words for a message when the other order is the only one that makes sense; "" when not. */
static const char *order_hint(const filling *f, const bali_number_list *list, size_t rows, size_t outcomes) {
    if (rows == 1 || outcomes == 1 || !sums_to_one(list->values, rows, outcomes, !f->for_slowest)) return "";
    return f->for_slowest
               ? "; every row sums to 1 with the outcomes of FOR fastest: leave out --table-order for-slowest"
               : "; every row sums to 1 with the outcomes of FOR slowest: use --table-order for-slowest";
}

/* "row Smoker=yes, Age=old of Lung", "the row of Lung". */
static void put_row(bali_text *text, const filling *f, size_t variable, size_t row) {
    char configuration[256];
    const char *shown = bali_configuration_text(f->network, variable, row, configuration, sizeof configuration);
    bali_text_printf(text, *shown ? "row %s of %.60s" : "the row%s of %.60s", shown, name_of(f, variable));
}

/* A row's sum is not 1 within the silent tolerance: warns, or refuses. */
static bal_status judge_sum(const filling *f, size_t variable, size_t row, double sum, bal_error *err) {
    size_t rows = bal_network_rows(f->network, variable), outcomes = bal_network_outcomes(f->network, variable);
    bool refused = !is_near_one(sum, warned_tolerance);
    if (!refused && !bali_remarks_wanted(f->remarks, "row-renormalised")) return BAL_OK;
    const bali_number_list *list = list_of(f, variable, BALI_LIST_TABLE);
    const char *hint = order_hint(f, list, rows, outcomes);
    size_t at = bali_number_at(f->draft->xml, list, f->for_slowest ? row : row * outcomes);
    bal_status status = BAL_OK;
    bali_text where = {0};
    put_row(&where, f, variable, row);
    if (where.failed) {
        status = bali_out_of_memory(err);
    } else if (refused) {
        status = bali_draft_fail(f->draft, at, name_of(f, variable), "row-sum", err, "%s sums to %.10g, not to 1%s",
                                 where.bytes, sum, *hint ? hint : "; correct its numbers");
    } else {
        bali_remark(f->remarks, at, "row-renormalised", name_of(f, variable),
                    "%s sums to %.10g and was divided by that%s", where.bytes, sum, hint);
    }
    bali_text_free(&where);
    return status;
}

static bal_status fill_table(const filling *f, size_t variable, double *cells, bal_error *err) {
    const bali_number_list *list = list_of(f, variable, BALI_LIST_TABLE);
    size_t rows = bal_network_rows(f->network, variable), outcomes = bal_network_outcomes(f->network, variable);
    bal_status status = check_length(f, variable, BALI_LIST_TABLE, err);
    for (size_t j = 0; j < rows && status == BAL_OK; j++) {
        double *row = cells + j * outcomes;
        for (size_t k = 0; k < outcomes; k++) row[k] = list->values[f->for_slowest ? k * rows + j : j * outcomes + k];
        double sum = sum_of(row, outcomes, 1);
        if (is_one(sum, outcomes)) continue;
        if (!is_near_one(sum, silent_tolerance)) status = judge_sum(f, variable, j, sum, err);
        for (size_t k = 0; k < outcomes && status == BAL_OK; k++) row[k] /= sum;
    }
    return status;
}

static bal_status fill_tables(const filling *f, bal_error *err) {
    size_t n = bal_network_variables(f->network), n_given = 0;
    for (size_t v = 0; v < n; v++) n_given += list_of(f, v, BALI_LIST_TABLE) != NULL;
    if (n_given == 0) return BAL_OK;
    bal_cells *cells = NULL;
    bool *given = bali_allocate(n, sizeof *given);
    bal_status status = given ? bal_cells_create(f->network, &cells, err) : bali_out_of_memory(err);
    for (size_t v = 0; v < n && status == BAL_OK; v++) {
        given[v] = list_of(f, v, BALI_LIST_TABLE) != NULL;
        if (given[v]) status = fill_table(f, v, bal_cells_edit(cells, v), err);
    }
    if (status == BAL_OK) status = bali_document_set_tables(f->document, cells, given, err);
    bal_cells_free(cells);
    bali_free(given);
    return status;
}

/* ---- counts, pseudo-counts, row ESS ---- */

/* Counts are of all families or of none: a sum over families must not lack one. */
static bal_status fill_counts(const filling *f, bali_draft_list which, bal_carried what, bal_error *err) {
    size_t n = bal_network_variables(f->network), with = BAL_NONE, without = BAL_NONE;
    for (size_t v = n; v-- > 0;) *(list_of(f, v, which) ? &with : &without) = v;
    if (with == BAL_NONE) return BAL_OK;
    if (without != BAL_NONE)
        return bali_draft_fail(f->draft, list_of(f, with, which)->at, name_of(f, without), "incomplete-counts", err,
                               "%s is given for %.80s but not for %.80s; give it for every variable or for none",
                               bali_draft_list_name(which), name_of(f, with), name_of(f, without));
    bal_cells *cells = NULL;
    bal_status status = bal_cells_create(f->network, &cells, err);
    for (size_t v = 0; v < n && status == BAL_OK; v++) {
        status = check_length(f, v, which, err);
        if (status == BAL_OK)
            memcpy(bal_cells_edit(cells, v), list_of(f, v, which)->values, list_of(f, v, which)->n * sizeof(double));
    }
    if (status == BAL_OK) status = bal_document_set_cells(f->document, what, cells, err);
    bal_cells_free(cells);
    return status;
}

static bal_status fill_row_ess(const filling *f, size_t variable, bal_error *err) {
    const bali_number_list *list = list_of(f, variable, BALI_LIST_ROW_ESS);
    size_t rows = bal_network_rows(f->network, variable);
    if (!list) return BAL_OK;
    if (list->n != 1 && list->n != rows)
        return bali_draft_fail(f->draft, list->at, name_of(f, variable), "table-size", err,
                               "ballast.row-ess of %.80s has %zu numbers; expected 1, or %zu: one a row",
                               name_of(f, variable), list->n, rows);
    double *row_ess = bali_allocate(rows, sizeof *row_ess);
    if (!row_ess) return bali_out_of_memory(err);
    for (size_t j = 0; j < rows; j++) row_ess[j] = list->values[list->n == 1 ? 0 : j];
    bal_status status = bali_document_set_row_ess(f->document, variable, row_ess, err);
    bali_free(row_ess);
    return status;
}

bal_status bali_draft_fill(const bali_draft *draft, const bali_draft_definition *const *definition_of, bool for_slowest,
                           bali_remarks *remarks, bal_document *document, bal_error *err) {
    filling f = {draft, definition_of, for_slowest, remarks, document, bal_document_network(document)};
    bal_status status = fill_tables(&f, err);
    if (status == BAL_OK) status = fill_counts(&f, BALI_LIST_COUNTS, BAL_CARRIED_COUNTS, err);
    if (status == BAL_OK) status = fill_counts(&f, BALI_LIST_PSEUDO_COUNTS, BAL_CARRIED_PSEUDO_COUNTS, err);
    for (size_t v = 0; v < bal_network_variables(f.network) && status == BAL_OK; v++) status = fill_row_ess(&f, v, err);
    return status;
}
