/* XML from memory, and what a listener hears of it as text that a test can compare. */
#ifndef SUPPORT_HEARING_H
#define SUPPORT_HEARING_H

#include "base/text.h"
#include "formats/xml.h"
#include "support/harness.h"

/* What a listener heard, as text: "(BIF 1:1" for a start, its attributes, "[text]", ")" for an end, "!code 1:1" for a
 * remark. */
typedef struct hearing {
    bali_xml *xml;
    bali_text heard;
    bool in_text, deaf; /* deaf: hears nothing, for texts that are too long for it */
    size_t stop_after;  /* starts; 0 = never */
} hearing;

/** A literal's bytes and how many they are, NULs in it included. */
#define LITERAL(text) (text), sizeof(text) - 1

/** Parses bytes as the file model.xml; *heard is freed by the caller, also after a failure. */
bal_status hear_as(hearing h, const char *bytes, size_t length, bali_text *heard, bal_error *err);
bal_status hear(const char *bytes, size_t length, bali_text *heard, bal_error *err);

/** Parses, and fails the test unless it was heard like this. */
void expect_heard(const char *bytes, size_t length, const char *expected);
/** Parses, and fails the test unless it is refused at a place, with a code and words. */
void expect_unheard(const char *bytes, size_t length, size_t line, size_t column, const char *code, const char *words);

/** A text so many times. */
bali_text repeated(const char *text, size_t times);

#endif
