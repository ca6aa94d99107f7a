/* Lists of numbers in an element's text, read as the text comes in, without keeping the text. */
#ifndef FORMATS_NUMBER_LIST_H
#define FORMATS_NUMBER_LIST_H

#include "formats/xml.h"

typedef enum bali_number_kind {
    BALI_PROBABILITIES, /* 0 to 1, and a little more: rows are renormalised later */
    BALI_COUNTS,        /* 0 or more */
    BALI_STRENGTHS      /* more than 0 */
} bali_number_kind;

typedef struct bali_number_list {
    bool given;
    bool is_named; /* "name =" stands before the numbers */
    size_t at;     /* of the element's tag */
    double *values;
    size_t n, capacity;
} bali_number_list;

/** A list that is being read. Start with = {.xml = ..., .list = ..., .kind = ..., .limit = ...}. */
typedef struct bali_number_reader {
    bali_xml *xml;
    bali_number_list *list;
    bali_number_kind kind;
    size_t limit;  /* most numbers that are read */
    size_t length; /* of the word that the last piece of text broke off in */
    char word[512];
} bali_number_reader;

/** Reads the numbers in the next piece of text. Fails: DATA with the place of the number; MEMORY. */
BAL_MUST_CHECK bal_status bali_number_feed(bali_number_reader *reader, const char *bytes, size_t length,
                                           bal_error *err);
/** The text ends. */
BAL_MUST_CHECK bal_status bali_number_finish(bali_number_reader *reader, bal_error *err);

/** The offset of the i-th number of a list; of the element when there is no such number. */
size_t bali_number_at(bali_xml *xml, const bali_number_list *list, size_t i);

void bali_number_list_free(bali_number_list *list);

#endif
