/* A table read in parts by several threads is the table read in order: the same counts, summary, facts and messages. */
#include "formats/table_source.h"

#include "ballast/tally.h"
#include "base/memory.h"
#include "base/text.h"
#include "model/cells.h"
#include "support/fixtures.h"
#include "support/harness.h"

#include <stdio.h>
#include <string.h>

enum { PART = 64 << 10, SIZE = 200 << 10 };

/* How a table of four parts is made; at each bound of a part something stands that could be taken for something else. */
typedef enum oddity {
    PLAIN,
    CRLF,
    CR,
    QUOTED_NEWLINE,  /* a line end inside quotes lies across every bound */
    LONG_CELL,       /* of many lines, longer than a part */
    BLANK_LINE,      /* between records, at a bound */
    BLANK_END,       /* a part's worth of blank lines at the end */
    UNKNOWN_LABEL,   /* in the second part and in the third */
    MISSING_CELLS,
    MISSING_LABEL,   /* NA, which is an outcome: told once */
    WEIGHTS,
    FRACTIONS,
    NOTHING_COMPLETE,
    N_ODDITIES
} oddity;

static const char *record_of(oddity odd, size_t i) {
    static const char *const plain[] = {"a,x,some text\n", "b,y,\n", "a,y,\"quoted, text\"\n", "b,x,0123456789\n"};
    static const char *const missing[] = {"a,x,t\n", ",x,t\n", "b,y,t\n", "NA,,t\n"};
    static const char *const weights[] = {"a,x,2\n", "b,y,0\n", "a,y,17\n", "b,x,1\n"};
    static const char *const fractions[] = {"a,x,0.25\n", "b,y,1.5\n", "a,y,3\n", "b,x,1e-3\n"};
    switch (odd) {
    case MISSING_CELLS: return missing[i % 4];
    case WEIGHTS: return weights[i % 4];
    case FRACTIONS: return fractions[i % 4];
    case NOTHING_COMPLETE: return ",x,t\n";
    case MISSING_LABEL: return i % 1000 == 7 ? "a,NA,t\n" : plain[i % 4];
    default: return plain[i % 4];
    }
}

static bool near_bound(size_t length) {
    size_t left = PART - length % PART;
    return left < 40;
}

static void put_record(bali_text *text, oddity odd, size_t i) {
    if (odd == QUOTED_NEWLINE && near_bound(text->length)) {
        bali_text_puts(text, "a,y,\"one\ntwo\nthree\na,x,four\nb,y,five\nsix\nseven\"\n");
    } else if (odd == LONG_CELL && i == 1000) {
        bali_text_puts(text, "b,x,\"");
        for (size_t n = 0; n < 3 * PART / 2; n++) bali_text_putc(text, n % 50 ? 'z' : '\n');
        bali_text_puts(text, "\"\n");
    } else if (odd == BLANK_LINE && near_bound(text->length) && text->length > PART) {
        bali_text_puts(text, "\n");
    } else if (odd == UNKNOWN_LABEL && near_bound(text->length)) {
        bali_text_puts(text, "a,zz,\n");
    } else {
        bali_text_puts(text, record_of(odd, i));
    }
}

static void put_line_ends(bali_text *text, const char *end) {
    bali_text out = {0};
    for (const char *p = text->bytes, *stop; *p; p = stop) {
        stop = strchr(p, '\n') + 1;
        bali_text_add(&out, p, (size_t)(stop - p) - 1);
        bali_text_puts(&out, end);
    }
    bali_text_free(text);
    *text = out;
}

static const char *write_table(oddity odd) {
    bali_text text = {0};
    bali_text_puts(&text, odd == WEIGHTS || odd == FRACTIONS ? "A,B,w\n" : "A,B,note\n");
    for (size_t i = 0; text.length < SIZE; i++) put_record(&text, odd, i);
    if (odd == CRLF) put_line_ends(&text, "\r\n");
    if (odd == CR) put_line_ends(&text, "\r");
    for (size_t n = 0; odd == BLANK_END && n < 2 * PART; n++) bali_text_putc(&text, '\n');
    ck_assert(!text.failed);
    const char *path = scratch_file("table.csv", text.bytes, text.length);
    bali_text_free(&text);
    return path;
}

static void listen(void *told, bal_severity severity, const bal_error *notice) {
    char line[4096];
    bal_error_text(notice, line, sizeof line);
    bali_text_printf(told, "%d %s\n", (int)severity, line);
}

/* What one reading came to. */
typedef struct outcome {
    bal_status status;
    bal_error error;
    bal_cells *counts;
    bal_source_summary summary;
    uint64_t missing[2];
    bal_file_facts facts;
    bali_text told;
} outcome;

static outcome read_table(const bal_network *network, const char *path, oddity odd, unsigned threads, uint64_t part_bytes) {
    outcome o = {0};
    bal_notices notices = {listen, &o.told};
    bal_table_options options = bal_table_options_defaults();
    options.notices = &notices;
    options.missing = odd == MISSING_CELLS || odd == NOTHING_COMPLETE ? BAL_MISSING_DROP : BAL_MISSING_STOP;
    if (odd == WEIGHTS || odd == FRACTIONS) options.weight = "w";
    bal_source *source = NULL;
    bool fewer = true;
    o.status = bal_table_open(bal_network_domain(network), path, &options, &source, &o.error);
    if (part_bytes) ((bali_table *)source)->part_bytes = part_bytes;
    if (o.status == BAL_OK) o.status = bal_tally_threads(network, source, threads, &fewer, &o.counts, &o.error);
    ck_assert(o.status != BAL_OK || !fewer);
    bal_source_summary_get(source, &o.summary);
    memcpy(o.missing, o.summary.missing, sizeof o.missing);
    o.summary.missing = NULL;
    o.summary.ignored = NULL;
    bal_table_facts(source, &o.facts);
    bal_source_free(source);
    return o;
}

/* Field by field: the bytes between fields are nobody's. */
static void expect_equal_summaries(const bal_source_summary *a, const bal_source_summary *b) {
    ck_assert_uint_eq(a->records, b->records);
    ck_assert_uint_eq(a->dropped, b->dropped);
    ck_assert_uint_eq(a->incomplete, b->incomplete);
    ck_assert_uint_eq(a->places, b->places);
    ck_assert_double_eq(a->weight, b->weight);
    ck_assert_int_eq(a->fractional, b->fractional);
    ck_assert_uint_eq(a->n_groups, b->n_groups);
    ck_assert_uint_eq(a->n_ignored, b->n_ignored);
}

static void expect_equal(const bal_network *network, const outcome *a, const outcome *b) {
    ck_assert_int_eq(a->status, b->status);
    ck_assert_str_eq(bali_text_string(&a->told), bali_text_string(&b->told));
    ck_assert_str_eq(a->error.message, b->error.message);
    ck_assert_uint_eq(a->error.line, b->error.line);
    ck_assert_uint_eq(a->error.record, b->error.record);
    ck_assert_int_eq(a->counts == NULL, b->counts == NULL);
    if (a->status != BAL_OK) return; /* how far the reading went by then is nobody's business */
    ck_assert_mem_eq(bali_cells_values(a->counts), bali_cells_values(b->counts), bal_network_cells(network) * sizeof(double));
    expect_equal_summaries(&a->summary, &b->summary);
    ck_assert_mem_eq(a->missing, b->missing, sizeof a->missing);
    ck_assert_uint_eq(a->facts.bytes, b->facts.bytes);
}

static void free_outcome(outcome *o) {
    bal_cells_free(o->counts);
    bali_text_free(&o->told);
}

/* Whether a reading in parts has to give up, and the table is read in order after all. */
static bool joins(oddity odd) {
    return odd != QUOTED_NEWLINE && odd != BLANK_LINE && odd != BLANK_END && odd != UNKNOWN_LABEL && odd != MISSING_LABEL &&
           odd != NOTHING_COMPLETE && odd != LONG_CELL;
}

static bool join_parts(const bal_network *network, const char *path, oddity odd) {
    bal_table_options options = bal_table_options_defaults();
    options.missing = BAL_MISSING_DROP;
    if (odd == WEIGHTS || odd == FRACTIONS) options.weight = "w";
    bal_source *source = NULL;
    bal_block block;
    ck_assert_int_eq(bal_table_open(bal_network_domain(network), path, &options, &source, NULL), BAL_OK);
    ((bali_table *)source)->part_bytes = PART;
    const bali_source_parts *parts = source->methods->parts;
    size_t n = parts->count(source);
    ck_assert_uint_ge(n, 3);
    for (size_t part = n; part-- > 0;) { /* any order will do */
        bal_source *opened = NULL;
        ck_assert_int_eq(parts->open(source, part, &opened, NULL), BAL_OK);
        bal_status status;
        do status = bal_source_next(opened, &block, NULL);
        while (status == BAL_OK && block.n_records > 0);
        if (status == BAL_OK) parts->close(source, part, opened);
        else bal_source_free(opened);
    }
    bool joined = parts->join(source);
    bal_source_free(source);
    return joined;
}

START_TEST(parts_are_the_table) {
    oddity odd = (oddity)_i;
    bal_network *network = network_of(odd == MISSING_LABEL ? "A:a,b ; B:x,y,NA | A" : "A:a,b ; B:x,y | A");
    const char *path = write_table(odd);
    outcome in_order = read_table(network, path, odd, 1, PART);
    for (unsigned threads = 2; threads <= 8; threads += 3) {
        outcome in_parts = read_table(network, path, odd, threads, PART);
        expect_equal(network, &in_parts, &in_order);
        free_outcome(&in_parts);
    }
    ck_assert_msg(join_parts(network, path, odd) == joins(odd), "oddity %d", _i);
    free_outcome(&in_order);
    bal_network_free(network);
}
END_TEST

/* Parts of their real size: what is hashed and what is not is the same too. */
START_TEST(a_large_table_is_the_same) {
    bal_network *network = network_of("A:a,b ; B:x,y | A");
    bali_text text = {0};
    bali_text_puts(&text, "A,B\n");
    while (text.length < 2 * BALI_PART_BYTES + 1000) bali_text_puts(&text, "a,x\nb,y\na,y\nb,\"x\"\nb,y\n");
    const char *path = scratch_file("large.csv", text.bytes, text.length);
    outcome in_order = read_table(network, path, PLAIN, 1, 0), in_parts = read_table(network, path, PLAIN, 2, 0);
    expect_equal(network, &in_parts, &in_order);
    ck_assert_str_eq(in_parts.facts.sha256, in_order.facts.sha256);
    ck_assert_uint_eq(in_parts.facts.bytes, text.length);
    free_outcome(&in_order);
    free_outcome(&in_parts);
    bali_text_free(&text);
    bal_network_free(network);
}
END_TEST

/* Two tables joined are read in the parts of both. */
START_TEST(joined_tables_are_read_in_parts) {
    bal_network *network = network_of("A:a,b ; B:x,y | A");
    bal_cells *counts[2];
    bal_source_summary summaries[2];
    const char *path = write_table(PLAIN);
    for (unsigned threads = 1; threads <= 2; threads++) {
        bal_table_options options = bal_table_options_defaults();
        bal_source *tables[2], *source = NULL;
        for (int i = 0; i < 2; i++) {
            ck_assert_int_eq(bal_table_open(bal_network_domain(network), path, &options, &tables[i], NULL), BAL_OK);
            ((bali_table *)tables[i])->part_bytes = PART;
        }
        ck_assert_int_eq(bal_source_join_take(tables, 2, &source, NULL), BAL_OK);
        ck_assert_uint_eq(source->methods->parts->count(source), 8);
        ck_assert_int_eq(bal_tally_threads(network, source, threads, NULL, &counts[threads - 1], NULL), BAL_OK);
        bal_source_summary_get(source, &summaries[threads - 1]);
        summaries[threads - 1].missing = NULL;
        summaries[threads - 1].ignored = NULL;
        bal_source_free(source);
    }
    ck_assert_mem_eq(bali_cells_values(counts[0]), bali_cells_values(counts[1]), bal_network_cells(network) * sizeof(double));
    expect_equal_summaries(&summaries[0], &summaries[1]);
    bal_cells_free(counts[0]);
    bal_cells_free(counts[1]);
    bal_network_free(network);
}
END_TEST

/* A file that takes the name while parts are read is another file: its records must not mix with the first one's. */
START_TEST(a_replaced_file_is_not_mixed_in) {
    bal_network *network = network_of("A:a,b ; B:x,y | A");
    bal_source *source = NULL, *part = NULL;
    bal_cells *counts = NULL, *wanted = NULL;
    char path[1024], other[1024];
    (void)snprintf(path, sizeof path, "%s", write_table(PLAIN));
    bal_table_options options = bal_table_options_defaults();
    ck_assert_int_eq(bal_table_open(bal_network_domain(network), path, &options, &source, NULL), BAL_OK);
    ck_assert_int_eq(bal_tally(network, source, &wanted, NULL), BAL_OK);
    bal_source_free(source);
    ck_assert_int_eq(bal_table_open(bal_network_domain(network), path, &options, &source, NULL), BAL_OK);
    ((bali_table *)source)->part_bytes = PART;
    ck_assert_uint_eq(source->methods->parts->count(source), 4);
    (void)snprintf(other, sizeof other, "%s", scratch_file("other.csv", "A,B,note\na,x,\n", 15));
    ck_assert_int_eq(rename(other, path), 0);
    ck_assert_int_eq(source->methods->parts->open(source, 1, &part, NULL), BAL_OK);
    ck_assert_uint_gt(((bali_table *)source)->notes[1].remarks, 0);
    bal_source_free(part);
    ck_assert_int_eq(bal_tally_threads(network, source, 2, NULL, &counts, NULL), BAL_OK);
    ck_assert_mem_eq(bali_cells_values(counts), bali_cells_values(wanted), bal_network_cells(network) * sizeof(double));
    bal_source_free(source);
    bal_cells_free(counts);
    bal_cells_free(wanted);
    bal_network_free(network);
}
END_TEST

/* Whichever allocation fails, on whichever thread: no memory, or the right counts. */
START_TEST(memory_may_run_out_anywhere) {
    bal_network *network = network_of("A:a,b ; B:x,y | A");
    char path[1024];
    (void)snprintf(path, sizeof path, "%s", write_table(PLAIN));
    outcome wanted = read_table(network, path, PLAIN, 1, PART);
    bal_table_options options = bal_table_options_defaults();
    size_t n_failed = 0, n_survived = 0;
    for (size_t n = 1; n <= 160; n++) {
        bal_source *source = NULL;
        bal_cells *counts = NULL;
        bal_error err = {0};
        bali_memory_fail_at(n);
        bal_status status = bal_table_open(bal_network_domain(network), path, &options, &source, &err);
        if (status == BAL_OK) ((bali_table *)source)->part_bytes = PART;
        if (status == BAL_OK) status = bal_tally_threads(network, source, 2, NULL, &counts, &err);
        bali_memory_fail_at(0);
        ck_assert_msg(status == BAL_OK || status == BAL_ERR_MEMORY, "allocation %zu: %d %s", n, (int)status, err.message);
        ck_assert_int_eq(status == BAL_OK, counts != NULL);
        if (counts)
            ck_assert_mem_eq(bali_cells_values(counts), bali_cells_values(wanted.counts), bal_network_cells(network) * sizeof(double));
        n_failed += status != BAL_OK;
        n_survived += status == BAL_OK;
        bal_cells_free(counts);
        bal_source_free(source);
    }
    ck_assert_uint_gt(n_failed, 50);
    ck_assert_uint_gt(n_survived, 0);
    free_outcome(&wanted);
    bal_network_free(network);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("table_parts");
    TCase *c = tcase_create("parts");
    tcase_set_timeout(c, 60);
    tcase_add_loop_test(c, parts_are_the_table, 0, N_ODDITIES);
    tcase_add_test(c, a_large_table_is_the_same);
    tcase_add_test(c, joined_tables_are_read_in_parts);
    tcase_add_test(c, a_replaced_file_is_not_mixed_in);
    tcase_add_test(c, memory_may_run_out_anywhere);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
