/* Reading: a file or standard input as bytes in order, or whole into memory. */
#ifndef BASE_FILES_H
#define BASE_FILES_H

#include "ballast/error.h"

#include <stdbool.h>
#include <stdint.h>

/** Something that is read. */
typedef struct bali_input bali_input;

/**
 * Opens a file for reading; "-" is standard input. A folder is refused. Never blocks on anything but the
 * opening of a FIFO.
 *
 * Fails:  IO, with err->file set and the system's reason in the message (code "cannot-open"); MEMORY.
 */
BAL_MUST_CHECK bal_status bali_input_open(const char *path, bali_input **out, bal_error *err);

/**
 * The next bytes, at most size of them; *length is 0 at the end. Short reads and EINTR are dealt with: *length < size
 * only at the end.
 *
 * Fails:  IO "cannot-read"; DATA "changed-while-read" when a regular file's size or modification time is not what it
 *         was at the opening, looked at when its end is reached.
 */
BAL_MUST_CHECK bal_status bali_input_read(bali_input *input, void *bytes, size_t size, size_t *length, bal_error *err);

/** Whether the input can be read again from its start: a regular file. */
bool bali_input_can_rewind(const bali_input *input);
/** Back to the start. Fails: IO "cannot-reread" for a pipe (the message says: save it to a file first). */
BAL_MUST_CHECK bal_status bali_input_rewind(bali_input *input, bal_error *err);

/** To a byte of a regular file, counted from where it stood at the opening. Fails: as _rewind. */
BAL_MUST_CHECK bal_status bali_input_seek(bali_input *input, uint64_t position, bal_error *err);

/** The name as the user gave it, "standard input" for "-"; borrowed. */
const char *bali_input_name(const bali_input *input);
/** The base name for provenance: never a path. Borrowed. */
const char *bali_input_base_name(const bali_input *input);
/** The size of a regular file when it was opened; 0 where that is not known, as for a pipe. */
uint64_t bali_input_size(const bali_input *input);
/** Whether two inputs read one and the same regular file in one and the same state: device, number, size, times. */
bool bali_input_same(const bali_input *a, const bali_input *b);
/** Bytes handed out so far (since the opening or the last rewind). */
uint64_t bali_input_position(const bali_input *input);
void bali_input_close(bali_input *input);

/**
 * Reads all of a file. bytes gets a NUL behind (not counted in *length); freed with bali_free.
 *
 * Fails:  as above; DATA "file-too-large" beyond limit bytes, without having allocated more than that.
 */
BAL_MUST_CHECK bal_status bali_read_whole(const char *path, size_t limit, char **bytes, size_t *length, bal_error *err);

/** Whether what was read so far is worth reading on. */
typedef bool (*bali_goes_on)(const char *bytes, size_t length);

/** The same, asking before more is read than a pipe gives at first; where the answer is no, *bytes is what was read so far. goes_on
 *  may be NULL. */
BAL_MUST_CHECK bal_status bali_read_while(const char *path, size_t limit, bali_goes_on goes_on, char **bytes, size_t *length,
                                          bal_error *err);

/** The part behind the last slash; "-" gives "standard input". Borrowed from path or static. */
const char *bali_base_name(const char *path);

/** Whether two paths name the same existing file (device and inode). "-" is a name like any other here. */
bool bali_same_file(const char *a, const char *b);

/**
 * Records what the system refused: "what: the system's reason; mend", with err->file set to file unless err already holds
 * a failure.
 *
 * reason  an errno, caught at once
 *
 * Returns: the status of the first cause: err->status when err already held one, else BAL_ERR_IO.
 */
bal_status bali_system_error(bal_error *err, const char *code, const char *file, int reason, const char *what, const char *mend);

#endif
