/* What the first bytes of a table look like: the delimiter, and files that are no CSV at all. */
#ifndef FORMATS_CSV_LOOK_H
#define FORMATS_CSV_LOOK_H

#include "ballast/error.h"

#include <stdbool.h>

/** Length of the first line of some bytes, its end not counted; a newline inside quotes does not end it. *complete is
 *  false when no end was met. */
size_t bali_csv_line_length(const char *bytes, size_t length, bool *complete);

/**
 * Refuses what is not CSV in UTF-8, saying what it looks like and how to convert it.
 *
 * bytes  the beginning of the file behind a UTF-8 byte order mark, with its first line where that is not too long
 *
 * Fails:  SYNTAX "not-a-table", "encoding", "sep-line".
 */
BAL_MUST_CHECK bal_status bali_csv_look(const char *bytes, size_t length, bal_error *err);

/** Tab when the file's name ends in .tsv or .tsv.gz, or its first line has a tab outside quotes, else comma. */
char bali_csv_guess_delimiter(const char *path, const char *line, size_t length);

/** One piece of the first line split at a delimiter outside quotes, without outer blanks and outer quotes. *at starts at
 *  0. Returns false when there is none left. Doubled quotes stay doubled. */
bool bali_csv_split(const char *line, size_t length, char delimiter, size_t *at, const char **piece,
                    size_t *piece_length);

#endif
