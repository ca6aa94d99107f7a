/* The bytes of an XML file as clean text: UTF-8, line ends LF, no byte order mark, no character that XML forbids. */
#ifndef FORMATS_XML_DECODE_H
#define FORMATS_XML_DECODE_H

#include "ballast/error.h"

/** What the XML declaration says; "" where it says nothing. */
typedef struct bali_xml_declaration {
    char version[16], encoding[48];
} bali_xml_declaration;

/**
 * Turns an XML file's bytes into clean text. UTF-8, US-ASCII, ISO-8859-x and windows-125x are read, as declared.
 *
 * bytes        address of the text, from bali_allocate; it may move. Freed by the caller, also after a failure
 * declaration  overwritten
 *
 * Fails:  SYNTAX for compressed data, UTF-16, UTF-32, any other encoding, a byte that does not fit the
 *         encoding, a character that XML forbids; MEMORY. Line and column are the editor's: CR, LF and CRLF
 *         each end a line, columns are characters.
 * Source: Extensible Markup Language (XML) 1.0, fifth edition (2008), sections 2.2, 2.11 and 4.3.3.
 */
BAL_MUST_CHECK bal_status bali_xml_decode(char **bytes, size_t *length, bali_xml_declaration *declaration,
                                          bal_error *err);

/** The line and column of an offset in clean text. Cost: O(offset). */
void bali_xml_position(const char *text, size_t offset, size_t *line, size_t *column);

#endif
