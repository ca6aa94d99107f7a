/* Status and place of a failure, notices, and the table of message codes. */
#ifndef BALLAST_ERROR_H
#define BALLAST_ERROR_H

#include <stddef.h>

#ifdef __cplusplus
extern "C" {
#endif

#define BAL_API __attribute__((visibility("default")))
#define BAL_MUST_CHECK __attribute__((warn_unused_result))
#define BAL_FORMAT(text, arguments) __attribute__((format(printf, text, arguments)))

typedef enum bal_status {
    BAL_OK = 0,
    BAL_ERR_MEMORY,      /* an allocation failed */
    BAL_ERR_IO,          /* a file could not be opened, read or written */
    BAL_ERR_SYNTAX,      /* a file is not well formed */
    BAL_ERR_DATA,        /* a file is well formed and says something that cannot be */
    BAL_ERR_ARGUMENT,    /* the caller asked for something that does not exist or is out of range */
    BAL_ERR_NUMERIC,     /* a number could not be computed */
    BAL_ERR_INTERRUPTED  /* a signal ended the work */
} bal_status;

/**
 * What went wrong, and where. Lives on the caller's stack; start it with = {0}.
 *
 * Every function that can fail takes a bal_error * last, which may be NULL. The first cause wins: a
 * floor that knows more about a failure only fills fields that are still empty. A message is lower
 * case, has no full stop, and reads "what is wrong; what to do".
 */
typedef struct bal_error {
    size_t line, column, record; /* one-based; 0 = unknown; line is the editor's, record is the table's */
    bal_status status;
    const char *code; /* a stable word in static memory, such as "unknown-label"; see bal_code_find */
    char file[1024], variable[256], message[512]; /* UTF-8, cut at a character's end */
} bal_error;

/**
 * Records a failure unless err already holds one, and returns its status, so that a function can end
 * with  return bal_error_set(err, BAL_ERR_DATA, "unknown-label", "...", ...).
 *
 * err     may be NULL: then only the status is returned
 * code    a code of the table below, in static memory
 * format  printf format of the message; control characters in the arguments are written as \xNN
 *
 * Returns: the status of the first cause: err->status when err already held one, else status.
 */
BAL_API bal_status bal_error_set(bal_error *err, bal_status status, const char *code, const char *format, ...)
    BAL_FORMAT(4, 5);

/** Fills the fields of the place that are still empty. NULL and 0 leave a field alone. No failure. */
BAL_API void bal_error_place(bal_error *err, const char *file, size_t line, size_t column);

/** Fills record (one-based) and variable where they are still empty. 0 and NULL leave a field alone. */
BAL_API void bal_error_context(bal_error *err, size_t record, const char *variable);

/**
 * Writes "FILE:LINE:COLUMN: message [code]" without the parts that are not known.
 *
 * Control characters and bytes that are not UTF-8 are written as \xNN, so that a hostile file name or
 * label cannot steer a terminal. Always ends with a NUL when size > 0; cut at a character's end.
 */
BAL_API void bal_error_text(const bal_error *err, char *text, size_t size);

/* Notices: what the library has to say without failing, and failures that are gathered (ten unknown
 * labels are worth ten lines). The library never prints. */
typedef enum bal_severity { BAL_NOTE, BAL_WARNING, BAL_PROBLEM } bal_severity;

/**
 * Where notices go. A NULL pointer to this, or a NULL tell, means nowhere.
 *
 * A notice is a bal_error whose status is BAL_OK for notes and warnings. A BAL_PROBLEM is one of
 * several failures of a call; the call then fails, and its own error is the first problem told.
 */
typedef struct bal_notices {
    void (*tell)(void *context, bal_severity severity, const bal_error *notice);
    void *context;
} bal_notices;

/** One row of the table of message codes: what `ballast explain` prints. All text in static memory. */
typedef struct bal_code {
    const char *code;    /* the stable word */
    const char *cause;   /* what it means */
    const char *example; /* a message as it may look, or an input that causes it */
    const char *mend;    /* what to do */
} bal_code;

/** The table of codes in alphabetical order; *n_codes is its length. Never fails. */
BAL_API const bal_code *bal_codes(size_t *n_codes);

/** The row of one code, or NULL when there is no such code. */
BAL_API const bal_code *bal_code_find(const char *code);

#ifdef __cplusplus
}
#endif
#endif
