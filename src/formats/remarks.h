/* Warnings of a reader: the first ten of a kind are told, then a count. */
#ifndef FORMATS_REMARKS_H
#define FORMATS_REMARKS_H

#include "formats/xml.h"

typedef struct bali_remark_kind {
    const char *code;
    size_t n;
} bali_remark_kind;

/** Start with = {.notices = ..., .xml = ...}; notices may be NULL. */
typedef struct bali_remarks {
    const bal_notices *notices;
    bali_xml *xml;
    bali_remark_kind kinds[16]; /* by code */
    size_t n_kinds;
} bali_remarks;

/** A warning about an offset of the file. variable may be NULL. */
void bali_remark(bali_remarks *remarks, size_t at, const char *code, const char *variable, const char *format, ...)
    BAL_FORMAT(5, 6);
/** Whether the next warning of this kind will be told, for callers to whom its words cost much. Counts it when not. */
bool bali_remarks_wanted(bali_remarks *remarks, const char *code);
/** Tells how many warnings of each kind were not told. */
void bali_remarks_close(bali_remarks *remarks);

#endif
