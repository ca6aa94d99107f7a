/* Tables with weights, folds, codes, numbers that are cut, and missing cells that are given. */
#include "formats/table_columns.h"

#include "base/numbers.h"
#include "support/document_texts.h"

#include <inttypes.h>
#include <string.h>
#include <zlib.h>

#define NETWORK                                                                                                                              \
    "<BIF VERSION='0.3'><NETWORK>"                                                                                                           \
    "<VARIABLE><NAME>smoker</NAME><OUTCOME>no</OUTCOME><OUTCOME>yes</OUTCOME></VARIABLE>"                                                     \
    "<VARIABLE><NAME>fever</NAME><OUTCOME>low</OUTCOME><OUTCOME>mid</OUTCOME><OUTCOME>high</OUTCOME>"                                          \
    "<PROPERTY>ballast.column = temp</PROPERTY><PROPERTY>ballast.cuts = 37.5 38.5</PROPERTY></VARIABLE>"                                     \
    "</NETWORK></BIF>"

enum { STOP = 0, DROP = 1, FAMILY = 2, WEIGHT = 4, FOLD = 8, CODES = 16, ONLY_SMOKER = 32, STRICT = 64, REDACT = 128, PLAIN = 256 };

typedef struct table_case {
    unsigned how;
    const char *text;
    const char *expected; /* a record a line: place, codes, *weight @group; what is told; the summary */
} table_case;

#define CODEBOOK "variable,outcome,code\nsmoker,yes,J\nsmoker,yes,1\nsmoker,no,\nfever,high,<HI>\n"

static const table_case cases[] = {
    /* Columns by ballast.column, and numbers that are cut. */
    {STOP, "smoker,temp\nno,37.4\nyes,37.5\nno,38.4999\nno,38.5\nno,-1e9\nno,1e300\n",
     "0: 0 0\n1: 1 1\n2: 0 1\n3: 0 2\n4: 0 0\n5: 0 2\n= 6 -0 ~0 places 6 weight 6\n"},
    {STOP, "fever,smoker\n36,no\n", "0: 0 0\n= 1 -0 ~0 places 1 weight 1\n"},
    {STOP, "fever,smoker,temp\n36,no,40\n",
     "warning t.csv:1: 1 column is not a variable and is ignored: fever [ignored-columns]\n0: 0 2\n= 1 -0 ~0 places 1 weight 1\n"},
    {STOP | STRICT, "fever,smoker,temp\n36,no,40\n",
     "t.csv:1: column 1, \"fever\", is not used: ballast.column takes the variable from another one; remove it, or leave out --strict "
     "[unexpected-column]\n"},
    {STOP, "smoker,tmp\nno,37\n", "t.csv:1: fever has no column \"temp\"; did you mean column 2, \"tmp\"? [missing-column]\n"},
    {STOP, "smoker,temp\nno,low\n",
     "t.csv:2:4: \"low\" is not a number, of which ballast.cuts makes the outcomes of fever; such a column holds no outcomes: give the numbers, "
     "or remove ballast.cuts [bad-number-cell]\n"},
    {STOP, "smoker,temp\nno,\"37,5\"\nno,inf\nno,-9.\nno,0x1\n",
     "t.csv:2:4: \"37,5\" is not a number, of which ballast.cuts makes the outcomes of fever; use a decimal point, and nothing between "
     "thousands [bad-number-cell]\n"
     "t.csv:3:4: \"inf\" is not a number, of which ballast.cuts makes the outcomes of fever; write a finite decimal number such as 12 or 0.5 "
     "[bad-number-cell]\n"
     "t.csv:5:4: \"0x1\" is not a number, of which ballast.cuts makes the outcomes of fever; write a finite decimal number such as 12 or 0.5 "
     "[bad-number-cell]\n"},
    {STOP | REDACT, "smoker,temp\nno,low\n",
     "t.csv:2:4: the text is not a number, of which ballast.cuts makes the outcomes of fever; write a finite decimal number such as 12 or 0.5 "
     "[bad-number-cell]\n"},
    {DROP, "smoker,temp\nno,NA\nyes,\nno,36\n", "2: 0 0\n= 1 -2 ~0 places 3 weight 1 missing 0 2\n"},
    {STOP, "smoker,temp\nno,36\nsmoker,temp\n", "t.csv:3:1: line 3 repeats the header, as where files were joined; remove it [repeated-header]\n"},
    {STOP | PLAIN, "smoker,fever\nno,mid\n", "0: 0 1\n= 1 -0 ~0 places 1 weight 1\n"},

    /* Records given although a cell is missing. */
    {FAMILY, "smoker,temp\nno,36\n,39\nyes,NA\nNA,\n", "0: 0 0\n1: - 2\n2: 1 -\n3: - -\n= 4 -0 ~3 places 4 weight 4 missing 2 2\n"},

    /* A variable that nobody wants. */
    {ONLY_SMOKER, "smoker\nno\n", "0: 0 ~\n= 1 -0 ~0 places 1 weight 1\n"},
    {ONLY_SMOKER, "temp,smoker\nrubbish,no\n,yes\n", "0: 0 ~\n1: 1 ~\n= 2 -0 ~0 places 2 weight 2\n"},

    /* Weights. */
    {WEIGHT, "w,smoker,temp\n2,no,36\n0,yes,36\n3,yes,39\n", "0: 0 0 *2\n2: 1 0 *0\n2: 1 2 *3\n= 3 -0 ~0 places 5 weight 5\n"},
    {WEIGHT | DROP, "w,smoker,temp\n2,no,\n1,yes,36\n", "2: 1 0 *1\n= 1 -1 ~0 places 3 weight 1 missing 0 1\n"},
    {WEIGHT, "w,smoker,temp\n0.5,no,36\n1e0,yes,36\n", "0: 0 0 *0.5\n1: 1 0 *1\n= 2 -0 ~0 places 2 weight 1.5 fractional\n"},
    {WEIGHT, "w,smoker,temp\n-1,no,36\n,no,36\nnan,no,36\ninf,no,36\n1_000,no,36\n\"1,5\",no,36\nNA,no,36\n1e16,no,36\n1e400,no,36\n",
     "t.csv:2:1: \"-1\" is not a weight; weights are not negative [bad-weight]\n"
     "t.csv:3:1: the weight is missing; write it, or 0 for a record that does not count [bad-weight]\n"
     "t.csv:4:1: \"nan\" is not a weight; write a finite decimal number such as 12 or 0.5 [bad-weight]\n"
     "t.csv:5:1: \"inf\" is not a weight; write a finite decimal number such as 12 or 0.5 [bad-weight]\n"
     "t.csv:6:1: \"1_000\" is not a weight; write a finite decimal number such as 12 or 0.5 [bad-weight]\n"
     "t.csv:7:1: \"1,5\" is not a weight; use a decimal point, and nothing between thousands [bad-weight]\n"
     "t.csv:8:1: \"NA\" is not a weight; write a finite decimal number such as 12 or 0.5 [bad-weight]\n"
     "t.csv:9:1: \"1e16\" is not a weight; weights are at most 1e15 [bad-weight]\n"
     "t.csv:10:1: \"1e400\" is not a weight; write a finite decimal number such as 12 or 0.5 [bad-weight]\n"},
    {WEIGHT, "w,smoker,temp\nx,no,36\nx,no,36\nx,no,36\nx,no,36\nx,no,36\nx,no,36\nx,no,36\nx,no,36\nx,no,36\nx,no,36\nx,no,36\nx,no,36\n",
     "10x "
     "t.csv:*:1: \"x\" is not a weight; write a finite decimal number such as 12 or 0.5 [bad-weight]\n"
     "t.csv: and 2 more bad weights [bad-weight]\n"},
    {WEIGHT | REDACT, "w,smoker,temp\nJane,no,36\n", "t.csv:2:1: the text is not a weight; write a finite decimal number such as 12 or 0.5 [bad-weight]\n"},
    {WEIGHT, "w,smoker,temp\n0,no,36\n0,yes,36\n", "t.csv: no record has a weight above 0; is it the right column? [no-weight]\n"},
    {WEIGHT, "w,smoker,temp\n",
     "warning t.csv: the table has a header and no records: an empty batch [no-records]\n= 0 -0 ~0 places 0 weight 0\n"},
    {WEIGHT | DROP, "w,smoker,temp\n0,no,36\n1,,36\n",
     "0: 0 0 *0\nwarning t.csv: every record that is complete has the weight 0, so none is left [no-records]\n= 1 -1 ~0 places 1 weight 0 missing 1 0\n"},
    {WEIGHT, "W,smoker,temp\n1,no,36\n",
     "t.csv:1: no column is named \"w\", which is to hold the weights; did you mean \"W\"? [missing-column]\n"},
    {WEIGHT, "smoker,temp\nno,36\n",
     "t.csv:1: no column is named \"w\", which is to hold the weights; add it, or give the name of another column [missing-column]\n"},
    {WEIGHT, "w,smoker,temp\n1,no,36\nw,smoker,temp\n", "t.csv:3:1: line 3 repeats the header, as where files were joined; remove it [repeated-header]\n"},
    {WEIGHT, "w,smoker,temp\nw,no,36\n", "t.csv:2:1: \"w\" is not a weight; write a finite decimal number such as 12 or 0.5 [bad-weight]\n"},
    {WEIGHT | STRICT, "w,smoker,temp\n1,no,36\n", "0: 0 0 *1\n= 1 -0 ~0 places 1 weight 1\n"},
    {WEIGHT, "w,smoker,temp\n1e15,no,36\n1e15,no,36\n1e15,no,36\n1e15,no,36\n1e15,no,36\n1e15,no,36\n1e15,no,36\n1e15,no,36\n1e15,no,36\n1e15,no,36\n",
     "t.csv:11: the weights up to here sum to more than 2^53, beyond which counts are not exact; divide them all by one number [bad-weight]\n"},

    /* Folds. */
    {FOLD, "site,smoker,temp\nB,no,36\nA,no,36\nB,yes,39\n", "0: 0 0 @0\n1: 0 0 @1\n2: 1 2 @0\n= 3 -0 ~0 places 3 weight 3 groups 2\n"},
    {FOLD | DROP, "site,smoker,temp\nC,,36\nB,no,36\nA,no,36\n", "1: 0 0 @0\n2: 0 0 @1\n= 2 -1 ~0 places 3 weight 2 missing 1 0 groups 2\n"},
    {FOLD | WEIGHT, "site,smoker,temp,w\nC,no,36,0\nB,no,36,2\nC,no,36,1\nB,no,36,0\n",
     "0: 0 0 *0 @0\n0: 0 0 *2 @0\n2: 0 0 *1 @1\n3: 0 0 *0 @0\n= 4 -0 ~0 places 3 weight 3 groups 2\n"},
    {FOLD, "site,smoker,temp\n,no,36\nA,no,36\nNA,no,36\n",
     "t.csv:2:1: the label of the fold is missing here; fill it in, or remove the record [missing-group]\n"
     "t.csv:4:1: the label of the fold is missing here; fill it in, or remove the record [missing-group]\n"},
    {FOLD, "sites,smoker,temp\nA,no,36\n",
     "t.csv:1: no column is named \"site\", which is to hold the labels of folds; did you mean \"sites\"? [missing-column]\n"},

    /* Codes. */
    {CODES, "smoker,temp\nJ,36\n1,36\n,36\nno,36\nyes,<HI>\n", "0: 1 0\n1: 1 0\n2: 0 0\n3: 0 0\n4: 1 2\n= 5 -0 ~0 places 5 weight 5\n"},
    {CODES | FAMILY, "smoker,temp\n\"\",36\nNA,36\n", "0: 0 0\n1: - 0\n= 2 -0 ~1 places 2 weight 2 missing 1 0\n"},
    {CODES, "smoker,temp\nj,36\n",
     "t.csv:2:1: \"j\" is not an outcome of smoker (no, yes); if it is a code, --codebook says of what [unknown-label]\n"},
    {CODES | ONLY_SMOKER, "smoker\nJ\n\"\"\n\nyes\n", "0: 1 ~\n1: 0 ~\n2: 0 ~\n3: 1 ~\n= 4 -0 ~0 places 4 weight 4\n"},
    {CODES | ONLY_SMOKER, "smoker\nJ\n\n",
     "t.csv:3:1: blank lines end the table, and an empty cell is an outcome here; remove them, or write \"\" for records [blank-line]\n"},
};

typedef struct listener {
    bali_text told;
    size_t problems;
} listener;

static void put_error(bali_text *out, const bal_error *error) {
    bal_error copy = *error;
    const char *slash = strrchr(copy.file, '/');
    if (slash) memmove(copy.file, slash + 1, strlen(slash));
    char text[4096];
    bal_error_text(&copy, text, sizeof text);
    bali_text_printf(out, "%s\n", text);
}

static void listen(void *context, bal_severity severity, const bal_error *notice) {
    listener *l = context;
    ck_assert_ptr_nonnull(bal_code_find(notice->code));
    l->problems += severity == BAL_PROBLEM;
    if (severity == BAL_WARNING) bali_text_puts(&l->told, "warning ");
    put_error(&l->told, notice);
}

static void put_block(bali_text *out, const bal_block *block) {
    for (size_t t = 0; t < block->n_records; t++) {
        bali_text_printf(out, "%" PRIu64 ":", bal_block_place(block, t));
        for (size_t v = 0; v < block->n_columns; v++) {
            if (!block->columns[v]) bali_text_puts(out, " ~");
            else if (bal_block_code(block, v, t) == BAL_NONE) bali_text_puts(out, " -");
            else bali_text_printf(out, " %zu", bal_block_code(block, v, t));
        }
        if (block->weights) bali_text_puts(out, " *");
        if (block->weights) bali_text_put_number(out, block->weights[t]);
        if (block->groups) bali_text_printf(out, " @%" PRIu32, block->groups[t]);
        bali_text_putc(out, '\n');
    }
}

static void put_summary(bali_text *out, const bal_source *source) {
    bal_source_summary s;
    bal_source_summary_get(source, &s);
    bali_text_printf(out, "= %" PRIu64 " -%" PRIu64 " ~%" PRIu64 " places %" PRIu64 " weight ", s.records, s.dropped, s.incomplete, s.places);
    bali_text_put_number(out, s.weight);
    if (s.fractional) bali_text_puts(out, " fractional");
    if (s.missing[0] + s.missing[1] > 0) bali_text_printf(out, " missing %" PRIu64 " %" PRIu64, s.missing[0], s.missing[1]);
    if (s.n_groups) bali_text_printf(out, " groups %zu", s.n_groups);
    bali_text_putc(out, '\n');
}

/* What a table is read with. */
typedef struct setting {
    bal_document *document;
    bal_codebook *codebook;
    bal_groups *groups;
} setting;

static const bal_domain *domain_of(const setting *s) {
    return bal_network_domain(bal_document_network(s->document));
}

static setting set_up(void) {
    setting s = {.document = read_text(NETWORK)};
    const char *book = scratch_file("book.csv", CODEBOOK, strlen(CODEBOOK));
    ck_assert_int_eq(bal_codebook_read(domain_of(&s), book, NULL, &s.codebook, NULL, NULL), BAL_OK);
    ck_assert_int_eq(bal_groups_create(&s.groups, NULL), BAL_OK);
    return s;
}

static void tear_down(setting *s) {
    bal_groups_free(s->groups);
    bal_codebook_free(s->codebook);
    bal_document_free(s->document);
}

static bal_table_options options_of(const setting *s, unsigned how) {
    static const bool only_smoker[] = {true, false};
    bal_table_options options = bal_table_options_defaults();
    options.missing = how & DROP ? BAL_MISSING_DROP : how & FAMILY ? BAL_MISSING_FAMILY : BAL_MISSING_STOP;
    options.weight = how & WEIGHT ? "w" : NULL;
    options.fold_column = how & FOLD ? "site" : NULL;
    options.groups = s->groups;
    options.codebook = how & CODES ? s->codebook : NULL;
    options.document = how & PLAIN ? NULL : s->document;
    options.wanted = how & ONLY_SMOKER ? only_smoker : NULL;
    options.strict = how & STRICT;
    options.redact = how & REDACT;
    static const char *const labels[] = {"-9"};
    options.missing_labels = labels;
    options.n_missing_labels = 1;
    return options;
}

/* One pass over a source; *out gets the records, what was told, and the summary or the failure. */
static bal_status go_over(bal_source *source, listener *l, bali_text *out, bal_error *err) {
    bal_block block = {.n_records = 1};
    bal_status status = BAL_OK;
    while (status == BAL_OK && block.n_records > 0) {
        status = bal_source_next(source, &block, err);
        if (status == BAL_OK) put_block(out, &block);
    }
    bali_text_puts(out, bali_text_string(&l->told));
    bali_text_clear(&l->told);
    if (status == BAL_OK) put_summary(out, source);
    return status;
}

static bal_status read_path(const setting *s, const char *path, unsigned how, bali_text *out) {
    listener l = {0};
    bal_notices notices = {listen, &l};
    bal_source *source = NULL;
    bal_error err = {0};
    bal_table_options options = options_of(s, how);
    options.notices = &notices;
    bal_status status = bal_table_open(domain_of(s), path, &options, &source, &err);
    bali_text_puts(out, bali_text_string(&l.told));
    bali_text_clear(&l.told);
    if (status == BAL_OK) status = go_over(source, &l, out, &err);
    ck_assert_int_eq(status, err.status);
    if (status != BAL_OK && l.problems == 0) put_error(out, &err);
    if (status != BAL_OK) ck_assert_ptr_nonnull(bal_code_find(err.code));
    if (status == BAL_OK) { /* a second pass is the same */
        size_t length = out->length;
        bali_text again = {0};
        ck_assert_int_eq(bal_source_rewind(source, NULL), BAL_OK);
        ck_assert_int_eq(go_over(source, &l, &again, NULL), BAL_OK);
        ck_assert_uint_le(again.length, length);
        const char *first = bali_text_string(out) + length - again.length;
        ck_assert(strstr(bali_text_string(out), "warning") || strcmp(first, bali_text_string(&again)) == 0);
        bali_text_free(&again);
    }
    bal_source_free(source);
    bali_text_free(&l.told);
    return status;
}

/* "10x " before a line with a * for the line's number stands for ten such lines, the first that of line 2. */
static void put_expected(bali_text *out, const char *expected) {
    if (strncmp(expected, "10x ", 4) != 0) {
        bali_text_puts(out, expected);
        return;
    }
    expected += 4;
    const char *star = strchr(expected, '*'), *end = strchr(expected, '\n') + 1;
    for (int line = 2; line < 12; line++) {
        bali_text_add(out, expected, (size_t)(star - expected));
        bali_text_printf(out, "%d", line);
        bali_text_add(out, star + 1, (size_t)(end - star - 1));
    }
    bali_text_puts(out, end);
}

START_TEST(tables_are_read_or_refused) {
    const table_case *c = &cases[_i];
    setting s = set_up();
    bali_text out = {0}, expected = {0};
    (void)read_path(&s, scratch_file("t.csv", c->text, strlen(c->text)), c->how, &out);
    put_expected(&expected, c->expected);
    ck_assert_str_eq(bali_text_string(&out), bali_text_string(&expected));
    bali_text_free(&out);
    bali_text_free(&expected);
    tear_down(&s);
}
END_TEST

/* Compressed by zlib, in one member or two, a table is the same table; its facts are those of the file on disk. */
START_TEST(compressed_tables_are_the_same) {
    const table_case *c = &cases[_i];
    setting s = set_up();
    char packed[4096];
    size_t length = strlen(c->text), n = 0, halves[] = {length / 2, length - length / 2};
    for (size_t i = 0, at = 0; i < 2; at += halves[i++]) {
        z_stream stream = {0};
        ck_assert_int_eq(deflateInit2(&stream, 6, Z_DEFLATED, 15 + 16, 8, Z_DEFAULT_STRATEGY), Z_OK);
        stream.next_in = (Bytef *)(c->text + at);
        stream.avail_in = (uInt)halves[i];
        stream.next_out = (Bytef *)packed + n;
        stream.avail_out = (uInt)(sizeof packed - n);
        ck_assert_int_eq(deflate(&stream, Z_FINISH), Z_STREAM_END);
        n += stream.total_out;
        deflateEnd(&stream);
    }
    bali_text out = {0}, expected = {0};
    (void)read_path(&s, scratch_file("t.csv", packed, n), c->how, &out);
    put_expected(&expected, c->expected);
    ck_assert_str_eq(bali_text_string(&out), bali_text_string(&expected));
    bali_text_free(&out);
    bali_text_free(&expected);
    tear_down(&s);
}
END_TEST

/* Each place is that of a record that the whole weights before it add up to. */
START_TEST(places_of_weighted_records_are_located) {
    static const char text[] = "w,smoker,temp\n2,no,36\n0,yes,36\n\"3\",yes,39\n0.5,no,36\n1,no,36\n";
    static const size_t records[] = {1, 1, 3, 3, 3, 4, 5};
    setting s = set_up();
    bal_source *source = NULL;
    bal_table_options options = options_of(&s, WEIGHT);
    ck_assert_int_eq(bal_table_open(domain_of(&s), scratch_file("t.csv", text, strlen(text)), &options, &source, NULL), BAL_OK);
    for (size_t place = 0; place < sizeof records / sizeof records[0]; place++) {
        bal_error err = {0};
        bal_source_locate(source, place, &err);
        ck_assert_uint_eq(err.record, records[place]);
        ck_assert_uint_eq(err.line, records[place] + 1);
        ck_assert_ptr_nonnull(strstr(err.file, "t.csv"));
    }
    bal_error err = {0};
    bal_source_locate(source, 7, &err);
    ck_assert_uint_eq(err.line, 0);
    bal_source_free(source);
    tear_down(&s);
}
END_TEST

START_TEST(groups_are_numbered_over_all_tables) {
    static const char one[] = "site,smoker,temp\nB,no,36\nA,no,36\n", two[] = "site,smoker,temp\nC,no,36\nB,yes,36\n";
    setting s = set_up();
    bali_text out = {0};
    ck_assert_int_eq(read_path(&s, scratch_file("one.csv", one, strlen(one)), FOLD, &out), BAL_OK);
    ck_assert_int_eq(read_path(&s, scratch_file("two.csv", two, strlen(two)), FOLD, &out), BAL_OK);
    ck_assert_str_eq(bali_text_string(&out), "0: 0 0 @0\n1: 0 0 @1\n= 2 -0 ~0 places 2 weight 2 groups 2\n"
                                             "0: 0 0 @2\n1: 1 0 @0\n= 2 -0 ~0 places 2 weight 2 groups 3\n");
    bali_text_free(&out);
    tear_down(&s);
}
END_TEST

START_TEST(a_weight_may_be_a_variables_column) {
    static const char text[] = "smoker,temp\nno,36\nyes,39\n";
    setting s = set_up();
    bal_source *source = NULL;
    bal_block block;
    bal_table_options options = options_of(&s, FOLD);
    options.weight = "temp";
    options.fold_column = "smoker";
    ck_assert_int_eq(bal_table_open(domain_of(&s), scratch_file("t.csv", text, strlen(text)), &options, &source, NULL), BAL_OK);
    ck_assert_int_eq(bal_source_next(source, &block, NULL), BAL_OK);
    ck_assert_uint_eq(block.n_records, 2);
    ck_assert(block.weights[0] == 36 && block.weights[1] == 39);
    ck_assert(block.groups[0] == 0 && block.groups[1] == 1);
    ck_assert_uint_eq(bal_block_code(&block, 1, 1), 2);
    bal_source_free(source);
    tear_down(&s);
}
END_TEST

START_TEST(what_does_not_go_together_is_refused) {
    static const char book[] = "variable,outcome,code\nfever,low,36\n", text[] = "site,smoker,temp\nA,no,36\n";
    static const char *const outcomes[] = {"a"};
    setting s = set_up();
    bal_source *source = NULL;
    bal_error err = {0};
    const char *path = scratch_file("t.csv", text, strlen(text));
    bal_table_options options = options_of(&s, FOLD);
    options.groups = NULL;
    ck_assert_int_eq(bal_table_open(domain_of(&s), path, &options, &source, &err), BAL_ERR_ARGUMENT);
    ck_assert_str_eq(err.code, "option-mismatch");

    bal_codebook *numbers = NULL;
    ck_assert_int_eq(bal_codebook_read(domain_of(&s), scratch_file("numbers.csv", book, strlen(book)), NULL, &numbers, NULL, NULL), BAL_OK);
    path = scratch_file("t.csv", text, strlen(text));
    options = options_of(&s, STOP);
    options.codebook = numbers;
    err = (bal_error){0};
    ck_assert_int_eq(bal_table_open(domain_of(&s), path, &options, &source, &err), BAL_ERR_DATA);
    ck_assert_str_eq(err.code, "ambiguous-code");
    ck_assert_ptr_null(source);

    bal_domain *other = NULL;
    ck_assert_int_eq(bal_domain_create(&(bal_variable_spec){"smoker", outcomes, 1}, 1, &other, NULL), BAL_OK);
    options.document = NULL;
    err = (bal_error){0};
    ck_assert_int_eq(bal_table_open(other, path, &options, &source, &err), BAL_ERR_ARGUMENT);
    ck_assert_str_eq(err.code, "other-network");
    bal_domain_free(other);
    bal_codebook_free(numbers);
    tear_down(&s);
}
END_TEST

typedef struct survivor {
    setting s;
    const char *path;
} survivor;

static bal_status read_everything(void *context, bal_error *err) {
    const survivor *all = context;
    const setting *s = &all->s;
    bal_source *source = NULL;
    bal_block block = {.n_records = 1};
    bal_groups *groups = NULL;
    bal_table_options options = options_of(s, WEIGHT | FOLD | CODES | FAMILY);
    bal_status status = bal_groups_create(&groups, err);
    options.groups = groups;
    if (status == BAL_OK) status = bal_table_open(domain_of(s), all->path, &options, &source, err);
    ck_assert((status == BAL_OK) == (source != NULL));
    while (status == BAL_OK && block.n_records > 0) status = bal_source_next(source, &block, err);
    bal_source_free(source);
    bal_groups_free(groups);
    return status;
}

START_TEST(memory_may_run_out_anywhere) {
    static const char text[] = "site,smoker,temp,w,note\nB,J,36,2,x\nA,,,0.5,y\n";
    survivor all = {set_up(), scratch_file("t.csv", text, strlen(text))};
    ck_assert_uint_ge(survive_allocations(read_everything, &all), 30);
    tear_down(&all.s);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("table_columns");
    TCase *c = tcase_create("tables");
    const int n = (int)(sizeof cases / sizeof cases[0]);
    tcase_add_loop_test(c, tables_are_read_or_refused, 0, n);
    tcase_add_loop_test(c, compressed_tables_are_the_same, 0, n);
    tcase_add_test(c, places_of_weighted_records_are_located);
    tcase_add_test(c, groups_are_numbered_over_all_tables);
    tcase_add_test(c, a_weight_may_be_a_variables_column);
    tcase_add_test(c, what_does_not_go_together_is_refused);
    tcase_add_test(c, memory_may_run_out_anywhere);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
