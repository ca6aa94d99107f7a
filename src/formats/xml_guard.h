/* The guard in front of the XML parser: it goes over clean text tag by tag, and lets nothing through that could make
 * the parser slow, large, or open anything. */
#ifndef FORMATS_XML_GUARD_H
#define FORMATS_XML_GUARD_H

#include "base/names.h"
#include "ballast/error.h"

#include <stdbool.h>

#define BALI_XML_MAX_TAG_BYTES ((size_t)65536) /* a tag, a comment, a processing instruction, an internal subset */
#define BALI_XML_MAX_NAME_BYTES ((size_t)255)  /* the name of an element or attribute */
#define BALI_XML_MAX_NAMES ((size_t)1000)      /* different ones: the parser's table of names has a largest size */
#define BALI_XML_MAX_DEPTH ((size_t)256)
#define BALI_XML_MAX_ELEMENTS ((size_t)1000000)
#define BALI_XML_MAX_ATTRIBUTES ((size_t)256) /* in one tag: the parser compares each with each */
#define BALI_XML_MAX_NAMESPACES ((size_t)256) /* in the file: the parser goes through all of them at every tag */
#define BALI_XML_MAX_INSTRUCTIONS ((size_t)1000000)

/** What a piece of the file is to the parser. */
typedef enum bali_xml_piece {
    BALI_XML_MARKUP, /* tags, comments, declarations, text: the parser's business */
    BALI_XML_SILENT, /* a processing instruction: nobody's */
    BALI_XML_CDATA   /* text as it stands, between <![CDATA[ and ]]> */
} bali_xml_piece;

/** An element whose end has not been seen: where its tag begins, and how long its name is. */
typedef struct bali_xml_open_tag {
    size_t at, name_bytes;
} bali_xml_open_tag;

typedef struct bali_xml_guard {
    char *text; /* clean and ended by a NUL; the document type and instructions outside the root are blanked out */
    size_t length;
    size_t at;            /* everything before is fit for the parser */
    bali_xml_piece piece; /* what ends at at */
    const char *expected; /* the root element that is expected, for messages */
    /** Gets warnings. */
    void (*remark)(void *context, size_t at, const char *code, const char *message);
    void *context;

    bali_xml_open_tag open[BALI_XML_MAX_DEPTH];
    size_t depth;
    size_t *starts; /* where each element's tag begins, in order */
    size_t n_starts, capacity;
    size_t attributes; /* seen so far, namespace declarations included */
    size_t namespaces, instructions;
    bali_names names; /* of elements and attributes: copies, which are freed one by one */
    size_t root_end;  /* behind the root element; 0 = not yet */
    bool has_doctype;
} bali_xml_guard;

/**
 * Looks at the next piece, a tag, a comment, an instruction, a CDATA section, a declaration or the text up to the next
 * of these, and moves at behind it.
 *
 * Fails:  SYNTAX for a limit, an entity declaration, markup that does not end or does not match; MEMORY. at then stays
 *         where the piece begins; err has line and column.
 * Cost:   O(bytes of the piece).
 */
BAL_MUST_CHECK bal_status bali_xml_guard_next(bali_xml_guard *guard, bal_error *err);

/** Looks at the end of the text: the root has to be there and complete. */
BAL_MUST_CHECK bal_status bali_xml_guard_end(const bali_xml_guard *guard, bal_error *err);

void bali_xml_guard_free(bali_xml_guard *guard);

/* For the guard's own files. */

/** Fails at an offset. */
bal_status bali_xml_guard_fail(const bali_xml_guard *guard, size_t at, const char *code, bal_error *err,
                               const char *format, ...) BAL_FORMAT(5, 6);
/** The offset behind the next occurrence of text from an offset, when it ends within BALI_XML_MAX_TAG_BYTES of begin.
 * Fails otherwise, saying that what (such as "a comment") is too long or does not end. */
BAL_MUST_CHECK bal_status bali_xml_guard_find(const bali_xml_guard *guard, size_t begin, size_t from, const char *text,
                                              const char *what, size_t *behind, bal_error *err);
/** Overwrites with blanks, newlines kept, so that places stay as they are. */
void bali_xml_guard_blank(bali_xml_guard *guard, size_t from, size_t to);
/** Looks at the document type declaration that begins at guard->at, and blanks out all of it but its name. */
BAL_MUST_CHECK bal_status bali_xml_guard_doctype(bali_xml_guard *guard, bal_error *err);
bool bali_xml_is_blank(char c);

#endif
