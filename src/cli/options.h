/* The command line: a table of options, and what a call made of them. */
#ifndef CLI_OPTIONS_H
#define CLI_OPTIONS_H

#include "base/text.h"
#include "ballast/error.h"

#include <stdbool.h>
#include <stdint.h>

/* Every option of every command. The order is that of the table in options.c, and of --help. */
typedef enum option_id {
    OPTION_OUTPUT,
    OPTION_RECORDS,
    OPTION_PRIOR,
    OPTION_ESS,
    OPTION_SCALE,
    OPTION_ROW_ESS,
    OPTION_PRIOR_FLOOR,
    OPTION_CARRY,
    OPTION_LEVEL,
    OPTION_ESTIMATE,
    OPTION_FOLDS,
    OPTION_FOLD_COLUMN,
    OPTION_HOLDOUT,
    OPTION_TEST,
    OPTION_REPEATS,
    OPTION_MISSING,
    OPTION_MISSING_LABEL,
    OPTION_UNRECORDED,
    OPTION_WEIGHT,
    OPTION_CODEBOOK,
    OPTION_DELIMITER,
    OPTION_STRICT,
    OPTION_TABLE_ORDER,
    OPTION_MAX_CELLS,
    OPTION_MEMORY,
    OPTION_REDACT,
    OPTION_JSON,
    OPTION_QUIET,
    OPTION_THREADS,
    OPTION_SEED,
    OPTION_HELP,
    N_OPTIONS
} option_id;

typedef enum option_kind {
    KIND_FLAG,
    KIND_TEXT,
    KIND_NUMBER,         /* a finite number in [least, most] */
    KIND_NUMBER_OR_WORD, /* the same, or one of words */
    KIND_WHOLE,          /* a whole number in [least, most] */
    KIND_WORD,           /* one of words */
    KIND_SIZE            /* bytes, with K, M or G behind */
} option_kind;

/** One option. Texts are static. */
typedef struct option_spec {
    const char *name;          /* without the dashes */
    char letter;               /* a short form, or 0 */
    option_kind kind;
    const char *argument;      /* how --help shows its argument; NULL for a flag */
    const char *fallback;      /* the default as --help shows it, read as if it were given; NULL = none */
    double least, most;
    bool above_least;          /* least itself is out of range */
    bool below_most;           /* most itself is out of range */
    bool repeatable;
    const char *const *words;  /* NULL-terminated */
    const char *help;
} option_spec;

/** The table, N_OPTIONS long. */
const option_spec *bali_option_table(void);

/** What an option came to. */
typedef struct option_value {
    bool given;       /* on the command line; otherwise the fallback's value stands here */
    const char *text; /* as it was written */
    double number;
    uint64_t whole;
    int word;         /* index into words, -1 = a number was given */
    const char **texts; /* a repeatable option: every text given, in order */
    size_t n_texts;
} option_value;

/** One call of a command. Texts are borrowed from the argument vector. */
typedef struct bali_call {
    option_value values[N_OPTIONS];
    const char *const *arguments; /* what is no option, in order */
    size_t n_arguments;
} bali_call;

enum { MOST_ARGUMENTS = 4096 };

/** A command of the program. */
typedef struct bali_command {
    const char *name;
    const char *usage;          /* its arguments, as --help shows them */
    size_t least_arguments, most_arguments;
    const option_id *options;   /* ended by N_OPTIONS */
    const char *summary;        /* one line */
    const char *help;           /* paragraphs behind the options */
    int (*run)(const bali_call *call); /* gives the exit status */
} bali_command;

/**
 * Reads the words behind the command's name.
 *
 * Fails: ARGUMENT with a message that names the option, its range and, for an unknown one, the nearest; MEMORY. bali_call_free
 *        in either case.
 */
BAL_MUST_CHECK bal_status bali_call_read(const bali_command *command, int n_words, char *const *words, bali_call *out, bal_error *err);
void bali_call_free(bali_call *call);

/** The command's --help page: usage, summary, options with their defaults. */
void bali_command_help(const bali_command *command, bali_text *text);
/** The line that begins with "usage:". */
void bali_command_usage(const bali_command *command, bali_text *text);

#endif
