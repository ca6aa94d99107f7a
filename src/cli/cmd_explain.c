/* ballast explain: what a message's code means. */
#include "cli/commands.h"
#include "cli/console.h"
#include "cli/results.h"

#include "base/memory.h"
#include "base/names.h"
#include "base/text.h"
#include "report/facts.h"

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

static void put_json(bali_json *json, const bal_code *codes, size_t n) {
    bali_json_object(json, NULL);
    bali_json_ballast(json, "explain");
    bali_json_array(json, "codes");
    for (size_t i = 0; i < n; i++) {
        bali_json_object(json, NULL);
        bali_json_string(json, "code", codes[i].code);
        bali_json_string(json, "cause", codes[i].cause);
        bali_json_string(json, "example", codes[i].example);
        bali_json_string(json, "mend", codes[i].mend);
        bali_json_end_object(json);
    }
    bali_json_end_array(json);
    bali_json_end_object(json);
}

static bal_status write_json(bali_results *results, const bal_code *codes, size_t n, bal_error *err) {
    if (!results->json) return BAL_OK;
    bali_json json = {0};
    put_json(&json, codes, n);
    bal_status status = json.text.failed ? bali_out_of_memory(err) : bali_output_write(results->json, json.text.bytes, json.text.length, err);
    bali_json_free(&json);
    return status == BAL_OK ? bali_results_commit(results, err) : status;
}

static int run(const bali_call *call) {
    bal_error err = {0};
    bali_text text = {0};
    bali_results results = {0};
    size_t n = 1;
    const bal_code *codes = call->n_arguments == 0 ? bal_codes(&n) : bal_code_find(call->arguments[0]);
    if (!codes) return refuse(call->arguments[0], &err);
    bal_status status = bali_results_open(call, &results, &err);
    if (status == BAL_OK) status = write_json(&results, codes, n, &err);
    if (status == BAL_OK && results.page) {
        if (call->n_arguments == 0) put_all(&text);
        else put_one(&text, codes);
        if (text.failed) status = bali_out_of_memory(&err);
    }
    bali_results_abandon(&results);
    int exit = status == BAL_OK ? bali_console_print(bali_text_string(&text), text.length) : bali_console_refuse(&err);
    bali_text_free(&text);
    return exit;
}

static const option_id options[] = {OPTION_JSON, OPTION_QUIET, OPTION_THREADS, OPTION_SEED, OPTION_HELP, N_OPTIONS};

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
