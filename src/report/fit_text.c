/* `ballast fit` as one page of 80 columns. */
#include "base/numbers.h"
#include "model/cells.h"
#include "report/facts.h"

#include <math.h>
#include <string.h>

enum { ROWS_SHOWN = 3, PAGE_WIDTH = 79, LABEL_WIDTH = 10, COUNT_EDGE = 39 };

static const bal_network *network_of(const bali_fit_facts *facts) {
    return bal_document_network(facts->document);
}

static void put_visible(bali_text *text, const char *string) {
    bali_text_put_visible(text, string, strlen(string));
}

/* A labelled paragraph: the label in its own column, the words beside it. Empties the words. */
static void put_item(bali_text *text, const char *label, bali_text *words) {
    bali_text_printf(text, "%-*s", LABEL_WIDTH, label);
    bali_text_put_wrapped(text, bali_text_string(words), LABEL_WIDTH, LABEL_WIDTH);
    text->failed |= words->failed;
    bali_text_clear(words);
}

static void put_what_went_in(bali_text *text, const bali_fit_facts *facts, bali_text *words) {
    const bal_network *network = network_of(facts);
    const bali_data_facts *data = facts->data;
    put_visible(words, data->inputs[0].name);
    bali_text_printf(words, ": %zu variables, %zu arcs, %zu rows, %zu cells, %zu free parameters", bal_network_variables(network),
                     bal_network_arcs(network), bali_count_rows(facts->fit->counts).rows, bal_network_cells(network),
                     bali_free_parameters(network, facts->fit->pseudo_counts));
    put_item(text, "network", words);
    put_visible(words, data->n_inputs > 1 ? data->inputs[1].name : "the network's own counts");
    bali_text_puts(words, ": ");
    bali_text_put_thousands(words, (uint64_t)data->records);
    bali_text_puts(words, data->records == 1 ? " record" : " records");
    if (data->summary.dropped > 0) {
        bali_text_puts(words, "; ");
        bali_text_put_thousands(words, data->summary.dropped);
        bali_text_puts(words, " more left out, since a cell was missing");
    }
    put_item(text, "data", words);
}

static void put_choice(bali_text *words, const bali_fit_facts *facts) {
    const bal_strength *strength = &facts->fit->strength;
    if (bal_prior_choice(facts->prior) == BAL_STRENGTH_GIVEN) {
        bali_text_puts(words, ", as given");
        return;
    }
    if (!strength->chosen) {
        bali_text_puts(words, facts->fit->records > 0 ? ", since every other would score the same on these records"
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
    put_item(text, "prior", words);
}

static void put_scores(bali_text *text, const bali_fit_facts *facts, bali_text *words) {
    const bal_fit *fit = facts->fit;
    if (fit->records <= 0) return;
    bali_text_printf(words, "log marginal likelihood %.3f nats; leave-one-out %.4f a record", fit->scores.log_marginal_likelihood,
                     fit->scores.leave_one_out / fit->records);
    if (fit->strength.chosen) bali_text_puts(words, " (slightly optimistic: the strength was chosen on these records)");
    if (facts->n_others > 0) bali_text_puts(words, "\nleave-one-out under other priors: ");
    for (size_t i = 0; i < facts->n_others; i++)
        bali_text_printf(words, "%s%s %.4f", i ? ", " : "", bal_prior_kind_name(facts->others[i].kind),
                         facts->others[i].leave_one_out / fit->records);
    put_item(text, "scores", words);
}

static void put_count(bali_text *text, const char *what, uint64_t n) {
    bali_text digits = {0};
    bali_text_put_thousands(&digits, n);
    bali_text_puts(text, what);
    size_t column = COUNT_EDGE > digits.length ? COUNT_EDGE - digits.length : 0;
    bali_text_pad(text, column);
    bali_text_puts(text, bali_text_string(&digits));
    text->failed |= digits.failed;
    bali_text_free(&digits);
}

/* Decimals that give a standard error two significant digits, four at least. */
static int decimals_for(double standard_error) {
    if (!(standard_error > 0)) return 4;
    int decimals = 1 - (int)floor(log10(standard_error));
    return decimals < 4 ? 4 : decimals > 7 ? 7 : decimals;
}

static void put_difference(bali_text *text, const bal_paired *paired) {
    int decimals = decimals_for(paired->standard_error);
    bali_text_printf(text, "%10.4f%10.4f  %7.*f", paired->bayes, paired->ml, decimals, paired->mean_difference);
    if (!isnan(paired->standard_error)) bali_text_printf(text, " +- %.*f", decimals, paired->standard_error);
    bali_text_putc(text, '\n');
}

/* "11 of these 250 records (4.4 %)". */
static void put_share(bali_text *words, uint64_t part, uint64_t whole) {
    bali_text_put_thousands(words, part);
    bali_text_puts(words, " of these ");
    bali_text_put_thousands(words, whole);
    bali_text_printf(words, " records (%.3g %%)", 100 * (double)part / (double)whole);
}

/* Why ML cannot be compared on all records, and what it would have to do. */
static void put_verdict(bali_text *text, const bal_heldout *h, bali_text *words) {
    uint64_t others = h->impossible + h->undefined;
    if (others == 0) {
        bali_text_puts(words, "ML had seen every cell that these records needed, so it can be scored on all of them.");
    } else {
        bali_text_puts(words, h->impossible > 0 ? "ML calls " : "ML has no answer for ");
        put_share(words, h->impossible > 0 ? h->impossible : h->undefined, h->records);
        if (h->impossible > 0) bali_text_puts(words, " impossible");
        if (h->impossible > 0 && h->undefined > 0) {
            bali_text_puts(words, " and has no answer for ");
            bali_text_put_thousands(words, h->undefined);
            bali_text_puts(words, " more");
        }
        bali_text_printf(words, ", so its total is %s. Records whose cells it had seen favour it.",
                         h->impossible > 0 ? "minus infinity" : "undefined");
        if (isfinite(h->break_even)) {
            bali_text_printf(words, " To tie on all records it would need %.4f a record on the rest", h->break_even);
            bali_text_puts(words, h->break_even > 0 ? ", which is more than certainty (0) would give." : ".");
        }
    }
    bali_text_puts(text, "  ");
    bali_text_put_wrapped(text, bali_text_string(words), 2, 2);
    bali_text_clear(words);
}

static void put_heldout(bali_text *text, const bali_fit_facts *facts, bali_text *words) {
    const bal_heldout *h = facts->heldout;
    if (!h) return;
    uint64_t others = h->impossible + h->undefined;
    bali_text_printf(words, "\nNew records: each predicted by a fit that had not seen it (%zu folds). ML is maximum likelihood, the raw "
                            "frequencies. Log-likelihood in nats a record; higher is better.",
                     facts->folds);
    bali_text_put_wrapped(text, bali_text_string(words), 0, 0);
    bali_text_clear(words);
    bali_text_puts(text, "                                records     Bayes        ML  Bayes - ML\n");
    if (others == 0) {
        put_count(text, "  all records", h->records);
        put_difference(text, &h->on_comparable);
    } else {
        put_count(text, "  all records", h->records);
        bali_text_printf(text, "%10.4f%10s\n", h->bayes_log_likelihood / (double)h->records, h->impossible ? "-inf" : "undefined");
        put_count(text, "    whose cells ML had seen", h->comparable);
        if (h->comparable > 0) {
            put_difference(text, &h->on_comparable);
        } else {
            bali_text_putc(text, '\n');
        }
        put_count(text, "    the rest", others);
        bali_text_printf(text, "%10.4f%10s\n", h->bayes_on_others, h->impossible ? "-inf" : "undefined");
    }
    put_count(text, "  the prior alone, all records", h->records);
    bali_text_printf(text, "%10.4f\n", h->prior_log_likelihood / (double)h->records);
    put_count(text, "  quadratic score (low is good)", h->records);
    put_difference(text, &h->quadratic);
    put_verdict(text, h, words);
}

static void put_row_list(bali_text *text, const bali_fit_facts *facts, bal_basis basis, size_t total, const char *title) {
    bali_row rows[ROWS_SHOWN];
    if (total == 0) return;
    (void)bali_list_rows(facts->fit->counts, basis, rows, ROWS_SHOWN);
    bali_text_printf(text, "  %s\n", title);
    for (size_t i = 0; i < total && i < ROWS_SHOWN; i++) {
        bali_text_puts(text, "    ");
        bali_put_row_name(text, network_of(facts), rows[i].variable, rows[i].row, PAGE_WIDTH - 20);
        if (basis == BAL_BASIS_FEW) bali_text_printf(text, " (%g record%s)", rows[i].records, rows[i].records == 1 ? "" : "s");
        bali_text_putc(text, '\n');
    }
    if (total > ROWS_SHOWN) bali_text_printf(text, "    and %zu more\n", total - ROWS_SHOWN);
}

static void put_rows(bali_text *text, const bali_fit_facts *facts, bali_text *words) {
    bali_row_counts rows = bali_count_rows(facts->fit->counts);
    bali_text_printf(words, "\nWhat the tables rest on: of %zu rows, %zu on 5 records or more, %zu on 1 to 4, %zu on the prior alone.", rows.rows,
                     rows.data, rows.few, rows.prior);
    bali_text_put_wrapped(text, bali_text_string(words), 0, 0);
    bali_text_clear(words);
    put_row_list(text, facts, BAL_BASIS_PRIOR, rows.prior, "prior belief, no record:");
    put_row_list(text, facts, BAL_BASIS_FEW, rows.few, "few records:");
}

static void put_what_came_out(bali_text *text, const bali_fit_facts *facts, bali_text *words) {
    bali_text_putc(text, '\n');
    if (facts->written) {
        put_visible(words, facts->written);
        bali_text_printf(words, ": %s, with the counts and pseudo-counts behind them",
                         facts->maximum_likelihood ? "raw frequencies (rows without records uniform)" : "posterior means");
        put_item(text, "wrote", words);
    }
    if (facts->json) {
        put_visible(words, facts->json);
        bali_text_puts(words, ": every number, with each cell's interval and each row's share of data");
        put_item(text, "wrote", words);
    }
    if (!facts->written) bali_text_puts(words, "-o FITTED.xml writes the tables");
    if (!facts->json) bali_text_puts(words, words->length ? "; --json FILE every number and interval" : "--json FILE writes every number and interval");
    if (facts->written && facts->json) {
        bali_text_puts(words, "ballast check ");
        put_visible(words, facts->data->inputs[0].name);
        bali_text_puts(words, " TABLE says whether a table is enough");
    }
    put_item(text, "next", words);
}

void bali_fit_text(const bali_fit_facts *facts, bali_text *text) {
    bali_text words = {0};
    put_what_went_in(text, facts, &words);
    put_prior(text, facts, &words);
    put_scores(text, facts, &words);
    put_heldout(text, facts, &words);
    put_rows(text, facts, &words);
    put_what_came_out(text, facts, &words);
    text->failed |= words.failed;
    bali_text_free(&words);
}
