/* What the program says on standard error, and how it ends. */
#ifndef CLI_CONSOLE_H
#define CLI_CONSOLE_H

#include "ballast/error.h"

#include <stdbool.h>

enum { CODES_COUNTED = 128 };

/** Where notices of one command go: at most ten of a code are shown, then a count at the end. */
typedef struct bali_console {
    bool quiet;                  /* no notes */
    const bal_code *codes[CODES_COUNTED];
    size_t told[CODES_COUNTED];  /* warnings and notes of each code */
    size_t n_codes;
    size_t problems;             /* failures told; the first of them is the command's error */
} bali_console;

/** For bal_notices.tell, with a bali_console as context. */
void bali_console_tell(void *console, bal_severity severity, const bal_error *notice);

/** Says how many notices were not shown. */
void bali_console_end(const bali_console *console);

/**
 * Prints the failure of a command, unless it was told already as a problem, and gives the exit status for its kind.
 */
int bali_console_fail(const bali_console *console, const bal_error *err);

/** Prints the failure of a command line: status 2. */
int bali_console_refuse(const bal_error *err);

/** Writes text to standard output and checks that it arrived: 0, or 3 with a message. */
int bali_console_print(const char *text, size_t length);

#endif
