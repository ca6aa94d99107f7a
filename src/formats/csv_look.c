#include "formats/csv_look.h"

#include "base/text.h"

#include <string.h>

/* Files that begin with fixed bytes. */
typedef struct signature {
    const char *bytes;
    size_t length;
    const char *code;
    const char *what; /* "this looks like ...", and what to do */
} signature;

#define SIGNATURE(bytes, code, what) {bytes, sizeof bytes - 1, code, what}

static const signature signatures[] = {
    SIGNATURE("\x1F\x8B", "not-a-table", "gzip data inside gzip data; decompress it once (gunzip)"),
    SIGNATURE("BZh91AY&SY", "not-a-table", "bzip2 data; decompress it first (bunzip2)"),
    SIGNATURE("\xFD" "7zXZ", "not-a-table", "xz data; decompress it first (unxz)"),
    SIGNATURE("\x28\xB5\x2F\xFD", "not-a-table", "zstd data; decompress it first (unzstd)"),
    SIGNATURE("PK\x03\x04", "not-a-table",
              "a zip archive or a spreadsheet (.xlsx, .ods); open it there and save it as CSV in UTF-8"),
    SIGNATURE("\xD0\xCF\x11\xE0", "not-a-table", "an old spreadsheet (.xls); open it there and save it as CSV in UTF-8"),
    SIGNATURE("%PDF-", "not-a-table", "a PDF; ask for the table behind it, saved as CSV in UTF-8"),
    SIGNATURE("{\\rtf", "not-a-table", "a word processor's text (RTF); save the table as CSV in UTF-8"),
    SIGNATURE("\xFF\xFE\x00\x00", "encoding", "UTF-32 text; convert it: iconv -f UTF-32 -t UTF-8"),
    SIGNATURE("\x00\x00\xFE\xFF", "encoding", "UTF-32 text; convert it: iconv -f UTF-32 -t UTF-8"),
    SIGNATURE("\xFF\xFE", "encoding", "UTF-16 text; convert it: iconv -f UTF-16 -t UTF-8"),
    SIGNATURE("\xFE\xFF", "encoding", "UTF-16 text; convert it: iconv -f UTF-16 -t UTF-8"),
};

/* How XML and HTML begin, behind blanks; compared without regard to case. */
static const char *const markup[] = {"<?xml", "<!doctype", "<!--", "<html", "<bif", "<pmml", "<table"};

static char lower(char c) {
    return c >= 'A' && c <= 'Z' ? (char)(c - 'A' + 'a') : c;
}

static bool begins_with(const char *bytes, size_t length, const char *beginning) {
    size_t wanted = strlen(beginning), i = 0;
    while (i < wanted && i < length && lower(bytes[i]) == beginning[i]) i++;
    return i == wanted;
}

static bool is_blank(char c) {
    return c == ' ' || c == '\t';
}

static bool is_markup(const char *bytes, size_t length) {
    size_t i = 0;
    while (i < length && (is_blank(bytes[i]) || bytes[i] == '\n' || bytes[i] == '\r')) i++;
    for (size_t m = 0; m < sizeof markup / sizeof markup[0]; m++)
        if (begins_with(bytes + i, length - i, markup[m])) return true;
    return false;
}

/* Whether every other byte is a NUL, as in UTF-16 without its mark. */
static bool is_wide(const char *bytes, size_t length) {
    if (length < 4 || (bytes[0] == '\0') == (bytes[1] == '\0')) return false;
    return (bytes[0] == '\0') == (bytes[2] == '\0') && (bytes[1] == '\0') == (bytes[3] == '\0');
}

size_t bali_csv_line_length(const char *bytes, size_t length, bool *complete) {
    bool quoted = false;
    *complete = true;
    for (size_t i = 0; i < length; i++) {
        if (bytes[i] == '"') quoted = !quoted;
        if (!quoted && (bytes[i] == '\n' || bytes[i] == '\r')) return i;
    }
    *complete = false;
    return length;
}

bal_status bali_csv_look(const char *bytes, size_t length, bal_error *err) {
    const bal_status status = BAL_ERR_SYNTAX;
    for (size_t s = 0; s < sizeof signatures / sizeof signatures[0]; s++)
        if (length >= signatures[s].length && memcmp(bytes, signatures[s].bytes, signatures[s].length) == 0)
            return bal_error_set(err, status, signatures[s].code, "this looks like %s", signatures[s].what);
    if (is_wide(bytes, length))
        return bal_error_set(err, status, "encoding", "this looks like UTF-16 text; convert it: iconv -f %s -t UTF-8",
                             bytes[0] ? "UTF-16LE" : "UTF-16BE");
    if (is_markup(bytes, length))
        return bal_error_set(err, status, "not-a-table",
                             "this looks like XML or HTML; a table is CSV (is it the network, in the table's place?)");
    bool complete;
    size_t line = bali_csv_line_length(bytes, length, &complete);
    if (line == 5 && begins_with(bytes, line, "sep="))
        return bal_error_set(err, status, "sep-line",
                             "a spreadsheet's note \"%.*s\" stands before the header; remove the line%s", (int)line,
                             bytes, bytes[4] == ',' ? "" : " and give the delimiter with --delimiter");
    return BAL_OK;
}

char bali_csv_guess_delimiter(const char *path, const char *line, size_t length) {
    size_t name = strlen(path);
    if (name >= 3 && begins_with(path + name - 3, 3, ".gz")) name -= 3;
    if (name >= 4 && begins_with(path + name - 4, 4, ".tsv")) return '\t';
    bool quoted = false;
    for (size_t i = 0; i < length; i++) {
        if (line[i] == '"') quoted = !quoted;
        if (!quoted && line[i] == '\t') return '\t';
    }
    return ',';
}

bool bali_csv_split(const char *line, size_t length, char delimiter, size_t *at, const char **piece,
                    size_t *piece_length) {
    if (*at > length) return false;
    bool quoted = false;
    size_t begin = *at, end = *at;
    for (; end < length && (quoted || line[end] != delimiter); end++)
        if (line[end] == '"') quoted = !quoted;
    *at = end + 1;
    while (begin < end && is_blank(line[begin])) begin++;
    while (end > begin && is_blank(line[end - 1])) end--;
    if (end - begin >= 2 && line[begin] == '"' && line[end - 1] == '"') {
        begin++;
        end--;
    }
    *piece = line + begin;
    *piece_length = end - begin;
    return true;
}
