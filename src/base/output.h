/* Writing: a regular file is written beside its place and renamed onto it, so that it is complete or untouched. */
#ifndef BASE_OUTPUT_H
#define BASE_OUTPUT_H

#include "ballast/error.h"

#include <stdbool.h>

/** Something that is written. Not for several threads. */
typedef struct bali_output bali_output;

/**
 * Opens an output. "-" is standard output. Regular files (and names that do not exist yet) are written to an unnamed file in the
 * same folder (O_TMPFILE, else a hidden named one) and take their name only in _commit; a link's target is what is
 * replaced, and the link stays; an existing file's mode is kept, a new one's follows the umask. What is not a regular
 * file (a FIFO, /dev/null) is written in place. An existing file that may not be written is refused, although its folder may
 * allow to replace it. Owner and group are kept where the system lets us; access lists are not.
 *
 * Fails:  IO "cannot-write" with err->file and the system's reason, before any work is done: a folder that cannot be written,
 *         a path that is a folder; MEMORY.
 */
BAL_MUST_CHECK bal_status bali_output_open(const char *path, bali_output **out, bal_error *err);

/** Adds bytes (buffered). Fails: IO "cannot-write". After a failure only _abandon is of use. */
BAL_MUST_CHECK bal_status bali_output_write(bali_output *output, const void *bytes, size_t length, bal_error *err);

/**
 * Flushes, syncs file and folder, and puts the file in its place; frees the output, also on failure (then the old file is
 * as it was, and nothing is left behind).
 */
BAL_MUST_CHECK bal_status bali_output_commit(bali_output *output, bal_error *err);

/** Drops everything and frees the output; NULL is fine. */
void bali_output_abandon(bali_output *output);

/** Whether a name stands for standard output: "-", or /dev/stdout and its like. */
bool bali_output_is_standard(const char *name);

/** Open, write, commit. */
BAL_MUST_CHECK bal_status bali_output_write_whole(const char *path, const void *bytes, size_t length, bal_error *err);

/** Whether two open outputs would end as one file, by whatever names they were given. Never true of what is written in place. */
bool bali_output_same(const bali_output *a, const bali_output *b);

/** Removes the named temporary files of all open outputs. For a signal handler: only calls what may be called there. */
void bali_output_interrupted(void);

#endif
