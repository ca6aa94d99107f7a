#include "base/text.h"
#include "formats/csv.h"
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

static Suite *suite(void) {
    Suite *suite = suite_create("csv");
    TCase *tests = tcase_create("csv");
    tcase_add_loop_test(tests, cells_are_read, 0, sizeof readings / sizeof readings[0]);
    tcase_add_loop_test(tests, the_size_of_a_read_changes_nothing, 0, sizeof readings / sizeof readings[0]);
    tcase_add_test(tests, every_short_file_is_read_as_by_the_slow_twin);
    tcase_add_loop_test(tests, a_pipe_that_trickles_gives_the_same, 0, sizeof readings / sizeof readings[0]);
    tcase_add_test(tests, other_delimiters_separate);
    tcase_add_test(tests, messages_show_what_they_may);
    tcase_add_test(tests, memory_may_run_out_anywhere);
    tcase_set_timeout(tests, 60);
    suite_add_tcase(suite, tests);
    return suite;
}

int main(void) {
    return run_suite(suite());
}
