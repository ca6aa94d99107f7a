#include "cli/options.h"

#include "base/memory.h"
#include "base/names.h"
#include "base/numbers.h"

#include <string.h>

static const char *const auto_words[] = {"auto", "auto-loo", NULL};
static const char *const scale_words[] = {"auto", NULL};
static const char *const prior_words[] = {"bdeu", "k2", "jeffreys", "expert", "carried", NULL};
static const char *const estimate_words[] = {"mean", "ml", NULL};
static const char *const missing_words[] = {"stop", "drop", "family", NULL};
static const char *const order_words[] = {"for-fastest", "for-slowest", NULL};

static const option_spec table[N_OPTIONS] = {
    [OPTION_OUTPUT] = {"output", 'o', KIND_TEXT, "FILE", .help = "where the result goes; - is standard output"},
    [OPTION_RECORDS] = {"records", 0, KIND_WHOLE, "N", .least = 0, .most = 1e15, .help = "how many records to draw"},
    [OPTION_PRIOR] = {"prior", 0, KIND_WORD, "KIND", "bdeu", .words = prior_words,
                      .help = "bdeu: the ESS spread evenly over a family's cells; k2: 1 a cell; jeffreys: 1/2 a cell; "
                              "expert: NETWORK's own tables, each row worth --row-ess cases; carried: the pseudo-counts of an earlier "
                              "fit, whose counts are added to the new ones"},
    [OPTION_ESS] = {"ess", 0, KIND_NUMBER_OR_WORD, "N|auto|auto-loo", "auto", .least = 1e-9, .most = 1e12, .words = auto_words,
                    .help = "equivalent sample size of bdeu, in records; auto: the one with the largest log marginal "
                            "likelihood, auto-loo: with the largest leave-one-out log-likelihood"},
    [OPTION_SCALE] = {"scale", 0, KIND_NUMBER_OR_WORD, "T|auto", "1", .least = 1e-9, .most = 1e12, .words = scale_words, .help = "multiplies every pseudo-count of k2, jeffreys and expert"},
    [OPTION_ROW_ESS] = {"row-ess", 0, KIND_NUMBER, "N", .least = 1e-9, .most = 1e12,
                        .help = "how many cases each of the expert's rows is worth (default: each row's ballast.row-ess)"},
    [OPTION_PRIOR_FLOOR] = {"prior-floor", 0, KIND_NUMBER, "P", "0", .least = 0, .most = 1, .below_most = true,
                            .help = "share of the uniform row mixed into each of the expert's rows, so that no outcome is "
                                    "impossible"},
    [OPTION_CARRY] = {"carry", 0, KIND_NUMBER, "W", "1", .least = 0, .most = 1,
                      .help = "carried: multiplies the old counts by W first, so that old records weigh less than new ones"},
    [OPTION_LEVEL] = {"level", 0, KIND_NUMBER, "P", "0.95", .least = 0, .most = 1, .above_least = true, .below_most = true,
                      .help = "level of the credible intervals"},
    [OPTION_ESTIMATE] = {"estimate", 0, KIND_WORD, "mean|ml", "mean", .words = estimate_words,
                         .help = "which tables are written: posterior means, or raw frequencies (rows without records uniform)"},
    [OPTION_FOLDS] = {"folds", 0, KIND_WHOLE, "K", "10", .least = 0, .most = 65535,
                      .help = "hold the records out in K parts, each predicted by a fit to the others; 0: do not"},
    [OPTION_FOLD_COLUMN] = {"fold-column", 0, KIND_TEXT, "COLUMN",
                            .help = "hold out one label of this column at a time (a patient, a site, a period), so that none is on both "
                                    "sides; in place of --folds"},
    [OPTION_HOLDOUT] = {"holdout", 0, KIND_NUMBER, "F", .least = 0, .most = 1, .above_least = true, .below_most = true,
                        .help = "hold out this share of the records, at random; in place of --folds"},
    [OPTION_TEST] = {"test", 0, KIND_TEXT, "TABLE", .help = "hold this table out: the fit is to DATA alone; in place of --folds"},
    [OPTION_REPEATS] = {"repeats", 0, KIND_WHOLE, "R", "1", .least = 1, .most = 1000,
                        .help = "hold out anew R times, with other random parts; totals are means, standard errors those of the records' "
                                "means"},
    [OPTION_MISSING] = {"missing", 0, KIND_WORD, "stop|drop|family", "stop", .words = missing_words,
                        .help = "what a missing cell does: refuse the table, leave the record out, or count the record in every family "
                                "it is complete for. Leaving records out biases the tables when whether a test was done depended on "
                                "another observation; counting by family mixes different sets of records; \"not done\" is often best an "
                                "outcome of its own, which --codebook can give to the empty cell"},
    [OPTION_MISSING_LABEL] = {"missing-label", 0, KIND_TEXT, "TEXT", .repeatable = true,
                              .help = "one more spelling of a missing cell, besides the empty cell and NA; may be repeated"},
    [OPTION_UNRECORDED] = {"unrecorded", 0, KIND_TEXT, "VARIABLE", .repeatable = true,
                           .help = "nobody recorded this variable: every family that touches it keeps its prior; may be repeated"},
    [OPTION_WEIGHT] = {"weight", 0, KIND_TEXT, "COLUMN",
                       .help = "a column of case weights; a whole weight w means w equal records"},
    [OPTION_CODEBOOK] = {"codebook", 0, KIND_TEXT, "FILE",
                         .help = "a CSV with the columns variable,outcome,code: how the table spells the outcomes"},
    [OPTION_DELIMITER] = {"delimiter", 0, KIND_TEXT, "CHARACTER", .help = "what stands between cells (default: a comma; a tab for .tsv "
                                                                          "files and headers with a tab)"},
    [OPTION_STRICT] = {"strict", 0, KIND_FLAG, .help = "refuse columns that are no variable, instead of naming them"},
    [OPTION_TABLE_ORDER] = {"table-order", 0, KIND_WORD, "for-fastest|for-slowest", "for-fastest", .words = order_words,
                            .help = "how the numbers of a TABLE run: the variable's own outcomes fastest (the format's rule) or slowest"},
    [OPTION_MAX_CELLS] = {"max-cells", 0, KIND_WHOLE, "N", "4194304", .least = 1, .most = 268435456,
                          .help = "refuse networks with more table cells than this"},
    [OPTION_MEMORY] = {"memory", 0, KIND_SIZE, "SIZE", .least = 0, .most = 1e15,
                       .help = "keep up to this many bytes of coded records (K, M and G are understood; default: a quarter of the "
                               "machine's memory); beyond, the table is read again"},
    [OPTION_REDACT] = {"redact", 0, KIND_FLAG, .help = "show no cell's text in messages"},
    [OPTION_JSON] = {"json", 0, KIND_TEXT, "FILE", .help = "write the numbers as JSON; - is standard output, then the text goes nowhere"},
    [OPTION_QUIET] = {"quiet", 0, KIND_FLAG, .help = "no page, no notes, no progress; warnings and errors are still shown"},
    [OPTION_THREADS] = {"threads", 0, KIND_WHOLE, "N", .least = 1, .most = 1024,
                        .help = "threads to use (default: all cores); changes no number"},
    [OPTION_SEED] = {"seed", 0, KIND_WHOLE, "N", "1", .least = 0, .most = 18446744073709551615.0,
                     .help = "seed of everything random: the same seed gives the same result"},
    [OPTION_HELP] = {"help", 'h', KIND_FLAG, .help = "this page"},
};

const option_spec *bali_option_table(void) {
    return table;
}

static int find_word(const char *const *words, const char *text) {
    for (int i = 0; words && words[i]; i++)
        if (strcmp(words[i], text) == 0) return i;
    return -1;
}

static void put_words(bali_text *text, const char *const *words) {
    for (size_t i = 0; words && words[i]; i++) {
        if (i > 0) bali_text_puts(text, words[i + 1] ? ", " : " or ");
        bali_text_puts(text, words[i]);
    }
}

/* "a number above 0 and below 1", "a whole number from 0 up to 65535". */
static void put_range(bali_text *text, const option_spec *spec) {
    if (spec->kind == KIND_WORD) {
        put_words(text, spec->words);
        return;
    }
    bali_text_puts(text, spec->kind == KIND_WHOLE ? "a whole number" : spec->kind == KIND_SIZE ? "bytes, such as 512M or 4G," : "a number");
    bali_text_puts(text, spec->above_least ? " above " : " from ");
    bali_text_put_number(text, spec->least);
    bali_text_puts(text, spec->below_most ? spec->above_least ? " and below " : " to below " : " up to ");
    if (spec->most >= 0x1p64) {
        bali_text_puts(text, "18446744073709551615"); /* 2^64 - 1, which a double does not hold */
    } else if (spec->kind == KIND_NUMBER || spec->kind == KIND_NUMBER_OR_WORD) {
        bali_text_put_number(text, spec->most);
    } else {
        bali_text_printf(text, "%.0f", spec->most);
    }
    if (spec->words) {
        bali_text_puts(text, ", or ");
        put_words(text, spec->words);
    }
}

static bal_status refuse_value(const option_spec *spec, const char *value, bal_error *err) {
    bali_text range = {0};
    put_range(&range, spec);
    bal_status status = bal_error_set(err, BAL_ERR_ARGUMENT, "bad-value", "\"%.80s\" is no value of --%s; give %s", value, spec->name,
                                      bali_text_string(&range));
    bali_text_free(&range);
    return status;
}

static bool in_range(const option_spec *spec, double number) {
    if (spec->above_least ? number <= spec->least : number < spec->least) return false;
    return spec->below_most ? number < spec->most : number <= spec->most;
}

/* "512M" -> 512 x 2^20. */
static bool read_size(const char *text, uint64_t *bytes) {
    size_t length = strlen(text);
    unsigned shift = 0;
    if (length > 0) {
        char unit = text[length - 1];
        shift = unit == 'K' ? 10 : unit == 'M' ? 20 : unit == 'G' ? 30 : 0;
    }
    if (!bali_whole_read(text, length - (shift > 0), bytes)) return false;
    if (*bytes > UINT64_MAX >> shift) return false;
    *bytes <<= shift;
    return true;
}

static bool read_value(const option_spec *spec, const char *text, option_value *value) {
    value->text = text;
    value->word = find_word(spec->words, text);
    switch (spec->kind) {
    case KIND_FLAG:
    case KIND_TEXT: return true;
    case KIND_WORD: return value->word >= 0;
    case KIND_WHOLE:
        if (!bali_whole_read(text, strlen(text), &value->whole)) return false;
        value->number = (double)value->whole;
        return in_range(spec, value->number);
    case KIND_SIZE:
        if (!read_size(text, &value->whole)) return false;
        return in_range(spec, (double)value->whole);
    case KIND_NUMBER_OR_WORD:
        if (value->word >= 0) return true;
        return bali_number_read(text, strlen(text), &value->number) && in_range(spec, value->number);
    case KIND_NUMBER: return bali_number_read(text, strlen(text), &value->number) && in_range(spec, value->number);
    }
    return false;
}

static bool has_option(const bali_command *command, option_id id) {
    for (const option_id *o = command->options; *o != N_OPTIONS; o++)
        if (*o == id) return true;
    return false;
}

/* The option of that name among the command's own; N_OPTIONS when it has none. */
static option_id find_long(const bali_command *command, const char *name, size_t length) {
    for (option_id id = 0; id < N_OPTIONS; id++)
        if (strlen(table[id].name) == length && memcmp(table[id].name, name, length) == 0 && has_option(command, id)) return id;
    return N_OPTIONS;
}

static option_id find_short(const bali_command *command, char letter) {
    for (option_id id = 0; id < N_OPTIONS; id++)
        if (table[id].letter != 0 && table[id].letter == letter && has_option(command, id)) return id;
    return N_OPTIONS;
}

static bal_status refuse_option(const bali_command *command, const char *word, size_t length, bal_error *err) {
    const char *names[N_OPTIONS];
    size_t n = 0;
    for (const option_id *o = command->options; *o != N_OPTIONS; o++) names[n++] = table[*o].name;
    size_t name_length = length > 2 && word[0] == '-' && word[1] == '-' ? length - 2 : 0;
    size_t near = name_length > 0 ? bali_nearest(word + 2, name_length, names, n) : BALI_NO_NAME;
    if (near != BALI_NO_NAME)
        return bal_error_set(err, BAL_ERR_ARGUMENT, "unknown-option", "ballast %s has no option %.*s; did you mean --%s?", command->name,
                             (int)length, word, names[near]);
    return bal_error_set(err, BAL_ERR_ARGUMENT, "unknown-option", "ballast %s has no option %.*s; see ballast %s --help", command->name,
                         (int)length, word, command->name);
}

static bal_status set_option(bali_call *c, option_id id, const char *text, bal_error *err) {
    const option_spec *spec = &table[id];
    option_value *value = &c->values[id];
    if (value->given && !spec->repeatable)
        return bal_error_set(err, BAL_ERR_ARGUMENT, "option-twice", "--%s stands twice; give it once", spec->name);
    if (!read_value(spec, text, value)) return refuse_value(spec, text, err);
    value->given = true;
    if (spec->repeatable) value->texts[value->n_texts++] = text;
    return BAL_OK;
}

/* Reads one word that begins with a dash, and the word behind it where the option has an argument. */
static bal_status read_option(const bali_command *command, int n_words, char *const *words, int *at, bali_call *c, bal_error *err) {
    const char *word = words[*at], *value = NULL;
    option_id id;
    size_t length = strlen(word);
    if (word[1] == '-') {
        const char *equals = strchr(word, '=');
        if (equals) {
            value = equals + 1;
            length = (size_t)(equals - word);
        }
        id = find_long(command, word + 2, length - 2);
    } else {
        id = find_short(command, word[1]);
        if (id != N_OPTIONS && word[2] != '\0') value = word + 2;
    }
    if (id == N_OPTIONS) return refuse_option(command, word, length, err);
    if (table[id].kind == KIND_FLAG) {
        if (value) return bal_error_set(err, BAL_ERR_ARGUMENT, "bad-value", "--%s takes no value; leave \"%.80s\" out", table[id].name, value);
        return set_option(c, id, "", err);
    }
    if (!value) {
        if (*at + 1 >= n_words)
            return bal_error_set(err, BAL_ERR_ARGUMENT, "no-value", "--%s needs a value: --%s %s", table[id].name, table[id].name,
                                 table[id].argument);
        value = words[++*at];
    }
    return set_option(c, id, value, err);
}

static bal_status check_arguments(const bali_command *command, const bali_call *c, bal_error *err) {
    if (c->values[OPTION_HELP].given || (c->n_arguments >= command->least_arguments && c->n_arguments <= command->most_arguments))
        return BAL_OK;
    bali_text usage = {0};
    bali_command_usage(command, &usage);
    bal_status status = bal_error_set(err, BAL_ERR_ARGUMENT, "wrong-arguments", "%s; %s",
                                      c->n_arguments < command->least_arguments ? "something is missing" : "there is one argument too many",
                                      bali_text_string(&usage));
    bali_text_free(&usage);
    return status;
}

static bal_status set_fallbacks(bali_call *c, size_t n_words, bal_error *err) {
    for (option_id id = 0; id < N_OPTIONS; id++) {
        c->values[id].word = -1;
        if (table[id].repeatable && !(c->values[id].texts = bali_allocate(n_words, sizeof *c->values[id].texts)))
            return bali_out_of_memory(err);
        if (table[id].fallback && !read_value(&table[id], table[id].fallback, &c->values[id]))
            return bal_error_set(err, BAL_ERR_ARGUMENT, "bad-value", "the default of --%s is out of range", table[id].name);
    }
    return BAL_OK;
}

bal_status bali_call_read(const bali_command *command, int n_words, char *const *words, bali_call *c, bal_error *err) {
    *c = (bali_call){0};
    const char **arguments = bali_allocate((size_t)n_words + 1, sizeof *arguments);
    c->arguments = arguments;
    if (!c->arguments) return bali_out_of_memory(err);
    bal_status status = set_fallbacks(c, (size_t)n_words, err);
    bool options = true;
    for (int i = 0; i < n_words && status == BAL_OK; i++) {
        if (options && strcmp(words[i], "--") == 0) {
            options = false;
        } else if (options && words[i][0] == '-' && words[i][1] != '\0') {
            status = read_option(command, n_words, words, &i, c, err);
        } else {
            arguments[c->n_arguments++] = words[i];
        }
    }
    return status == BAL_OK ? check_arguments(command, c, err) : status;
}

void bali_call_free(bali_call *c) {
    bali_free((void *)c->arguments);
    for (option_id id = 0; id < N_OPTIONS; id++) bali_free(c->values[id].texts);
    *c = (bali_call){0};
}

void bali_command_usage(const bali_command *command, bali_text *text) {
    bali_text_printf(text, "usage: ballast %s %s", command->name, command->usage);
}

static void put_option(bali_text *text, const option_spec *spec) {
    bali_text line = {0};
    bali_text_puts(&line, "  ");
    if (spec->letter) bali_text_printf(&line, "-%c, ", spec->letter);
    bali_text_printf(&line, "--%s", spec->name);
    if (spec->argument) bali_text_printf(&line, " %s", spec->argument);
    bali_text_puts(text, bali_text_string(&line));
    bali_text_puts(text, "\n      ");
    bali_text_clear(&line);
    bali_text_puts(&line, spec->help);
    if (spec->fallback) bali_text_printf(&line, " (default: %s)", spec->fallback);
    bali_text_put_wrapped(text, bali_text_string(&line), 6, 6);
    bali_text_free(&line);
}

void bali_command_help(const bali_command *command, bali_text *text) {
    bali_command_usage(command, text);
    bali_text_puts(text, "\n\n");
    bali_text_put_wrapped(text, command->summary, 0, 0);
    if (command->help) {
        bali_text_putc(text, '\n');
        bali_text_put_wrapped(text, command->help, 0, 0);
    }
    bali_text_puts(text, "\nOptions:\n");
    for (const option_id *o = command->options; *o != N_OPTIONS; o++) put_option(text, &table[*o]);
}
