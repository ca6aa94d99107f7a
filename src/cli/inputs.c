#include "cli/inputs.h"

#include "base/files.h"
#include "base/memory.h"
#include "base/threads.h"

#include <string.h>
#include <sys/stat.h>

unsigned bali_call_threads(const bali_call *call) {
    return call->values[OPTION_THREADS].given ? (unsigned)call->values[OPTION_THREADS].whole : bali_processors();
}

static bal_network_options network_options(const bali_call *call, const bali_inputs *inputs) {
    bal_network_options options = bal_network_options_defaults();
    options.max_cells = (size_t)call->values[OPTION_MAX_CELLS].whole;
    options.for_slowest = call->values[OPTION_TABLE_ORDER].word == 1;
    options.notices = &inputs->notices;
    return options;
}

static bal_status check_delimiter(const option_value *value, char *delimiter, bal_error *err) {
    *delimiter = 0;
    if (!value->given) return BAL_OK;
    const char *text = strcmp(value->text, "\\t") == 0 ? "\t" : value->text;
    if (strlen(text) != 1 || strchr("\"\r\n", text[0]) || (unsigned char)text[0] >= 0x80 || ((unsigned char)text[0] < 0x20 && text[0] != '\t'))
        return bal_error_set(err, BAL_ERR_ARGUMENT, "bad-value", "\"%.80s\" is no delimiter; give one character such as ; or \\t", value->text);
    *delimiter = text[0];
    return BAL_OK;
}

bal_status bali_inputs_read_network(const bali_call *call, bali_console *console, bali_inputs *inputs, bal_error *err) {
    inputs->notices = (bal_notices){bali_console_tell, console};
    if (call->n_arguments > 1 && strcmp(call->arguments[0], "-") == 0 && strcmp(call->arguments[1], "-") == 0)
        return bal_error_set(err, BAL_ERR_ARGUMENT, "input-twice", "standard input cannot be both network and table; give one of them as a file");
    bal_status status = check_delimiter(&call->values[OPTION_DELIMITER], &inputs->delimiter, err);
    if (status != BAL_OK) return status;
    bal_network_options options = network_options(call, inputs);
    status = bal_document_read(call->arguments[0], &options, &inputs->document, &inputs->facts.inputs[0], err);
    if (status == BAL_OK) inputs->facts.n_inputs = 1;
    return status;
}

/* Whether bytes begin as a network file does. A table may begin with < too: "<65 years" is a fine name for a column. */
static bool begins_as_network(const char *bytes) {
    static const char *const beginnings[] = {"<?xml", "<!DOCTYPE", "<!--", "<BIF"};
    if (strncmp(bytes, "\xEF\xBB\xBF", 3) == 0) bytes += 3;
    bytes += strspn(bytes, " \t\r\n");
    for (size_t i = 0; i < sizeof beginnings / sizeof beginnings[0]; i++)
        if (strncmp(bytes, beginnings[i], strlen(beginnings[i])) == 0) return true;
    return false;
}

/* Whether a file looks like a network. Looking never fails: what cannot be looked at is taken for a table. A FIFO is not even
 * opened: its writer would lose its reader. */
static bool looks_like_network(const char *path) {
    bali_input *input = NULL;
    char head[64] = "";
    size_t length;
    struct stat found;
    if (strcmp(path, "-") == 0 || stat(path, &found) != 0 || !S_ISREG(found.st_mode)) return false;
    if (bali_input_open(path, &input, NULL) != BAL_OK) return false;
    bool read = bali_input_read(input, head, sizeof head - 1, &length, NULL) == BAL_OK;
    bali_input_close(input);
    return read && begins_as_network(head);
}

static bal_status take_counts(const bal_document *from, const char *name, bali_inputs *inputs, bal_error *err) {
    const bal_cells *counts = bal_document_cells(from, BAL_CARRIED_COUNTS);
    if (!counts)
        return bal_error_set(err, BAL_ERR_ARGUMENT, "no-data", "%s carries no counts; give a table of records", name);
    bal_status status = bal_cells_copy(counts, &inputs->counts, err);
    if (status == BAL_OK) inputs->facts.records = bal_tally_records(inputs->counts);
    return status;
}

static bal_status read_counts(const bali_call *call, bali_inputs *inputs, bal_error *err) {
    bal_network_options options = network_options(call, inputs);
    const char *path = call->arguments[1];
    bal_status status = bal_document_read(path, &options, &inputs->data_document, &inputs->facts.inputs[1], err);
    if (status != BAL_OK) return status;
    inputs->facts.n_inputs = 2;
    if (!bal_network_equal(bal_document_network(inputs->data_document), bal_document_network(inputs->document)))
        return bal_error_set(err, BAL_ERR_DATA, "other-network", "%s counts for another network than %s; give counts of the same one", path,
                             call->arguments[0]);
    return take_counts(inputs->data_document, path, inputs, err);
}

static size_t memory_limit(const bali_call *call) {
    if (call->values[OPTION_MEMORY].given) return (size_t)call->values[OPTION_MEMORY].whole;
    size_t machine = bali_machine_memory();
    return machine ? machine / 4 : (size_t)1 << 30;
}

static bal_status read_table(const bali_call *call, bal_missing missing, bali_inputs *inputs, bal_error *err) {
    bal_table_options options = bal_table_options_defaults();
    options.strict = call->values[OPTION_STRICT].given;
    options.redact = call->values[OPTION_REDACT].given;
    options.delimiter = inputs->delimiter;
    options.missing = missing;
    options.missing_labels = call->missing_labels;
    options.n_missing_labels = call->n_missing_labels;
    options.notices = &inputs->notices;
    const bal_network *network = bal_document_network(inputs->document);
    bal_source *table = NULL;
    bal_status status = bal_table_open(bal_network_domain(network), call->arguments[1], &options, &table, err);
    if (status != BAL_OK) return status;
    inputs->table = table;
    status = bal_source_keep_take(table, memory_limit(call), &inputs->source, err);
    if (status == BAL_OK) status = bal_tally(network, inputs->source, &inputs->counts, err);
    if (status != BAL_OK) return status;
    bal_table_facts(inputs->table, &inputs->facts.inputs[1]);
    bal_source_summary_get(inputs->source, &inputs->facts.summary);
    inputs->facts.n_inputs = 2;
    inputs->facts.from_table = true;
    inputs->facts.records = (double)inputs->facts.summary.records;
    return BAL_OK;
}

static void warn_of_counts(const bali_inputs *inputs, const char *name) {
    bal_error notice = {0};
    (void)bal_error_set(&notice, BAL_ERR_DATA, "counts-ignored", "the network's own counts are not used, since a table is given");
    notice.status = BAL_OK;
    bal_error_place(&notice, name, 0, 0);
    inputs->notices.tell(inputs->notices.context, BAL_WARNING, &notice);
}

bal_status bali_inputs_read_data(const bali_call *call, bal_missing missing, bali_inputs *inputs, bal_error *err) {
    if (call->n_arguments < 2) return take_counts(inputs->document, call->arguments[0], inputs, err);
    if (bal_document_cells(inputs->document, BAL_CARRIED_COUNTS)) warn_of_counts(inputs, call->arguments[0]);
    return looks_like_network(call->arguments[1]) ? read_counts(call, inputs, err) : read_table(call, missing, inputs, err);
}

void bali_inputs_free(bali_inputs *inputs) {
    bal_cells_free(inputs->counts);
    bal_source_free(inputs->source);
    bal_document_free(inputs->data_document);
    bal_document_free(inputs->document);
    *inputs = (bali_inputs){0};
}
