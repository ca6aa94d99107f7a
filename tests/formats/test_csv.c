#include "base/memory.h"
#include "base/text.h"
#include "formats/csv.h"
#include "formats/csv_look.h"
#include "support/harness.h"

#include <stdio.h>
#include <string.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <unistd.h>

#define BYTES(text) text, sizeof text - 1

/* A whole file as text: every cell as LINE:COLUMN(text), a quoted one as LINE:COLUMN"text", a bar at the end of each record;
 * a failure as !LINE:COLUMN code at the end. */
static void dump(const char *path, const bali_csv_options *options, bali_text *out) {
    bali_csv *csv = NULL;
    bali_csv_cell cell = {0};
    bal_error err = {0};
    bal_status status = bali_csv_open(path, options, &csv, &err);
    ck_assert((status == BAL_OK) == (csv != NULL));
    while (status == BAL_OK) {
        size_t line, column;
        status = bali_csv_next(csv, &cell, &err);
        if (status != BAL_OK || !cell.text) break;
        bali_csv_place(csv, &line, &column);
        bali_text_printf(out, "%zu:%zu%c", line, column, cell.quoted ? '"' : '(');
        bali_text_put_visible(out, cell.text, cell.length);
        bali_text_puts(out, cell.quoted ? "\"" : ")");
        if (cell.ends_record) bali_text_putc(out, '|');
        /* Eight bytes can be read from any byte of the text on: the address sanitizer watches. */
        volatile char sum = 0;
        for (size_t i = cell.length ? cell.length - 1 : 0, end = i + BALI_CSV_READABLE; i < end; i++) sum = (char)(sum ^ cell.text[i]);
    }
    if (status != BAL_OK) bali_text_printf(out, "!%zu:%zu %s", err.line, err.column, err.code);
    ck_assert_int_eq(status, err.status);
    ck_assert(status == BAL_OK || bal_code_find(err.code) != NULL);
    bali_csv_close(csv);
    ck_assert(!out->failed);
}

typedef struct reading {
    const char *bytes;
    size_t length;
    const char *cells;
} reading;

static const reading readings[] = {
    {BYTES(""), ""},
    {BYTES("\xEF\xBB\xBF"), ""},
    {BYTES("a"), "1:1(a)|"},
    {BYTES("a,b\n1,2\n"), "1:1(a)1:3(b)|2:1(1)2:3(2)|"},
    {BYTES("a,b\r\n1,2\r\n"), "1:1(a)1:3(b)|2:1(1)2:3(2)|"},
    {BYTES("a,b\r1,2\r"), "1:1(a)1:3(b)|2:1(1)2:3(2)|"},
    {BYTES("a\nb\r\nc\rd"), "1:1(a)|2:1(b)|3:1(c)|4:1(d)|"},
    {BYTES("a\n\rb"), "1:1(a)|2:1()|3:1(b)|"},
    {BYTES("a\r\r\nb"), "1:1(a)|2:1()|3:1(b)|"},
    {BYTES("\n\na"), "1:1()|2:1()|3:1(a)|"},
    {BYTES(","), "1:1()1:2()|"},
    {BYTES(",\n,"), "1:1()1:2()|2:1()2:2()|"},
    {BYTES("a,"), "1:1(a)1:3()|"},
    {BYTES("a,\n"), "1:1(a)1:3()|"},
    {BYTES("\xEF\xBB\xBF" "a,b\n1,2"), "1:1(a)1:3(b)|2:1(1)2:3(2)|"},
    {BYTES("\xEF\xBB\xBF\"a\",b"), "1:1\"a\"1:5(b)|"},
    {BYTES("\"a\",\"b\"\n\"1\",\"2\"\n"), "1:1\"a\"1:5\"b\"|2:1\"1\"2:5\"2\"|"},
    {BYTES("\"\"\n\"\""), "1:1\"\"|2:1\"\"|"},
    {BYTES("\"\"\"\""), "1:1\"\"\"|"},
    {BYTES("\"a\"\"b\",\"\"\"c\",\"d\"\"\""), "1:1\"a\"b\"1:8\"\"c\"1:14\"d\"\"|"},
    {BYTES("\"a\"\"\"\"b\"\"\"\"\"\"\""), "1:1\"a\"\"b\"\"\"\"|"},
    {BYTES("\"a,b\",c"), "1:1\"a,b\"1:7(c)|"},
    {BYTES("\"a\nb\",c\nd,e"), "1:1\"a\\x0Ab\"2:4(c)|3:1(d)3:3(e)|"},
    {BYTES("\"a\r\nb\rc\",d\r\ne"), "1:1\"a\\x0D\\x0Ab\\x0Dc\"3:4(d)|4:1(e)|"},
    {BYTES("x\n a , b\tc\t,\td \n"), "1:1(x)|2:1(a)2:5(b\\x09c)2:11(d)|"},
    {BYTES("\" a \",\"\t\""), "1:1\" a \"1:7\"\\x09\"|"},
    {BYTES("  \n"), "1:1()|"},
    {BYTES("\xC3\xA4,\xE2\x82\xAC,\xF0\x9F\x8D\x80,x"), "1:1(\xC3\xA4)1:3(\xE2\x82\xAC)1:5(\xF0\x9F\x8D\x80)1:7(x)|"},
    {BYTES("\xC2\xA0x\xC2\xA0,y"), "1:1(\xC2\xA0x\xC2\xA0)1:5(y)|"},
    {BYTES("a\n\xEF\xBB\xBF" "b"), "1:1(a)|2:1(\\xEF\\xBB\\xBF" "b)|"},
    {BYTES("abcdefgh,abcdefg,abcdefghi\nabcdefghijklmnopqrstuvwxyz"), "1:1(abcdefgh)1:10(abcdefg)1:18(abcdefghi)|2:1(abcdefghijklmnopqrstuvwxyz)|"},
    /* Refusals, each behind what was right. */
    {BYTES("a,b\n1,\"x\" ,"), "1:1(a)1:3(b)|2:1(1)!2:6 misplaced-quote"},
    {BYTES("a,b\n1,\"x\"y"), "1:1(a)1:3(b)|2:1(1)!2:6 misplaced-quote"},
    {BYTES("a,b\n1,x\"y"), "1:1(a)1:3(b)|2:1(1)!2:4 misplaced-quote"},
    {BYTES("a,b\n1, \"x\""), "1:1(a)1:3(b)|2:1(1)!2:4 misplaced-quote"},
    {BYTES("a\n\xEF\xBB\xBF\"a\""), "1:1(a)|!2:2 misplaced-quote"},
    {BYTES("a,b\n1,\""), "1:1(a)1:3(b)|2:1(1)!2:3 unclosed-quote"},
    {BYTES("a,b\n1,\"x\ny\n"), "1:1(a)1:3(b)|2:1(1)!2:3 unclosed-quote"},
    {BYTES("a\n\"x\"\""), "1:1(a)|!2:1 unclosed-quote"},
    {BYTES("a,b\n\xC3\xA4\0,"), "1:1(a)1:3(b)|!2:2 control-character"},
    {BYTES("a\n\0"), "1:1(a)|!2:1 control-character"},
    {BYTES("abcdefghijklmnop\n\"x\0\""), "1:1(abcdefghijklmnop)|!2:3 control-character"},
    {BYTES("a\nx\x01"), "1:1(a)|!2:2 control-character"},
    {BYTES("a\nx\x7F"), "1:1(a)|!2:2 control-character"},
    {BYTES("a\nx\xC2\x85"), "1:1(a)|!2:2 control-character"},
    {BYTES("a\n\"\n\x0B\""), "1:1(a)|!3:1 control-character"},
    {BYTES("a\nb\xE9,c"), "1:1(a)|!2:2 bad-utf8"},
    {BYTES("a\nb\xC0\xAF"), "1:1(a)|!2:2 bad-utf8"},
    {BYTES("a\n\xED\xA0\x80"), "1:1(a)|!2:1 bad-utf8"},
    {BYTES("a\n\xF4\x90\x80\x80"), "1:1(a)|!2:1 bad-utf8"},
    {BYTES("a\n\"x\ny\xFF\""), "1:1(a)|!3:2 bad-utf8"},
    {BYTES("a\nb\xE2\x82"), "1:1(a)|!2:2 bad-utf8"},
    {BYTES("a\n\x80"), "1:1(a)|!2:1 bad-utf8"},
};

START_TEST(cells_are_read) {
    const reading *r = &readings[_i];
    bali_csv_options options = {0};
    bali_text out = {0};
    dump(scratch_file("cells.csv", r->bytes, r->length), &options, &out);
    ck_assert_str_eq(bali_text_string(&out), r->cells);
    bali_text_free(&out);
}
END_TEST

START_TEST(the_size_of_a_read_changes_nothing) {
    const reading *r = &readings[_i];
    char path[512];
    (void)snprintf(path, sizeof path, "%s", scratch_file("chunks.csv", r->bytes, r->length));
    for (size_t chunk = 1; chunk <= r->length + 2; chunk++) {
        bali_csv_options options = {.chunk_bytes = chunk};
        bali_text out = {0};
        dump(path, &options, &out);
        ck_assert_msg(strcmp(bali_text_string(&out), r->cells) == 0, "chunks of %zu bytes give %s", chunk, bali_text_string(&out));
        bali_text_free(&out);
    }
}
END_TEST

/* Line and column of a byte, counted from the file's beginning. */
static void position(const char *bytes, size_t at, size_t *line, size_t *column) {
    *line = *column = 1;
    for (size_t i = 0; i < at; i++) {
        bool ends = bytes[i] == '\n' || (bytes[i] == '\r' && bytes[i + 1] != '\n');
        *line += ends;
        *column = ends ? 1 : *column + 1;
    }
}

/* The slow twin of the reader, for printable ASCII: one byte after another, as RFC 4180 says it. bytes has a NUL behind. */
static void read_slowly(const char *bytes, bali_text *out) {
    size_t i = 0, line, column;
    bool expected = false;
    while (bytes[i] || expected) {
        bali_text cell = {0};
        size_t start = i;
        bool quoted = bytes[i] == '"';
        if (quoted) {
            for (i++; bytes[i] && (bytes[i] != '"' || bytes[i + 1] == '"'); i++) {
                if (bytes[i] == '"') i++;
                bali_text_putc(&cell, bytes[i]);
            }
            position(bytes, start, &line, &column);
            if (bytes[i] != '"') {
                bali_text_printf(out, "!%zu:%zu unclosed-quote", line, column);
                bali_text_free(&cell);
                return;
            }
            i++;
        } else {
            for (; bytes[i] && !strchr(",\r\n\"", bytes[i]); i++)
                if (bytes[i] != ' ' || cell.length > 0) bali_text_putc(&cell, bytes[i]);
            while (cell.length > 0 && cell.bytes[cell.length - 1] == ' ') cell.length--;
        }
        if (bytes[i] && !strchr(",\r\n", bytes[i])) {
            position(bytes, i, &line, &column);
            bali_text_printf(out, "!%zu:%zu misplaced-quote", line, column);
            bali_text_free(&cell);
            return;
        }
        expected = bytes[i] == ',';
        position(bytes, start, &line, &column);
        bali_text_printf(out, "%zu:%zu%c", line, column, quoted ? '"' : '(');
        if (cell.length > 0) bali_text_put_visible(out, cell.bytes, cell.length);
        bali_text_puts(out, quoted ? "\"" : ")");
        if (!expected) bali_text_putc(out, '|');
        if (bytes[i] == '\r' && bytes[i + 1] == '\n') i++;
        if (bytes[i]) i++;
        bali_text_free(&cell);
    }
}

START_TEST(every_short_file_is_read_as_by_the_slow_twin) {
    enum { LONGEST = 5, SYMBOLS = 6 };
    char bytes[LONGEST + 1], path[512];
    size_t n_files = 0;
    (void)snprintf(path, sizeof path, "%s/short.csv", scratch_dir());
    for (size_t length = 0, count = 1; length <= LONGEST; length++, count *= SYMBOLS)
        for (size_t number = 0; number < count; number++, n_files++) {
            size_t rest = number;
            memset(bytes, 0, sizeof bytes);
            for (size_t i = 0; i < length; i++, rest /= SYMBOLS) bytes[i] = "a,\"\n\r "[rest % SYMBOLS];
            bali_csv_options options = {.chunk_bytes = 1 + number % 4};
            bali_text out = {0}, slow = {0};
            (void)unlink(path); /* some file systems write a file out at once when it takes another's place */
            dump(scratch_file("short.csv", bytes, length), &options, &out);
            read_slowly(bytes, &slow);
            ck_assert_str_eq(bali_text_string(&out), bali_text_string(&slow));
            bali_text_free(&out);
            bali_text_free(&slow);
        }
    ck_assert_uint_eq(n_files, 9331);
}
END_TEST

/* Opens a FIFO for a child that writes the bytes one at a time. */
static pid_t trickle(const char *path, const char *bytes, size_t length) {
    (void)unlink(path);
    ck_assert_int_eq(mkfifo(path, 0600), 0);
    pid_t child = fork();
    ck_assert_int_ge(child, 0);
    if (child > 0) return child;
    FILE *file = fopen(path, "wb");
    if (!file) _exit(1);
    setvbuf(file, NULL, _IONBF, 0);
    for (size_t i = 0; i < length; i++)
        if (fputc((unsigned char)bytes[i], file) == EOF) _exit(2);
    _exit(fclose(file) == 0 ? 0 : 3);
}

START_TEST(a_pipe_that_trickles_gives_the_same) {
    const reading *r = &readings[_i];
    char path[512];
    (void)snprintf(path, sizeof path, "%s/trickle", scratch_dir());
    bali_csv_options options = {.chunk_bytes = 7};
    bali_text out = {0};
    pid_t child = trickle(path, r->bytes, r->length);
    dump(path, &options, &out);
    int ended;
    ck_assert_int_eq(waitpid(child, &ended, 0), child);
    ck_assert_str_eq(bali_text_string(&out), r->cells);
    bali_text_free(&out);
    (void)unlink(path);
}
END_TEST

START_TEST(a_cell_may_have_a_mebibyte) {
    static const struct {
        size_t length;
        bool quoted;
        const char *code;
    } cases[] = {
        {BALI_CSV_CELL_LIMIT, false, NULL},          {BALI_CSV_CELL_LIMIT + 1, false, "cell-too-long"},
        {BALI_CSV_CELL_LIMIT, true, NULL},           {BALI_CSV_CELL_LIMIT + 1, true, "unclosed-quote"},
        {3 * BALI_CSV_CELL_LIMIT, false, "cell-too-long"}, {3 * BALI_CSV_CELL_LIMIT, true, "unclosed-quote"},
    };
    /* Some end just before, in and behind the closing quote. */
    static const size_t chunks[] = {0, 4096, BALI_CSV_CELL_LIMIT - 1, BALI_CSV_CELL_LIMIT + 6, BALI_CSV_CELL_LIMIT + 7,
                                    BALI_CSV_CELL_LIMIT + 8, 5 * BALI_CSV_CELL_LIMIT};
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        bali_text text = {0};
        bali_text_puts(&text, cases[i].quoted ? "a,b\nx,\"" : "a,b\nx,");
        for (size_t n = 0; n < cases[i].length; n++) bali_text_putc(&text, n % 2 ? 'y' : cases[i].quoted ? '\n' : ',' + 1);
        bali_text_puts(&text, cases[i].quoted ? "\"\n" : "\n");
        const char *path = scratch_file("long.csv", text.bytes, text.length);
        for (size_t c = 0; c < sizeof chunks / sizeof chunks[0]; c++) {
            bali_csv_options options = {.chunk_bytes = chunks[c]};
            bali_csv *csv = NULL;
            bali_csv_cell cell;
            bal_error err = {0};
            ck_assert_int_eq(bali_csv_open(path, &options, &csv, &err), BAL_OK);
            for (int k = 0; k < 3; k++) ck_assert_int_eq(bali_csv_next(csv, &cell, &err), BAL_OK);
            bal_status status = bali_csv_next(csv, &cell, &err);
            if (cases[i].code) {
                ck_assert_int_eq(status, BAL_ERR_SYNTAX);
                ck_assert_str_eq(err.code, cases[i].code);
                ck_assert_uint_eq(err.line, 2);
                ck_assert_uint_eq(err.column, 3);
            } else {
                ck_assert_int_eq(status, BAL_OK);
                ck_assert_uint_eq(cell.length, cases[i].length);
                ck_assert(cell.ends_record);
            }
            bali_csv_close(csv);
        }
        bali_text_free(&text);
    }
}
END_TEST

/* Columns stay right where the line's start left the buffer long ago. */
START_TEST(columns_are_counted_over_many_reads) {
    enum { CELLS = 3000 };
    bali_text text = {0};
    for (int i = 0; i < CELLS; i++) bali_text_printf(&text, "%s\xC3\xA9%d", i ? "," : "", i % 10);
    bali_text_puts(&text, "\n\"p\nq\",r\n");
    bali_csv_options options = {.chunk_bytes = 64};
    bali_csv *csv = NULL;
    bali_csv_cell cell;
    size_t line, column;
    ck_assert_int_eq(bali_csv_open(scratch_file("wide.csv", text.bytes, text.length), &options, &csv, NULL), BAL_OK);
    for (size_t i = 0; i < CELLS; i++) {
        ck_assert_int_eq(bali_csv_next(csv, &cell, NULL), BAL_OK);
        if (i % 7 != 0) continue; /* asking or not changes nothing */
        bali_csv_place(csv, &line, &column);
        ck_assert_uint_eq(line, 1);
        ck_assert_uint_eq(column, 3 * i + 1);
    }
    ck_assert(cell.ends_record);
    for (size_t i = 0; i < 2; i++) {
        ck_assert_int_eq(bali_csv_next(csv, &cell, NULL), BAL_OK);
        bali_csv_place(csv, &line, &column);
        ck_assert_uint_eq(line, 2 + i);
        ck_assert_uint_eq(column, i ? 4 : 1);
    }
    bali_csv_close(csv);
    bali_text_free(&text);
}
END_TEST

START_TEST(the_delimiter_is_guessed_or_given) {
    static const struct {
        const char *name, *text;
        char given, delimiter;
    } cases[] = {
        {"d.csv", "a,b\n", 0, ','},       {"d.csv", "a\tb\n", 0, '\t'}, {"d.tsv", "a,b\n", 0, '\t'},   {"d.TSV", "ab\n", 0, '\t'},
        {"d.csv", "\"a\tb\",c\n", 0, ','}, {"d.csv", "a;b\n", 0, ','},   {"d.csv", "a;b\n", ';', ';'},  {"d.tsv", "a,b\n", ',', ','},
        {"d.csv", "a\nb\tc\n", 0, ','},    {"tsv", "a\n", 0, ','},       {"d.csv", "a|b\n", '|', '|'},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        bali_csv_options options = {.delimiter = cases[i].given};
        bali_csv *csv = NULL;
        size_t length;
        ck_assert_int_eq(bali_csv_open(scratch_file(cases[i].name, cases[i].text, strlen(cases[i].text)), &options, &csv, NULL), BAL_OK);
        ck_assert_msg(bali_csv_delimiter(csv) == cases[i].delimiter, "case %zu", i);
        const char *line = bali_csv_first_line(csv, &length);
        ck_assert_uint_eq(length, strcspn(cases[i].text, "\n"));
        ck_assert(memcmp(line, cases[i].text, length) == 0);
        bali_csv_close(csv);
    }
    static const char wrong[] = "\"\r\n a0\x7F\x80";
    for (size_t i = 0; i < sizeof wrong - 1; i++) {
        bali_csv_options options = {.delimiter = wrong[i]};
        bali_csv *csv = (bali_csv *)1;
        bal_error err = {0};
        ck_assert_int_eq(bali_csv_open("any.csv", &options, &csv, &err), BAL_ERR_ARGUMENT);
        ck_assert_str_eq(err.code, "bad-delimiter");
        ck_assert_ptr_null(csv);
    }
}
END_TEST

START_TEST(other_delimiters_separate) {
    static const struct {
        char delimiter;
        const char *text, *cells;
    } cases[] = {
        {'\t', "a\t b,c \t\n1\t\t2", "1:1(a)1:3(b,c)1:9()|2:1(1)2:3()2:4(2)|"},
        {';', "a;\"b;c\";d,e", "1:1(a)1:3\"b;c\"1:9(d,e)|"},
        {'|', "a|b\t|c", "1:1(a)1:3(b)1:6(c)|"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        bali_csv_options options = {.delimiter = cases[i].delimiter};
        bali_text out = {0};
        dump(scratch_file("other.csv", cases[i].text, strlen(cases[i].text)), &options, &out);
        ck_assert_str_eq(bali_text_string(&out), cases[i].cells);
        bali_text_free(&out);
    }
}
END_TEST

START_TEST(what_is_no_table_is_named) {
    static const struct {
        const char *bytes;
        size_t length;
        const char *code, *words;
    } cases[] = {
        {BYTES("\x1F\x8B\x08\0\0\0\0"), "not-a-table", "gunzip"},
        {BYTES("PK\x03\x04\x14\0"), "not-a-table", "spreadsheet"},
        {BYTES("%PDF-1.7\n"), "not-a-table", "PDF"},
        {BYTES("\xD0\xCF\x11\xE0\xA1\xB1\x1A\xE1"), "not-a-table", "spreadsheet"},
        {BYTES("\xFF\xFE" "a\0,\0"), "encoding", "iconv -f UTF-16 -t UTF-8"},
        {BYTES("\xFE\xFF\0a\0,"), "encoding", "iconv -f UTF-16 -t UTF-8"},
        {BYTES("a\0,\0b\0\n\0"), "encoding", "UTF-16LE"},
        {BYTES("\0a\0,\0b\0\n"), "encoding", "UTF-16BE"},
        {BYTES("\xFF\xFE\0\0a\0\0\0"), "encoding", "UTF-32"},
        {BYTES("<?xml version=\"1.0\"?><BIF/>"), "not-a-table", "network"},
        {BYTES("\xEF\xBB\xBF\n <!DOCTYPE html>"), "not-a-table", "HTML"},
        {BYTES("<HTML><body>"), "not-a-table", "HTML"},
        {BYTES("sep=;\na;b\n"), "sep-line", "--delimiter"},
        {BYTES("\xEF\xBB\xBFsep=,\r\na,b\n"), "sep-line", "remove the line"},
        {BYTES("SEP=\t\na\tb\n"), "sep-line", "remove the line"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        bali_csv_options options = {0};
        bali_csv *csv = (bali_csv *)1;
        bal_error err = {0};
        const char *path = scratch_file("odd.csv", cases[i].bytes, cases[i].length);
        ck_assert_msg(bali_csv_open(path, &options, &csv, &err) == BAL_ERR_SYNTAX, "case %zu is taken for a table", i);
        ck_assert_ptr_null(csv);
        ck_assert_str_eq(err.code, cases[i].code);
        ck_assert_ptr_nonnull(bal_code_find(err.code));
        ck_assert_msg(strstr(err.message, cases[i].words) != NULL, "%s", err.message);
        ck_assert_str_eq(err.file, path);
        ck_assert_uint_eq(err.line, 1);
        ck_assert_uint_eq(err.column, 1);
    }
    /* What only resembles them is a table. */
    static const char *const tables[] = {"<5,>=5\n", "sep=\n", "separator\n", "PK\n", "BZh,b\n", "%PDF\n"};
    for (size_t i = 0; i < sizeof tables / sizeof tables[0]; i++) {
        bal_error err = {0};
        ck_assert_msg(bali_csv_look(tables[i], strlen(tables[i]), &err) == BAL_OK, "%s", err.message);
    }
    ck_assert_int_eq(bali_csv_look("a\0b,c\n", 6, NULL), BAL_OK); /* one NUL is refused where it stands */
}
END_TEST

START_TEST(messages_show_what_they_may) {
    static const struct {
        const char *text;
        bool redact;
        const char *words, *not;
    } cases[] = {
        {"a\nb\xE9\n", false, "byte 0xE9 is not UTF-8", NULL},
        {"a\nb\xC0\xAF\n", false, "bytes 0xC0 0xAF are not UTF-8", NULL},
        {"a\nb\xE2\x82", false, "the file ends inside a character", NULL},
        {"a\nb\xE9\n", true, "a character is not UTF-8", "E9"},
        {"a\nb\x1B[31m\n", false, "control character U+001B", NULL},
        {"a\n\"b\" \n", false, "a blank behind the quote that closes the cell begun at 2:1", NULL},
        {"a\n \"b\"\n", false, "a quote behind blanks", NULL},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        bali_csv_options options = {.redact = cases[i].redact};
        bali_csv *csv = NULL;
        bali_csv_cell cell;
        bal_error err = {0};
        ck_assert_int_eq(bali_csv_open(scratch_file("m.csv", cases[i].text, strlen(cases[i].text)), &options, &csv, &err), BAL_OK);
        ck_assert_int_eq(bali_csv_next(csv, &cell, &err), BAL_OK);
        ck_assert_int_eq(bali_csv_next(csv, &cell, &err), BAL_ERR_SYNTAX);
        ck_assert_msg(strstr(err.message, cases[i].words) != NULL, "%s", err.message);
        if (cases[i].not) ck_assert_ptr_null(strstr(err.message, cases[i].not));
        bali_csv_close(csv);
    }
}
END_TEST

START_TEST(a_file_is_read_again_and_hashed_once) {
    /* The digest is the first example of FIPS 180-4: SHA-256 of "abc". */
    static const char digest[] = "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad";
    bali_csv_options options = {.chunk_bytes = 2};
    bali_csv *csv = NULL;
    bali_csv_cell cell;
    bal_file_facts facts;
    ck_assert_int_eq(bali_csv_open(scratch_file("facts.csv", "abc", 3), &options, &csv, NULL), BAL_OK);
    ck_assert(bali_csv_can_rewind(csv));
    ck_assert_int_eq(bali_csv_rewind(csv, NULL), BAL_OK); /* before the end: the hash starts anew */
    for (int pass = 0; pass < 3; pass++) {
        ck_assert_int_eq(bali_csv_next(csv, &cell, NULL), BAL_OK);
        ck_assert(cell.length == 3 && memcmp(cell.text, "abc", 3) == 0 && cell.ends_record);
        ck_assert_int_eq(bali_csv_next(csv, &cell, NULL), BAL_OK);
        ck_assert_ptr_null(cell.text);
        ck_assert_int_eq(bali_csv_next(csv, &cell, NULL), BAL_OK);
        ck_assert_ptr_null(cell.text);
        bali_csv_facts(csv, &facts);
        ck_assert_str_eq(facts.name, "facts.csv");
        ck_assert_uint_eq(facts.bytes, 3);
        ck_assert_str_eq(facts.sha256, digest);
        ck_assert_int_eq(bali_csv_rewind(csv, NULL), BAL_OK);
    }
    bali_csv_close(csv);
}
END_TEST

START_TEST(a_pass_that_was_left_is_not_hashed) {
    bali_text text = {0};
    for (int i = 0; i < 500; i++) bali_text_printf(&text, "line,%d\n", i);
    const char *path = scratch_file("left.csv", text.bytes, text.length);
    bal_file_facts facts[2];
    for (int left = 0; left < 2; left++) {
        bali_csv_options options = {.chunk_bytes = 100};
        bali_csv *csv = NULL;
        bali_csv_cell cell = {.text = ""};
        ck_assert_int_eq(bali_csv_open(path, &options, &csv, NULL), BAL_OK);
        for (int i = 0; left && i < 300; i++) ck_assert_int_eq(bali_csv_next(csv, &cell, NULL), BAL_OK);
        if (left) ck_assert_int_eq(bali_csv_rewind(csv, NULL), BAL_OK);
        while (cell.text) ck_assert_int_eq(bali_csv_next(csv, &cell, NULL), BAL_OK);
        bali_csv_facts(csv, &facts[left]);
        bali_csv_close(csv);
    }
    ck_assert_uint_eq(strlen(facts[0].sha256), 64);
    ck_assert_str_eq(facts[0].sha256, facts[1].sha256);
    ck_assert_uint_eq(facts[1].bytes, text.length);
    bali_text_free(&text);
}
END_TEST

START_TEST(large_files_are_not_hashed) {
    for (size_t over = 0; over < 2; over++) {
        size_t length = ((size_t)8 << 20) + over;
        char *bytes = bali_allocate(length, 1);
        memset(bytes, 'x', length);
        for (size_t i = 99; i < length; i += 100) bytes[i] = '\n';
        bali_csv_options options = {0};
        bali_csv *csv = NULL;
        bali_csv_cell cell = {.text = ""};
        bal_file_facts facts;
        ck_assert_int_eq(bali_csv_open(scratch_file("large.csv", bytes, length), &options, &csv, NULL), BAL_OK);
        while (cell.text) ck_assert_int_eq(bali_csv_next(csv, &cell, NULL), BAL_OK);
        bali_csv_facts(csv, &facts);
        ck_assert_uint_eq(facts.bytes, length);
        ck_assert_uint_eq(strlen(facts.sha256), over ? 0 : 64);
        bali_csv_close(csv);
        bali_free(bytes);
    }
}
END_TEST

static bal_status read_it_all(void *context, bal_error *err) {
    bali_csv_options options = {.chunk_bytes = 5};
    bali_csv *csv = NULL;
    bali_csv_cell cell = {.text = ""};
    bal_status status = bali_csv_open(context, &options, &csv, err);
    ck_assert((status == BAL_OK) == (csv != NULL));
    while (status == BAL_OK && cell.text) status = bali_csv_next(csv, &cell, err);
    bali_csv_close(csv);
    return status;
}

START_TEST(memory_may_run_out_anywhere) {
    static const char text[] = "a,b\n\"twenty \"\"letters\"\" and more\",\"second\nline\"\nx,a cell of a certain length\n";
    char path[512];
    (void)snprintf(path, sizeof path, "%s", scratch_file("memory.csv", text, sizeof text - 1));
    ck_assert_uint_ge(survive_allocations(read_it_all, path), 5);
}
END_TEST

START_TEST(a_line_is_split_outside_quotes) {
    static const struct {
        const char *line;
        const char *pieces[5];
    } cases[] = {
        {"", {""}},
        {"a", {"a"}},
        {"a;b", {"a", "b"}},
        {" a ;\"b;c\"; \"d\" ;", {"a", "b;c", "d", ""}},
        {"\"", {"\""}},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        const char *piece;
        size_t at = 0, length, n = 0;
        while (bali_csv_split(cases[i].line, strlen(cases[i].line), ';', &at, &piece, &length)) {
            ck_assert_ptr_nonnull(cases[i].pieces[n]);
            ck_assert_uint_eq(length, strlen(cases[i].pieces[n]));
            ck_assert(memcmp(piece, cases[i].pieces[n++], length) == 0);
        }
        ck_assert_ptr_null(cases[i].pieces[n]);
    }
}
END_TEST

static Suite *suite(void) {
    Suite *suite = suite_create("csv");
    TCase *cells = tcase_create("cells"), *files = tcase_create("files");
    int n = sizeof readings / sizeof readings[0];
    tcase_add_loop_test(cells, cells_are_read, 0, n);
    tcase_add_loop_test(cells, the_size_of_a_read_changes_nothing, 0, n);
    tcase_add_loop_test(cells, a_pipe_that_trickles_gives_the_same, 0, n);
    tcase_add_test(cells, every_short_file_is_read_as_by_the_slow_twin);
    tcase_add_test(cells, a_cell_may_have_a_mebibyte);
    tcase_add_test(cells, columns_are_counted_over_many_reads);
    tcase_add_test(cells, other_delimiters_separate);
    tcase_add_test(cells, messages_show_what_they_may);
    tcase_add_test(files, the_delimiter_is_guessed_or_given);
    tcase_add_test(files, what_is_no_table_is_named);
    tcase_add_test(files, a_file_is_read_again_and_hashed_once);
    tcase_add_test(files, a_pass_that_was_left_is_not_hashed);
    tcase_add_test(files, large_files_are_not_hashed);
    tcase_add_test(files, memory_may_run_out_anywhere);
    tcase_add_test(files, a_line_is_split_outside_quotes);
    tcase_set_timeout(cells, 60);
    suite_add_tcase(suite, cells);
    suite_add_tcase(suite, files);
    return suite;
}

int main(void) {
    return run_suite(suite());
}
