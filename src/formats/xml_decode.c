#include "formats/xml_decode.h"

#include "base/memory.h"
#include "base/text.h"

#include <errno.h>
#include <iconv.h>
#include <string.h>
#include <strings.h>

/* Longest XML declaration that is looked at, and how much is converted at a time. */
enum { LONGEST_DECLARATION = 1024, CONVERTED_AT_ONCE = 4096 };

static const char save_as_utf8[] = "save it as UTF-8";

void bali_xml_position(const char *text, size_t offset, size_t *line, size_t *column) {
    size_t start = 0;
    *line = 1;
    for (const char *next; (next = memchr(text + start, '\n', offset - start)); ++*line)
        start = (size_t)(next - text) + 1;
    *column = 1 + bali_utf8_count(text + start, offset - start);
}

/* Fails at the end of the clean text read so far. */
static bal_status fail_behind(const char *text, size_t length, bal_error *err) {
    size_t line, column;
    bali_xml_position(text, length, &line, &column);
    bal_error_place(err, NULL, line, column);
    return BAL_ERR_SYNTAX;
}

/* Files of another kind that are often given by mistake, by their first bytes. */
static bal_status refuse_other_kinds(const char *bytes, size_t length, bal_error *err) {
    static const struct {
        const char *magic, *what, *mend;
    } kinds[] = {
        {"\x1F\x8B", "gzip data", "decompress it first"},
        {"BZh", "bzip2 data", "decompress it first"},
        {"\xFD"
         "7zXZ",
         "xz data", "decompress it first"},
        {"\x28\xB5\x2F\xFD", "zstd data", "decompress it first"},
        {"PK\x03\x04", "a zip archive (or an office document)", "unpack it, and give the XML file inside"},
        {"%PDF", "a PDF document", "give the network's XML file"},
    };
    for (size_t i = 0; i < sizeof kinds / sizeof kinds[0]; i++) {
        size_t size = strlen(kinds[i].magic);
        if (length < size || memcmp(bytes, kinds[i].magic, size) != 0) continue;
        (void)bal_error_set(err, BAL_ERR_SYNTAX, "not-xml", "%s, not XML; %s", kinds[i].what, kinds[i].mend);
        return fail_behind(bytes, 0, err);
    }
    return BAL_OK;
}

static bool fits(unsigned char byte, char pattern) {
    switch (pattern) {
    case '0': return byte == 0;
    case 'x': return byte != 0;
    case 'E': return byte == 0xFE;
    case 'F': return byte == 0xFF;
    default: return true;
    }
}

/* UTF-16 and UTF-32 show themselves by a byte order mark, or by the NULs around the first ASCII characters. */
static bal_status refuse_wide(const char *bytes, size_t length, bal_error *err) {
    static const struct {
        const char *name, *pattern;
    } encodings[] = {
        {"UTF-32LE", "FE00"}, {"UTF-32BE", "00EF"}, {"UTF-16LE", "FE??"}, {"UTF-16BE", "EF??"},
        {"UTF-32LE", "x000"}, {"UTF-32BE", "000x"}, {"UTF-16LE", "x0x0"}, {"UTF-16BE", "0x0x"},
    };
    for (size_t i = 0; i < sizeof encodings / sizeof encodings[0] && length >= 4; i++) {
        size_t fitting = 0;
        while (fitting < 4 && fits((unsigned char)bytes[fitting], encodings[i].pattern[fitting])) fitting++;
        if (fitting < 4) continue;
        (void)bal_error_set(err, BAL_ERR_SYNTAX, "encoding",
                            "%s text; %s (iconv -f %s -t UTF-8 FILE > NEW) and declare encoding=\"UTF-8\"",
                            encodings[i].name, save_as_utf8, encodings[i].name);
        return fail_behind(bytes, 0, err);
    }
    return BAL_OK;
}

/* Copies the value of name="value" out of the declaration; a value that does not fit is cut. */
static void find_value(const char *declaration, size_t length, const char *name, char *value, size_t size) {
    size_t n = strlen(name);
    for (size_t i = 0; i + n < length; i++) {
        if (memcmp(declaration + i, name, n) != 0) continue;
        i += n;
        while (i < length && strchr(" \t\r\n=", declaration[i])) i++;
        if (i == length || (declaration[i] != '"' && declaration[i] != '\'')) return;
        const char *from = declaration + i + 1, *to = memchr(from, declaration[i], length - i - 1);
        if (!to) return;
        size_t copied = (size_t)(to - from) < size - 1 ? (size_t)(to - from) : size - 1;
        memcpy(value, from, copied);
        value[copied] = '\0';
        return;
    }
}

static void read_declaration(const char *bytes, size_t length, bali_xml_declaration *declaration) {
    if (length < 6 || memcmp(bytes, "<?xml", 5) != 0 || !strchr(" \t\r\n", bytes[5])) return;
    size_t looked_at = length < LONGEST_DECLARATION ? length : LONGEST_DECLARATION;
    const char *end = memchr(bytes, '>', looked_at);
    if (!end) return;
    find_value(bytes, (size_t)(end - bytes), "version", declaration->version, sizeof declaration->version);
    find_value(bytes, (size_t)(end - bytes), "encoding", declaration->encoding, sizeof declaration->encoding);
}

typedef enum family { UTF_8, ASCII, ONE_BYTE, UNREAD } family;

static bool is_digits(const char *text, size_t most) {
    size_t n = strspn(text, "0123456789");
    return n > 0 && n <= most && text[n] == '\0';
}

static family family_of(const char *encoding) {
    if (*encoding == '\0' || strcasecmp(encoding, "UTF-8") == 0 || strcasecmp(encoding, "UTF8") == 0) return UTF_8;
    if (strcasecmp(encoding, "US-ASCII") == 0 || strcasecmp(encoding, "ASCII") == 0) return ASCII;
    if (strncasecmp(encoding, "ISO-8859-", 9) == 0 && is_digits(encoding + 9, 2)) return ONE_BYTE;
    if (strncasecmp(encoding, "windows-125", 11) == 0 && is_digits(encoding + 11, 1)) return ONE_BYTE;
    return UNREAD;
}

/* A label is shown in a command line only when a shell would read it as one word. */
static bal_status refuse_encoding(const char *encoding, bal_error *err) {
    static const char plain[] = "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789-_.";
    bool is_plain = *encoding != '-' && strspn(encoding, plain) == strlen(encoding);
    bool is_wide = strncasecmp(encoding, "UTF-16", 6) == 0 || strncasecmp(encoding, "UTF-32", 6) == 0;
    if (is_wide) {
        (void)bal_error_set(err, BAL_ERR_SYNTAX, "encoding",
                            "declares the encoding %s, which its bytes are not; %s and declare encoding=\"UTF-8\"",
                            encoding, save_as_utf8);
    } else if (is_plain) {
        (void)bal_error_set(
            err, BAL_ERR_SYNTAX, "encoding",
            "encoding %s is not read; %s (iconv -f %s -t UTF-8 FILE > NEW) and declare encoding=\"UTF-8\"", encoding,
            save_as_utf8, encoding);
    } else {
        (void)bal_error_set(err, BAL_ERR_SYNTAX, "encoding",
                            "encoding \"%s\" is not read; %s (with iconv) and declare encoding=\"UTF-8\"", encoding,
                            save_as_utf8);
    }
    return fail_behind("", 0, err);
}

/* Adds one piece of the conversion; false with errno when iconv stopped for a reason other than a full buffer. */
static bool convert_piece(iconv_t converter, char **from, size_t *left, bali_text *to) {
    char piece[CONVERTED_AT_ONCE];
    char *end = piece;
    size_t room = sizeof piece;
    size_t result = iconv(converter, from, left, &end, &room);
    bali_text_add(to, piece, sizeof piece - room);
    return result != (size_t)-1 || errno == E2BIG;
}

/* Converts one-byte text to UTF-8. The system's tables are used; they are part of the C library. */
static bal_status convert(char **bytes, size_t *length, const char *encoding, bal_error *err) {
    bali_text to = {0};
    bal_status status = BAL_OK;
    iconv_t converter = iconv_open("UTF-8", encoding);
    if (converter == (iconv_t)-1) return errno == ENOMEM ? bali_out_of_memory(err) : refuse_encoding(encoding, err);
    char *from = *bytes;
    size_t left = *length;
    bool good = true;
    while (good && left > 0 && !to.failed) good = convert_piece(converter, &from, &left, &to);
    if (to.failed) {
        status = bali_out_of_memory(err);
    } else if (!good) {
        status = bal_error_set(err, BAL_ERR_SYNTAX, "bad-encoding",
                               "byte 0x%02X does not exist in %s; correct the declared encoding",
                               (unsigned)(unsigned char)*from, encoding);
        (void)fail_behind(bali_text_string(&to), to.length, err);
    } else {
        bali_free(*bytes);
        *bytes = to.bytes;
        *length = to.length;
        to = (bali_text){0};
    }
    (void)iconv_close(converter);
    bali_text_free(&to);
    return status;
}

static bool is_xml_character(uint32_t c) {
    return c >= 0x20 ? c != 0xFFFE && c != 0xFFFF : c == '\t' || c == '\n' || c == '\r';
}

static bal_status refuse_byte(unsigned char byte, family encoded, bal_error *err) {
    if (encoded == ASCII)
        return bal_error_set(err, BAL_ERR_SYNTAX, "bad-encoding",
                             "byte 0x%02X is not US-ASCII, the declared encoding; declare the right encoding", byte);
    return bal_error_set(
        err, BAL_ERR_SYNTAX, "bad-encoding",
        "byte 0x%02X is not UTF-8; declare the encoding (such as ISO-8859-1), or convert the file with iconv", byte);
}

/* Checks every character, in place; CR LF and CR become LF. Text of converted one-byte encodings comes as UTF-8. */
static bal_status clean(char *bytes, size_t *length, family encoded, bal_error *err) {
    size_t to = 0;
    for (size_t i = 0; i < *length;) {
        unsigned char byte = (unsigned char)bytes[i];
        if (byte >= 0x20 && byte < 0x80) {
            bytes[to++] = bytes[i++];
            continue;
        }
        uint32_t character = 0;
        size_t size = encoded == ASCII && byte >= 0x80 ? 0 : bali_utf8_next(bytes + i, *length - i, &character);
        if (size == 0) {
            (void)refuse_byte(byte, encoded, err);
            return fail_behind(bytes, to, err);
        }
        if (!is_xml_character(character)) {
            (void)bal_error_set(err, BAL_ERR_SYNTAX, "forbidden-character",
                                "character U+%04X, which XML does not allow; remove it", (unsigned)character);
            return fail_behind(bytes, to, err);
        }
        if (character == '\r') {
            bytes[to++] = '\n';
            i += i + 1 < *length && bytes[i + 1] == '\n' ? 2 : 1;
            continue;
        }
        memmove(bytes + to, bytes + i, size);
        to += size;
        i += size;
    }
    bytes[to] = '\0';
    *length = to;
    return BAL_OK;
}

bal_status bali_xml_decode(char **bytes, size_t *length, bali_xml_declaration *declaration, bal_error *err) {
    *declaration = (bali_xml_declaration){0};
    bal_status status = refuse_other_kinds(*bytes, *length, err);
    if (status == BAL_OK) status = refuse_wide(*bytes, *length, err);
    if (status != BAL_OK) return status;
    bool has_mark = *length >= 3 && memcmp(*bytes, "\xEF\xBB\xBF", 3) == 0;
    if (has_mark) {
        *length -= 3;
        memmove(*bytes, *bytes + 3, *length + 1);
    }
    read_declaration(*bytes, *length, declaration);
    family encoded = has_mark ? UTF_8 : family_of(declaration->encoding);
    if (encoded == UNREAD) return refuse_encoding(declaration->encoding, err);
    if (encoded == ONE_BYTE) status = convert(bytes, length, declaration->encoding, err);
    return status == BAL_OK ? clean(*bytes, length, encoded, err) : status;
}
