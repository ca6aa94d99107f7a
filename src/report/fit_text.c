/* `ballast fit` as one page of 80 columns. */
#include "base/numbers.h"
#include "model/cells.h"
#include "report/facts.h"
#include "report/words.h"

#include <math.h>
#include <string.h>

enum { ROWS_SHOWN = 3 };

static const bal_network *network_of(const bali_fit_facts *facts) {
    return bal_document_network(facts->document);
}

static void put_data(bali_text *text, const bali_fit_facts *facts, bali_text *words) {
    const bali_data_facts *data = facts->data;
    bali_put_data_source(words, data);
    bali_text_puts(words, ": ");
    bool only_carried = data->n_data == 0 && bal_prior_kind_of(facts->prior) == BAL_PRIOR_CARRIED;
    double records = only_carried ? data->earlier : data->records;
    bali_put_records(words, records);
    bali_text_puts(words, records == 1 ? " record" : " records");
    if (data->summary.fractional) bali_text_printf(words, " of weight %.6g", data->weight);
    if (only_carried) bali_text_puts(words, " carried over, no new ones");
    if (data->earlier > 0 && !only_carried) {
        bali_text_puts(words, ", added to ");
        bali_put_records(words, data->earlier);
        bali_text_puts(words, " carried over");
    }
    if (data->summary.dropped > 0) {
        bali_text_puts(words, "; ");
        bali_text_put_thousands(words, data->summary.dropped);
        bali_text_puts(words, " more left out, since a cell was missing");
    }
    if (data->by_family) {
        bali_text_puts(words, "; ");
        bali_text_put_thousands(words, data->summary.incomplete);
        bali_text_puts(words, " of them incomplete, counted in the families they are complete for");
    }
    bali_put_item(text, "data", words);
}

static void put_what_went_in(bali_text *text, const bali_fit_facts *facts, bali_text *words) {
    const bal_network *network = network_of(facts);
    bali_put_visible(words, facts->data->inputs[0].name);
    bali_text_puts(words, ": ");
    bali_put_shape(words, network, bali_free_parameters(network, facts->fit->pseudo_counts));
    bali_put_item(text, "network", words);
    put_data(text, facts, words);
}

static void put_choice(bali_text *words, const bali_fit_facts *facts) {
    const bal_strength *strength = &facts->fit->strength;
    if (bal_prior_choice(facts->prior) == BAL_STRENGTH_GIVEN) {
        bali_text_puts(words, ", as given");
        return;
    }
    if (!strength->chosen) {
        bali_text_puts(words, bali_scored_records(facts) > 0 ? ", since every other would score the same on these records"
                                                      : ", since there are no records to choose by");
        return;
    }
    bali_text_printf(words, ", chosen between 0.01 and 10000 for the largest %s",
                     bal_prior_choice(facts->prior) == BAL_STRENGTH_BY_LEAVE_ONE_OUT ? "leave-one-out log-likelihood"
                                                                                     : "log marginal likelihood");
    if (strength->at_end < 0) bali_text_puts(words, "; that is the lower end, so these records ask for even less prior");
    if (strength->at_end > 0) bali_text_puts(words, "; that is the upper end, so these records ask for even more prior");
}

static void put_prior(bali_text *text, const bali_fit_facts *facts, bali_text *words) {
    bal_prior_kind kind = bal_prior_kind_of(facts->prior);
    const bal_prior_options *options = facts->prior_options;
    bali_text_puts(words, bal_prior_kind_name(kind));
    if (kind == BAL_PRIOR_CARRIED) {
        const char *first = bal_document_property(facts->document, BAL_OF_NETWORK, BAL_NONE, "ballast.prior");
        bali_text_puts(words, ": the pseudo-counts of the earlier fit");
        if (first) bali_text_puts(words, ", ");
        if (first) bali_put_visible(words, first);
    }
    if (options->row_ess > 0) {
        bali_text_puts(words, ", each row worth ");
        bali_text_put_number(words, options->row_ess);
        bali_text_puts(words, " cases");
    } else if (kind == BAL_PRIOR_EXPERT) {
        bali_text_puts(words, ", each row worth the cases its file says");
    }
    if (options->floor > 0) {
        bali_text_puts(words, ", floor ");
        bali_text_put_number(words, options->floor);
    }
    if (kind == BAL_PRIOR_BDEU || facts->fit->strength.value != 1 || bal_prior_choice(facts->prior) != BAL_STRENGTH_GIVEN) {
        bali_text_puts(words, kind == BAL_PRIOR_BDEU ? ", equivalent sample size (ESS) " : ", scale ");
        bali_text_put_number(words, facts->fit->strength.value);
        put_choice(words, facts);
    }
    bali_put_item(text, "prior", words);
}

static void put_scores(bali_text *text, const bali_fit_facts *facts, bali_text *words) {
    const bal_fit *fit = facts->fit;
    double records = bali_scored_records(facts);
    if (isnan(records)) return;
    bali_text_printf(words, "log marginal likelihood %.3f nats", fit->scores.log_marginal_likelihood);
    if (facts->data->composite) bali_text_puts(words, " (composite: families count different records)");
    if (!isnan(facts->log_predictive)) bali_text_printf(words, "; of the new records given the old, %.3f", facts->log_predictive);
    if (!isnan(fit->scores.leave_one_out)) {
        bali_text_printf(words, "; leave-one-out %.4f a record", fit->scores.leave_one_out / records);
        if (fit->strength.chosen) bali_text_puts(words, " (slightly optimistic: the strength was chosen on these records)");
        if (facts->n_others > 0) bali_text_puts(words, "\nleave-one-out under other priors: ");
        for (size_t i = 0; i < facts->n_others; i++) {
            bali_text_printf(words, "%s%s %.4f", i ? ", " : "", bal_prior_kind_name(facts->others[i].kind),
                             facts->others[i].leave_one_out / records);
            if (facts->others[i].kind == BAL_PRIOR_BDEU) bali_text_printf(words, " (ESS %g, chosen on these records)", facts->others[i].strength);
        }
    }
    bali_put_item(text, "scores", words);
}

static void put_rows(bali_text *text, const bali_fit_facts *facts, bali_text *words) {
    bali_row_counts rows = bali_count_rows(facts->fit->counts);
    bali_text_printf(words, "\nWhat the tables rest on: of %zu rows, %zu on 5 records or more, %zu on 1 to 4, %zu on the prior alone.", rows.rows,
                     rows.data, rows.few, rows.prior);
    bali_text_put_wrapped(text, bali_text_string(words), 0, 0);
    text->failed |= words->failed;
    bali_text_clear(words);
    bali_put_row_list(text, facts->fit->counts, BAL_BASIS_PRIOR, ROWS_SHOWN, "prior belief, no record:");
    bali_put_row_list(text, facts->fit->counts, BAL_BASIS_FEW, ROWS_SHOWN, "few records:");
}

static void put_what_came_out(bali_text *text, const bali_fit_facts *facts, bali_text *words) {
    bali_text_putc(text, '\n');
    if (facts->written) {
        bali_put_visible(words, facts->written);
        bali_text_printf(words, ": %s, with the counts and pseudo-counts behind them",
                         facts->maximum_likelihood ? "raw frequencies (rows without records uniform)" : "posterior means");
        bali_put_item(text, "wrote", words);
    }
    if (facts->json) {
        bali_put_visible(words, facts->json);
        bali_text_puts(words, ": every number, with each cell's interval and each row's share of data");
        bali_put_item(text, "wrote", words);
    }
    if (!facts->written) bali_text_puts(words, "-o FITTED.xml writes the tables");
    if (!facts->json) bali_text_puts(words, words->length ? "; --json FILE every number and interval" : "--json FILE writes every number and interval");
    if (facts->written && facts->json) {
        bali_text_puts(words, "ballast fit ");
        bali_put_visible(words, facts->written);
        bali_text_puts(words, " NEXT.csv --prior carried adds the next batch of cases");
    }
    bali_put_item(text, "next", words);
}

void bali_fit_text(const bali_fit_facts *facts, bali_text *text) {
    bali_text words = {0};
    put_what_went_in(text, facts, &words);
    put_prior(text, facts, &words);
    put_scores(text, facts, &words);
    bali_put_heldout(text, facts);
    put_rows(text, facts, &words);
    put_what_came_out(text, facts, &words);
    text->failed |= words.failed;
    bali_text_free(&words);
}
