#include "cli/results.h"

#include "base/files.h"

#include <string.h>

/* Standard input may come from the very file that would be written. */
static bool is_input(const char *path, const char *argument) {
    return bali_same_file(path, strcmp(argument, "-") == 0 ? "/dev/stdin" : argument);
}

static bal_status check_against_inputs(const bali_call *call, const char *path, bal_error *err) {
    static const option_id files[] = {OPTION_TEST, OPTION_CODEBOOK};
    bool read = false;
    for (size_t i = 0; i < call->n_arguments; i++) read |= is_input(path, call->arguments[i]);
    for (size_t i = 0; i < sizeof files / sizeof files[0]; i++) read |= call->values[files[i]].given && is_input(path, call->values[files[i]].text);
    if (!read || bali_output_is_standard(path)) return BAL_OK;
    return bal_error_set(err, BAL_ERR_ARGUMENT, "output-is-input", "%s is read and would be written; write to another file and move it over",
                         path);
}

static bal_status open_one(const bali_call *call, option_id id, bali_output **out, bal_error *err) {
    if (!call->values[id].given) return BAL_OK;
    const char *path = call->values[id].text;
    if (path[0] == '\0')
        return bal_error_set(err, BAL_ERR_ARGUMENT, "bad-value", "--%s has no file name; give one, or - for standard output",
                             bali_option_table()[id].name);
    bal_status status = check_against_inputs(call, path, err);
    return status == BAL_OK ? bali_output_open(path, out, err) : status;
}

/* The standard output twice, or what exists already and is one file, FIFO or device under two names. */
static bool is_same(const char *a, const char *b) {
    bool standard_a = bali_output_is_standard(a), standard_b = bali_output_is_standard(b);
    return standard_a || standard_b ? standard_a && standard_b : bali_same_file(a, b);
}

static bal_status open_both(const bali_call *call, bali_results *results, bal_error *err) {
    const option_value *output = &call->values[OPTION_OUTPUT], *json = &call->values[OPTION_JSON];
    bool same = output->given && json->given && is_same(output->text, json->text);
    bal_status status = same ? BAL_OK : open_one(call, OPTION_OUTPUT, &results->output, err);
    if (status == BAL_OK && !same) status = open_one(call, OPTION_JSON, &results->json, err);
    if (status != BAL_OK) return status;
    if (!same && !(results->output && results->json && bali_output_same(results->output, results->json))) return BAL_OK;
    return bal_error_set(err, BAL_ERR_ARGUMENT, "one-output-twice", "--output and --json both name %s; give each its own file", json->text);
}

bal_status bali_results_open(const bali_call *call, bali_results *results, bal_error *err) {
    const option_value *output = &call->values[OPTION_OUTPUT], *json = &call->values[OPTION_JSON];
    bal_status status = open_both(call, results, err);
    results->page = !call->values[OPTION_QUIET].given && !(output->given && bali_output_is_standard(output->text)) &&
                    !(json->given && bali_output_is_standard(json->text));
    if (status != BAL_OK) bali_results_abandon(results);
    return status;
}

bal_status bali_results_commit(bali_results *results, bal_error *err) {
    bal_status status = BAL_OK;
    bali_output *output = results->output, *json = results->json;
    results->output = results->json = NULL;
    if (output) status = bali_output_commit(output, err);
    if (json && status == BAL_OK) {
        status = bali_output_commit(json, err);
    } else {
        bali_output_abandon(json);
    }
    return status;
}

void bali_results_abandon(bali_results *results) {
    bali_output_abandon(results->output);
    bali_output_abandon(results->json);
    results->output = results->json = NULL;
}
