/* The one escaper of XML, HTML and SVG text. */
#ifndef BASE_MARKUP_H
#define BASE_MARKUP_H

#include "base/text.h"

/** Adds text as element content or as an attribute's value between double quotes: & < > " ' and, as character
 *  references, tab, newline and carriage return (so that no parser normalises them). Bytes that are not UTF-8 and
 *  characters that no XML can hold (most controls, U+FFFE, U+FFFF) become U+FFFD. */
void bali_markup_escape(bali_text *text, const char *bytes, size_t length);
/** The same, with tabs and newlines as they are: for element content that is laid out over lines. */
void bali_markup_content(bali_text *text, const char *bytes, size_t length);

#endif
