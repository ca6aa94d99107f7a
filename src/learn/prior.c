#include "ballast/prior.h"

#include "base/memory.h"
#include "learn/prior_parts.h"
#include "model/cells.h"
#include "model/shape.h"

#include <math.h>

bal_prior_options bal_prior_options_defaults(void) {
    return (bal_prior_options){.kind = BAL_PRIOR_BDEU, .choice = BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD, .strength = 1};
}

const char *bal_prior_kind_name(bal_prior_kind kind) {
    static const char *const names[] = {"bdeu", "k2", "jeffreys", "expert", "carried"};
    return names[kind];
}

static bal_status refuse_row_ess(double row_ess, bal_error *err) {
    return bal_error_set(err, BAL_ERR_ARGUMENT, "bad-row-ess", "a row is worth a finite number of cases above 0, not %g", row_ess);
}

static bal_status check_options(const bal_prior_options *options, bal_error *err) {
    if (!(options->strength > 0) || !isfinite(options->strength))
        return bal_error_set(err, BAL_ERR_ARGUMENT, "bad-strength", "a prior's strength is a finite number above 0, not %g",
                             options->strength);
    if (!(options->row_ess >= 0) || !isfinite(options->row_ess)) return refuse_row_ess(options->row_ess, err);
    if (!(options->floor >= 0 && options->floor < 1))
        return bal_error_set(err, BAL_ERR_ARGUMENT, "bad-floor", "the prior's floor is at least 0 and below 1, not %g", options->floor);
    return BAL_OK;
}

static bal_status check_expert(const bal_network *network, const bal_document *expert, bal_error *err) {
    if (!expert)
        return bal_error_set(err, BAL_ERR_ARGUMENT, "no-expert", "the expert prior needs a network with the expert's tables");
    if (!bal_network_equal(bal_document_network(expert), network))
        return bal_error_set(err, BAL_ERR_DATA, "other-network", "the expert's tables belong to another network; give tables of this one");
    if (bal_document_cells(expert, BAL_CARRIED_PSEUDO_COUNTS))
        return bal_error_set(err, BAL_ERR_DATA, "fitted-tables",
                             "the tables were fitted to data already, so they are no expert's; give the expert's own file, or --prior carried");
    return BAL_OK;
}

/* Row ESS x [(1 - floor) theta + floor / r], for one family. */
static bal_status weigh_family(bal_prior *prior, size_t v, const bal_prior_options *options, bal_error *err) {
    const double *theta = bal_cells_family(bal_document_cells(options->expert, BAL_CARRIED_TABLES), v);
    const double *row_ess = bal_document_row_ess(options->expert, v);
    if (options->row_ess <= 0 && !row_ess)
        return bal_error_set(err, BAL_ERR_ARGUMENT, "no-row-ess",
                             "nothing says how many cases a row of %s is worth; give --row-ess N, or ballast.row-ess in the file",
                             bal_domain_name(bal_network_domain(prior->network), v));
    size_t r = bal_network_outcomes(prior->network, v), rows = bal_network_rows(prior->network, v);
    double *unit = bal_cells_edit(prior->units, v);
    for (size_t row = 0; row < rows; row++) {
        double worth = options->row_ess > 0 ? options->row_ess : row_ess[row];
        if (!(worth > 0) || !isfinite(worth)) return refuse_row_ess(worth, err);
        for (size_t k = 0; k < r; k++, unit++, theta++)
            *unit = worth * ((1 - options->floor) * *theta + options->floor / (double)r);
    }
    return BAL_OK;
}

static bal_status weigh_expert(bal_prior *prior, const bal_prior_options *options, bal_error *err) {
    bal_status status = check_expert(prior->network, options->expert, err);
    if (status != BAL_OK) return status;
    const bal_domain *domain = bal_network_domain(prior->network);
    if (!bal_document_cells(options->expert, BAL_CARRIED_TABLES))
        return bal_error_set(err, BAL_ERR_DATA, "no-tables",
                             "the expert prior needs a table for every variable; add the missing TABLE elements");
    status = bal_cells_create(prior->network, &prior->units, err);
    for (size_t v = 0; v < bal_domain_variables(domain) && status == BAL_OK; v++) {
        status = weigh_family(prior, v, options, err);
        if (status != BAL_OK) bal_error_context(err, 0, bal_domain_name(domain, v));
    }
    return status;
}

/* A row without any pseudo-count says nothing of its outcomes, and without records it would have no mean. */
static bal_status check_carried(const bal_cells *pseudo_counts, bal_error *err) {
    const bal_network *network = bal_cells_network(pseudo_counts);
    for (size_t v = 0; v < bal_network_variables(network); v++) {
        size_t r = bal_network_outcomes(network, v), rows = bal_network_rows(network, v);
        const char *name = bal_domain_name(bal_network_domain(network), v);
        const double *alpha = bal_cells_family(pseudo_counts, v);
        for (size_t row = 0; row < rows; row++, alpha += r) {
            double total = bali_row_sum(alpha, r);
            if (total > 0 && isfinite(total)) continue;
            bal_status status = bal_error_set(err, BAL_ERR_DATA, "no-pseudo-counts",
                                              "the pseudo-counts of row %zu of %s sum to %g, so they are no prior; fit anew from the counts",
                                              row + 1, name, total);
            bal_error_context(err, 0, name);
            return status;
        }
    }
    return BAL_OK;
}

static bal_status take_carried(bal_prior *prior, const bal_document *carried, bal_error *err) {
    const bal_cells *pseudo_counts = carried ? bal_document_cells(carried, BAL_CARRIED_PSEUDO_COUNTS) : NULL;
    if (!pseudo_counts)
        return bal_error_set(err, BAL_ERR_ARGUMENT, "no-pseudo-counts",
                             "the carried prior needs the pseudo-counts of an earlier fit; give a file that ballast fit wrote");
    if (!bal_network_equal(bal_document_network(carried), prior->network))
        return bal_error_set(err, BAL_ERR_DATA, "other-network", "the carried prior belongs to another network; give the fit of this one");
    bal_status status = check_carried(pseudo_counts, err);
    if (status != BAL_OK) return status;
    prior->choice = BAL_STRENGTH_GIVEN;
    prior->strength = 1;
    return bal_cells_copy(pseudo_counts, &prior->units, err);
}

bal_status bal_prior_create(const bal_network *network, const bal_prior_options *options, bal_prior **out, bal_error *err) {
    *out = NULL;
    bal_status status = check_options(options, err);
    if (status != BAL_OK) return status;
    bal_prior *prior = bali_allocate(1, sizeof *prior);
    if (!prior) return bali_out_of_memory(err);
    prior->network = bali_network_hold(network);
    prior->kind = options->kind;
    prior->choice = options->choice;
    prior->strength = options->strength;
    if (prior->kind == BAL_PRIOR_EXPERT) status = weigh_expert(prior, options, err);
    if (prior->kind == BAL_PRIOR_CARRIED) status = take_carried(prior, options->carried, err);
    if (status == BAL_OK) {
        *out = prior;
    } else {
        bal_prior_free(prior);
    }
    return status;
}

void bal_prior_free(bal_prior *prior) {
    if (!prior) return;
    bal_cells_free(prior->units);
    bal_network_free(prior->network);
    bali_free(prior);
}

bal_prior_kind bal_prior_kind_of(const bal_prior *prior) {
    return prior->kind;
}

bal_strength_choice bal_prior_choice(const bal_prior *prior) {
    return prior->choice;
}

double bali_prior_unit(const bal_prior *prior, size_t variable) {
    if (prior->kind == BAL_PRIOR_K2) return 1;
    if (prior->kind == BAL_PRIOR_JEFFREYS) return 0.5;
    size_t q = bal_network_rows(prior->network, variable), r = bal_network_outcomes(prior->network, variable);
    return 1 / ((double)q * (double)r);
}

/* The constant pseudo-count of a family. BDeu divides once, as it is defined, so that ESS 8 over 4 cells is exactly 2. */
static double family_count(const bal_prior *prior, double strength, size_t v) {
    if (prior->kind != BAL_PRIOR_BDEU) return strength * bali_prior_unit(prior, v);
    return strength / ((double)bal_network_rows(prior->network, v) * (double)bal_network_outcomes(prior->network, v));
}

void bal_prior_fill(const bal_prior *prior, double strength, bal_cells *pseudo_counts) {
    for (size_t v = 0; v < bal_network_variables(prior->network); v++) {
        size_t cells = bal_network_rows(prior->network, v) * bal_network_outcomes(prior->network, v);
        const double *units = prior->units ? bal_cells_family(prior->units, v) : NULL;
        double constant = units ? 0 : family_count(prior, strength, v);
        double *alpha = bal_cells_edit(pseudo_counts, v);
        for (size_t c = 0; c < cells; c++) alpha[c] = units ? strength * units[c] : constant;
    }
}
