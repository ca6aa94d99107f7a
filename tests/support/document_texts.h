/* Network files from memory, what the reader says of them, and documents compared. */
#ifndef SUPPORT_DOCUMENT_TEXTS_H
#define SUPPORT_DOCUMENT_TEXTS_H

#include "ballast/formats.h"
#include "base/text.h"
#include "support/harness.h"

/* The beginning and the end of a network file with two variables; tests count lines and columns from them. */
#define HEAD                                                                                                           \
    "<?xml version=\"1.0\"?>\n<BIF VERSION=\"0.3\">\n<NETWORK>\n<NAME>demo</NAME>\n"                                   \
    "<VARIABLE TYPE=\"nature\"><NAME>smoker</NAME><OUTCOME>no</OUTCOME><OUTCOME>yes</OUTCOME></VARIABLE>\n"            \
    "<VARIABLE><NAME> cough </NAME><OUTCOME>none</OUTCOME><OUTCOME>some</OUTCOME><OUTCOME>much</OUTCOME></VARIABLE>\n"
#define TAIL "</NETWORK>\n</BIF>\n"
enum { HEAD_LINES = 6 };

/** The warnings that were told. */
typedef struct said {
    bali_text text; /* "code line:column message\n" */
    size_t n;
} said;

/** Reads bytes as the file model.xml. warnings may be NULL. */
bal_status read_bytes(const char *bytes, size_t length, bal_network_options options, said *warnings, bal_document **out,
                      bal_error *err);
/** The same of a string, which has to be accepted. */
bal_document *read_or_fail(const char *bytes, bal_network_options options, said *warnings);
bal_document *read_text(const char *bytes);
/** Fails the test unless a string is refused at a place, with a code and words. */
void expect_refused_text(const char *bytes, bal_network_options options, size_t line, size_t column, const char *code,
                         const char *words);
/** Fails the test unless a row of a variable's TABLE is this, to 4 units in the last place of 1. */
void expect_table_row(const bal_document *document, size_t variable, size_t row, const double *expected);

/** A document as text, freed with bal_text_free. */
void print_document(const bal_document *document, char **text, size_t *length);
/** Fails the test unless two documents say the same, bit by bit; properties in their order at each place. */
void expect_equal_documents(const bal_document *a, const bal_document *b);
/** Written, read back, written again: an equal document without a warning, the same bytes. */
void expect_round_trip(const bal_document *document);

#endif
