#include "formats/number_list.h"

#include "base/memory.h"
#include "base/numbers.h"

#include <string.h>

enum { SHOWN = 40 };

/* A row may sum to 1.02; no single number in it may be more, then. */
static const double most_probability = 1.02 + 1e-12;

static bool is_blank(char c) {
    return c == ' ' || c == '\n' || c == '\t' || c == '\r';
}

size_t bali_number_at(bali_xml *xml, const bali_number_list *list, size_t i) {
    bali_xml_retrace retrace = bali_xml_retrace_start(xml, list->at);
    size_t at;
    char byte = '\0', before = ' ';
    while (list->is_named && byte != '=')
        if (!bali_xml_retrace_next(&retrace, &byte, &at)) return list->at;
    for (size_t words = 0; bali_xml_retrace_next(&retrace, &byte, &at); before = byte)
        if (is_blank(before) && !is_blank(byte) && words++ == i) return at;
    return list->at;
}

/* The number at hand cannot be: says so where it stands. */
static bal_status refuse(const bali_number_reader *reader, const char *word, size_t length, const char *what,
                         bal_error *err) {
    bal_status status = bal_error_set(err, BAL_ERR_DATA, "bad-number", "\"%.*s\"%s %s",
                                      (int)(length < SHOWN ? length : SHOWN), word, length < SHOWN ? "" : "...", what);
    bali_xml_place(reader->xml, bali_number_at(reader->xml, reader->list, reader->list->n), err);
    return status;
}

static bool has(const char *word, size_t length, const char *any) {
    for (size_t i = 0; i < length; i++)
        if (strchr(any, word[i])) return true;
    return false;
}

static bal_status refuse_word(const bali_number_reader *reader, const char *word, size_t length, bal_error *err) {
    if (has(word, length, ",")) return refuse(reader, word, length, "is not a number; use a decimal point", err);
    size_t digits = 0;
    while (digits < length && strchr("0123456789.+-eE", word[digits])) digits++;
    if (digits == length && has(word, length, "0123456789") && length > 3)
        return refuse(reader, word, length, "is too large or no decimal number; write it like 0.25 or 2.5e-1", err);
    return refuse(reader, word, length, "is not a finite decimal number; use a decimal point, as in 0.25", err);
}

static bal_status add(bali_number_reader *reader, const char *word, size_t length, bal_error *err) {
    bali_number_list *list = reader->list;
    double value;
    if (!bali_number_read(word, length, &value)) return refuse_word(reader, word, length, err);
    if (value < 0) return refuse(reader, word, length, "is negative; use 0 or more", err);
    if (reader->kind == BALI_STRENGTHS && value == 0)
        return refuse(reader, word, length, "is not more than 0; use a positive number", err);
    if (reader->kind == BALI_PROBABILITIES && value > most_probability)
        return refuse(reader, word, length, "is more than 1; use a probability", err);
    if (list->n == reader->limit) {
        bal_status status = bal_error_set(err, BAL_ERR_DATA, "too-many-cells",
                                          "more than %zu numbers; correct the list, or raise --max-cells",
                                          reader->limit);
        bali_xml_place(reader->xml, list->at, err);
        return status;
    }
    if (!bali_grow((void **)&list->values, &list->capacity, list->n + 1, sizeof *list->values))
        return bali_out_of_memory(err);
    list->values[list->n++] = value == 0 ? 0 : value; /* no negative zero */
    return BAL_OK;
}

/* Adds to the word that the piece before broke off in; a word that does not fit is no number that could be read. */
static bal_status continue_word(bali_number_reader *reader, const char *bytes, size_t length, bal_error *err) {
    size_t room = sizeof reader->word - reader->length;
    memcpy(reader->word + reader->length, bytes, length < room ? length : room);
    reader->length += length < room ? length : room;
    return length < room ? BAL_OK : refuse_word(reader, reader->word, reader->length, err);
}

bal_status bali_number_finish(bali_number_reader *reader, bal_error *err) {
    size_t length = reader->length;
    reader->length = 0;
    return length > 0 ? add(reader, reader->word, length, err) : BAL_OK;
}

bal_status bali_number_feed(bali_number_reader *reader, const char *bytes, size_t length, bal_error *err) {
    bal_status status = BAL_OK;
    for (size_t i = 0; i < length && status == BAL_OK;) {
        size_t from = i;
        while (i < length && !is_blank(bytes[i])) i++;
        if (i == length) {
            status = continue_word(reader, bytes + from, i - from, err);
        } else if (reader->length > 0) {
            status = continue_word(reader, bytes + from, i - from, err);
            if (status == BAL_OK) status = bali_number_finish(reader, err);
        } else if (i > from) {
            status = add(reader, bytes + from, i - from, err);
        }
        while (i < length && is_blank(bytes[i])) i++;
    }
    return status;
}

void bali_number_list_free(bali_number_list *list) {
    bali_free(list->values);
    *list = (bali_number_list){0};
}
