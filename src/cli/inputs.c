#include "cli/inputs.h"
#include "cli/twice.h"

#include "base/files.h"
#include "base/memory.h"
#include "base/numbers.h"
#include "base/threads.h"

#include <string.h>
#include <sys/stat.h>

bal_missing bali_call_missing(const bali_call *call) {
    static const bal_missing kinds[] = {BAL_MISSING_STOP, BAL_MISSING_DROP, BAL_MISSING_FAMILY};
    return kinds[call->values[OPTION_MISSING].word];
}

unsigned bali_call_threads(const bali_call *call) {
    return call->values[OPTION_THREADS].given ? (unsigned)call->values[OPTION_THREADS].whole : bali_processors();
}

size_t bali_call_memory(const bali_call *call) {
    if (call->values[OPTION_MEMORY].given) return (size_t)call->values[OPTION_MEMORY].whole;
    size_t machine = bali_machine_memory();
    return machine ? machine / 4 : (size_t)1 << 30;
}

static bal_network_options network_options(const bali_call *call, const bali_inputs *inputs) {
    bal_network_options options = bal_network_options_defaults();
    options.max_cells = (size_t)call->values[OPTION_MAX_CELLS].whole;
    options.for_slowest = call->values[OPTION_TABLE_ORDER].word == 1;
    options.notices = &inputs->notices;
    return options;
}

bal_status bali_inputs_add_file(bali_inputs *inputs, const bal_file_facts *file, bal_error *err) {
    bal_file_facts *files = bali_reallocate(inputs->facts.inputs, inputs->facts.n_inputs + 1, sizeof *files);
    if (!files) return bali_out_of_memory(err);
    inputs->facts.inputs = files;
    files[inputs->facts.n_inputs++] = *file;
    return BAL_OK;
}

static bal_status read_delimiter(const option_value *value, char *delimiter, bal_error *err) {
    *delimiter = 0;
    if (!value->given) return BAL_OK;
    const char *text = strcmp(value->text, "\\t") == 0 ? "\t" : value->text;
    if (strlen(text) != 1 || strchr("\"\r\n", text[0]) || (unsigned char)text[0] >= 0x80 || ((unsigned char)text[0] < 0x20 && text[0] != '\t'))
        return bal_error_set(err, BAL_ERR_ARGUMENT, "bad-value", "\"%.80s\" is no delimiter; give one character such as ; or \\t", value->text);
    *delimiter = text[0];
    return BAL_OK;
}

/* Standard input is read once, so only one input can be it. */
static bal_status check_standard_input(const bali_call *call, bal_error *err) {
    const option_id files[] = {OPTION_TEST, OPTION_CODEBOOK};
    size_t n = 0;
    for (size_t i = 0; i < call->n_arguments; i++) n += strcmp(call->arguments[i], "-") == 0;
    for (size_t i = 0; i < sizeof files / sizeof files[0]; i++)
        n += call->values[files[i]].given && strcmp(call->values[files[i]].text, "-") == 0;
    if (n <= 1) return BAL_OK;
    return bal_error_set(err, BAL_ERR_ARGUMENT, "input-twice", "standard input can be only one of the inputs; give the others as files");
}

static bal_status mark_unrecorded(const bali_call *call, bali_inputs *inputs, bal_error *err) {
    const option_value *option = &call->values[OPTION_UNRECORDED];
    const bal_domain *domain = bal_network_domain(bal_document_network(inputs->document));
    size_t n = bal_domain_variables(domain);
    if (!option->given) return BAL_OK;
    inputs->unrecorded = bali_allocate(n, sizeof *inputs->unrecorded);
    inputs->wanted = bali_allocate(n, sizeof *inputs->wanted);
    if (!inputs->unrecorded || !inputs->wanted) return bali_out_of_memory(err);
    for (size_t v = 0; v < n; v++) inputs->wanted[v] = true;
    for (size_t i = 0; i < option->n_texts; i++) {
        size_t v = bal_domain_find(domain, option->texts[i]);
        if (v == BAL_NONE)
            return bal_error_set(err, BAL_ERR_ARGUMENT, "unknown-name", "--unrecorded %.80s names no variable of the network", option->texts[i]);
        inputs->unrecorded[v] = true;
        inputs->wanted[v] = false;
    }
    inputs->facts.unrecorded = inputs->unrecorded;
    return BAL_OK;
}

static bal_status read_codebook(const bali_call *call, bali_inputs *inputs, bal_error *err) {
    if (!call->values[OPTION_CODEBOOK].given) return BAL_OK;
    const bal_domain *domain = bal_network_domain(bal_document_network(inputs->document));
    bal_file_facts facts;
    bal_status status = bal_codebook_read(domain, call->values[OPTION_CODEBOOK].text, &inputs->notices, &inputs->codebook, &facts, err);
    return status == BAL_OK ? bali_inputs_add_file(inputs, &facts, err) : status;
}

bal_status bali_inputs_read_network(const bali_call *call, bali_console *console, bali_inputs *inputs, bal_error *err) {
    inputs->notices = (bal_notices){bali_console_tell, console};
    char delimiter;
    bal_status status = read_delimiter(&call->values[OPTION_DELIMITER], &delimiter, err); /* before any file is opened */
    if (status == BAL_OK) status = check_standard_input(call, err);
    if (status == BAL_OK) status = bali_refuse_same_files(call, err);
    if (status != BAL_OK) return status;
    bal_network_options options = network_options(call, inputs);
    bal_file_facts facts;
    status = bal_document_read(call->arguments[0], &options, &inputs->document, &facts, err);
    if (status == BAL_OK) status = bali_inputs_add_file(inputs, &facts, err);
    return status == BAL_OK ? mark_unrecorded(call, inputs, err) : status;
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

double bali_document_records(const bal_document *document) {
    const bal_cells *counts = bal_document_cells(document, BAL_CARRIED_COUNTS);
    if (!counts) return 0;
    const char *text = bal_document_property(document, BAL_OF_NETWORK, BAL_NONE, "ballast.records");
    double records;
    if (text && bali_number_read(text, strlen(text), &records) && records >= 0) return records;
    return bal_tally_records(counts);
}

static bal_status take_counts(const bal_document *from, const char *name, bali_inputs *inputs, bal_error *err) {
    const bal_cells *counts = bal_document_cells(from, BAL_CARRIED_COUNTS);
    if (!counts)
        return bal_error_set(err, BAL_ERR_ARGUMENT, "no-data", "%s carries no counts; give a table of records", name);
    bal_status status = bal_cells_copy(counts, &inputs->counts, err);
    if (status != BAL_OK) return status;
    inputs->facts.records = inputs->facts.weight = bali_document_records(from);
    return BAL_OK;
}

static bal_status read_counts(const bali_call *call, bali_inputs *inputs, bal_error *err) {
    bal_network_options options = network_options(call, inputs);
    const char *path = call->arguments[1];
    bal_file_facts facts;
    if (call->n_arguments > 2)
        return bal_error_set(err, BAL_ERR_ARGUMENT, "wrong-arguments", "%s holds counts, so it is all of the data; leave the other files out", path);
    bal_status status = bal_document_read(path, &options, &inputs->data_document, &facts, err);
    if (status == BAL_OK) status = bali_inputs_add_file(inputs, &facts, err);
    if (status != BAL_OK) return status;
    inputs->facts.first_data = inputs->facts.n_inputs - 1;
    inputs->facts.n_data = 1;
    if (!bal_network_equal(bal_document_network(inputs->data_document), bal_document_network(inputs->document)))
        return bal_error_set(err, BAL_ERR_DATA, "other-network", "%s counts for another network than %s; give counts of the same one", path,
                             call->arguments[0]);
    return take_counts(inputs->data_document, path, inputs, err);
}

bal_status bali_inputs_open_table(const bali_call *call, const bali_inputs *inputs, const char *path, bal_missing missing, bal_source **out,
                                  bal_error *err) {
    *out = NULL;
    const option_value *labels = &call->values[OPTION_MISSING_LABEL];
    bal_table_options options = bal_table_options_defaults();
    options.strict = call->values[OPTION_STRICT].given;
    options.redact = call->values[OPTION_REDACT].given;
    options.missing = missing;
    options.weight = call->values[OPTION_WEIGHT].text;
    options.fold_column = inputs->groups ? call->values[OPTION_FOLD_COLUMN].text : NULL;
    options.groups = inputs->groups;
    options.codebook = inputs->codebook;
    options.document = inputs->document;
    options.missing_labels = labels->texts;
    options.n_missing_labels = labels->n_texts;
    options.wanted = inputs->wanted;
    options.notices = &inputs->notices;
    bal_status status = read_delimiter(&call->values[OPTION_DELIMITER], &options.delimiter, err);
    if (status != BAL_OK) return status;
    return bal_table_open(bal_network_domain(bal_document_network(inputs->document)), path, &options, out, err);
}

/* Opens every table and joins them; the joined source owns them. */
static bal_status open_tables(const bali_call *call, bal_missing missing, bali_inputs *inputs, bal_source **out, bal_error *err) {
    size_t n = call->n_arguments - 1, opened = 0;
    bal_source **sources = bali_allocate(n, sizeof *sources);
    inputs->tables = bali_allocate(n, sizeof *inputs->tables);
    bal_status status = sources && inputs->tables ? BAL_OK : bali_out_of_memory(err);
    while (opened < n && status == BAL_OK) {
        status = bali_inputs_open_table(call, inputs, call->arguments[1 + opened], missing, &sources[opened], err);
        if (status == BAL_OK) inputs->tables[opened] = sources[opened];
        opened += status == BAL_OK;
    }
    if (status == BAL_OK && n == 1) {
        *out = sources[0];
    } else if (status == BAL_OK) {
        status = bal_source_join_take(sources, n, out, err);
    } else {
        for (size_t i = 0; i < opened; i++) bal_source_free(sources[i]);
    }
    inputs->n_tables = status == BAL_OK ? n : 0;
    bali_free(sources);
    return status;
}

static bal_status note_tables(bali_inputs *inputs, bool by_family, bal_error *err) {
    inputs->facts.first_data = inputs->facts.n_inputs;
    for (size_t i = 0; i < inputs->n_tables; i++) {
        bal_file_facts facts;
        bal_table_facts(inputs->tables[i], &facts);
        bal_status status = bali_inputs_add_file(inputs, &facts, err);
        if (status != BAL_OK) return status;
    }
    bal_source_summary *summary = &inputs->facts.summary;
    bal_source_summary_get(inputs->source, summary);
    inputs->facts.n_data = inputs->n_tables;
    inputs->facts.from_table = true;
    inputs->facts.by_family = by_family && summary->incomplete > 0;
    inputs->facts.fractional = summary->fractional;
    inputs->facts.weight = summary->weight;
    inputs->facts.records = summary->fractional ? (double)summary->records : summary->weight;
    return BAL_OK;
}

static bal_status read_tables(const bali_call *call, const bali_data_options *options, bali_inputs *inputs, bal_error *err) {
    bal_source *tables = NULL;
    bal_status status = BAL_OK;
    if (call->values[OPTION_FOLD_COLUMN].given) status = bal_groups_create(&inputs->groups, err);
    if (status == BAL_OK) status = open_tables(call, options->missing, inputs, &tables, err);
    if (status != BAL_OK) return status;
    status = bal_source_keep_take(tables, options->keep_records ? bali_call_memory(call) : 0, &inputs->source, err);
    if (status == BAL_OK) status = bal_tally_threads(bal_document_network(inputs->document), inputs->source, bali_call_threads(call),
                                                       &inputs->fewer_threads, &inputs->counts, err);
    if (status == BAL_OK) status = note_tables(inputs, options->missing == BAL_MISSING_FAMILY, err);
    if (status == BAL_OK) bali_warn_of_equal_tables(inputs);
    return status;
}

static void warn_of_counts(const bali_inputs *inputs, const char *name) {
    bal_error notice = {0};
    (void)bal_error_set(&notice, BAL_ERR_DATA, "counts-ignored", "the network's own counts are not used, since data are given");
    notice.status = BAL_OK;
    bal_error_place(&notice, name, 0, 0);
    inputs->notices.tell(inputs->notices.context, BAL_WARNING, &notice);
}

bal_status bali_inputs_read_data(const bali_call *call, const bali_data_options *options, bali_inputs *inputs, bal_error *err) {
    bool carried = strcmp(call->values[OPTION_PRIOR].text, "carried") == 0;
    if (call->n_arguments < 2) return take_counts(inputs->document, call->arguments[0], inputs, err);
    if (!carried && bal_document_cells(inputs->document, BAL_CARRIED_COUNTS)) warn_of_counts(inputs, call->arguments[0]);
    bal_status status = looks_like_network(call->arguments[1]) ? read_counts(call, inputs, err) : BAL_OK;
    if (status == BAL_OK && !inputs->data_document) {
        status = read_codebook(call, inputs, err);
        if (status == BAL_OK) status = read_tables(call, options, inputs, err);
    }
    return status;
}

void bali_warn_of_threads(const bali_inputs *inputs) {
    bal_error notice = {0};
    (void)bal_error_set(&notice, BAL_ERR_DATA, "fewer-threads", "the system started fewer threads than were asked for; the result is the same");
    notice.status = BAL_OK;
    inputs->notices.tell(inputs->notices.context, BAL_WARNING, &notice);
}

void bali_inputs_free(bali_inputs *inputs) {
    bal_cells_free(inputs->counts);
    bal_source_free(inputs->source);
    bali_free((void *)inputs->tables);
    bal_groups_free(inputs->groups);
    bal_codebook_free(inputs->codebook);
    bal_document_free(inputs->data_document);
    bal_document_free(inputs->document);
    bali_free(inputs->wanted);
    bali_free(inputs->unrecorded);
    bali_free(inputs->facts.inputs);
    *inputs = (bali_inputs){0};
}
