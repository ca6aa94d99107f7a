/* ballast explain: what a message's code means. */
#include "cli/commands.h"
#include "cli/console.h"

#include "base/memory.h"
#include "base/names.h"
#include "base/text.h"

#include <string.h>

static int refuse(const char *word, bal_error *err) {
    size_t n;
    const bal_code *codes = bal_codes(&n);
    const char **names = bali_allocate(n, sizeof *names);
    if (!names) return bali_out_of_memory(err), bali_console_refuse(err);
    for (size_t i = 0; i < n; i++) names[i] = codes[i].code;
    size_t near = bali_nearest(word, strlen(word), names, n);
    (void)bal_error_set(err, BAL_ERR_ARGUMENT, "unknown-code", "there is no code \"%.80s\"; %s%s", word,
                        near == BALI_NO_NAME ? "ballast explain lists them all" : "did you mean ", near == BALI_NO_NAME ? "" : names[near]);
    bali_free(names);
    return bali_console_refuse(err);
}

static void put_one(bali_text *text, const bal_code *code) {
    const struct {
        const char *label, *words;
    } items[] = {{"cause    ", code->cause}, {"example  ", code->example}, {"mend     ", code->mend}};
    bali_text_printf(text, "%s\n\n", code->code);
    for (size_t i = 0; i < sizeof items / sizeof items[0]; i++) {
        bali_text_puts(text, items[i].label);
        bali_text_put_wrapped(text, items[i].words, strlen(items[i].label), strlen(items[i].label));
    }
}

static void put_all(bali_text *text) {
    enum { COLUMN = 22 };
    size_t n;
    const bal_code *codes = bal_codes(&n);
    for (size_t i = 0; i < n; i++) {
        size_t length = strlen(codes[i].code);
        bali_text_printf(text, "%-*s ", COLUMN - 1, codes[i].code);
        bali_text_put_wrapped(text, codes[i].cause, COLUMN, length < COLUMN ? COLUMN : length + 1);
    }
}

static int run(const bali_call *call) {
    bal_error err = {0};
    bali_text text = {0};
    if (call->n_arguments == 0) {
        put_all(&text);
    } else {
        const bal_code *code = bal_code_find(call->arguments[0]);
        if (!code) return refuse(call->arguments[0], &err);
        put_one(&text, code);
    }
    int exit = text.failed ? (bali_out_of_memory(&err), bali_console_refuse(&err)) : bali_console_print(text.bytes, text.length);
    bali_text_free(&text);
    return exit;
}

static const option_id options[] = {OPTION_HELP, N_OPTIONS};

const bali_command bali_cmd_explain = {
    "explain",
    "[CODE]",
    0,
    1,
    options,
    "Says what the code at the end of a message means, shows an example, and says what to do. Without CODE it lists all codes.",
    NULL,
    run,
};
