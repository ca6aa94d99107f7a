#include "support/fixtures.h"

#include "base/random.h"
#include "model/block.h"
#include "model/shape.h"

#include <ctype.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static void *make(size_t count, size_t size) {
    void *memory = calloc(count ? count : 1, size);
    ck_assert_ptr_nonnull(memory);
    return memory;
}

static void must(bal_status status, const bal_error *err) {
    ck_assert_msg(status == BAL_OK, "a fixture could not be made: %s", err->message);
}

/* ---- networks from text ---- */

/* A piece of text without the blanks around it. */
typedef struct piece {
    char *text;
    struct piece *next;
} piece;

typedef struct drafted_variable {
    bal_variable_spec spec;
    char *name, *parents;
    char **outcomes;
} drafted_variable;

static char *trim(char *text) {
    while (isspace((unsigned char)*text)) text++;
    size_t length = strlen(text);
    while (length > 0 && isspace((unsigned char)text[length - 1])) length--;
    text[length] = '\0';
    return text;
}

/* Cuts at the first separator; returns what is behind it, or NULL. */
static char *cut(char *text, char separator) {
    char *at = strchr(text, separator);
    if (at) *at = '\0';
    return at ? at + 1 : NULL;
}

static size_t count_pieces(const char *text, char separator) {
    size_t n = 1;
    for (; *text; text++) n += *text == separator;
    return n;
}

static void draft_outcomes(drafted_variable *v, char *text) {
    size_t n = *text == '#' ? strtoul(text + 1, NULL, 10) : count_pieces(text, ',');
    v->outcomes = make(n, sizeof *v->outcomes);
    for (size_t k = 0; k < n; k++) {
        char digits[24];
        char *rest = *text == '#' ? text : cut(text, ',');
        (void)snprintf(digits, sizeof digits, "%zu", k);
        v->outcomes[k] = strdup(*text == '#' ? digits : trim(text));
        text = rest;
    }
    v->spec = (bal_variable_spec){v->name, (const char *const *)v->outcomes, n};
}

static size_t find_drafted(const drafted_variable *variables, size_t n, const char *name) {
    for (size_t v = 0; v < n; v++)
        if (strcmp(variables[v].name, name) == 0) return v;
    ck_abort_msg("a fixture names the unknown parent %s", name);
}

static bal_family_spec draft_family(const drafted_variable *variables, size_t n, char *parents) {
    if (!parents || *trim(parents) == '\0') return (bal_family_spec){0};
    size_t n_parents = count_pieces(parents, ','), *list = make(n_parents, sizeof *list);
    for (size_t p = 0; p < n_parents; p++) {
        char *rest = cut(parents, ',');
        list[p] = find_drafted(variables, n, trim(parents));
        parents = rest;
    }
    return (bal_family_spec){list, n_parents};
}

static bal_status create(const drafted_variable *variables, const bal_family_spec *families, size_t n, size_t max_cells,
                         bal_network **out, bal_error *err) {
    bal_domain *domain = NULL;
    bal_variable_spec *specs = make(n, sizeof *specs);
    for (size_t v = 0; v < n; v++) specs[v] = variables[v].spec;
    bal_status status = bal_domain_create(specs, n, &domain, err);
    if (status == BAL_OK) status = bal_network_create(domain, families, max_cells, out, err);
    bal_domain_free(domain);
    free(specs);
    return status;
}

bal_status network_try(const char *text, size_t max_cells, bal_network **out, bal_error *err) {
    size_t n = count_pieces(text, ';');
    char *copy = strdup(text), *rest = copy;
    drafted_variable *variables = make(n, sizeof *variables);
    bal_family_spec *families = make(n, sizeof *families);
    for (size_t v = 0; v < n; v++) {
        char *name = rest;
        rest = cut(rest, ';');
        variables[v].parents = cut(name, '|');
        char *outcomes = cut(name, ':');
        variables[v].name = trim(name);
        draft_outcomes(&variables[v], trim(outcomes));
    }
    for (size_t v = 0; v < n; v++) families[v] = draft_family(variables, n, variables[v].parents);
    *out = NULL;
    bal_status status = create(variables, families, n, max_cells, out, err);
    for (size_t v = 0; v < n; v++) {
        for (size_t k = 0; k < variables[v].spec.n_outcomes; k++) free(variables[v].outcomes[k]);
        free(variables[v].outcomes);
        free((void *)families[v].parents);
    }
    free(families);
    free(variables);
    free(copy);
    return status;
}

bal_network *network_of(const char *text) {
    bal_network *network;
    bal_error err = {0};
    must(network_try(text, 0, &network, &err), &err);
    return network;
}

size_t variable_of(const bal_network *network, const char *name) {
    size_t v = bal_domain_find(bal_network_domain(network), name);
    ck_assert_msg(v != BAL_NONE, "no variable %s", name);
    return v;
}

/* ---- cells and counts ---- */

bal_cells *equal_cells(const bal_network *network, double value) {
    bal_cells *cells;
    bal_error err = {0};
    must(bal_cells_create(network, &cells, &err), &err);
    for (size_t c = 0; c < bal_network_cells(network); c++) bal_cells_edit(cells, 0)[c] = value;
    return cells;
}

bal_cells *cells_of(const bal_network *network, const double *values) {
    bal_cells *cells = equal_cells(network, 0);
    memcpy(bal_cells_edit(cells, 0), values, bal_network_cells(network) * sizeof *values);
    return cells;
}

size_t cell_of(const bal_network *network, size_t variable, const int *record) {
    size_t n_parents, outcomes[64];
    const size_t *parents = bal_network_parents(network, variable, &n_parents);
    if (n_parents > 64)
        ck_abort_msg("%zu parents are too many for a fixture", n_parents); /* an assertion each time would be slow */
    for (size_t p = 0; p < n_parents; p++) {
        if (record[parents[p]] < 0) return BAL_NONE;
        outcomes[p] = (size_t)record[parents[p]];
    }
    if (record[variable] < 0) return BAL_NONE;
    return bal_network_row(network, variable, outcomes) * bal_network_outcomes(network, variable) + (size_t)record[variable];
}

bal_cells *counts_of(const bal_network *network, const int *codes, size_t n_records) {
    size_t n = bal_network_variables(network);
    bal_cells *counts = equal_cells(network, 0);
    for (size_t i = 0; i < n_records; i++)
        for (size_t v = 0; v < n; v++) {
            size_t cell = cell_of(network, v, codes + i * n);
            if (cell != BAL_NONE) bal_cells_edit(counts, v)[cell] += 1;
        }
    return counts;
}

/* ---- records as a source ---- */

typedef struct fixture_source {
    bal_source head;
    fixture_table table;
    size_t n_variables, at, n_blocks;
    unsigned width;
    void **columns;
    double *weights;
} fixture_source;

static size_t all_blocks;

size_t fixture_blocks(void) {
    return all_blocks;
}

static void put_code(fixture_source *s, size_t v, size_t t, int code) {
    if (s->width == 1) {
        ((uint8_t *)s->columns[v])[t] = code < 0 ? UINT8_MAX : (uint8_t)code;
    } else {
        ((uint16_t *)s->columns[v])[t] = code < 0 ? UINT16_MAX : (uint16_t)code;
    }
}

static bal_status fixture_next(bal_source *source, bal_block *block, bal_error *err) {
    fixture_source *s = (fixture_source *)source;
    size_t left = s->table.n_records - s->at, n = left < s->table.block_records ? left : s->table.block_records;
    all_blocks++;
    if (++s->n_blocks == s->table.fail_at) return bal_error_set(err, BAL_ERR_IO, "cannot-read", "a fixture that cannot be read");
    for (size_t t = 0; t < n; t++) {
        for (size_t v = s->table.narrow; v < s->n_variables; v++) put_code(s, v, t, s->table.codes[(s->at + t) * s->n_variables + v]);
        s->weights[t] = s->table.weights ? s->table.weights[s->at + t] : (double)(s->at + t + 1);
    }
    *block = (bal_block){.n_records = n,
                         .n_columns = s->n_variables,
                         .width = s->width,
                         .columns = (const void *const *)s->columns,
                         .weights = s->table.weighted || s->table.weights ? s->weights : NULL,
                         .groups = s->table.groups ? s->table.groups + s->at : NULL,
                         .first_record = s->at,
                         .places = s->table.places ? s->table.places + s->at : NULL};
    s->at += n;
    return BAL_OK;
}

static bal_status fixture_rewind(bal_source *source, bal_error *err) {
    fixture_source *s = (fixture_source *)source;
    if (s->table.pipe && s->at > 0) return bal_error_set(err, BAL_ERR_IO, "cannot-reread", "a fixture that is a pipe");
    s->at = 0;
    return BAL_OK;
}

static void fixture_locate(bal_source *source, uint64_t place, bal_error *err) {
    (void)source;
    bal_error_place(err, "fixture.csv", (size_t)place + 2, 0);
    bal_error_context(err, (size_t)place + 1, NULL);
}

static void fixture_summary(const bal_source *source, bal_source_summary *out) {
    const fixture_source *s = (const fixture_source *)source;
    const fixture_table *table = &s->table;
    out->records = s->at;
    out->n_groups = table->n_groups;
    for (size_t i = 0; i < s->at; i++) {
        double weight = table->weights ? table->weights[i] : table->weighted ? (double)(i + 1) : 1;
        out->weight += weight;
        out->fractional |= weight != floor(weight);
    }
    out->places = table->all_places ? table->all_places : (uint64_t)out->weight;
}

static void fixture_free(bal_source *source) {
    fixture_source *s = (fixture_source *)source;
    for (size_t v = 0; v < s->n_variables; v++) free(s->columns[v]);
    free(s->columns);
    free(s->weights);
    free(s);
}

static const bali_source_methods fixture_methods = {fixture_next, fixture_rewind, fixture_locate, fixture_summary, fixture_free, NULL};

bal_source *source_of(const bal_domain *domain, const fixture_table *table) {
    fixture_source *s = make(1, sizeof *s);
    bali_source_init(&s->head, &fixture_methods, domain);
    s->table = *table;
    if (s->table.block_records == 0) s->table.block_records = BALI_BLOCK_RECORDS;
    s->n_variables = bal_domain_variables(domain);
    s->width = bali_code_width(domain);
    s->columns = make(s->n_variables, sizeof *s->columns);
    s->weights = make(s->table.block_records, sizeof *s->weights);
    for (size_t v = table->narrow; v < s->n_variables; v++) s->columns[v] = make(s->table.block_records, s->width);
    return &s->head;
}

bal_source *plain_source(const bal_network *network, const int *codes, size_t n_records) {
    return source_of(bal_network_domain(network), &(fixture_table){.codes = codes, .n_records = n_records});
}

/* ---- priors ---- */

bal_prior *prior_of(const bal_network *network, const bal_prior_options *options) {
    bal_prior *prior;
    bal_error err = {0};
    must(bal_prior_create(network, options, &prior, &err), &err);
    return prior;
}

bal_prior *carried_prior(const bal_cells *pseudo_counts) {
    bal_document *document = NULL;
    bal_error err = {0};
    must(bal_document_create(bal_cells_network(pseudo_counts), "fitted", &document, &err), &err);
    must(bal_document_set_cells(document, BAL_CARRIED_PSEUDO_COUNTS, pseudo_counts, &err), &err);
    bal_prior *prior = prior_of(bal_cells_network(pseudo_counts), &(bal_prior_options){.kind = BAL_PRIOR_CARRIED, .strength = 1, .carried = document});
    bal_document_free(document);
    return prior;
}

bal_prior *simple_prior(const bal_network *network, bal_prior_kind kind, double strength) {
    return prior_of(network, &(bal_prior_options){.kind = kind, .choice = BAL_STRENGTH_GIVEN, .strength = strength});
}

bal_prior *open_prior(const bal_network *network, bal_prior_kind kind, bal_strength_choice choice) {
    return prior_of(network, &(bal_prior_options){.kind = kind, .choice = choice, .strength = 1});
}

bal_prior *expert_prior(const bal_cells *tables, double row_ess, double floor, double strength) {
    const bal_network *network = bal_cells_network(tables);
    bal_document *document = NULL;
    bal_error err = {0};
    must(bal_document_create(network, "expert", &document, &err), &err);
    must(bal_document_set_cells(document, BAL_CARRIED_TABLES, tables, &err), &err);
    bal_prior_options options = {
        .kind = BAL_PRIOR_EXPERT, .strength = strength, .expert = document, .row_ess = row_ess, .floor = floor};
    bal_prior *prior = prior_of(network, &options);
    bal_document_free(document);
    return prior;
}

/* ---- random ones ---- */

dice dice_of(int seed) {
    return (dice){.seed = (uint64_t)seed};
}

size_t roll(dice *d, size_t n) {
    return (size_t)(bali_splitmix64(d->seed, d->at++) % n);
}

double chance(dice *d) {
    return bali_uniform(bali_splitmix64(d->seed, d->at++));
}

/* A random order of 0 ... n - 1. */
static void shuffle(dice *d, size_t *order, size_t n) {
    for (size_t i = 0; i < n; i++) order[i] = i;
    for (size_t i = n; i-- > 1;) {
        size_t other = roll(d, i + 1), held = order[i];
        order[i] = order[other];
        order[other] = held;
    }
}

bal_network *random_network(dice *d, size_t n, size_t least_outcomes, size_t most_outcomes, size_t most_parents) {
    size_t rank[64], pool[64];
    ck_assert_uint_le(n, 64);
    char text[16384];
    size_t at = 0;
    shuffle(d, rank, n);
    for (size_t v = 0; v < n; v++) {
        size_t outcomes = least_outcomes + roll(d, most_outcomes - least_outcomes + 1),
               n_parents = roll(d, most_parents + 1), put = 0;
        at += (size_t)snprintf(text + at, sizeof text - at, "%sV%zu:#%zu |", v ? ";" : "", v, outcomes);
        shuffle(d, pool, n);
        for (size_t i = 0; i < n && put < n_parents; i++)
            if (rank[pool[i]] < rank[v]) at += (size_t)snprintf(text + at, sizeof text - at, "%sV%zu", put++ ? "," : "", pool[i]);
    }
    return network_of(text);
}

static void put_reversed_variable(bali_text *text, const bal_network *network, size_t v) {
    const bal_domain *domain = bal_network_domain(network);
    size_t n_parents, r = bal_network_outcomes(network, v);
    const size_t *parents = bal_network_parents(network, v, &n_parents);
    bali_text_printf(text, "%s:", bal_domain_name(domain, v));
    for (size_t k = r; k-- > 0;) bali_text_printf(text, "%s%s", k + 1 < r ? "," : "", bal_domain_outcome(domain, v, k));
    for (size_t p = n_parents; p-- > 0;)
        bali_text_printf(text, "%s%s", p + 1 < n_parents ? "," : "|", bal_domain_name(domain, parents[p]));
}

bal_network *reversed_network(const bal_network *network) {
    bali_text text = {0};
    size_t n = bal_network_variables(network);
    for (size_t v = n; v-- > 0;) {
        if (v + 1 < n) bali_text_putc(&text, ';');
        put_reversed_variable(&text, network, v);
    }
    bal_network *reversed = network_of(bali_text_string(&text));
    bali_text_free(&text);
    return reversed;
}

int *reversed_codes(const bal_network *network, const int *codes, size_t n_records) {
    size_t n = bal_network_variables(network);
    int *reversed = make(n_records * n, sizeof *reversed);
    for (size_t i = 0; i < n_records; i++)
        for (size_t v = 0; v < n; v++) {
            int code = codes[i * n + v];
            reversed[i * n + (n - 1 - v)] = code < 0 ? -1 : (int)bal_network_outcomes(network, v) - 1 - code;
        }
    return reversed;
}

bal_cells *random_tables(dice *d, const bal_network *network, double zeros) {
    bal_cells *tables = equal_cells(network, 0);
    for (size_t v = 0; v < bal_network_variables(network); v++) {
        size_t r = bal_network_outcomes(network, v), rows = bal_network_rows(network, v);
        double *row = bal_cells_edit(tables, v);
        for (size_t j = 0; j < rows; j++, row += r) {
            double total = 0;
            for (size_t k = 0; k < r; k++) {
                double u = chance(d);
                row[k] = k + 1 < r && chance(d) < zeros ? 0 : u * u * u + 1e-3; /* cubes: some outcomes are rare */
                total += row[k];
            }
            for (size_t k = 0; k < r; k++) row[k] /= total;
        }
    }
    return tables;
}

int *random_codes(dice *d, const bal_cells *tables, size_t n_records, double missing) {
    const bal_network *network = bal_cells_network(tables);
    size_t n = bal_network_variables(network);
    int *codes = make(n_records * n, sizeof *codes);
    for (size_t i = 0; i < n_records; i++) {
        int *record = codes + i * n;
        for (size_t o = 0; o < n; o++) {
            size_t v = bal_network_order(network)[o], r = bal_network_outcomes(network, v);
            record[v] = 0;
            const double *row = bal_cells_family(tables, v) + cell_of(network, v, record);
            double left = chance(d);
            int last = 0;
            for (size_t k = 0; k < r; k++) {
                if (row[k] <= 0) continue;
                last = (int)k;
                left -= row[k];
                if (left < 0) break;
            }
            record[v] = last;
        }
        for (size_t v = 0; v < n; v++)
            if (chance(d) < missing) record[v] = -1;
    }
    return codes;
}
