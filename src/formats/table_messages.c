#include "formats/table_messages.h"

#include "base/names.h"
#include "base/numbers.h"
#include "formats/spelling.h"
#include "model/domain.h"

#include <inttypes.h>
#include <string.h>

enum { MOST_OUTCOMES = 8, MOST_OUTCOME_BYTES = 160, MOST_COMPARED = 10000, MOST_COUNTS = 10 };

static char lower(char c) {
    return c >= 'A' && c <= 'Z' ? (char)(c - 'A' + 'a') : c;
}

static bool equal_lower(const char *text, size_t length, const char *word) {
    size_t i = 0;
    while (i < length && word[i] != '\0' && lower(text[i]) == word[i]) i++;
    return i == length && word[i] == '\0';
}

/* How a missing cell is often written, in lower case. Only empty cells and NA are taken as missing unasked. */
static bool is_usual_missing(const char *text, size_t length) {
    static const char *const usual[] = {
        "n/a", "na", "nan", "null", "none", "nil", "missing", "n.a.", "#n/a", "<na>", "(null)", "#value!", "not known",
        "unk", "unknown", "not done", "?",  "??",  ".",    "..",   "-",   "--",      "---",  "*",    "-1",   "-9",     "-99",     "-999",
        "-9999", "999", "9999"};
    for (size_t i = 0; i < sizeof usual / sizeof usual[0]; i++)
        if (equal_lower(text, length, usual[i])) return true;
    return false;
}

static void say_outcomes(const bali_bad_label *label, bali_phrase *phrase) {
    size_t n = bal_domain_outcomes(label->domain, label->variable), listed = 0, start = phrase->length;
    bali_phrase_add(phrase, " (");
    for (; listed < n && listed < MOST_OUTCOMES && phrase->length - start < MOST_OUTCOME_BYTES; listed++) {
        const char *outcome = bal_domain_outcome(label->domain, label->variable, listed);
        if (listed > 0) bali_phrase_add(phrase, ", ");
        bali_phrase_text(phrase, outcome, strlen(outcome));
    }
    if (listed < n) bali_phrase_add(phrase, ", ... %zu in all", n);
    bali_phrase_add(phrase, ")");
}

/* The outcome that is the same number, as 1 is 1.0. */
static size_t equal_number(const bali_bad_label *label) {
    double value, other;
    size_t n = bal_domain_outcomes(label->domain, label->variable);
    if (!bali_number_read(label->text, label->length, &value)) return BALI_NO_NAME;
    for (size_t k = 0; k < n && k < MOST_COMPARED; k++) {
        const char *outcome = bal_domain_outcome(label->domain, label->variable, k);
        if (bali_number_read(outcome, strlen(outcome), &other) && !(value < other) && !(value > other)) return k;
    }
    return BALI_NO_NAME;
}

/* Two texts around the first '-', '/', '.' or blank of a text. */
static bool halve(const char *text, size_t length, size_t *first, size_t *second) {
    *first = 0;
    while (*first < length && !strchr("-/. ", text[*first])) ++*first;
    *second = *first + 1;
    return *first > 0 && *second < length;
}

static uint64_t month_number(const char *text, size_t length) {
    static const char *const months[] = {"jan", "feb", "mar", "apr", "may", "jun", "jul", "aug", "sep", "oct", "nov", "dec"};
    for (uint64_t m = 0; m < 12; m++)
        if (equal_lower(text, length, months[m])) return m + 1;
    return 0;
}

/* Day and month of "02-Jan" or "Jan-02". */
static bool read_date(const char *text, size_t length, uint64_t parts[2]) {
    size_t first, second;
    if (!halve(text, length, &first, &second)) return false;
    parts[0] = month_number(text, first);
    parts[1] = month_number(text + second, length - second);
    if (parts[0] && !parts[1]) return bali_whole_read(text + second, length - second, &parts[1]);
    if (parts[1] && !parts[0]) return bali_whole_read(text, first, &parts[0]);
    return false;
}

/* The outcome of which a spreadsheet makes such a date, as it makes 02-Jan or 01-Feb of 1-2. */
static size_t made_into_date(const bali_bad_label *label) {
    uint64_t date[2], parts[2];
    size_t n = bal_domain_outcomes(label->domain, label->variable), first, second;
    if (label->length > 12 || !read_date(label->text, label->length, date)) return BALI_NO_NAME;
    for (size_t k = 0; k < n && k < MOST_COMPARED; k++) {
        const char *outcome = bal_domain_outcome(label->domain, label->variable, k);
        size_t length = strlen(outcome);
        if (!halve(outcome, length, &first, &second) || !bali_whole_read(outcome, first, &parts[0])) continue;
        if (!bali_whole_read(outcome + second, length - second, &parts[1])) continue;
        if ((parts[0] == date[0] && parts[1] == date[1]) || (parts[0] == date[1] && parts[1] == date[0])) return k;
    }
    return BALI_NO_NAME;
}

enum { LONGEST_CODE = 3 };

static void say_hint(const bali_bad_label *label, bali_phrase *phrase) {
    bali_difference how;
    const char *const *labels = bali_domain_labels(label->domain, label->variable), *words = NULL;
    size_t n = bal_domain_outcomes(label->domain, label->variable), date = made_into_date(label);
    size_t outcome = bali_spelling_nearest(label->text, label->length, labels, n, &how);
    if (outcome != BALI_NO_NAME && how != BALI_DIFFERS_IN_CASE) words = bali_difference_words(how);
    if (outcome == BALI_NO_NAME || how == BALI_DIFFERENT) {
        size_t same = equal_number(label);
        if (same != BALI_NO_NAME) outcome = same;
    }
    if (date != BALI_NO_NAME) outcome = date;
    if (outcome != BALI_NO_NAME) {
        const char *question = date != BALI_NO_NAME ? "; did a spreadsheet make a date of " : "; did you mean ";
        bali_phrase_add(phrase, "%s", words ? "; " : question);
        bali_phrase_quote(phrase, labels[outcome], strlen(labels[outcome]));
        if (words) bali_phrase_add(phrase, " differs %s", words);
        else bali_phrase_add(phrase, "?");
    }
    if (is_usual_missing(label->text, label->length)) {
        bali_phrase_add(phrase, "; if it means a missing cell, give --missing-label ");
        bali_phrase_quote(phrase, label->text, label->length);
    } else if (outcome == BALI_NO_NAME && label->length <= LONGEST_CODE) {
        bali_phrase_add(phrase, "; if it is a code, --codebook says of what");
    }
}

void bali_say_bad_label(const bali_bad_label *label, bali_phrase *phrase) {
    const char *name = bal_domain_name(label->domain, label->variable);
    if (label->redact) bali_phrase_add(phrase, "the text");
    else bali_phrase_quote(phrase, label->text, label->length);
    bali_phrase_add(phrase, " is not an outcome of ");
    bali_phrase_text(phrase, name, strlen(name));
    say_outcomes(label, phrase);
    if (label->record) bali_phrase_add(phrase, " in record %" PRIu64, label->record);
    if (!label->redact) say_hint(label, phrase);
}

/* What to do about a text that should be a finite decimal number. */
static const char *number_advice(const char *text, size_t length) {
    bool digits = length > 0;
    for (size_t i = 0; i < length; i++) digits = digits && strchr("0123456789,. '-+", text[i]) != NULL;
    if (digits && memchr(text, ',', length)) return "use a decimal point, and nothing between thousands";
    return "write a finite decimal number such as 12 or 0.5";
}

void bali_say_bad_number(const bali_bad_label *label, bali_phrase *phrase) {
    const char *name = bal_domain_name(label->domain, label->variable);
    if (label->redact) bali_phrase_add(phrase, "the text");
    else bali_phrase_quote(phrase, label->text, label->length);
    bali_phrase_add(phrase, " is not a number, of which ballast.cuts makes the outcomes of ");
    bali_phrase_text(phrase, name, strlen(name));
    if (label->record) bali_phrase_add(phrase, " in record %" PRIu64, label->record);
    if (!label->redact && bali_domain_find_outcome(label->domain, label->variable, label->text, label->length) != BAL_NONE)
        bali_phrase_add(phrase, "; such a column holds no outcomes: give the numbers, or remove ballast.cuts");
    else
        bali_phrase_add(phrase, "; %s", number_advice(label->text, label->length));
    if (label->redact || !is_usual_missing(label->text, label->length)) return;
    bali_phrase_add(phrase, "; if it means a missing cell, give --missing-label ");
    bali_phrase_quote(phrase, label->text, label->length);
}

void bali_say_bad_weight(const char *text, size_t length, bool redact, bali_phrase *phrase) {
    double number;
    if (length == 0) {
        bali_phrase_add(phrase, "the weight is missing; write it, or 0 for a record that does not count");
        return;
    }
    if (redact) bali_phrase_add(phrase, "the text");
    else bali_phrase_quote(phrase, text, length);
    bali_phrase_add(phrase, " is not a weight; ");
    if (!bali_number_read(text, length, &number)) bali_phrase_add(phrase, "%s", number_advice(text, length));
    else bali_phrase_add(phrase, number < 0 ? "weights are not negative" : "weights are at most 1e15");
}

/* The variable with the largest count that comes after (count, variable) in the order told: large counts first. */
static size_t next_largest(const bal_domain *domain, const uint64_t *counts, size_t after) {
    size_t best = BAL_NONE;
    for (size_t v = 0; v < bal_domain_variables(domain); v++) {
        if (counts[v] == 0) continue;
        if (after != BAL_NONE && (counts[v] > counts[after] || (counts[v] == counts[after] && v <= after))) continue;
        if (best == BAL_NONE || counts[v] > counts[best]) best = v;
    }
    return best;
}

void bali_say_largest(const bal_domain *domain, const uint64_t *counts, bali_phrase *phrase) {
    size_t listed = 0, in_all = 0;
    for (size_t v = 0; v < bal_domain_variables(domain); v++) in_all += counts[v] > 0;
    size_t most = in_all < MOST_COUNTS ? in_all : MOST_COUNTS;
    for (size_t v = BAL_NONE; listed < most && phrase->length < sizeof phrase->text / 2; listed++) {
        v = next_largest(domain, counts, v);
        if (listed > 0) bali_phrase_add(phrase, ", ");
        bali_phrase_count(phrase, counts[v]);
        bali_phrase_add(phrase, " in ");
        bali_phrase_text(phrase, bal_domain_name(domain, v), strlen(bal_domain_name(domain, v)));
    }
    if (listed < in_all) bali_phrase_add(phrase, " and in %zu more columns", in_all - listed);
}
