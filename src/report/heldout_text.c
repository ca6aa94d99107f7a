/* Held-out comparison with maximum likelihood, as it stands on a page of 80 columns. */
#include "report/facts.h"
#include "report/words.h"

#include <math.h>

enum { COUNT_EDGE = 39 };

static void put_count(bali_text *text, const char *what, double n) {
    bali_text digits = {0};
    bali_put_records(&digits, n);
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
static void put_share(bali_text *words, double part, double whole) {
    bali_put_records(words, part);
    bali_text_puts(words, " of these ");
    bali_put_records(words, whole);
    bali_text_printf(words, " records (%.3g %%)", 100 * part / whole);
}

/* Why ML cannot be compared on all records, and what it would have to do. */
static void put_verdict(bali_text *text, const bal_heldout *h) {
    bali_text held = {0}, *words = &held;
    double others = h->impossible + h->undefined;
    if (others <= 0) {
        bali_text_puts(words, "ML had seen every cell that these records needed, so it can be scored on all of them.");
    } else {
        bali_text_puts(words, h->impossible > 0 ? "ML calls " : "ML has no answer for ");
        put_share(words, h->impossible > 0 ? h->impossible : h->undefined, h->records);
        if (h->impossible > 0) bali_text_puts(words, " impossible");
        if (h->impossible > 0 && h->undefined > 0) {
            bali_text_puts(words, " and has no answer for ");
            bali_put_records(words, h->undefined);
            bali_text_puts(words, " more");
        }
        bali_text_printf(words, ", so its total is %s. Records whose cells it had seen favour it.",
                         h->impossible > 0 ? "minus infinity" : "undefined");
        if (isfinite(h->break_even)) {
            bali_text_printf(words, " To tie on all records it would need %.4f a record on the rest", h->break_even);
            bali_text_puts(words, h->break_even > 0 ? ", which is more than certainty (0) would give." : ".");
        }
    }
    if (h->bayes_impossible > 0) {
        bali_text_puts(words, " The prior has zeros where ");
        put_share(words, h->bayes_impossible, h->records);
        bali_text_puts(words, h->bayes_impossible == 1 ? " falls, so Bayes has no finite total either." : " fall, so Bayes has no finite total either.");
    }
    bali_text_puts(text, "  ");
    bali_text_put_wrapped(text, bali_text_string(words), 2, 2);
    text->failed |= words->failed;
    bali_text_free(words);
}

/* How the records came to be held out. */
static void put_method(bali_text *words, const bali_fit_facts *facts) {
    const bal_heldout *h = facts->heldout;
    const bal_heldout_options *options = facts->heldout_options;
    switch (options->method) {
    case BAL_HELDOUT_FOLDS: bali_text_printf(words, "%zu folds", h->parts); break;
    case BAL_HELDOUT_GROUPS: bali_text_printf(words, "%zu folds, one a label of the fold column", h->parts); break;
    case BAL_HELDOUT_HOLDOUT: bali_text_printf(words, "a share of %g, held out at random", options->fraction); break;
    case BAL_HELDOUT_TEST:
        bali_text_puts(words, "those of ");
        bali_put_visible(words, facts->data->inputs[facts->data->n_inputs - 1].name); /* the test table went in last */
        break;
    }
    if (options->repeats > 1) bali_text_printf(words, ", %zu times with other random parts: numbers are means", options->repeats);
}

static void put_intro(bali_text *text, const bali_fit_facts *facts) {
    bali_text words = {0};
    bali_text_puts(&words, "\nNew records: each predicted by a fit that had not seen it (");
    put_method(&words, facts);
    bali_text_puts(&words, "). ML is maximum likelihood, the raw frequencies. Log-likelihood in nats a record; higher is better.");
    if (facts->heldout->incomplete > 0) {
        bali_text_putc(&words, ' ');
        bali_put_records(&words, facts->heldout->incomplete);
        bali_text_puts(&words, facts->heldout->incomplete == 1 ? " incomplete record is not scored." : " incomplete records are not scored.");
    }
    if (facts->data->unrecorded) bali_text_puts(&words, " Families that touch an unrecorded variable are left out.");
    bali_text_put_wrapped(text, bali_text_string(&words), 0, 0);
    text->failed |= words.failed;
    bali_text_free(&words);
}

void bali_put_heldout(bali_text *text, const bali_fit_facts *facts) {
    const bal_heldout *h = facts->heldout;
    if (!h) return;
    double others = h->impossible + h->undefined;
    if (h->records <= 0) {
        bali_text_puts(text, "\nNew records: no complete record was held out, so nothing is compared.\n");
        return;
    }
    put_intro(text, facts);
    bali_text_puts(text, "                                records     Bayes        ML  Bayes - ML\n");
    if (others <= 0) {
        put_count(text, "  all records", h->records);
        put_difference(text, &h->on_comparable);
    } else {
        put_count(text, "  all records", h->records);
        bali_text_printf(text, "%10.4f%10s\n", h->bayes_log_likelihood / h->records, h->impossible > 0 ? "-inf" : "undefined");
        put_count(text, "    whose cells ML had seen", h->comparable);
        if (h->comparable > 0) {
            put_difference(text, &h->on_comparable);
        } else {
            bali_text_putc(text, '\n');
        }
        put_count(text, "    the rest", others);
        bali_text_printf(text, "%10.4f%10s\n", h->bayes_on_others, h->impossible > 0 ? "-inf" : "undefined");
    }
    bool carried = bal_prior_kind_of(facts->prior) == BAL_PRIOR_CARRIED; /* then earlier records are no part of it */
    put_count(text, carried ? "  the first prior alone, all" : "  the prior alone, all records", h->records);
    bali_text_printf(text, "%10.4f\n", h->prior_log_likelihood / h->records);
    put_count(text, "  quadratic score (low is good)", h->records);
    put_difference(text, &h->quadratic);
    put_verdict(text, h);
}
