/* csv_driver DOMAIN TABLE [OPTION VALUE]...: prints the codes of a table's records, for tests in other languages.
 *
 * DOMAIN is a text file, one line a variable: its name and its outcomes with tabs between. TABLE may be "-". The options are
 * those of the program: --missing stop|drop|family, --missing-label TEXT, --delimiter CHARACTER, --weight COLUMN, --codebook FILE,
 * and the flags --strict, --redact, --allow-absent. A record is a line: its place, then a code a variable, "-" where it is missing,
 * "~" without a column, and its weight where there are weights, in units of 2^-32. What the library says goes to standard error as the program would print it, and so does the exit status. */
#include "ballast/formats.h"

#include <inttypes.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { MOST_VARIABLES = 4096, MOST_OUTCOMES = 70000, MOST_MISSING_LABELS = 16 };

static const char *outcomes[MOST_OUTCOMES];
static bal_variable_spec variables[MOST_VARIABLES];
static const char *missing_labels[16];
static const char *codebook_path;
static const bal_missing policies[] = {BAL_MISSING_STOP, BAL_MISSING_DROP, BAL_MISSING_FAMILY};

static void tell(void *context, bal_severity severity, const bal_error *notice) {
    static const char *const prefixes[] = {"note: ", "warning: ", ""};
    char text[4096];
    bal_error_text(notice, text, sizeof text);
    (void)fprintf(stderr, "%s%s\n", prefixes[severity], text);
    if (severity == BAL_PROBLEM) *(bool *)context = true;
}

static int finish(bal_status status, const bal_error *err, bool told) {
    char text[4096];
    bal_error_text(err, text, sizeof text);
    if (status != BAL_OK && !told) (void)fprintf(stderr, "%s\n", text);
    if (status == BAL_OK) return 0;
    return status == BAL_ERR_SYNTAX || status == BAL_ERR_DATA ? 1 : status == BAL_ERR_ARGUMENT ? 2 : 3;
}

static char *read_text(const char *path) {
    enum { MOST_BYTES = 1 << 22 };
    FILE *file = fopen(path, "rb");
    char *text = calloc(MOST_BYTES, 1);
    if (!file || !text || (fread(text, 1, MOST_BYTES - 1, file) == 0 && ferror(file))) {
        perror(path);
        exit(2);
    }
    (void)fclose(file);
    return text;
}

/* Cuts the text into names and outcomes. */
static size_t read_domain(char *text) {
    size_t n = 0, used = 0;
    for (char *line = text; *line && n < MOST_VARIABLES; n++) {
        char *end = strchr(line, '\n'), *tab;
        if (end) *end = '\0';
        variables[n] = (bal_variable_spec){.outcomes = outcomes + used};
        variables[n].name = line;
        while ((tab = strchr(line, '\t')) && used < MOST_OUTCOMES) {
            *tab = '\0';
            line = tab + 1;
            outcomes[used++] = line;
            variables[n].n_outcomes++;
        }
        line = end ? end + 1 : line + strlen(line);
    }
    return n;
}

static void read_options(int n, char **arguments, bal_table_options *options) {
    options->missing_labels = missing_labels;
    for (int i = 0; i < n; i++) {
        const char *name = arguments[i], *value = i + 1 < n ? arguments[i + 1] : "";
        if (strcmp(name, "--strict") == 0) options->strict = true;
        else if (strcmp(name, "--redact") == 0) options->redact = true;
        else if (strcmp(name, "--allow-absent") == 0) options->allow_absent = true;
        else if (strcmp(name, "--missing") == 0) options->missing = policies[(value[0] == 'd') + 2 * (value[0] == 'f')], i++;
        else if (strcmp(name, "--weight") == 0) options->weight = value, i++;
        else if (strcmp(name, "--codebook") == 0) codebook_path = value, i++;
        else if (strcmp(name, "--delimiter") == 0) options->delimiter = value[0] == '\\' ? '\t' : value[0], i++;
        else if (strcmp(name, "--missing-label") == 0 && options->n_missing_labels < 16) missing_labels[options->n_missing_labels++] = value, i++;
        else exit(2);
    }
}

static void print_block(const bal_block *block) {
    for (size_t t = 0; t < block->n_records; t++) {
        (void)printf("%" PRIu64, bal_block_place(block, t));
        for (size_t v = 0; v < block->n_columns; v++) {
            size_t code = block->columns[v] ? bal_block_code(block, v, t) : 0;
            if (!block->columns[v]) (void)fputs(" ~", stdout);
            else if (code == BAL_NONE) (void)fputs(" -", stdout);
            else (void)printf(" %zu", code);
        }
        if (block->weights) (void)printf(" %.0f", block->weights[t] * 0x1p32);
        (void)putchar('\n');
    }
}

static void print_summary(const bal_source *source, size_t n) {
    bal_source_summary summary;
    bal_file_facts facts;
    bal_source_summary_get(source, &summary);
    bal_table_facts(source, &facts);
    (void)printf("records %" PRIu64 " dropped %" PRIu64 " incomplete %" PRIu64 " weight %.17g missing", summary.records, summary.dropped,
                 summary.incomplete, summary.weight);
    for (size_t v = 0; v < n; v++) (void)printf(" %" PRIu64, summary.missing[v]);
    (void)printf("\n%s %" PRIu64 " %s\n", facts.name, facts.bytes, facts.sha256);
}

int main(int n_arguments, char **arguments) {
    if (n_arguments < 3) return 2;
    char *text = read_text(arguments[1]);
    size_t n = read_domain(text);
    bool told = false;
    bal_notices notices = {tell, &told};
    bal_table_options options = bal_table_options_defaults();
    read_options(n_arguments - 3, arguments + 3, &options);
    options.notices = &notices;
    bal_domain *domain = NULL;
    bal_codebook *codebook = NULL;
    bal_source *source = NULL;
    bal_error err = {0};
    bal_block block = {.n_records = 1};
    bal_status status = bal_domain_create(variables, n, &domain, &err);
    if (status == BAL_OK && codebook_path) status = bal_codebook_read(domain, codebook_path, &notices, &codebook, NULL, &err);
    options.codebook = codebook;
    if (status == BAL_OK) status = bal_table_open(domain, arguments[2], &options, &source, &err);
    while (status == BAL_OK && block.n_records > 0) {
        status = bal_source_next(source, &block, &err);
        if (status == BAL_OK) print_block(&block);
    }
    if (status == BAL_OK) print_summary(source, n);
    bal_source_free(source);
    bal_codebook_free(codebook);
    bal_domain_free(domain);
    free(text);
    return finish(status, &err, told);
}
