/* The elements of an XML file, one after another, with their places. It knows nothing of networks. */
#ifndef FORMATS_XML_H
#define FORMATS_XML_H

#include "ballast/error.h"

#include <stdbool.h>
#include <stdint.h>

/** A file's text, made clean: UTF-8, line ends LF. A place in it is an offset in bytes. */
typedef struct bali_xml bali_xml;

/** Who hears what the file says. A call that returns anything but BAL_OK ends the parse with that status. */
typedef struct bali_xml_listener {
    void *context;
    const char *expected; /* the root element, or elements, for messages: "BIF" */
    /** An element begins with its tag at an offset; name is its local name. Attributes can be asked for. */
    bal_status (*start)(void *context, const char *name, size_t at, bal_error *err);
    /** The next piece of text directly in the innermost open element; references are resolved. A text comes in any
     * number of pieces, whatever its length. */
    bal_status (*text)(void *context, const char *bytes, size_t length, bal_error *err);
    /** The innermost open element ends. */
    bal_status (*end)(void *context, bal_error *err);
    /** A warning: nothing is wrong, but something is not as it may be meant. */
    void (*remark)(void *context, size_t at, const char *code, const char *message);
} bali_xml_listener;

/**
 * Takes an XML file's bytes, and turns them into clean text.
 *
 * file   its name, for messages
 * bytes  from bali_allocate, ended by a NUL that length does not count; taken, also when this call fails
 *
 * Fails:  SYNTAX for compressed data, an encoding that is not read, bytes that do not fit the encoding; MEMORY.
 * Cost:   O(length), in place unless the encoding is ISO-8859-x or windows-125x.
 */
BAL_MUST_CHECK bal_status bali_xml_create_take(const char *file, char *bytes, size_t length, bali_xml **out,
                                               bal_error *err);
void bali_xml_free(bali_xml *xml);

/**
 * Goes through the file once, and tells a listener. Once for each bali_xml.
 *
 * Nothing but the text at hand is looked at: no entity, no external file, no default value of an attribute.
 *
 * Fails:  SYNTAX with file, line and column of the first thing that is wrong, MEMORY, and whatever the listener
 * returns. Cost:   O(length); limits are those of xml_guard.h.
 */
BAL_MUST_CHECK bal_status bali_xml_parse(bali_xml *xml, const bali_xml_listener *listener, bal_error *err);

/** During start: the value of the element's attribute of that name without a prefix, or NULL. Borrowed until the next
 * call. When memory runs out the value is cut, and the parse fails after start. */
const char *bali_xml_attribute(bali_xml *xml, const char *name, size_t *length);
/** During start: the name of the i-th attribute without a prefix, or NULL behind the last. Borrowed. */
const char *bali_xml_attribute_name(const bali_xml *xml, size_t i);

/** Fills the empty fields of err: file, line, column. */
void bali_xml_place(bali_xml *xml, size_t at, bal_error *err);
/** The line of an offset. Cheap when places are asked for in the order of the file. */
size_t bali_xml_line(bali_xml *xml, size_t at);

/** An element's text gone over again, to find the place of something in it. */
typedef struct bali_xml_retrace {
    const char *text;
    size_t at; /* of what comes next */
    bool in_cdata;
} bali_xml_retrace;

/** Starts at the beginning of the text of the element whose tag begins at an offset. */
bali_xml_retrace bali_xml_retrace_start(const bali_xml *xml, size_t at);

/**
 * The next byte of the element's text as the listener heard it, and the offset where it comes from. A reference counts
 * as one byte: a blank when it stands for one, else '&'. Returns false at the end of the text or at the next element.
 */
bool bali_xml_retrace_next(bali_xml_retrace *retrace, char *byte, size_t *at);

#endif
