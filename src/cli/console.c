#include "cli/console.h"

#include "base/output.h"

#include <stdio.h>
#include <string.h>

enum { SHOWN_OF_A_KIND = 10 };

static void print(const char *prefix, const bal_error *err) {
    char text[4096];
    bal_error_text(err, text, sizeof text);
    (void)fprintf(stderr, "%s%s\n", prefix, text);
}

/* How many notices of this code came before; counts this one. */
static size_t count_notice(bali_console *console, const char *word) {
    const bal_code *code = word ? bal_code_find(word) : NULL;
    size_t i = 0;
    while (i < console->n_codes && console->codes[i] != code) i++;
    if (i == CODES_COUNTED) return 0;
    if (i == console->n_codes) console->codes[console->n_codes++] = code;
    return console->told[i]++;
}

void bali_console_tell(void *context, bal_severity severity, const bal_error *notice) {
    bali_console *console = context;
    if (severity == BAL_PROBLEM) {
        console->problems++;
        print("", notice);
    } else if (severity != BAL_NOTE || !console->quiet) {
        if (count_notice(console, notice->code) < SHOWN_OF_A_KIND) print(severity == BAL_NOTE ? "note: " : "warning: ", notice);
    }
}

void bali_console_end(const bali_console *console) {
    for (size_t i = 0; i < console->n_codes; i++) {
        if (console->told[i] <= SHOWN_OF_A_KIND || !console->codes[i]) continue;
        (void)fprintf(stderr, "and %zu more of [%s]\n", console->told[i] - SHOWN_OF_A_KIND, console->codes[i]->code);
    }
}

static int exit_status(const bal_error *err) {
    switch (err->status) {
    case BAL_OK: return 0;
    case BAL_ERR_SYNTAX:
    case BAL_ERR_DATA: return 1;
    case BAL_ERR_ARGUMENT: return 2;
    case BAL_ERR_MEMORY:
    case BAL_ERR_IO:
    case BAL_ERR_NUMERIC:
    case BAL_ERR_INTERRUPTED: return 3;
    }
    return 3;
}

int bali_console_fail(const bali_console *console, const bal_error *err) {
    bool told = console->problems > 0 && (err->status == BAL_ERR_DATA || err->status == BAL_ERR_SYNTAX);
    if (!told) print("", err);
    return exit_status(err);
}

int bali_console_refuse(const bal_error *err) {
    print("", err);
    return exit_status(err);
}

int bali_console_print(const char *text, size_t length) {
    bal_error err = {0};
    if (bali_output_write_whole("-", text, length, &err) == BAL_OK) return 0;
    print("", &err);
    return exit_status(&err);
}
